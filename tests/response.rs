//! Response tables against closed forms and solves of their own, on points that no fit has seen.
#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use std::f64::consts::PI;

use etchwise::flow::{SolveOptions, closed_form, solve_outline};
use etchwise::geometry::{NominalSpec, Outline};
use etchwise::study::{
    PointError, RangeText, ResponseError, ResponseFamily, ResponseOptions, ResponseTable, Trend,
    TrendCheck, response_table,
};
use etchwise::warning::Code;

fn ranges(texts: &[&str]) -> Vec<RangeText> {
    texts.iter().map(|t| RangeText::read(t).unwrap()).collect()
}

fn nominal(fixed: &str, texts: &[&str]) -> ResponseFamily {
    let fixed: NominalSpec = fixed.parse().unwrap();
    ResponseFamily::nominal(fixed, &ranges(texts)).unwrap()
}

fn with_fresh(fresh_points: usize) -> ResponseOptions {
    ResponseOptions {
        fresh_points,
        ..ResponseOptions::default()
    }
}

fn codes(table: &ResponseTable) -> Vec<Code> {
    table.warnings.iter().map(|w| w.code).collect()
}

/// Places of another sequence than that of the fresh points: multiples of the golden ratio and the root of two,
/// between 0 and 1, ends of the range among them.
fn places(count: usize) -> impl Iterator<Item = [f64; 2]> {
    let fraction = |k: usize, step: f64| (k as f64 * step).fract();
    let spread =
        (0..count).map(move |k| [fraction(k, 0.618_033_988_75), fraction(k, 2.0_f64.sqrt())]);
    spread.chain([[0.0, 1.0], [1.0, 0.0], [1.0, 1.0]])
}

fn between(low: f64, high: f64, share: f64) -> f64 {
    low + share * (high - low)
}

#[test]
fn a_rectangle_is_within_its_stated_error_of_the_series_at_a_thousand_points() {
    let family = nominal("rectangle", &["width=60..120um", "height=30..60um"]);
    let table = response_table(&family, with_fresh(50)).unwrap();
    assert!(table.errors.is_met() && table.warnings.is_empty());
    let mut largest = 0.0_f64;
    for [x, y] in places(1000) {
        let (w, h) = (between(60e-6, 120e-6, x), between(30e-6, 60e-6, y));
        let exact = closed_form::rectangle(w, h).unwrap().conductance;
        let off = table.conductance(&[w, h]).unwrap() / exact - 1.0;
        largest = largest.max(off.abs());
    }
    assert!(largest < 1e-3, "{largest}");
    // The stated error comes from fifty other points; a thousand may find a little more.
    assert!(
        largest < 1.5 * table.errors.stated(),
        "{largest} {:?}",
        table.errors
    );
    for trend in &table.trends {
        assert_eq!(
            (trend.expected, trend.found),
            (Some(Trend::Rises), Some(Trend::Rises))
        );
        assert!(trend.holds() && trend.pairs > 0);
    }
}

#[test]
fn grooves_of_both_etches_are_within_a_tenth_of_a_per_cent_of_solves_of_their_own() {
    for (fixed, texts, low) in [
        (
            "koh_groove",
            ["opening=60..120um", "depth=20..40um"],
            [60e-6, 20e-6],
        ),
        (
            "isotropic_etch",
            ["mask_opening=20..40um", "depth=20..40um"],
            [20e-6, 20e-6],
        ),
    ] {
        let family = nominal(fixed, &texts);
        let table = response_table(&family, with_fresh(60)).unwrap();
        assert!(table.errors.is_met(), "{fixed} {:?}", table.errors);
        assert!(
            table.errors.numerical <= 1.001e-4,
            "{fixed} {:?}",
            table.errors
        );
        for [x, y] in places(12) {
            let at = [
                between(low[0], 2.0 * low[0], x),
                between(low[1], 2.0 * low[1], y),
            ];
            let outline = family.outline(&at).unwrap();
            let solved = solve_outline(&outline, &SolveOptions::default()).unwrap();
            let off = table.conductance(&at).unwrap() / solved.flow.conductance.value - 1.0;
            assert!(off.abs() < 1e-3, "{fixed} {at:?} {off}");
        }
    }
}

#[test]
fn a_circle_is_a_power_law_of_four_terms_at_most_and_outside_there_is_no_answer() {
    let table =
        response_table(&nominal("circle", &["diameter=50..100um"]), with_fresh(20)).unwrap();
    // dlnK/dln(d) = 4 and half the logarithm of the range is ln(2)/2.
    let slope = table
        .fit
        .terms
        .iter()
        .find(|term| term.degrees == [1])
        .unwrap();
    assert!((slope.coefficient / (2.0 * 2.0_f64.ln()) - 1.0).abs() < 1e-4);
    assert_eq!(table.fit.degrees, [1]);
    let k = table.conductance(&[80e-6]).unwrap();
    assert!((k / (PI * 80e-6_f64.powi(4) / 128.0) - 1.0).abs() < 2e-4);
    for outside in [49.9e-6, 100.1e-6, f64::NAN] {
        assert_eq!(table.conductance(&[outside]), None);
    }
    assert_eq!(table.conductance(&[80e-6, 1.0]), None);
    let proven = table
        .points
        .iter()
        .all(|p| (PI * p.values[0].powi(4) / 128.0) > p.proven.clone().unwrap()[0]);
    assert!(
        proven,
        "a polygon inside the circle has a proven low value below it"
    );
}

#[test]
fn walls_of_a_rectangle_moved_give_the_rectangle_that_they_make() {
    let outline = Outline::single(vec![
        [-50e-6, -40e-6],
        [50e-6, -40e-6],
        [50e-6, 0.0],
        [-50e-6, 0.0],
    ]);
    let texts = ["film=0..2um", "depth=-2..2um", "floor=0..1um"];
    let family = ResponseFamily::moved(&outline, &[], &ranges(&texts)).unwrap();
    let table = response_table(&family, with_fresh(20)).unwrap();
    assert!(table.errors.is_met(), "{:?}", table.errors);
    for [x, y] in places(20) {
        let (film, depth, floor) = (2e-6 * x, between(-2e-6, 2e-6, y), 1e-6 * (1.0 - x));
        let exact = closed_form::rectangle(100e-6 - 2.0 * film, 40e-6 + depth + floor - 2.0 * film);
        let k = table.conductance(&[film, depth, floor]).unwrap();
        let off = k / exact.unwrap().conductance - 1.0;
        assert!(off.abs() < 1e-3, "{film} {depth} {floor}: {off}");
    }
    let found: Vec<Option<Trend>> = table.trends.iter().map(|t| t.found).collect();
    assert_eq!(
        found,
        [Some(Trend::Falls), Some(Trend::Rises), Some(Trend::Rises)]
    );
    assert!(table.trends.iter().all(TrendCheck::holds));
}

#[test]
fn the_number_of_threads_changes_no_bit() {
    let family = nominal(
        "trapezoid right_angle=80deg depth=30um",
        &["top_width=60..90um", "left_angle=70..88deg"],
    );
    let on = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads);
        let pool = pool.build().unwrap();
        pool.install(|| response_table(&family, with_fresh(20)).unwrap())
    };
    let bits = |table: &ResponseTable| -> Vec<u64> {
        let terms = table.fit.terms.iter().map(|t| t.coefficient.to_bits());
        let points = table.points.iter().chain(&table.fresh);
        terms
            .chain(points.map(|p| p.conductance.value.to_bits()))
            .collect()
    };
    assert_eq!(bits(&on(1)), bits(&on(3)));
}

#[test]
fn a_groove_that_has_closed_is_flat_and_a_fit_that_is_not_says_so() {
    // From a depth of 70.7 um on the V is closed and K is constant; a polynomial cannot be.
    let family = nominal("koh_groove opening=100um", &["depth=30..120um"]);
    let table = response_table(&family, with_fresh(60)).unwrap();
    let trend = &table.trends[0];
    assert_eq!(trend.expected, Some(Trend::Rises));
    assert!(
        trend.wrong_places > 0 && trend.wrong_pairs == 0,
        "{trend:?}"
    );
    assert!(trend.largest_fall > 0.0 && trend.largest_fall < 2.0 * table.errors.stated());
    assert!(codes(&table).contains(&Code::NotMonotone));
}

#[test]
fn a_fit_that_is_not_reached_is_the_best_one_and_says_what_it_is() {
    let halves = "bonded_halves lower=(koh_groove opening=100um depth=40um) \
                  upper=(koh_groove opening=100um depth=40um)";
    let family = nominal(halves, &["offset=-1000..1000um"]);
    let options = ResponseOptions {
        fit_error: 1e-2,
        fresh_points: 40,
    };
    let table = response_table(&family, options).unwrap();
    assert!(!table.errors.is_met(), "{:?}", table.errors);
    assert!(table.errors.fit() > 1e-2, "{:?}", table.errors);
    assert_eq!(table.nodes, [33]);
    let codes = codes(&table);
    assert!(codes.contains(&Code::FitNotReached) && codes.contains(&Code::ShapeChanges));
}

#[test]
fn a_section_that_cannot_be_made_is_named_with_its_values_before_anything_is_solved() {
    let family = nominal(
        "trapezoid right_angle=90deg",
        &[
            "top_width=20..40um",
            "depth=20..40um",
            "left_angle=20..90deg",
        ],
    );
    let error = response_table(&family, with_fresh(20)).unwrap_err();
    let ResponseError::Point { place, source } = &error else {
        panic!("{error}")
    };
    assert_eq!(
        place,
        "top_width = 20 um, depth = 20 um, left_angle = 20 deg"
    );
    assert!(matches!(**source, PointError::Nominal(_)));
}

#[test]
fn parameters_that_cannot_be_varied_are_refused_with_what_can() {
    let square = Outline::single(vec![[0.0, 0.0], [1e-5, 0.0], [1e-5, 1e-5], [0.0, 1e-5]]);
    let refused = |texts: &[&str]| ResponseFamily::moved(&square, &[], &ranges(texts)).unwrap_err();
    for (texts, part) in [
        (&["flim=0..1um"][..], "did you mean `film`"),
        (&["film=-1..1um"], "over_etch"),
        (&["scale=0..1um"], "scale=-2..2%"),
        (&["depth=1..2um", "depth=1..2um"], "one range"),
        (&["depth=2..1um"], "smaller value first"),
        (
            &["a=1..2um", "b=1..2um", "c=1..2um", "d=1..2um"],
            "fix the others",
        ),
        (&[], "--vary"),
    ] {
        let hint = refused(texts).hint();
        assert!(hint.contains(part), "{texts:?}: {hint}");
    }
}
