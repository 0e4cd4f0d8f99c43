//! How the conductance of a potassium hydroxide groove goes with its etched depth.
//!
//! Run with `cargo run --release --example parameter_sweep`. Opening 100 um; the walls meet at
//! `100 um / sqrt(2)` = 70.7 um, beyond which the depth asked for changes nothing. The last column,
//! `d ln K / d ln depth`, says how many per cent of K one per cent of depth is worth; it is taken from
//! two solves half a per cent of depth to either side.

#![expect(clippy::print_stdout, reason = "an example shows its numbers")]

use std::error::Error;

use etchwise::flow::{SolveOptions, solve_outline};
use etchwise::geometry::NominalSpec;
use etchwise::measured::Estimate;

/// Half the step of the logarithmic derivative.
const STEP: f64 = 0.005;

/// Conductance of a groove 100 um wide at the lid; depth in um.
fn conductance(depth_um: f64) -> Result<Estimate, Box<dyn Error>> {
    let groove: NominalSpec = format!("koh_groove opening=100um depth={depth_um}um").parse()?;
    Ok(solve_outline(&groove.outline()?, &SolveOptions::default())?
        .flow
        .conductance)
}

fn main() -> Result<(), Box<dyn Error>> {
    println!(
        "{:>12}{:>16}{:>14}{:>24}",
        "depth / um", "K / m^4", "K / K(10 um)", "d ln K / d ln depth"
    );
    let shallow = conductance(10.0)?.value;
    for depth in [10.0, 20.0, 30.0, 40.0, 50.0, 60.0, 70.0, 80.0] {
        let best = conductance(depth)?;
        let (less, more) = (
            conductance(depth * (1.0 - STEP))?,
            conductance(depth * (1.0 + STEP))?,
        );
        let span = ((1.0 + STEP) / (1.0 - STEP)).ln();
        let slope = (more.value / less.value).ln() / span;
        println!(
            "{depth:>12.1}{:>16.6e}{:>14.3}{slope:>24.3}",
            best.value,
            best.value / shallow
        );
    }
    Ok(())
}
