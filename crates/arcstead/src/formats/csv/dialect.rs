//! How a file separates cells and writes decimals: decided once for the whole file.

use super::error::CsvError;
use super::lines::{cells, short_text};
use super::number::Decimal;

/// Separator and decimal sign.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Dialect {
    pub(super) separator: u8,
    pub(super) decimal: Decimal,
}

impl Dialect {
    /// Decides from the first lines of a file, those made of numbers if there are any. The error names the
    /// index of the line.
    pub(super) fn detect(lines: &[&[u8]]) -> Result<Self, (usize, CsvError)> {
        let filled = || lines.iter().enumerate().filter(|(_, line)| !line.trim_ascii().is_empty());
        let mut deciding = filled().filter(|(_, line)| is_of_numbers(line)).collect::<Vec<_>>();
        if deciding.is_empty() {
            deciding = filled().collect();
        }
        let half_have = |separator: u8| {
            2 * deciding.iter().filter(|(_, line)| line.contains(&separator)).count() >= deciding.len().max(1)
        };
        let separator = [b'\t', b';'].into_iter().find(|&separator| half_have(separator)).unwrap_or(b',');
        if separator == b',' {
            return match ambiguous(&deciding) {
                Some((at, line)) => Err((at, CsvError::AmbiguousComma { found: short_text(line) })),
                None => Ok(Self { separator, decimal: Decimal::Point }),
            };
        }
        let mut decimal = Decimal::Point;
        for (at, line) in &deciding {
            for cell in cells(line, separator).filter(|cell| is_of_numbers(cell) && cell.contains(&b',')) {
                if cell.contains(&b'.') {
                    return Err((*at, CsvError::PointAndComma { found: short_text(cell) }));
                }
                decimal = Decimal::Comma;
            }
        }
        Ok(Self { separator, decimal })
    }
}

/// Whether a line, or cell, has nothing but what numbers and their separators are made of, and a digit.
fn is_of_numbers(line: &[u8]) -> bool {
    line.iter().any(u8::is_ascii_digit)
        && line.iter().all(|byte| {
            matches!(byte, b'0'..=b'9' | b'+' | b'-' | b'.' | b',' | b';' | b'\t' | b' ' | b'e' | b'E' | b'"')
        })
}

/// The first line that shows that commas may be decimal commas: when all cells of all lines are integers, one
/// that no program writes as an integer (`-0`, `043`).
fn ambiguous<'a>(deciding: &[(usize, &&'a [u8])]) -> Option<(usize, &'a [u8])> {
    let is_integer = |cell: &[u8]| {
        let digits = cell.strip_prefix(b"-").or_else(|| cell.strip_prefix(b"+")).unwrap_or(cell);
        !digits.is_empty() && digits.iter().all(u8::is_ascii_digit)
    };
    let is_odd = |cell: &[u8]| {
        cell == b"-0" || (cell.len() > 1 && cell[0] == b'0') || (cell.len() > 2 && cell.starts_with(b"-0"))
    };
    let integers = |line: &[u8]| {
        line.contains(&b',') && cells(line, b',').all(|cell| cell.is_empty() || is_integer(cell))
    };
    if !deciding.iter().all(|(_, line)| integers(line)) {
        return None;
    }
    deciding.iter().find(|(_, line)| cells(line, b',').any(is_odd)).map(|(at, line)| (*at, **line))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn detect(text: &str) -> Result<(char, Decimal), (usize, CsvError)> {
        let lines = text.lines().map(str::as_bytes).collect::<Vec<_>>();
        Dialect::detect(&lines).map(|dialect| (char::from(dialect.separator), dialect.decimal))
    }

    #[test]
    fn the_lines_of_numbers_decide() {
        assert_eq!(detect("a;b, and c;d\n1.5,2\n3,4"), Ok((',', Decimal::Point)));
        assert_eq!(detect("a,b\n1,5;2\n3;4"), Ok((';', Decimal::Comma)));
        assert_eq!(detect("1.5;2\n3;4"), Ok((';', Decimal::Point)));
        assert_eq!(detect("t,x\ty\n1,5\t2,25"), Ok(('\t', Decimal::Comma)));
        assert_eq!(detect(""), Ok((',', Decimal::Point)));
        assert_eq!(detect("1\n2"), Ok((',', Decimal::Point)));
    }

    #[test]
    fn a_comma_that_may_be_either_is_refused() {
        assert!(matches!(detect("1,204\n0,043"), Err((1, CsvError::AmbiguousComma { .. }))));
        assert!(matches!(detect("-0,204\n1,435"), Err((0, CsvError::AmbiguousComma { .. }))));
        assert_eq!(detect("-3,204\n0,435"), Ok((',', Decimal::Point)));
        assert!(matches!(detect("1.234,5;2\n3;4"), Err((0, CsvError::PointAndComma { .. }))));
    }
}
