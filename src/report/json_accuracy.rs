//! The JSON view of how the accuracy came about.

use serde::Serialize;

use super::json_values::{Number, Quantity, place};
use crate::flow::{Accuracy, Cost, DEFAULT_TOLERANCE, Goal, SectionFlow, Stop, WidthCause};

/// What was asked for, what was reached, what limits it, what more would cost.
#[derive(Serialize)]
pub(super) struct AccuracyView {
    /// `proven`, `estimated` or `grid`.
    goal: &'static str,
    asked: Quantity,
    reached: Quantity,
    met: bool,
    #[serde(skip_serializing_if = "Option::is_none")]
    stopped_by: Option<&'static str>,
    limited_by: Limit,
    further: Option<CostView>,
}

#[derive(Serialize)]
struct Limit {
    cause: &'static str,
    at: [Number; 2],
    share: Quantity,
    #[serde(skip_serializing_if = "Option::is_none")]
    fluid_angle: Option<Quantity>,
    #[serde(skip_serializing_if = "Option::is_none")]
    cells_across: Option<Quantity>,
    corner_share: Quantity,
}

#[derive(Serialize)]
struct CostView {
    reaches: Quantity,
    cells_across: Quantity,
    fluid_nodes: Quantity,
    memory: Quantity,
    work_ratio: Quantity,
}

impl AccuracyView {
    pub(super) fn new(flow: &SectionFlow) -> Self {
        let accuracy = &flow.accuracy;
        let figure = accuracy.goal.unwrap_or(Goal::Proven(DEFAULT_TOLERANCE));
        Self {
            goal: match accuracy.goal {
                Some(Goal::Proven(_)) => "proven",
                Some(Goal::Estimated(_)) => "estimated",
                None => "grid",
            },
            asked: Quantity::optional(
                accuracy.goal.map(Goal::asked),
                "1",
                "the grid was given with --cells-across",
            ),
            reached: Quantity::optional(figure.reached(flow), "1", "there is no proven range"),
            met: accuracy.is_met,
            stopped_by: accuracy.stop.map(|stop| match stop {
                Stop::Memory => "memory",
                Stop::Time => "time",
                _ => "stalled",
            }),
            limited_by: Limit::new(accuracy),
            further: accuracy.further.map(CostView::new),
        }
    }
}

impl Limit {
    fn new(accuracy: &Accuracy) -> Self {
        let source = accuracy.source;
        let (cause, fluid_angle, cells_across) = match source.cause {
            WidthCause::ReEntrantCorner { fluid_angle } => {
                let angle = Quantity::real(fluid_angle, "rad");
                ("re_entrant_corner", Some(angle), None)
            }
            WidthCause::NarrowPart { cells_across } => {
                let cells = Quantity::count(cells_across as usize);
                ("narrow_part", None, Some(cells))
            }
            WidthCause::Spread => ("spread", None, None),
            _ => ("bend", None, None),
        };
        Self {
            cause,
            at: place(source.at),
            share: Quantity::real(source.share, "1"),
            fluid_angle,
            cells_across,
            corner_share: Quantity::real(source.corner_share, "1"),
        }
    }
}

impl CostView {
    fn new(cost: Cost) -> Self {
        Self {
            reaches: Quantity::real(cost.figure, "1"),
            cells_across: Quantity::real(cost.cells_across, "1"),
            fluid_nodes: Quantity::real(cost.fluid_nodes.round(), "1"),
            memory: Quantity::real(cost.memory, "B"),
            work_ratio: Quantity::real(cost.work_ratio, "1"),
        }
    }
}
