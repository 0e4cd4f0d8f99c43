use etchwise::{geometry::*, flow::*};
fn rot(p:Vec<[f64;2]>,a:f64)->Vec<[f64;2]>{p.into_iter().map(|q|[q[0]*a.cos()-q[1]*a.sin(),q[0]*a.sin()+q[1]*a.cos()]).collect()}
fn main(){
    let l=vec![[0.0,0.0],[2.0,0.0],[2.0,1.0],[1.0,1.0],[1.0,2.0],[0.0,2.0]];
    for a in [0.0,0.1,0.3,0.7854,1.2] { for n in [64.0,128.0,256.0,512.0] {
        let p=rot(l.clone(),a); let o=Outline::single(p.clone());
        let d=2.0*largest_inscribed_circle(&o.lumens[0]).radius; let h=d/n; let (lo,_)=o.bounds().unwrap();
        let c=p[3]; let f=|x:f64|{ let t=x/h; let up=(t/8.0).ceil()*8.0; up-t };
        let off=[f(c[0]-lo[0]),f(c[1]-lo[1])];
        let s=solve_outline(&o,&SolveOptions{cells_across:Some(n),grid_offset:None,..Default::default()}).unwrap().flow;
        println!("a={a} n={n} plain {:.7} best {:.7} est {:.1e}",s.conductance_finest_grid,s.conductance.value,s.conductance.relative());
    }}
}
