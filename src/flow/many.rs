//! Work on many independent items, shared out over threads only where that pays.

use rayon::prelude::*;

/// Items from which threads are worth starting.
const MANY: usize = 64;
/// Items that one thread takes at least.
const TOGETHER: usize = 16;

/// What some work makes of each item, in their order: the same on any number of threads.
pub(super) fn map_many<T: Sync, R: Send>(items: &[T], work: impl Fn(&T) -> R + Sync) -> Vec<R> {
    if items.len() >= MANY {
        let each = items.par_iter().with_min_len(TOGETHER);
        each.map(&work).collect()
    } else {
        items.iter().map(&work).collect()
    }
}
