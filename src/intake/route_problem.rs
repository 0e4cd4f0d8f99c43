//! What can be wrong with a route file beyond its form: order, lengths, counts, names, section files.

use crate::units::format_length;

/// Largest number of equal branches of one segment.
pub const MAX_PARALLEL: usize = 10_000;
/// Largest relative standard uncertainty of a branch that is taken.
pub const MAX_SPREAD: f64 = 0.5;

/// What is wrong with a route.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum RouteProblem {
    /// There is no segment.
    #[error("the route has no segment")]
    Empty,
    /// A list of branches holds none.
    #[error("there is no branch")]
    NoBranch,
    /// A length or position beyond all channels.
    #[error("{} is outside what a channel can have: lengths from 1 nm, positions within 1 km", format_length(*length))]
    Outside {
        /// The length, m.
        length: f64,
    },
    /// A name is used twice.
    #[error("the name `{name}` is used for two {of}")]
    SameName {
        /// The name.
        name: String,
        /// Of what.
        of: &'static str,
    },
    /// A name is empty.
    #[error("the name is empty")]
    NoName,
    /// A station lies before the one above it.
    #[error(
        "station {number} is at {}, before station {} at {}",
        format_length(*at),
        number - 1,
        format_length(*before)
    )]
    OutOfOrder {
        /// Number of the station, from 1.
        number: usize,
        /// Its position, m.
        at: f64,
        /// Position of the one before, m.
        before: f64,
    },
    /// Two stations are at one place.
    #[error(
        "stations {} and {number} are both at {}",
        number - 1,
        format_length(*at)
    )]
    SamePlace {
        /// Number of the second, from 1.
        number: usize,
        /// Their position, m.
        at: f64,
    },
    /// A length that is not above zero.
    #[error("the length is {}; it must be above zero", format_length(*length))]
    NotPositive {
        /// The length, m.
        length: f64,
    },
    /// One station makes no length.
    #[error("there is one station only, so the length is not known")]
    OneStation,
    /// Two ways to give the same thing.
    #[error("both `{first}` and `{second}` are given")]
    Both {
        /// The first.
        first: &'static str,
        /// The second.
        second: &'static str,
    },
    /// Neither of two keys is there.
    #[error("neither `{first}` nor `{second}` is given")]
    Neither {
        /// The first.
        first: &'static str,
        /// The second.
        second: &'static str,
    },
    /// More stations than allowed.
    #[error("the route has more than {limit} stations")]
    TooManyStations {
        /// The limit.
        limit: usize,
    },
    /// A number of equal branches outside its limits.
    #[error("`parallel` must be a whole number from 1 to {MAX_PARALLEL}")]
    Parallel,
    /// A spread outside its limits.
    #[error(
        "the spread is {}; from 0 to {} (relative standard uncertainty of K) is taken",
        spread,
        MAX_SPREAD
    )]
    Spread {
        /// As a share.
        spread: f64,
    },
    /// A rule of interpolation that is not known.
    #[error("`{word}` is not a rule of interpolation")]
    Interpolation {
        /// As written.
        word: String,
        /// Those that are known.
        known: String,
    },
    /// A section file that cannot be used.
    #[error("the section file cannot be used: {message}")]
    Section {
        /// What its reader says, with the place in it.
        message: String,
        /// What its reader advises.
        hint: String,
    },
    /// The route itself as a section, or standard input.
    #[error("`-` is no section file")]
    StandardInput,
}

impl RouteProblem {
    /// What the user can do.
    pub(super) fn hint(&self) -> String {
        match self {
            Self::Empty => "add a [[segment]] with `name`, `length` and `section`".to_owned(),
            Self::NoBranch => "add a [[segment.branch]], or take `branch` out".to_owned(),
            Self::Outside { .. } => "check the number and its unit".to_owned(),
            Self::SameName { .. } => "give each its own name".to_owned(),
            Self::NoName => "write a name".to_owned(),
            Self::OutOfOrder { .. } => {
                "list the stations in the direction of flow, with positions that grow".to_owned()
            }
            Self::SamePlace { .. } => {
                "a sudden change of section is the end of one segment and the begin of the next: make two \
                 segments"
                    .to_owned()
            }
            Self::NotPositive { .. } => "write a length such as \"20 mm\"".to_owned(),
            Self::OneStation => {
                "add a second station, or give `length` and one `section` for a constant stretch"
                    .to_owned()
            }
            Self::Both { .. } => "keep one of the two".to_owned(),
            Self::Neither { first, second } => format!("add `{first}` or `{second}`"),
            Self::TooManyStations { .. } => {
                "raise it by --max-stations, or thin the stations out".to_owned()
            }
            Self::Parallel => "write for example parallel = 4".to_owned(),
            Self::Spread { .. } => "write for example spread = \"5 %\"".to_owned(),
            Self::Interpolation { known, .. } => format!("known: {known}"),
            Self::Section { hint, .. } => hint.clone(),
            Self::StandardInput => "name the file of a section".to_owned(),
        }
    }
}
