//! Two hundred invented channels as a profilometer would have written them: the way from the file to the
//! conductance against what is known.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

#[path = "synthetic/channels.rs"]
mod channels;

use channels::{Channel, Dice, KINDS, Trouble, measured, told, written};
use etchwise::flow::{Goal, SolveOptions, solve_outline};
use etchwise::geometry::Outline;
use etchwise::intake::{ReadError, ReadOptions, Section, section_from_bytes};

/// Channels in the test.
const CHANNELS: usize = 200;
/// Allowed error of the conductance.
const ALLOWED: f64 = 0.01;

fn conductance(outline: &Outline) -> f64 {
    let options = SolveOptions {
        goal: Goal::Estimated(1e-3),
        ..SolveOptions::default()
    };
    solve_outline(outline, &options)
        .unwrap()
        .flow
        .conductance
        .value
}

/// One invented case: what is true and what was written.
fn case(number: usize) -> (Channel, Trouble, usize, Vec<u8>) {
    let mut dice = Dice::new(number as u64);
    let channel = Channel::random(KINDS[number % KINDS.len()], &mut dice);
    let dialect = (number / KINDS.len()) % 8;
    let depth = channel.depth;
    let slope = depth / channel.width;
    let trouble = Trouble {
        tilt: [0.0, 0.3, -1.0, 0.1][dice.below(4)] * slope,
        bow: [0.0, 0.0, 0.3, -0.2][dice.below(4)] * depth,
        noise: [0.0, 0.001, 0.003][dice.below(3)] * depth,
        spikes: [0, 0, 2, 6][dice.below(4)],
        missing: [0, 0, 4, 10][dice.below(4)],
    };
    let step = channel.width / dice.between(400.0, 1500.0);
    let rows = measured(&channel, &trouble, step, &mut dice);
    let bytes = written(&rows, dialect);
    (channel, trouble, dialect, bytes)
}

fn read(trouble: &Trouble, bytes: Vec<u8>) -> Result<Section, ReadError> {
    let mut options = ReadOptions::default();
    options.instrument.corrections.bow = if trouble.bow == 0.0 { 1 } else { 2 };
    section_from_bytes(bytes, "invented", &options)
}

#[test]
fn the_conductance_of_invented_channels_comes_out_of_their_files() {
    let mut worst = 0.0_f64;
    let mut failures = Vec::new();
    for number in 0..CHANNELS {
        let (channel, trouble, dialect, bytes) = case(number);
        let told = told(&channel, &trouble, dialect);
        let section = match read(&trouble, bytes) {
            Ok(section) => section,
            Err(error) => {
                failures.push(format!("{number}: {told}\n{}", error.explain()));
                continue;
            }
        };
        let micrometre = |p: [f64; 2]| p.map(|c| c * 1e-6);
        let outline = channel.outline().into_iter().map(micrometre).collect();
        let truth = conductance(&Outline::single(outline));
        let found = conductance(&section.outline);
        let off = found / truth - 1.0;
        worst = worst.max(off.abs());
        let reach = section.extras.reach.as_ref();
        let side = |outline: Option<&Outline>, other: f64| outline.map_or(other, conductance);
        let low = side(
            reach.and_then(|r| r.inner.as_ref()).map(|s| &s.outline),
            found,
        );
        let high = side(
            reach.and_then(|r| r.outer.as_ref()).map(|s| &s.outline),
            found,
        );
        let within = low * (1.0 - ALLOWED) <= truth && truth <= high * (1.0 + ALLOWED);
        // Every one of these traces shows its whole channel: no tip stands in the way.
        if off.abs() > ALLOWED || !within {
            failures.push(format!(
                "{number}: off by {off:.4}, within reach {within}: {told}"
            ));
        }
    }
    assert!(
        failures.is_empty(),
        "worst {worst:.4}\n{}",
        failures.join("\n")
    );
}
