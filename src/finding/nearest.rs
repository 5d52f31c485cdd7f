//! The nearest spelling of a word that was mistyped.

/// The candidate that takes the fewest changes of one letter (put in, taken out, replaced, two neighbours swapped) to
/// become `word`, case aside; `None` if every one takes more than about a third of its letters.
pub fn nearest<'a>(word: &str, candidates: impl Iterator<Item = &'a str>) -> Option<&'a str> {
    let word: Vec<char> = word.to_lowercase().chars().collect();
    candidates
        .map(|candidate| {
            let letters: Vec<char> = candidate.to_lowercase().chars().collect();
            let allowed = (letters.len().max(word.len()) / 3).max(1);
            (changes(&word, &letters), allowed, candidate)
        })
        .filter(|(changes, allowed, _)| changes <= allowed)
        .min_by_key(|(changes, _, _)| *changes)
        .map(|(_, _, candidate)| candidate)
}

/// Changes of one letter from one word to another: the distance of Damerau (1964) without overlapping swaps.
fn changes(from: &[char], to: &[char]) -> usize {
    let mut before: Vec<usize> = Vec::new();
    let mut last: Vec<usize> = (0..=to.len()).collect();
    for i in 1..=from.len() {
        let mut row = vec![i; to.len() + 1];
        for j in 1..=to.len() {
            let replaced = last[j - 1] + usize::from(from[i - 1] != to[j - 1]);
            row[j] = replaced.min(last[j] + 1).min(row[j - 1] + 1);
            if i > 1 && j > 1 && from[i - 1] == to[j - 2] && from[i - 2] == to[j - 1] {
                row[j] = row[j].min(before[j - 2] + 1);
            }
        }
        before = std::mem::replace(&mut last, row);
    }
    last[to.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_nearest_spelling_is_found_and_nothing_far_off() {
        let keys = ["tolerance_m", "look_m", "zones", "decisions"];
        let find = |word| nearest(word, keys.into_iter());
        assert_eq!(find("tolerence_m"), Some("tolerance_m"));
        assert_eq!(find("zonse"), Some("zones"));
        assert_eq!(find("Zones"), Some("zones"));
        assert_eq!(find("pressure"), None);
    }
}
