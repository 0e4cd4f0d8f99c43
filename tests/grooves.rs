//! Sections of traces, solved: what a stylus hides, and that the range of smallest and largest section holds the
//! truth; and how long a long trace takes.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use etchwise::flow::{SolveOptions, closed_form, solve_outline};
use etchwise::geometry::Outline;
use etchwise::intake::{
    CorrectedTrace, GrooveSection, Profile, SectionOptions, Tip, Zone, sections,
};
use etchwise::study::{Reach, ReachSides};

const UM: f64 = 1e-6;

fn tip(radius: f64) -> Tip {
    Tip {
        radius: radius * UM,
        cone_angle: 60_f64.to_radians(),
    }
}

/// An invented channel with upright walls from 100.2 um on, between lands of 100 um, as a tip reads it.
fn channel(width: f64, depth: f64, step: f64, by: Tip) -> CorrectedTrace {
    let (from, to) = (100.2, 100.2 + width);
    let count = ((width + 200.4) / step).ceil() as usize;
    // The tip may touch both edges anywhere, not only at samples: its image is known in closed form.
    let read = |x: f64| {
        let edge = (x - from).min(to - x);
        if edge <= 0.0 {
            return 0.0;
        }
        let sides = [x - from, to - x].map(|u| -by.height_at(u * UM));
        sides.into_iter().fold(-depth * UM, f64::max)
    };
    let x: Vec<f64> = (0..=count).map(|i| step * i as f64).collect();
    let land = |from: f64, to: f64| Zone {
        from: from * UM,
        to: to * UM,
    };
    CorrectedTrace {
        profile: Profile {
            z: x.iter().map(|&x| read(x)).collect(),
            x: x.iter().map(|x| x * UM).collect(),
        },
        lands: vec![land(0.0, from), land(to, width + 200.4)],
        ..CorrectedTrace::default()
    }
}

fn section(trace: &CorrectedTrace, options: &SectionOptions) -> GrooveSection {
    sections(trace, options).unwrap().remove(0)
}

fn conductance(outline: &Outline) -> f64 {
    solve_outline(outline, &SolveOptions::default())
        .unwrap()
        .flow
        .conductance
        .value
}

/// Conductance as read against that of the channel.
fn share_as_read(width: f64, depth: f64) -> f64 {
    let trace = channel(width, depth, 0.1, tip(0.0));
    let truth = closed_form::rectangle(width * UM, depth * UM)
        .unwrap()
        .conductance;
    conductance(&section(&trace, &SectionOptions::default()).outline) / truth
}

#[test]
fn a_sixty_degree_cone_shows_54_per_cent_of_a_deep_channel() {
    // Shares computed from the ideal geometry of a sharp cone, see the tip's formulas.
    for (width, depth, expected) in [
        (100.0, 50.0, 0.54),
        (200.0, 50.0, 0.81),
        (100.0, 20.0, 0.85),
    ] {
        let share = share_as_read(width, depth);
        println!("{width} x {depth} um read by a sharp cone of 60 deg: {share:.4} of K");
        assert!((share - expected).abs() < 0.01, "{width} {depth}: {share}");
    }
}

#[test]
fn the_range_of_smallest_and_largest_section_holds_the_truth() {
    let truth = closed_form::rectangle(100.0 * UM, 50.0 * UM)
        .unwrap()
        .conductance;
    for (radius, step, stated) in [
        (0.0, 0.5, true),
        (2.0, 0.5, true),
        (12.5, 0.5, true),
        (2.0, 0.13, true),
        (0.0, 0.5, false),
        (2.0, 0.5, false),
    ] {
        let trace = channel(100.0, 50.0, step, tip(radius));
        let options = SectionOptions {
            tip: stated.then(|| tip(radius)),
            ..SectionOptions::default()
        };
        let section = section(&trace, &options);
        let reach = section.reach.as_ref().unwrap();
        let sides = ReachSides {
            inner: reach.inner.as_ref().map(|s| &s.outline),
            outer: reach.outer.as_ref().map(|s| &s.outline),
            conductance_left_out: 0.0,
        };
        let solve = SolveOptions::default();
        let flow = solve_outline(&section.outline, &solve).unwrap().flow;
        let reach = Reach::new(&section.outline, &flow, &sides, &solve).unwrap();
        let (low, high) = (reach.low().unwrap() / truth, reach.high().unwrap() / truth);
        println!("radius {radius} um, step {step} um, stated {stated}: {low:.4} to {high:.4} of K");
        assert!(low < 1.0 && high > 1.0, "{low} {high}");
        assert!(low > 0.4 && high < 1.1, "{low} {high}");
    }
}

#[test]
fn stated_walls_bring_the_channel_back() {
    let truth = closed_form::rectangle(100.0 * UM, 50.0 * UM)
        .unwrap()
        .conductance;
    for radius in [0.0, 2.0, 12.5] {
        let options = SectionOptions {
            tip: Some(tip(radius)),
            walls: Some(std::f64::consts::FRAC_PI_2),
            ..SectionOptions::default()
        };
        let section = section(&channel(100.0, 50.0, 0.1, tip(radius)), &options);
        let share = conductance(&section.outline) / truth;
        println!("radius {radius} um, upright walls: {share:.4} of K");
        // The edges lie between two samples, a tenth of a micrometre apart.
        assert!((share - 1.0).abs() < 0.004, "{share}");
    }
}

#[test]
fn a_million_samples_do_not_take_long() {
    // Grooves of 1 mm pitch, 20 um deep, with slanted walls and a grain of noise.
    let count = 1_000_000_usize;
    let height = |index: usize| {
        let at = (index % 2000) as f64 * 0.5;
        let noise = ((index * 7919) % 1000) as f64 / 1000.0 - 0.5;
        -((at - 300.0).min(700.0 - at).max(0.0) * 0.8).min(20.0) + 0.02 * noise
    };
    let profile = Profile {
        x: (0..count).map(|i| i as f64 * 0.5 * UM).collect(),
        z: (0..count).map(|i| height(i) * UM).collect(),
    };
    let zone = |i: usize| Zone {
        from: (i as f64 * 1000.0 - 295.0) * UM,
        to: (i as f64 * 1000.0 + 295.0) * UM,
    };
    let trace = CorrectedTrace {
        profile,
        lands: (0..=500).map(zone).collect(),
        ..CorrectedTrace::default()
    };
    let options = SectionOptions {
        tip: Some(tip(12.5)),
        ..SectionOptions::default()
    };
    let start = std::time::Instant::now();
    let found = sections(&trace, &options).unwrap();
    let taken = start.elapsed();
    println!("1e6 samples, {} grooves: {taken:?}", found.len());
    assert_eq!(found.len(), 500);
    let one = SectionOptions {
        groove: Some(250),
        ..options
    };
    let start = std::time::Instant::now();
    sections(&trace, &one).unwrap();
    println!("1e6 samples, one groove of them: {:?}", start.elapsed());
    // Loaded machines are slow; measured on two idle cores it is a fraction of this.
    assert!(taken.as_secs_f64() < 10.0);
}
