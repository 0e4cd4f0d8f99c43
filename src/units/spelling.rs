//! The nearest known spelling of a word that is not known, for messages.
//!
//! Method: edit distance with swaps of neighbours (restricted Damerau-Levenshtein distance).

/// The known word at the smallest edit distance, if it is close enough to be meant.
///
/// Capitals, and hyphens or spaces for underscores, make no difference.
pub(crate) fn nearest<'a>(word: &str, known: &[&'a str]) -> Option<&'a str> {
    let plain = word.to_lowercase().replace(['-', ' '], "_");
    known
        .iter()
        .map(|candidate| (distance(&plain, candidate), *candidate))
        .filter(|(d, candidate)| *d <= 1 + candidate.len() / 4)
        .min_by_key(|(d, _)| *d)
        .map(|(_, candidate)| candidate)
}

/// Edit distance with insertions, deletions, replacements and swaps of neighbours.
///
/// Words longer than 40 characters count as far away.
fn distance(a: &str, b: &str) -> usize {
    let (a, b): (Vec<char>, Vec<char>) =
        (a.chars().take(41).collect(), b.chars().take(41).collect());
    if a.len() > 40 || b.len() > 40 {
        return usize::MAX;
    }
    let width = b.len() + 1;
    let mut rows = vec![vec![0; width]; a.len() + 1];
    for i in 0..=a.len() {
        for j in 0..=b.len() {
            rows[i][j] = if i == 0 || j == 0 {
                i + j
            } else {
                let swap = i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1];
                let change = usize::from(a[i - 1] != b[j - 1]);
                let plain = (rows[i - 1][j] + 1)
                    .min(rows[i][j - 1] + 1)
                    .min(rows[i - 1][j - 1] + change);
                if swap {
                    plain.min(rows[i - 2][j - 2] + 1)
                } else {
                    plain
                }
            };
        }
    }
    rows[a.len()][b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn near_words_are_found_and_far_ones_are_not() {
        let keys = ["name", "unit", "lumen", "nominal", "islands", "outer"];
        let kinds = ["rectangle", "triangle", "koh_groove"];
        for (word, known, expected) in [
            ("lumens", &keys[..], Some("lumen")),
            ("iland", &keys, Some("islands")),
            ("uter", &keys, Some("outer")),
            ("Unit", &keys, Some("unit")),
            ("uint", &keys, Some("unit")),
            ("temperature", &keys, None),
            ("", &keys, None),
            ("rectangel", &kinds, Some("rectangle")),
            ("KOH-groove", &kinds, Some("koh_groove")),
            ("sphere", &kinds, None),
        ] {
            assert_eq!(nearest(word, known), expected, "{word}");
        }
        assert_eq!(nearest(&"x".repeat(1_000_000), &keys), None);
    }

    #[test]
    fn distances_of_known_pairs() {
        assert_eq!(distance("kitten", "sitting"), 3);
        assert_eq!(distance("unit", "uint"), 1);
        assert_eq!(distance("", "abc"), 3);
    }
}
