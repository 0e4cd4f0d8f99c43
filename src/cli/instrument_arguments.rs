//! Options that say how the file of an instrument becomes a section: what can be typed, no meaning yet.

use clap::{Arg, ArgAction, Command, value_parser};

use super::arguments::{flag, option};

/// One option: name, value, short help, long help.
type Row = (&'static str, &'static str, &'static str, &'static str);

/// Options for tables of numbers.
const TABLE: [Row; 7] = [
    (
        "x-unit",
        "UNIT",
        "Unit of positions that the file does not name",
        "Unit of the positions in a trace or height map that does not name it: m, mm, um, nm, angstrom, \
         inch, mil. Never guessed. Example: --x-unit um",
    ),
    (
        "z-unit",
        "UNIT",
        "Unit of heights that the file does not name",
        "Unit of the heights in a trace or height map that does not name it: m, mm, um, nm, angstrom, \
         inch, mil. Never guessed. Example: --z-unit nm",
    ),
    (
        "x-column",
        "COLUMN",
        "Column of the positions: its name or number",
        "Column of the positions by its name in the file or its number from 1. Default: by the names, \
         then the first that rises throughout. Example: --x-column 2",
    ),
    (
        "z-column",
        "COLUMN",
        "Column of the heights: its name or number",
        "Column of the heights by its name in the file or its number from 1. Default: the only one there \
         is besides the positions. Example: --z-column 3",
    ),
    (
        "x-step",
        "LENGTH",
        "Distance of samples in a file without positions",
        "Distance of neighbouring samples along x in a trace or matrix without positions, above 0. \
         Default: from the file. Example: --x-step 0.5um",
    ),
    (
        "y-step",
        "LENGTH",
        "Distance of rows in a matrix without positions",
        "Distance of neighbouring rows of a height map given as a plain matrix, above 0. Default: from \
         the file. Example: --y-step 2um",
    ),
    (
        "decimal",
        "MARK",
        "Decimal mark where it is in doubt: point, comma",
        "Decimal mark of a table where both readings are possible: point or comma. Default: decided on \
         all rows, refused in doubt. Example: --decimal comma",
    ),
];

/// Options for traces, with a value.
const TRACE: [Row; 21] = [
    (
        "groove",
        "N",
        "Number of the channel along the trace",
        "Number, from 1, of the channel along the trace, where there are several. Default: the only one. \
         Example: --groove 2",
    ),
    (
        "shrink-x",
        "SHARE",
        "Shrinkage of a cast along x",
        "How much smaller the part is along x than what was measured: -50 % to 50 %. Lengths along x are \
         multiplied by 1 less this. Default: 0. Example: --shrink-x 1.5%",
    ),
    (
        "shrink-z",
        "SHARE",
        "Shrinkage of a cast in height",
        "How much smaller the part is in height than what was measured: -50 % to 50 %. Heights are \
         multiplied by 1 less this. Default: 0. Example: --shrink-z 1.5%",
    ),
    (
        "level",
        "HOW",
        "Level the trace on: lands, line, local, ends, none",
        "What the reference line goes through: lands, all level stretches beside the channels, piece by \
         piece where one line does not fit them; line, one line in any case; local, the two lands beside \
         each channel; ends, both ends of the trace; none. Default: lands. Example: --level ends",
    ),
    (
        "level-on",
        "ZONES",
        "Level on these stretches of the trace",
        "Stretches of the trace that the reference line is fitted to, from..to, separated by commas. \
         Example: --level-on 0um..40um,160um..200um",
    ),
    (
        "land-zones",
        "ZONES",
        "These stretches of the trace are the lands",
        "Stretches of the trace that are lands, from..to, separated by commas, where those found are not \
         right. Example: --land-zones 0um..40um,160um..200um",
    ),
    (
        "level-fit",
        "FIT",
        "Fit of the reference line: robust, least-squares",
        "How the reference line is fitted: robust, or least-squares. Default: robust. Example: \
         --level-fit least-squares",
    ),
    (
        "bow",
        "DEGREE",
        "Degree of the reference line, 1 to 5",
        "Degree of the polynomial that is taken off: 1, a straight line, to 5. Default: 1. Example: --bow 2",
    ),
    (
        "spike-size",
        "LENGTH",
        "Least height of a spike",
        "Least height of what is taken for a spike, above 0. Default: from the noise of the trace. \
         Example: --spike-size 0.5um",
    ),
    (
        "cutoff",
        "LENGTH",
        "Gaussian profile filter with this cut-off",
        "Smooth the trace with the Gaussian profile filter of ISO 16610-21 with this cut-off, above 0. \
         Default: nothing is smoothed. Example: --cutoff 8um",
    ),
    (
        "repeat",
        "FILE",
        "A further trace of the same line",
        "A further trace of the same line, either way; traces are aligned and averaged, and their \
         scatter is reported. May be given more than once. Example: --repeat back.csv",
    ),
    (
        "tip-radius",
        "LENGTH",
        "Radius of the stylus tip",
        "Radius of the stylus tip, 0 or above. With it or --tip-angle the shape of the tip is taken \
         off. Example: --tip-radius 2um",
    ),
    (
        "tip-angle",
        "ANGLE",
        "Full angle of the stylus cone",
        "Full angle of the cone of the stylus, above 0 and below 180 deg. Default with --tip-radius: 60 deg. \
         Example: --tip-angle 60deg",
    ),
    (
        "walls",
        "ANGLE",
        "True angle of walls that the tip could not reach",
        "Angle against the horizontal of walls that the tip could not reach, above 0 to 90 deg; they \
         are restored at it. Default: as read. Example: --walls 90deg",
    ),
    (
        "lid",
        "HOW",
        "Where the lid lies: both, left, right, fit",
        "Where the lid lies: both, on both edges of the channel; left or right, level on that land; fit, the \
         line that fits both lands best. Default: both. Example: --lid left",
    ),
    (
        "lid-gap",
        "LENGTH",
        "Gap between lands and lid",
        "Distance of the lid above where it would lie (a bond, a film). Default: 0. Example: --lid-gap 2um",
    ),
    (
        "lid-sag",
        "LENGTH",
        "Sag of the lid in the middle",
        "How far the lid sags into the channel in its middle, as an arc; negative: bulges out. Default: 0. \
         Example: --lid-sag 1um",
    ),
    (
        "lid-trace",
        "FILE",
        "Trace of the other half, bonded face to face",
        "Trace of the other half of a bonded pair; it is levelled, turned over and laid on as lid. \
         Example: --lid-trace upper.csv",
    ),
    (
        "lid-offset",
        "LENGTH",
        "Sideways offset of the other half",
        "Sideways offset of the trace given by --lid-trace against the middle of the channel. \
         Default: 0. Example: --lid-offset 5um",
    ),
    (
        "simplify",
        "LENGTH",
        "Thin the outline within this distance",
        "Vertices of the outline may go where it moves by less than this. Default: far below all else. \
         Example: --simplify 10nm",
    ),
    (
        "name",
        "TEXT",
        "Name of the section",
        "Name of the section, for outputs. Default: that of the file. Example: --name \"inlet\"",
    ),
];

/// Options for height maps, with a value.
const MAP: [Row; 3] = [
    (
        "station",
        "LENGTH",
        "Place of the cut along the groove",
        "Place of the cut along the groove, counted from the middle of the map. May be given more than \
         once with map. Default: the mean section. Example: --station 120um",
    ),
    (
        "average",
        "LENGTH",
        "Length of groove averaged for a cut",
        "Length of groove over which each cut is averaged, above 0. Default: one line at a station, all that is \
         there without one. Example: --average 50um",
    ),
    (
        "groove-direction",
        "ANGLE",
        "Direction of the groove against x",
        "Direction of the groove against the x axis, anticlockwise, -180 to 180 deg. Default: found. \
         Example: --groove-direction 26deg",
    ),
];

/// Options for pictures, with a value.
const PICTURE: [Row; 11] = [
    (
        "scale-y",
        "LENGTH",
        "Height of a pixel, where it is not its width",
        "Height of one pixel, where it differs from its width (--scale). Default: as --scale. Example: \
         --scale-y 0.2um",
    ),
    (
        "tilt",
        "ANGLE",
        "Tilt of the stage, or of the face: face:20deg",
        "Tilt of the stage, with the face square to the surface of the sample: heights are divided by its sine; \
         or face:ANGLE, how far the face is turned from the view: heights are divided by its cosine. \
         Example: --tilt 70deg",
    ),
    (
        "crop",
        "BOX",
        "Part of the picture to use: X,Y,WIDTH,HEIGHT",
        "Part of the picture to use, in pixels from its upper left corner: X,Y,WIDTH,HEIGHT. Default: \
         all, less the data bar. Example: --crop 0,0,1024,680",
    ),
    (
        "page",
        "N",
        "Page of a picture file with several",
        "Page, from 1, of a TIFF with several. Default: the only one. Example: --page 2",
    ),
    (
        "channel",
        "CHANNEL",
        "Channel to use: grey, red, green, blue",
        "What of a colour picture is used: grey, red, green or blue. Default: grey. Example: \
         --channel green",
    ),
    (
        "fluid-is",
        "TONE",
        "The channel in the picture is dark or bright",
        "Whether the channel is the dark or the bright part of the picture. Default: found where \
         it is clear. Example: --fluid-is dark",
    ),
    (
        "threshold",
        "LEVEL",
        "Grey level of the wall: otsu, a level, two places",
        "Grey level at which the wall is taken: otsu (Otsu 1979), a grey value, a share of the full range \
         such as 45%, or half way between the levels at two places in pixels, in the fluid and in the \
         wall: X1,Y1:X2,Y2. Default: otsu. Example: --threshold 45%",
    ),
    (
        "denoise",
        "FILTER",
        "Denoise first: median:PIXELS or gauss:PIXELS",
        "Filter before the wall is sought: median:RADIUS or gauss:SIGMA, in pixels. Default: none. \
         Example: --denoise median:1",
    ),
    (
        "region",
        "WHICH",
        "Which region is the channel: largest, X,Y or N",
        "Which region is the channel: largest; the one at X,Y in pixels; or its number N in order of \
         size. Default: the only one of its size. Example: --region 512,300",
    ),
    (
        "islands-above",
        "LENGTH",
        "Side of the smallest square island that is kept",
        "Islands in the channel smaller than a square of this side are filled up, 0 or above. Default: \
         30 pixels in area. Example: --islands-above 2um",
    ),
    (
        "reach-levels",
        "SHARES",
        "Levels of the grey edge that bound the wall",
        "Between which shares of the step in grey the wall lies for sure, LOW,HIGH. Default: 20%,80%. \
         Example: --reach-levels 10%,90%",
    ),
];

const TABLE_HEADING: &str = "Columns of text";
const TRACE_HEADING: &str = "Trace of a profilometer";
const MAP_HEADING: &str = "Height map";
const PICTURE_HEADING: &str = "Picture of a section";

/// The commands that read the files of instruments.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Kind {
    Trace,
    Map,
    Image,
}

impl Kind {
    /// Name of the command and of what it reads.
    pub(super) fn word(self) -> &'static str {
        match self {
            Self::Trace => "trace",
            Self::Map => "map",
            Self::Image => "image",
        }
    }

    pub(super) fn about(self) -> &'static str {
        match self {
            Self::Trace => "From the trace of a profilometer to sections of its channels",
            Self::Map => "From a height map to sections across its channels",
            Self::Image => "From a picture of a section to its outline",
        }
    }

    pub(super) fn example(self) -> &'static str {
        match self {
            Self::Trace => {
                "Example: etchwise trace scan.csv --x-unit um --z-unit nm --tip-radius 2um \\\n  \
                 --tip-angle 60deg -o wafer.toml --picture check.png"
            }
            Self::Map => {
                "Example: etchwise map surface.x3p --station 0um --average 50um -o groove.toml \\\n  \
                 --picture check.png"
            }
            Self::Image => {
                "Example: etchwise image cut.tif --scale 0.21um --fluid-is dark -o cut.toml \\\n  \
                 --picture check.png"
            }
        }
    }
}

/// Which options the help shows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Shown {
    /// All of them, in the long help.
    InLongHelp,
    /// Those of one kind of file.
    Only(Kind),
}

impl Shown {
    fn put_on(self, arg: Arg, kinds: &[Kind]) -> Arg {
        match self {
            Self::InLongHelp => arg.hide_short_help(true),
            Self::Only(kind) => arg.hide(!kinds.contains(&kind)),
        }
    }
}

/// The kinds of file that an option is for.
fn kinds_of(name: &str) -> &'static [Kind] {
    let is_in = |rows: &[Row]| rows.iter().any(|row| row.0 == name);
    match name {
        "name" | "simplify" => &[Kind::Trace, Kind::Map, Kind::Image],
        "y-step" | "no-plane" => &[Kind::Map],
        "repeat" | "lid-trace" | "lid-offset" => &[Kind::Trace],
        "tilt-corrected" | "allow-large" => &[Kind::Image],
        _ if is_in(&MAP) => &[Kind::Map],
        _ if is_in(&PICTURE) => &[Kind::Image],
        _ => &[Kind::Trace, Kind::Map],
    }
}

/// Whether an option has a meaning for a kind of file, by the word of the kind.
pub(super) fn is_for(name: &str, kind: &str) -> bool {
    kinds_of(name).iter().any(|k| k.word() == kind)
}

/// The switch that shows all settings.
pub(super) fn show_settings(command: Command) -> Command {
    command.arg(
        flag("show-settings", "Say what was decided and why").long_help(
            "Say on standard error which settings for an instrument's file hold and which of them were given, \
             and every step with its reason. Example: --show-settings",
        ),
    )
}

fn add(command: Command, rows: &[Row], heading: &'static str, shown: Shown) -> Command {
    rows.iter()
        .fold(command, |command, &(name, value, help, long)| {
            let arg = entry(name, value, help, long).help_heading(heading);
            command.arg(shown.put_on(arg, kinds_of(name)))
        })
}

/// An option; those that name files or may come more than once are told by their names.
fn entry(name: &'static str, value: &'static str, help: &'static str, long: &'static str) -> Arg {
    let arg = option(name, value, help)
        .long_help(long)
        .allow_hyphen_values(true);
    match name {
        "repeat" => arg
            .value_parser(value_parser!(std::path::PathBuf))
            .action(ArgAction::Append),
        "lid-trace" => arg.value_parser(value_parser!(std::path::PathBuf)),
        "station" => arg.action(ArgAction::Append),
        "groove" | "page" => arg.value_parser(value_parser!(u32).range(1..)),
        "bow" => arg.value_parser(value_parser!(u8).range(1..=5)),
        "decimal" => arg.value_parser(["point", "comma"]),
        "level" => arg
            .value_parser(["lands", "line", "local", "ends", "none"])
            .conflicts_with("level-on"),
        "level-fit" => arg.value_parser(["robust", "least-squares"]),
        "lid" => arg
            .value_parser(["both", "left", "right", "fit"])
            .conflicts_with("lid-trace"),
        "lid-offset" => arg.requires("lid-trace"),
        "channel" => arg.value_parser(["grey", "red", "green", "blue"]),
        "fluid-is" => arg.value_parser(["dark", "bright"]),
        "scale-y" => arg.requires("scale"),
        "tilt" => arg.conflicts_with("tilt-corrected"),
        _ => arg,
    }
}

/// Options without a value: name, heading, short help, long help.
const SWITCHES: [(&str, &str, &str, &str); 5] = [
    (
        "invert",
        TRACE_HEADING,
        "Turn over: the trace is of a mould master or a cast",
        "Turn the heights over: the trace is of a mould master or a cast, where the channel is a ridge. \
         Example: --invert",
    ),
    (
        "keep-spikes",
        TRACE_HEADING,
        "Keep spikes as they are",
        "Keep what looks like spikes or dust as it is. Example: --keep-spikes",
    ),
    (
        "no-plane",
        MAP_HEADING,
        "Take no plane off",
        "Take no plane off the height map before it is cut. Example: --no-plane",
    ),
    (
        "tilt-corrected",
        PICTURE_HEADING,
        "Heights are right in spite of the tilt in the file",
        "The picture is corrected for the tilt that its file states. Example: --tilt-corrected",
    ),
    (
        "allow-large",
        PICTURE_HEADING,
        "Accept pictures above 200 million pixels",
        "Accept pictures above 200 million pixels. Example: --allow-large",
    ),
];

/// Adds the options for every kind of instrument.
pub(super) fn instrument_options(command: Command, shown: Shown) -> Command {
    let mut command = command;
    for (rows, heading) in [
        (&TABLE[..], TABLE_HEADING),
        (&TRACE[..], TRACE_HEADING),
        (&MAP[..], MAP_HEADING),
        (&PICTURE[..], PICTURE_HEADING),
    ] {
        command = add(command, rows, heading, shown);
    }
    for (name, heading, help, long) in SWITCHES {
        let arg = flag(name, help).long_help(long).help_heading(heading);
        command = command.arg(shown.put_on(arg, kinds_of(name)));
    }
    command
}

/// Names of all options for instruments, in the order of the help.
pub(super) fn option_names() -> impl Iterator<Item = &'static str> {
    let of = |rows: &'static [Row]| rows.iter().map(|row| row.0);
    of(&TABLE)
        .chain(of(&TRACE))
        .chain(of(&MAP))
        .chain(of(&PICTURE))
        .chain(SWITCHES.iter().map(|row| row.0))
}

/// What holds where an option is not given, in the words of its help.
pub(super) fn default_of(name: &str) -> &'static str {
    let rows = TABLE.iter().chain(&TRACE).chain(&MAP).chain(&PICTURE);
    let help = rows.filter(|row| row.0 == name).map(|row| row.3).next();
    let rest = help.and_then(|text| text.split_once("Default: "));
    let sentence = rest.and_then(|(_, rest)| rest.split_once(". Example: "));
    sentence.map_or("nothing", |(default, _)| default)
}
