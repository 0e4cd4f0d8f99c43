use etchwise::{geometry::*, flow::*};
fn main(){
    let spec=std::env::args().nth(1).unwrap(); let exact:f64=std::env::args().nth(2).unwrap().parse().unwrap();
    let p:f64=std::env::args().nth(3).unwrap().parse().unwrap();
    let o=spec.parse::<NominalSpec>().unwrap().outline().unwrap();
    for n in [64.0,128.0,256.0] { for k in 0..10 { let k=k as f64; let off=[(0.137f64 + 0.618 * k).fract(), (0.411f64 + 0.755 * k).fract()];
    let s=solve_outline(&o,&SolveOptions{cells_across:Some(n),grid_offset:Some(off),..Default::default()}).unwrap().flow;
    let kx=s.geometry.hydraulic_diameter.powi(2)*s.geometry.area/2.0/exact;
    let v:Vec<f64>=s.solver.levels.iter().map(|l|l.conductance/kx-1.0).collect();
    let r=|a:f64,b:f64,p:f64| a+(a-b)/(p.exp2()-1.0);
    let (f1,f2)=(r(v[0],v[1],2.0),r(v[1],v[2],2.0));
    println!("n={n} K {:.2e} {:.2e} {:.2e}  h2 {:.1e} (prev {:.1e})  h2hp {:.1e}  est {:.1e}",v[0],v[1],v[2],f1,f2,r(f1,f2,p),s.conductance.relative());
    }}
}
