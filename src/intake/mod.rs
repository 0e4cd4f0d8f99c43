//! From files to sections: the only place that reads files.
//!
//! A section comes as a section file (TOML), as an outline in columns of text, or as an SVG drawing with
//! a stated scale; which one it is shows in the content, never in the file name. Coordinates leave here
//! in metres, `y` upwards. No unit is guessed: without one reading stops.

#![expect(
    clippy::disallowed_methods,
    reason = "intake is the layer that reads files"
)]

mod card_file;
mod columns;
mod content_kind;
mod curve_flatten;
mod delimited_text;
mod height_map;
mod instrument;
mod instrument_sections;
mod limits;
mod loop_nesting;
pub mod micrograph;
mod network_entry;
mod network_file;
mod network_problem;
mod order_statistics;
mod outline_svg;
mod outline_text;
mod plausibility;
mod provenance;
mod read_error;
mod read_hints;
mod route_file;
mod route_problem;
mod section;
mod section_file;
mod section_reach;
mod section_write;
mod source_table;
mod source_text;
mod staircase;
mod step;
mod svg_path;
mod svg_shapes;
mod svg_transform;
mod toml_values;
mod trace;
mod wall_tables;

pub use card_file::{CardContent, CardFluid, CardKind, CardLaw};
pub use height_map::{
    CutOptions, HeightMap, MAX_MAP_POINTS, MapCut, MapCuts, MapProblem, SurfaceContent,
    SurfaceFormat, cut, heights_csv, map_from_bytes, read_surface, surface_format,
};
pub use instrument::{
    InstrumentData, InstrumentOptions, InstrumentReading, Intake, MapReading, TraceReading,
    instrument_from_bytes, read_instrument,
};
pub use limits::{MAX_FILE_BYTES, MAX_MARKUP_BYTES, MAX_VERTICES};
pub use micrograph::{
    Channel, Denoise, HistogramSummary, LARGEST_PIXELS, Levels, MicrographOptions,
    MicrographProblem, MicrographSection, PixelBox, PixelLoop, Preview, Region, RegionFound,
    ScaleCandidate, Threshold, Tilt, Tone, is_picture, read_micrograph,
};
pub use network_file::{
    NetworkFile, NetworkFileCard, NetworkFileChannel, NetworkFileCondition, NetworkFileNode,
    read_network,
};
pub use network_problem::NetworkProblem;
pub use provenance::{Provenance, SectionKind};
pub use read_error::{Place, ReadError, ReadErrorKind, ReadProblem};
pub use route_file::{
    FileBranch, FileSection, FileSegment, FileStation, INTERPOLATION_WORDS, MAX_STATIONS,
    RouteFile, read_route, route_from_bytes,
};
pub use route_problem::{MAX_PARALLEL, MAX_SPREAD, RouteProblem};
pub use section::{Extras, ReadOptions, Section, read_section, section_from_bytes};
pub use section_reach::{Reach, ReachSection};
pub use section_write::to_toml;
pub use step::Step;
pub use trace::{
    Change, ChangeKind, CorrectedTrace, CorrectionOptions, Decimal, GrooveProblem, GrooveSection,
    IsotropicFit, KOH_ANGLE, KohFit, LANDS_DIFFER, Levelling, LidAlternative, LidChoice, LineFit,
    MAX_BOW, Profile, RawTrace, RepeatPlace, Repeatability, SLIVER, SectionOptions, StepHeight,
    THINNING, TableAxis, TableKind, TableOptions, TableProblem, Tip, TipFlank, TraceProblem,
    TrenchNumbers, WallNumbers, Zone, correct, sections, step_height, table_kind, trace_from_bytes,
};
