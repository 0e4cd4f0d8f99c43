//! The options of `card` that ask for a response table.

use clap::{Arg, ArgAction, Command, value_parser};

use super::arguments::option;

/// Heading of these options in the help.
const HEADING: &str = "Response table";

/// Adds the options to a command.
pub(super) fn response_options(command: Command) -> Command {
    let entry = |name, value, help, long| -> Arg {
        option(name, value, help)
            .long_help(long)
            .help_heading(HEADING)
    };
    command
        .arg(
            entry(
                "vary",
                "NAME=LOW..HIGH",
                "Make a table over a range of a parameter, up to three",
                "Make a table of K over a range of this parameter, and a formula for it. For a nominal kind (see \
                 `etchwise draw`) a parameter of it; for a file a motion of its walls by the name of a \
                 `sensitivity` case, as a change from the section as given. With a unit; relative motions also in \
                 %. May be given up to three times. Example: --vary depth=20..40um",
            )
            .action(ArgAction::Append)
            .allow_hyphen_values(true),
        )
        .arg(
            entry(
                "with",
                "NAME=VALUE",
                "Fix a parameter of a nominal kind",
                "Fix a parameter of a nominal kind, with its unit; a section inside goes in round brackets. May be \
                 given more than once. Example: --with height=40um",
            )
            .action(ArgAction::Append)
            .requires("vary"),
        )
        .arg(
            entry(
                "fit-error",
                "SHARE",
                "Largest relative error of the formula [default: 0.1%]",
                "Largest relative difference between the formula and solves at fresh points, 1e-6 to 20%, as 0.1%, \
                 200ppm or 1e-3. Each K is solved to a tenth of it. Status 5 where it is not reached. Default: \
                 0.1%. Example: --fit-error 0.02%",
            )
            .requires("vary"),
        )
        .arg(
            entry(
                "fresh-points",
                "N",
                "Fresh points to check the formula on [default: 200]",
                "Sections solved to check the formula, none of them used in the fit: 10 to 100000. Default: 200. \
                 Example: --fresh-points 1000",
            )
            .value_parser(value_parser!(u32).range(10..=100_000))
            .requires("vary"),
        )
        .arg(
            entry(
                "picture",
                "FILE",
                "Write a picture of the response, .png or .svg",
                "Write a picture of the response: lines of equal resistance (with a fluid) or conductance over two \
                 parameters, a curve over one, three maps for three; the ending says .png or .svg. May be given \
                 more than once. Example: --picture response.png",
            )
            .action(ArgAction::Append)
            .value_parser(value_parser!(std::path::PathBuf))
            .requires("vary"),
        )
}
