//! temporary, replaced by merge
use super::outline::{Lumen, Point};
/// Circle.
#[derive(Debug, Clone, Copy)]
pub struct Circle {
    /// c
    pub centre: Point,
    /// r
    pub radius: f64,
}
/// temp
pub fn largest_inscribed_circle(lumen: &Lumen) -> Circle {
    let o = super::Outline {
        lumens: vec![lumen.clone()],
    };
    let (l, h) = o.bounds().unwrap_or(([0.0; 2], [0.0; 2]));
    let mut best = Circle {
        centre: l,
        radius: 0.0,
    };
    for i in 1..40 {
        for j in 1..40 {
            let p = [
                l[0] + (h[0] - l[0]) * i as f64 / 40.0,
                l[1] + (h[1] - l[1]) * j as f64 / 40.0,
            ];
            let mut d = f64::INFINITY;
            let mut inside = false;
            for wall in o.loops() {
                for (a, b) in wall.edges() {
                    if (a[1] > p[1]) != (b[1] > p[1])
                        && p[0] < a[0] + (p[1] - a[1]) * (b[0] - a[0]) / (b[1] - a[1])
                    {
                        inside = !inside;
                    }
                    let (vx, vy) = (b[0] - a[0], b[1] - a[1]);
                    let t = (((p[0] - a[0]) * vx + (p[1] - a[1]) * vy) / (vx * vx + vy * vy))
                        .clamp(0.0, 1.0);
                    d = d.min((a[0] + t * vx - p[0]).hypot(a[1] + t * vy - p[1]));
                }
            }
            if inside && d > best.radius {
                best = Circle {
                    centre: p,
                    radius: d,
                };
            }
        }
    }
    best
}
