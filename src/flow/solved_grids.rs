//! All grids of a section solved, in one place of the lattice or several: what every answer is read from.

use crate::geometry::{Corner, Outline, facet_turning};
use crate::grid::{Lattice, LineCrossings, Mask};
use crate::proof::{Bracket, bracket};
use crate::solve::{Field, Hierarchy, SolveControl, Solved};

use super::assemble::leading_exponent;
use super::corner_alignment::{Alignment, align};
use super::grid_integrals::GridIntegrals;
use super::peak::{GridPeak, peak};
use super::solve_cost::{LevelCost, StageClock};
use super::solve_outline::FlowError;
use super::wall_shear::{CORNER_TURNING, corners_of};

/// Residual as a share of `1 / cells_across^2`: about a tenth of the truncation error of the field. What it leaves in
/// `K` goes with its square (`grid_integrals`), below 1e-9, so that extrapolation is not disturbed.
const RESIDUAL_SHARE: f64 = 0.1;
/// Residual as a share of that of the first guess, which is large where walls are rough or corners re-entrant. What is
/// left in `K` goes with the square of the share as well: below a thousandth of its estimated error.
const START_SHARE: f64 = 0.005;
/// The same two for `K` alone: because of the square, more may stay.
const ALONE_SHARES: [f64; 2] = [1.0, 0.02];
/// Exponent of the widest corner below which the proven ranges are asked as well: from 106 degrees.
const WIDE_EXPONENT: f64 = 3.4;
/// The same from 135 degrees, for `K` alone: only where the energy alone could mislead, because proofs cost more than
/// solves.
const FLAT_EXPONENT: f64 = 8.0 / 3.0;

/// What grids are solved for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Purpose {
    /// The field and all that is read from it.
    Field,
    /// `K` and nothing else.
    ConductanceAlone,
}

impl Purpose {
    fn wide_exponent(self) -> f64 {
        match self {
            Self::Field => WIDE_EXPONENT,
            Self::ConductanceAlone => FLAT_EXPONENT,
        }
    }

    /// Residuals at which a grid is solved, as shares of `1 / cells_across^2` and of that of the first guess.
    fn residual_shares(self) -> [f64; 2] {
        match self {
            Self::Field => [RESIDUAL_SHARE, START_SHARE],
            Self::ConductanceAlone => ALONE_SHARES,
        }
    }
}

/// What one grid of the sequence said.
pub(super) struct GridAnswer {
    pub(super) stride: u32,
    pub(super) nodes: usize,
    pub(super) wall_nodes: usize,
    pub(super) solved: Solved,
    pub(super) integrals: GridIntegrals,
    pub(super) peak: GridPeak,
}

/// The finest grid with its solution, and the answers of all.
pub(super) struct SolvedGrids {
    pub(super) lattice: Lattice,
    pub(super) mask: Mask,
    pub(super) phi: Field,
    pub(super) corners: Vec<Vec<Corner>>,
    /// Spacings in the hydraulic diameter.
    pub(super) cells_in_diameter: f64,
    /// Turning per facet of curved walls, radians.
    pub(super) facet_turning: f64,
    /// How far re-entrant corners miss the nodes, 0 to 1.
    pub(super) misfit: f64,
    /// Finest first.
    pub(super) answers: Vec<GridAnswer>,
    /// The second grid where corners make a second witness welcome.
    second: Option<SecondGrid>,
}

/// A grid of twice the spacing.
struct SecondGrid {
    mask: Mask,
    /// Its solution, in units of its own spacing squared.
    phi: Field,
    /// Place of the finest lattice, in units of the finest spacing.
    offset: [f64; 2],
}

impl SolvedGrids {
    /// Proven range of the second grid, m^4, where it is welcome.
    pub(super) fn coarse_range(&self, outline: &Outline) -> Option<Bracket> {
        let SecondGrid { mask, phi, offset } = self.second.as_ref()?;
        let spacing = 2.0 * self.lattice.spacing;
        let lattice = Lattice::new(outline, spacing, offset.map(|o| 0.5 * o));
        let range = bracket(&lattice, mask, phi).ok()?;
        Some(range.scaled(spacing.powi(4)))
    }
}

/// Solves the grids of a section.
///
/// - `asked`: spacing of the finest, m; up to an eighth smaller where corners are put on nodes
/// - `cells_across`: about
/// - `offset`: place of the lattice where it is given
/// - `purpose`: decides how far the iteration goes and whether the range of the second grid is welcome
pub(super) fn solve_grids(
    outline: &Outline,
    asked: f64,
    cells_across: f64,
    offset: Option<[f64; 2]>,
    purpose: Purpose,
    clock: &mut StageClock,
) -> Result<SolvedGrids, FlowError> {
    let corners = corners_of(outline, asked);
    let fitted = match offset {
        None => align(outline, &corners, asked),
        Some(offset) => Alignment {
            spacing: asked,
            offset,
            misfit: 1.0,
        },
    };
    let spacing = fitted.spacing;
    clock.end("corners and place of the grid");
    let is_wide = leading_exponent(&corners).is_some_and(|p| p < purpose.wide_exponent());
    let lattice = Lattice::new(outline, spacing, fitted.offset);
    let Sequence {
        hierarchy,
        answers,
        second,
    } = solve_sequence(&lattice, (cells_across, purpose), is_wide, clock)
        .ok_or(FlowError::NoFluidNode { spacing })?;
    let (mask, phi, second_mask) = hierarchy.into_two_finest();
    let second = second.zip(second_mask).map(|(phi, mask)| SecondGrid {
        mask,
        phi,
        offset: fitted.offset,
    });
    Ok(SolvedGrids {
        lattice,
        mask,
        phi,
        corners,
        cells_in_diameter: 4.0 * outline.area() / (outline.wetted_perimeter() * spacing),
        facet_turning: outline
            .loops()
            .map(|wall| facet_turning(wall, CORNER_TURNING))
            .sum(),
        misfit: fitted.misfit,
        answers,
        second,
    })
}

/// The grids of a lattice, solved.
struct Sequence {
    hierarchy: Hierarchy,
    /// Finest first.
    answers: Vec<GridAnswer>,
    /// Solution of the second grid in units of its own spacing, where it was wanted.
    second: Option<Field>,
}

/// Solves every grid of the sequence.
fn solve_sequence(
    lattice: &Lattice,
    (cells_across, purpose): (f64, Purpose),
    wants_second: bool,
    clock: &mut StageClock,
) -> Option<Sequence> {
    let rows = LineCrossings::rows(lattice);
    let columns = LineCrossings::columns(lattice);
    clock.end("crossings");
    let mut hierarchy = Hierarchy::new(lattice, &rows, &columns)?;
    clock.end("grids and transfers");
    let [share, start_share] = purpose.residual_shares();
    let control = SolveControl {
        residual: share / (cells_across * cells_across),
        most_cycles: 100,
    };
    let (mut answers, mut second) = (Vec::new(), None);
    hierarchy.solve_to_share(control, start_share, |grid, solved| {
        let seconds = clock.lap();
        clock.add("solve", seconds);
        clock.level(LevelCost {
            fluid_nodes: grid.mask.nodes(),
            cycles: solved.cycles,
            seconds,
            bytes: grid.bytes(),
        });
        answers.push(GridAnswer {
            stride: grid.mask.stride,
            nodes: grid.mask.nodes(),
            wall_nodes: grid.mask.wall.iter().map(Vec::len).sum(),
            solved,
            integrals: GridIntegrals::new(&grid.mask, &grid.phi),
            peak: peak(&grid.mask, &grid.phi),
        });
        if wants_second && grid.mask.stride == 2 {
            // Later cycles overwrite it.
            second = Some(grid.phi.scaled(0.25));
        }
        clock.end("integrals");
    });
    answers.reverse();
    Some(Sequence {
        hierarchy,
        answers,
        second,
    })
}
