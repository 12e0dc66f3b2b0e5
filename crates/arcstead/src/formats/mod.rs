//! Capture files: found, told apart and read; and SigMF written.
//!
//! A capture file holds one or more captures, each one triggered record of all channels on one clock. A file
//! is opened once ([`open_captures`]), which reads what describes it but no samples, so that all captures are
//! known by name before the first is read; each is then read by itself ([`CaptureFile::read`]), from any
//! thread, and only its own bytes are. A capture that cannot be read is an error of its own and leaves the
//! others alone.
//!
//! ```no_run
//! use arcstead::formats::{ReadSettings, find_captures, open_captures};
//! let found = find_captures(&["visit".into()])?;
//! for path in &found.files {
//!     let file = open_captures(path, &ReadSettings::default())?;
//!     for index in 0..file.capture_count() {
//!         let recorded = file.read(index)?;
//!         println!("{}: {} channels", recorded.name, recorded.capture.channel_count());
//!     }
//! }
//! # Ok::<(), arcstead::formats::FormatError>(())
//! ```
//!
//! | format | module | told by |
//! |---|---|---|
//! | SigMF 1.x | [`sigmf`] | ending `.sigmf-meta` or `.sigmf-data` (`.sigmf` archives are refused by name) |
//! | CSV | [`csv`] | ending `.csv` or `.tsv`; `.txt` when it holds lines of numbers |
//!
//! # Another format
//! A type that implements [`CaptureFormat`] in a module beside the two, and its line in [`FORMATS`]: nothing
//! else knows the formats.
//!
//! # What a file may not do
//! Only regular files are opened. No size or count that a file states is believed before the bytes are known
//! to be there. No name in a file may lead out of its folder. The greatest numbers are constants:
//! [`MAX_CHANNELS`], [`MAX_SAMPLES`], [`MIN_SAMPLE_RATE_HZ`], [`MAX_SAMPLE_RATE_HZ`].

mod capture_file;
pub mod csv;
mod error;
mod find_captures;
mod limits;
mod natural_order;
mod regular_file;
mod sample_rate;
pub mod sigmf;

pub use capture_file::{CaptureFile, CaptureFormat, FORMATS, ReadSettings, Recorded, open_captures};
pub use error::FormatError;
pub use find_captures::{FoundCaptures, SkipReason, Skipped, find_captures};
pub use limits::{MAX_CHANNELS, MAX_SAMPLE_RATE_HZ, MAX_SAMPLES, MIN_SAMPLE_RATE_HZ};
pub use natural_order::natural_order;
