//! From a corrected trace to closed sections.
//!
//! The surface is the trace as read or, with a stated tip, the highest surface that reads like it (see
//! `tip`: the wall lies at or below it). The section is the space between that surface and the lid; what
//! stands above the line through both edges (an overshoot of the instrument, dust) is cut off at that line.
//! A lid above the lands ends at the edges: the gap beside the groove is solid. A lid that touches the floor
//! leaves several lumens; those below [`SLIVER`] of the area are left out, which moves K by less than a
//! millionth.
//!
//! Where flanks show the tip, the smallest section has the surface as its wall, the largest one walls that
//! fall straight down from the outermost touched samples (see `wall_curves` for what that takes for
//! granted); the section itself lies between. For a trace that was turned over (a master, a cast) it is the other
//! way round: the surface makes the largest section, upright walls from the ends of the floor the smallest. All
//! three are drawn by one routine (`closing`) that puts each inside the next exactly.

use super::closing::{Layer, Part, close};
use super::corrected::CorrectedTrace;
use super::groove_problem::GrooveProblem;
use super::groove_section::{GrooveSection, LidAlternative, TipFlank};
use super::grooves::{Edges, Groove};
use super::half::{Grounds, Half, Walls};
use super::lid::{self, LidForm};
use super::profile::{Profile, Zone};
use super::section_notes;
use super::section_options::{LidChoice, SectionOptions};
use super::trench_numbers::TrenchNumbers;
use super::wall_curves::{Line, WallCurves};
use crate::geometry::{Loop, Lumen, Outline, Point};
use crate::intake::section_reach::{Reach, ReachSection};

/// Lumens smaller than this fraction of the area are left out.
pub const SLIVER: f64 = 1e-3;

/// Lands that differ by more than this fraction of the depth make the lid a question.
pub const LANDS_DIFFER: f64 = 0.005;

/// The grooves of a corrected trace as closed sections, in order along the trace.
///
/// Grooves that run off the trace or have too few samples are named in a warning of every section. Positions of
/// the outlines are those of the trace. Costs O(n log n) for `n` samples.
///
/// # Errors
/// [`GrooveProblem`]: no lands or grooves, a groove that cannot be closed, a lid that leaves nothing.
///
/// # Examples
/// ```
/// use etchwise::intake::{CorrectedTrace, Profile, SectionOptions, Zone, sections};
/// // An invented groove: 40 um wide and 10 um deep at both ends of a floor of 20 um, on lands of 20 um.
/// let corners = [(0.0, 0.0), (20.0, 0.0), (30.0, -10.0), (50.0, -10.0), (60.0, 0.0), (80.0, 0.0)];
/// let height = |x: f64| {
///     let pair = corners.windows(2).find(|pair| x <= pair[1].0).unwrap();
///     let ((a, from), (b, to)) = (pair[0], pair[1]);
///     from + (x - a) / (b - a) * (to - from)
/// };
/// let x: Vec<f64> = (0..=80).map(f64::from).collect();
/// let profile = Profile {
///     z: x.iter().map(|&x| 1e-6 * height(x)).collect(),
///     x: x.iter().map(|x| 1e-6 * x).collect(),
/// };
/// let land = |from: f64, to: f64| Zone { from: from * 1e-6, to: to * 1e-6 };
/// let lands = vec![land(0.0, 18.0), land(62.0, 80.0)];
/// let trace = CorrectedTrace { profile, lands, ..CorrectedTrace::default() };
/// let found = sections(&trace, &SectionOptions::default())?;
/// assert!((found[0].outline.area() / 300e-12 - 1.0).abs() < 1e-12);
/// assert!((found[0].numbers.middle_width / 30e-6 - 1.0).abs() < 1e-12);
/// # Ok::<(), etchwise::intake::GrooveProblem>(())
/// ```
pub fn sections(
    trace: &CorrectedTrace,
    options: &SectionOptions,
) -> Result<Vec<GrooveSection>, GrooveProblem> {
    options.check()?;
    let ground = Half::new("trace", trace, options.tip)?;
    let other = match &options.lid_trace {
        Some(lid) => Some(Half::new("lid trace", lid, options.tip)?),
        None => None,
    };
    let grooves = chosen(&ground, options.groove)?;
    let mut found = Vec::with_capacity(grooves.len());
    for (groove, edges) in grooves {
        options.check_simplify(groove.depth)?;
        let opposite = match &other {
            Some(other) => Some(opposite(&ground, other, groove, options)?),
            None => None,
        };
        let drawing = Drawing {
            ground: &ground,
            groove,
            options,
            walls: ground.walls(groove, edges, options),
            opposite,
        };
        found.push(drawing.section()?);
    }
    Ok(found)
}

/// The grooves to close, with their edges.
fn chosen<'a>(
    half: &'a Half<'_>,
    number: Option<usize>,
) -> Result<Vec<(&'a Groove, &'a Edges)>, GrooveProblem> {
    let grooves = &half.grooves;
    if let Some(number) = number {
        let groove = number.checked_sub(1).and_then(|index| grooves.get(index));
        let groove = groove.ok_or(GrooveProblem::GrooveNumber {
            number,
            count: grooves.len(),
        })?;
        return match &groove.edges {
            Ok(edges) => Ok(vec![(groove, edges)]),
            Err(why) => Err(GrooveProblem::NotUsable { why: why.clone() }),
        };
    }
    let usable = grooves
        .iter()
        .filter_map(|g| g.edges.as_ref().ok().map(|e| (g, e)));
    let usable: Vec<_> = usable.collect();
    match grooves.iter().find_map(|g| g.edges.as_ref().err()) {
        Some(first) if usable.is_empty() => Err(GrooveProblem::NoneUsable {
            first: first.clone(),
        }),
        _ => Ok(usable),
    }
}

/// Walls of the groove of the other half that lies over a groove: the only one, or, the half being turned
/// over, the one with the same number counted from the other end.
fn opposite(
    ground: &Half<'_>,
    other: &Half<'_>,
    groove: &Groove,
    options: &SectionOptions,
) -> Result<Walls, GrooveProblem> {
    let (count, lid) = (ground.grooves.len(), other.grooves.len());
    let index = match lid {
        1 => Some(0),
        _ if lid == count => count.checked_sub(groove.number),
        _ => None,
    };
    let over = index.and_then(|index| other.grooves.get(index));
    let over = over.ok_or(GrooveProblem::LidGrooves { lid, count })?;
    match &over.edges {
        Ok(edges) => Ok(other.walls(over, edges, options)),
        Err(why) => Err(GrooveProblem::NotUsable {
            why: format!("lid trace: {why}"),
        }),
    }
}

/// Everything that makes one section.
pub(super) struct Drawing<'a> {
    pub(super) ground: &'a Half<'a>,
    pub(super) groove: &'a Groove,
    pub(super) options: &'a SectionOptions,
    pub(super) walls: Walls,
    pub(super) opposite: Option<Walls>,
}

/// Which walls of the two halves.
type Choice = fn(&WallCurves) -> Option<&Vec<Point>>;
const UPRIGHT: Choice = |curves| curves.upright.as_ref();
const STATED: Choice = |curves| Some(&curves.stated);
const AS_READ: Choice = |curves| Some(&curves.as_read);

/// The parts of the section and of its neighbours.
struct Drawn {
    layers: Vec<Layer>,
    parts: Vec<Vec<Part>>,
    /// Index of the section's layer.
    own: usize,
}

impl Drawing<'_> {
    fn section(&self) -> Result<GrooveSection, GrooveProblem> {
        let number = self.groove.number;
        let drawn = self.drawn(self.options.lid, self.options.lid_gap)?;
        let kept = kept_parts(&drawn.parts[drawn.own]);
        if kept.is_empty() {
            return Err(GrooveProblem::NoArea { groove: number });
        }
        if self.options.lid_gap < 0.0 && kept.len() > 1 {
            let higher = self.drawn(self.options.lid, 0.0)?;
            if kept_parts(&higher.parts[higher.own]).len() < kept.len() {
                return Err(GrooveProblem::LidCuts {
                    groove: number,
                    lower: -self.options.lid_gap,
                    lumens: kept.len(),
                });
            }
        }
        let (outline, reach) = self.outlines(&drawn, &kept)?;
        let numbers =
            TrenchNumbers::new(&self.walls.curves.stated, Line::through(&self.walls.edges))
                .ok_or(GrooveProblem::NoArea { groove: number })?;
        let left_out = drawn.parts[drawn.own].len() - kept.len();
        let edges = &self.walls.edges;
        let samples = edges.left_land.start..edges.right_land.end;
        let heights = self.ground.heights();
        let surface = Profile {
            x: heights.x.get(samples.clone()).unwrap_or_default().to_vec(),
            z: heights.z.get(samples.clone()).unwrap_or_default().to_vec(),
        };
        let inside = |index: usize| {
            self.walls
                .flanks
                .iter()
                .any(|f| f.from < index && index < f.to)
        };
        let flank = |f: &super::flanks::Flank| TipFlank {
            zone: Zone {
                from: heights.x[f.from],
                to: heights.x[f.to],
            },
            angle: f.angle,
            is_bottomless: f.is_bottomless,
        };
        Ok(GrooveSection {
            number,
            zone: Zone {
                from: edges.left.x,
                to: edges.right.x,
            },
            reach,
            lid: lid_over(&drawn.layers[drawn.own].upper, &kept),
            lid_alternatives: self.alternatives(),
            surface,
            is_touched: samples.map(|index| !inside(index)).collect(),
            flanks: self.walls.flanks.iter().map(flank).collect(),
            steps: section_notes::steps(self, &numbers, &outline, left_out),
            warnings: section_notes::warnings(self, &numbers),
            numbers,
            outline,
        })
    }

    /// Whether some flank of either half shows the tip.
    pub(super) fn has_tip_flanks(&self) -> bool {
        self.halves().any(|walls| !walls.flanks.is_empty())
    }

    /// Whether the floor of either half was not touched.
    pub(super) fn is_bottomless(&self) -> bool {
        self.halves().any(|walls| walls.curves.upright.is_none())
    }

    /// Why flanks count as tip shape.
    pub(super) fn grounds(&self) -> Grounds {
        self.walls.grounds
    }

    pub(super) fn halves(&self) -> impl Iterator<Item = &Walls> {
        std::iter::once(&self.walls).chain(&self.opposite)
    }

    /// Difference of the two lands in height, m.
    pub(super) fn step_of_lands(&self) -> f64 {
        self.walls.edges.right.z - self.walls.edges.left.z
    }

    /// Outermost, stated and as-read section under a lid, without those that are the same.
    fn drawn(&self, lid: LidChoice, gap: f64) -> Result<Drawn, GrooveProblem> {
        let upright = self.has_tip_flanks() && !self.is_bottomless();
        let as_read = upright && self.halves().any(|w| w.curves.stated != w.curves.as_read);
        let mut choices = [(upright, UPRIGHT), (true, STATED), (as_read, AS_READ)];
        if self.ground.is_inverted {
            choices.reverse();
        }
        let has_outer = choices[0].0;
        let mut layers = Vec::new();
        for (_, choice) in choices.into_iter().filter(|(wanted, _)| *wanted) {
            layers.extend(self.layer(choice, lid, gap)?);
        }
        let own = usize::from(has_outer).min(layers.len().saturating_sub(1));
        let parts = close(&layers);
        Ok(Drawn { layers, parts, own })
    }

    /// Walls and lid as two curves; `None` where there are no such walls.
    fn layer(
        &self,
        choice: Choice,
        lid: LidChoice,
        gap: f64,
    ) -> Result<Option<Layer>, GrooveProblem> {
        let Some(lower) = choice(&self.walls.curves) else {
            return Ok(None);
        };
        let edges = &self.walls.edges;
        let (base, line) = (
            Line::through(edges),
            lid::line(lid, edges, self.ground.heights()),
        );
        let ends = |curve: &[Point]| {
            let x = |p: Option<&Point>| p.map_or(edges.left.x, |p| p[0]);
            [x(curve.first()), x(curve.last())]
        };
        let Some(opposite) = &self.opposite else {
            let form = LidForm {
                gap,
                sag: self.options.lid_sag,
            };
            return Ok(Some(Layer {
                upper: lid::face(line, form, edges, ends(lower), self.groove.number)?,
                lower: lower.clone(),
            }));
        };
        let Some(over) = choice(&opposite.curves) else {
            return Ok(None);
        };
        let middle = |e: &Edges| 0.5 * (e.left.x + e.right.x);
        let upper = lid::other_half(
            over,
            Line::through(&opposite.edges),
            (line, gap),
            [middle(edges), middle(&opposite.edges)],
            self.options.lid_offset,
        );
        let (below, above) = (ends(lower), ends(&upper));
        let stretch = [below[0].min(above[0]), below[1].max(above[1])];
        Ok(Some(Layer {
            lower: lid::continued(lower.clone(), |x| base.at(x), stretch),
            upper: lid::continued(upper, |x| line.at(x) + gap, stretch),
        }))
    }

    /// The section and what lies around it.
    fn outlines(
        &self,
        drawn: &Drawn,
        kept: &[&Part],
    ) -> Result<(Outline, Option<Reach>), GrooveProblem> {
        let has_outer = drawn.own > 0;
        let within = |part: &Part, around: &Part| {
            around.span[0] <= part.span[0] && part.span[1] <= around.span[1]
        };
        let outer_parts: Vec<&Part> = if has_outer {
            let total: f64 = drawn.parts[0].iter().map(|p| p.area).sum();
            let wanted = |p: &&Part| p.area >= SLIVER * total || kept.iter().any(|k| within(k, p));
            drawn.parts[0].iter().filter(wanted).collect()
        } else {
            Vec::new()
        };
        let inner_parts: Option<Vec<&Part>> = drawn.parts.get(drawn.own + 1).map(|parts| {
            let large = kept_parts(parts);
            large
                .into_iter()
                .filter(|p| kept.iter().any(|k| within(p, k)))
                .collect()
        });
        let mut escape = String::new();
        for every_point in [false, true] {
            let outline = outline(kept, every_point);
            let outer = has_outer.then(|| self::outline(&outer_parts, every_point));
            let inner = inner_parts
                .as_ref()
                .map(|parts| self::outline(parts, every_point));
            match nested(inner.as_ref(), &outline, outer.as_ref()) {
                Ok(()) => return Ok((outline, self.reach(inner, outer))),
                Err(problem) => escape = problem,
            }
        }
        Err(GrooveProblem::Polygon {
            groove: self.groove.number,
            problem: escape,
        })
    }

    fn reach(&self, inner: Option<Outline>, outer: Option<Outline>) -> Option<Reach> {
        let side = |outline: Outline| ReachSection {
            outline,
            nominal: None,
        };
        // A smallest section without area would leave the conductance without a low value.
        if inner.as_ref().is_some_and(|o| o.lumens.is_empty()) {
            return None;
        }
        if inner.is_none() && outer.is_none() {
            return None;
        }
        Some(Reach {
            inner: inner.map(side),
            outer: outer.map(side),
            reason: Some(section_notes::reach_reason(self)),
        })
    }

    /// Sections under the other lids, where the lands differ enough.
    fn alternatives(&self) -> Vec<LidAlternative> {
        if !self.lands_differ() {
            return Vec::new();
        }
        let others = LidChoice::ALL
            .into_iter()
            .filter(|&lid| lid != self.options.lid);
        let under = |lid: LidChoice| {
            let layer = self.layer(STATED, lid, self.options.lid_gap).ok()??;
            let parts = close(&[layer]);
            let kept = kept_parts(parts.first()?);
            let candidate = outline(&kept, false);
            (!kept.is_empty() && candidate.is_valid()).then_some(candidate)
        };
        let alternative = |lid: LidChoice| LidAlternative {
            lid: lid.as_str(),
            outline: under(lid),
        };
        others.map(alternative).collect()
    }

    pub(super) fn lands_differ(&self) -> bool {
        self.step_of_lands().abs() > LANDS_DIFFER * self.groove.depth
    }
}

/// The parts that are not slivers.
fn kept_parts(parts: &[Part]) -> Vec<&Part> {
    let total: f64 = parts.iter().map(|p| p.area).sum();
    parts
        .iter()
        .filter(|p| p.area > 0.0 && p.area >= SLIVER * total)
        .collect()
}

fn outline(parts: &[&Part], every_point: bool) -> Outline {
    let lumen = |part: &&Part| Lumen {
        outer: Loop::new(
            if every_point {
                &part.all_points
            } else {
                &part.points
            }
            .clone(),
        ),
        islands: Vec::new(),
    };
    Outline {
        lumens: parts.iter().map(lumen).collect(),
    }
    .oriented()
}

/// Proves that the outlines are valid and lie in each other.
fn nested(
    inner: Option<&Outline>,
    section: &Outline,
    outer: Option<&Outline>,
) -> Result<(), String> {
    for outline in inner.into_iter().chain([section]).chain(outer) {
        let problems = outline.problems();
        if let Some(problem) = problems.errors().next() {
            return Err(problem.to_string());
        }
        if problems.has_errors() {
            return Err("the outline has more problems than can be listed".to_owned());
        }
    }
    let escapes = |e: crate::geometry::Escape, which: &str| format!("{which}: {e}");
    if let Some(inner) = inner {
        let proven = inner.proven_inside(section);
        proven.map_err(|e| escapes(e, "the smallest section leaves the section"))?;
    }
    if let Some(outer) = outer {
        let proven = section.proven_inside(outer);
        proven.map_err(|e| escapes(e, "the section leaves the largest one"))?;
    }
    Ok(())
}

/// The lid over the parts of a section.
fn lid_over(upper: &[Point], kept: &[&Part]) -> Profile {
    let mut lid = Profile::default();
    let (Some(first), Some(last)) = (kept.first(), kept.last()) else {
        return lid;
    };
    let [from, to] = [first.span[0], last.span[1]];
    let mut push = |[x, z]: Point| {
        if lid.x.last().is_none_or(|&before| x > before) {
            lid.x.push(x);
            lid.z.push(z);
        }
    };
    for pair in upper.windows(2) {
        let ([x0, z0], [x1, z1]) = (pair[0], pair[1]);
        for x in [from, x1.min(to)] {
            if x0 <= x && x <= x1 && x1 > x0 && x >= from {
                push([x, z0 + (x - x0) / (x1 - x0) * (z1 - z0)]);
            }
        }
    }
    lid
}
