//! Which known word was probably meant.

/// The candidate nearest to `word`, where it is near enough to be meant: up to a
/// third of its letters wrong, left out, put in or swapped with a neighbour.
pub fn nearest<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    // Longer words are no misspellings, and the distance costs length times length.
    if word.chars().count() > 60 {
        return None;
    }
    candidates
        .into_iter()
        .map(|candidate| (distance(&plain(word), &plain(candidate)), candidate))
        .filter(|(wrong, candidate)| *wrong <= forgiven(candidate))
        .min_by_key(|(wrong, _)| *wrong)
        .map(|(_, candidate)| candidate)
}

fn forgiven(candidate: &str) -> usize {
    candidate.chars().count() / 3
}

/// Capitals, hyphens and underscores are no difference worth counting.
fn plain(word: &str) -> Vec<char> {
    word.chars()
        .flat_map(char::to_lowercase)
        .map(|c| if matches!(c, '_' | '-') { ' ' } else { c })
        .collect()
}

/// Edit distance with unit costs, row by row; two neighbours that changed places
/// are one edit (V. I. Levenshtein 1966, F. J. Damerau 1964; from memory).
fn distance(a: &[char], b: &[char]) -> usize {
    let mut before: Vec<usize> = vec![0; b.len() + 1];
    let mut above: Vec<usize> = (0..=b.len()).collect();
    for i in 0..a.len() {
        let mut row = vec![i + 1];
        for j in 0..b.len() {
            let replaced = above[j] + usize::from(a[i] != b[j]);
            let mut least = replaced.min(row[j] + 1).min(above[j + 1] + 1);
            if 0 < i && 0 < j && a[i] == b[j - 1] && a[i - 1] == b[j] {
                least = least.min(before[j - 1] + 1);
            }
            row.push(least);
        }
        before = std::mem::replace(&mut above, row);
    }
    above[b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn edits_are_counted() {
        let chars = |s: &str| s.chars().collect::<Vec<_>>();
        // The textbook example (common knowledge, no source).
        assert_eq!(distance(&chars("kitten"), &chars("sitting")), 3);
        assert_eq!(distance(&chars("prot"), &chars("port")), 1);
        assert_eq!(distance(&[], &chars("abc")), 3);
        assert_eq!(distance(&chars("abc"), &[]), 3);
    }

    #[test]
    fn near_words_are_offered_and_far_ones_are_not() {
        let known = ["at most", "at least", "every", "within"];
        assert_eq!(nearest("at_most", known), Some("at most"));
        assert_eq!(nearest("evry", known), Some("every"));
        assert_eq!(nearest("Within", known), Some("within"));
        assert_eq!(nearest("colour", known), None);
        assert_eq!(nearest("2", ["I", "II"]), None);
        assert_eq!(nearest("lf", ["LF", "CR"]), Some("LF"));
        assert_eq!(nearest(&"x".repeat(1_000_000), known), None);
    }
}
