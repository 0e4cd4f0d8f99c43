//! What can be typed: commands, options and their help. One table, no meaning yet.

use clap::{Arg, ArgAction, Command, value_parser};

use super::accuracy_options::accuracy_options;
use super::card_arguments::card;
use super::instrument_arguments::{Kind, Shown, instrument_options, show_settings};
use super::network_arguments::network;
use crate::geometry::{ParameterInfo, Quantity, kinds, modifiers};

/// Printed below the help of the program.
const STATUS: &str = "\
Exit status:
  0  done, and accepted where a limit was set
  1  done, outside the limit (check: problems found)
  2  wrong usage
  3  input unreadable, unit or scale ambiguous, or output not writable
  4  outside the model's validity (not laminar, section not resolved)
  5  not solved to the asked accuracy

A resistance is not a pressure rating; the results are for fully developed
laminar flow in a rigid section.";

/// The whole command line.
pub fn command() -> Command {
    Command::new("etchwise")
        .version(env!("CARGO_PKG_VERSION"))
        .about("Hydraulics of as-made microchannel cross-sections, with their certainty")
        .after_help(STATUS)
        .subcommand_required(true)
        .arg_required_else_help(true)
        .max_term_width(79)
        .subcommand(solve())
        .subcommand(reading(Kind::Trace))
        .subcommand(reading(Kind::Map))
        .subcommand(reading(Kind::Image))
        .subcommand(check())
        .subcommand(draw())
        .subcommand(sensitivity())
        .subcommand(card())
        .subcommand(super::route_arguments::route())
        .subcommand(network())
}

pub(super) fn option(name: &'static str, value: &'static str, help: &'static str) -> Arg {
    Arg::new(name).long(name).value_name(value).help(help)
}

/// An option that names pictures to write; it may come more than once.
pub(super) fn picture_option(
    name: &'static str,
    help: &'static str,
    long: &'static str,
    heading: &'static str,
) -> Arg {
    option(name, "FILE", help)
        .long_help(long)
        .action(ArgAction::Append)
        .value_parser(value_parser!(std::path::PathBuf))
        .help_heading(heading)
}

pub(super) fn flag(name: &'static str, help: &'static str) -> Arg {
    Arg::new(name)
        .long(name)
        .action(ArgAction::SetTrue)
        .help(help)
}

/// Options that every command has.
fn common(command: Command) -> Command {
    command
        .arg(flag("json", "Print one JSON object, SI units").help_heading("Output"))
        .arg(flag("quiet", "Say nothing on standard error but errors").short('q'))
        .arg(
            option(
                "threads",
                "N",
                "Threads to use, 1 to 256 [default: all cores]",
            )
            .value_parser(value_parser!(u16).range(1..=256))
            .long_help(
                "Threads to use, 1 to 256. The results are the same with any number. Default: all \
                     cores. Example: --threads 2",
            ),
        )
}

/// The input file and how to read it.
fn input(command: Command) -> Command {
    let heading = "Input";
    command
        .arg(
            Arg::new("file")
                .value_name("FILE")
                .required(true)
                .value_parser(value_parser!(std::path::PathBuf))
                .help("File of a section or of an instrument; - for standard input")
                .long_help(
                    "Section file, outline in columns or SVG drawing; or the file of an instrument: trace of a \
                     profilometer, height map, picture of a section. - for standard input.",
                ),
        )
        .arg(
            option("as", "KIND", "Read FILE as: section, outline, svg, trace, map, image")
                .help_heading(heading)
                .long_help(
                    "Read FILE as section (TOML), outline (columns of text), svg (drawing), trace, map or image. \
                     Without it the content decides, never the file name. Example: --as outline",
                ),
        )
        .arg(
            option("unit", "UNIT", "Unit of bare coordinates: m, mm, um, nm")
                .help_heading(heading)
                .long_help(
                    "Unit of coordinates in a file that does not name one: m, cm, mm, um, nm, inch, \
                     mil. Never guessed. Example: --unit um",
                ),
        )
        .arg(
            option("scale", "LENGTH", "Length of one unit of a drawing or of a pixel")
                .help_heading(heading)
                .conflicts_with("unit")
                .long_help(
                    "Length of one user unit of an SVG drawing, or width of one pixel of a picture. Default: from the \
                     width, height and viewBox of the drawing, or from what the picture's file states. Example: \
                     --scale \"1 um\"",
                ),
        )
        .arg(
            flag("allow-any-size", "Accept sections outside 10 nm to 50 mm")
                .long_help(
                    "Accept sections whose larger side is outside 10 nm to 50 mm, which are otherwise \
                     taken for a wrong unit. Example: --allow-any-size",
                )
                .help_heading(heading),
        )
}

/// The input file with the options for instruments, which only the long help lists.
pub(super) fn any_input(command: Command) -> Command {
    show_settings(instrument_options(input(command), Shown::InLongHelp))
}

/// `trace`, `map` and `image`: from the file of an instrument to section files.
fn reading(kind: Kind) -> Command {
    let command = Command::new(kind.word())
        .about(kind.about())
        .after_help(kind.example());
    let heading = "Output";
    let command = instrument_options(input(command), Shown::Only(kind));
    common(show_settings(command))
        .arg(
            Arg::new("output")
                .short('o')
                .long("output")
                .value_name("FILE")
                .value_parser(value_parser!(std::path::PathBuf))
                .help("Write the section file")
                .long_help(
                    "Write the section as a section file (TOML); several go to FILE-1, FILE-2 and so on, before \
                     the ending. - is standard output; the talk then goes to standard error. Example: -o \
                     wafer.toml",
                )
                .help_heading(heading),
        )
        .arg(
            picture_option("picture", "Write the check picture, .png or .svg", "Write the picture that shows what was done: data, zones, fit, corrections, lid, outline; the \
                     ending says .png or .svg. May be given more than once. Example: --picture check.png", heading),
        )
        .arg(
            Arg::new("heights")
                .long("heights")
                .value_name("FILE")
                .value_parser(value_parser!(std::path::PathBuf))
                .hide(kind != Kind::Map)
                .help("Write the heights of the map as a table")
                .long_help(
                    "Write the heights of the map as read, in metres, as CSV: one row for each y, rising. \
                     Example: --heights heights.csv",
                )
                .help_heading(heading),
        )
        .arg(flag("no-solve", "Do not solve the sections").long_help(
            "Do not solve the sections: no conductance, no effect of the lid. Example: --no-solve",
        ))
        .arg(flag("ascii", "Plain ASCII text").help_heading(heading))
        .arg(
            flag("deny-warnings", "End with status 1 on any warning").long_help(
                "End with status 1 on any warning that is not a mere caution. Example: --deny-warnings",
            ),
        )
}

fn solve() -> Command {
    let command = Command::new("solve")
        .about("Solve a section: conductance, resistance, friction factor, shear")
        .after_help(
            "Example: etchwise solve wafer.toml --fluid water --temperature 25C \\\n  \
             --length 20mm --flow-rate 5uL/min --picture wafer.png",
        );
    let command = accuracy_options(fluid_options(film_options(any_input(command))));
    let heading = "Output";
    wall_options(result(command), heading)
        .arg(
            flag("trace", "Say on standard error what the solve cost").long_help(
                "Say on standard error what the solve cost: time by stage, time and memory by grid. \
                 Example: --trace",
            ),
        )
        .arg(flag(
            "shortcuts",
            "Also say what the usual formulas would have said",
        ))
        .arg(
            Arg::new("vtk")
                .long("vtk")
                .value_name("PREFIX")
                .value_parser(value_parser!(std::path::PathBuf))
                .help("Write PREFIX.vti (field) and PREFIX.vtp (wall)")
                .long_help(
                    "Write the velocity field as PREFIX.vti and the wall with its shear as PREFIX.vtp, \
                     for viewers; coordinates in m. Example: --vtk out/wafer",
                )
                .help_heading(heading),
        )
        .arg(
            flag("legacy-vtk", "With --vtk: also PREFIX.vtk in the old format")
                .requires("vtk")
                .long_help(
                    "Also write the field as PREFIX.vtk in the old text format, for readers without \
                     .vti. Example: --vtk wafer --legacy-vtk",
                )
                .help_heading(heading),
        )
        .arg(
            picture_option("picture", "Write a picture of the velocity, .png or .svg", "Write a picture of the velocity with contour lines, wall, scale bar and colour \
                     bar; the ending says .png or .svg. May be given more than once. Example: \
                     --picture wafer.png", heading),
        )
}

/// Files that hold the wall shear.
fn wall_options(command: Command, heading: &'static str) -> Command {
    command
        .arg(
            Arg::new("wall-csv")
                .long("wall-csv")
                .value_name("FILE")
                .value_parser(value_parser!(std::path::PathBuf))
                .help("Write the wall shear along the wall as a table")
                .long_help(
                    "Write the wall shear along the wall to FILE as CSV: loop, wall, arc length, place, \
                     normal, shear. Example: --wall-csv wall.csv",
                )
                .help_heading(heading),
        )
        .arg(
            picture_option("wall-picture", "Write a picture of the wall shear, .png or .svg", "Write a picture of the wall shear along the developed wall; the ending says .png \
                     or .svg. May be given more than once. Example: --wall-picture shear.png", heading),
        )
}

pub(super) fn film_options(command: Command) -> Command {
    let film = "Film on the walls";
    command
        .arg(
            option("film", "THICKNESS", "Solve what a film of this thickness leaves")
                .long_help(
                    "Solve what a conformal film of this thickness leaves of the section: the fluid at \
                     least this far from the wall. Corners of the fluid stay sharp, re-entrant ones \
                     become round; necks may close and islands grow together, which is reported. \
                     Example: --film 0.5um",
                )
                .help_heading(film),
        )
        .arg(
            option("film-on", "WALLS", "Walls with the film: all, floor, lid [default: all]")
                .value_parser(["all", "floor", "lid"])
                .requires("film")
                .long_help(
                    "Walls that carry the film: all; floor, those whose normal out of the fluid points \
                     down within 45 degrees; lid, up. The film ends square, or at its own level where a \
                     wall without film leans at up to 135 degrees to the coated one. Default: all. Example: \
                     --film 0.5um --film-on floor",
                )
                .help_heading(film),
        )
}

/// How and where the main result is printed.
pub(super) fn result(command: Command) -> Command {
    let heading = "Output";
    common(command)
        .arg(
            flag("csv", "Print a CSV table, unit in every head")
                .conflicts_with("json")
                .help_heading(heading),
        )
        .arg(
            option("csv-locale", "DIALECT", "Dialect of tables: plain, eu [default: plain]")
                .value_parser(["plain", "eu"])
                .long_help(
                    "Dialect of tables: plain, commas and decimal points (RFC 4180); eu, semicolons and decimal \
                     commas, with a byte order mark, for spreadsheets set to it. Default: plain. Example: --csv \
                     --csv-locale eu",
                )
                .help_heading(heading),
        )
        .arg(
            Arg::new("output")
                .short('o')
                .long("output")
                .value_name("FILE")
                .value_parser(value_parser!(std::path::PathBuf))
                .help("Write the result to FILE instead")
                .long_help(
                    "Write the result to FILE; - is standard output, the default. FILE appears \
                     only when it is complete. Example: -o wafer.json",
                )
                .help_heading(heading),
        )
        .arg(
            flag("verbose", "Show the grids and the solver's course")
                .short('v')
                .help_heading(heading),
        )
        .arg(flag("ascii", "Plain ASCII text").help_heading(heading))
        .arg(
            flag("deny-warnings", "End with status 1 on any warning").long_help(
                "End with status 1 on any warning that is not a mere caution. Example: \
                 --deny-warnings",
            ),
        )
}

fn sensitivity() -> Command {
    let command = Command::new("sensitivity")
        .about("What small changes of the wall do to conductance and resistance")
        .after_help(
            "Example: etchwise sensitivity wafer.toml --picture sensitivity.png\n\n\
             Cases: scale, depth, width, over-etch, film, single walls, wall angle, lid gap; what\n\
             exactly moves is printed with the result. Without --cells-across the grid has at least\n\
             128 cells across, and as many as the tolerance and the identities of the wall shear need.",
        );
    let heading = "Output";
    result(accuracy_options(any_input(command)))
        .arg(
            flag("no-check", "Do not check the cases by new solves").long_help(
                "Do not check the cases by solving the section again with its walls moved either way. \
                 Faster, but where the second order matters is then not known. Example: --no-check",
            ),
        )
        .arg(
            Arg::new("vtk")
                .long("vtk")
                .value_name("PREFIX")
                .value_parser(value_parser!(std::path::PathBuf))
                .help("Write PREFIX.vtp (wall)")
                .long_help(
                    "Write the wall with its local sensitivity, shear and outward normal as \
                     PREFIX.vtp, for viewers; coordinates in m. Example: --vtk out/wafer",
                )
                .help_heading(heading),
        )
        .arg(
            picture_option("picture", "Write a picture of the wall, .png or .svg", "Write a picture of the wall coloured by its local sensitivity, with numbers; the \
                     ending says .png or .svg. May be given more than once. Example: --picture \
                     wafer.png", heading),
        )
}

/// A fluid without an operating point.
pub(super) fn fluid_only(command: Command) -> Command {
    let fluid = "Fluid";
    let entry = |name, value, help, long| {
        option(name, value, help)
            .long_help(long)
            .help_heading(fluid)
    };
    command
        .arg(
            option("fluid", "NAME", "water or air (needs --temperature)")
                .value_parser(["water", "air"])
                .long_help(
                    "Fluid by name: water (IAPWS SR6-08) or air (dry, Sutherland's formula); both need \
                     --temperature. Example: --fluid water",
                )
                .help_heading(fluid),
        )
        .arg(entry(
            "temperature",
            "T",
            "Temperature, such as 25C or 298.15K",
            "Temperature of the fluid, with its unit. Water: -20 to 110 C at 0.1 MPa. \
             Example: --temperature 25C",
        ).allow_hyphen_values(true))
        .arg(entry(
            "gas-pressure",
            "P",
            "Absolute pressure of air [default: 101325 Pa]",
            "Absolute pressure of the gas in the channel. Default: 101325 Pa. Example: \
             --gas-pressure 1.2bar",
        ))
        .arg(entry(
            "viscosity",
            "MU",
            "Viscosity of another fluid, such as 1.2mPa.s",
            "Dynamic viscosity of a Newtonian fluid, above 0, with its unit. Example: --viscosity 1.2mPa.s",
        ))
        .arg(entry(
            "density",
            "RHO",
            "Density of another fluid, such as 1050kg/m^3",
            "Density, above 0, with its unit; needed for the Reynolds number. Example: --density 1050kg/m^3",
        ))
}

/// Heading of what drives a channel.
pub(super) const OPERATING_POINT: &str = "Operating point";

/// A fluid and its operating point.
fn fluid_options(command: Command) -> Command {
    let entry = |name, value, help, long| {
        option(name, value, help)
            .long_help(long)
            .help_heading(OPERATING_POINT)
    };
    fluid_only(command)
        .arg(entry(
            "length",
            "L",
            "Length of the channel, such as 20mm",
            "Length of the channel, above 0, with its unit. Example: --length 20mm",
        ))
        .arg(
            entry(
                "pressure-drop",
                "DP",
                "Pressure drop over the length, such as 30kPa",
                "Pressure drop over the length, above 0, with its unit. Not together with --flow-rate. Example: --pressure-drop 30kPa",
            )
            .conflicts_with("flow-rate"),
        )
        .arg(entry(
            "flow-rate",
            "Q",
            "Flow rate, such as 5uL/min",
            "Volume flow rate, above 0, with its unit. Not together with --pressure-drop. Example: --flow-rate 5uL/min",
        ))
}

fn check() -> Command {
    let command = Command::new("check")
        .about("List every problem of an outline, with place and remedy")
        .after_help("Example: etchwise check traced.csv --unit um");
    common(any_input(command))
}

fn draw() -> Command {
    let mut draw = Command::new("draw")
        .about("Draw a nominal section from process parameters")
        .subcommand_required(true)
        .arg_required_else_help(true)
        .after_help(
            "Example: etchwise draw koh_groove --opening 100um --depth 40um -o groove.toml",
        );
    for kind in kinds() {
        let parameters = kind.parameters.iter().chain(modifiers());
        draw = draw.subcommand(
            common(Command::new(kind.name).about(kind.summary))
                .args(parameters.map(parameter))
                .arg(
                    option("name", "TEXT", "Name of the section")
                        .long_help("Name of the section, for outputs. Example: --name \"inlet\""),
                )
                .arg(flag(
                    "points",
                    "Write the outline as points, not as parameters",
                ))
                .arg(
                    Arg::new("output")
                        .short('o')
                        .long("output")
                        .value_name("FILE")
                        .value_parser(value_parser!(std::path::PathBuf))
                        .help("Write to FILE (.csv: outline in um)")
                        .long_help(
                            "Write to FILE: a section file, or with the ending .csv the outline in \
                             columns in um. - is standard output, the default. Example: -o groove.toml",
                        ),
                ),
        );
    }
    draw
}

fn parameter(info: &'static ParameterInfo) -> Arg {
    let default = info
        .default
        .map_or(String::new(), |d| format!(" [default: {d}]"));
    let arg = Arg::new(info.name)
        .long(info.name.replace('_', "-"))
        .value_name(match info.quantity {
            Quantity::Length => "LENGTH",
            Quantity::Angle => "ANGLE",
            Quantity::Spec | Quantity::SpecList => "SECTION",
            _ => "NUMBER",
        })
        .help(format!("{}{default}", info.meaning))
        .long_help(format!(
            "{}{default}. Example: --{} \"{}\"",
            info.meaning,
            info.name.replace('_', "-"),
            info.example
        ));
    if info.quantity == Quantity::SpecList {
        arg.action(ArgAction::Append)
    } else {
        arg
    }
}
