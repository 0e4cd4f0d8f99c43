//! What can be typed for `card`.

use clap::{Arg, ArgAction, Command, value_parser};

use super::accuracy_options::accuracy_options;
use super::arguments::{any_input, film_options, flag, fluid_only, option, result};
use super::response_arguments::response_options;

/// Heading of the options of its own.
const HEADING: &str = "Card";

/// Options that mean nothing for a response table.
const NOT_WITH_VARY: [&str; 10] = [
    "cells-across",
    "estimate",
    "film",
    "max-memory",
    "max-seconds",
    "modelica",
    "print-schema",
    "temperature-range",
    "tolerance",
    "uncertainty",
];

/// `card`: coefficients of sections for a network model.
pub(super) fn card() -> Command {
    let command = Command::new("card")
        .about("Hand over coefficients of sections to a network model")
        .after_help(
            "Examples: etchwise card wafer.toml --fluid water --temperature 25C --json -o wafer.card.json\n          \
             etchwise card a.toml b.toml --fluid water --temperature 25C --csv\n          \
             etchwise card koh_groove --vary depth=20..40um --vary opening=60..120um",
        );
    let command = accuracy_options(fluid_only(film_options(any_input(command))));
    response_options(own_options(result(command)))
        .mut_arg("file", |file| {
            file.num_args(1..)
                .action(ArgAction::Append)
                .required(false)
                .required_unless_present("print-schema")
                .help("Files of sections or instruments; with --vary one file or kind")
                .long_help(
                    "Section files, outlines, SVG drawings or files of instruments, one card each; - for standard \
                     input. With --vary one of them, or a kind of section as in `etchwise draw`.",
                )
        })
        // A response table has its own grid, accuracy and outputs.
        .mut_arg("vary", |vary| vary.conflicts_with_all(NOT_WITH_VARY))
}

/// Temperatures of `R(T)`.
pub(super) fn temperature_range() -> Arg {
    option("temperature-range", "LOW..HIGH", "Temperatures of R(T) [default: 5C..60C]").long_help("Temperatures between which the resistance over temperature must hold, each with its unit; the \
             fluid's own temperature lies between them. Default: 5C..60C, wider where the fluid is colder or \
             hotter. Example: --temperature-range 10C..40C").allow_hyphen_values(true)
}

fn own_options(command: Command) -> Command {
    let entry = |name, value, help, long| -> Arg {
        option(name, value, help)
            .long_help(long)
            .help_heading(HEADING)
    };
    command
        .arg(temperature_range().help_heading(HEADING))
        .arg(
            entry(
                "uncertainty",
                "INPUT=U",
                "Standard uncertainty of a dimension, such as depth=0.3um",
                "Standard uncertainty of a dimension, as a length, a share or an angle; INPUT is a case of \
                 `etchwise sensitivity` (depth, width, scale, film, ...) or viscosity. The card then carries the \
                 standard uncertainty of R, first order, inputs independent. May be given more than once. \
                 Example: --uncertainty depth=0.3um --uncertainty scale=0.5%",
            )
            .action(ArgAction::Append),
        )
        .arg(
            entry(
                "modelica",
                "FILE",
                "Write the cards as Modelica model text",
                "Write the cards as a package in the Modelica language: one model a card, with length, \
                 temperature and bound as parameters; it needs no library. Example: --modelica cards.mo",
            )
            .value_parser(value_parser!(std::path::PathBuf)),
        )
        .arg(
            flag("print-schema", "Print the JSON Schema of the cards")
                .long_help(
                    "Print the JSON Schema (draft 2020-12) that --json follows, and do nothing else. Example: \
                     --print-schema",
                )
                .help_heading(HEADING),
        )
}
