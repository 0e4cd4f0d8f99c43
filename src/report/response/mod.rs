//! The views of a response table: text, JSON, CSV and picture, all of one [`ResponseDocument`].

mod csv;
mod document;
mod formula;
mod json;
mod map;
mod picture;
mod plot;
mod text;

pub use csv::response_csv;
pub use document::ResponseDocument;
pub use formula::formula_text;
pub use json::{RESPONSE_SCHEMA, response_json};
pub use picture::{draw_response, response_picture};
pub use text::response_text;
