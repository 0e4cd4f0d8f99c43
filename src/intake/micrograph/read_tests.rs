//! What the outline of a picture is worth: against shapes whose size is known.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use std::f64::consts::PI;

use super::test_pictures::{Drawn, micrometre, read};
use super::*;

/// Relative differences of area and perimeter from a shape, and the section.
fn differences(drawn: &Drawn, area: f64, perimeter: f64) -> [f64; 2] {
    let outline = read(drawn).outline;
    [
        outline.area() / (area * 1e-12) - 1.0,
        outline.wetted_perimeter() / (perimeter * 1e-6) - 1.0,
    ]
}

#[test]
fn measure_discs() {
    for radius in [10.0, 20.0, 40.0, 80.0, 200.0] {
        for blur in [0.0, 0.5, 1.0, 2.0, 3.0] {
            let size = (2.0 * radius + 40.0) as usize;
            let c = size as f64 / 2.0;
            let drawn = Drawn::disc(size, [c + 0.3, c - 0.2], radius);
            let drawn = if blur > 0.0 {
                drawn.blurred(blur)
            } else {
                drawn
            };
            let [a, p] = differences(&drawn, PI * radius * radius, 2.0 * PI * radius);
            let s = read(&drawn);
            println!(
                "r {radius} blur {blur}: area {a:.2e} perimeter {p:.2e} vertices {} edge {:?} reach {}",
                s.contours[0].len(),
                s.edge_width,
                s.reach.is_some()
            );
        }
    }
    for noise in [0.02, 0.05, 0.1] {
        for blur in [0.0, 1.0, 2.0] {
            let drawn = Drawn::disc(200, [100.3, 99.8], 60.0);
            let drawn = if blur > 0.0 {
                drawn.blurred(blur)
            } else {
                drawn
            }
            .noisy(noise);
            for denoise in [Denoise::None, Denoise::Median(1), Denoise::Gaussian(1.5)] {
                let options = MicrographOptions {
                    denoise,
                    ..micrometre()
                };
                match read_micrograph(&drawn.png(), &options) {
                    Ok(s) => {
                        let a = s.outline.area() / (PI * 3600.0 * 1e-12) - 1.0;
                        let p = s.outline.wetted_perimeter() / (2.0 * PI * 60.0 * 1e-6) - 1.0;
                        println!(
                            "noise {noise} blur {blur} {denoise:?}: area {a:.2e} perimeter {p:.2e} {} edge {:?} reach {} {:?}",
                            s.contours[0].len(),
                            s.edge_width,
                            s.reach.is_some(),
                            s.warnings
                                .iter()
                                .map(|w| w.message.clone())
                                .collect::<Vec<_>>()
                        );
                    }
                    Err(e) => println!("noise {noise} blur {blur} {denoise:?}: {e}"),
                }
            }
        }
    }
}
