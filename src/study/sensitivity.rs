//! What small changes of the wall do to the conductance, from one solve.
//!
//! With `dn_w` the motion of the wall out of the fluid, `dK = closed integral of (dphi/dn)^2 dn_w ds` (m^4):
//! the shape derivative of the conductance, after J. Hadamard (1908; from memory). It is exact to first order
//! for every motion, so each case is a motion ([`WallMotion`]) put into the same integral, and `dlnR = -dlnK`.
//! Each case is checked by new solves of the moved outline, which also say where the second order matters.
//!
//! Accuracy: within 1e-3 of central differences of new solves, `tests/sensitivity.rs`.

use std::time::Instant;

use rayon::prelude::*;

use crate::flow::{
    FlowError, SectionFlow, SolveOptions, SolvedSection, WallCurve, WallPlace, solve_outline,
};
use crate::geometry::{Outline, WallStretch};
use crate::warning::{Code, Warning};

use super::facing::vertex_arcs;
use super::resolve_check::{Base, Check, NoCheck};
use super::wall_motion::{Measure, WallMotion};
use super::wall_motion_cases::{NoMotion, WallMotions, wall_motions};

/// Cells across that integrals over the wall need for a thousandth; `K` itself needs fewer.
const LEAST_CELLS: f64 = 128.0;
/// Relative error of Rellich's identity from which the grid is refined for them.
const WALL_TOLERANCE: f64 = 5e-4;
/// Fluid nodes beyond which the grid is not refined for them.
const MOST_NODES: f64 = 2e6;
/// Cells across, and fluid nodes, beyond which the checking solves do not go: their differences are good
/// enough there.
const MOST_CHECK_CELLS: f64 = 128.0;
const MOST_CHECK_NODES: f64 = 3e5;
/// Difference between prediction and new solves, as a share of what all moving walls do together in absolute
/// value, from which a warning is given.
const CHECK_TOLERANCE: f64 = 5e-3;

/// What to study.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct SensitivityOptions {
    /// Whether each case is checked by new solves.
    pub check: bool,
    /// No new solve is begun that is foreseen to end later than this.
    pub until: Option<Instant>,
}

impl SensitivityOptions {
    /// Whether work that takes this long, s, would end too late; `None` for no limit.
    fn is_too_late_by(&self, seconds: f64) -> bool {
        let left = self
            .until
            .map(|end| end.saturating_duration_since(Instant::now()));
        left.is_some_and(|left| left.as_secs_f64() <= seconds)
    }
}

/// One case: a change of the wall and what it does.
#[derive(Debug, Clone, PartialEq)]
pub struct Sensitivity {
    /// Short name, the key in machine output.
    pub name: String,
    /// What exactly moves.
    pub definition: String,
    /// What a unit of change is.
    pub measure: Measure,
    /// Length of which a relative change is one, m.
    pub reference_length: Option<f64>,
    /// `dK` per unit of change, m^4 per unit.
    pub conductance: f64,
    /// `dlnK` per unit of change; `dlnR` is its negative.
    pub relative: f64,
    /// The same with every part of the wall counted positive: the scale on which differences are judged.
    pub gross: f64,
    /// New solves either way.
    pub check: Result<Check, NoCheck>,
}

/// All cases of one section.
#[derive(Debug, Clone, PartialEq)]
pub struct SensitivityStudy {
    /// The cases in the order of the output.
    pub cases: Vec<Sensitivity>,
    /// Cases that this section does not have.
    pub absent: Vec<NoMotion>,
    /// `dlnK` of depth and width together; exactly 4.
    pub stretch_sum: f64,
    /// What moving the section as a whole would do, along `x` and `y`, as a share of what an over-etch as
    /// large does; exactly 0.
    pub shift: [f64; 2],
    /// Cells across the smallest lumen in the checking solves, and their `K`, m^4.
    pub check_grid: Option<(f64, f64)>,
    /// Warnings about these results; those of the solve come on top.
    pub warnings: Vec<Warning>,
}

impl Sensitivity {
    /// `dlnK` per metre; `None` for an angle and for a change without a length of its own.
    pub fn per_metre(&self) -> Option<f64> {
        match self.measure {
            Measure::Length => Some(self.relative),
            Measure::Relative => self.reference_length.map(|length| self.relative / length),
            Measure::Angle => None,
        }
    }

    /// Prediction minus new solves, as a share of [`Sensitivity::gross`].
    pub fn check_difference(&self) -> Option<f64> {
        let check = self.check.as_ref().ok()?;
        Some((self.relative - check.first_order) / self.gross)
    }
}

impl SensitivityStudy {
    /// The case of that name.
    pub fn case(&self, name: &str) -> Option<&Sensitivity> {
        self.cases.iter().find(|case| case.name == name)
    }
}

/// Solves a section on a grid fine enough for integrals over the wall.
///
/// As [`solve_outline`], but without a wish for the grid at least 128 cells across, and refined until Rellich's
/// identity, `closed integral of (r.n) (dphi/dn)^2 ds = 4 K`, is met within 5e-4 or the grid would have more
/// than two million nodes: its left side is such an integral with a known value. Limits on memory and time hold
/// for these grids too, and whether the goal of `options` is met is said of the last one.
///
/// # Errors
/// As [`solve_outline`].
pub fn solve_for_sensitivity(
    outline: &Outline,
    options: &SolveOptions,
) -> Result<SolvedSection, FlowError> {
    let start = Instant::now();
    let mut solved = solve_outline(outline, options)?;
    if options.cells_across.is_some() {
        return Ok(solved);
    }
    loop {
        let flow = &solved.flow;
        let cells = flow.grid.cells_across;
        let wanted = if cells < LEAST_CELLS {
            LEAST_CELLS
        } else if wall_error(flow) > WALL_TOLERANCE {
            2.0 * cells
        } else {
            return Ok(solved);
        };
        if flow.grid.fluid_nodes as f64 * (wanted / cells).powi(2) > MOST_NODES {
            return Ok(solved);
        }
        let spent = start.elapsed().as_secs_f64();
        let Some(finer) = solved.on_finer_grid(wanted, options, spent) else {
            return Ok(solved);
        };
        solved = finer;
    }
}

/// How far Rellich's identity is missed.
fn wall_error(flow: &SectionFlow) -> f64 {
    let rellich = flow.identities.iter().find(|i| i.name == "rellich");
    rellich.map_or(0.0, |identity| identity.relative_difference.abs())
}

/// Every case for a solved section.
///
/// - `walls`: stretches of its wall with names of their own
///
/// # Examples
/// ```
/// use etchwise::{flow::SolveOptions, geometry::Outline};
/// use etchwise::study::{SensitivityOptions, sensitivity_study, solve_for_sensitivity};
/// let a = 100e-6;
/// let square = Outline::single(vec![[0.0, 0.0], [a, 0.0], [a, a], [0.0, a]]);
/// let solved = solve_for_sensitivity(&square, &SolveOptions::default())?;
/// let study = sensitivity_study(&solved, &[], SensitivityOptions::default());
/// let depth = study.case("depth").map_or(0.0, |case| case.relative);
/// assert!((depth - 2.0).abs() < 2e-3);
/// # Ok::<(), etchwise::flow::FlowError>(())
/// ```
pub fn sensitivity_study(
    solved: &SolvedSection,
    walls: &[WallStretch],
    options: SensitivityOptions,
) -> SensitivityStudy {
    let WallMotions { outline, cases } =
        wall_motions(solved.outline(), walls, solved.flow.grid.spacing);
    let k = solved.flow.conductance.value;
    let integrals = WallIntegrals::new(&outline, &solved.flow.wall_shear.curve);
    let (mut motions, mut absent) = (Vec::new(), Vec::new());
    for case in cases {
        match case {
            Ok(motion) => motions.push(motion),
            Err(none) => absent.push(none),
        }
    }
    let base = options
        .check
        .then(|| base(solved, &outline, options))
        .transpose();
    let cases: Vec<Sensitivity> = motions
        .par_iter()
        .map(|motion| {
            let (conductance, gross) = integrals.of(motion);
            Sensitivity {
                name: motion.name.clone(),
                definition: motion.definition.clone(),
                measure: motion.measure,
                reference_length: motion.reference_length,
                conductance,
                relative: conductance / k,
                gross: gross / k,
                check: match &base {
                    Ok(Some(base)) if options.is_too_late_by(2.0 * base.seconds) => {
                        Err(NoCheck::Time)
                    }
                    Ok(Some(base)) => base.check(motion),
                    Ok(None) => Err(NoCheck::NotAsked),
                    Err(error) => Err(error.clone()),
                },
            }
        })
        .collect();
    let relative = |name: &str| {
        let case = cases.iter().find(|case| case.name == name);
        case.map_or(f64::NAN, |case| case.relative)
    };
    let warnings = warnings(solved, &cases);
    SensitivityStudy {
        stretch_sum: relative("depth") + relative("width"),
        shift: integrals.shift(),
        check_grid: match base {
            Ok(Some(base)) => Some((base.cells_across, base.conductance)),
            _ => None,
        },
        absent,
        warnings,
        cases,
    }
}

/// The unmoved section on the grid of the checks.
fn base<'a>(
    solved: &SolvedSection,
    outline: &'a Outline,
    limits: SensitivityOptions,
) -> Result<Base<'a>, NoCheck> {
    let grid = &solved.flow.grid;
    let coarser = (MOST_CHECK_NODES / grid.fluid_nodes as f64).sqrt().min(1.0);
    let cells_across = (grid.cells_across * coarser).min(MOST_CHECK_CELLS);
    let share = (cells_across / grid.cells_across).powi(2);
    if limits.is_too_late_by(share * solved.cost().seconds()) {
        return Err(NoCheck::Time);
    }
    let options = SolveOptions {
        cells_across: Some(cells_across),
        ..SolveOptions::default()
    };
    let start = Instant::now();
    let k = solve_outline(outline, &options)?.flow.conductance;
    Ok(Base {
        outline,
        cells_across,
        conductance: k.value,
        relative_error: k.relative(),
        seconds: start.elapsed().as_secs_f64(),
        diameter: grid.inscribed_diameter,
    })
}

/// Integrals of `(dphi/dn)^2` over the wall, edge by edge.
struct WallIntegrals<'a> {
    curve: &'a WallCurve,
    /// Arc length at which each edge of each loop starts, and the length of the loop, m.
    edge_starts: Vec<Vec<f64>>,
}

impl<'a> WallIntegrals<'a> {
    fn new(outline: &Outline, curve: &'a WallCurve) -> Self {
        Self {
            curve,
            edge_starts: outline.loops().map(vertex_arcs).collect(),
        }
    }

    /// `dn_w` at a place of the wall.
    fn speed(&self, motion: &WallMotion, place: &WallPlace) -> f64 {
        let edge = self.edge_starts.get(place.loop_index).map_or(0, |starts| {
            let after = starts.partition_point(|&start| start <= place.arc_length);
            after.saturating_sub(1)
        });
        motion.outward_speed(place.loop_index, edge, place.at, place.normal)
    }

    /// `dK` per unit of change and the same with all parts counted positive, m^4 per unit.
    fn of(&self, motion: &WallMotion) -> (f64, f64) {
        let signed = |place: &WallPlace| self.speed(motion, place);
        let size = |place: &WallPlace| self.speed(motion, place).abs();
        let curve = self.curve;
        match &motion.stretch {
            // Its ends need not be vertices of the curve's own outline.
            Some(WallStretch {
                loop_index,
                from,
                to,
                ..
            }) => {
                let along =
                    curve.integrate_stretch(*loop_index, *from, *to, 2, |_| motion.normal_speed);
                (along, along.abs())
            }
            None => (curve.integrate(2, signed), curve.integrate(2, size)),
        }
    }

    /// Integrals of `(dphi/dn)^2 n` against that of `(dphi/dn)^2`.
    fn shift(&self) -> [f64; 2] {
        let all = self.curve.integrate(2, |_| 1.0);
        [0, 1].map(|axis| self.curve.integrate(2, |place| place.normal[axis]) / all)
    }
}

fn warnings(solved: &SolvedSection, cases: &[Sensitivity]) -> Vec<Warning> {
    let mut found = Vec::new();
    let corners = solved.flow.wall_shear.singular_corners.len();
    if corners > 0 {
        found.push(Warning {
            code: Code::SensitivitySingular,
            message: format!(
                "the local sensitivity has no bound at {corners} re-entrant corner{}; the totals are finite",
                if corners == 1 { "" } else { "s" }
            ),
            advice: "trust the totals; close to such a corner the real radius of the corner decides"
                .to_owned(),
            numbers: vec![("corners", corners as f64)],
        });
    }
    let off: Vec<(&str, f64)> = cases
        .iter()
        .filter_map(|case| {
            let error = case.check.as_ref().ok()?.first_order_error / case.gross;
            Some((case.name.as_str(), case.check_difference()?, error))
        })
        .filter(|(_, difference, error)| {
            difference.is_nan() || difference.abs() > CHECK_TOLERANCE + error
        })
        .map(|(name, difference, _)| (name, difference))
        .collect();
    if let Some(worst) = off.iter().map(|(_, d)| d.abs()).max_by(f64::total_cmp) {
        let names: Vec<&str> = off.iter().map(|(name, _)| *name).collect();
        found.push(Warning {
            code: Code::SensitivityMismatch,
            message: format!(
                "prediction and new solves differ by up to {:.2} %, above {:.2} %: {}",
                100.0 * worst,
                100.0 * CHECK_TOLERANCE,
                names.join(", ")
            ),
            advice: "ask for a finer grid with --cells-across".to_owned(),
            numbers: vec![("largest", worst), ("limit", CHECK_TOLERANCE)],
        });
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::time::Duration;

    #[test]
    fn only_work_that_would_end_after_the_limit_is_too_late() {
        let within = |until| SensitivityOptions { check: true, until };
        assert!(!within(None).is_too_late_by(f64::MAX));
        let hour = within(Instant::now().checked_add(Duration::from_hours(1)));
        assert!(!hour.is_too_late_by(60.0));
        assert!(hour.is_too_late_by(3601.0));
        assert!(within(Some(Instant::now())).is_too_late_by(0.0));
    }
}
