use etchwise::{geometry::*, flow::*};
fn run(name:&str,o:&Outline,n:f64,exact:f64,off:[f64;2]){
    let t=std::time::Instant::now();
    let s=solve_outline(o,&SolveOptions{cells_across:if n>0.0{Some(n)}else{None},grid_offset:if name.starts_with('L'){None}else{Some(off)},..Default::default()}).unwrap();
    let f=&s.flow; let dt=t.elapsed().as_secs_f64();
    let ids:Vec<String>=f.identities.iter().map(|i|format!("{:.1e}/{:.0e}",i.relative_difference,i.tolerance)).collect();
    println!("{name} n={:.0} nodes={} plain {:.1e} best {:.1e} est {:.1e} | fRe {:.6} peak {:.6}~{:.0e} m {:.6}~{:.0e} ke {:.6}~{:.0e} sh {:.5} @{:.3?} ids {:?} cyc {} {:.3} t {:.1}ms",f.grid.cells_across,f.grid.fluid_nodes,f.conductance_finest_grid/exact-1.0,f.conductance.value/exact-1.0,f.conductance.relative(),f.fanning_dh,f.peak.to_mean.value,f.peak.to_mean.error,f.momentum_factor.value,f.momentum_factor.error,f.kinetic_energy_factor.value,f.kinetic_energy_factor.error,f.wall_shear.max_per_gradient/f.wall_shear.mean_per_gradient,f.wall_shear.max_at,ids,f.solver.cycles,f.solver.convergence_factor,dt*1e3);
    for w in &f.warnings { println!("    ! {}",w.message); }
}
fn rot(p:Vec<[f64;2]>,a:f64)->Outline{Outline::single(p.into_iter().map(|q|[q[0]*a.cos()-q[1]*a.sin(),q[0]*a.sin()+q[1]*a.cos()]).collect())}
fn main(){
    let sq=vec![[0.0,0.0],[1.0,0.0],[1.0,1.0],[0.0,1.0]];
    let ex=0.0351442537388;
    for n in [8.0,16.0,32.0,64.0,128.0,256.0]{ run("sq",&rot(sq.clone(),0.0),n,ex,[0.0,0.0]); }
    for (a,off) in [(0.0,[0.3,0.7]),(0.0,[0.9,0.11]),(0.1,[0.3,0.2]),(0.4636,[0.5,0.1]),(0.7854,[0.2,0.2]),(0.01,[0.2,0.4])]{
      for n in [64.0,128.0]{ run(&format!("sq a={a}"),&rot(sq.clone(),a),n,ex,off);} }
    let circ:Vec<[f64;2]>=(0..7000).map(|k|{let t=k as f64/7000.0*std::f64::consts::TAU;[t.cos(),t.sin()]}).collect();
    for off in [[0.0,0.0],[0.3,0.6],[0.77,0.21]]{ for n in [32.0,64.0,128.0,256.0]{run("circ",&rot(circ.clone(),0.0),n,std::f64::consts::PI/8.0,off);} }
    let tri=vec![[0.0,0.0],[1.0,0.0],[0.5,3f64.sqrt()/2.0]];
    for (a,off) in [(0.0,[0.3,0.7]),(0.1,[0.3,0.2]),(0.4636,[0.5,0.1])]{ for n in [64.0,128.0]{run("tri",&rot(tri.clone(),a),n,3f64.sqrt()/320.0,off);} }
    let l=vec![[0.0,0.0],[2.0,0.0],[2.0,1.0],[1.0,1.0],[1.0,2.0],[0.0,2.0]];
    for n in [32.0,64.0,128.0,256.0,512.0,1024.0]{run("L",&rot(l.clone(),0.0),n,0.2140758,[0.1,0.3]);}
    for n in [32.0,64.0,128.0,0.0]{run("L rot",&rot(l.clone(),0.1),n,0.2140758,[0.1,0.3]);}
    let thin=vec![[0.0,0.0],[1000.0,0.0],[1000.0,1.0],[0.0,1.0]];
    run("thin",&rot(thin.clone(),0.0),16.0,1000.0/12.0*(1.0-0.00063024),[0.1,0.3]);
    run("thinrot",&rot(thin.clone(),0.6),16.0,1000.0/12.0*(1.0-0.00063024),[0.1,0.3]);
    let ann=|ri:f64|{let mk=|r:f64|Loop::new((0..7000).map(|k|{let t=k as f64/7000.0*std::f64::consts::TAU;[r*t.cos(),r*t.sin()]}).collect()); Outline{lumens:vec![Lumen{outer:mk(1.0),islands:vec![mk(ri)]}]}.oriented()};
    for ri in [0.5,0.1,0.01,0.002]{ let k:f64=ri; let e=std::f64::consts::PI/8.0*(1.0-k.powi(4)-(1.0-k*k).powi(2)/(1.0/k).ln()); for n in [64.0,128.0,0.0]{ run(&format!("ann {ri}"),&ann(ri),n,e,[0.3,0.4]); } }
    run("big sq rot",&rot(sq.clone(),0.2),1001.0,ex,[0.0,0.0]);
}
