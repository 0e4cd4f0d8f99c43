//! What can be typed after `etchwise route`.

use clap::{Arg, ArgAction, Command, value_parser};

use super::accuracy_options::accuracy_options;
use super::arguments::{OPERATING_POINT, fluid_only, option, picture_option, result};
use super::card_arguments::temperature_range;

/// `route`: a channel along its length.
pub(super) fn route() -> Command {
    let command = Command::new("route")
        .about("A channel along its length: segments, tapers, parallel branches")
        .after_help(
            "Example: etchwise route chip.toml --fluid water --temperature 25C \\\n  \
             --flow-rate 5uL/min --picture chip.png\n\n\
             The route file (TOML) lists [[segment]] tables with stations along them; README.md\n\
             shows one.",
        )
        .arg(
            Arg::new("file")
                .value_name("FILE")
                .required(true)
                .value_parser(value_parser!(std::path::PathBuf))
                .help("Route file (TOML); - for standard input")
                .long_help(
                    "Route file (TOML). The section files that it names are relative to it, or to the folder \
                     the program runs in where it comes from standard input (-).",
                ),
        )
        .arg(
            option("max-stations", "N", "Stations a route may have [default: 500]")
                .value_parser(value_parser!(u32).range(2..=100_000))
                .long_help(
                    "Stations that a route may have, 2 to 100000; more are refused before any section is read. \
                     Default: 500. Example: --max-stations 2000",
                )
                .help_heading("Input"),
        )
        .arg(
            option("spread", "SHARE", "Relative standard uncertainty of K of a branch")
                .long_help(
                    "Relative standard uncertainty of K of every single branch, independent of the others, where \
                     the route file gives none: 0 to 0.5, as 5% or 0.05. Default: none. Example: --spread 5%",
                )
                .help_heading("Input"),
        )
        .arg(
            option("sections-between", "N", "Least sections put between two nominal stations")
                .value_parser(value_parser!(u8).range(1..=63))
                .long_help(
                    "Sections solved between two stations whose dimensions are interpolated, at least; 1 to 63. The integral needs few, and has them; more make the proven range narrower. Default: 1. Example: \
                     --sections-between 15",
                )
                .help_heading("Accuracy"),
        );
    let command = command.arg(temperature_range().help_heading("Output"));
    output(result(accuracy_options(drive(fluid_only(command)))))
}

fn drive(command: Command) -> Command {
    command
        .arg(
            option("pressure-drop", "DP", "Pressure drop over the route, such as 30kPa")
                .long_help(
                    "Pressure drop over the route, above 0, with its unit. Not together with --flow-rate. \
                     Example: --pressure-drop 30kPa",
                )
                .conflicts_with("flow-rate")
                .help_heading(OPERATING_POINT),
        )
        .arg(
            option("flow-rate", "Q", "Flow rate, such as 5uL/min")
                .long_help(
                    "Volume flow rate through the route, above 0, with its unit. May be given more than once: \
                     the first counts for tables and pictures, all for the series of --vtk. Not together with \
                     --pressure-drop. Example: --flow-rate 5uL/min",
                )
                .action(ArgAction::Append)
                .help_heading(OPERATING_POINT),
        )
}

fn output(command: Command) -> Command {
    let heading = "Output";
    command
        .arg(
            Arg::new("card")
                .long("card")
                .value_name("FILE")
                .value_parser(value_parser!(std::path::PathBuf))
                .help("Write the card of the route for a network model")
                .long_help(
                    "Write the card of the route, one JSON object with its resistance, inertance, volume and \
                     limits for a network model; needs a fluid. Example: --card chip-card.json",
                )
                .help_heading(heading),
        )
        .arg(
            Arg::new("vtk")
                .long("vtk")
                .value_name("PREFIX")
                .value_parser(value_parser!(std::path::PathBuf))
                .help("Write PREFIX.vtu (fluid), PREFIX.vtp (walls), PREFIX.pvd")
                .long_help(
                    "Write the route in space for viewers: fluid with velocity and pressure as PREFIX.vtu, walls \
                     with shear as PREFIX.vtp, and PREFIX.pvd, which lists them. With several flow rates \
                     PREFIX-1.vtu and so on. Coordinates in m, z along the channel. Needs a fluid and a flow \
                     rate or a pressure drop. Example: --vtk out/chip",
                )
                .help_heading(heading),
        )
        .arg(picture_option(
            "picture",
            "Write a picture along the length, .png or .svg",
            "Write a picture of pressure, resistance per length and shear along the route; the ending says .png or \
             .svg. May be given more than once. Example: --picture chip.png",
            heading,
        ))
}
