use etchwise::{geometry::*, flow::*};
fn main(){
    let spec=std::env::args().nth(1).unwrap();
    let o=spec.parse::<NominalSpec>().unwrap().outline().unwrap();
    for n in [32.0,64.0,128.0,256.0,512.0] { for off in [None,Some([0.137,0.411]),Some([0.6,0.3])] {
    let s=solve_outline(&o,&SolveOptions{cells_across:Some(n),grid_offset:off,..Default::default()}).unwrap().flow;
    println!("n={n} nodes {} fRe {:.8} est {:.1e} plain {:.10}",s.grid.fluid_nodes,s.fanning_dh,s.conductance.relative(),s.conductance_finest_grid/s.geometry.area.powi(2));
    }}
}
