//! Cuts of invented maps whose grooves are known.

use super::{CutOptions, HeightMap, MapCut, MapProblem, cut};
use crate::warning::Code;

const WIDTH: f64 = 200e-6;
const DEPTH: f64 = 20e-6;
const SPACING: f64 = 2e-6;

/// Repeatable noise with a standard deviation of one.
struct Noise(u64);

impl Noise {
    fn next(&mut self) -> f64 {
        // Sum of twelve even numbers: variance one, mean zero.
        let mut sum = -6.0;
        for _ in 0..12 {
            self.0 = self
                .0
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1_442_695_040_888_963_407);
            sum += (self.0 >> 11) as f64 / (1_u64 << 53) as f64;
        }
        sum
    }
}

/// A map of heights `of(x, y)` with noise, x and y from its middle.
fn map_of(size: [usize; 2], noise: f64, of: impl Fn(f64, f64) -> f64) -> HeightMap {
    let mut random = Noise(7);
    let middle = size.map(|count| 0.5 * (count - 1) as f64 * SPACING);
    let heights = (0..size[0] * size[1]).map(|place| {
        let x = (place % size[0]) as f64 * SPACING - middle[0];
        let y = (place / size[0]) as f64 * SPACING - middle[1];
        of(x, y) + noise * random.next()
    });
    HeightMap {
        size,
        spacing: [SPACING, SPACING],
        heights: heights.collect(),
        ..HeightMap::default()
    }
}

/// A groove with flanks as wide as given, `u` across it; the width is that at half depth.
fn groove(u: f64, flank: f64) -> f64 {
    let inside = (0.5 * (WIDTH + flank) - u.abs()) / flank;
    -DEPTH * inside.clamp(0.0, 1.0)
}

/// Distance from the line through the middle at an angle.
fn across(degrees: f64) -> impl Fn(f64, f64) -> f64 {
    let (sine, cosine) = degrees.to_radians().sin_cos();
    move |x, y| cosine * y - sine * x
}

/// Width at half depth and depth of the groove in the middle of heights every `step`.
fn width_and_depth(z: &[f64], step: f64) -> (f64, f64) {
    let middle = z.len() / 2;
    let floor = &z[middle - 10..middle + 10];
    let floor = floor.iter().sum::<f64>() / floor.len() as f64;
    let lands = z.iter().take(8).chain(z.iter().rev().take(8));
    let lands = lands.sum::<f64>() / 16.0;
    let half = 0.5 * (floor + lands);
    let crossing = |a: usize, b: usize| {
        let part = (half - z[a]) / (z[b] - z[a]);
        a as f64 + part * (b as f64 - a as f64)
    };
    let right = (middle..z.len() - 1).find(|&k| z[k + 1] > half).unwrap();
    let left = (1..=middle).rev().find(|&k| z[k - 1] > half).unwrap();
    let width = crossing(right, right + 1) - crossing(left, left - 1);
    (width * step, lands - floor)
}

fn measured(cut: &MapCut) -> (f64, f64) {
    let profile = &cut.trace.profile;
    width_and_depth(&profile.z, profile.x[1] - profile.x[0])
}

#[test]
fn a_groove_at_26_degrees_has_its_width_and_depth_and_a_row_has_not() {
    let at = across(26.0);
    let tilt = |x: f64, y: f64| 2e-3 * x - 1e-3 * y;
    let map = map_of([360, 300], 0.3e-6, |x, y| {
        groove(at(x, y), 20e-6) + tilt(x, y)
    });
    let cuts = cut(&map, &CutOptions::default()).unwrap();
    let (width, depth) = measured(&cuts.cuts[0]);
    assert!((width / WIDTH - 1.0).abs() < 0.002, "{width}");
    assert!((depth / DEPTH - 1.0).abs() < 0.002, "{depth}");
    assert!(cuts.warnings.is_empty(), "{:?}", cuts.warnings);
    let spread = cuts.cuts[0].spread.unwrap();
    assert!((0.1e-6..0.4e-6).contains(&spread), "{spread}");
    // The middle row runs at 26 degrees to the groove.
    let row = 150 * 360;
    let row: Vec<f64> = (0..360)
        .map(|at| {
            let (x, y) = (at as f64 * SPACING, 150.0 * SPACING);
            map.heights[row + at] - cuts.plane[0] - cuts.plane[1] * x - cuts.plane[2] * y
        })
        .collect();
    let (stretched, _) = width_and_depth(&row, SPACING);
    let factor = 1.0 / 26_f64.to_radians().sin();
    assert!(
        (stretched / WIDTH / factor - 1.0).abs() < 0.02,
        "{stretched}"
    );
}

#[test]
fn directions_are_found_to_a_tenth_of_a_degree() {
    // Flanks of one and a half points and noise of a twentieth of the depth; angles near the axes and the
    // diagonal would show a preference for the rows of the map.
    for degrees in [0.0, 0.07, 3.3, 26.0, 44.96, 45.0, 89.95, -89.2, -37.0] {
        let at = across(degrees);
        for flank in [3e-6, 30e-6] {
            let map = map_of([180, 160], 1e-6, |x, y| groove(at(x, y), flank));
            let cuts = cut(&map, &CutOptions::default()).unwrap();
            let off = (cuts.direction.to_degrees() - degrees + 90.0).rem_euclid(180.0) - 90.0;
            let u = cuts.direction_uncertainty.to_degrees();
            assert!(off.abs() < 0.1, "{degrees} {flank}: {off} (u {u})");
            assert!(
                off.abs() < 5.0 * u + 0.005 && u < 0.1,
                "{degrees} {flank}: {off} (u {u})"
            );
        }
    }
}

#[test]
fn the_plane_is_that_of_the_lands() {
    // The groove lies to one side, where a plane through all points leans into it.
    let at = across(90.0);
    let map = map_of([200, 160], 0.1e-6, |x, y| {
        groove(at(x + 90e-6, y), 10e-6) + 4e-3 * x + 1e-3 * y
    });
    let cuts = cut(&map, &CutOptions::default()).unwrap();
    let [_, slope_x, slope_y] = cuts.plane;
    // Three standard deviations for 0.1 um of noise on the 185 um of land on the right.
    assert!((slope_x - 4e-3).abs() < 4.5e-5, "{slope_x}");
    assert!((slope_y - 1e-3).abs() < 4.5e-5, "{slope_y}");
    assert!(cuts.plane_residual.unwrap() < 0.12e-6);
    let lands = cuts.cuts[0].trace.profile.z.last().unwrap();
    assert!(lands.abs() < 0.05e-6, "{lands}");
    // Ordinary least squares along x, for comparison: about four per cent off.
    let (mut xx, mut xz) = (0.0, 0.0);
    for (place, z) in map.heights.iter().enumerate() {
        let x = (place % 200) as f64 * SPACING - 199e-6;
        xx += x * x;
        xz += x * z;
    }
    assert!((xz / xx - 4e-3).abs() > 1e-2, "{}", xz / xx);
}

#[test]
fn a_surface_without_a_groove_needs_a_stated_direction() {
    let map = map_of([120, 120], 1e-6, |_, _| 0.0);
    let problem = cut(&map, &CutOptions::default()).unwrap_err();
    assert!(
        matches!(problem, MapProblem::NoDirection { .. }),
        "{problem}"
    );
    assert!(problem.is_ambiguous() && problem.hint().contains("--groove-direction"));
    let options = CutOptions {
        direction: Some(0.5),
        ..CutOptions::default()
    };
    let cuts = cut(&map, &options).unwrap();
    assert!((cuts.direction - 0.5).abs() < 1e-12 && cuts.direction_uncertainty == 0.0);
    // Two channels that cross have no one direction either.
    let crossed = map_of([160, 160], 0.1e-6, |x, y| {
        groove(2.0 * x, 9e-6).min(groove(2.0 * y, 9e-6))
    });
    assert!(matches!(
        cut(&crossed, &CutOptions::default()),
        Err(MapProblem::NoDirection { .. })
    ));
}

#[test]
fn a_stated_direction_against_the_heights_is_told() {
    let at = across(26.0);
    let map = map_of([200, 200], 0.2e-6, |x, y| groove(2.0 * at(x, y), 20e-6));
    let options = CutOptions {
        direction: Some(-26_f64.to_radians()),
        ..CutOptions::default()
    };
    let cuts = cut(&map, &options).unwrap();
    assert_eq!(cuts.warnings.len(), 1);
    assert_eq!(cuts.warnings[0].code, Code::ObliqueCut);
    // Widths are 1 / cos(52 degrees) times too large.
    assert!(
        cuts.warnings[0].message.contains("62 % too large"),
        "{}",
        cuts.warnings[0].message
    );
}

#[test]
fn a_curved_groove_is_told() {
    let radius = 2e-3;
    let map = map_of([240, 240], 0.2e-6, |x, y| {
        groove(1.5 * (x.hypot(y + radius) - radius), 20e-6)
    });
    let cuts = cut(&map, &CutOptions::default()).unwrap();
    let told = cuts
        .warnings
        .iter()
        .find(|w| w.message.contains("curved"))
        .unwrap();
    // The groove turns by the length of the map over the radius, clockwise along x.
    let turn = told.numbers[0].1;
    assert!(
        (turn / (-239.0 * SPACING / radius) - 1.0).abs() < 0.15,
        "{turn}"
    );
}

#[test]
fn missing_points_stay_missing_and_are_counted() {
    let mut map = map_of([120, 100], 0.05e-6, |_, y| groove(2.5 * y, 10e-6));
    for row in 40..60 {
        for column in 30..50 {
            map.heights[row * 120 + column] = f64::NAN;
        }
    }
    let single = CutOptions {
        stations: vec![(39.5 - 59.5) * SPACING],
        ..CutOptions::default()
    };
    let cuts = cut(&map, &single).unwrap();
    let one = &cuts.cuts[0];
    assert_eq!((one.rows, one.spread), (1, None));
    let gaps = one.trace.profile.z.iter().filter(|z| z.is_nan()).count();
    assert!((20..=22).contains(&gaps) && one.missing == gaps, "{gaps}");
    let mean = cut(&map, &CutOptions::default()).unwrap();
    let mean = &mean.cuts[0];
    assert!(mean.trace.profile.z.iter().all(|z| z.is_finite()));
    assert!(
        (20 * 20..21 * 24).contains(&mean.missing),
        "{}",
        mean.missing
    );
    let (_, depth) = measured(mean);
    assert!((depth / DEPTH - 1.0).abs() < 0.005, "{depth}");
}

#[test]
fn stations_count_along_the_groove_from_the_middle() {
    let at = across(30.0);
    let map = map_of([200, 160], 0.0, |x, y| groove(2.0 * at(x, y), 20e-6));
    let options = CutOptions {
        stations: vec![-60e-6, 80e-6],
        average: Some(20e-6),
        ..CutOptions::default()
    };
    let cuts = cut(&map, &options).unwrap();
    let along = [30_f64.to_radians().cos(), 30_f64.to_radians().sin()];
    for (cut, station) in cuts.cuts.iter().zip([-60e-6, 80e-6]) {
        assert_eq!((cut.station, cut.average, cut.rows), (station, 20e-6, 11));
        for end in [cut.from, cut.to] {
            let from_middle = [end[0] - 199e-6, end[1] - 159e-6];
            let place = from_middle[0] * along[0] + from_middle[1] * along[1];
            assert!((place - station).abs() < 0.1e-6, "{place}");
            assert!((-1e-9..398.1e-6).contains(&end[0]) && (-1e-9..318.1e-6).contains(&end[1]));
        }
        assert!(cut.to[0] > cut.from[0]);
        let length = (cut.to[0] - cut.from[0]).hypot(cut.to[1] - cut.from[1]);
        assert!((length - cut.trace.profile.x.last().unwrap()).abs() < 1e-12);
    }
    let outside = CutOptions {
        stations: vec![300e-6],
        ..CutOptions::default()
    };
    let problem = cut(&map, &outside).unwrap_err();
    assert!(
        matches!(problem, MapProblem::StationOutside { .. }),
        "{problem}"
    );
}

#[test]
fn without_levelling_heights_stay() {
    let map = map_of([100, 80], 0.0, |x, y| {
        groove(2.0 * y, 20e-6) + 1e-2 * x + 3e-6
    });
    let options = CutOptions {
        level: false,
        stations: vec![50e-6],
        ..CutOptions::default()
    };
    let cuts = cut(&map, &options).unwrap();
    assert_eq!((cuts.plane, cuts.plane_residual), ([0.0; 3], None));
    let last = cuts.cuts[0].trace.profile.z.last().unwrap();
    assert!((last - 3.5e-6).abs() < 0.02e-6, "{last}");
}

#[test]
fn hopeless_maps_and_options_are_refused() {
    let mut map = map_of([20, 20], 0.0, |x, _| x);
    let refused = |map: &HeightMap, options: &CutOptions| cut(map, options).unwrap_err();
    let with = |average, direction| CutOptions {
        average,
        direction,
        ..CutOptions::default()
    };
    assert!(matches!(
        refused(&map, &with(Some(0.0), None)),
        MapProblem::AverageNotPositive { .. }
    ));
    assert_eq!(
        refused(&map, &with(None, Some(f64::NAN))),
        MapProblem::DirectionNotFinite
    );
    assert!(matches!(
        refused(&map, &with(Some(1.0), Some(0.0))),
        MapProblem::StationOutside { .. }
    ));
    map.heights.fill(f64::NAN);
    assert!(matches!(
        refused(&map, &CutOptions::default()),
        MapProblem::TooFewHeights { valid: 0, .. }
    ));
    assert!(matches!(
        refused(&HeightMap::default(), &CutOptions::default()),
        MapProblem::TooSmall { .. }
    ));
    // Sizes that contradict the heights must not lead outside them.
    let wrong = HeightMap {
        size: [50, 50],
        spacing: [1e-6; 2],
        heights: vec![0.0; 100],
        ..HeightMap::default()
    };
    let _ = cut(&wrong, &with(None, Some(0.3)));
}
