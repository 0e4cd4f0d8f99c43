//! Integrals of the squared flux of the upper bound over whole and cut cells.

use crate::geometry::Point;
use crate::grid::{EAST, NORTH, SOUTH, WEST};

/// Integrals over one region in cell coordinates.
#[derive(Debug, Clone, Copy)]
pub(super) struct Moments {
    pub(super) area: f64,
    first: Point,
    second: Point,
}

/// - `polygons`: outer boundary and holes of the region, fluid on the left
pub(super) fn region_moments<'a>(polygons: impl Iterator<Item = &'a [Point]>) -> Moments {
    let mut m = Moments {
        area: 0.0,
        first: [0.0; 2],
        second: [0.0; 2],
    };
    for polygon in polygons {
        let Some(mut a) = polygon.last() else {
            continue;
        };
        for b in polygon {
            let cross = a[0] * b[1] - a[1] * b[0];
            m.area += cross;
            for axis in 0..2 {
                m.first[axis] += cross * (a[axis] + b[axis]);
                m.second[axis] +=
                    cross * (a[axis] * a[axis] + a[axis] * b[axis] + b[axis] * b[axis]);
            }
            a = b;
        }
    }
    Moments {
        area: m.area / 2.0,
        first: m.first.map(|v| v / 6.0),
        second: m.second.map(|v| v / 12.0),
    }
}

/// Integral of `abs(s)^2` over a region with the given side values.
pub(super) fn energy(sides: [f64; 4], m: &Moments) -> f64 {
    let part = |low: f64, high: f64, axis: usize| {
        let slope = high - low;
        low * low * m.area + 2.0 * low * slope * m.first[axis] + slope * slope * m.second[axis]
    };
    part(sides[WEST], sides[EAST], 0) + part(sides[SOUTH], sides[NORTH], 1)
}

/// The same over a whole cell whose sides may also vary along themselves.
///
/// With side values `W`, `E`, `S`, `N` and variations `w`, `e`, `s`, `n` (difference over a side's length)
/// `s_x = W + (E - W) x + (y - 1/2) (w + (e - w) x) + (n - s) x (1 - x) / 2`, and `s_y` alike. The variations
/// change neither the divergence at any point nor the mean on any side.
pub(super) fn whole_energy(sides: [f64; 4], along: [f64; 4]) -> f64 {
    let [south, east, north, west] = sides;
    let [s, e, n, w] = along;
    let part = |low: f64, high: f64, a: f64, b: f64, bulge: f64| {
        (low * low + low * high + high * high) * (1.0 / 3.0)
            + (a * a + a * b + b * b) * (1.0 / 36.0)
            + bulge * ((low + high) * (1.0 / 12.0) + bulge * (1.0 / 120.0))
    };
    part(west, east, w, e, n - s) + part(south, north, s, n, e - w)
}
