//! Why a visit cannot be simulated.

use thiserror::Error;

/// Why settings and site do not make a visit.
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
pub enum SimError {
    /// The site has no antenna.
    #[error("the site has no antennas; a visit needs at least one")]
    NoAntennas,
    /// The settings name no source.
    #[error("no source is given; name at least one source with its position")]
    NoSources,
    /// The settings ask for no capture.
    #[error("no captures are asked for; expected one or more")]
    NoCaptures,
    /// A number is not finite or out of range.
    #[error("{name} is {found}; expected {expected}")]
    Setting {
        /// The setting, as it is called in the settings.
        name: &'static str,
        /// The value found.
        found: f64,
        /// What would be in range, with its unit.
        expected: &'static str,
    },
    /// A number of one source is not finite or out of range.
    #[error("{name} of source {index} (counted from 0) is {found}; expected {expected}")]
    Source {
        /// Index of the source.
        index: usize,
        /// The setting, as it is called in the settings.
        name: &'static str,
        /// The value found.
        found: f64,
        /// What would be in range, with its unit.
        expected: &'static str,
    },
    /// The band does not lie between zero and half the sample rate.
    #[error(
        "the band {low_hz} Hz to {high_hz} Hz does not lie in order between zero and {nyquist_hz} Hz, half the sample \
         rate; lower the band or raise the sample rate"
    )]
    Band {
        /// Lower edge found, in hertz.
        low_hz: f64,
        /// Upper edge found, in hertz.
        high_hz: f64,
        /// Half the sample rate, in hertz.
        nyquist_hz: f64,
    },
    /// The recorder resolves a number of bits that is not simulated.
    #[error("a recorder of {found} bits; expected 8 to 16")]
    Bits {
        /// The number found.
        found: u8,
    },
    /// The record holds too few or too many samples.
    #[error("a record of {found} samples a channel; expected {least} to {most}")]
    SampleCount {
        /// The number found.
        found: usize,
        /// The fewest.
        least: usize,
        /// The most.
        most: usize,
    },
    /// There is not one nominal delay for each antenna.
    #[error("{found} nominal delays for {expected} antennas; give one for each antenna, or none at all")]
    DelayCount {
        /// Delays found.
        found: usize,
        /// Antennas of the site.
        expected: usize,
    },
    /// The record ends before the pulse of a source has passed all antennas.
    #[error(
        "a record of {found_s} s cannot hold source {source_index} (counted from 0): its pulse, a third into the \
         record, has passed all antennas only after {needed_s} s; take more samples or equal cables"
    )]
    RecordTooShort {
        /// Index of the source.
        source_index: usize,
        /// Length of the record in seconds.
        found_s: f64,
        /// Length that would do, in seconds.
        needed_s: f64,
    },
    /// A source is inside something radio does not pass.
    #[error(
        "source {source_index} (counted from 0) is inside the obstacle {obstacle:?}, and no antenna can hear it"
    )]
    SourceInside {
        /// Index of the source.
        source_index: usize,
        /// Name of the obstacle.
        obstacle: String,
    },
    /// An antenna is inside something radio does not pass.
    #[error("antenna {antenna:?} is inside the obstacle {obstacle:?} and hears nothing")]
    AntennaInside {
        /// Name of the antenna.
        antenna: String,
        /// Name of the obstacle.
        obstacle: String,
    },
    /// A source is so near to an antenna that spreading by one over the distance does not hold.
    #[error(
        "source {source_index} (counted from 0) is {found_m} m from antenna {antenna:?}; expected at least {least_m} m"
    )]
    TooNear {
        /// Index of the source.
        source_index: usize,
        /// Name of the antenna.
        antenna: String,
        /// Their distance in metres.
        found_m: f64,
        /// The least distance simulated, in metres.
        least_m: f64,
    },
    /// A source stands straight above or below an antenna with an obstacle between, and no vertical plane tells
    /// over which edge the pulse goes.
    #[error(
        "a source at {source_m:?} m is straight above or below antenna {antenna:?} with an obstacle between; move one \
         of them sideways"
    )]
    NoWay {
        /// Position of the source in metres.
        source_m: [f64; 3],
        /// Name of the antenna.
        antenna: String,
    },
    /// There is not one timing sigma for each antenna, or one is not a finite number of zero or more.
    #[error(
        "{found} timing sigmas for {expected} antennas, or one of them negative or not finite; give one sigma of zero \
         or more for each antenna"
    )]
    TimingSigma {
        /// Sigmas found.
        found: usize,
        /// Antennas of the site.
        expected: usize,
    },
}
