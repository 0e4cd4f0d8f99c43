//! Numbers beside the wall of a sensitivity picture, placed where they cover nothing.

use super::drawing::TextSize;
use super::label_box::LabelBox;
use super::picture_layout::Layout;
use crate::flow::{CurvePoint, LoopCurve, PointKind, WallCurve};
use crate::geometry::Point;

/// Most numbers on a picture.
const MOST_LABELS: usize = 12;
/// Places tried on a loop without corners.
const PLACES_ON_LOOP: usize = 8;
/// Distance of a number from the middle of the coloured line, px.
const AWAY: f64 = 18.0;
/// Free space around a number, px.
const FREE: f64 = 8.0;

/// One number on the page.
pub(super) struct Label {
    pub(super) text: String,
    /// Middle of the text, px.
    pub(super) middle: Point,
    /// Line from the wall to the number, px.
    pub(super) leader: [Point; 2],
}

/// Numbers at the largest value of each stretch between corners, the longest stretches first, or evenly spread
/// over a loop without corners; each inside the fluid, else outside, else left out.
///
/// - `width`: of the page, px
/// - `write`: the number for a shear
pub(super) fn labels(
    curve: &WallCurve,
    layout: &Layout,
    width: f64,
    write: &dyn Fn(f64) -> String,
) -> Vec<Label> {
    let wall: Vec<Point> = curve
        .loops
        .iter()
        .flat_map(|l| &l.points)
        .map(|p| layout.page(p.at))
        .collect();
    let mut placed: Vec<(LabelBox, Label)> = Vec::new();
    let mut candidates: Vec<(f64, &CurvePoint)> = curve.loops.iter().flat_map(places).collect();
    candidates.sort_by(|a, b| b.0.total_cmp(&a.0));
    for (_, point) in candidates {
        if placed.len() >= MOST_LABELS {
            break;
        }
        let text = write(point.shear_per_gradient);
        let half = [0.5 * TextSize::Small.width(&text), 6.0];
        let at = layout.page(point.at);
        // A normal on a stretched page is stretched the other way.
        let [nx, ny] = [
            point.normal[0] / layout.scale[0],
            -point.normal[1] / layout.scale[1],
        ];
        let size = nx.hypot(ny);
        let [nx, ny] = [nx / size, ny / size];
        let reach = AWAY + nx.abs() * half[0] + ny.abs() * half[1];
        let found = [-1.0, 1.0].into_iter().find_map(|side| {
            let bounds = LabelBox {
                middle: [at[0] + side * nx * reach, at[1] + side * ny * reach],
                half,
            };
            let is_free = !wall.iter().any(|&p| bounds.holds(p, FREE))
                && !placed.iter().any(|(other, _)| other.meets(&bounds, FREE))
                && bounds.middle[0] - half[0] > 2.0
                && bounds.middle[0] + half[0] < width - 2.0;
            is_free.then_some((side, bounds))
        });
        if let Some((side, bounds)) = found {
            let along =
                |distance: f64| [at[0] + side * nx * distance, at[1] + side * ny * distance];
            placed.push((
                bounds,
                Label {
                    text,
                    middle: bounds.middle,
                    leader: [along(6.0), along(AWAY - 4.0)],
                },
            ));
        }
    }
    placed.into_iter().map(|(_, label)| label).collect()
}

/// Places worth a number with the length of wall they stand for.
fn places(curve: &LoopCurve) -> Vec<(f64, &CurvePoint)> {
    let points = &curve.points;
    let n = points.len();
    let Some(corner) = points.iter().position(|p| p.kind != PointKind::Regular) else {
        let count = PLACES_ON_LOOP.min(n);
        let share = curve.length() / PLACES_ON_LOOP as f64;
        return (0..count)
            .map(|k| (share, &points[k * n / count]))
            .collect();
    };
    let turned: Vec<&CurvePoint> = (0..n).map(|k| &points[(corner + k) % n]).collect();
    turned
        .split(|p| p.kind != PointKind::Regular)
        .filter_map(|run| {
            let (first, last) = (run.first()?, run.last()?);
            let length = (last.arc_length - first.arc_length).rem_euclid(curve.length());
            let largest = run
                .iter()
                .max_by(|a, b| a.shear_per_gradient.total_cmp(&b.shear_per_gradient))?;
            // Near a singular corner the curve has no bound; the middle says more.
            let singular = |p: &CurvePoint| p.kind == PointKind::SingularCorner;
            let next_to_singular = points.iter().any(|p| {
                singular(p)
                    && [first, last]
                        .iter()
                        .any(|end| (end.at[0] - p.at[0]).hypot(end.at[1] - p.at[1]) < 0.3 * length)
            });
            let chosen = if next_to_singular {
                run.get(run.len() / 2)?
            } else {
                largest
            };
            Some((length, *chosen))
        })
        .collect()
}
