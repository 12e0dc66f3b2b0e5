//! What was meant by a name that is not known.

/// The most candidates that are looked at: beyond it a hostile file could make every mistake cost a second.
const MOST_CANDIDATES: usize = 256;

/// The candidate that is nearest to `name` in the number of single changes (a character left out, put in, replaced,
/// or two neighbours exchanged; capitals count as small letters), where at most a third of the name is changed.
/// Of equally near ones the first. Only the first 256 candidates are looked at.
///
/// The distance is that of optimal string alignment (Damerau, 1964), which costs the product of the two lengths.
pub(crate) fn nearest<'c>(name: &str, candidates: impl IntoIterator<Item = &'c str>) -> Option<&'c str> {
    let name: Vec<char> = name.chars().flat_map(char::to_lowercase).collect();
    let allowed = (name.len() / 3).max(1);
    candidates
        .into_iter()
        .take(MOST_CANDIDATES)
        .filter_map(|candidate| {
            let letters: Vec<char> = candidate.chars().flat_map(char::to_lowercase).collect();
            (letters.len().abs_diff(name.len()) <= allowed)
                .then(|| (changes(&name, &letters), candidate))
                .filter(|(changes, _)| *changes <= allowed)
        })
        .min_by_key(|(changes, _)| *changes)
        .map(|(_, candidate)| candidate)
}

fn changes(a: &[char], b: &[char]) -> usize {
    // Rows of the table of distances between the beginnings of a and b: the one before the last, the last, this.
    let mut before: Vec<usize> = Vec::new();
    let mut last: Vec<usize> = (0..=b.len()).collect();
    for i in 1..=a.len() {
        let mut row = vec![i];
        for j in 1..=b.len() {
            let replaced = last[j - 1] + usize::from(a[i - 1] != b[j - 1]);
            let mut least = replaced.min(last[j] + 1).min(row[j - 1] + 1);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                least = least.min(before[j - 2] + 1);
            }
            row.push(least);
        }
        before = std::mem::replace(&mut last, row);
    }
    last[b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    fn count(a: &str, b: &str) -> usize {
        changes(&a.chars().collect::<Vec<_>>(), &b.chars().collect::<Vec<_>>())
    }

    #[test]
    fn single_changes_are_counted() {
        assert_eq!(count("position_m", "posiiton_m"), 1, "neighbours exchanged");
        assert_eq!(count("name", "nme"), 1, "one left out");
        assert_eq!(count("name", "naame"), 1, "one put in");
        assert_eq!(count("name", "nane"), 1, "one replaced");
        assert_eq!(count("", "abc"), 3);
        // common practice, no source: the usual worked example of the distance.
        assert_eq!(count("kitten", "sitting"), 3);
    }

    #[test]
    fn far_names_are_not_offered() {
        let names = ["Bushing T1 phase A", "Bushing T1 phase B", "Arrester 3"];
        assert_eq!(nearest("bushing t1 phase b", names), Some("Bushing T1 phase B"));
        assert_eq!(nearest("Arestor 3", names), Some("Arrester 3"));
        assert_eq!(nearest("relay house", names), None);
        assert_eq!(nearest("A9", ["A1", "A2"]), Some("A1"));
        assert_eq!(nearest("", ["A1"]), None);
    }
}
