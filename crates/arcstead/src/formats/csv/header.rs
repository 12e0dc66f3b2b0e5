//! What the lines around the samples say: sample rate, segments, time.

use super::error::CsvError;
use super::number::{Decimal, parse};
use super::quantity::{Key, rate_unit_hz, split_number, time_unit_s};
use crate::CaptureTime;

/// A row of the header: the cells that are no samples.
#[derive(Debug)]
pub(super) struct HeaderRow {
    /// Line in the file, counted from 1.
    pub(super) line: u64,
    pub(super) cells: Vec<String>,
}

/// Names of the key that holds the sample interval, in small letters and digits.
const INTERVAL_KEYS: &[&str] = &[
    "sampleinterval",
    "samplinginterval",
    "sampleperiod",
    "samplingperiod",
    "sampletime",
    "samplingtime",
    "increment",
    "xincrement",
    "xincr",
    "xinc",
    "xdelta",
    "deltax",
    "hincrement",
    "horizontalincrement",
    "timeincrement",
    "timeinterval",
    "timestep",
    "timedelta",
    "deltat",
    "deltatime",
    "dt",
];

/// Names of the key that holds the sample rate.
const RATE_KEYS: &[&str] =
    &["samplerate", "samplingrate", "samplefrequency", "samplingfrequency", "samplespersecond", "fs"];

/// The sample rate that the header states, in hertz, and the line that does. An interval and a rate, or
/// several of them (one a channel), must be the same.
pub(super) fn stated_rate_hz(
    rows: &[HeaderRow],
    decimal: Decimal,
) -> Result<Option<(f64, u64)>, (u64, CsvError)> {
    let mut stated: Option<(f64, u64)> = None;
    for (at, row) in rows.iter().enumerate() {
        for (column, cell) in row.cells.iter().enumerate() {
            let key = Key::of(cell);
            let is_interval = INTERVAL_KEYS.contains(&key.name.as_str());
            if !is_interval && !RATE_KEYS.contains(&key.name.as_str()) {
                continue;
            }
            let Some((number, unit)) = value_of(rows, at, column, &key, decimal) else { continue };
            let wrong = || CsvError::Interval { key: cell.clone(), found: format!("{number:e} {unit}") };
            let rate_hz = if is_interval {
                let unit_s = if unit.is_empty() { 1.0 } else { time_unit_s(&unit).unwrap_or(1.0) };
                1.0 / (number * unit_s)
            } else {
                number * rate_unit_hz(&unit).unwrap_or(1.0)
            };
            if !(rate_hz > 0.0 && rate_hz.is_finite()) {
                return Err((row.line, wrong()));
            }
            match stated {
                Some((first_hz, _)) if (rate_hz - first_hz).abs() > 1e-6 * first_hz => {
                    let (first_s, second_s) = (1.0 / first_hz, 1.0 / rate_hz);
                    return Err((row.line, CsvError::TwoIntervals { first_s, second_s }));
                }
                Some(_) => {}
                None => stated = Some((rate_hz, row.line)),
            }
        }
    }
    Ok(stated)
}

/// The number that belongs to a key, and its unit: behind a `:` or `=`, in the next cell, or in the cell
/// below.
fn value_of(
    rows: &[HeaderRow],
    row: usize,
    column: usize,
    key: &Key,
    decimal: Decimal,
) -> Option<(f64, String)> {
    let cell =
        |row: usize, column: usize| -> Option<&str> { rows.get(row)?.cells.get(column).map(String::as_str) };
    let unit = |rest: &str, next: Option<&str>| -> String {
        let next = next.filter(|next| time_unit_s(next).is_some() || rate_unit_hz(next).is_some());
        [rest, key.unit.as_str(), next.unwrap_or("")]
            .into_iter()
            .find(|unit| !unit.is_empty())
            .unwrap_or("")
            .to_owned()
    };
    if let Some((number, rest)) = split_number(&key.value, decimal) {
        return Some((number, unit(rest, cell(row, column + 1))));
    }
    if let Some((number, rest)) = cell(row, column + 1).and_then(|cell| split_number(cell, decimal)) {
        return Some((number, unit(rest, cell(row, column + 2))));
    }
    let (number, rest) = split_number(cell(row + 1, column)?, decimal)?;
    Some((number, unit(rest, None)))
}

/// Number of segments and rows of each, where the header states two segments or more.
pub(super) fn segments(rows: &[HeaderRow]) -> Option<(u64, u64)> {
    let count = |key: &str| {
        rows.iter().find_map(|row| {
            let at = row.cells.iter().position(|cell| Key::of(cell).name == key)?;
            let number = parse(row.cells.get(at + 1)?.as_bytes(), Decimal::Point)?;
            (number.fract().abs() < f64::MIN_POSITIVE && (1.0..=1e15).contains(&number))
                .then_some(number as u64)
        })
    };
    Some((count("segments")?, count("segmentsize")?)).filter(|(segments, _)| *segments > 1)
}

/// All cells that are moments beyond doubt, in their order.
pub(super) fn times(rows: &[HeaderRow]) -> Vec<CaptureTime> {
    rows.iter()
        .flat_map(|row| &row.cells)
        .filter_map(|cell| {
            // `Date: 2026-...` has a colon in its time too.
            let after_key = cell.split_once([':', '=']).map_or("", |(_, value)| value.trim());
            CaptureTime::parse_rfc3339(cell).or_else(|_| CaptureTime::parse_rfc3339(after_key)).ok()
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rate(text: &str) -> Result<Option<f64>, CsvError> {
        let rows = text
            .lines()
            .zip(1..)
            .map(|(line, number)| HeaderRow {
                line: number,
                cells: line.split(';').map(|cell| cell.trim().to_owned()).collect(),
            })
            .collect::<Vec<_>>();
        stated_rate_hz(&rows, Decimal::Comma)
            .map(|stated| stated.map(|(rate, _)| rate))
            .map_err(|(_, error)| error)
    }

    #[test]
    fn rates_in_all_their_places() {
        for text in [
            "Sample Interval;2e-10",
            "Sample Interval;0,2;ns",
            "Sample Interval;0,2 ns",
            "Sample interval (ns);0,2",
            "# Sampling Rate: 5 GS/s",
            "fs = 5e9",
            "Sample Rate;5;GHz;Record Length;10",
            "X;CH1;Start;Increment\nSequence;Volt;-1e-6;2e-10",
            "Sample Interval;2e-10;Sample Interval;2e-10\nSample Rate;5e9",
        ] {
            let found = rate(text).unwrap().unwrap();
            assert!((found / 5e9 - 1.0).abs() < 1e-12, "{text}: {found}");
        }
        assert_eq!(rate("Sample Rate;Auto\nTime Base;1e-6"), Ok(None));
        assert!(matches!(rate("Sample Interval;0"), Err(CsvError::Interval { .. })));
        assert!(matches!(rate("Sample Rate;-5e9"), Err(CsvError::Interval { .. })));
        assert!(matches!(rate("Sample Interval;2e-10;dt;4e-10"), Err(CsvError::TwoIntervals { .. })));
    }

    #[test]
    fn only_a_time_with_its_zone_is_a_moment() {
        let rows = [HeaderRow {
            line: 1,
            cells: vec![
                "2026-03-04 10:15:00".into(),
                "Date: 2026-03-04T10:15:00.5Z".into(),
                "2026-03-04T10:15:01+00:00".into(),
                "04/03/2026".into(),
            ],
        }];
        let found = times(&rows).iter().map(ToString::to_string).collect::<Vec<_>>();
        assert_eq!(found, ["2026-03-04T10:15:00.5Z", "2026-03-04T10:15:01Z"]);
    }
}
