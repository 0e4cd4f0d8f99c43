//! The proven bounds: that they hold, how narrow they are, and that they hold for any nodal values.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use etchwise::flow::{SectionFlow, SolveOptions, closed_form, solve_outline};
use etchwise::geometry::{NominalSpec, Outline};
use etchwise::grid::{Lattice, LineCrossings};
use etchwise::proof::{Bracket, bracket};
use etchwise::solve::{Hierarchy, SolveControl};
use proptest::prelude::*;

/// Sections with known conductance: spec, and the closed form or series of `closed_form`.
fn known() -> Vec<(&'static str, f64)> {
    let um = 1e-6;
    let square = closed_form::rectangle(100.0 * um, 100.0 * um).unwrap();
    let flat = closed_form::rectangle(400.0 * um, 100.0 * um).unwrap();
    let triangle = closed_form::equilateral_triangle(100.0 * um).unwrap();
    let ring = closed_form::eccentric_annulus(100.0 * um, 50.0 * um, 25.0 * um).unwrap();
    vec![
        ("rectangle width=100um height=100um", square.conductance),
        ("rectangle width=400um height=100um", flat.conductance),
        (
            "triangle base=100um left_angle=60deg right_angle=60deg",
            triangle.conductance,
        ),
        (
            "annulus outer_diameter=200um inner_diameter=100um offset=25um",
            ring.conductance,
        ),
    ]
}

fn outline(spec: &str) -> Outline {
    spec.parse::<NominalSpec>().unwrap().outline().unwrap()
}

fn solve(outline: &Outline, cells: f64, offset: Option<[f64; 2]>) -> SectionFlow {
    let options = SolveOptions {
        cells_across: Some(cells),
        grid_offset: offset,
        ..SolveOptions::default()
    };
    solve_outline(outline, &options).unwrap().flow
}

fn proven(flow: &SectionFlow) -> Bracket {
    flow.bracket.unwrap()
}

/// How many times the usual number of places is tried; all fifty on every grid need 17.
fn more_places() -> u32 {
    let asked = std::env::var("BRACKET_PLACES").ok();
    asked.and_then(|n| n.parse().ok()).unwrap_or(1)
}

/// Curved walls are chords within 1e-7 of the size, which moves K by less than this.
const CHORDS: f64 = 1e-6;

#[test]
fn the_bracket_holds_on_every_grid_at_any_offset_and_angle() {
    for (spec, exact) in known() {
        let section = outline(spec);
        for (cells, places) in [
            (8.0, 50),
            (16.0, 50),
            (32.0, 50),
            (64.0, 50),
            (128.0, 12),
            (256.0, 3),
        ] {
            for k in 0..places * more_places() {
                let k = f64::from(k);
                let offset = [(0.137 + 0.618 * k).fract(), (0.411 + 0.755 * k).fract()];
                let turned = section.clone().rotated(0.37 * k, [0.0, 0.0]);
                let flow = solve(&turned, cells, Some(offset));
                let Bracket { low, high } = proven(&flow);
                assert!(
                    low <= exact * (1.0 + CHORDS) && exact * (1.0 - CHORDS) <= high,
                    "{spec} at {cells}, turned {k}: {low:e} {exact:e} {high:e}"
                );
                assert!((low..=high).contains(&flow.conductance.value));
            }
        }
    }
}

#[test]
fn the_gap_at_128_cells_is_small_and_falls_faster_than_the_square_of_the_spacing() {
    for (spec, limit) in [
        ("rectangle width=100um height=100um", 4e-5),
        ("koh_groove opening=100um depth=20um", 4e-5),
        ("circle diameter=100um", 4e-5),
        (
            "triangle base=100um left_angle=60deg right_angle=60deg",
            5e-5,
        ),
        ("circular_sector radius=100um angle=270deg", 1e-3),
    ] {
        let section = outline(spec);
        let re_entrant = spec.starts_with("circular_sector");
        let width = |cells: f64| {
            (0..4)
                .map(|k| {
                    let k = f64::from(k);
                    let offset = [(0.2 + 0.618 * k).fract(), (0.3 + 0.755 * k).fract()];
                    // A re-entrant corner falls on a node, as the program itself would have it.
                    let offset = (!re_entrant).then_some(offset);
                    proven(&solve(&section, cells, offset)).relative_width()
                })
                .fold(0.0, f64::max)
        };
        let fine = width(128.0);
        assert!(fine < limit, "{spec}: {fine:.2e}");
        let order = (width(32.0) / fine).log2() / 2.0;
        let least = if re_entrant { 4.0 / 3.0 - 0.1 } else { 2.3 };
        assert!(order > least, "{spec}: order {order:.2}");
    }
}

/// A star-shaped polygon around the origin.
fn star(radii: &[f64]) -> Outline {
    let n = radii.len() as f64;
    let vertex = |(k, r): (usize, &f64)| {
        let t = std::f64::consts::TAU * k as f64 / n;
        [r * t.cos(), r * t.sin()]
    };
    Outline::single(radii.iter().enumerate().map(vertex).collect())
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(
        std::env::var("PROPTEST_CASES").ok().and_then(|n| n.parse().ok()).unwrap_or(48)
    ))]

    #[test]
    fn coarse_and_fine_brackets_of_rough_polygons_overlap(
        radii in prop::collection::vec(0.4..1.0_f64, 5..60),
        dx in 0.0..1.0_f64,
        dy in 0.0..1.0_f64,
    ) {
        let section = star(&radii);
        let coarse = solve(&section, 12.0, Some([dx, dy])).bracket;
        let fine = proven(&solve(&section, 96.0, None));
        // A coarse grid may have no bracket, but not a wrong one.
        if let Ok(coarse) = coarse {
            prop_assert!(coarse.low <= fine.high && fine.low <= coarse.high, "{coarse:?} {fine:?}");
        }
    }

    #[test]
    fn the_bracket_holds_for_any_nodal_values(seed in 1..1000_u32, amount in 0.0..2.0_f64) {
        let exact = closed_form::rectangle(1.0, 1.0).unwrap().conductance;
        let unit = Outline::single(vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]])
            .rotated(0.3, [0.0, 0.0]);
        let lattice = Lattice::new(&unit, 1.0 / 20.0, [0.3, 0.8]);
        let (rows, columns) = (LineCrossings::rows(&lattice), LineCrossings::columns(&lattice));
        let mut hierarchy = Hierarchy::new(&lattice, &rows, &columns).unwrap();
        hierarchy.solve(SolveControl { residual: 1e-8, most_cycles: 50 }, |_, _| {});
        let (mask, mut phi) = hierarchy.into_finest();
        let mut state = seed;
        for value in phi.colour.iter_mut().flatten() {
            state = state.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
            *value *= 1.0 + amount * (f64::from(state) / f64::from(u32::MAX) - 0.5);
        }
        let found = bracket(&lattice, &mask, &phi).unwrap().scaled(lattice.spacing.powi(4));
        prop_assert!(found.low <= exact && exact <= found.high, "{found:?} {exact}");
    }
}

#[test]
fn corners_that_miss_their_node_by_rounding_have_a_bracket_on_every_grid() {
    let um = 1e-6;
    let angle = |x: f64, y: f64| {
        let places = [
            [0.0, 0.0],
            [80.0, 0.0],
            [80.0, 40.0],
            [40.0, 40.0],
            [40.0, 80.0],
            [0.0, 80.0],
        ];
        Outline::single(places.map(|[a, b]| [(a + x) * um, (b + y) * um]).to_vec())
    };
    let (mut lowest, mut highest) = (0.0_f64, f64::INFINITY);
    for k in 0..40 {
        let section = angle(0.31 * f64::from(k), -1.7 * f64::from(k));
        for turned in [section.clone(), section.mirrored_left_right(0.0)] {
            let Bracket { low, high } = proven(&solve(&turned, f64::from(24 + k), None));
            (lowest, highest) = (lowest.max(low), highest.min(high));
        }
    }
    assert!(lowest <= highest, "{lowest:e} {highest:e}");
}

#[test]
fn a_vertex_a_hair_from_a_grid_line_or_node_at_most_doubles_the_gap() {
    let convex = vec![
        [0.0, 0.0],
        [1.0, 0.13],
        [1.31, 0.7],
        [0.62, 1.2],
        [-0.2, 0.8],
    ];
    let re_entrant = vec![
        [0.0, 0.0],
        [1.9, 0.2],
        [1.8, 0.9],
        [0.9, 0.8],
        [0.8, 1.9],
        [-0.1, 1.7],
    ];
    for points in [convex, re_entrant] {
        let section = Outline::single(points.clone());
        let cells = 48.0;
        let generic = (0..12)
            .map(|k| {
                let k = f64::from(k);
                let offset = [(0.137 + 0.618 * k).fract(), (0.411 + 0.755 * k).fract()];
                proven(&solve(&section, cells, Some(offset))).relative_width()
            })
            .fold(0.0, f64::max);
        let spacing = solve(&section, cells, Some([0.0; 2])).grid.spacing;
        let (low, _) = section.bounds().unwrap();
        for vertex in points {
            for hair in [1e-9, -1e-9, 1e-7, -1e-7, 2e-6, -2e-6, 1e-4, -1e-4] {
                let on_line = [0, 1].map(|axis: usize| {
                    let at = (vertex[axis] - low[axis]) / spacing;
                    at.ceil() - at + hair + 1.0
                });
                for offset in [on_line, [on_line[0], 1.37], [1.41, on_line[1]]] {
                    let width = proven(&solve(&section, cells, Some(offset))).relative_width();
                    assert!(
                        width <= 2.0 * generic,
                        "{vertex:?}, {hair:e}: {width:.2e} against {generic:.2e}"
                    );
                }
            }
        }
    }
}

#[test]
fn thin_walls_posts_and_several_lumens_have_brackets_that_hold() {
    // Two squares parted by a wall of a hundredth of a cell: twice the one.
    let half = |x: f64| vec![[x, 0.0], [x + 1.0, 0.0], [x + 1.0, 1.0], [x, 1.0]];
    let parted = Outline {
        lumens: [Outline::single(half(0.0)), Outline::single(half(1.0003))]
            .into_iter()
            .flat_map(|o| o.lumens)
            .collect(),
    };
    let exact = 2.0 * closed_form::rectangle(1.0, 1.0).unwrap().conductance;
    for angle in [0.0, 0.4] {
        let flow = solve(
            &parted.clone().rotated(angle, [0.0, 0.0]),
            32.0,
            Some([0.35, 0.6]),
        );
        let Bracket { low, high } = proven(&flow);
        assert!(low <= exact && exact <= high, "{low} {exact} {high}");
        assert!(high / low < 1.02, "thin walls cost little: {}", high / low);
    }
    // A post: the bracket of a coarse grid holds the best value of a fine one.
    let post = "rectangle width=300um height=100um posts=[(rectangle width=20um height=20um x=10um y=-40um)]";
    let fine = solve(&outline(post), 256.0, None).conductance.value;
    for cells in [24.0, 48.0, 96.0] {
        let Bracket { low, high } = proven(&solve(&outline(post), cells, Some([0.3, 0.7])));
        assert!(
            low <= fine && fine <= high,
            "{cells}: {low:e} {fine:e} {high:e}"
        );
    }
}
