//! What a solve cost: time by stage, time and memory by grid.

use std::time::Instant;

/// Time of one stage of the work.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StageCost {
    /// What was done.
    pub name: &'static str,
    /// Wall-clock time, s.
    pub seconds: f64,
}

/// Time and memory of one grid.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LevelCost {
    /// Fluid nodes.
    pub fluid_nodes: usize,
    /// Cycles spent on this grid.
    pub cycles: usize,
    /// Wall-clock time from the first guess until the grid counted as solved, coarser grids of its cycles included, s.
    pub seconds: f64,
    /// Memory of its nodes, arms, transfer and fields, bytes.
    pub bytes: usize,
}

/// What the last grid sequence of a solve cost. Times differ from run to run; results do not.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct SolveCost {
    /// Stages in the order of the work.
    pub stages: Vec<StageCost>,
    /// Grids, finest first.
    pub levels: Vec<LevelCost>,
}

impl SolveCost {
    /// Time of all stages, s.
    pub fn seconds(&self) -> f64 {
        self.stages.iter().map(|stage| stage.seconds).sum()
    }
}

/// Takes the time of stages that follow each other.
#[derive(Debug)]
pub(super) struct StageClock {
    last: Instant,
    cost: SolveCost,
}

impl StageClock {
    pub(super) fn start() -> Self {
        Self {
            last: Instant::now(),
            cost: SolveCost::default(),
        }
    }

    /// Time since the last call, s.
    pub(super) fn lap(&mut self) -> f64 {
        let now = Instant::now();
        let seconds = (now - self.last).as_secs_f64();
        self.last = now;
        seconds
    }

    /// Gives a stage its time out of what has passed since the last call; what it did beside other work is theirs.
    pub(super) fn split(&mut self, name: &'static str, seconds: f64) {
        let passed = self.last.elapsed().as_secs_f64();
        let seconds = seconds.min(passed);
        self.last += std::time::Duration::from_secs_f64(seconds);
        self.add(name, seconds);
    }

    /// Ends a stage.
    pub(super) fn end(&mut self, name: &'static str) {
        let seconds = self.lap();
        self.add(name, seconds);
    }

    /// Adds a time that was taken already.
    pub(super) fn add(&mut self, name: &'static str, seconds: f64) {
        match self.cost.stages.iter_mut().find(|stage| stage.name == name) {
            Some(stage) => stage.seconds += seconds,
            None => self.cost.stages.push(StageCost { name, seconds }),
        }
    }

    /// Adds a grid, coarsest first.
    pub(super) fn level(&mut self, level: LevelCost) {
        self.cost.levels.insert(0, level);
    }

    pub(super) fn cost(self) -> SolveCost {
        self.cost
    }
}
