//! What can be typed for `network`.

use clap::{Arg, Command, value_parser};

use super::arguments::{flag, option, result};

/// Heading of the options of its own.
const HEADING: &str = "Net";

/// `network`: flows and pressures of a net of cards.
pub(super) fn network() -> Command {
    let command = Command::new("network")
        .about("Solve a net of channels made of cards: pressures, flows, how sure they are")
        .after_help(
            "Examples: etchwise network manifold.toml\n          \
             etchwise network manifold.toml --csv --nodes-csv nodes.csv -o channels.csv",
        )
        .arg(
            Arg::new("file")
                .value_name("FILE")
                .required_unless_present("print-schema")
                .value_parser(value_parser!(std::path::PathBuf))
                .help("File of the net (TOML); - for standard input")
                .long_help(
                    "File of the net (TOML): cards made by `etchwise card --json`, nodes with a pressure or an \
                     inflow, channels between them. Files of cards are relative to its folder. - for standard \
                     input.",
                ),
        )
        .arg(
            option("samples", "N", "Samples of the uncertainty, 0 or 10 to 20000 [default: 1000]")
                .value_parser(value_parser!(u32).range(0..=20_000))
                .long_help(
                    "Times that the net is solved with resistances drawn at random, 0 for none, else 10 to 20000. \
                     Default: 1000, fewer for a large net, which is said. Example: --samples 4000",
                )
                .help_heading(HEADING),
        )
        .arg(
            option("seed", "N", "Seed of the samples [default: 1]")
                .value_parser(value_parser!(u64))
                .long_help(
                    "Seed of the samples: the same seed gives the same samples, whatever the number of threads. \
                     Default: 1. Example: --seed 7",
                )
                .help_heading(HEADING),
        )
        .arg(
            option("nodes-csv", "FILE", "Write the nodes as a CSV table")
                .value_parser(value_parser!(std::path::PathBuf))
                .long_help(
                    "Write the nodes as a CSV table: what is given, pressure, inflow, imbalance. Example: \
                     --nodes-csv nodes.csv",
                )
                .help_heading("Output"),
        )
        .arg(
            flag("print-schema", "Print the JSON Schema of the result")
                .long_help(
                    "Print the JSON Schema (draft 2020-12) that --json follows, and do nothing else. Example: \
                     --print-schema",
                )
                .help_heading(HEADING),
        );
    result(command)
        .mut_arg("verbose", |arg| arg.help("Show every row of the tables"))
        .mut_arg("csv", |arg| {
            arg.help("Print a CSV table, one row a channel, unit in every head")
        })
}
