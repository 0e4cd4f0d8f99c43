//! Nets of channels against closed forms and against a dense solution by other code. All nets are invented.
#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use etchwise::study::{
    BeyondLimit, CardExtent, NetCard, NetCardLimits, NetChannel, NetNode, NetOutput, Network,
    NetworkError, NodeCondition, NormalSource, OutputUncertainty, SampleOptions,
};
use etchwise::warning::Code;
use nalgebra::{DMatrix, DVector};

/// Resistance per length of the cards here, Pa s/m^4.
const R: f64 = 2.0e15;

fn card(name: &str, proven: f64) -> NetCard {
    NetCard {
        name: name.to_owned(),
        extent: CardExtent::PerLength,
        resistance: R,
        proven: Some((R * (1.0 - proven), R * (1.0 + proven))),
        inertance: Some(3e11),
        volume: 4e-9,
        wall_area: 2.8e-4,
        length: None,
        shear_mean: Some(3.2e10),
        shear_max: Some(4.3e10),
        own_uncertainty: None,
        origin: 0,
        common_uncertainty: 0.0,
        limits: NetCardLimits {
            reynolds: Some(2000.0),
            entrance_share: Some(0.1),
            pressure_drop: Some(1e7),
        },
        temperature: Some(298.15),
        viscosity: 8.9e-4,
        density: Some(997.0),
        law: None,
    }
}

/// Nodes `n0`, `n1`, ... with given pressures, and channels as begin, end and length.
fn net(nodes: usize, pressures: &[(usize, f64)], channels: &[(usize, usize, f64)]) -> Network {
    let mut network = Network {
        name: "invented".to_owned(),
        fluid: "water".to_owned(),
        temperature: None,
        cards: vec![card("square", 1e-3)],
        nodes: (0..nodes)
            .map(|k| NetNode {
                name: format!("n{k}"),
                condition: NodeCondition::Inflow(0.0),
            })
            .collect(),
        channels: Vec::new(),
    };
    for &(node, pressure) in pressures {
        network.nodes[node].condition = NodeCondition::Pressure(pressure);
    }
    for (index, &(from, to, length)) in channels.iter().enumerate() {
        network.channels.push(NetChannel {
            name: format!("c{index}"),
            from,
            to,
            card: 0,
            length: Some(length),
            parallel: 1,
            spread: 0.0,
        });
    }
    network
}

fn assert_close(found: f64, exact: f64, tolerance: f64) {
    let off = (found / exact - 1.0).abs();
    assert!(off <= tolerance, "{found} against {exact}: {off:.2e} off");
}

#[test]
fn channels_in_series_and_side_by_side_come_out_to_rounding() {
    // Lengths between 1 mm and 1 m: their sum, and the sum of their inverses, are the answers.
    let lengths: Vec<f64> = (0..200).map(|k| 1e-3 * 1.035_f64.powi(k)).collect();
    let chain: Vec<(usize, usize, f64)> = lengths
        .iter()
        .enumerate()
        .map(|(k, &l)| (k, k + 1, l))
        .collect();
    let series = net(201, &[(0, 2e4), (200, 0.0)], &chain).solve().unwrap();
    let sum: f64 = lengths.iter().sum();
    let resistance = series.equivalent.unwrap().resistance;
    assert_close(resistance, R * sum, 1e-14);
    for channel in &series.channels {
        assert_close(channel.flow, 2e4 / (R * sum), 1e-13);
    }
    assert!(series.balance.relative < 1e-13, "{:?}", series.balance);
    let side: Vec<(usize, usize, f64)> = lengths.iter().map(|&l| (0, 1, l)).collect();
    let parallel = net(2, &[(0, 2e4), (1, 0.0)], &side).solve().unwrap();
    let sum: f64 = lengths.iter().map(|l| 1.0 / l).sum();
    assert_close(parallel.equivalent.unwrap().resistance, R / sum, 1e-14);
    for (channel, length) in parallel.channels.iter().zip(&lengths) {
        assert_close(channel.flow, 2e4 / (R * length), 1e-14);
    }
    // The same through a node in the middle, and `parallel` against as many channels.
    let mut bundle = net(3, &[(0, 2e4), (2, 0.0)], &[(0, 1, 0.01), (1, 2, 0.02)]);
    bundle.channels[1].parallel = 7;
    let solved = bundle.solve().unwrap();
    let exact = R * (0.01 + 0.02 / 7.0);
    assert_close(solved.equivalent.unwrap().resistance, exact, 1e-14);
    let each = solved.channels[1].mean_velocity.unwrap();
    assert_close(each, 2e4 / exact / 7.0 / 4e-9, 1e-14);
    assert_close(solved.channels[1].volume, 7.0 * 0.02 * 4e-9, 1e-14);
}

#[test]
fn a_bridge_agrees_with_its_closed_form_and_carries_nothing_when_balanced() {
    let lengths = [0.01, 0.02, 0.03, 0.05, 0.07];
    let [a, b, c, d, e] = lengths;
    let channels = [(0, 1, a), (0, 2, b), (1, 3, c), (2, 3, d), (1, 2, e)];
    let solved = net(4, &[(0, 1e4), (3, 0.0)], &channels).solve().unwrap();
    // Star of the triangle a, b, e.
    let sum = a + b + e;
    let (u, v, w) = (a * b / sum, a * e / sum, b * e / sum);
    let exact = R * (u + 1.0 / (1.0 / (v + c) + 1.0 / (w + d)));
    assert_close(solved.equivalent.unwrap().resistance, exact, 1e-14);
    // Balanced: a / c = b / d.
    let balanced = [
        (0, 1, 0.01),
        (0, 2, 0.02),
        (1, 3, 0.03),
        (2, 3, 0.06),
        (1, 2, 0.01),
    ];
    let solved = net(4, &[(0, 1e4), (3, 0.0)], &balanced).solve().unwrap();
    assert!(solved.channels[4].flow.abs() < 1e-15 * solved.channels[0].flow);
}

/// Any net: a ring so that it hangs together, and chords.
fn random_net(seed: u64) -> Network {
    let mut source = NormalSource::new(seed);
    let nodes = 5 + (source.bits() % 40) as usize;
    let mut channels: Vec<(usize, usize, f64)> = Vec::new();
    for k in 0..nodes {
        channels.push((k, (k + 1) % nodes, 0.01 * source.normal().exp()));
    }
    for _ in 0..2 * nodes {
        let from = (source.bits() % nodes as u64) as usize;
        let step = 1 + (source.bits() % (nodes as u64 - 1)) as usize;
        channels.push((from, (from + step) % nodes, 0.01 * source.normal().exp()));
    }
    // Half of the nets have two outlets at the same pressure.
    let middle = if seed.is_multiple_of(2) { 0.0 } else { 1e3 };
    let mut network = net(
        nodes,
        &[(0, 3e4), (nodes / 2, middle), (nodes - 1, 0.0)],
        &channels,
    );
    network.nodes[1].condition = NodeCondition::Inflow(1e-10 * source.normal());
    network
}

/// Pressures by a dense LU of the conductance matrix with rows of given pressures replaced.
fn dense_pressures(network: &Network) -> Vec<f64> {
    let n = network.nodes.len();
    let mut matrix = DMatrix::<f64>::zeros(n, n);
    let mut right = DVector::<f64>::zeros(n);
    for channel in &network.channels {
        let g = f64::from(channel.parallel) / (R * channel.length.unwrap());
        for (row, column) in [(channel.from, channel.to), (channel.to, channel.from)] {
            matrix[(row, row)] += g;
            matrix[(row, column)] -= g;
        }
    }
    for (row, node) in network.nodes.iter().enumerate() {
        match node.condition {
            NodeCondition::Inflow(q) => right[row] = q,
            NodeCondition::Pressure(p) => {
                matrix.row_mut(row).fill(0.0);
                // Of the size of the other rows.
                let scale = 1.0 / (R * 0.01);
                matrix[(row, row)] = scale;
                right[row] = scale * p;
            }
        }
    }
    matrix.lu().solve(&right).unwrap().iter().copied().collect()
}

#[test]
fn random_nets_agree_with_a_dense_solution() {
    for seed in 0..60 {
        let network = random_net(seed);
        let solved = network.solve().unwrap();
        let dense = dense_pressures(&network);
        for (node, exact) in solved.nodes.iter().zip(dense) {
            assert!(
                (node.pressure - exact).abs() < 1e-8,
                "{seed}: {} {exact}",
                node.pressure
            );
        }
        assert!(solved.balance.is_kept() && solved.balance.relative < 1e-11);
        assert!(solved.balance.whole.abs() < 1e-22, "{:?}", solved.balance);
        assert!(solved.equivalent.is_none());
    }
}

#[test]
fn conductances_twelve_decades_apart_keep_their_digits() {
    // Ladder of wide channels with one narrow rung: 1e12 apart. Closed form of two rails in series and parallel.
    let (wide, narrow) = (1e-6, 1e6);
    let channels = [
        (0, 1, wide),
        (1, 2, narrow),
        (2, 3, wide),
        (1, 4, wide),
        (4, 2, narrow),
        (3, 5, narrow),
    ];
    let solved = net(6, &[(0, 1e5), (5, 0.0)], &channels).solve().unwrap();
    let rungs = 1.0 / (1.0 / narrow + 1.0 / (wide + narrow));
    let exact = R * (wide + rungs + wide + narrow);
    assert_close(solved.equivalent.unwrap().resistance, exact, 1e-15 * 4.0);
    let whole = 1e5 / exact;
    // Flow of the wide channels, whose ends have equal pressures in nearly all their digits.
    assert_close(solved.channels[0].flow, whole, 1e-13);
    assert_close(solved.channels[2].flow, whole, 1e-13);
    assert_close(
        solved.channels[3].flow,
        whole * rungs / (wide + narrow),
        1e-13,
    );
    assert!(solved.balance.relative < 1e-13, "{:?}", solved.balance);
}

/// Any net with two pressures.
fn two_ended(seed: u64) -> Network {
    let mut network = random_net(seed);
    let middle = network.nodes.len() / 2;
    network.nodes[middle].condition = NodeCondition::Inflow(0.0);
    network
}

#[test]
fn the_proven_range_holds_whatever_the_cards_are_within_theirs() {
    let fresh = two_ended(5);
    let mut network = fresh.clone();
    let whole = network.solve().unwrap().equivalent.unwrap();
    let (low, high) = whole.proven.unwrap();
    assert!(low < whole.resistance && whole.resistance < high);
    assert_close(low, whole.resistance * (1.0 - 1e-3), 1e-12);
    let mut source = NormalSource::new(3);
    for _ in 0..50 {
        for channel in &mut network.channels {
            let up = if source.bits().is_multiple_of(2) {
                1e-3
            } else {
                -1e-3
            };
            channel.length = channel.length.map(|l| l * (1.0 + up));
        }
        let other = network.solve().unwrap().equivalent.unwrap().resistance;
        assert!((low..=high).contains(&other), "{low} {other} {high}");
        network = fresh.clone();
    }
    network.cards[0].proven = None;
    assert_eq!(network.solve().unwrap().equivalent.unwrap().proven, None);
}

#[test]
fn a_single_channel_gives_the_numbers_of_its_formulas() {
    let solved = net(2, &[(0, 1e4), (1, 0.0)], &[(1, 0, 0.02)])
        .solve()
        .unwrap();
    let channel = &solved.channels[0];
    let flow = 1e4 / (R * 0.02);
    // From the second node to the first: against its direction.
    assert_close(channel.flow, -flow, 1e-15);
    assert_close(channel.pressure_drop, -1e4, 1e-15);
    assert_close(channel.mean_velocity.unwrap(), flow / 4e-9, 1e-15);
    let diameter = 4.0 * 4e-9 / 2.8e-4;
    let reynolds = 997.0 * flow / 4e-9 * diameter / 8.9e-4;
    assert_close(channel.reynolds.unwrap(), reynolds, 1e-14);
    assert_close(channel.wall_shear_max.unwrap(), 4.3e10 * flow, 1e-15);
    assert_close(channel.residence_time.unwrap(), 0.02 * 4e-9 / flow, 1e-15);
    assert_close(channel.time_constant.unwrap(), 3e11 / R, 1e-15);
    assert!(channel.beyond.is_empty());
    assert_close(solved.nodes[0].inflow, flow, 1e-15);
    assert_close(solved.nodes[1].inflow, -flow, 1e-15);
}

#[test]
fn limits_of_the_cards_are_kept_and_said() {
    let network = net(2, &[(0, 2e7), (1, 0.0)], &[(0, 1, 1e-3)]);
    let solved = network.solve().unwrap();
    assert_eq!(
        solved.channels[0].beyond,
        [
            BeyondLimit::Reynolds,
            BeyondLimit::Entrance,
            BeyondLimit::PressureDrop
        ]
    );
    assert!(solved.is_outside_validity());
    let codes: Vec<Code> = solved.warnings(&network).iter().map(|w| w.code).collect();
    assert_eq!(
        codes,
        [
            Code::NotLaminar,
            Code::EntranceLength,
            Code::FluidRange,
            Code::Caution
        ]
    );
    let quiet = net(2, &[(0, 1e4), (1, 0.0)], &[(0, 1, 0.1)]);
    let warnings = quiet.solve().unwrap().warnings(&quiet);
    assert!(
        warnings.iter().all(|w| w.code == Code::Caution),
        "{warnings:?}"
    );
}

#[test]
fn nets_that_have_no_solution_say_why_and_where() {
    let error = |network: Network| network.solve().unwrap_err();
    assert_eq!(error(net(2, &[(0, 1.0)], &[])), NetworkError::Empty);
    let floating = error(net(3, &[(0, 1.0)], &[(0, 1, 0.1)]));
    assert!(
        matches!(&floating, NetworkError::Floating { node, .. } if node == "n2"),
        "{floating}"
    );
    let part = error(net(
        5,
        &[(0, 1.0)],
        &[(0, 1, 0.1), (2, 3, 0.1), (4, 3, 0.1)],
    ));
    assert!(
        matches!(&part, NetworkError::NoPressure { node, nodes: 3, .. } if node == "n2"),
        "{part}"
    );
    for length in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        let wrong = error(net(2, &[(0, 1.0)], &[(0, 1, length)]));
        assert!(
            matches!(wrong, NetworkError::Channel { .. }),
            "{length}: {wrong}"
        );
    }
    let looped = error(net(2, &[(0, 1.0)], &[(0, 1, 0.1), (1, 1, 0.1)]));
    assert!(looped.to_string().contains("same node"), "{looped}");
    let mut warm = net(2, &[(0, 1.0)], &[(0, 1, 0.1)]);
    warm.temperature = Some(310.15);
    assert!(matches!(error(warm), NetworkError::NoLaw { .. }));
    let mut mixed = net(2, &[(0, 1.0)], &[(0, 1, 0.1)]);
    mixed.cards.push(NetCard {
        temperature: Some(300.0),
        ..card("other", 1e-3)
    });
    assert!(matches!(
        error(mixed),
        NetworkError::MixedTemperatures { .. }
    ));
}

/// A divider with two cards, spreads and an inflow, all uncertain.
fn uncertain() -> Network {
    let channels = [
        (0, 1, 0.01),
        (1, 2, 0.02),
        (1, 2, 0.03),
        (1, 3, 0.05),
        (2, 3, 0.02),
    ];
    let mut network = net(4, &[(0, 2e4), (3, 0.0)], &channels);
    network.nodes[2].condition = NodeCondition::Inflow(2e-11);
    network.cards[0].own_uncertainty = Some(0.01);
    network.cards[0].common_uncertainty = 0.02;
    network.cards.push(NetCard {
        common_uncertainty: 0.03,
        origin: 1,
        ..card("other", 1e-3)
    });
    network.channels[3].card = 1;
    network.channels[2].spread = 0.04;
    network.channels[2].parallel = 4;
    network
}

#[test]
fn first_order_agrees_with_differences_of_solutions() {
    let network = uncertain();
    let solved = network.solve().unwrap();
    let options = SampleOptions {
        count: Some(0),
        seed: 1,
    };
    let found = network.uncertainty(&solved, options).unwrap();
    assert_eq!(found.outputs.len(), found.all_outputs);
    assert_eq!(found.samples, 0);
    let value = |network: &Network, output: NetOutput| {
        let solved = network.solve().unwrap();
        match output {
            NetOutput::Resistance => solved.equivalent.unwrap().resistance,
            NetOutput::Inflow(node) => solved.nodes[node].inflow,
            NetOutput::Flow(channel) => solved.channels[channel].flow,
            NetOutput::Pressure(node) => solved.nodes[node].pressure,
        }
    };
    for one in &found.outputs {
        let step = 1e-4_f64;
        let slope = |change: &dyn Fn(&mut Network, f64)| {
            let (mut up, mut down) = (network.clone(), network.clone());
            change(&mut up, step.exp());
            change(&mut down, (-step).exp());
            (value(&up, one.output) - value(&down, one.output)) / (2.0 * step)
        };
        let first = slope(&|n, f| n.cards[0].resistance *= f) * 0.01_f64.hypot(0.02);
        let second = slope(&|n, f| n.cards[1].resistance *= f) * 0.03;
        let spread =
            slope(&|n, f| n.channels[2].length = n.channels[2].length.map(|l| l * f)) * 0.02;
        let square = first.powi(2) + second.powi(2) + spread.powi(2);
        assert_close(one.u, square.sqrt(), 1e-6);
        assert_close(
            one.common_share,
            (first.powi(2) + second.powi(2)) / square,
            1e-6,
        );
    }
}

#[test]
fn samples_agree_with_first_order_and_repeat_bit_for_bit() {
    let network = uncertain();
    let solved = network.solve().unwrap();
    let options = SampleOptions {
        count: Some(4000),
        seed: 42,
    };
    let found = network.uncertainty(&solved, options).unwrap();
    assert_eq!(found.samples, 4000);
    let limit = 5.0 * found.sampling_error().unwrap();
    let largest = found.largest_difference().unwrap().abs();
    assert!(
        largest > 0.0 && largest < limit,
        "{largest} against {limit}"
    );
    for one in &found.outputs {
        let sampled = one.sampled.unwrap();
        assert!((sampled.mean - one.value).abs() < 0.2 * one.u, "{one:?}");
        assert!(
            sampled.low < one.value && one.value < sampled.high,
            "{one:?}"
        );
    }
    assert_eq!(network.uncertainty(&solved, options).unwrap(), found);
    let other = network
        .uncertainty(
            &solved,
            SampleOptions {
                seed: 43,
                ..options
            },
        )
        .unwrap();
    assert_ne!(other.outputs, found.outputs);
    // What all channels have in common does not change how the flow splits.
    let mut common = uncertain();
    common.channels[2].spread = 0.0;
    common.channels[3].card = 0;
    common.nodes[2].condition = NodeCondition::Inflow(0.0);
    let solved = common.solve().unwrap();
    let found = common.uncertainty(&solved, options).unwrap();
    for one in &found.outputs {
        match one.output {
            NetOutput::Pressure(_) => assert!(one.u < 1e-12 * one.value, "{one:?}"),
            _ => assert_close(one.u / one.value.abs(), 0.01_f64.hypot(0.02), 1e-12),
        }
    }
    // Two entries of one card are that card: nothing changes. Of two cards, the split moves.
    let split = |origin: usize| {
        let mut two = common.clone();
        two.cards[0].common_uncertainty = 0.0;
        two.cards[1] = NetCard {
            origin,
            ..two.cards[0].clone()
        };
        two.channels[3].card = 1;
        let solved = two.solve().unwrap();
        let found = two.uncertainty(&solved, options).unwrap().outputs;
        let pressure = |one: &&OutputUncertainty| one.output == NetOutput::Pressure(1);
        *found.iter().find(pressure).unwrap()
    };
    let (one, two) = (split(0), split(1));
    assert!(
        one.u < 1e-12 * one.value && two.u > 1e-4 * two.value,
        "{one:?} {two:?}"
    );
    assert!(one.sampled.unwrap().u < 1e-9 * one.value, "{one:?}");
    assert_close(two.sampled.unwrap().u, two.u, 0.06);
    let mut exact = common;
    exact
        .cards
        .iter_mut()
        .for_each(|c| (c.own_uncertainty, c.common_uncertainty) = (None, 0.0));
    let solved = exact.solve().unwrap();
    assert_eq!(exact.uncertainty(&solved, options), None);
}

#[test]
fn a_large_net_and_a_long_chain_are_solved_without_recursion() {
    // A square of 71 by 71 nodes: 9940 channels.
    let side = 71;
    let mut channels = Vec::new();
    for row in 0..side {
        for column in 0..side {
            let node = row * side + column;
            let length = 0.01 + 1e-6 * node as f64;
            if column + 1 < side {
                channels.push((node, node + 1, length));
            }
            if row + 1 < side {
                channels.push((node, node + side, length));
            }
        }
    }
    let network = net(side * side, &[(0, 1e5), (side * side - 1, 0.0)], &channels);
    let solved = network.solve().unwrap();
    assert!(solved.balance.relative < 1e-10, "{:?}", solved.balance);
    let inflow = solved.nodes[0].inflow;
    assert_close(inflow, 1e5 / solved.equivalent.unwrap().resistance, 1e-11);
    assert_close(-solved.nodes[side * side - 1].inflow, inflow, 1e-11);
    let count = 100_000;
    let chain: Vec<(usize, usize, f64)> = (0..count).map(|k| (k, k + 1, 0.01)).collect();
    let solved = net(count + 1, &[(0, 1e5), (count, 0.0)], &chain)
        .solve()
        .unwrap();
    assert_close(solved.equivalent.unwrap().resistance, R * 1000.0, 1e-10);
}
