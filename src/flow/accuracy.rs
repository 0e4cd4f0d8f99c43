//! Accuracy on request: how fine a grid gets, where the search stops, and what going on would cost.
//!
//! The width of the proven range falls at least with `h^2.5`, its share from re-entrant corners with
//! `h^(2 pi / omega)`. From one solve that law says how fine the next grid must be; the answer is never the
//! law but the bracket of that grid. The search stops before a grid that is foreseen to need more memory or time than
//! allowed, and keeps the narrowest result so far.

use std::time::Instant;

use crate::geometry::Outline;
use crate::grid::{LEAST_CELLS_ACROSS, memory_needed, spacing};
use crate::warning::{Code, Warning};

use super::attempt::Attempt;
use super::section_flow::SectionFlow;
use super::solve_outline::{FlowError, SolveOptions, SolvedSection};
use super::width_source::{SMOOTH, WidthSource};

/// Relative width of the proven range that is aimed at by default.
pub const DEFAULT_TOLERANCE: f64 = 1e-3;
/// Least tolerance that can be asked for: rounding and the widening for it stay far below.
pub const LEAST_TOLERANCE: f64 = 1e-9;
/// Cells across the smallest lumen that the search starts from.
const FIRST_CELLS_ACROSS: f64 = 64.0;
/// Share of the asked width that the next grid is laid out for: the law is not exact.
const AIM: f64 = 0.93;
/// Share of that left out where re-entrant corners miss the nodes: their constants then vary from grid to grid by about
/// as much, and a grid a sixth finer costs less than one more.
const SCATTER: f64 = 1.0 / 3.0;
/// Least and most by which the next grid is finer.
const FINER: [f64; 2] = [1.1, 4.0];
/// How much finer the next grid is where there is no proven range, and how often that is tried.
const WITHOUT_FINER: f64 = 1.5;
/// See [`WITHOUT_FINER`].
const MOST_WITHOUT: usize = 4;
/// Most grids tried.
const MOST_GRIDS: usize = 12;
/// Fluid nodes a second, taken for the first grid, before any was timed.
const NODES_PER_SECOND: f64 = 1e6;
/// Fewest cells across that the first grid falls back to when time is short.
const HASTY_CELLS_ACROSS: f64 = 16.0;

/// What the search for a grid aims at.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Goal {
    /// Relative width of the proven range of `K`.
    Proven(f64),
    /// Estimated relative error of the best value of `K`.
    Estimated(f64),
}

impl Goal {
    /// The figure asked for.
    pub fn asked(self) -> f64 {
        match self {
            Self::Proven(asked) | Self::Estimated(asked) => asked,
        }
    }

    /// The figure reached, where there is one.
    pub fn reached(self, flow: &SectionFlow) -> Option<f64> {
        match self {
            Self::Proven(_) => flow.bracket.ok().map(|proven| proven.relative_width()),
            Self::Estimated(_) => Some(flow.conductance.relative()),
        }
    }

    fn is_met(self, flow: &SectionFlow) -> bool {
        flow.solver.converged
            && self
                .reached(flow)
                .is_some_and(|reached| reached <= self.asked())
    }
}

/// What stopped the search short of its goal.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum Stop {
    /// The next grid would need more memory than allowed.
    Memory,
    /// The next grid would take longer than allowed.
    Time,
    /// Finer grids no longer help.
    Stalled,
}

/// What a finer grid would cost.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cost {
    /// The figure it would reach, foreseen.
    pub figure: f64,
    /// Cells across the smallest lumen.
    pub cells_across: f64,
    /// Fluid nodes.
    pub fluid_nodes: f64,
    /// Memory, bytes.
    pub memory: f64,
    /// Work against that of the grid at hand.
    pub work_ratio: f64,
}

/// How the accuracy of a solved section came about.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Accuracy {
    /// What was aimed at; `None` where the grid was given.
    pub goal: Option<Goal>,
    /// Whether it was reached; `true` where there was no goal.
    pub is_met: bool,
    /// What stopped the search.
    pub stop: Option<Stop>,
    /// What limits the proven range.
    pub source: WidthSource,
    /// What it would cost to reach the goal, or a tenth of the figure reached where the goal is met.
    pub further: Option<Cost>,
}

impl Default for Accuracy {
    /// A grid that was given, with nothing known about what limits it.
    fn default() -> Self {
        Self {
            goal: None,
            is_met: true,
            stop: None,
            source: WidthSource::default(),
            further: None,
        }
    }
}

/// Refines until the goal is met or a limit stops it; keeps the best section so far.
///
/// - `diameter`: of the largest circle in the smallest lumen, m
pub(super) fn refine(
    outline: &Outline,
    diameter: f64,
    options: &SolveOptions,
) -> Result<SolvedSection, FlowError> {
    let attempt = |cells: f64| Attempt::new(outline, diameter, cells, options);
    let goal = options.goal;
    let start = Instant::now();
    let mut cells = first_cells(outline, diameter, options);
    let mut best = attempt(cells)?;
    let mut seconds = start.elapsed().as_secs_f64();
    let mut stop = Some(Stop::Stalled);
    let mut without = 0;
    for _ in 1..MOST_GRIDS {
        let reached = best.reached(goal);
        if best.meets(goal) || without > MOST_WITHOUT {
            break;
        }
        without += usize::from(reached.is_none());
        let finer = match reached {
            Some(reached) => finer(
                goal,
                &best.source,
                aim(goal, &best) * goal.asked() / reached,
            ),
            None => WITHOUT_FINER,
        };
        let next = cells * finer.clamp(FINER[0], FINER[1]);
        if spacing(outline, diameter, next, options.memory_limit).is_err() {
            stop = Some(Stop::Memory);
            break;
        }
        let foreseen = seconds * (next / cells).powi(2);
        let spent = start.elapsed().as_secs_f64();
        if options.is_out_of_time(spent + foreseen) {
            stop = Some(Stop::Time);
            break;
        }
        cells = next;
        let Ok(solved) = attempt(cells) else {
            break;
        };
        seconds = start.elapsed().as_secs_f64() - spent;
        if better(solved.reached(goal), reached) {
            best = solved;
        }
    }
    let mut solved = best.answered(outline);
    judge(&mut solved.flow, outline, options, stop, seconds);
    Ok(solved)
}

/// Share of what is asked for that the next grid is laid out for.
fn aim(goal: Goal, tried: &Attempt) -> f64 {
    let is_scattered = matches!(goal, Goal::Proven(_)) && tried.grids.misfit >= 1.0;
    let scattered = if is_scattered {
        tried.source.corner_share
    } else {
        0.0
    };
    AIM * (1.0 - SCATTER * scattered)
}

/// Says whether the goal is met, what else stopped the search, and what going on would cost.
///
/// - `seconds`: what the last grid took, s
pub(super) fn judge(
    flow: &mut SectionFlow,
    outline: &Outline,
    options: &SolveOptions,
    stop: Option<Stop>,
    seconds: f64,
) {
    let is_met = options.goal.is_met(flow);
    flow.accuracy.goal = Some(options.goal);
    flow.accuracy.is_met = is_met;
    flow.accuracy.stop = stop.filter(|_| !is_met);
    flow.accuracy.further = further(outline, flow);
    if !is_met {
        let warning = not_reached(flow, options, seconds);
        flow.warnings.push(warning);
    }
}

/// Cells across of the first grid: fewer where memory or time is short.
fn first_cells(outline: &Outline, diameter: f64, options: &SolveOptions) -> f64 {
    let first = diameter / FIRST_CELLS_ACROSS;
    let by_memory = (options.memory_limit / memory_needed(outline, first)).sqrt();
    let nodes = outline.area() / (first * first);
    let by_time = options.time_limit.map_or(1.0, |limit| {
        let least = HASTY_CELLS_ACROSS / FIRST_CELLS_ACROSS;
        (limit * NODES_PER_SECOND / nodes).sqrt().max(least)
    });
    let mut cells = FIRST_CELLS_ACROSS * by_memory.min(by_time).min(1.0);
    // The share of the wall falls more slowly than that of the nodes.
    while cells > LEAST_CELLS_ACROSS
        && memory_needed(outline, diameter / cells.floor()) > options.memory_limit
    {
        cells *= 0.9;
    }
    // With what does not even allow the coarsest grid, that one is refused with its figures.
    cells.floor().max(LEAST_CELLS_ACROSS)
}

fn better(new: Option<f64>, old: Option<f64>) -> bool {
    match (new, old) {
        (Some(new), Some(old)) => new < old,
        (new, old) => new.is_some() || old.is_none(),
    }
}

/// How many times finer a grid must be for a given share of the figure reached.
fn finer(goal: Goal, source: &WidthSource, share: f64) -> f64 {
    let (corner_share, smooth) = match goal {
        Goal::Proven(_) => (source.corner_share, SMOOTH),
        // What extrapolation leaves falls faster than this, but not reliably so.
        Goal::Estimated(_) => (0.0, 2.0),
    };
    let figure = |f: f64| {
        (1.0 - corner_share) * f.powf(-smooth) + corner_share * f.powf(-source.corner_exponent)
    };
    let (mut low, mut high) = (1.0, 1e8);
    for _ in 0..80 {
        let middle = f64::sqrt(low * high);
        if figure(middle) > share {
            low = middle;
        } else {
            high = middle;
        }
    }
    high
}

/// What it would cost to reach the goal, or to get ten times better.
pub(super) fn further(outline: &Outline, flow: &SectionFlow) -> Option<Cost> {
    let accuracy = &flow.accuracy;
    let goal = accuracy.goal.unwrap_or(Goal::Proven(DEFAULT_TOLERANCE));
    let reached = goal.reached(flow)?;
    let figure = if accuracy.is_met {
        0.1 * reached
    } else {
        goal.asked()
    };
    let times = finer(goal, &accuracy.source, AIM * figure / reached);
    let spacing = flow.grid.spacing / times;
    Some(Cost {
        figure,
        cells_across: (flow.grid.cells_across * times).ceil(),
        fluid_nodes: outline.area() / (spacing * spacing),
        memory: memory_needed(outline, spacing),
        work_ratio: times * times,
    })
}

/// The warning about a goal that was not reached.
fn not_reached(flow: &SectionFlow, options: &SolveOptions, seconds: f64) -> Warning {
    let goal = options.goal;
    let percent = |share: f64| crate::units::format_percent(share, 2);
    let what = match goal {
        Goal::Proven(_) => "the proven range of the conductance",
        Goal::Estimated(_) => "the estimated error of the conductance",
    };
    let reached = match (goal.reached(flow), &flow.bracket) {
        (Some(reached), _) => percent(reached),
        (None, Err(error)) => format!("missing ({error})"),
        (None, Ok(_)) => "missing".to_owned(),
    };
    let why = match flow.accuracy.stop {
        Some(Stop::Memory) => format!(
            "stopped by --max-memory {:.3} GB",
            options.memory_limit / 1e9
        ),
        Some(Stop::Time) => format!(
            "stopped by --max-seconds {}",
            options.time_limit.unwrap_or(f64::INFINITY)
        ),
        _ => "finer grids did not help".to_owned(),
    };
    let cost = flow.accuracy.further.map_or_else(String::new, |cost| {
        format!(
            "; about {:.0} cells across would do, {:.2e} nodes, {:.3} GB and {:.1} s",
            cost.cells_across,
            cost.fluid_nodes,
            cost.memory / 1e9,
            cost.work_ratio * seconds
        )
    });
    Warning {
        code: Code::AccuracyNotReached,
        message: format!(
            "{what} is {reached}, asked was {}; {why}{cost}",
            percent(goal.asked())
        ),
        advice: match flow.accuracy.stop {
            Some(Stop::Memory) => "raise --max-memory, ask for less with --tolerance, or round the corner that limits it",
            Some(Stop::Time) => "raise --max-seconds, ask for less with --tolerance, or round the corner that limits it",
            _ => "ask for less with --tolerance, or use --estimate",
        }
        .to_owned(),
        numbers: vec![
            ("reached", goal.reached(flow).unwrap_or(f64::INFINITY)),
            ("asked", goal.asked()),
        ],
    }
}
