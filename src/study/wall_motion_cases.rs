//! The cases of the sensitivity study: what exactly moves in each.
//!
//! The lid is the top of the section: its line is the horizontal through the highest vertex. Walls are told
//! apart by the direction of their normal out of the fluid, within 45 degrees of up (lid), down (floor),
//! left or right; walls of islands count by their own direction. Walls with names of their own move in
//! cases of their own as well. All lumens move together.

use crate::geometry::{Loop, Outline, Point, WallStretch};

use super::facing::{Facing, facings, on_stretch, with_stretch_ends};
use super::wall_motion::{EdgeMotion, LinearField, Measure, WallMotion};

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

/// The cases of a section with the outline that they move.
#[derive(Debug, Clone, PartialEq)]
pub struct WallMotions {
    /// The outline, with a vertex at every end of a named stretch.
    pub outline: Outline,
    /// The cases in the order of the output.
    pub cases: Vec<Result<WallMotion, NoMotion>>,
}

/// Every case for a section.
///
/// - `outline`: oriented, without duplicate vertices
/// - `walls`: stretches of it with names
/// - `chord`: length over which the direction of edges shorter than it is taken, m; the node distance of the
///   grid, or zero for that of every edge
pub fn wall_motions(outline: &Outline, walls: &[WallStretch], chord: f64) -> WallMotions {
    let outline = with_stretch_ends(outline, walls);
    let (low, high) = outline.bounds().unwrap_or_default();
    let middle = [0.5 * (low[0] + high[0]), high[1]];
    let section = Section {
        outline: &outline,
        facings: outline.loops().map(|wall| facings(wall, chord)).collect(),
    };
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
    all.extend(walls.iter().map(|stretch| section.named(stretch)));
    WallMotions {
        cases: all.into_iter().map(checked).collect(),
        outline,
    }
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
            stretch: None,
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

    /// A stretch with a name of its own.
    fn named(&self, stretch: &WallStretch) -> WallMotion {
        let mut motion = self.case(
            &format!("wall {}", stretch.name),
            "the wall of that name recedes along its normals",
            Measure::Length,
            |_| None,
            Vec::new(),
        );
        let wall = self.outline.loops().nth(stretch.loop_index);
        if let (Some(edges), Some(wall)) = (motion.edges.get_mut(stretch.loop_index), wall) {
            for (edge, inside) in edges.iter_mut().zip(on_stretch(wall, stretch)) {
                if inside {
                    *edge = EdgeMotion::AlongNormal;
                }
            }
        }
        motion.stretch = Some(stretch.clone());
        motion
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
