//! Pressures, flows and what follows from them for each channel.

use super::NetworkError;
use super::elements::{Element, elements, temperature_factors};
use super::elimination::Eliminated;
use super::net::{Network, NodeCondition};
use super::topology::{State, Topology, incidence, product};
use crate::flow::{EntranceModel, entrance_length};

/// Imbalance relative to the flow through a node up to which a net counts as solved.
pub const BALANCE_TOLERANCE: f64 = 1e-9;

/// Share of the largest flow below which a node's flow does not count as one.
const LEAST_FLOW: f64 = 1e-6;

/// Multiplications of an elimination up to which the ends of the proven range are solved for; beyond, the cards furthest
/// from their values stand for all.
const MOST_WORK: u64 = 50_000_000;

/// A limit of its card that a channel is beyond.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum BeyondLimit {
    /// Reynolds number.
    Reynolds,
    /// Entrance longer than its share of the length.
    Entrance,
    /// Pressure drop.
    PressureDrop,
}

impl BeyondLimit {
    /// The limit in one word for machines.
    pub fn word(self) -> &'static str {
        match self {
            Self::Reynolds => "reynolds",
            Self::Entrance => "entrance",
            Self::PressureDrop => "pressure_drop",
        }
    }
}

/// What is known of one channel; flows and volumes are those of all that lie side by side, velocity, Reynolds number
/// and shear those of each.
#[derive(Debug, Clone, PartialEq)]
pub struct ChannelState {
    /// From begin to end, m^3/s; negative for a flow the other way.
    pub flow: f64,
    /// Pressure at the begin less that at the end, Pa.
    pub pressure_drop: f64,
    /// Pa s/m^3.
    pub resistance: f64,
    /// Its proven range.
    pub proven: Option<(f64, f64)>,
    /// Mean velocity, m/s; `None` for a route that does not state its length.
    pub mean_velocity: Option<f64>,
    /// On the hydraulic diameter; `None` without a density or a length.
    pub reynolds: Option<f64>,
    /// Entrance length, m.
    pub entrance_length: Option<f64>,
    /// Mean wall shear, Pa.
    pub wall_shear_mean: Option<f64>,
    /// Largest wall shear, Pa.
    pub wall_shear_max: Option<f64>,
    /// m^3.
    pub volume: f64,
    /// Volume over flow, s; `None` without flow.
    pub residence_time: Option<f64>,
    /// kg/m^4.
    pub inertance: Option<f64>,
    /// Inertance over resistance, s.
    pub time_constant: Option<f64>,
    /// Limits that it is beyond.
    pub beyond: Vec<BeyondLimit>,
}

/// What is known of one node.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct NodeState {
    /// Pa.
    pub pressure: f64,
    /// Flow into the net, m^3/s.
    pub inflow: f64,
    /// Flows out less flows in less the given inflow, m^3/s; zero by definition at a given pressure.
    pub imbalance: f64,
}

/// How well mass is conserved.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MassBalance {
    /// Largest imbalance of a node, m^3/s.
    pub largest: f64,
    /// Place of that node.
    pub node: usize,
    /// Largest imbalance relative to the flow through its node, or to a millionth of the largest flow of the net where
    /// less flows.
    pub relative: f64,
    /// All inflows together, m^3/s.
    pub whole: f64,
}

impl MassBalance {
    /// Whether mass is conserved to [`BALANCE_TOLERANCE`].
    pub fn is_kept(&self) -> bool {
        self.relative <= BALANCE_TOLERANCE
    }
}

/// The resistance between the two nodes of given pressure, all other inflows being zero.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct EquivalentResistance {
    /// Places of the two nodes.
    pub between: [usize; 2],
    /// Pa s/m^3.
    pub resistance: f64,
    /// Proven range, where every card has one.
    ///
    /// The resistance between two nodes does not fall when any resistance in the net rises (Rayleigh 1871, On the
    /// theory of resonance, from memory), so the ends of the cards' ranges give the ends of this one; widened by the
    /// bound of rounding.
    pub proven: Option<(f64, f64)>,
}

/// A solved net.
#[derive(Debug)]
pub struct NetworkSolution {
    /// Temperature, K.
    pub temperature: Option<f64>,
    /// `R(T) / R(T0)` of each card.
    pub temperature_factors: Vec<f64>,
    /// Nodes in the order of the net.
    pub nodes: Vec<NodeState>,
    /// Channels in the order of the net.
    pub channels: Vec<ChannelState>,
    /// Whether mass is conserved.
    pub balance: MassBalance,
    /// With exactly two nodes of given pressure that are joined.
    pub equivalent: Option<EquivalentResistance>,
    pub(super) topology: Topology,
    pub(super) eliminated: Eliminated,
}

impl Network {
    /// Solves the net.
    ///
    /// Flow of a channel: `Q = (p_from - p_to) / R`; at each node flows and inflow are in balance.
    ///
    /// # Accuracy
    /// Every conductance that comes up is made by adding and multiplying positive numbers, so nothing cancels: series
    /// and parallel channels come out to 1e-14 (`tests/network.rs`).
    ///
    /// # Errors
    /// [`NetworkError`] for a node that floats, a part without a pressure, a channel with numbers that make none,
    /// and a temperature outside the law of a card.
    pub fn solve(&self) -> Result<NetworkSolution, NetworkError> {
        if self.channels.is_empty() {
            return Err(NetworkError::Empty);
        }
        let (temperature, factors) = temperature_factors(self)?;
        let elements = elements(self, &factors)?;
        let conductances: Vec<f64> = elements.iter().map(|e| 1.0 / e.resistance).collect();
        let topology = Topology::new(self, &conductances)?;
        let eliminated = topology.eliminate(&conductances)?;
        let state = topology.state(self, &eliminated, &self.inflows(), &self.given(&topology));
        let flows: Vec<f64> = state
            .drops
            .iter()
            .zip(&elements)
            .map(|(drop, element)| drop / element.resistance)
            .collect();
        let (nodes, balance) = self.node_states(&state, &flows);
        let is_solved = flows.iter().chain(&state.pressures).all(|v| v.is_finite());
        if !is_solved {
            return Err(NetworkError::OutOfRange);
        }
        let channels = self.channel_states(&state, &flows, &elements);
        let equivalent = equivalent(&topology, &eliminated, &elements)?;
        Ok(NetworkSolution {
            temperature,
            temperature_factors: factors,
            nodes,
            channels,
            balance,
            equivalent,
            topology,
            eliminated,
        })
    }

    /// Inflow of every node, zero at given pressures.
    pub(super) fn inflows(&self) -> Vec<f64> {
        self.nodes
            .iter()
            .map(|node| match node.condition {
                NodeCondition::Inflow(q) => q,
                NodeCondition::Pressure(_) => 0.0,
            })
            .collect()
    }

    /// Given pressures in the order of the kept nodes.
    pub(super) fn given(&self, topology: &Topology) -> Vec<f64> {
        topology
            .kept
            .iter()
            .map(|&node| match self.nodes[node].condition {
                NodeCondition::Pressure(p) => p,
                NodeCondition::Inflow(_) => 0.0,
            })
            .collect()
    }

    fn node_states(&self, state: &State, flows: &[f64]) -> (Vec<NodeState>, MassBalance) {
        let matrix = incidence(self);
        let sums = product(&matrix, flows);
        let sizes: Vec<f64> = flows.iter().map(|q| q.abs()).collect();
        let through = product(&matrix.map(|v: &f64| v.abs()), &sizes);
        let mut balance = MassBalance {
            largest: 0.0,
            node: 0,
            relative: 0.0,
            whole: 0.0,
        };
        // Where next to nothing flows, the flow is the rounding of larger ones.
        let floor = LEAST_FLOW * sizes.iter().copied().fold(0.0, f64::max);
        let mut nodes = Vec::with_capacity(self.nodes.len());
        for (index, (node, sum)) in self.nodes.iter().zip(sums).enumerate() {
            let (inflow, imbalance) = match node.condition {
                NodeCondition::Pressure(_) => (sum, 0.0),
                NodeCondition::Inflow(q) => (q, sum - q),
            };
            balance.whole += inflow;
            if imbalance.abs() > balance.largest {
                balance.largest = imbalance.abs();
                balance.node = index;
            }
            let throughput = (0.5 * (through[index] + inflow.abs())).max(floor);
            if imbalance != 0.0 {
                balance.relative = balance.relative.max(imbalance.abs() / throughput);
            }
            nodes.push(NodeState {
                pressure: state.pressures[index],
                inflow,
                imbalance,
            });
        }
        (nodes, balance)
    }

    fn channel_states(
        &self,
        state: &State,
        flows: &[f64],
        elements: &[Element],
    ) -> Vec<ChannelState> {
        (0..self.channels.len())
            .map(|index| {
                self.channel_state(index, flows[index], state.drops[index], &elements[index])
            })
            .collect()
    }

    fn channel_state(&self, index: usize, flow: f64, drop: f64, element: &Element) -> ChannelState {
        let channel = &self.channels[index];
        let card = &self.cards[channel.card];
        let count = f64::from(channel.parallel);
        let single = flow.abs() / count;
        let length = element.length;
        // Area and perimeter: of the section, or the means of a route.
        let area = length.map(|l| element.volume / count / l);
        let perimeter = match (channel.length, card.length) {
            (Some(_), _) => Some(card.wall_area),
            (None, Some(length)) => Some(card.wall_area / length),
            (None, None) => None,
        };
        // Re = rho v Dh / mu with Dh = 4 A / P is 4 rho Q / (mu P).
        let reynolds = perimeter
            .zip(card.density)
            .map(|(p, density)| 4.0 * density * single / (element.viscosity * p));
        let diameter = area.zip(perimeter).map(|(a, p)| 4.0 * a / p);
        let entrance = diameter
            .zip(reynolds)
            .map(|(d, re)| entrance_length(EntranceModel::default(), d, re));
        let limits = &card.limits;
        let is_above = |value: Option<f64>, limit: Option<f64>| {
            value.zip(limit).is_some_and(|(value, limit)| value > limit)
        };
        let entrance_limit = length
            .zip(limits.entrance_share)
            .map(|(l, share)| l * share);
        let found = [
            (BeyondLimit::Reynolds, is_above(reynolds, limits.reynolds)),
            (
                BeyondLimit::Entrance,
                flow != 0.0 && is_above(entrance, entrance_limit),
            ),
            (
                BeyondLimit::PressureDrop,
                is_above(Some(drop.abs()), limits.pressure_drop),
            ),
        ];
        let shear = |per_flow: Option<f64>| per_flow.map(|s| s * element.factor * single);
        ChannelState {
            flow,
            pressure_drop: drop,
            resistance: element.resistance,
            proven: element.proven,
            mean_velocity: area.map(|a| single / a),
            reynolds,
            entrance_length: entrance,
            wall_shear_mean: shear(card.shear_mean),
            wall_shear_max: shear(card.shear_max),
            volume: element.volume,
            residence_time: Some(element.volume / flow.abs()).filter(|t| t.is_finite()),
            inertance: element.inertance,
            time_constant: element.inertance.map(|i| i / element.resistance),
            beyond: found
                .into_iter()
                .filter_map(|(limit, is_beyond)| is_beyond.then_some(limit))
                .collect(),
        }
    }
}

/// The resistance between exactly two kept nodes.
fn equivalent(
    topology: &Topology,
    eliminated: &Eliminated,
    elements: &[Element],
) -> Result<Option<EquivalentResistance>, NetworkError> {
    let Some(between) = topology.two_ends() else {
        return Ok(None);
    };
    if eliminated.between <= 0.0 {
        return Ok(None);
    }
    let resistance = 1.0 / eliminated.between;
    let proven: Option<Vec<(f64, f64)>> = elements.iter().map(|e| e.proven).collect();
    let rounding = topology.rounding();
    let proven = match proven {
        Some(proven) if topology.structure.work <= MOST_WORK => {
            let end = |end: &dyn Fn(&(f64, f64)) -> f64| -> Result<f64, NetworkError> {
                let conductances: Vec<f64> = proven.iter().map(|p| 1.0 / end(p)).collect();
                Ok(1.0 / topology.eliminate(&conductances)?.between)
            };
            Some((end(&|p| p.0)?, end(&|p| p.1)?))
        }
        // All resistances between the same two multiples of themselves: so is the whole.
        Some(proven) => {
            let ratios = proven.iter().zip(elements);
            let (low, high) = ratios.fold((f64::INFINITY, 0.0_f64), |(low, high), (p, e)| {
                (low.min(p.0 / e.resistance), high.max(p.1 / e.resistance))
            });
            Some((resistance * low, resistance * high))
        }
        None => None,
    };
    let proven = proven.map(|(low, high)| (low * (1.0 - rounding), high * (1.0 + rounding)));
    Ok(Some(EquivalentResistance {
        between,
        resistance,
        proven,
    }))
}
