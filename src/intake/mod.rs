//! From files to sections: the only place that reads files.
//!
//! A section comes as a section file (TOML), as an outline in columns of text, or as an SVG drawing with
//! a stated scale; which one it is shows in the content, never in the file name. Coordinates leave here
//! in metres, `y` upwards. No unit is guessed: without one reading stops.

#![expect(
    clippy::disallowed_methods,
    reason = "intake is the layer that reads files"
)]

mod columns;
mod curve_flatten;
mod delimited_text;
mod height_map;
mod limits;
mod loop_nesting;
mod micrograph;
mod outline_svg;
mod outline_text;
mod plausibility;
mod provenance;
mod read_error;
mod read_hints;
mod section;
mod section_file;
mod section_reach;
mod section_write;
mod source_text;
mod staircase;
mod step;
mod svg_path;
mod svg_shapes;
mod svg_transform;
mod toml_values;
mod trace;
mod wall_tables;

pub use height_map::{HeightMap, MapProblem, map_from_bytes};
pub use limits::{MAX_FILE_BYTES, MAX_MARKUP_BYTES, MAX_VERTICES};
pub use micrograph::MicrographProblem;
pub use provenance::{Provenance, SectionKind};
pub use read_error::{Place, ReadError, ReadErrorKind, ReadProblem};
pub use section::{Extras, ReadOptions, Section, read_section, section_from_bytes};
pub use section_reach::{Reach, ReachSection};
pub use section_write::to_toml;
pub use step::Step;
pub use trace::{
    Change, ChangeKind, CorrectedTrace, Decimal, GrooveProblem, GrooveSection, LidAlternative,
    Profile, RawTrace, TableAxis, TableKind, TableOptions, TableProblem, TraceProblem, Zone,
    table_kind, trace_from_bytes,
};
