//! What can go wrong with a capture file.

use std::path::PathBuf;

use arcstead_core::CaptureError;
use thiserror::Error;

use super::csv::CsvError;
use super::limits::{MAX_CHANNELS, MAX_SAMPLE_RATE_HZ, MAX_SAMPLES, MIN_SAMPLE_RATE_HZ};
use super::sigmf::SigmfError;

/// Why a capture file, or one capture of it, cannot be read.
///
/// The text of an error names the place; where there is a cause ([`std::error::Error::source`]) it says what
/// is wrong there, so the chain joined by `: ` is the message for a person.
#[derive(Debug, Error)]
#[non_exhaustive]
pub enum FormatError {
    /// There is no such file or folder, or it cannot be read.
    #[error("{path} cannot be read")]
    Io {
        /// The file or folder.
        path: PathBuf,
        /// What the system said.
        source: std::io::Error,
    },
    /// It is a device, a pipe or a socket, or a folder where a file was needed.
    #[error("{path} is not a regular file; captures are read from files and folders only")]
    NotAFile {
        /// What was given.
        path: PathBuf,
    },
    /// A folder holds no capture.
    #[error(
        "the folder {path} holds no capture ({skipped} other entries were passed over; folders in it are not searched)"
    )]
    NoCaptures {
        /// The folder.
        path: PathBuf,
        /// How many entries it has that are no captures.
        skipped: usize,
    },
    /// No format is known for the file.
    #[error("{path} is no capture file of a known format; known are {known}")]
    UnknownFormat {
        /// The file.
        path: PathBuf,
        /// Names of the known formats.
        known: String,
    },
    /// The file holds fewer captures than that.
    #[error("{path} holds {count} captures; there is none with index {index}")]
    NoSuchCapture {
        /// The file.
        path: PathBuf,
        /// Index asked for, counted from 0.
        index: usize,
        /// Captures in the file.
        count: usize,
    },
    /// More channels than a capture may have.
    #[error(
        "{path} has {found} channels; at most {MAX_CHANNELS} are read (are its rows and columns swapped?)"
    )]
    Channels {
        /// The file.
        path: PathBuf,
        /// Channels found.
        found: u64,
    },
    /// More samples than a capture may have.
    #[error("{name} holds {found} samples or more; at most {MAX_SAMPLES} are read in one capture")]
    Samples {
        /// Name of the capture.
        name: String,
        /// Samples of all channels.
        found: u64,
    },
    /// Neither the file nor the site gives a sample rate.
    #[error(
        "{path} gives no sample rate; put `sample_rate_gsps` under [recorder] in the site file, or give `inspect` a \
         --sample-rate"
    )]
    NoSampleRate {
        /// The file.
        path: PathBuf,
    },
    /// A sample rate out of the range that is believed.
    #[error(
        "{path} gives a sample rate of {found_hz} Hz; expected {MIN_SAMPLE_RATE_HZ:e} to {MAX_SAMPLE_RATE_HZ:e} Hz"
    )]
    SampleRate {
        /// The file.
        path: PathBuf,
        /// The rate found, in hertz.
        found_hz: f64,
    },
    /// The file and the site file give different sample rates.
    #[error(
        "{path} was sampled at {} GS/s, but `sample_rate_gsps` of the site file (--sample-rate of `inspect`) says {} GS/s; \
         correct it, or leave it out: this file carries its own rate",
        file_hz / 1e9,
        site_hz / 1e9
    )]
    RateDisagrees {
        /// The file.
        path: PathBuf,
        /// The file's rate in hertz.
        file_hz: f64,
        /// The site's rate in hertz.
        site_hz: f64,
    },
    /// The samples do not make a capture.
    #[error("{name}")]
    Capture {
        /// Name of the capture.
        name: String,
        /// Why.
        source: CaptureError,
    },
    /// A SigMF recording is not as the standard says.
    #[error("{path}")]
    Sigmf {
        /// The file.
        path: PathBuf,
        /// What is wrong.
        source: SigmfError,
    },
    /// A CSV file is not readable as one capture.
    #[error("{path}{}", line.map_or(String::new(), |line| format!(", line {line}")))]
    Csv {
        /// The file.
        path: PathBuf,
        /// Line counted from 1, where one is at fault.
        line: Option<u64>,
        /// What is wrong.
        source: CsvError,
    },
}

impl FormatError {
    /// The error and its causes in one line, as documents give it for a rejected capture.
    #[must_use]
    pub fn message(&self) -> String {
        crate::error_chain::told(self)
    }
}
