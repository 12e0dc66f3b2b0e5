//! The sample interval from a column of times.

use super::error::CsvError;
use super::number::Digits;

/// Greatest relative uncertainty of an interval that is taken from the digits of a time column alone.
const MOST_UNCERTAIN: f64 = 1e-3;

/// Greatest distance from an even grid, in last digits, of times that are printed exactly.
const EXACT: f64 = 1e-3;

/// Relative rounding of times that a recorder kept in 32-bit floats before it printed them (24 bits).
const SINGLE_ROUNDING: f64 = 1.2e-7;

/// The first column of a table, number by number.
#[derive(Debug)]
pub(super) struct TimeColumn {
    values: Vec<f64>,
    /// Most significant digits of any number, and the power of ten of the finest last digit of all.
    significant: i32,
    finest: i32,
}

impl TimeColumn {
    pub(super) fn new() -> Self {
        Self { values: Vec::new(), significant: 0, finest: i32::MAX }
    }

    /// Adds a number and the cell it was read from.
    pub(super) fn push(&mut self, value: f64, cell: &[u8]) {
        let digits = Digits::of(cell);
        self.significant = self.significant.max(digits.significant);
        self.finest = self.finest.min(digits.last);
        self.values.push(value);
    }

    pub(super) fn values(&self) -> &[f64] {
        &self.values
    }

    /// How far two printed times may be from their true difference: one last digit, in the unit of the
    /// column.
    ///
    /// Numbers are printed with a fixed number of decimals or of significant digits, and trailing zeros may
    /// be gone; in both cases the greatest number has lost most: the finest last digit, or the most
    /// significant digits, say how much.
    fn resolution(&self) -> f64 {
        let greatest = self.greatest();
        let first_digit = if greatest > 0.0 { greatest.log10().floor() as i32 } else { 0 };
        let printed = 10_f64.powi(self.finest.max(first_digit + 1 - self.significant));
        printed.max(SINGLE_ROUNDING * greatest)
    }

    fn greatest(&self) -> f64 {
        self.values.iter().fold(0.0_f64, |greatest, value| greatest.max(value.abs()))
    }

    /// Whether the column goes up by exactly one from row to row: it counts.
    pub(super) fn counts(&self) -> bool {
        self.first_not_counting().is_none()
    }

    /// The first row that is not one more than the row before.
    pub(super) fn first_not_counting(&self) -> Option<usize> {
        self.values.windows(2).position(|pair| (pair[1] - pair[0] - 1.0).abs() > 1e-9).map(|at| at + 1)
    }

    /// Whether the column never goes down and takes more values than a signal that does so would: it is time.
    pub(super) fn only_rises(&self) -> bool {
        let rises = self.values.windows(2).filter(|pair| pair[1] > pair[0]).count();
        self.values.windows(2).all(|pair| pair[1] >= pair[0]) && rises >= 2 + self.values.len() / 100
    }

    /// The sample interval in seconds: `header_s` if stated, else (last - first) / (rows - 1), else `site_s`
    /// where the digits do not tell it apart. None when there is but one row and nothing stated. `unit_s` is
    /// the unit of the column.
    ///
    /// # Errors
    /// With the row (counted from 0) where one is at fault: as the module says under *Time*.
    pub(super) fn interval_s(
        &self,
        unit_s: f64,
        header_s: Option<f64>,
        site_s: Option<f64>,
    ) -> Result<Option<f64>, (Option<usize>, CsvError)> {
        let (Some(first), Some(last)) = (self.values.first(), self.values.last()) else {
            return Ok(header_s);
        };
        let steps = self.values.len() - 1;
        if steps == 0 {
            return Ok(header_s);
        }
        let (first_s, last_s) = (first * unit_s, last * unit_s);
        let resolution_s = self.resolution() * unit_s;
        let column_s = (last_s - first_s) / steps as f64;
        if last_s < first_s {
            return Err((None, CsvError::TimeBackwards { first_s, last_s }));
        }
        // Rounded or cut, a printed time and the line through first and last are each off by half a digit at
        // most.
        let tolerance_s = resolution_s + 0.01 * column_s;
        let in_pairs = self.comes_in_pairs();
        let mut greatest_off_s = 0.0_f64;
        for (row, value) in self.values.iter().enumerate() {
            let (found_s, expected_s) = (value * unit_s, first_s + row as f64 * column_s);
            let off_s = (found_s - expected_s).abs();
            if off_s > tolerance_s && !in_pairs {
                return Err((Some(row), CsvError::UnevenTime { found_s, expected_s }));
            }
            greatest_off_s = greatest_off_s.max(off_s);
        }
        // Times that were rounded scatter about the even grid by half a digit. If none does (but for the
        // rounding of the numbers here) their digits are all there are: recorders sample at round rates.
        let exact = steps >= 3
            && column_s > 0.99 * resolution_s
            && greatest_off_s <= EXACT * resolution_s + 1e-15 * self.greatest() * unit_s;
        let uncertainty_s = if exact { greatest_off_s } else { resolution_s } / steps as f64;
        if in_pairs {
            // So do few digits, when a step is just half of the last one. Then somebody else must know the
            // step.
            let known = |interval_s: f64| {
                (interval_s - column_s).abs() <= MOST_UNCERTAIN * interval_s + uncertainty_s
            };
            let coarse = column_s <= 1.01 * resolution_s;
            if !(coarse && header_s.or(site_s).is_some_and(known)) {
                return Err((None, CsvError::Envelope));
            }
        }
        if let Some(header_s) = header_s {
            return if (header_s - column_s).abs() > MOST_UNCERTAIN * header_s + uncertainty_s {
                Err((None, CsvError::HeaderDisagrees { header_s, column_s }))
            } else {
                Ok(Some(header_s))
            };
        }
        match site_s {
            Some(site_s) if (site_s - column_s).abs() <= uncertainty_s => Ok(Some(site_s)),
            _ if uncertainty_s > MOST_UNCERTAIN * column_s => {
                Err((None, CsvError::TooFewDigits { interval_s: column_s, uncertainty_s }))
            }
            _ => Ok(Some(column_s)),
        }
    }

    /// Whether every value stands exactly twice in a row.
    fn comes_in_pairs(&self) -> bool {
        let same = |a: f64, b: f64| a.to_bits() == b.to_bits();
        let (pairs, rest) = self.values.as_chunks::<2>();
        pairs.len() >= 2
            && rest.is_empty()
            && pairs.iter().all(|&[a, b]| same(a, b))
            && pairs.windows(2).all(|pair| pair[1][0] > pair[0][0])
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn column(cells: impl IntoIterator<Item = String>) -> TimeColumn {
        let mut column = TimeColumn::new();
        for cell in cells {
            column.push(cell.parse().unwrap(), cell.as_bytes());
        }
        column
    }

    fn assert_interval(column: &TimeColumn, header: Option<f64>, site: Option<f64>, expected: f64) {
        let found = column.interval_s(1.0, header, site).unwrap().unwrap();
        assert!((found / expected - 1.0).abs() < 1e-4, "{found} / {expected}");
    }

    #[test]
    fn few_digits_over_many_rows_still_tell_the_interval() {
        // Six significant digits over 100 000 rows of 0.2 ns: neighbours differ by 0 or more, the whole by 20
        // us.
        let times = column((0..100_000).map(|k| format!("{:.5e}", 1e-3 + f64::from(k) * 2e-10)));
        assert_eq!(times.values()[0].to_bits(), times.values()[1].to_bits());
        assert_interval(&times, None, Some(2e-10), 2e-10);
        assert_interval(&times, Some(2e-10), None, 2e-10);
        let times = column((0..100_000).map(|k| format!("{:.5e}", f64::from(k) * 2e-10)));
        assert_interval(&times, None, None, 2e-10);
        // Trailing zeros cut off.
        let times = column((0..1000).map(|k| format!("{}", f64::from(k) / 5.0)));
        assert_interval(&times, None, None, 0.2);
    }

    #[test]
    fn too_few_digits_are_told() {
        let times = column((0..100).map(|k| format!("{:.3}", 1.0 + f64::from(k) * 1e-4)));
        let (_, error) = times.interval_s(1.0, None, None).unwrap_err();
        assert!(matches!(error, CsvError::TooFewDigits { .. }), "{error}");
        assert_interval(&times, None, Some(1e-4), 1e-4);
    }

    #[test]
    fn exact_times_of_a_short_record_are_taken_as_exact() {
        let times = column(["0", "0.2", "0.4", "0.6", "0.8"].map(str::to_owned));
        assert_interval(&times, None, None, 0.2);
        // All the same: nothing is told, and nothing contradicts.
        let times = column(["1.000"; 100].map(str::to_owned));
        assert_interval(&times, Some(1e-9), None, 1e-9);
        assert_interval(&times, None, Some(1e-9), 1e-9);
        assert!(matches!(times.interval_s(1.0, None, None), Err((None, CsvError::TooFewDigits { .. }))));
    }

    #[test]
    fn a_missing_row_is_found() {
        let times = column((0..1000).filter(|&k| k != 700).map(|k| format!("{:.10}", f64::from(k) * 2e-10)));
        let (row, error) = times.interval_s(1.0, None, None).unwrap_err();
        assert!(matches!(error, CsvError::UnevenTime { .. }), "{error}");
        assert!(row.is_some());
    }

    #[test]
    fn pairs_are_envelopes_unless_the_digits_are_coarse() {
        let pairs = column((0..100).map(|k| format!("{:.9}", f64::from(k / 2) * 4e-7)));
        assert!(matches!(pairs.interval_s(1.0, None, Some(2e-7)), Err((None, CsvError::Envelope))));
        // 0.5 ns printed in whole nanoseconds, cut.
        let coarse = column((0..100).map(|k| format!("{}", k / 2)));
        assert!(matches!(coarse.interval_s(1e-9, None, None), Err((None, CsvError::Envelope))));
        assert!(coarse.interval_s(1e-9, None, Some(0.5e-9)).is_ok());
    }

    #[test]
    fn a_thinned_waveform_and_a_reversed_one_are_refused() {
        let times = column((0..100).map(|k| format!("{:.10}", f64::from(k) * 4e-10)));
        let (_, error) = times.interval_s(1.0, Some(2e-10), None).unwrap_err();
        assert!(matches!(error, CsvError::HeaderDisagrees { .. }), "{error}");
        let times = column((0..100).rev().map(|k| format!("{:.10}", f64::from(k) * 4e-10)));
        let (_, error) = times.interval_s(1.0, None, None).unwrap_err();
        assert!(matches!(error, CsvError::TimeBackwards { .. }), "{error}");
    }

    #[test]
    fn what_kind_of_column_it_is() {
        let is = |cells: &[&str]| {
            let column = column(cells.iter().map(|&cell| cell.to_owned()));
            (column.counts(), column.only_rises())
        };
        assert_eq!(is(&["0", "1", "2", "3"]), (true, true));
        assert_eq!(is(&["-0.2", "0.0", "0.2", "0.4"]), (false, true));
        assert_eq!(is(&["0", "0", "0", "1", "1"]), (false, false));
        assert_eq!(is(&["0.1", "-0.2", "0.3"]), (false, false));
    }
}
