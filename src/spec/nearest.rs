//! Which known word was probably meant.

/// The candidate nearest to `word`, where it is near enough to be meant: at most
/// a third of its letters (and at least one) wrong, left out or put in.
pub fn nearest<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    // Longer words are no misspellings, and the distance costs length times length.
    if word.chars().count() > 60 {
        return None;
    }
    candidates
        .into_iter()
        .map(|candidate| (distance(&plain(word), &plain(candidate)), candidate))
        .filter(|(wrong, candidate)| *wrong <= (candidate.chars().count() / 3).max(1))
        .min_by_key(|(wrong, _)| *wrong)
        .map(|(_, candidate)| candidate)
}

/// Capitals, hyphens and underscores are no difference worth counting.
fn plain(word: &str) -> Vec<char> {
    word.chars()
        .flat_map(char::to_lowercase)
        .map(|c| if matches!(c, '_' | '-') { ' ' } else { c })
        .collect()
}

/// Edit distance with unit costs, row by row (V. I. Levenshtein, 1966; from memory).
fn distance(a: &[char], b: &[char]) -> usize {
    let mut row: Vec<usize> = (0..=b.len()).collect();
    for (i, x) in a.iter().enumerate() {
        let mut diagonal = row[0];
        row[0] = i + 1;
        for (j, y) in b.iter().enumerate() {
            let replaced = diagonal + usize::from(x != y);
            diagonal = row[j + 1];
            row[j + 1] = replaced.min(row[j] + 1).min(diagonal + 1);
        }
    }
    row[b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn edits_are_counted() {
        let chars = |s: &str| s.chars().collect::<Vec<_>>();
        // The textbook example (common knowledge, no source).
        assert_eq!(distance(&chars("kitten"), &chars("sitting")), 3);
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
        assert_eq!(nearest(&"x".repeat(1_000_000), known), None);
    }
}
