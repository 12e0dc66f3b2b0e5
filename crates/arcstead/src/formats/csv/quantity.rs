//! Units, and numbers with units, as headers write them.

use super::number::{Decimal, parse};

/// The unit of time called so, in seconds.
pub(super) fn time_unit_s(text: &str) -> Option<f64> {
    match bare(text).as_str() {
        "s" | "sec" | "second" | "seconds" => Some(1.0),
        "ms" | "msec" | "millisecond" | "milliseconds" => Some(1e-3),
        // Micro is written with a Latin u, the sign for micro, or the Greek letter.
        "us" | "\u{b5}s" | "\u{3bc}s" | "usec" | "microsecond" | "microseconds" => Some(1e-6),
        "ns" | "nsec" | "nanosecond" | "nanoseconds" => Some(1e-9),
        "ps" | "psec" | "picosecond" | "picoseconds" => Some(1e-12),
        _ => None,
    }
}

/// The unit of voltage called so, in volts.
pub(super) fn voltage_unit_v(text: &str) -> Option<f64> {
    match bare(text).as_str() {
        "v" | "volt" | "volts" => Some(1.0),
        "mv" | "millivolt" | "millivolts" => Some(1e-3),
        "uv" | "\u{b5}v" | "\u{3bc}v" | "microvolt" | "microvolts" => Some(1e-6),
        "kv" | "kilovolt" | "kilovolts" => Some(1e3),
        _ => None,
    }
}

/// The unit of rate called so, in hertz.
pub(super) fn rate_unit_hz(text: &str) -> Option<f64> {
    let text = bare(text);
    let base = ["hz", "samples/s", "sample/s", "pts/s", "sa/s", "s/s", "sa/sec", "s/sec", "sps"]
        .into_iter()
        .find_map(|base| text.strip_suffix(base))?;
    match base.trim_end() {
        "" => Some(1.0),
        "k" => Some(1e3),
        "m" => Some(1e6),
        "g" => Some(1e9),
        _ => None,
    }
}

/// Whether the cell stands in a row of units.
pub(super) fn is_unit(text: &str) -> bool {
    time_unit_s(text).is_some()
        || voltage_unit_v(text).is_some()
        || matches!(
            bare(text).as_str(),
            "sequence"
                | "count"
                | "counts"
                | "adc"
                | "lsb"
                | "code"
                | "codes"
                | "a"
                | "ma"
                | "w"
                | "%"
                | "div"
                | "arb"
                | "unknown"
                | "none"
                | "-"
        )
}

/// Small letters, without the brackets around a unit.
fn bare(text: &str) -> String {
    text.trim_matches(|letter: char| letter.is_whitespace() || "()[]".contains(letter)).to_lowercase()
}

/// A number and what follows it: `2e-10 s`, `5GS/s`.
pub(super) fn split_number(text: &str, decimal: Decimal) -> Option<(f64, &str)> {
    let text = text.trim();
    let ends = text.char_indices().map(|(at, letter)| at + letter.len_utf8()).take(40);
    let end = ends.filter(|&end| parse(&text.as_bytes()[..end], decimal).is_some()).last()?;
    let number = parse(&text.as_bytes()[..end], decimal)?;
    Some((number, text[end..].trim()))
}

/// A name or key of a header, taken apart.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Key {
    /// Small letters and digits only.
    pub(super) name: String,
    /// The unit in brackets at its end, empty when there is none.
    pub(super) unit: String,
    /// What follows a `:` or `=`, empty when nothing does.
    pub(super) value: String,
}

impl Key {
    /// Takes `# Sample Interval (ns) = 0.2` apart.
    pub(super) fn of(text: &str) -> Self {
        let (key, value) = text.split_once([':', '=']).unwrap_or((text, ""));
        let (name, unit) = match key.split_once(['(', '[']) {
            Some((name, unit)) => (name, unit.trim_end().trim_end_matches([')', ']'])),
            None => (key, ""),
        };
        Self {
            name: name
                .chars()
                .filter(|letter| letter.is_alphanumeric())
                .flat_map(char::to_lowercase)
                .collect(),
            unit: unit.trim().to_owned(),
            value: value.trim().to_owned(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_in_their_spellings() {
        for (text, expected) in
            [("s", 1.0), ("Second", 1.0), ("(ms)", 1e-3), ("µs", 1e-6), ("μs", 1e-6), ("[ns]", 1e-9)]
        {
            assert_eq!(time_unit_s(text), Some(expected), "{text}");
        }
        for (text, expected) in [("Volt", 1.0), ("mV", 1e-3), ("uV", 1e-6)] {
            assert_eq!(voltage_unit_v(text), Some(expected), "{text}");
        }
        for (text, expected) in
            [("Hz", 1.0), ("GS/s", 1e9), ("MSa/s", 1e6), ("GHz", 1e9), ("Gsps", 1e9), ("kHz", 1e3)]
        {
            assert_eq!(rate_unit_hz(text), Some(expected), "{text}");
        }
        assert_eq!((time_unit_s("V"), voltage_unit_v("s"), rate_unit_hz("s")), (None, None, None));
        assert_eq!(split_number("2e-10s", Decimal::Point), Some((2e-10, "s")));
        assert_eq!(split_number(" 5 GS/s", Decimal::Point), Some((5.0, "GS/s")));
        assert_eq!(split_number("0,2 ns", Decimal::Comma), Some((0.2, "ns")));
        assert_eq!(split_number("Auto", Decimal::Point), None);
    }

    #[test]
    fn keys_come_apart() {
        let key = Key::of("# Sample Interval (ns) = 0.2");
        assert_eq!(
            (key.name.as_str(), key.unit.as_str(), key.value.as_str()),
            ("sampleinterval", "ns", "0.2")
        );
        assert_eq!(Key::of("X-axis").name, "xaxis");
    }
}
