//! Micrographs: from a picture of a section to its outline.

mod micrograph_problem;

pub use micrograph_problem::MicrographProblem;
