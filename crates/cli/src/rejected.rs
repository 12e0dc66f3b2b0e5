//! Captures that gave nothing, those of the same reason together.

use std::collections::HashMap;

use arcstead::documents::RejectedCapture;

use crate::console::on_one_line;

/// A line for every reason, in the order of the first capture of each: `name: reason` for one capture,
/// `40 captures (name ...): reason` for several. With `every_one` a line for every capture.
pub(crate) fn lines(rejected: &[RejectedCapture], every_one: bool) -> Vec<String> {
    let mut groups: Vec<Vec<&RejectedCapture>> = Vec::new();
    let mut group_of: HashMap<&str, usize> = HashMap::new();
    for one in rejected {
        match group_of.get(reason(one)) {
            Some(&group) if !every_one => groups[group].push(one),
            _ => {
                group_of.insert(reason(one), groups.len());
                groups.push(vec![one]);
            }
        }
    }
    groups.iter().filter_map(|alike| Some(line(alike.first()?, alike.len()))).collect()
}

/// The line of `count` captures that were rejected for the same reason.
fn line(first: &RejectedCapture, count: usize) -> String {
    let RejectedCapture { capture, reason: whole } = first;
    let reason = reason(first);
    on_one_line(&match count {
        // A reason that names the whole file reads best as it stands.
        1 if reason.len() < whole.len() && file_of(capture) == capture => whole.clone(),
        1 => format!("{capture}: {reason}"),
        count => format!("{count} captures ({capture} ...): {reason}"),
    })
}

/// The reason without the name of the capture or file that it may begin with.
pub(crate) fn reason(rejected: &RejectedCapture) -> &str {
    let (whole, capture) = (rejected.reason.as_str(), rejected.capture.as_str());
    let file = file_of(capture);
    // With its folder and its number in the file, or without.
    let names = [capture, file, without_folder(capture), without_folder(file)];
    names.into_iter().find_map(|name| behind_name(whole, name)).unwrap_or(whole)
}

/// The capture's name without its number in the file.
fn file_of(capture: &str) -> &str {
    match capture.rsplit_once('#') {
        Some((file, number)) if number.parse::<usize>().is_ok() => file,
        _ => capture,
    }
}

fn without_folder(name: &str) -> &str {
    name.rsplit(std::path::is_separator).next().unwrap_or(name)
}

/// What stands behind a path ending in `name`; none where the reason does not begin with such a path.
fn behind_name<'r>(reason: &'r str, name: &str) -> Option<&'r str> {
    reason.match_indices(name).find_map(|(start, _)| {
        let (folder, rest) = (&reason[..start], &reason[start + name.len()..]);
        let is_folder = folder.ends_with(std::path::is_separator) && !folder.contains(": ");
        let rest =
            rest.strip_prefix([':', ',', ' ']).filter(|_| folder.is_empty() || is_folder)?.trim_start();
        (!rest.is_empty()).then_some(rest)
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rejected(pairs: &[(&str, &str)]) -> Vec<RejectedCapture> {
        let one = |&(capture, reason): &(&str, &str)| RejectedCapture {
            capture: capture.into(),
            reason: reason.into(),
        };
        pairs.iter().map(one).collect()
    }

    #[test]
    fn a_line_tells_a_reason_and_how_many_captures_it_cost() {
        let all = rejected(&[
            ("v.sigmf-meta#1", "the band is too high"),
            ("b.csv", "visit/b.csv, line 3: `x` in column 1"),
            ("v.sigmf-meta#2", "the band is too high"),
            ("v.sigmf-meta#3", "visit/v.sigmf-meta: samples are missing"),
        ]);
        assert_eq!(
            lines(&all, false),
            [
                "2 captures (v.sigmf-meta#1 ...): the band is too high",
                "visit/b.csv, line 3: `x` in column 1",
                "v.sigmf-meta#3: samples are missing",
            ]
        );
        assert_eq!(lines(&all, true).len(), 4);
        assert_eq!(lines(&all, true)[2], "v.sigmf-meta#2: the band is too high");
        assert_eq!(lines(&[], false), [""; 0]);
    }

    #[test]
    fn a_reason_that_names_the_file_is_the_same_for_the_next_file() {
        let all = rejected(&[
            ("one/a.csv", "one/a.csv gives no sample rate"),
            ("b.csv", "my visit/b.csv gives no sample rate"),
            ("two/c.csv#4", "c.csv#4: gives no sample rate"),
        ]);
        assert_eq!(lines(&all, false), ["3 captures (one/a.csv ...): gives no sample rate"]);
        assert_eq!(lines(&all[..1], false), ["one/a.csv gives no sample rate"]);
    }

    #[test]
    fn words_that_only_look_like_the_name_stay() {
        for (capture, whole) in [
            ("a", "a: "),
            ("a", "all is lost"),
            ("a.csv", "in it: x/a.csv is gone"),
            ("", "gone"),
            ("a", "a"),
        ] {
            assert_eq!(reason(&rejected(&[(capture, whole)])[0]), whole);
        }
    }

    #[test]
    fn a_name_cannot_begin_a_line() {
        let all = rejected(&[("a\n\u{202e}b.csv", "lost")]);
        assert_eq!(lines(&all, false), ["a??b.csv: lost"]);
    }
}
