//! Which way each edge of the wall faces, and where stretches with names begin and end.

use crate::geometry::{Loop, Lumen, Outline, Point, WallStretch};

use super::wall_motion::outward_normals;

/// Stretch ends nearer than this share of the loop to a vertex fall on it.
const AT_VERTEX: f64 = 1e-9;

/// Direction of a wall, from its normal out of the fluid.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Facing {
    Lid,
    Floor,
    Left,
    Right,
}

impl Facing {
    /// Lid and floor keep a wall at 45 degrees, in spite of rounding.
    fn of([x, y]: Point) -> Self {
        match (y.abs() >= x.abs() - 1e-9, y > 0.0, x > 0.0) {
            (true, true, _) => Self::Lid,
            (true, false, _) => Self::Floor,
            (false, _, true) => Self::Right,
            (false, _, false) => Self::Left,
        }
    }
}

/// Arc lengths of the vertices from the first, m; the length of the loop closes the list.
pub(super) fn vertex_arcs(wall: &Loop) -> Vec<f64> {
    let mut arcs = vec![0.0];
    let mut total = 0.0;
    for (a, b) in wall.edges() {
        total += (b[0] - a[0]).hypot(b[1] - a[1]);
        arcs.push(total);
    }
    arcs
}

/// Direction of every edge; one shorter than `chord` (m) counts with the wall around it over that length,
/// since a digitised wall zigzags.
pub(super) fn facings(wall: &Loop, chord: f64) -> Vec<Facing> {
    let arcs = vertex_arcs(wall);
    let normals = outward_normals(wall).into_iter().enumerate();
    normals
        .map(|(k, own)| {
            if arcs[k + 1] - arcs[k] >= chord {
                return Facing::of(own);
            }
            let middle = 0.5 * (arcs[k] + arcs[k + 1]);
            let [a, b] = [-0.5, 0.5].map(|half| place(wall, &arcs, middle + half * chord));
            let (x, y) = (b[0] - a[0], b[1] - a[1]);
            let length = x.hypot(y);
            Facing::of(if length > 0.0 {
                [y / length, -x / length]
            } else {
                own
            })
        })
        .collect()
}

/// Place at an arc length, m.
fn place(wall: &Loop, arcs: &[f64], arc_length: f64) -> Point {
    let n = wall.points.len();
    let s = arc_length.rem_euclid(arcs[n]);
    let edge = arcs.partition_point(|&a| a <= s).clamp(1, n) - 1;
    let (a, b) = (wall.points[edge], wall.points[(edge + 1) % n]);
    let length = arcs[edge + 1] - arcs[edge];
    let share = if length > 0.0 {
        (s - arcs[edge]) / length
    } else {
        0.0
    };
    [0, 1].map(|axis| a[axis] + share * (b[axis] - a[axis]))
}

/// The outline with a vertex at every end of a named stretch.
pub(super) fn with_stretch_ends(outline: &Outline, walls: &[WallStretch]) -> Outline {
    let mut index = 0;
    let mut next = |wall: &Loop| {
        let own = walls.iter().filter(|stretch| stretch.loop_index == index);
        let ends: Vec<f64> = own.flat_map(|stretch| [stretch.from, stretch.to]).collect();
        index += 1;
        with_vertices(wall, &ends)
    };
    Outline {
        lumens: outline
            .lumens
            .iter()
            .map(|lumen| Lumen {
                outer: next(&lumen.outer),
                islands: lumen.islands.iter().map(&mut next).collect(),
            })
            .collect(),
    }
}

fn with_vertices(wall: &Loop, ends: &[f64]) -> Loop {
    let arcs = vertex_arcs(wall);
    let total = arcs[arcs.len() - 1];
    let mut all: Vec<(f64, Point)> = arcs.iter().copied().zip(wall.points.clone()).collect();
    for end in ends {
        let s = end.rem_euclid(total);
        if arcs.iter().all(|a| (a - s).abs() > AT_VERTEX * total) {
            all.push((s, place(wall, &arcs, s)));
        }
    }
    all.sort_by(|a, b| a.0.total_cmp(&b.0));
    Loop::new(all.into_iter().map(|(_, p)| p).collect())
}

/// Whether the middle of each edge of a loop lies on a stretch of it.
pub(super) fn on_stretch(wall: &Loop, stretch: &WallStretch) -> Vec<bool> {
    let arcs = vertex_arcs(wall);
    let total = arcs[arcs.len() - 1];
    arcs.windows(2)
        .map(|ends| {
            let beyond = 0.5 * (ends[0] + ends[1]) - stretch.from;
            beyond.rem_euclid(total) < stretch.to - stretch.from
        })
        .collect()
}
