//! The cases of the sensitivity study: what exactly moves in each.
//!
//! The lid is the top of the section: its line is the horizontal through the highest vertex. Walls are told
//! apart by the direction of their normal out of the fluid, within 45 degrees of up (lid), down (floor),
//! left or right; walls of islands count by their own direction. All lumens move together.

use crate::geometry::{Loop, Outline, Point};

use super::wall_motion::{EdgeMotion, LinearField, Measure, WallMotion, outward_normals};

/// Interruptions of a side wall by edges of another direction, up to this share of the height of its loop,
/// belong to the side wall: scallops, roughness.
const INTERRUPTION: f64 = 0.05;

/// A case that this section does not have.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct NoMotion {
    /// Name of the case.
    pub name: String,
    /// What would move.
    pub definition: String,
    /// Why nothing does.
    pub reason: String,
}

/// Direction of a wall, from its normal out of the fluid.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Facing {
    Lid,
    Floor,
    Left,
    Right,
}

impl Facing {
    /// Walls at exactly 45 degrees count as sides.
    fn of([x, y]: Point) -> Self {
        // Rounding of the normal must not decide about walls drawn at 45 degrees.
        let steep = y.abs() > x.abs() * (1.0 + 1e-9);
        match (steep, y > 0.0, x > 0.0) {
            (true, true, _) => Self::Lid,
            (true, false, _) => Self::Floor,
            (false, _, true) => Self::Right,
            (false, _, false) => Self::Left,
        }
    }
}

/// Every case for a section, in the order of the output.
///
/// - `outline`: oriented, without duplicate vertices
pub fn wall_motions(outline: &Outline) -> Vec<Result<WallMotion, NoMotion>> {
    let (low, high) = outline.bounds().unwrap_or_default();
    let middle = [0.5 * (low[0] + high[0]), high[1]];
    let facings: Vec<Vec<Facing>> = outline
        .loops()
        .map(|wall| outward_normals(wall).into_iter().map(Facing::of).collect())
        .collect();
    let section = Section { outline, facings };
    let [width, depth] = [high[0] - low[0], high[1] - low[1]];
    let mut all = section.stretches(middle, [width, depth]);
    all.extend(section.normal_motions());
    all.push(section.wall_angle());
    all.push(section.case(
        "lid_gap",
        "the lid, all walls facing up, rises as one piece; the walls beside it are extended along their lines",
        Measure::Length,
        |facing| (facing == Facing::Lid).then_some(EdgeMotion::Follows(0)),
        vec![LinearField::uniform([0.0, 1.0])],
    ));
    all.into_iter().map(checked).collect()
}

/// A motion, or why there is none.
fn checked(motion: WallMotion) -> Result<WallMotion, NoMotion> {
    if motion.moves() {
        Ok(motion)
    } else {
        Err(NoMotion {
            name: motion.name,
            definition: motion.definition,
            reason: "no wall of this section faces that way within 45 degrees".to_owned(),
        })
    }
}

/// The outline with the direction of every edge.
struct Section<'a> {
    outline: &'a Outline,
    facings: Vec<Vec<Facing>>,
}

impl Section<'_> {
    /// A case in which the direction of an edge decides how it moves.
    fn case(
        &self,
        name: &str,
        definition: &str,
        measure: Measure,
        motion: impl Fn(Facing) -> Option<EdgeMotion>,
        fields: Vec<LinearField>,
    ) -> WallMotion {
        WallMotion {
            name: name.to_owned(),
            definition: definition.to_owned(),
            measure,
            reference_length: None,
            normal_speed: 1.0,
            fields,
            edges: self
                .facings
                .iter()
                .map(|edges| {
                    let edges = edges.iter();
                    edges
                        .map(|&f| motion(f).unwrap_or(EdgeMotion::Rests))
                        .collect()
                })
                .collect(),
        }
    }

    /// Scale, depth and width: the whole section stretched.
    fn stretches(&self, middle: Point, [width, depth]: [f64; 2]) -> Vec<WallMotion> {
        [
            (
                "scale",
                "every length of the section grows alike",
                [1.0, 1.0],
                None,
            ),
            (
                "depth",
                "the section is stretched downwards from the lid line; depth is its height",
                [0.0, 1.0],
                Some(depth),
            ),
            (
                "width",
                "the section is stretched sideways from its middle; width is that of the whole section",
                [1.0, 0.0],
                Some(width),
            ),
        ]
        .into_iter()
        .map(|(name, definition, along, reference_length)| WallMotion {
            reference_length,
            ..self.case(
                name,
                definition,
                Measure::Relative,
                |_| Some(EdgeMotion::Follows(0)),
                vec![LinearField::stretching(middle, along)],
            )
        })
        .collect()
    }

    /// Film, over-etch and the four directions.
    fn normal_motions(&self) -> Vec<WallMotion> {
        let own = |name: &str, definition: &str, facing: Option<Facing>| {
            self.case(
                name,
                definition,
                Measure::Length,
                |f| {
                    facing
                        .is_none_or(|g| f == g)
                        .then_some(EdgeMotion::AlongNormal)
                },
                Vec::new(),
            )
        };
        vec![
            own(
                "over_etch",
                "every wall recedes from the fluid along its normal, islands too",
                None,
            ),
            WallMotion {
                normal_speed: -1.0,
                ..own(
                    "film",
                    "a film of even thickness grows on every wall into the fluid, on islands too",
                    None,
                )
            },
            own(
                "lid",
                "walls facing up recede along their normals",
                Some(Facing::Lid),
            ),
            own(
                "floor",
                "walls facing down recede along their normals",
                Some(Facing::Floor),
            ),
            own(
                "left",
                "walls facing left recede along their normals",
                Some(Facing::Left),
            ),
            own(
                "right",
                "walls facing right recede along their normals",
                Some(Facing::Right),
            ),
        ]
    }

    /// Side walls of outer loops turned about their upper ends, lower ends apart.
    fn wall_angle(&self) -> WallMotion {
        let mut motion = self.case(
            "wall_angle",
            "each side wall, a stretch of the outer wall facing left or right, turns about its upper end so \
             that its lower end moves outwards; lid, floor and islands stay",
            Measure::Angle,
            |_| None,
            Vec::new(),
        );
        let mut index = 0;
        for lumen in &self.outline.lumens {
            for side in [Facing::Left, Facing::Right] {
                let rate = if side == Facing::Left { -1.0 } else { 1.0 };
                for run in runs(&lumen.outer, &self.facings[index], side) {
                    let n = lumen.outer.points.len();
                    let ends = [run.0 % n, (run.0 + run.1) % n].map(|k| lumen.outer.points[k]);
                    let top = if ends[0][1] >= ends[1][1] {
                        ends[0]
                    } else {
                        ends[1]
                    };
                    let field = motion.fields.len() as u32;
                    motion.fields.push(LinearField::turning(top, rate));
                    for k in run.0..run.0 + run.1 {
                        motion.edges[index][k % n] = EdgeMotion::Follows(field);
                    }
                }
            }
            index += 1 + lumen.islands.len();
        }
        motion
    }
}

/// Stretches of edges of one direction with their short interruptions: first edge and number of edges.
fn runs(wall: &Loop, facings: &[Facing], side: Facing) -> Vec<(usize, usize)> {
    let n = facings.len();
    // Start behind an edge that is clearly not of this side, so that no stretch runs over the end.
    let Some(start) = (0..n).find(|&k| facings[k] == side && facings[(k + n - 1) % n] != side)
    else {
        return Vec::new();
    };
    let ys = wall.points.iter().map(|p| p[1]);
    let height = ys.clone().fold(f64::NEG_INFINITY, f64::max) - ys.fold(f64::INFINITY, f64::min);
    let lengths: Vec<f64> = wall
        .edges()
        .map(|(a, b)| (b[0] - a[0]).hypot(b[1] - a[1]))
        .collect();
    let mut found: Vec<(usize, usize)> = Vec::new();
    let mut gap = f64::INFINITY;
    for k in start..start + n {
        if facings[k % n] != side {
            gap += lengths[k % n];
            continue;
        }
        match found.last_mut() {
            Some(run) if gap <= INTERRUPTION * height => run.1 = k + 1 - run.0,
            _ => found.push((k, 1)),
        }
        gap = 0.0;
    }
    // The last stretch may go on in the first.
    if let [first, .., last] = found[..]
        && gap <= INTERRUPTION * height
    {
        found.pop();
        found[0] = (last.0, first.0 + n + first.1 - last.0);
    }
    found
}
