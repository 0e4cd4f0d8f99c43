//! Estimated errors of the conductance where many corners miss the nodes: rough outlines, ridges, stars.
//!
//! Reference: the same sections on fine grids, whose own proven range is far narrower. The sections are invented.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use std::f64::consts::TAU;

use etchwise::flow::{NearbySections, SolveOptions, solve_outline};
use etchwise::geometry::{Outline, Point};
use etchwise::measured::Estimate;

/// Numbers between -1 and 1 without order.
fn noise(seed: u64) -> impl Iterator<Item = f64> {
    let mut state = seed;
    std::iter::repeat_with(move || {
        state = state
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        (state >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
    })
}

/// A flattened disc; `roughness` over the radius by vertex.
fn disc(count: usize, roughness: impl Iterator<Item = f64>) -> Outline {
    let points = (0..count).zip(roughness).map(|(k, rough)| {
        let t = k as f64 * TAU / count as f64;
        let r = 50e-6 * (1.0 + rough);
        [r * t.cos(), 0.6 * r * t.sin()]
    });
    Outline::single(points.collect())
}

fn noisy_disc(count: usize, part: f64, seed: u64) -> Outline {
    disc(count, noise(seed).map(|x| part * x))
}

fn wavy_disc() -> Outline {
    let waves = (0..1000).map(|k| {
        let t = f64::from(k) * TAU / 1000.0;
        0.01 * ((7.0 * t).sin() + 0.6 * (41.0 * t + 1.0).sin() + 0.5 * (173.0 * t + 2.0).sin())
    });
    disc(1000, waves)
}

/// A rectangle with ridges on its lid that are nothing special.
fn ridged(count: usize, seed: u64) -> Outline {
    let pitch = 100e-6 / count as f64;
    let mut share = noise(seed).map(|x| 0.5 + 0.5 * x);
    let mut lid: Vec<Point> = Vec::new();
    for k in 0..count {
        let mut next = || share.next().unwrap_or(0.5);
        let from = pitch * (k as f64 + 0.2 + 0.2 * next());
        let to = from + pitch * (0.1 + 0.3 * next());
        let low = 50e-6 - 40e-6 * (0.2 + 0.6 * next());
        lid.extend([[from, 50e-6], [from, low], [to, low], [to, 50e-6]]);
    }
    let mut points = vec![[0.0, 0.0], [100e-6, 0.0], [100e-6, 50e-6]];
    points.extend(lid.into_iter().rev());
    points.push([0.0, 50e-6]);
    Outline::single(points)
}

fn star(arms: usize, inner: f64, seed: u64) -> Outline {
    let points = (0..2 * arms).zip(noise(seed)).map(|(k, x)| {
        let t = (k as f64 + 0.3 * x) * TAU / (2 * arms) as f64;
        let r = 50e-6 * if k % 2 == 1 { inner } else { 0.95 + 0.05 * x };
        [r * t.cos(), r * t.sin()]
    });
    Outline::single(points.collect())
}

fn sections() -> Vec<(&'static str, Outline)> {
    vec![
        ("wavy disc", wavy_disc()),
        ("noisy disc, 60", noisy_disc(60, 0.03, 5)),
        ("noisy disc, 200", noisy_disc(200, 0.01, 8)),
        ("noisy disc, 400", noisy_disc(400, 0.003, 2)),
        ("noisy disc, 800", noisy_disc(800, 0.01, 3)),
        ("ridges, 1", ridged(1, 11)),
        ("ridges, 3", ridged(3, 12)),
        ("ridges, 5", ridged(5, 13)),
        ("star, 5", star(5, 0.45, 21)),
        ("star, 9", star(9, 0.7, 22)),
    ]
}

fn conductance(outline: &Outline, cells: f64) -> Estimate {
    let options = SolveOptions {
        cells_across: Some(cells),
        ..SolveOptions::default()
    };
    solve_outline(outline, &options).unwrap().flow.conductance
}

#[test]
fn estimates_on_rough_outlines_hold_on_any_grid() {
    let mut offs = Vec::new();
    for (name, outline) in sections() {
        assert!(outline.is_valid(), "{name}");
        let fine = conductance(&outline, 700.0);
        for cells in [16.0, 23.0, 37.0, 52.0, 75.0, 110.0, 160.0] {
            let found = conductance(&outline, cells);
            let off = (found.value - fine.value).abs() - fine.error;
            let share = off / found.error;
            assert!(
                share <= 2.0,
                "{name}, {cells} cells: {share:.2} of {found:?}"
            );
            offs.push(share);
        }
    }
    offs.sort_by(f64::total_cmp);
    let part = |share: f64| offs[(share * offs.len() as f64) as usize];
    assert!(part(0.9) <= 1.2, "nine of ten: {:.2}", part(0.9));
    // Not too careful either: what is asked for has a price.
    assert!(part(0.5) >= 0.1, "median: {:.2}", part(0.5));
}

#[test]
fn a_ten_thousandth_on_a_rough_outline_takes_no_more_cells_than_it_needs() {
    let outline = wavy_disc();
    let nearby = NearbySections::new(&outline, 1e-4).unwrap();
    assert!(nearby.cells_across() < 450.0, "{}", nearby.cells_across());
    let found = nearby.conductance(&outline).unwrap();
    let off = found.value / conductance(&outline, 1000.0).value - 1.0;
    assert!(off.abs() <= 1e-4, "{off:e}, {found:?}");
}
