//! The command line: the only layer that prints, reads the environment, or decides the exit status.
//!
//! Arguments are read in two stages: `arguments` knows what can be typed, the request of each command
//! what it means, with units applied and before any file is opened. Machine output goes to standard
//! output, talk to standard error.

mod accuracy_options;
mod arguments;
mod card;
mod card_arguments;
mod check;
mod check_panels;
mod draw;
mod exit_status;
mod failure;
mod input;
mod instrument_arguments;
mod instrument_options;
mod measures;
mod network;
mod network_arguments;
mod output;
mod quantities;
mod reading;
mod response;
mod response_arguments;
mod route;
mod route_arguments;
mod sections;
mod sensitivity;
mod solve;

use std::ffi::OsString;
use std::process::ExitCode;

pub use arguments::command;
pub use exit_status::ExitStatus;

use failure::Failure;
use instrument_arguments::Kind;

/// Runs the program on its arguments, the program name first.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> ExitCode {
    let matches = match command().try_get_matches_from(arguments) {
        Ok(matches) => matches,
        Err(error) => {
            // Help and version are no errors; clap knows which stream and which status are right.
            let printed = error.print();
            return match (error.exit_code(), printed) {
                (0, _) => ExitStatus::Done.into(),
                _ => ExitStatus::Usage.into(),
            };
        }
    };
    let outcome = match matches.subcommand() {
        Some(("solve", matches)) => solve::run(matches),
        Some(("trace", matches)) => reading::run(Kind::Trace, matches),
        Some(("map", matches)) => reading::run(Kind::Map, matches),
        Some(("image", matches)) => reading::run(Kind::Image, matches),
        Some(("check", matches)) => check::run(matches),
        Some(("draw", matches)) => draw::run(matches),
        Some(("sensitivity", matches)) => sensitivity::run(matches),
        Some(("card", matches)) => card::run(matches),
        Some(("route", matches)) => route::run(matches),
        Some(("network", matches)) => network::run(matches),
        _ => Err(Failure::usage(
            "no command was given",
            "type `etchwise --help` for the commands",
        )),
    };
    match outcome {
        Ok(status) => {
            if let Some(why) = status.why_no_result() {
                output::talk(why);
            }
            status.into()
        }
        Err(failure) => {
            failure.print();
            failure.status.into()
        }
    }
}

/// Sets the number of threads for the whole run.
fn set_threads(matches: &clap::ArgMatches) -> Result<(), Failure> {
    let Some(&threads) = matches.get_one::<u16>("threads") else {
        return Ok(());
    };
    rayon::ThreadPoolBuilder::new()
        .num_threads(usize::from(threads))
        .build_global()
        .map_err(|error| {
            Failure::usage(format!("--threads {threads}: {error}"), "use fewer threads")
        })
}
