//! What the outline of a picture is worth: against shapes whose size is known.

use std::f64::consts::PI;

use super::test_pictures::{Drawn, micrometre, read};
use super::*;
use crate::warning::Code;

/// Relative differences of area and perimeter from those of a shape.
fn differences(section: &MicrographSection, area: f64, perimeter: f64) -> [f64; 2] {
    [
        section.outline.area() / (area * 1e-12) - 1.0,
        section.outline.wetted_perimeter() / (perimeter * 1e-6) - 1.0,
    ]
}

fn disc(radius: f64, shift: [f64; 2]) -> Drawn {
    let size = (2.0 * radius + 40.0) as usize;
    let middle = size as f64 / 2.0;
    Drawn::disc(size, shift.map(|s| middle + s), radius)
}

fn has(section: &MicrographSection, code: Code) -> bool {
    section.warnings.iter().any(|w| w.code == code)
}

#[test]
fn sharp_discs_have_their_area_and_perimeter() {
    for (radius, allowed) in [(20.0, 1e-3), (40.0, 3e-4), (200.0, 1e-4)] {
        for shift in [[0.0, 0.0], [0.5, 0.5], [0.3, -0.2]] {
            let section = read(&disc(radius, shift));
            let [area, perimeter] = differences(&section, PI * radius * radius, 2.0 * PI * radius);
            assert!(area.abs() < allowed, "radius {radius}: area off by {area}");
            assert!(
                perimeter.abs() < allowed,
                "radius {radius}: perimeter off by {perimeter}"
            );
            assert!(section.reach.is_none() && !has(&section, Code::GreyEdge));
            assert_eq!(section.contours.len(), 1);
            assert!(section.outline.problems().list.is_empty());
        }
    }
}

#[test]
fn blurred_discs_shrink_as_foreseen_and_their_reach_holds_the_true_one() {
    for (radius, sigma) in [(40.0, 1.0), (40.0, 2.0), (80.0, 3.0)] {
        let section = read(&disc(radius, [0.3, -0.2]).blurred(sigma));
        // The wall moves in by s^2 / (2 r), with the blur of the pixels themselves (variance 1/12).
        let shift = (sigma * sigma + 1.0 / 12.0) / (2.0 * radius);
        let foreseen = (1.0 - shift / radius).powi(2) - 1.0;
        let [area, perimeter] = differences(&section, PI * radius * radius, 2.0 * PI * radius);
        assert!(
            (area - foreseen).abs() < 4e-4,
            "area off by {area}, foreseen {foreseen}"
        );
        assert!((perimeter - 0.5 * foreseen).abs() < 5e-4, "{perimeter}");
        assert!(has(&section, Code::GreyEdge));
        let width = section.edge_width.unwrap();
        assert!((width / (1.683 * sigma) - 1.0).abs() < 0.15, "{width}");
        let reach = section.reach.unwrap();
        let (inner, outer) = (reach.inner.unwrap().outline, reach.outer.unwrap().outline);
        assert!(inner.proven_inside(&section.outline).is_ok());
        assert!(section.outline.proven_inside(&outer).is_ok());
        let exact = PI * radius * radius * 1e-12;
        assert!(inner.area() < exact && exact < outer.area());
    }
}

#[test]
fn noise_makes_the_perimeter_long() {
    let radius = 60.0;
    for (blur, noise, [low, high]) in [
        (0.0, 0.02, [0.0, 2e-3]),
        (0.0, 0.05, [2e-3, 8e-3]),
        (1.0, 0.05, [6e-3, 2e-2]),
    ] {
        let mut drawn = disc(radius, [0.3, -0.2]);
        if blur > 0.0 {
            drawn = drawn.blurred(blur);
        }
        let drawn = drawn.noisy(noise);
        let section = read(&drawn);
        let [area, perimeter] = differences(&section, PI * radius * radius, 2.0 * PI * radius);
        assert!(area.abs() < 1.5e-3, "{area}");
        assert!((low..high).contains(&perimeter), "{perimeter}");
        assert_eq!(
            has(&section, Code::PerimeterSampling),
            noise > 0.04,
            "noise {noise}"
        );
        if let Some(warning) = section
            .warnings
            .iter()
            .find(|w| w.code == Code::PerimeterSampling)
        {
            let foreseen = warning.numbers[0].1;
            assert!(
                (0.5..2.0).contains(&(foreseen / perimeter)),
                "{foreseen} {perimeter}"
            );
        }
        let options = MicrographOptions {
            denoise: Denoise::Gaussian(1.5),
            ..micrometre()
        };
        let section = read_micrograph(&drawn.png(), &options).unwrap();
        let [_, perimeter] = differences(&section, PI * radius * radius, 2.0 * PI * radius);
        assert!(perimeter.abs() < 1e-3, "{perimeter}");
    }
}

#[test]
fn ellipses_and_turned_rectangles_have_their_size() {
    let (a, b) = (70.0_f64, 30.0_f64);
    let ellipse = Drawn::new(200, 120, |x, y| {
        ((x - 100.2) / a).powi(2) + ((y - 60.1) / b).powi(2) < 1.0
    });
    // Ramanujan's second formula, exact to 1e-9 here.
    let h = ((a - b) / (a + b)).powi(2);
    let perimeter = PI * (a + b) * (1.0 + 3.0 * h / (10.0 + (4.0 - 3.0 * h).sqrt()));
    let [area, length] = differences(&read(&ellipse), PI * a * b, perimeter);
    assert!(area.abs() < 1e-3 && length.abs() < 1e-3, "{area} {length}");
    for degrees in [0.0_f64, 7.0, 20.0, 45.0] {
        let (sin, cos) = degrees.to_radians().sin_cos();
        let drawn = Drawn::new(240, 240, |x, y| {
            let (x, y) = (x - 120.3, y - 119.6);
            (cos * x + sin * y).abs() < 80.0 && (cos * y - sin * x).abs() < 35.0
        });
        let [area, length] = differences(&read(&drawn), 160.0 * 70.0, 460.0);
        assert!(
            area.abs() < 1e-3 && length.abs() < 5e-3,
            "{degrees}: {area} {length}"
        );
    }
}

#[test]
fn islands_stay_and_specks_are_filled() {
    let drawn = Drawn::new(200, 160, |x, y| {
        let at = |cx: f64, cy: f64, r: f64| (x - cx).hypot(y - cy) < r;
        (20.0..180.0).contains(&x)
            && (20.0..140.0).contains(&y)
            && !at(70.0, 80.0, 20.0)
            && !at(130.0, 60.0, 10.0)
            && !at(150.0, 120.0, 2.0)
    });
    let section = read(&drawn);
    assert_eq!(section.outline.lumens.len(), 1);
    assert_eq!(section.outline.lumens[0].islands.len(), 2);
    let exact = (160.0 * 120.0 - PI * 500.0) * 1e-12;
    assert!((section.outline.area() / exact - 1.0).abs() < 1e-3);
    let options = MicrographOptions {
        smallest_island: Some(0.0),
        ..micrometre()
    };
    let section = read_micrograph(&drawn.png(), &options).unwrap();
    assert_eq!(section.outline.lumens[0].islands.len(), 3);
}

#[test]
fn heights_and_directions_are_those_of_the_picture() {
    // A triangle with its tip up and a long left side, pixels twice as wide as high.
    let drawn = Drawn::new(100, 100, |x, y| y < 80.0 && x > 20.0 && x - 20.0 < y - 20.0);
    let options = MicrographOptions {
        scale: Some(2e-6),
        scale_y: Some(1e-6),
        crop: Some([10, 5, 85, 90]),
        ..MicrographOptions::default()
    };
    let section = read_micrograph(&drawn.png(), &options).unwrap();
    let exact = 0.5 * 60.0 * 2e-6 * 60e-6;
    assert!((section.outline.area() / exact - 1.0).abs() < 5e-3);
    let (low, high) = section.outline.bounds().unwrap();
    // The crop ends 15 pixels below the base, and begins 10 pixels left of the side.
    assert!(
        (low[0] - 20e-6).abs() < 0.5e-6 && (low[1] - 15e-6).abs() < 0.3e-6,
        "{low:?}"
    );
    assert!((high[1] - 75e-6).abs() < 2e-6, "{high:?}");
    let centre = section.outline.centroid();
    assert!(centre[0] < 0.5 * (low[0] + high[0]) && centre[1] < 0.5 * (low[1] + high[1]));
    let lowest = section.contours[0].iter().map(|p| p[1]).fold(0.0, f64::max);
    assert!((lowest - 80.0).abs() < 0.1, "{lowest}");
    // A stage tilted by 30 degrees shows half the height.
    let tilted = MicrographOptions {
        tilt: Some(Tilt::Stage(30_f64.to_radians())),
        ..options
    };
    let section = read_micrograph(&drawn.png(), &tilted).unwrap();
    assert!((section.outline.area() / (2.0 * exact) - 1.0).abs() < 5e-3);
}

#[test]
fn all_formats_give_the_same_section() {
    let drawn = disc(40.0, [0.3, -0.2]);
    let sixteen = read(&drawn).outline.area();
    for format in [
        image::ImageFormat::Png,
        image::ImageFormat::Bmp,
        image::ImageFormat::Tiff,
        image::ImageFormat::Jpeg,
    ] {
        let bytes = drawn.eight_bit(format);
        assert!(is_picture(&bytes));
        let section = read_micrograph(&bytes, &micrometre()).unwrap();
        let ratio = section.outline.area() / sixteen;
        assert!((ratio - 1.0).abs() < 1e-3, "{format:?}: {ratio}");
        assert!(section.levels.otsu.unwrap() < 255.0);
    }
}

#[test]
fn black_and_white_pictures_say_what_their_perimeter_is() {
    let mut drawn = disc(40.0, [0.3, -0.2]);
    for value in &mut drawn.wall {
        *value = value.round();
    }
    let section = read(&drawn);
    assert!(has(&section, Code::PerimeterSampling));
    let [area, perimeter] = differences(&section, PI * 1600.0, 80.0 * PI);
    assert!(area.abs() < 5e-3 && perimeter > 0.02, "{area} {perimeter}");
}

#[test]
fn stated_levels_and_points_do_the_same() {
    let drawn = disc(40.0, [0.0, 0.0]);
    let exact = PI * 1600e-12;
    let [x, y] = [60, 60];
    for threshold in [
        "30000".to_owned(),
        "45.78%".to_owned(),
        format!("{x},{y}:5,5"),
        format!("{x},{y},9,9:2,2,8,8"),
    ] {
        let options = MicrographOptions {
            threshold: threshold.parse().unwrap(),
            ..micrometre()
        };
        let section = read_micrograph(&drawn.png(), &options).unwrap();
        let area = section.outline.area() / exact - 1.0;
        assert!(area.abs() < 1e-3, "{threshold}: {area}");
        assert_eq!(section.fluid, Tone::Dark);
    }
}
