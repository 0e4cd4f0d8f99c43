//! Nearest spelling of a word among known words.

/// The known word at the smallest edit distance, if it is close enough to be meant.
pub(crate) fn nearest<'a>(word: &str, known: &[&'a str]) -> Option<&'a str> {
    let lower = word.to_lowercase();
    known
        .iter()
        .map(|candidate| (distance(&lower, candidate), *candidate))
        .filter(|(d, candidate)| *d <= 1 + candidate.len() / 4)
        .min_by_key(|(d, _)| *d)
        .map(|(_, candidate)| candidate)
}

/// Edit distance with insertions, deletions, replacements and swaps of neighbours.
///
/// Words longer than 40 characters count as far away.
fn distance(a: &str, b: &str) -> usize {
    let (a, b): (Vec<char>, Vec<char>) = (a.chars().collect(), b.chars().collect());
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
        let known = ["name", "unit", "lumen", "nominal", "islands", "outer"];
        assert_eq!(nearest("lumens", &known), Some("lumen"));
        assert_eq!(nearest("iland", &known), Some("islands"));
        assert_eq!(nearest("uter", &known), Some("outer"));
        assert_eq!(nearest("Unit", &known), Some("unit"));
        assert_eq!(nearest("uint", &known), Some("unit"));
        assert_eq!(nearest("temperature", &known), None);
        assert_eq!(nearest("", &known), None);
    }
}
