//! Hydraulics of as-made microchannel cross-sections, with their certainty.
//!
//! One equation carries the whole crate: `-lap(phi) = 1` in the section with `phi = 0` on its wall
//! (`phi` in m^2). With the pressure gradient `G = -dp/dx` (Pa/m) and the viscosity `mu` (Pa s):
//!
//! | quantity | formula | unit |
//! |---|---|---|
//! | axial velocity | `u = (G/mu) phi` | m/s |
//! | conductance | `K` = integral of `phi` over the section | m^4 |
//! | flow rate | `Q = G K / mu` | m^3/s |
//! | resistance per length | `mu / K` | Pa s/m^4 |
//! | hydraulic diameter | `Dh = 4 A / P` | m |
//! | Fanning `f Re` on `Dh` | `Dh^2 A / (2 K)`; Darcy is four times that | 1 |
//! | Fanning `f Re` on `sqrt(A)` | `2 A^(5/2) / (P K)` | 1 |
//! | wall shear | `tau = G abs(dphi/dn)` | Pa |
//!
//! Conventions: SI inside, units only at the border; `x` to the right, `y` upwards; outer loops turn
//! anticlockwise and islands clockwise once an [`geometry::Outline`] is built; friction factors always
//! say Fanning or Darcy, and hydraulic diameter or `sqrt(A)`.
//!
//! Data flows one way: intake, geometry, grid, solve, proof, flow, study, report, cli.

pub mod cli;
pub mod flow;
pub mod geometry;
pub mod grid;
pub mod intake;
pub mod measured;
pub mod proof;
pub mod report;
pub mod solve;
pub mod study;
pub mod units;
pub mod warning;
