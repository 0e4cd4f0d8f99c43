use etchwise::{geometry::*, flow::*};
fn main(){
    let n: f64 = std::env::args().nth(1).unwrap().parse().unwrap();
    let o=Outline::single(vec![[0.0,0.0],[1.0,0.2],[0.8,1.2],[-0.2,1.0]]);
    let t=std::time::Instant::now();
    let s=solve_outline(&o,&SolveOptions{cells_across:Some(n),..Default::default()}).unwrap().flow;
    println!("nodes {} total {:.3}s solver {:.3}s cycles {} residual {:.1e} per node {:.1} ns est {:.1e}",s.grid.fluid_nodes,t.elapsed().as_secs_f64(),s.solver.seconds,s.solver.cycles,s.solver.residual,s.solver.seconds*1e9/s.grid.fluid_nodes as f64,s.conductance.relative());
}
