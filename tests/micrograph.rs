//! Conductance of sections read from pictures, against exact circles.
//!
//! The pictures are drawn here: each grey is the mean over its pixel. For a circle K = pi r^4 / 8 (Poiseuille's
//! law), so a wall that is off by d changes K by 4 d / r.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use etchwise::flow::{SolveOptions, solve_outline};
use etchwise::geometry::Outline;
use etchwise::intake::{MicrographOptions, read_micrograph};

/// Share of a pixel at a distance from the centre that lies beyond a radius, by 32 x 32 samples.
fn wall_share(x: u32, y: u32, centre: [f64; 2], radius: f64) -> f64 {
    let middle = (f64::from(x) + 0.5 - centre[0]).hypot(f64::from(y) + 0.5 - centre[1]);
    if (middle - radius).abs() > 1.0 {
        return f64::from(u8::from(middle > radius));
    }
    let at = |k: u32| (f64::from(k) + 0.5) / 32.0;
    let hits = (0..32 * 32)
        .filter(|k| {
            let dx = f64::from(x) + at(k % 32) - centre[0];
            let dy = f64::from(y) + at(k / 32) - centre[1];
            dx.hypot(dy) > radius
        })
        .count();
    hits as f64 / 1024.0
}

/// The outline of a disc, read from a 16-bit picture of it at one micrometre a pixel.
fn outline_of_disc(radius: f64) -> Outline {
    let size = (2.0 * radius + 30.0) as u32;
    let centre = [radius + 15.3, radius + 14.8];
    let picture = image::ImageBuffer::<image::Luma<u16>, Vec<u16>>::from_fn(size, size, |x, y| {
        image::Luma([(5_000.0 + 50_000.0 * wall_share(x, y, centre, radius)).round() as u16])
    });
    let mut bytes = std::io::Cursor::new(Vec::new());
    picture
        .write_to(&mut bytes, image::ImageFormat::Png)
        .unwrap();
    let options = MicrographOptions {
        scale: Some(1e-6),
        ..MicrographOptions::default()
    };
    read_micrograph(&bytes.into_inner(), &options)
        .unwrap()
        .outline
}

#[test]
fn discs_read_from_pictures_have_the_conductance_of_circles() {
    for (radius, allowed) in [(40.0, 5e-3), (200.0, 1e-3)] {
        let outline = outline_of_disc(radius);
        let metres = radius * 1e-6;
        let solved = solve_outline(&outline, &SolveOptions::default()).unwrap();
        let exact = std::f64::consts::PI * metres.powi(4) / 8.0;
        let difference = solved.flow.conductance.value / exact - 1.0;
        println!("radius {radius} pixels: K off by {difference:.2e}");
        assert!(
            difference.abs() < allowed,
            "radius {radius}: K off by {difference}"
        );
        let perimeter = outline.wetted_perimeter() / (std::f64::consts::TAU * metres) - 1.0;
        assert!(
            perimeter.abs() < allowed,
            "radius {radius}: perimeter off by {perimeter}"
        );
    }
}
