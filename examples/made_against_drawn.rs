//! The channel as it came off the line against the channel as it was drawn: what happened to K and R.
//!
//! Run with `cargo run --release --example made_against_drawn`. The drawing is a 100 um wide, 40 um deep
//! potassium hydroxide groove; the made one is an outline of an invented wafer. The viscosity cancels in
//! the ratio of the resistances, which is the inverse of the ratio of the conductances.

#![expect(clippy::print_stdout, reason = "an example shows its numbers")]

use std::error::Error;
use std::path::Path;

use etchwise::flow::{SectionFlow, SolveOptions, solve_outline};
use etchwise::intake::{ReadOptions, read_section};

const SHAPES: &str = concat!(env!("CARGO_MANIFEST_DIR"), "/shapes");

fn solve(file: &str) -> Result<SectionFlow, Box<dyn Error>> {
    let section = read_section(&Path::new(SHAPES).join(file), &ReadOptions::default())?;
    Ok(solve_outline(&section.outline, &SolveOptions::default())?.flow)
}

fn main() -> Result<(), Box<dyn Error>> {
    let drawn = solve("drawn/koh_groove.toml")?;
    let made = solve("made/koh_rounded.toml")?;

    println!(
        "{:<28}{:>14}{:>14}{:>12}",
        "", "drawn", "made", "made/drawn"
    );
    let row = |name: &str, drawn: f64, made: f64| {
        println!(
            "{name:<28}{drawn:>14.5e}{made:>14.5e}{:>12.4}",
            made / drawn
        );
    };
    row("area / m^2", drawn.geometry.area, made.geometry.area);
    row(
        "wetted perimeter / m",
        drawn.geometry.wetted_perimeter,
        made.geometry.wetted_perimeter,
    );
    row("height / m", drawn.geometry.height, made.geometry.height);
    let (k_drawn, k_made) = (drawn.conductance, made.conductance);
    row("conductance K / m^4", k_drawn.value, k_made.value);
    row(
        "resistance over mu L / m^-4",
        1.0 / k_drawn.value,
        1.0 / k_made.value,
    );
    row(
        "peak over mean velocity",
        drawn.peak.to_mean.value,
        made.peak.to_mean.value,
    );

    // The numerical error matters only if it reaches the difference that is looked at.
    let numerical = k_drawn.relative() + k_made.relative();
    let change = k_made.value / k_drawn.value - 1.0;
    println!(
        "\nK differs by {:+.2} %; the estimated numerical error of that is {:.4} %",
        100.0 * change,
        100.0 * numerical
    );
    Ok(())
}
