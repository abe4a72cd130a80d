//! What a misspelt word was probably meant to be.

/// The known word most like `found`; `None` only where nothing is known.
///
/// ```
/// assert_eq!(kinmark::input::nearest("replicats", ["seed", "replicates"]), Some("replicates"));
/// ```
pub fn nearest<'k>(found: &str, known: impl IntoIterator<Item = &'k str>) -> Option<&'k str> {
    let found = found.to_lowercase();
    known.into_iter().min_by_key(|word| {
        let word = word.to_lowercase();
        // A known word inside the unknown one (or the reverse) beats an equal number of edits.
        let inside = word.contains(&found) || found.contains(&word);
        (strsim::damerau_levenshtein(&found, &word), !inside)
    })
}

/// Up to three known words that `found` may be a slip for, likeliest first; none where all differ in
/// more than a third of their letters.
pub fn nearest_few<'k>(found: &str, known: impl IntoIterator<Item = &'k str>) -> Vec<&'k str> {
    let lower = found.to_lowercase();
    let allowed = (found.chars().count() / 3).max(1);
    let mut close: Vec<(usize, &str)> = known
        .into_iter()
        .map(|word| {
            (
                strsim::damerau_levenshtein(&lower, &word.to_lowercase()),
                word,
            )
        })
        .filter(|(edits, _)| *edits <= allowed)
        .collect();
    close.sort_unstable();
    close.into_iter().take(3).map(|(_, word)| word).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_slip_is_recognised_and_a_stranger_is_not() {
        let known = ["lh-precentral", "lh-postcentral", "rh-precentral", "10"];
        assert_eq!(
            nearest_few("lh-precentrl", known),
            ["lh-precentral", "rh-precentral", "lh-postcentral"]
        );
        assert!(nearest_few("thalamus", known).is_empty());
        assert_eq!(
            nearest("fraction", ["counts", "fractions"]),
            Some("fractions")
        );
    }
}
