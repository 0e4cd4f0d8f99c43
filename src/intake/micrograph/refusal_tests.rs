//! What is refused, and that nothing crashes.

use image::ImageFormat;

use super::test_pictures::{Drawn, micrometre};
use super::*;
use crate::warning::Code;

fn two_channels() -> Drawn {
    Drawn::new(160, 80, |x, y| {
        let channel = |from: f64| (from..from + 40.0).contains(&x);
        (20.0..60.0).contains(&y) && (channel(20.0) || channel(100.0))
    })
}

fn problem(drawn: &Drawn, options: &MicrographOptions) -> MicrographProblem {
    let problem = read_micrograph(&drawn.png(), options).unwrap_err();
    assert!(!problem.to_string().is_empty() && !problem.hint().is_empty());
    problem
}

#[test]
fn several_regions_are_named_and_one_can_be_chosen() {
    let drawn = two_channels();
    let found = problem(&drawn, &micrometre());
    assert!(found.is_ambiguous());
    let MicrographProblem::SeveralRegions { regions } = &found else {
        panic!("{found}");
    };
    assert_eq!(regions.len(), 2);
    assert_eq!(regions[0].pixels, 1600);
    assert!(
        found.to_string().contains("region 2 (dark, 1600 pixels"),
        "{found}"
    );
    for (region, centre) in [("2", 120.0), ("30,30", 40.0), ("largest", 40.0)] {
        let options = MicrographOptions {
            region: region.parse().unwrap(),
            ..micrometre()
        };
        let section = read_micrograph(&drawn.png(), &options).unwrap();
        let chosen = section.regions[section.region - 1];
        assert!((chosen.centre[0] - centre).abs() < 0.1, "{region}");
        assert!((section.outline.centroid()[0] / (centre * 1e-6) - 1.0).abs() < 1e-3);
    }
    for (region, text) in [
        ("3", "no region 3"),
        ("80,40", "lies in the wall"),
        ("200,1", "--region"),
    ] {
        let options = MicrographOptions {
            region: region.parse().unwrap(),
            fluid: Some(Tone::Dark),
            ..micrometre()
        };
        let found = problem(&drawn, &options).to_string();
        assert!(found.contains(text), "{found}");
    }
}

#[test]
fn the_tone_is_found_where_it_is_clear() {
    // A dark ring: its bright middle is a closed region too.
    let ring = Drawn::new(120, 120, |x, y| {
        (25.0..50.0).contains(&(x - 60.0).hypot(y - 60.0))
    });
    let found = problem(&ring, &micrometre());
    assert!(found.is_ambiguous() && matches!(found, MicrographProblem::ToneUnclear { .. }));
    let options = MicrographOptions {
        fluid: Some(Tone::Dark),
        ..micrometre()
    };
    let section = read_micrograph(&ring.png(), &options).unwrap();
    assert_eq!(section.outline.lumens[0].islands.len(), 1);
    // Turned round, the fluid is bright.
    let mut bright = Drawn::disc(100, [50.0, 50.0], 30.0);
    for value in &mut bright.wall {
        *value = 1.0 - *value;
    }
    let section = read_micrograph(&bright.png(), &micrometre()).unwrap();
    assert_eq!(section.fluid, Tone::Bright);
    assert!(section.warnings.iter().any(|w| w.code == Code::ChoiceMade));
    let area = section.outline.area() / (std::f64::consts::PI * 900e-12);
    assert!((area - 1.0).abs() < 1e-3, "{area}");
}

#[test]
fn a_wall_that_is_cut_off_is_refused() {
    let open = Drawn::new(100, 60, |x, y| (20.0..80.0).contains(&x) && y < 40.0);
    let options = MicrographOptions {
        fluid: Some(Tone::Dark),
        ..micrometre()
    };
    let found = problem(&open, &options);
    assert!(
        matches!(
            found,
            MicrographProblem::NoRegion {
                cut_off: Some(_),
                ..
            }
        ),
        "{found}"
    );
    let options = MicrographOptions {
        region: Region::Seed(50, 20),
        ..micrometre()
    };
    assert!(matches!(
        problem(&open, &options),
        MicrographProblem::RegionCutOff { .. }
    ));
}

#[test]
fn pictures_without_a_wall_are_refused() {
    let even = Drawn::new(64, 64, |_, _| false);
    assert!(matches!(
        problem(&even, &micrometre()),
        MicrographProblem::Uniform { .. }
    ));
    let noise = even.clone().noisy(0.05);
    assert!(matches!(
        problem(&noise, &micrometre()),
        MicrographProblem::NoEdge { .. }
    ));
    let mut ramp = even;
    for (i, value) in ramp.wall.iter_mut().enumerate() {
        *value = (i % 64) as f64 / 63.0;
    }
    assert!(matches!(
        problem(&ramp, &micrometre()),
        MicrographProblem::NoEdge { .. }
    ));
    let mut faint = Drawn::disc(64, [32.0, 32.0], 20.0);
    for value in &mut faint.wall {
        *value *= 1e-4;
    }
    assert!(matches!(
        problem(&faint, &micrometre()),
        MicrographProblem::TooFewSteps { .. }
    ));
}

#[test]
fn options_out_of_range_are_named() {
    type Change = fn(&mut MicrographOptions);
    let drawn = Drawn::disc(64, [32.0, 32.0], 20.0);
    let cases: [(Change, &str); 22] = [
        (|o| o.scale = None, "no scale"),
        (|o| o.scale = Some(-1.0), "--scale"),
        (|o| o.scale = Some(f64::NAN), "--scale"),
        (|o| o.scale = Some(1.0), "outside 10 nm to 50 mm"),
        (|o| o.tilt = Some(Tilt::Stage(0.0)), "--tilt"),
        (|o| o.tilt = Some(Tilt::Face(f64::NAN)), "--tilt"),
        (|o| o.crop = Some([0, 0, 65, 64]), "--crop"),
        (|o| o.crop = Some([60, 60, 4, 4]), "4 x 4"),
        (|o| o.page = Some(2), "no page 2"),
        (|o| o.page = Some(0), "no page 0"),
        (|o| o.reach_levels = [0.8, 0.2], "--reach-levels"),
        (|o| o.denoise = Denoise::Median(99), "--denoise"),
        (|o| o.threshold = Threshold::Value(1.0), "one side"),
        (|o| o.threshold = Threshold::Value(f64::NAN), "--threshold"),
        (|o| o.threshold = Threshold::Share(2.0), "--threshold"),
        (
            |o| o.threshold = "32,32:30,30".parse().unwrap(),
            "same grey",
        ),
        (
            |o| o.threshold = "32,32:99,1".parse().unwrap(),
            "--threshold",
        ),
        (
            |o| {
                o.threshold = "32,32:2,2".parse().unwrap();
                o.fluid = Some(Tone::Bright);
            },
            "--fluid-is bright",
        ),
        (|o| o.simplify = Some(-1.0), "--simplify"),
        (|o| o.simplify = Some(1.0), "--simplify"),
        (|o| o.smallest_island = Some(f64::NAN), "--islands-above"),
        (|o| o.largest_pixels = 4095, "64 x 64"),
    ];
    for (change, text) in cases {
        let mut options = micrometre();
        change(&mut options);
        let found = problem(&drawn, &options);
        assert!(found.to_string().contains(text), "{found}");
    }
    let large = MicrographOptions {
        scale: Some(1.0),
        allow_any_size: true,
        ..micrometre()
    };
    assert!(read_micrograph(&drawn.png(), &large).is_ok());
}

#[test]
fn a_picture_below_its_stated_size_is_not_allocated() {
    // A header of 60 000 x 60 000 pixels with nothing behind it.
    let mut bytes = Drawn::disc(64, [32.0, 32.0], 20.0).png();
    bytes[16..24].copy_from_slice(&[0, 0, 0xea, 0x60, 0, 0, 0xea, 0x60]);
    assert!(read_micrograph(&bytes, &micrometre()).is_err());
    for format in [ImageFormat::Bmp, ImageFormat::Tiff] {
        let bytes = Drawn::disc(64, [32.0, 32.0], 20.0).eight_bit(format);
        let options = MicrographOptions {
            largest_pixels: 100,
            ..micrometre()
        };
        let found = read_micrograph(&bytes, &options).unwrap_err();
        assert!(
            matches!(found, MicrographProblem::TooLarge { .. }),
            "{found}"
        );
        assert!(found.hint().contains("--allow-large"));
    }
}

#[test]
fn bytes_cut_off_or_flipped_never_crash() {
    let drawn = Drawn::disc(18, [9.0, 9.0], 6.5);
    let mut pictures = vec![drawn.png()];
    for format in [
        ImageFormat::Png,
        ImageFormat::Bmp,
        ImageFormat::Tiff,
        ImageFormat::Jpeg,
    ] {
        pictures.push(drawn.eight_bit(format));
    }
    let options = MicrographOptions {
        largest_pixels: 10_000,
        ..micrometre()
    };
    for bytes in pictures {
        assert!(read_micrograph(&bytes, &options).is_ok());
        for end in 0..bytes.len() {
            let _ = read_micrograph(&bytes[..end], &options);
        }
        let mut state = 99_u64;
        let mut next = || {
            state = state
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1_442_695_040_888_963_407);
            (state >> 33) as usize
        };
        for round in 0..400 {
            let mut broken = bytes.clone();
            for _ in 0..=round % 4 {
                // Headers are hit as often as all the rest.
                let reach = if next() % 2 == 0 {
                    broken.len().min(80)
                } else {
                    broken.len()
                };
                let at = next() % reach;
                broken[at] = next() as u8;
            }
            let _ = read_micrograph(&broken, &options);
        }
    }
}

#[test]
fn other_files_are_no_pictures() {
    for bytes in [
        &b""[..],
        b"BM",
        b"x_um,y_um\n0,0\n",
        b"<svg/>",
        b"BMxxxxxxxxxxxx",
        b"II*",
    ] {
        assert!(!is_picture(bytes));
        assert_eq!(
            read_micrograph(bytes, &micrometre()),
            Err(MicrographProblem::NotAPicture)
        );
    }
}
