//! Text about the accuracy: what was asked, what was reached, what limits it, what more would cost.

use crate::flow::{DEFAULT_TOLERANCE, Goal, SectionFlow, WidthCause};

use super::numbers::{per_cent, significant};
use super::text::{part, place, value_table};

/// The block `Accuracy`.
pub(super) fn accuracy(flow: &SectionFlow) -> String {
    let accuracy = &flow.accuracy;
    let goal = accuracy.goal.unwrap_or(Goal::Proven(DEFAULT_TOLERANCE));
    let figure = match goal {
        Goal::Proven(_) => "proven width of K",
        Goal::Estimated(_) => "estimated error of K",
    };
    let mut table = value_table();
    let reached = goal
        .reached(flow)
        .map_or_else(|| "none".to_owned(), per_cent);
    let verdict = match accuracy.goal {
        None => "the grid was given".to_owned(),
        Some(goal) if accuracy.is_met => format!("asked {}: reached", per_cent(goal.asked())),
        Some(goal) => format!("asked {}: NOT reached", per_cent(goal.asked())),
    };
    table.row([figure.to_owned(), reached, verdict]);
    let source = accuracy.source;
    let at = place(flow, source.at);
    let share = format!("{} of the width, estimated", per_cent(source.share));
    let limit = match source.cause {
        WidthCause::ReEntrantCorner { fluid_angle } => {
            let angle = significant(fluid_angle.to_degrees(), 4);
            [
                format!("re-entrant corner of {angle}\u{b0}"),
                format!("{share}; at {at}"),
            ]
        }
        WidthCause::NarrowPart { cells_across } => [
            format!("a part {cells_across} cells across"),
            format!("{share}; at {at}"),
        ],
        WidthCause::Spread => ["no single place".to_owned(), String::new()],
        _ => ["a bend of the wall".to_owned(), format!("{share}; at {at}")],
    };
    let [cause, note] = limit;
    table.row(["limited most by".to_owned(), cause, note]);
    if let Some(cost) = accuracy.further {
        table.row([
            format!("{} would take", per_cent(cost.figure)),
            format!("{} times the work", significant(cost.work_ratio, 2)),
            format!(
                "{} cells across, {} nodes, {} GB",
                significant(cost.cells_across, 3),
                significant(cost.fluid_nodes, 2),
                significant(cost.memory / 1e9, 2)
            ),
        ]);
    }
    part("Accuracy", &table)
}
