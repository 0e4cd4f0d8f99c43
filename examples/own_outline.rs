//! An outline built in code: a channel with a tilted square post, checked, solved and drawn.
//!
//! Run with `cargo run --release --example own_outline`. Lengths are metres, `y` upwards; the direction of
//! a loop and a repeated last vertex do not matter. The picture goes to the folder for temporary files.

#![expect(clippy::print_stdout, reason = "an example shows its numbers")]

use std::error::Error;

use etchwise::flow::{SolveOptions, solve_outline};
use etchwise::geometry::{Loop, Lumen, Outline};
use etchwise::report::{PictureFormat, SolveDocument, picture_bytes, write_file};

/// Nodes of the field behind the picture, at most about.
const PICTURE_NODES: usize = 200_000;

/// A loop from coordinates in micrometres.
fn micrometres(points: &[[f64; 2]]) -> Loop {
    Loop::new(points.iter().map(|p| [p[0] * 1e-6, p[1] * 1e-6]).collect())
}

fn main() -> Result<(), Box<dyn Error>> {
    let wall = [[0.0, 0.0], [200.0, 0.0], [194.0, -60.0], [6.0, -60.0]];
    let post = [
        [100.0, -18.0],
        [112.0, -30.0],
        [100.0, -42.0],
        [88.0, -30.0],
    ];
    let outline = Outline {
        lumens: vec![Lumen {
            outer: micrometres(&wall),
            islands: vec![micrometres(&post)],
        }],
    }
    .oriented();

    let problems = outline.problems();
    for problem in problems.errors() {
        println!("{problem}: {}", problem.remedy());
    }
    if problems.has_errors() {
        return Err("the outline cannot be used".into());
    }

    let solved = solve_outline(&outline, &SolveOptions::default())?;
    let flow = &solved.flow;
    println!("area          {:.5e} m^2", flow.geometry.area);
    println!(
        "conductance   {:.6e} m^4, estimated error {:.4} %",
        flow.conductance.value,
        100.0 * flow.conductance.relative()
    );
    println!("peak / mean   {:.4}", flow.peak.to_mean.value);
    for warning in &flow.warnings {
        println!("{}: {}", warning.code.as_str(), warning.message);
    }

    let document = SolveDocument::new("trapezoid with a post", flow);
    let field = solved.dense_field(PICTURE_NODES);
    let picture = picture_bytes(&document, solved.outline(), &field, PictureFormat::Png)?;
    let name = format!("etchwise_own_outline_{}.png", std::process::id());
    let path = std::env::temp_dir().join(name);
    write_file(&path, &picture, &[])?;
    println!("picture       {}", path.display());
    Ok(())
}
