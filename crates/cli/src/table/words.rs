//! Flags and counts in plain words.

use std::collections::HashMap;

use arcstead::documents::{CaptureCounts, Flag};

use super::figures::count;
use crate::console::on_one_line;
use crate::rejected;

/// Most reasons that are told apart without `--verbose`.
const MOST_REASONS: usize = 3;

/// What a flag says, in a few words.
pub(super) fn flag_words(flag: Flag) -> &'static str {
    match flag {
        Flag::FewAntennas => "too few antennas to check any arrival",
        Flag::RangeUndetermined => "the direction is known, the distance is not",
        Flag::MirrorAmbiguity => "more than one place fits",
        Flag::PoorFit => "the arrivals fit no place",
        Flag::AntennaLate => "an arrival came too late and was left out",
        Flag::AntennaEarly => "an arrival came too early and was left out",
        Flag::RegionTouchesSearchEdge => "the source may lie outside the search box",
        Flag::Hidden => "the place is hidden from some of the antennas",
        Flag::Scattered => "the captures do not agree on one place",
        _ => "something this table has no words for; see the JSON result",
    }
}

/// `A`, `A or B`, `A, B or C`.
pub(super) fn either(names: &[String]) -> String {
    match names {
        [] => String::new(),
        [one] => one.clone(),
        [most @ .., last] => format!("{} or {last}", most.join(", ")),
    }
}

/// What became of the captures that belong to no source told; none when there are none.
pub(super) fn not_used(counts: &CaptureCounts) -> Option<String> {
    let mut parts = Vec::new();
    if counts.stray > 0 {
        parts.push(format!("{} outside the source told", count(counts.stray, "capture")));
    }
    if !counts.rejected.is_empty() {
        parts.push(rejected(counts));
    }
    (!parts.is_empty()).then(|| parts.join("\n"))
}

/// The captures that gave nothing, a line for each reason, the most frequent first.
pub(super) fn rejected(counts: &CaptureCounts) -> String {
    let mut found: HashMap<&str, usize> = HashMap::new();
    for one in &counts.rejected {
        *found.entry(rejected::reason(one)).or_default() += 1;
    }
    let mut found: Vec<_> = found.into_iter().collect();
    found.sort_by(|(a, a_count), (b, b_count)| b_count.cmp(a_count).then(a.cmp(b)));
    let told =
        found.iter().take(MOST_REASONS).map(|(reason, count)| format!("{count} x {}", on_one_line(reason)));
    let mut lines =
        vec![format!("{} without enough pulses, or not readable:", count(counts.rejected.len(), "capture"))];
    lines.extend(told);
    if found.len() > MOST_REASONS {
        lines.push(format!("and {}, -v tells them", count(found.len() - MOST_REASONS, "other reason")));
    }
    lines.join("\n")
}

#[cfg(test)]
mod tests {
    use super::*;
    use arcstead::documents::RejectedCapture;

    #[test]
    fn reasons_are_counted() {
        let rejected = |reason: &str| RejectedCapture { capture: "c".into(), reason: reason.into() };
        let counts = CaptureCounts {
            read: 9,
            used: 3,
            stray: 1,
            rejected: ["b", "a", "b", "c", "d", "e"].map(rejected).to_vec(),
        };
        assert_eq!(
            not_used(&counts).unwrap(),
            "1 capture outside the source told\n6 captures without enough pulses, or not readable:\n2 x b\n1 x a\n1 x c\nand 2 other reasons, -v \
             tells them"
        );
        assert_eq!(not_used(&CaptureCounts::default()), None);
    }
}
