//! The order in which people number files.

use std::cmp::Ordering;

/// Compares two names so that numbers in them count as numbers: `shot_2` comes before `shot_10`.
///
/// Runs of the digits 0-9 compare by value, however long; everything else byte by byte. Names that differ
/// only in leading zeros compare byte by byte, so the order is total and equal means identical.
#[must_use]
pub fn natural_order(one: &str, other: &str) -> Ordering {
    let (mut a, mut b) = (one.as_bytes(), other.as_bytes());
    loop {
        match (a.first(), b.first()) {
            (None, None) => return one.cmp(other),
            (None, Some(_)) => return Ordering::Less,
            (Some(_), None) => return Ordering::Greater,
            (Some(x), Some(y)) if x.is_ascii_digit() && y.is_ascii_digit() => {
                let (number_a, number_b) = (take_number(&mut a), take_number(&mut b));
                match number_a.len().cmp(&number_b.len()).then_with(|| number_a.cmp(number_b)) {
                    Ordering::Equal => {}
                    unequal => return unequal,
                }
            }
            (Some(x), Some(y)) => {
                match x.cmp(y) {
                    Ordering::Equal => {}
                    unequal => return unequal,
                }
                a = &a[1..];
                b = &b[1..];
            }
        }
    }
}

/// Takes the digits at the front, and gives them without leading zeros: equally many digits then compare as
/// text.
fn take_number<'a>(rest: &mut &'a [u8]) -> &'a [u8] {
    let end = rest.iter().position(|byte| !byte.is_ascii_digit()).unwrap_or(rest.len());
    let (number, after) = rest.split_at(end);
    *rest = after;
    let zeros = number.iter().position(|&digit| digit != b'0').unwrap_or(number.len());
    &number[zeros..]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_count_as_numbers() {
        let mut names = ["shot_10", "shot_2", "shot_02", "a", "shot_1b", "shot", "", "shot_1a", "shot_0"];
        names.sort_by(|one, other| natural_order(one, other));
        assert_eq!(names, ["", "a", "shot", "shot_0", "shot_1a", "shot_1b", "shot_02", "shot_2", "shot_10"]);
        let huge = "9".repeat(60);
        assert_eq!(natural_order(&huge, &format!("1{huge}")), Ordering::Less);
        assert_eq!(natural_order("x007", "x007"), Ordering::Equal);
    }
}
