//! What can be wrong with a CSV file.

use thiserror::Error;

/// What is wrong with a CSV file; the line stands in the error around it.
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
pub enum CsvError {
    /// The file is empty.
    #[error("the file is empty")]
    Empty,
    /// The file is UTF-16.
    #[error("the file is UTF-16; save it as UTF-8")]
    Utf16,
    /// A line has no end.
    #[error("the line is longer than {most} bytes")]
    LineTooLong {
        /// The limit.
        most: u64,
    },
    /// There are no rows of numbers at the beginning.
    #[error(
        "no table of numbers in the first {searched} bytes; expected rows of samples, one column a channel, \
         separated by `,` `;` or tab"
    )]
    NoTable {
        /// How far was searched.
        searched: usize,
    },
    /// A comma may be a decimal comma or a separator.
    #[error(
        "the comma in `{found}` could be a decimal comma or a separator; export with `;` or tab as separator, or with \
         decimal points"
    )]
    AmbiguousComma {
        /// The line.
        found: String,
    },
    /// Numbers have commas and points.
    #[error("`{found}` has a point and a comma; export without thousands separators")]
    PointAndComma {
        /// The cell.
        found: String,
    },
    /// A cell is no number.
    #[error("`{found}` in column {column}; expected a finite number with a decimal {decimal}{hint}")]
    Number {
        /// The cell.
        found: String,
        /// Column counted from 1.
        column: usize,
        /// `point` or `comma`.
        decimal: &'static str,
        /// What it may mean.
        hint: &'static str,
    },
    /// A cell is missing.
    #[error("column {column} is empty; expected a number in each of {expected} columns")]
    MissingCell {
        /// Column counted from 1.
        column: usize,
        /// Columns of the table.
        expected: usize,
    },
    /// A cell too many.
    #[error("`{found}` in column {column}, where the rows before have none")]
    ExtraCell {
        /// The cell.
        found: String,
        /// Column counted from 1.
        column: usize,
    },
    /// Samples go on after a blank line.
    #[error("rows go on after a blank line; expected one table without gaps")]
    Gap,
    /// A stated interval or rate is none.
    #[error("`{key}` is {found}; expected a positive number")]
    Interval {
        /// The key.
        key: String,
        /// What it says.
        found: String,
    },
    /// The header states two intervals.
    #[error("the header states sample intervals of {first_s:e} s and {second_s:e} s")]
    TwoIntervals {
        /// One, in seconds.
        first_s: f64,
        /// The other, in seconds.
        second_s: f64,
    },
    /// Header and time column disagree.
    #[error(
        "the header states a sample interval of {header_s:e} s, but the time column goes in steps of {column_s:e} s; \
         export every sample (a thinned waveform is not fit for timing), or correct the header"
    )]
    HeaderDisagrees {
        /// The interval stated, in seconds.
        header_s: f64,
        /// The interval of the time column, in seconds.
        column_s: f64,
    },
    /// The time column is not even.
    #[error(
        "the time column is not even: {found_s:e} s where {expected_s:e} s was expected; samples are missing, or \
         were not taken on one clock"
    )]
    UnevenTime {
        /// The time found, in seconds.
        found_s: f64,
        /// The time expected, in seconds.
        expected_s: f64,
    },
    /// The index column does not count.
    #[error("the index column goes from {before} to {found}; expected one more: rows are missing")]
    Index {
        /// Index of the row.
        found: f64,
        /// Index of the row before.
        before: f64,
    },
    /// The time column does not increase.
    #[error(
        "the time column does not increase from its first row ({first_s:e} s) to its last ({last_s:e} s)"
    )]
    TimeBackwards {
        /// First time in seconds.
        first_s: f64,
        /// Last time in seconds.
        last_s: f64,
    },
    /// Every time stands twice.
    #[error(
        "every time stands twice: these are envelope data (least and greatest), not samples; export the waveform"
    )]
    Envelope,
    /// The digits of the time column do not tell the interval.
    #[error(
        "the time column has too few digits to tell the sample interval ({interval_s:e} s, uncertain by \
         {uncertainty_s:e} s); export it with more digits, or put `sample_rate_gsps` under [recorder] in the site \
         file, or give `inspect` a --sample-rate"
    )]
    TooFewDigits {
        /// The interval, in seconds.
        interval_s: f64,
        /// By how much it may be wrong, in seconds.
        uncertainty_s: f64,
    },
    /// A segmented file lacks segments.
    #[error(
        "the header states {stated} segments of {rows} rows; this one has {found} rows: the file was cut short"
    )]
    SegmentCut {
        /// Segments stated.
        stated: u64,
        /// Rows of each, as stated.
        rows: u64,
        /// Rows there are.
        found: u64,
    },
    /// A segmented file has more rows than stated.
    #[error("the header states {stated} segments of {rows} rows, but rows go on after them")]
    SegmentsGoOn {
        /// Segments stated.
        stated: u64,
        /// Rows of each, as stated.
        rows: u64,
    },
    /// There is a time or index column and nothing else.
    #[error("there is a time column but no column of samples")]
    NoChannel,
}
