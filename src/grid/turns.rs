//! The order in which chains of wall follow each other around a cell.
//!
//! Along the sides of a cell, anticlockwise, places where a chain starts and where one ends take turns: fluid lies
//! from each end to the next start. Both walls of a sliver may cross a side so near to each other that their order is
//! rounding; the turns of the others then say which of the two is the first.

/// Places around a cell nearer to each other than this may be in the wrong order.
const SAME_PLACE: f64 = 1e-9;

/// Number of starts before an end, which is the index of the chain that follows, or all of them.
///
/// - `chains`: of one cell, rising by their starts
/// - `places`: start and end of a chain around the cell, 0 to 4
/// - `is_solid`: whether the first chain goes round something solid; asked where nothing else decides
pub(crate) fn next_start<C>(
    chains: &[C],
    places: impl Fn(&C) -> [f64; 2],
    end: f64,
    is_solid: impl FnOnce() -> bool,
) -> usize {
    let after = chains.partition_point(|c| places(c)[0] < end);
    let near = &chains[after.saturating_sub(1)..chains.len().min(after + 1)];
    if near
        .iter()
        .all(|c| (places(c)[0] - end).abs() >= SAME_PLACE)
    {
        return after;
    }
    let starts: Vec<f64> = chains.iter().map(|c| places(c)[0]).collect();
    let mut ends: Vec<f64> = chains.iter().map(|c| places(c)[1]).collect();
    ends.sort_by(f64::total_cmp);
    let (start_first, end_first) = (out_of_turn(&starts, &ends), out_of_turn(&ends, &starts));
    let is_start_first = if start_first.max(end_first) < SAME_PLACE {
        is_solid()
    } else {
        start_first < end_first
    };
    ends.partition_point(|&e| e < end) + usize::from(is_start_first)
}

/// By how much places are out of turn, if the first of some comes first.
fn out_of_turn(first: &[f64], second: &[f64]) -> f64 {
    let pairs = first.iter().zip(second).map(|(a, b)| a - b);
    let next = second.iter().zip(first.iter().skip(1)).map(|(b, a)| b - a);
    pairs.chain(next).fold(0.0, f64::max)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn next(chains: &[[f64; 2]], end: f64, is_solid: bool) -> usize {
        next_start(chains, |&c| c, end, || is_solid)
    }

    #[test]
    fn places_far_from_each_other_follow_by_their_order() {
        let chains = [[0.5, 1.5], [2.2, 3.7]];
        assert_eq!([1.5, 3.7].map(|end| next(&chains, end, false)), [1, 2]);
        let turned = [[0.5, 3.7], [2.2, 1.5]];
        assert_eq!([3.7, 1.5].map(|end| next(&turned, end, false)), [2, 1]);
    }

    #[test]
    fn the_walls_of_a_sliver_take_turns_with_the_others() {
        // A knife from the side at 0.4 through the cell, whose walls cross that side in either order.
        for off in [-1e-15, 0.0, 1e-15] {
            let chains = [[0.4, 2.6], [2.5, 0.4 + off]];
            assert_eq!(next(&chains, 0.4 + off, false), 1);
            assert_eq!(next(&chains, 2.6, false), 2);
            // A slot of fluid instead.
            let slot = [[0.4 + off, 2.5], [2.6, 0.4]];
            assert_eq!(next(&slot, 0.4, false), 0);
            assert_eq!(next(&slot, 2.5, false), 1);
        }
    }

    #[test]
    fn a_lone_sliver_is_what_it_is_said_to_be() {
        for off in [-1e-15, 0.0, 1e-15] {
            let tip = [[1.3, 1.3 + off]];
            assert_eq!(
                [true, false].map(|solid| next(&tip, 1.3 + off, solid)),
                [1, 0]
            );
        }
    }
}
