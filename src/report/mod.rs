//! Answers out: text, JSON, CSV, field files and pictures, and the only code that writes files.
//!
//! Every format is a view of one [`SolveDocument`].

mod card_csv;
mod card_document;
mod card_json;
mod card_modelica;
mod card_text;
mod check_axes;
mod check_curves;
mod check_dimensions;
mod check_image;
mod check_lanes;
mod check_legend;
mod check_map;
mod check_outside;
mod check_page;
mod check_picture;
mod colour_map;
mod contour;
mod csv;
mod csv_locale;
mod curve_thinning;
mod document;
mod drawing;
mod json;
mod json_accuracy;
mod json_film;
mod json_reach;
mod json_values;
mod json_wall;
mod label_box;
mod line_style;
mod network_csv;
mod network_document;
mod network_json;
mod network_text;
mod numbers;
mod picture;
mod picture_furniture;
mod picture_layout;
mod png;
mod reading_document;
mod reading_json;
mod reading_text;
mod response;
mod route_card_json;
mod route_csv;
mod route_document;
mod route_json;
mod route_picture;
mod route_text;
mod route_vtk;
mod route_wall_vtk;
mod sensitivity_csv;
mod sensitivity_document;
mod sensitivity_json;
mod sensitivity_labels;
mod sensitivity_picture;
mod sensitivity_text;
mod svg;
mod table;
mod text;
mod text_accuracy;
mod text_cost;
mod text_operation;
mod text_reach;
mod text_wall;
mod ticks;
mod vtk;
mod wall_crowds;
mod wall_csv;
mod wall_picture;
mod write;

pub use card_csv::card_csv;
pub use card_document::{CardDocument, CardRecord, FailedCard};
pub use card_json::{CARD_JSON_SCHEMA, CARD_SCHEMA, card_json};
pub use card_modelica::card_modelica;
pub use card_text::card_text;
pub use check_page::{check_picture_bytes, draw_check};
pub use check_picture::{
    Band, BandKind, CheckPicture, Curve, CurveKind, CurvePanel, Cut, Dimension, ImagePanel,
    MapPanel, Mark, MarkKind, Panel, Region, RegionKind,
};
pub use csv::{CsvError, to_csv};
pub use csv_locale::CsvLocale;
pub use document::{ReachRecord, Scale, SolveDocument, SourceRecord};
pub use drawing::{Anchor, Colour, Drawing, Item, Raster, TextSize};
pub use json::{SCHEMA, to_json};
pub use network_csv::{network_csv, network_nodes_csv};
pub use network_document::{NetworkCardRecord, NetworkDocument};
pub use network_json::{NETWORK_JSON_SCHEMA, NETWORK_SCHEMA, network_json};
pub use network_text::network_text;
pub use picture::{PictureError, PictureFormat, draw_velocity, picture_bytes};
pub use png::{PngError, to_png};
pub use reading_document::{
    AlternativeRecord, ConductanceRecord, MeasureRecord, ReadingDocument, SectionRecord, StepRecord,
};
pub use reading_json::reading_json;
pub use reading_text::{reading_text, settings_text};
pub use response::{
    RESPONSE_SCHEMA, ResponseDocument, draw_response, formula_text, response_csv, response_json,
    response_picture, response_text,
};
pub use route_card_json::{RouteCardError, route_card_json};
pub use route_csv::route_csv;
pub use route_document::{RouteDocument, RouteSectionRecord};
pub use route_json::{ROUTE_JSON_SCHEMA, ROUTE_SCHEMA, route_json};
pub use route_picture::{draw_route, route_picture};
pub use route_text::route_text;
pub use route_vtk::{route_pvd, route_vtu};
pub use route_wall_vtk::route_wall_vtp;
pub use sensitivity_csv::sensitivity_csv;
pub use sensitivity_document::SensitivityDocument;
pub use sensitivity_json::{SENSITIVITY_SCHEMA, sensitivity_json};
pub use sensitivity_picture::sensitivity_picture;
pub use sensitivity_text::sensitivity_text;
pub use svg::to_svg;
pub use text::{TextOptions, to_text};
pub use text_cost::cost_text;
pub use vtk::{VtkError, field_legacy_vtk, field_vti, wall_vtp};
pub use wall_csv::wall_csv;
pub use wall_picture::{draw_wall, wall_picture_bytes};
pub use write::{
    OutputFile, WriteError, check_target, check_targets, legacy_vtk_path, vtk_paths, write_file,
    write_files,
};
