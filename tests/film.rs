//! What a film leaves of a section, against closed forms and against the definition: the fluid points at
//! least as far from the wall as the film is thick.
#![expect(
    clippy::unwrap_used,
    clippy::panic,
    reason = "a test stops at the first surprise"
)]

use std::f64::consts::{FRAC_PI_2, PI, TAU};

use etchwise::flow::{Goal, SolveOptions, solve_outline};
use etchwise::geometry::{
    Film, FilmError, FilmOn, Filmed, Loop, Lumen, Outline, Point, SegmentTree,
};
use etchwise::warning::Code;
use proptest::prelude::*;

fn film(outline: &Outline, thickness: f64) -> Filmed {
    film_on(outline, thickness, FilmOn::All)
}

fn film_on(outline: &Outline, thickness: f64, on: FilmOn) -> Filmed {
    let filmed = Film { thickness, on }.applied_to(outline);
    let filmed = filmed.unwrap_or_else(|error| panic!("{error}"));
    check(outline, &filmed);
    filmed
}

/// Valid, inside the section, and no vertex nearer to the wall than the film (all walls).
fn check(outline: &Outline, filmed: &Filmed) {
    assert!(!filmed.outline.problems().has_errors());
    let film = filmed.report.film;
    assert!((filmed.report.thickness_used / film.thickness - 1.0).abs() < 2e-6);
    let tree = SegmentTree::of_outline(outline);
    let size = outline.wetted_perimeter();
    // The even-odd rule below looks at every wall for every point.
    let step = 1 + filmed.report.vertices / 1000;
    for &p in filmed.outline.loops().flat_map(|l| &l.points).step_by(step) {
        if film.on == FilmOn::All {
            let distance = tree.nearest(p).unwrap().distance;
            let allowed = film.thickness * (1.0 - 1.1e-6) - 1e-12 * size;
            assert!(distance >= allowed, "{p:?} is {distance:e} from the wall");
        }
        assert!(
            is_inside(outline, p) || tree.nearest(p).unwrap().distance < 1e-12 * size,
            "{p:?} is outside"
        );
    }
    let report = &filmed.report;
    assert!(report.area[1] < report.area[0]);
    assert!((report.area[1] - filmed.outline.area()).abs() <= 1e-15 * report.area[0]);
}

/// Even-odd rule, written independently of the library.
fn is_inside(outline: &Outline, p: Point) -> bool {
    let mut inside = false;
    for (a, b) in outline.loops().flat_map(Loop::edges) {
        if (a[1] > p[1]) != (b[1] > p[1]) {
            let x = a[0] + (p[1] - a[1]) / (b[1] - a[1]) * (b[0] - a[0]);
            inside ^= x > p[0];
        }
    }
    inside
}

fn rectangle(x: f64, y: f64, width: f64, height: f64) -> Vec<Point> {
    vec![
        [x, y],
        [x + width, y],
        [x + width, y + height],
        [x, y + height],
    ]
}

fn with_islands(outer: Vec<Point>, islands: Vec<Vec<Point>>) -> Outline {
    Outline {
        lumens: vec![Lumen {
            outer: Loop::new(outer),
            islands: islands.into_iter().map(Loop::new).collect(),
        }],
    }
    .oriented()
}

fn circle(centre: Point, radius: f64, sides: usize) -> Vec<Point> {
    (0..sides)
        .map(|i| {
            let (sin, cos) = (TAU * i as f64 / sides as f64).sin_cos();
            [centre[0] + radius * cos, centre[1] + radius * sin]
        })
        .collect()
}

/// Relative difference.
fn off(found: f64, exact: f64) -> f64 {
    (found / exact - 1.0).abs()
}

#[test]
fn a_rectangle_stays_a_rectangle() {
    let section = Outline::single(rectangle(1e-6, -3e-6, 100e-6, 40e-6));
    let filmed = film(&section, 0.5e-6);
    assert!(off(filmed.outline.area(), 99e-6 * 39e-6) < 1e-12);
    assert!(off(filmed.outline.wetted_perimeter(), 2.0 * 138e-6) < 1e-12);
    assert_eq!(filmed.report.vertices, 4);
    assert_eq!(filmed.report.lumens, [1, 1]);
}

#[test]
fn a_circle_stays_a_circle_with_as_many_vertices() {
    for (sides, thickness) in [
        (12, 0.3),
        (5000, 0.3),
        (5000, 0.9),
        (1000, 0.999),
        (20_000, 0.5),
    ] {
        let section = Outline::single(circle([0.2, -0.4], 1.0, sides));
        let filmed = film(&section, thickness);
        // The distance of the sides from the centre is cos(pi / n).
        let shrunk = 1.0 - thickness / (PI / sides as f64).cos();
        assert!(
            off(filmed.outline.area(), section.area() * shrunk * shrunk) < 1e-8 / (1.0 - thickness)
        );
        assert_eq!(filmed.report.vertices, sides);
    }
}

#[test]
fn a_re_entrant_corner_becomes_an_arc() {
    let corner = vec![
        [0.0, 0.0],
        [3.0, 0.0],
        [3.0, 1.0],
        [1.0, 1.0],
        [1.0, 3.0],
        [0.0, 3.0],
    ];
    let section = Outline::single(corner);
    for t in [0.01, 0.1, 0.3] {
        let filmed = film(&section, t);
        // Strips along all walls, their overlaps at five corners, and a quarter circle.
        let area = 5.0 - 12.0 * t + 5.0 * t * t - FRAC_PI_2 / 2.0 * t * t;
        let perimeter = 12.0 - 10.0 * t + FRAC_PI_2 * t;
        assert!(off(filmed.outline.area(), area) < 1e-7);
        assert!(off(filmed.outline.wetted_perimeter(), perimeter) < 1e-7);
    }
}

#[test]
fn an_annulus_loses_at_both_walls_and_closes() {
    let ring = with_islands(
        circle([0.0; 2], 2.0, 2000),
        vec![circle([0.0; 2], 1.0, 2000)],
    );
    let filmed = film(&ring, 0.25);
    assert!(off(filmed.outline.area(), PI * (1.75 * 1.75 - 1.25 * 1.25)) < 1e-5);
    assert_eq!(filmed.report.islands, [1, 1]);
    let filmed = film(&ring, 0.499);
    assert!(off(filmed.outline.area(), PI * (1.501 * 1.501 - 1.499 * 1.499)) < 1e-2);
    let closed = Film {
        thickness: 0.5,
        on: FilmOn::All,
    }
    .applied_to(&ring);
    assert!(matches!(closed, Err(FilmError::Closed { radius, .. }) if off(radius, 0.5) < 1e-5));
}

fn dumbbell(neck: f64) -> Outline {
    let h = 0.5 * neck;
    Outline::single(vec![
        [0.0, -2.0],
        [4.0, -2.0],
        [4.0, -h],
        [6.0, -h],
        [6.0, -2.0],
        [10.0, -2.0],
        [10.0, 2.0],
        [6.0, 2.0],
        [6.0, h],
        [4.0, h],
        [4.0, 2.0],
        [0.0, 2.0],
    ])
}

#[test]
fn a_dumbbell_splits_where_its_neck_closes() {
    let section = dumbbell(1.0);
    let open = film(&section, 0.499);
    assert_eq!(open.report.lumens, [1, 1]);
    let split = film(&section, 0.501);
    assert_eq!(split.report.lumens, [1, 2]);
    assert_eq!(split.report.lumens_split, 1);
    assert_eq!(split.report.lumens_vanished, 0);
    // Exactly at the neck: one or the other, and it is said that the thickness was moved.
    let exact = film(&section, 0.5);
    assert!(exact.report.lumens[1] == 2 || exact.report.lumens[1] == 1);
}

#[test]
fn islands_grow_together_and_onto_the_wall() {
    let post = |x: f64, y: f64| rectangle(x, y, 1.0, 1.0);
    let two = with_islands(
        rectangle(0.0, 0.0, 20.0, 10.0),
        vec![post(8.0, 4.0), post(10.0, 4.0)],
    );
    assert_eq!(film(&two, 0.49).report.islands, [2, 2]);
    let merged = film(&two, 0.51);
    assert_eq!(merged.report.islands, [2, 1]);
    assert_eq!(merged.report.lumens, [1, 1]);
    let near_wall = with_islands(rectangle(0.0, 0.0, 20.0, 10.0), vec![post(8.0, 0.8)]);
    assert_eq!(film(&near_wall, 0.39).report.islands, [1, 1]);
    let joined = film(&near_wall, 0.41);
    assert_eq!(joined.report.islands, [1, 0]);
    assert_eq!(joined.report.lumens, [1, 1]);
    // A row of posts across the channel divides it.
    let row = (0..10).map(|i| post(10.0, f64::from(i) + 0.05 * f64::from(i) - 0.2 + 0.3));
    let wall = with_islands(rectangle(0.0, 0.0, 20.0, 10.7), row.collect());
    let divided = film(&wall, 0.2);
    assert_eq!(divided.report.lumens, [1, 2]);
    assert_eq!(divided.report.islands, [10, 0]);
}

#[test]
fn a_ring_of_posts_cuts_off_a_lumen_inside_an_island() {
    let posts = (0..12).map(|i| {
        let (sin, cos) = (TAU * f64::from(i) / 12.0).sin_cos();
        circle([2.0 * cos, 2.0 * sin], 0.45, 64)
    });
    let section = with_islands(circle([0.0; 2], 4.0, 256), posts.collect());
    let filmed = film(&section, 0.1);
    assert_eq!(filmed.report.lumens, [1, 2]);
    assert_eq!(filmed.report.islands, [12, 1]);
}

#[test]
fn a_comb_keeps_its_teeth_until_they_close() {
    let mut points = vec![[0.0, 0.0], [100.0, 0.0]];
    for i in (0..50).rev() {
        let x = 2.0 * f64::from(i);
        points.extend([[x + 2.0, 10.0], [x + 1.0, 10.0], [x + 1.0, 1.0], [x, 1.0]]);
    }
    let comb = Outline::single(points);
    let filmed = film(&comb, 0.45);
    assert_eq!(filmed.report.lumens, [1, 1]);
    let closed = film(&comb, 0.499);
    assert_eq!(closed.report.lumens, [1, 1]);
    let gone = Film {
        thickness: 0.6,
        on: FilmOn::All,
    }
    .applied_to(&comb);
    assert!(gone.is_err() || gone.unwrap().report.area[1] < 10.0);
}

#[test]
fn a_fillet_of_the_radius_of_the_film_becomes_a_corner() {
    let t = 0.25;
    let mut points = Vec::new();
    for (x, y, start) in [
        (1.75, 0.25, 3),
        (1.75, 0.75, 0),
        (0.25, 0.75, 1),
        (0.25, 0.25, 2),
    ] {
        points.extend((0..=400).map(|i| {
            let (sin, cos) = (FRAC_PI_2 * (f64::from(start) + f64::from(i) / 400.0)).sin_cos();
            [x + t * cos, y + t * sin]
        }));
    }
    let section = Outline::single(points);
    let filmed = film(&section, t);
    assert!(off(filmed.outline.area(), 1.5 * 0.5) < 1e-5);
    assert!(off(film(&section, 0.3).outline.area(), 1.4 * 0.4) < 1e-5);
}

#[test]
fn a_film_on_the_floor_takes_off_the_depth_only() {
    let section = Outline::single(rectangle(0.0, 0.0, 100e-6, 40e-6));
    let floor = film_on(&section, 5e-6, FilmOn::Floor);
    assert!(off(floor.outline.area(), 100e-6 * 35e-6) < 1e-12);
    assert_eq!(floor.report.vertices, 4);
    let (low, high) = floor.outline.bounds().unwrap();
    assert_eq!((low[0], high), (0.0, [100e-6, 40e-6]));
    assert!((low[1] - 5e-6).abs() < 1e-18);
    let lid = film_on(&section, 5e-6, FilmOn::Lid);
    assert!((lid.outline.bounds().unwrap().1[1] - 35e-6).abs() < 1e-18);
}

#[test]
fn a_film_on_the_floor_meets_leaning_walls_at_its_own_level() {
    // A groove with walls of 54.74 degrees, wider at the lid, and one that narrows.
    for lean in [0.7_f64, -0.7] {
        let trapezoid = vec![
            [0.0, 0.0],
            [10.0, 0.0],
            [10.0 + 2.0 * lean, 2.0],
            [-2.0 * lean, 2.0],
        ];
        let filmed = film_on(&Outline::single(trapezoid), 0.5, FilmOn::Floor);
        let at = |y: f64| 10.0 + 2.0 * lean * y;
        assert!(off(filmed.outline.area(), 0.5 * (at(0.5) + at(2.0)) * 1.5) < 1e-12);
        assert_eq!(filmed.report.vertices, 4);
    }
}

#[test]
fn a_film_on_the_floor_ends_square_on_a_round_wall_and_at_a_step() {
    let round = Outline::single(circle([0.0; 2], 1.0, 720));
    let t = 0.1;
    let filmed = film_on(&round, t, FilmOn::Floor);
    // A quarter of a ring is gone.
    let ring = PI / 4.0 * (1.0 - (1.0 - t) * (1.0 - t));
    assert!((round.area() - filmed.outline.area() - ring).abs() < 2e-3 * ring + 1e-3);
    let step = vec![
        [0.0, 0.0],
        [5.0, 0.0],
        [5.0, 1.0],
        [9.0, 1.0],
        [9.0, 4.0],
        [0.0, 4.0],
    ];
    let filmed = film_on(&Outline::single(step), 0.25, FilmOn::Floor);
    assert!(off(filmed.outline.area(), 5.0 * 4.0 + 4.0 * 3.0 - 9.0 * 0.25) < 1e-12);
    // A thick film buries the step; its upper end stays square.
    let step = vec![
        [0.0, 0.0],
        [5.0, 0.0],
        [5.0, 1.0],
        [9.0, 1.0],
        [9.0, 4.0],
        [0.0, 4.0],
    ];
    let filmed = film_on(&Outline::single(step), 1.5, FilmOn::Floor);
    assert!(off(filmed.outline.area(), 5.0 * 2.5 + 4.0 * 1.5) < 1e-12);
}

#[test]
fn a_thin_plate_has_no_film_below_from_the_floor_above() {
    let plate = with_islands(
        rectangle(0.0, 0.0, 10.0, 10.0),
        vec![rectangle(3.0, 5.0, 4.0, 0.1)],
    );
    let filmed = film_on(&plate, 0.5, FilmOn::Floor);
    let gone = 10.0 * 0.5 + 4.0 * 0.5;
    assert!(off(filmed.outline.area(), 100.0 - 0.4 - gone) < 1e-12);
    assert_eq!(filmed.report.islands, [1, 1]);
}

#[test]
fn a_lumen_may_close_while_others_stay() {
    let outline = Outline {
        lumens: [
            rectangle(0.0, 0.0, 10.0, 1.0),
            rectangle(0.0, 5.0, 10.0, 4.0),
        ]
        .map(|points| Lumen {
            outer: Loop::new(points),
            islands: vec![],
        })
        .into(),
    };
    let filmed = film(&outline, 0.6);
    assert_eq!(filmed.report.lumens, [2, 1]);
    assert_eq!(filmed.report.lumens_vanished, 1);
    assert!(off(filmed.outline.area(), 8.8 * 2.8) < 1e-12);
}

#[test]
fn a_tiny_pocket_is_left_out_and_bounded() {
    // A pocket of 0.02 behind a neck of 0.01, on a channel of 10 by 4.
    let pocket = vec![
        [0.0, 0.0],
        [10.0, 0.0],
        [10.0, 4.0],
        [5.005, 4.0],
        [5.005, 4.1],
        [5.01, 4.1],
        [5.01, 4.12],
        [4.99, 4.12],
        [4.99, 4.1],
        [4.995, 4.1],
        [4.995, 4.0],
        [0.0, 4.0],
    ];
    let section = Outline::single(pocket);
    let all = Film {
        thickness: 0.006,
        on: FilmOn::All,
    };
    let kept = all.applied_within(&section, 1e-13).unwrap();
    assert_eq!(kept.report.lumens, [1, 2]);
    assert_eq!(kept.report.lumens_left_out, 0);
    let filmed = film(&section, 0.006);
    assert_eq!(filmed.report.lumens, [1, 1]);
    assert_eq!(filmed.report.lumens_left_out, 1);
    // Up to two arcs about the corners of the neck.
    let t = 0.006_f64;
    let under = |u: f64| 0.5 * (u * (t * t - u * u).sqrt() + t * t * (u / t).asin());
    let area = 0.008 * 0.014 - 2.0 * (under(0.005) - under(0.001));
    assert!(off(filmed.report.area_left_out, area) < 1e-3);
    assert!(off(filmed.report.conductance_left_out, area * area / (8.0 * PI)) < 2e-3);
}

#[test]
fn what_is_hardly_more_than_rounding_is_left_out_and_bounded() {
    // Beside a channel of 10 by 10, a square of which a film of 0.1 leaves 1e-6 by 1e-6.
    let side = 0.2 + 1e-6;
    let mut section = Outline::single(rectangle(0.0, 0.0, 10.0, 10.0));
    let beside = Outline::single(rectangle(20.0, 0.0, side, side));
    section.lumens.extend(beside.lumens);
    let filmed = film(&section, 0.1);
    assert_eq!(filmed.outline.lumens.len(), 1);
    assert_eq!(filmed.report.lumens_left_out, 1);
    assert!(off(filmed.report.area_left_out, 1e-12) < 1e-6);
    assert!(off(filmed.report.conductance_left_out, 1e-24 / (8.0 * PI)) < 1e-6);
}

#[test]
fn a_film_of_any_thickness_is_told_in_few_digits() {
    let square = Outline::single(rectangle(0.0, 0.0, 1e-4, 1e-4));
    for (thickness, told) in [
        (6e-5, "film is 60 um thick"),
        (1e300, "film is 1e306 um thick"),
    ] {
        let on = FilmOn::All;
        let error = Film { thickness, on }.applied_to(&square).unwrap_err();
        assert!(matches!(error, FilmError::Closed { .. }));
        assert!(error.to_string().contains(told), "{error}");
    }
}

#[test]
fn what_is_left_out_counts_against_the_tolerance() {
    let square = Outline::single(rectangle(0.0, 0.0, 1e-4, 1e-4));
    let options = SolveOptions {
        goal: Goal::Proven(5e-3),
        memory_limit: 3e6,
        ..SolveOptions::default()
    };
    let whole = solve_outline(&square, &options).unwrap().flow;
    assert!(whole.accuracy.is_met);
    // A hundredth of K might be missing: no grid can prove K to half of that.
    let left_out = 0.01 * whole.conductance.value;
    let options = SolveOptions {
        conductance_left_out: left_out,
        ..options
    };
    let flow = solve_outline(&square, &options).unwrap().flow;
    assert!(!flow.accuracy.is_met);
    let proven = flow.bracket.unwrap();
    assert!(proven.high - proven.low > left_out && proven.low < whole.conductance.value);
    assert!(
        flow.warnings
            .iter()
            .any(|w| w.code == Code::AccuracyNotReached)
    );
}

#[test]
fn the_thinnest_film_and_one_that_nearly_closes() {
    let corner = vec![
        [0.0, 0.0],
        [3.0, 0.0],
        [3.0, 1.0],
        [1.0, 1.0],
        [1.0, 3.0],
        [0.0, 3.0],
    ];
    let section = Outline::single(corner);
    let thin = film(&section, 1e-11);
    assert!((thin.outline.area() - (5.0 - 12e-11)).abs() < 1e-13);
    let below = Film {
        thickness: 1e-13,
        on: FilmOn::All,
    }
    .applied_to(&section);
    assert!(matches!(below, Err(FilmError::TooThin { .. })));
    let square = Outline::single(rectangle(0.0, 0.0, 1.0, 1.0));
    let last = film(&square, 0.499_999);
    assert!(off(last.outline.area(), 4e-12) < 1e-5);
    for thickness in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        let refused = Film {
            thickness,
            on: FilmOn::All,
        }
        .applied_to(&square);
        assert!(matches!(refused, Err(FilmError::NotPositive { .. })));
    }
    for thickness in [0.5, 0.6, 1e9, f64::MAX] {
        let closed = Film {
            thickness,
            on: FilmOn::All,
        }
        .applied_to(&square);
        assert!(matches!(closed, Err(FilmError::Closed { radius, .. }) if off(radius, 0.5) < 1e-6));
    }
}

/// A rough closed wall: radii of a walk about a circle, any number of vertices.
fn rough(sides: usize, roughness: f64, seed: u64) -> Outline {
    let mut state = seed.wrapping_mul(0x9E37_79B9_7F4A_7C15) | 1;
    let mut random = move || {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        (state >> 11) as f64 / (1_u64 << 53) as f64
    };
    let points = (0..sides).map(|i| {
        let (sin, cos) = (TAU * i as f64 / sides as f64).sin_cos();
        let r = 1.0 - roughness * random();
        [1.4 * r * cos, r * sin]
    });
    Outline::single(points.collect())
}

#[test]
fn vertices_on_straight_walls_within_rounding_do_no_harm() {
    // The slope of the floor is the same to either side of its second vertex, but for rounding.
    let groove = [
        [-50.0, 0.0],
        [-50.0, -39.8],
        [-20.0, -40.1],
        [0.0, -40.3],
        [20.0, -40.2],
        [50.0, -39.9],
        [50.0, 0.0],
    ];
    for factor in [1.0, 1e-6, 3.7e-5] {
        let section = Outline::single(groove.map(|p| p.map(|c| c * factor)).into());
        for share in [1e-6, 0.01, 0.999_983_96e-1] {
            for on in FilmOn::ALL {
                film_on(&section, share * factor * 10.0, on);
            }
        }
    }
}

#[test]
fn many_vertices_take_seconds_at_most() {
    for (sides, roughness, thickness) in [
        (100_000, 0.0, 0.1),
        (100_000, 1e-5, 0.1),
        (100_000, 0.01, 0.003),
        (100_000, 0.1, 0.05),
        (20_000, 0.3, 0.1),
    ] {
        let section = rough(sides, roughness, 7);
        let start = std::time::Instant::now();
        let filmed = film(&section, thickness);
        let time = start.elapsed().as_secs_f64();
        println!(
            "{sides} {roughness} {thickness}: {time:.2} s, {:?}",
            filmed.report
        );
        assert!(time < 60.0, "{sides} vertices took {time} s");
    }
}

/// A share of the usual number of cases, for those that take longest.
fn fewer_cases() -> ProptestConfig {
    let usual = ProptestConfig::default();
    ProptestConfig {
        cases: usual.cases.div_ceil(8),
        ..usual
    }
}

proptest! {
    #![proptest_config(fewer_cases())]

    #[test]
    fn rough_sections_keep_their_distance(
        sides in 5_usize..200,
        roughness in 0.0..0.9_f64,
        seed in 0_u64..1_000_000,
        share in 0.0..0.9_f64,
    ) {
        let section = rough(sides, roughness, seed);
        let radius = etchwise::geometry::largest_inscribed_circle(&section.lumens[0]).unwrap().radius;
        let filmed = film(&section, (share * radius).max(1e-9));
        // Every point of the section at 1.001 of the distance is in what remains, others are not.
        let tree = SegmentTree::of_outline(&section);
        for i in 0..400 {
            let p = [1.4 * (f64::from(i % 20) / 9.5 - 1.0) + 1e-4, f64::from(i / 20) / 9.5 - 1.0 + 1e-5];
            let wall = tree.nearest(p).unwrap().distance / filmed.report.film.thickness;
            let inside = is_inside(&section, p);
            let remains = is_inside(&filmed.outline, p);
            if !inside || wall < 0.999 {
                prop_assert!(!remains, "{p:?}");
            } else if wall > 1.001 && filmed.report.lumens_left_out == 0 {
                prop_assert!(remains, "{p:?}");
            }
        }
    }

    #[test]
    fn the_area_falls_by_the_perimeter(
        sides in 5_usize..100,
        roughness in 0.0..0.9_f64,
        seed in 0_u64..1_000_000,
        share in 0.01..0.8_f64,
    ) {
        let section = rough(sides, roughness, seed);
        let radius = etchwise::geometry::largest_inscribed_circle(&section.lumens[0]).unwrap().radius;
        let (t, step) = (share * radius, 1e-5 * radius);
        let all = |t: f64| {
            let filmed = film(&section, t);
            let area = filmed.report.area[1] + filmed.report.area_left_out;
            (area, filmed.report.perimeter[1], filmed.report.lumens_left_out)
        };
        let ((a, p, n), (b, q, m)) = (all(t), all(t + step));
        prop_assert!(b < a);
        if n == 0 && m == 0 {
            // The perimeter moves by at most its turning in one step, or falls where a part closes.
            let mean = (a - b) / step;
            prop_assert!(mean < p.max(q) * (1.0 + 1e-3) + 1e-3, "{mean} {p} {q}");
            prop_assert!(mean > p.min(q) * (1.0 - 1e-3) - 1e-3, "{mean} {p} {q}");
        }
    }

    #[test]
    fn two_films_are_one_of_their_sum(
        sides in 5_usize..100,
        roughness in 0.0..0.7_f64,
        seed in 0_u64..1_000_000,
        share in 0.01..0.4_f64,
        more in 0.01..0.4_f64,
    ) {
        let section = rough(sides, roughness, seed);
        let radius = etchwise::geometry::largest_inscribed_circle(&section.lumens[0]).unwrap().radius;
        let once = film(&section, (share + more) * radius);
        let twice = film(&film(&section, share * radius).outline, more * radius);
        if once.report.lumens_left_out + twice.report.lumens_left_out == 0 {
            prop_assert!((twice.report.area[1] - once.report.area[1]).abs() < 1e-6 * section.area());
        }
    }

    #[test]
    fn islands_at_random_grow_and_merge(
        centres in proptest::collection::vec((0.0..10.0_f64, 0.0..6.0_f64, 3_usize..9), 1..25),
        thickness in 0.01..0.6_f64,
    ) {
        let mut posts: Vec<(Point, usize)> = Vec::new();
        for (x, y, sides) in centres {
            let p = [x + 0.5, y + 0.5];
            if posts.iter().all(|(q, _)| (p[0] - q[0]).hypot(p[1] - q[1]) > 0.62) {
                posts.push((p, sides));
            }
        }
        let islands = posts.iter().map(|&(p, sides)| circle(p, 0.3, sides)).collect();
        let section = with_islands(rectangle(0.0, 0.0, 11.0, 7.0), islands);
        let filmed = film(&section, thickness);
        let tree = SegmentTree::of_outline(&section);
        for i in 0..600 {
            let p = [11.0 * (f64::from(i % 30) + 0.37) / 30.0, 7.0 * (f64::from(i / 30) + 0.21) / 20.0];
            let wall = tree.nearest(p).unwrap().distance / thickness;
            let remains = is_inside(&filmed.outline, p);
            if !is_inside(&section, p) || wall < 0.999 {
                prop_assert!(!remains);
            } else if wall > 1.001 && filmed.report.lumens_left_out == 0 {
                prop_assert!(remains);
            }
        }
    }

}

proptest! {
    #[test]
    fn a_film_on_the_floor_of_a_rough_groove_is_no_thicker_than_that_on_all(
        heights in proptest::collection::vec(0.0..1.0_f64, 3..60),
        thickness in 0.01..0.5_f64,
    ) {
        let last = (heights.len() - 1) as f64;
        let mut points: Vec<Point> = heights.iter().enumerate()
            .map(|(i, &h)| [10.0 * i as f64 / last, h])
            .collect();
        points.extend([[10.0, 3.0], [0.0, 3.0]]);
        let section = Outline::single(points);
        for on in [FilmOn::Floor, FilmOn::Lid] {
            let result = Film { thickness, on }.applied_to(&section);
            let filmed = match result {
                Ok(filmed) => filmed,
                // No wall of the floor lies within 45 degrees.
                Err(FilmError::NoWall { .. }) => continue,
                Err(error) => return Err(TestCaseError::fail(error.to_string())),
            };
            check(&section, &filmed);
            // One layer above every coated wall: its middle is in the film, or outside the section.
            for (a, b) in section.lumens[0].outer.edges() {
                let d = [(b[0] - a[0]), (b[1] - a[1])];
                let length = d[0].hypot(d[1]);
                let level = if on == FilmOn::Floor { d[0] } else { -d[0] } / length;
                if level > 0.7072 {
                    let p = [
                        0.5 * (a[0] + b[0]) - 0.9 * thickness * d[1] / length,
                        0.5 * (a[1] + b[1]) + 0.9 * thickness * d[0] / length,
                    ];
                    prop_assert!(!is_inside(&filmed.outline, p), "{p:?}");
                }
            }
            // Away from all walls nothing is gone.
            let tree = SegmentTree::of_outline(&section);
            for i in 0..300 {
                let p = [10.0 * (f64::from(i % 30) + 0.37) / 30.0, 3.0 * (f64::from(i / 30) + 0.21) / 10.0];
                if is_inside(&section, p) && tree.nearest(p).unwrap().distance > 1.5 * thickness {
                    prop_assert!(is_inside(&filmed.outline, p), "{p:?}");
                }
            }
        }
    }
}
