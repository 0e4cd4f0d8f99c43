//! The lid over a groove: flat, sagging, or the other half of the channel.

use super::groove_problem::GrooveProblem;
use super::grooves::{Edges, Heights};
use super::section_options::LidChoice;
use super::wall_curves::Line;
use crate::geometry::Point;

/// Segments of a sagging lid: an arc of 256 chords is off by 1.5e-5 of its sag.
const ARC_SEGMENTS: u32 = 256;

/// The line on which a flat lid lies.
pub(super) fn line(choice: LidChoice, edges: &Edges, heights: Heights<'_>) -> Line {
    let level = |x: f64, z: f64| Line {
        from: [x, z],
        slope: 0.0,
    };
    match choice {
        LidChoice::Both => Line::through(edges),
        LidChoice::Left => level(edges.left.x, edges.left.z),
        LidChoice::Right => level(edges.right.x, edges.right.z),
        LidChoice::Fit => {
            let lands = [&edges.left_land, &edges.right_land];
            let points = lands.into_iter().flat_map(|land| {
                let x = heights.x.get(land.clone()).unwrap_or_default();
                x.iter()
                    .zip(heights.z.get(land.clone()).unwrap_or_default())
            });
            least_squares(points.map(|(x, z)| [*x, *z])).unwrap_or_else(|| Line::through(edges))
        }
    }
}

/// The line of least squares of vertical distances; `None` for points at one place.
fn least_squares(points: impl Iterator<Item = Point> + Clone) -> Option<Line> {
    let count = points.clone().count() as f64;
    let sum = points
        .clone()
        .fold([0.0; 2], |s, p| [s[0] + p[0], s[1] + p[1]]);
    let middle = sum.map(|s| s / count);
    let (mut square, mut product) = (0.0, 0.0);
    for [x, z] in points {
        square += (x - middle[0]).powi(2);
        product += (x - middle[0]) * (z - middle[1]);
    }
    (square > 0.0).then(|| Line {
        from: middle,
        slope: product / square,
    })
}

/// How a lid differs from its line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct LidForm {
    /// Height over the line, m.
    pub(super) gap: f64,
    /// How far its middle hangs below, m.
    pub(super) sag: f64,
}

/// The lower face of a lid over a stretch that holds the groove: an arc from edge to edge, straight beyond.
///
/// An arc of sag `s` over half a chord `c` has the radius `(c^2 + s^2) / (2 s)`.
///
/// # Errors
/// [`GrooveProblem::SagTooLarge`] when the arc would be more than a half circle.
pub(super) fn face(
    line: Line,
    form: LidForm,
    edges: &Edges,
    stretch: [f64; 2],
    groove: usize,
) -> Result<Vec<Point>, GrooveProblem> {
    let on_line = |x: f64, below: f64| [x, line.at(x) + (form.gap - below)];
    let (left, right) = (edges.left.x, edges.right.x);
    let half = 0.5 * (right - left);
    let mut points = vec![on_line(stretch[0].min(left), 0.0)];
    if form.sag.abs() > half {
        return Err(GrooveProblem::SagTooLarge {
            groove,
            sag: form.sag,
            width: right - left,
        });
    }
    if form.sag.abs() > 0.0 {
        let sag = form.sag.abs();
        let radius = 0.5 * (half * half / sag + sag);
        // Half the angle of the arc, from its sine and cosine over the radius.
        let opening = half.atan2(radius - sag);
        for index in 0..=ARC_SEGMENTS {
            let along = 2.0 * f64::from(index) / f64::from(ARC_SEGMENTS) - 1.0;
            let u = match index {
                0 => -half,
                ARC_SEGMENTS => half,
                _ => radius * (along * opening).sin(),
            };
            // sqrt(R^2 - u^2) - (R - s) without its cancellation; zero at both edges.
            let below = (half - u) * (half + u)
                / ((radius * radius - u * u).max(0.0).sqrt() + (radius - sag));
            let x = match index {
                0 => left,
                ARC_SEGMENTS => right,
                _ => left + half + u,
            };
            let below = if below.is_finite() { below } else { 0.0 };
            points.push(on_line(x, form.sag.signum() * below));
        }
    }
    points.push(on_line(stretch[1].max(right), 0.0));
    points.dedup_by(|later, earlier| later[0] <= earlier[0]);
    Ok(points)
}

/// The other half over this groove: its walls turned over and mirrored, its middle `offset` to the
/// right of the middle of this groove, its lands on the line.
///
/// - `walls`: curve of the other half, and the line through its edges
/// - `middles`: middle of this groove and of the other, m
pub(super) fn other_half(
    walls: &[Point],
    land: Line,
    lid: (Line, f64),
    middles: [f64; 2],
    offset: f64,
) -> Vec<Point> {
    let (line, gap) = lid;
    let turned = |&[x, z]: &Point| {
        let x_here = middles[0] + offset + (middles[1] - x);
        let depth = (land.at(x) - z).max(0.0);
        [x_here, line.at(x_here) + gap + depth]
    };
    walls.iter().rev().map(turned).collect()
}

/// A curve continued on a line up to both ends of a stretch.
pub(super) fn continued(
    mut curve: Vec<Point>,
    on: impl Fn(f64) -> f64,
    stretch: [f64; 2],
) -> Vec<Point> {
    let ends = |curve: &Vec<Point>| curve.first().zip(curve.last()).map(|(a, b)| [a[0], b[0]]);
    let Some([from, to]) = ends(&curve) else {
        return curve;
    };
    if stretch[0] < from {
        curve.splice(0..0, [[stretch[0], on(stretch[0])], [from, on(from)]]);
    }
    if stretch[1] > to {
        curve.extend([[to, on(to)], [stretch[1], on(stretch[1])]]);
    }
    curve.dedup();
    curve
}
