//! How exact, and at what cost: the options that become [`SolveOptions`].

use clap::{Arg, ArgMatches, Command, value_parser};

use crate::flow::{DEFAULT_TOLERANCE, Goal, LEAST_TOLERANCE, SolveOptions};
use crate::units::{parse_bytes, parse_fraction};

use super::arguments::{flag, option};
use super::failure::Failure;
use super::quantities::{positive, quantity};

/// Heading of these options in the help.
const HEADING: &str = "Accuracy";

/// Adds the options to a command.
pub(super) fn accuracy_options(command: Command) -> Command {
    let entry = |name, value, help, long| -> Arg {
        option(name, value, help)
            .long_help(long)
            .help_heading(HEADING)
    };
    command
        .arg(entry(
            "tolerance",
            "SHARE",
            "Proven relative width of K to reach [default: 0.1%]",
            "Refine until the two proven values of the conductance differ by less than this, relative: \
             1e-9 to 1, as 0.1%, 200ppm or 1e-3. Status 5 where it is not reached. Default: 0.1%. \
             Example: --tolerance 0.01%",
        ))
        .arg(
            flag("estimate", "Apply the tolerance to the estimated error instead")
                .long_help(
                    "Apply the tolerance to the estimated error of the best value, which is no bound, \
                     instead of the proven width: coarser grids do. Example: --tolerance 1e-5 --estimate",
                )
                .help_heading(HEADING),
        )
        .arg(
            entry(
                "cells-across",
                "N",
                "Cells across the smallest lumen, instead of a tolerance",
                "Cells across the largest circle that fits into the smallest lumen: the short side of a \
                 rectangle, the gap of an annulus. At least 4. Default: as many as the tolerance needs. \
                 Example: --cells-across 128",
            )
            .value_parser(value_parser!(f64))
            .allow_negative_numbers(true)
            .conflicts_with_all(["tolerance", "estimate"]),
        )
        .arg(entry(
            "max-memory",
            "BYTES",
            "Memory that may be used [default: 8GB]",
            "No grid is begun that is foreseen to need more memory than this: above 0, in B, kB, MB, GB, \
             KiB, MiB or GiB. Default: 8GB. Example: --max-memory 2GB",
        ))
        .arg(
            entry(
                "max-seconds",
                "S",
                "Time after which no finer grid is begun",
                "No finer grid is begun that is foreseen to end later than this, in seconds, above 0; the \
                 first grid is always solved. Default: no limit. Example: --max-seconds 10",
            )
            .value_parser(value_parser!(f64))
            .allow_negative_numbers(true),
        )
}

/// Reads them.
pub(super) fn solve_options(matches: &ArgMatches) -> Result<SolveOptions, Failure> {
    let tolerance =
        quantity(matches, "tolerance", parse_fraction)?.map_or(Ok(DEFAULT_TOLERANCE), checked)?;
    let memory = quantity(matches, "max-memory", parse_bytes)?;
    positive(matches, "max-memory", memory, "2GB")?;
    let seconds = finite(matches, "max-seconds", "10")?;
    if let Some(s) = seconds.filter(|s| *s <= 0.0) {
        return Err(Failure::usage(
            format!("--max-seconds: {s} is not above zero"),
            "give a positive number of seconds, for example --max-seconds 10",
        ));
    }
    let defaults = SolveOptions::default();
    Ok(SolveOptions {
        cells_across: finite(matches, "cells-across", "128")?,
        goal: if matches.get_flag("estimate") {
            Goal::Estimated(tolerance)
        } else {
            Goal::Proven(tolerance)
        },
        memory_limit: memory.unwrap_or(defaults.memory_limit),
        time_limit: seconds,
        ..defaults
    })
}

/// A plain number, as typed; beyond the range of a double it is infinite.
fn finite(matches: &ArgMatches, name: &str, example: &str) -> Result<Option<f64>, Failure> {
    match matches.get_one::<f64>(name).copied() {
        Some(value) if !value.is_finite() => Err(Failure::usage(
            format!("--{name}: {value} is not a finite number"),
            &format!("give a finite number, for example --{name} {example}"),
        )),
        value => Ok(value),
    }
}

/// A tolerance within its bounds.
fn checked(tolerance: f64) -> Result<f64, Failure> {
    if (LEAST_TOLERANCE..=1.0).contains(&tolerance) {
        return Ok(tolerance);
    }
    let shown = if tolerance == 0.0 || tolerance.abs() >= 1e-4 {
        format!("{tolerance}")
    } else {
        format!("{tolerance:e}")
    };
    Err(Failure::usage(
        format!("--tolerance: {shown} is outside {LEAST_TOLERANCE:e} to 1"),
        "give a share such as 0.1%, 200ppm or 1e-4",
    ))
}
