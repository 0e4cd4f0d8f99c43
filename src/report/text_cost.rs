//! What a solve cost, as text for `--trace`.

use crate::flow::SolveCost;

use super::numbers::{per_cent, significant};
use super::table::{Align, Table};

/// Blanks before each line of a table.
const INDENT: usize = 2;

/// Time by stage, time and memory by grid, each also per fluid node.
pub fn cost_text(cost: &SolveCost) -> String {
    let total = cost.seconds();
    let nodes = cost.levels.first().map_or(0, |level| level.fluid_nodes);
    let each = |amount: f64, nodes: usize| significant(amount / nodes.max(1) as f64, 3);
    let mut stages = Table::new(&[Align::Left, Align::Right, Align::Right, Align::Right]);
    stages.row(["stage", "time / ms", "share", "ns per node"]);
    for stage in &cost.stages {
        stages.row([
            stage.name.to_owned(),
            significant(1e3 * stage.seconds, 3),
            per_cent(stage.seconds / total),
            each(1e9 * stage.seconds, nodes),
        ]);
    }
    stages.row([
        "all".to_owned(),
        significant(1e3 * total, 3),
        String::new(),
        each(1e9 * total, nodes),
    ]);
    let mut levels = Table::new(&[Align::Right; 6]);
    levels.row([
        "fluid nodes",
        "cycles",
        "time / ms",
        "ns per node",
        "memory / MB",
        "bytes per node",
    ]);
    for level in &cost.levels {
        levels.row([
            level.fluid_nodes.to_string(),
            level.cycles.to_string(),
            significant(1e3 * level.seconds, 3),
            each(1e9 * level.seconds, level.fluid_nodes),
            significant(1e-6 * level.bytes as f64, 3),
            each(level.bytes as f64, level.fluid_nodes),
        ]);
    }
    format!(
        "Cost of the last grid\n{}\n{}",
        stages.print(INDENT),
        levels.print(INDENT)
    )
}
