//! Numbers for some of many nodes, in the same order, found without a search.

use crate::grid::Mask;
use crate::solve::Field;

/// New numbers for some of the nodes of a grid.
pub(super) struct Numbering {
    /// One bit for each node.
    bits: Vec<u64>,
    /// Number of bits set before each word.
    before: Vec<u32>,
}

impl Numbering {
    pub(super) fn new(nodes: usize, chosen: impl Iterator<Item = usize>) -> Self {
        let mut bits = vec![0_u64; nodes / 64 + 1];
        for node in chosen {
            bits[node / 64] |= 1 << (node % 64);
        }
        let mut count = 0;
        let before = bits.iter().map(|word| {
            count += word.count_ones();
            count - word.count_ones()
        });
        Self {
            before: before.collect(),
            bits,
        }
    }

    /// New number of a node, `None` if it is not one of those chosen.
    pub(super) fn of(&self, node: usize) -> Option<u32> {
        let word = *self.bits.get(node / 64)?;
        let below = word & ((1 << (node % 64)) - 1);
        let is_chosen = word >> (node % 64) & 1 == 1;
        is_chosen.then(|| self.before[node / 64] + below.count_ones())
    }

    /// Values of the chosen nodes, which were given by their row-by-row numbers.
    pub(super) fn values(&self, mask: &Mask, phi: &Field) -> Vec<f64> {
        let mut values = Vec::new();
        let mut runs = mask.runs.iter().peekable();
        for (index, &word) in self.bits.iter().enumerate() {
            let mut rest = word;
            while rest != 0 {
                let node = 64 * index as u32 + rest.trailing_zeros();
                rest &= rest - 1;
                while runs.next_if(|run| run.natural + run.len <= node).is_some() {}
                let value = runs.peek().and_then(|run| {
                    let (colour, place) = run.node(run.first + (node - run.natural));
                    phi.colour[colour as usize].get(place as usize).copied()
                });
                values.push(value.unwrap_or(0.0));
            }
        }
        values
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn chosen_nodes_are_numbered_in_order_and_others_not_at_all() {
        let chosen = [0, 3, 63, 64, 65, 127, 128, 300, 511];
        let numbering = Numbering::new(512, [300, 3].into_iter().chain(chosen));
        for node in 0..600 {
            let place = chosen.iter().position(|&c| c == node);
            assert_eq!(numbering.of(node), place.map(|k| k as u32));
        }
    }
}
