//! Which nodes are found, which are given, and whether every part of the net has a pressure.

use std::collections::HashMap;

use sprs::{CsMat, TriMat};

use super::NetworkError;
use super::elimination::{Eliminated, Pressures};
use super::net::{NetNode, Network, NodeCondition};
use super::structure::Structure;

/// Most links of the eliminated net: 16 bytes each with their working copies, 1 GB in all.
const MOST_LINKS: usize = 30_000_000;

/// The pattern of a net, which serves any resistances.
#[derive(Debug)]
pub(super) struct Topology {
    pub(super) structure: Structure,
    /// For each node its number, nodes of given pressure last; more than two of these with the same pressure share one.
    number: Vec<usize>,
    /// The first node of given pressure of each such number, in their order.
    pub(super) kept: Vec<usize>,
    /// Nodes of given pressure.
    given: usize,
    /// For each channel its link and whether the link begins at the channel's end; `None` between two kept nodes.
    links: Vec<Option<(usize, bool)>>,
}

/// Pressures and what they do along channels.
pub(super) struct State {
    /// At each node, Pa.
    pub(super) pressures: Vec<f64>,
    /// From begin to end of each channel, Pa.
    pub(super) drops: Vec<f64>,
}

impl Topology {
    pub(super) fn new(network: &Network, conductances: &[f64]) -> Result<Self, NetworkError> {
        check_parts(network)?;
        let (number, unknowns, kept) = numbers(network);
        let matrix = conductance_matrix(network, &number, unknowns + kept.len(), conductances);
        let mut pairs = Vec::new();
        for (row, line) in matrix.outer_iterator().enumerate() {
            let later = line.iter().map(|(column, _)| column);
            pairs.extend(
                later
                    .filter(|&column| column > row)
                    .map(|column| (row as u32, column as u32)),
            );
        }
        let structure = Structure::new(unknowns, unknowns + kept.len(), &pairs, MOST_LINKS)?;
        let links = network
            .channels
            .iter()
            .map(|channel| structure.link(number[channel.from], number[channel.to]))
            .collect();
        Ok(Self {
            structure,
            given: network.nodes.len() - unknowns,
            number,
            kept,
            links,
        })
    }

    /// The nodes of given pressure, where there are exactly two.
    pub(super) fn two_ends(&self) -> Option<[usize; 2]> {
        match self.kept.as_slice() {
            &[first, second] if self.given == 2 => Some([first, second]),
            _ => None,
        }
    }

    /// Eliminates with the conductance of each channel, m^3/(s Pa).
    pub(super) fn eliminate(&self, conductances: &[f64]) -> Result<Eliminated, NetworkError> {
        let mut of_links = vec![0.0; self.structure.columns.len()];
        let mut between = 0.0;
        for (link, g) in self.links.iter().zip(conductances) {
            match link {
                Some((link, _)) => of_links[*link] += g,
                None => between += g,
            }
        }
        let done = Eliminated::new(&self.structure, of_links, between);
        if done.is_sound() {
            Ok(done)
        } else {
            Err(NetworkError::OutOfRange)
        }
    }

    /// Pressures for inflows of all nodes (those of kept nodes do not count) and pressures of kept nodes.
    pub(super) fn state(
        &self,
        network: &Network,
        eliminated: &Eliminated,
        inflows: &[f64],
        kept: &[f64],
    ) -> State {
        let ordered = self.ordered(inflows);
        let found: Pressures = eliminated.pressures(&self.structure, ordered, kept);
        let pressures: Vec<f64> = self
            .number
            .iter()
            .map(|&number| found.nodes[self.structure.position[number] as usize])
            .collect();
        let drops = network
            .channels
            .iter()
            .zip(&self.links)
            .map(|(channel, link)| match link {
                Some((link, false)) => found.differences[*link],
                Some((link, true)) => -found.differences[*link],
                None => pressures[channel.from] - pressures[channel.to],
            })
            .collect();
        State { pressures, drops }
    }

    /// Drops of all channels as differences of pressures: cheap, for derivatives.
    pub(super) fn plain_drops(
        &self,
        network: &Network,
        eliminated: &Eliminated,
        inflows: &[f64],
        kept: &[f64],
    ) -> Vec<f64> {
        let ordered = self.ordered(inflows);
        let found = eliminated.plain_pressures(&self.structure, ordered, kept);
        let at = |node: usize| found[self.structure.position[self.number[node]] as usize];
        let channels = network.channels.iter();
        channels
            .map(|channel| at(channel.from) - at(channel.to))
            .collect()
    }

    /// Inflows of free nodes in the order of elimination.
    fn ordered(&self, inflows: &[f64]) -> Vec<f64> {
        let unknowns = self.structure.unknowns;
        let mut ordered = vec![0.0; unknowns];
        for (&number, &inflow) in self.number.iter().zip(inflows) {
            if number < unknowns {
                ordered[self.structure.position[number] as usize] = inflow;
            }
        }
        ordered
    }

    /// Bound of the relative rounding error of the conductance between two kept nodes.
    ///
    /// Taking out a node with `d` links makes every conductance wrong by at most `(d + 2) eps / 2` of itself.
    /// That is a change of conductances by such a factor at most, and by Rayleigh's law the conductance between
    /// the ends then changes by no more; over all nodes these add up. The sums of channels side by side and the
    /// few products before count for `channels + 8`.
    pub(super) fn rounding(&self) -> f64 {
        let links = self.structure.columns.len() + self.links.len();
        (links + 4 * self.structure.unknowns + 8) as f64 * f64::EPSILON
    }
}

/// The number of each node, how many are free, and the first node of each kept number.
///
/// Two nodes of given pressure keep a number each, since the resistance between them is asked for. More of them are one
/// node where their pressure is the same: hundreds of open outlets then cost no more than one.
fn numbers(network: &Network) -> (Vec<usize>, usize, Vec<usize>) {
    let pressure = |node: &NetNode| match node.condition {
        NodeCondition::Pressure(p) => Some(p),
        NodeCondition::Inflow(_) => None,
    };
    let given = network
        .nodes
        .iter()
        .filter(|n| pressure(n).is_some())
        .count();
    let unknowns = network.nodes.len() - given;
    let mut kept = Vec::new();
    let mut of_pressure: HashMap<u64, usize> = HashMap::new();
    let mut free = 0;
    let mut number = Vec::with_capacity(network.nodes.len());
    for (index, node) in network.nodes.iter().enumerate() {
        number.push(match pressure(node) {
            None => {
                free += 1;
                free - 1
            }
            Some(p) => {
                let key = if given > 2 { p.to_bits() } else { index as u64 };
                *of_pressure.entry(key).or_insert_with(|| {
                    kept.push(index);
                    unknowns + kept.len() - 1
                })
            }
        });
    }
    (number, unknowns, kept)
}

/// The matrix of conductances with their negative sums on the diagonal, rows by `number`.
fn conductance_matrix(
    network: &Network,
    number: &[usize],
    size: usize,
    conductances: &[f64],
) -> CsMat<f64> {
    let mut triplets = TriMat::with_capacity((size, size), 4 * conductances.len());
    for (channel, &g) in network.channels.iter().zip(conductances) {
        let (a, b) = (number[channel.from], number[channel.to]);
        triplets.add_triplet(a, b, g);
        triplets.add_triplet(b, a, g);
        triplets.add_triplet(a, a, -g);
        triplets.add_triplet(b, b, -g);
    }
    triplets.to_csr()
}

/// Rows are nodes, columns channels: 1 where a channel begins, -1 where it ends.
pub(super) fn incidence(network: &Network) -> CsMat<f64> {
    let shape = (network.nodes.len(), network.channels.len());
    let mut triplets = TriMat::with_capacity(shape, 2 * network.channels.len());
    for (column, channel) in network.channels.iter().enumerate() {
        triplets.add_triplet(channel.from, column, 1.0);
        triplets.add_triplet(channel.to, column, -1.0);
    }
    triplets.to_csr()
}

/// Product of a matrix by rows with a vector.
pub(super) fn product(matrix: &CsMat<f64>, vector: &[f64]) -> Vec<f64> {
    let mut result = vec![0.0; matrix.rows()];
    sprs::prod::mul_acc_mat_vec_csr(matrix.view(), vector, &mut result[..]);
    result
}

/// Refuses nodes without a channel and parts without a pressure.
fn check_parts(network: &Network) -> Result<(), NetworkError> {
    let nodes = network.nodes.len();
    let mut parent: Vec<usize> = (0..nodes).collect();
    let mut has_channel = vec![false; nodes];
    for channel in &network.channels {
        has_channel[channel.from] = true;
        has_channel[channel.to] = true;
        let (a, b) = (
            root(&mut parent, channel.from),
            root(&mut parent, channel.to),
        );
        // The smaller number stays the root, so that a part is named after its first node.
        parent[a.max(b)] = a.min(b);
    }
    let name = |index: usize| network.nodes[index].name.clone();
    if let Some(index) = has_channel.iter().position(|has| !has) {
        return Err(NetworkError::Floating {
            index,
            node: name(index),
        });
    }
    let mut has_pressure = vec![false; nodes];
    let mut count = vec![0_usize; nodes];
    for node in 0..nodes {
        let part = root(&mut parent, node);
        count[part] += 1;
        has_pressure[part] |= matches!(network.nodes[node].condition, NodeCondition::Pressure(_));
    }
    match (0..nodes).find(|&node| count[node] > 0 && !has_pressure[node]) {
        Some(index) => Err(NetworkError::NoPressure {
            index,
            node: name(index),
            nodes: count[index],
        }),
        None => Ok(()),
    }
}

/// The first node of a part, paths halved on the way.
fn root(parent: &mut [usize], node: usize) -> usize {
    let mut at = node;
    while parent[at] != at {
        parent[at] = parent[parent[at]];
        at = parent[at];
    }
    at
}
