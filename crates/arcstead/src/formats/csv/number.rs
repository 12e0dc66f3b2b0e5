//! Numbers in cells.

/// Which sign stands before the decimals.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Decimal {
    Point,
    Comma,
}

impl Decimal {
    pub(super) fn name(self) -> &'static str {
        match self {
            Self::Point => "point",
            Self::Comma => "comma",
        }
    }
}

/// Longest cell that can be a number.
const LONGEST: usize = 64;

/// Reads a finite number: digits, sign, decimals, exponent, and nothing else (no `nan`, no separators of
/// thousands).
pub(super) fn parse(cell: &[u8], decimal: Decimal) -> Option<f64> {
    let mut buffer = [0_u8; LONGEST];
    let bytes = match decimal {
        Decimal::Point => cell,
        Decimal::Comma => {
            let copy = buffer.get_mut(..cell.len())?;
            for (to, &from) in copy.iter_mut().zip(cell) {
                *to = match from {
                    b',' => b'.',
                    b'.' => return None,
                    other => other,
                };
            }
            &*copy
        }
    };
    // Rust reads `inf` and `nan` as numbers: a number begins with a digit, a sign or the decimal sign.
    if bytes.len() > LONGEST
        || !bytes.iter().all(|byte| matches!(byte, b'0'..=b'9' | b'+' | b'-' | b'.' | b'e' | b'E'))
    {
        return None;
    }
    std::str::from_utf8(bytes).ok()?.parse().ok().filter(|number: &f64| number.is_finite())
}

/// Whether the cell stands where a number should, be it well written or not: it is made of what numbers are
/// made of, or it is one of the marks recorders put in the place of a number.
pub(super) fn stands_for_number(cell: &[u8]) -> bool {
    let made_of_numbers = |byte: &u8| matches!(byte, b'0'..=b'9' | b'+' | b'-' | b'.' | b',' | b'e' | b'E');
    (cell.iter().any(u8::is_ascii_digit) && cell.iter().all(made_of_numbers)) || is_mark(cell)
}

/// Whether the cell is what recorders put where they have no number: `nan`, `inf`, `****`, `>1.2`.
pub(super) fn is_mark(cell: &[u8]) -> bool {
    let word = cell.strip_prefix(b"-").or_else(|| cell.strip_prefix(b"+")).unwrap_or(cell);
    word.eq_ignore_ascii_case(b"nan")
        || word.eq_ignore_ascii_case(b"inf")
        || word.eq_ignore_ascii_case(b"infinity")
        || (!cell.is_empty() && cell.iter().all(|&byte| byte == b'*'))
        || matches!(cell.first(), Some(b'<' | b'>')) && cell.iter().any(u8::is_ascii_digit)
}

/// How finely a number is printed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Digits {
    /// Digits from the first that is not zero to the last.
    pub(super) significant: i32,
    /// Power of ten of the last digit.
    pub(super) last: i32,
}

impl Digits {
    /// The digits of a cell that [`parse`] reads.
    pub(super) fn of(cell: &[u8]) -> Self {
        let (mut significant, mut decimals, mut after_sign) = (0_i32, 0_i32, false);
        let mut exponent = 0_i32;
        for (at, byte) in cell.iter().enumerate() {
            match byte {
                b'0'..=b'9' => {
                    // A cell is short (LONGEST), so the counts are.
                    significant += i32::from(significant > 0 || *byte != b'0');
                    decimals += i32::from(after_sign);
                }
                b'.' | b',' => after_sign = true,
                b'e' | b'E' => {
                    let text = std::str::from_utf8(&cell[at + 1..]).unwrap_or("");
                    exponent = text.parse::<i32>().unwrap_or(0).clamp(-400, 400);
                    break;
                }
                _ => {}
            }
        }
        Self { significant, last: exponent - decimals }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_and_what_is_none() {
        let cases =
            [("1", 1.0), ("-0.5", -0.5), ("+2e-10", 2e-10), (".5", 0.5), ("5.", 5.0), ("1E3", 1000.0)];
        for (text, expected) in cases {
            assert_eq!(
                parse(text.as_bytes(), Decimal::Point).map(f64::to_bits),
                Some(f64::to_bits(expected))
            );
        }
        assert_eq!(parse(b"0,435", Decimal::Comma).map(f64::to_bits), Some(0.435_f64.to_bits()));
        for text in ["", "-", "nan", "inf", "0,435", "1.234.5", "1e999", "0x10", "1 2", "****", "1_000"] {
            assert_eq!(parse(text.as_bytes(), Decimal::Point), None, "{text}");
        }
        assert_eq!(parse(b"0.435", Decimal::Comma), None);
        assert_eq!(parse(&[b'1'; 100], Decimal::Comma), None);
        assert_eq!(parse(&[b'1'; 100], Decimal::Point), None);
        for mark in ["nan", "NaN", "-inf", "****", ">1.2", "<-0.5"] {
            assert!(is_mark(mark.as_bytes()), "{mark}");
        }
        for word in ["", "V", "<b>", "Inflow"] {
            assert!(!is_mark(word.as_bytes()), "{word}");
        }
    }

    #[test]
    fn digits_say_how_fine_a_number_is() {
        for (text, significant, last) in
            [("-0.00120", 3, -5), ("1.5e-6", 2, -7), ("120", 3, 0), ("0", 0, 0), ("1,25E+3", 3, 1)]
        {
            assert_eq!(Digits::of(text.as_bytes()), Digits { significant, last }, "{text}");
        }
    }
}
