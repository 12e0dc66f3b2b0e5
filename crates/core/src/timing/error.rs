//! What can be wrong with a timing plan, or with a capture given to one.

use thiserror::Error;

use crate::bandpass::BandPassError;

/// Why there is no timing.
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
pub enum TimingError {
    /// The band or the order of the filter cannot be had.
    #[error(transparent)]
    BandPass(#[from] BandPassError),
    /// The sample rate is not a positive finite number.
    #[error("a sample rate of {found_hz} Hz; expected a positive finite number")]
    SampleRate {
        /// The rate given, in hertz.
        found_hz: f64,
    },
    /// There are no channels.
    #[error("no channels to time; expected at least one")]
    NoChannels,
    /// The captures are shorter than the gate with some noise before it.
    #[error(
        "captures of {found} samples are too short to time a pulse in this band: expected at least {least}; record longer, or widen the band"
    )]
    TooShort {
        /// Samples of a channel.
        found: usize,
        /// The least number that can be timed.
        least: usize,
    },
    /// The matrix of greatest delays does not fit the channels.
    #[error(
        "greatest delays of {found_rows} x {found_columns} channels where {expected} are timed; expected one row and one column for each channel"
    )]
    MaxDelayShape {
        /// Rows given.
        found_rows: usize,
        /// Columns given.
        found_columns: usize,
        /// Channels timed.
        expected: usize,
    },
    /// A greatest delay is negative or not a number.
    #[error(
        "a greatest delay of {found_s} s between channels {a} and {b}; expected zero or more (infinite: no limit)"
    )]
    MaxDelay {
        /// First channel, counted from 1.
        a: usize,
        /// Second channel, counted from 1.
        b: usize,
        /// The value given, in seconds.
        found_s: f64,
    },
    /// An option is out of its range.
    #[error("the option `{name}` is {found}; expected {expected}")]
    Option {
        /// Name of the field of [`TimingOptions`](crate::TimingOptions).
        name: &'static str,
        /// The value given.
        found: f64,
        /// What it may be.
        expected: &'static str,
    },
    /// A capture does not have the shape the plan was made for.
    #[error(
        "a capture of {found_channels} channels x {found_samples} samples at {found_rate_hz} Hz given to a plan for {expected_channels} x {expected_samples} at {expected_rate_hz} Hz; make a plan for this shape"
    )]
    Shape {
        /// Channels of the capture.
        found_channels: usize,
        /// Samples of each of its channels.
        found_samples: usize,
        /// Its sample rate in hertz.
        found_rate_hz: f64,
        /// Channels planned.
        expected_channels: usize,
        /// Samples planned.
        expected_samples: usize,
        /// Sample rate planned, in hertz.
        expected_rate_hz: f64,
    },
}
