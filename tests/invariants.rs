//! What must hold for every section, checked on random ones.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use etchwise::flow::{SectionFlow, SolveOptions, solve_outline};
use etchwise::geometry::{Loop, Lumen, Outline};
use etchwise::grid::{Lattice, LineCrossings, Mask};
use etchwise::solve::{Hierarchy, SolveControl, natural_order, poisson_matrix};
use proptest::prelude::*;

/// A star-shaped polygon around the origin: radii at equal angles.
fn star(radii: &[f64]) -> Vec<[f64; 2]> {
    radii
        .iter()
        .enumerate()
        .map(|(k, r)| {
            let t = std::f64::consts::TAU * k as f64 / radii.len() as f64;
            [r * t.cos(), r * t.sin()]
        })
        .collect()
}

fn moved(outline: &Outline, map: impl Fn([f64; 2]) -> [f64; 2]) -> Outline {
    let map_loop = |l: &Loop| Loop::new(l.points.iter().map(|&p| map(p)).collect());
    Outline {
        lumens: outline
            .lumens
            .iter()
            .map(|lumen| Lumen {
                outer: map_loop(&lumen.outer),
                islands: lumen.islands.iter().map(map_loop).collect(),
            })
            .collect(),
    }
    .oriented()
}

fn solve(outline: &Outline) -> SectionFlow {
    let options = SolveOptions {
        cells_across: Some(48.0),
        ..SolveOptions::default()
    };
    solve_outline(outline, &options).unwrap().flow
}

fn radii() -> impl Strategy<Value = Vec<f64>> {
    prop::collection::vec(0.5..1.0_f64, 5..14)
}

/// Two results of the same section agree within both error estimates.
fn agree(a: &SectionFlow, b: &SectionFlow, factor: f64) {
    let allowed = factor * (a.conductance.relative() + b.conductance.relative()) + 1e-9;
    let difference = (a.conductance.value / b.conductance.value - 1.0).abs();
    assert!(
        difference <= allowed,
        "K differs by {difference:e}, allowed {allowed:e}"
    );
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(
        std::env::var("PROPTEST_CASES").ok().and_then(|n| n.parse().ok()).unwrap_or(24)
    ))]

    #[test]
    fn conductance_goes_with_length_to_the_fourth(radii in radii(), scale in 1e-6..1e3_f64) {
        let outline = Outline::single(star(&radii));
        let (a, b) = (solve(&outline), solve(&moved(&outline, |p| [scale * p[0], scale * p[1]])));
        let ratio = b.conductance.value / (a.conductance.value * scale.powi(4));
        // Rounding of the scaled vertices may move the grid a little.
        let allowed = a.conductance.relative() + b.conductance.relative() + 1e-9;
        prop_assert!((ratio - 1.0).abs() <= allowed, "ratio {ratio}, allowed {allowed:e}");
    }

    #[test]
    fn a_shift_a_turn_and_a_mirror_change_nothing(
        radii in radii(),
        angle in 0.0..std::f64::consts::TAU,
        shift in -5.0..5.0_f64,
    ) {
        let outline = Outline::single(star(&radii));
        let (c, s) = (angle.cos(), angle.sin());
        let plain = solve(&outline);
        let turned = moved(&outline, |p| [c * p[0] - s * p[1] + shift, s * p[0] + c * p[1] - shift]);
        agree(&plain, &solve(&turned), 2.0);
        agree(&plain, &solve(&moved(&outline, |p| [-p[0], p[1]])), 2.0);
    }

    #[test]
    fn a_larger_section_conducts_more_and_none_more_than_the_round_one(
        radii in radii(),
        growth in 1.02..1.3_f64,
        vertex in 0..5_usize,
    ) {
        let inner = solve(&Outline::single(star(&radii)));
        let mut larger = radii;
        larger[vertex] *= growth;
        let outer = solve(&Outline::single(star(&larger)));
        let margin = inner.conductance.error + outer.conductance.error;
        prop_assert!(outer.conductance.value > inner.conductance.value - margin);
        // Saint-Venant's inequality (proved by Polya 1948; from memory): equality for the circle.
        let bound = outer.geometry.area.powi(2) / (8.0 * std::f64::consts::PI);
        prop_assert!(outer.conductance.value < bound);
    }

    #[test]
    fn two_lumens_add(first in radii(), second in radii()) {
        let a = Outline::single(star(&first));
        let b = moved(&Outline::single(star(&second)), |p| [p[0] + 2.5, p[1]]);
        let both = Outline { lumens: [a.lumens.clone(), b.lumens.clone()].concat() };
        let (a, b, both) = (solve(&a), solve(&b), solve(&both));
        let sum = a.conductance.value + b.conductance.value;
        let allowed = 3.0 * (a.conductance.error + b.conductance.error + both.conductance.error);
        prop_assert!((both.conductance.value - sum).abs() <= allowed);
    }

    #[test]
    fn the_stencil_and_the_assembled_matrix_agree(radii in radii(), dx in 0.0..1.0_f64, dy in 0.0..1.0_f64) {
        let lattice = Lattice::new(&Outline::single(star(&radii)), 0.07, [dx, dy]);
        let (rows, columns) = (LineCrossings::rows(&lattice), LineCrossings::columns(&lattice));
        let mut hierarchy = Hierarchy::new(&lattice, &rows, &columns).unwrap();
        let control = SolveControl { residual: 1e-12, most_cycles: 60 };
        hierarchy.solve(control, |_, _| {});
        let mask: &Mask = &hierarchy.grids[0].mask;
        let matrix = poisson_matrix(mask);
        let order = natural_order(mask);
        let mut phi = vec![0.0; mask.nodes()];
        for (indices, values) in order.iter().zip(&hierarchy.grids[0].phi.colour) {
            for (&index, &value) in indices.iter().zip(values) {
                phi[index as usize] = value;
            }
        }
        let mut image = vec![0.0; phi.len()];
        for (&value, (row, column)) in &matrix {
            image[row] += value * phi[column];
        }
        for (row, value) in image.iter().enumerate() {
            let diagonal = matrix.get(row, row).copied().unwrap();
            prop_assert!((value - 1.0).abs() < 1e-9 * diagonal.max(1.0), "row {row}: {value}");
        }
    }
}

#[test]
fn the_result_is_the_same_to_the_last_bit_for_any_number_of_threads() {
    let outline = Outline::single(star(&[1.0, 0.8, 0.9, 0.7, 1.0, 0.6]));
    let options = SolveOptions {
        cells_across: Some(420.0),
        ..SolveOptions::default()
    };
    let with = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .unwrap();
        pool.install(|| solve_outline(&outline, &options).unwrap().flow)
    };
    let (one, two, four) = (with(1), with(2), with(4));
    assert!(
        one.grid.fluid_nodes > 120_000,
        "large enough to be shared out"
    );
    for other in [two, four] {
        assert_eq!(one.conductance, other.conductance);
        assert_eq!(one.bracket.unwrap(), other.bracket.unwrap());
        assert_eq!(one.accuracy.source, other.accuracy.source);
        assert_eq!(one.wall_shear, other.wall_shear);
        assert_eq!(one.peak, other.peak);
    }
}

#[test]
fn a_cycle_reduces_the_residual_to_a_quarter_at_most() {
    for offset in [[0.0, 0.0], [0.37, 0.61], [0.99, 0.02]] {
        let outline = Outline::single(star(&[1.0, 0.8, 0.9, 0.7, 1.0, 0.6, 0.9]));
        let options = SolveOptions {
            cells_across: Some(200.0),
            grid_offset: Some(offset),
            ..SolveOptions::default()
        };
        let flow = solve_outline(&outline, &options).unwrap().flow;
        assert!(flow.solver.converged && !flow.solver.accelerated);
        assert!(
            flow.solver.convergence_factor < 0.25,
            "{}",
            flow.solver.convergence_factor
        );
        assert!(flow.solver.cycles <= 12, "{} cycles", flow.solver.cycles);
    }
}

#[test]
fn lumens_islands_and_slots_of_any_thinness_keep_their_unknowns() {
    // Fifty parallel lumens of very different widths, one an island away from touching the next.
    let lumens: Vec<Lumen> = (0..50)
        .map(|k| {
            let (x, w) = (1.1 * f64::from(k), 1.0 + 0.001 * f64::from(k));
            Lumen {
                outer: Loop::new(vec![[x, 0.0], [x + w, 0.0], [x + w, 5.0], [x, 5.0]]),
                islands: Vec::new(),
            }
        })
        .collect();
    let comb = Outline { lumens }.oriented();
    let flow = solve(&comb);
    let sum: f64 = comb
        .lumens
        .iter()
        .map(|lumen| {
            let points = &lumen.outer.points;
            rectangle(points[1][0] - points[0][0], 5.0)
        })
        .sum();
    assert!((flow.conductance.value / sum - 1.0).abs() < 2e-5);
    // A wall of no more than a hundredth of a cell parts a square in two.
    let half = |x0: f64, x1: f64| Lumen {
        outer: Loop::new(vec![[x0, 0.0], [x1, 0.0], [x1, 1.0], [x0, 1.0]]),
        islands: Vec::new(),
    };
    let parted = Outline {
        lumens: vec![half(0.0, 0.5), half(0.5001, 1.0001)],
    };
    let flow = solve(&parted);
    let exact = 2.0 * rectangle(0.5, 1.0);
    assert!((flow.conductance.value / exact - 1.0).abs() < 2e-5);
    // 1000 to 1, slanted.
    let (c, s) = (0.6_f64.cos(), 0.6_f64.sin());
    let slit = moved(
        &Outline::single(vec![[0.0, 0.0], [1000.0, 0.0], [1000.0, 1.0], [0.0, 1.0]]),
        |p| [c * p[0] - s * p[1], s * p[0] + c * p[1]],
    );
    let options = SolveOptions {
        cells_across: Some(16.0),
        ..SolveOptions::default()
    };
    let flow = solve_outline(&slit, &options).unwrap().flow;
    let exact = rectangle(1.0, 1000.0);
    assert!((flow.conductance.value / exact - 1.0).abs() < 1e-5);
}

/// Conductance of a rectangle, `(w h^3/12) (1 - (192 h/(pi^5 w)) sum tanh(n pi w/2h)/n^5)`, n odd
/// (series solution; Boussinesq 1868, in every textbook of laminar flow).
fn rectangle(h: f64, w: f64) -> f64 {
    let sum: f64 = (0..60)
        .map(|k| {
            let n = f64::from(2 * k + 1);
            (n * std::f64::consts::PI * w / (2.0 * h)).tanh() / n.powi(5)
        })
        .sum();
    w * h.powi(3) / 12.0 * (1.0 - 192.0 * h / (std::f64::consts::PI.powi(5) * w) * sum)
}

#[test]
fn beside_many_corners_the_iteration_ends_sooner_and_loses_next_to_nothing() {
    let radii: Vec<f64> = (0..60).map(|k| 1.0 - 0.06 * f64::from(k % 2)).collect();
    let lattice = Lattice::new(&Outline::single(star(&radii)), 0.02, [0.3, 0.6]);
    let (rows, columns) = (
        LineCrossings::rows(&lattice),
        LineCrossings::columns(&lattice),
    );
    let control = SolveControl {
        residual: 1e-7,
        most_cycles: 60,
    };
    let solved = |share: f64| {
        let mut hierarchy = Hierarchy::new(&lattice, &rows, &columns).unwrap();
        let mut finest = None;
        hierarchy.solve_to_share(control, share, |_, found| finest = Some(found));
        let sum: f64 = hierarchy.grids[0].phi.colour.iter().flatten().sum();
        (finest.unwrap(), sum)
    };
    let ((far, whole), (near, early)) = (solved(0.0), solved(0.005));
    assert!(far.converged && far.residual <= control.residual, "{far:?}");
    assert!(
        near.converged && near.residual > control.residual,
        "{near:?}"
    );
    assert!(
        near.cycles >= 1 && near.cycles < far.cycles,
        "{near:?} {far:?}"
    );
    assert!((early / whole - 1.0).abs() < 1e-4, "{early} {whole}");
}
