//! Fluxes through the sides of one whole cell of the upper bound from the nodes around it.

use crate::grid::{EAST, NORTH, SOUTH, WEST};

use super::cell_energy::whole_energy;
use super::row_values::RowValues;

/// Sign with which a side enters the divergence.
pub(super) fn sign(side: usize) -> f64 {
    if side == EAST || side == NORTH {
        1.0
    } else {
        -1.0
    }
}

/// The side of a cell towards a neighbour.
pub(super) fn side_towards(di: i64, dj: i64) -> usize {
    match (di, dj) {
        (1, _) => EAST,
        (-1, _) => WEST,
        (_, 1) => NORTH,
        _ => SOUTH,
    }
}

/// Energy of a cell whose east side is decided by the balance of the others.
pub(super) fn balanced_cell(
    [south, _, north, w]: [f64; 4],
    along: [f64; 4],
    west: &mut Option<f64>,
) -> f64 {
    let east = w - 1.0 - (north - south);
    *west = Some(east);
    whole_energy([south, east, north, w], along)
}

/// One cell with whole cells all around, some of whose nodes may not be fluid.
pub(super) fn plain_cell(nodes: &RowValues, i: i64, j: i64, west: &mut Option<f64>) -> f64 {
    let cell = NodesAround::new(nodes, i, j);
    let along = cell.variations(|_, _| false);
    let side = |own: usize| cell.difference(own);
    let w = west.unwrap_or_else(|| side(WEST));
    balanced_cell([side(SOUTH), 0.0, side(NORTH), w], along, west)
}

/// Values of the nodes around one, row by row from below; `None` outside the fluid.
pub(super) struct NodesAround([[Option<f64>; 3]; 3]);

impl NodesAround {
    pub(super) fn new(nodes: &RowValues, i: i64, j: i64) -> Self {
        Self([-1, 0, 1].map(|dj| nodes.places(i - 1, j + dj)))
    }

    fn at(&self, di: i64, dj: i64) -> Option<f64> {
        self.0[(dj + 1) as usize][(di + 1) as usize]
    }

    /// Flux through a side as the difference of the two nodes; none beside a node that is not fluid.
    pub(super) fn difference(&self, side: usize) -> f64 {
        let beyond = match side {
            SOUTH => self.at(0, -1),
            EAST => self.at(1, 0),
            NORTH => self.at(0, 1),
            _ => self.at(-1, 0),
        };
        match (self.at(0, 0), beyond) {
            (Some(here), Some(beyond)) => sign(side) * (beyond - here),
            _ => 0.0,
        }
    }

    /// Variation of the flux along each side of a whole cell; none where a cut cell shares the side or a node
    /// around it is not fluid. The two cells at a side get the same value.
    pub(super) fn variations(&self, is_cut: impl Fn(i64, i64) -> bool) -> [f64; 4] {
        [(0, -1), (1, 0), (0, 1), (-1, 0)].map(|(di, dj): (i64, i64)| {
            if is_cut(di, dj) {
                return 0.0;
            }
            // The side between a lower or left node and the next one; the direction along it.
            let (a, b) = (di.min(0), dj.min(0));
            let (step, turn) = ((di.abs(), dj.abs()), (dj.abs(), di.abs()));
            let flux = |k: i64| {
                let (x, y) = (a + k * turn.0, b + k * turn.1);
                Some(self.at(x + step.0, y + step.1)? - self.at(x, y)?)
            };
            match (flux(1), flux(-1)) {
                (Some(above), Some(below)) => 0.5 * (above - below),
                _ => 0.0,
            }
        })
    }
}
