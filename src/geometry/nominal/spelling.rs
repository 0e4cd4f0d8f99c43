//! The nearest known spelling of a word that is not known.

/// The candidate with the smallest edit distance, if that is at most a third of the word (or 2).
pub(super) fn nearest(word: &str, candidates: &[&'static str]) -> Option<&'static str> {
    let plain = word.to_lowercase().replace(['-', ' '], "_");
    let allowed = (plain.chars().count() / 3).max(2);
    candidates
        .iter()
        .map(|&candidate| (edit_distance(&plain, candidate), candidate))
        .filter(|&(distance, _)| distance <= allowed)
        .min_by_key(|&(distance, _)| distance)
        .map(|(_, candidate)| candidate)
}

/// Levenshtein distance: insertions, deletions and replacements between two words.
fn edit_distance(a: &str, b: &str) -> usize {
    let mut row: Vec<usize> = (0..=b.chars().count()).collect();
    for (i, ca) in a.chars().enumerate() {
        let mut next = vec![i + 1];
        for ((cb, &above_left), &above) in b.chars().zip(&row).zip(row.iter().skip(1)) {
            let left = next.last().copied().unwrap_or(0);
            let replaced = above_left + usize::from(ca != cb);
            next.push(replaced.min(above + 1).min(left + 1));
        }
        row = next;
    }
    row.last().copied().unwrap_or(0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn near_words_are_found_and_far_ones_are_not() {
        let known = ["rectangle", "triangle", "koh_groove"];
        assert_eq!(nearest("rectangel", &known), Some("rectangle"));
        assert_eq!(nearest("KOH-groove", &known), Some("koh_groove"));
        assert_eq!(nearest("sphere", &known), None);
        assert_eq!(edit_distance("kitten", "sitting"), 3);
    }
}
