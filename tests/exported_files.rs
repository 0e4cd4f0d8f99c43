//! Every exported format is read back by an independent reader and compared with the result it shows.
#![expect(
    clippy::unwrap_used,
    clippy::panic,
    reason = "helpers of tests stop the test"
)]

mod report_samples;

#[path = "exported/check_picture.rs"]
mod check_picture;
#[path = "exported/check_samples.rs"]
mod check_samples;
#[path = "exported/field_files.rs"]
mod field_files;
#[path = "exported/json_and_csv.rs"]
mod json_and_csv;
#[path = "exported/pictures.rs"]
mod pictures;
#[path = "exported/text.rs"]
mod text;
#[path = "exported/wall.rs"]
mod wall;
#[path = "exported/writing.rs"]
mod writing;

/// 100 um by 50 um, corner off the origin.
fn sample() -> report_samples::Sample {
    report_samples::rectangle([3e-3, -2e-3], 100e-6, 50e-6, 32)
}

fn close(a: f64, b: f64, tolerance: f64) {
    assert!(
        (a - b).abs() <= tolerance * b.abs(),
        "{a} against {b}, relative tolerance {tolerance}"
    );
}
