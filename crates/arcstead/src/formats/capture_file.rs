//! What a capture format is, the list of them, and opening a file.

use std::fmt;
use std::path::Path;

use arcstead_core::Capture;

use super::csv::Csv;
use super::error::FormatError;
use super::regular_file::RegularFile;
use super::sigmf::Sigmf;
use crate::CaptureTime;

/// The formats, asked in this order. Another one is added here and nowhere else.
pub const FORMATS: &[&dyn CaptureFormat] = &[&Sigmf, &Csv];

/// How many bytes of a file a format sees to recognise it.
const FIRST_BYTES: usize = 4096;

/// What the site knows that a file may lack.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct ReadSettings {
    /// Sample rate of the recorder in hertz: taken for files that carry none, compared with files that do
    /// (they must agree within 0.1 %). Of complex samples it is the rate of the complex samples.
    pub sample_rate_hz: Option<f64>,
}

/// One capture as it was read.
#[derive(Debug, Clone, PartialEq)]
pub struct Recorded {
    /// Name of the file, and in a file of several captures `#` and the number of this one, counted from 1.
    pub name: String,
    /// When it was taken, where the file says so beyond doubt (with its zone).
    pub time: Option<CaptureTime>,
    /// The samples.
    pub capture: Capture,
    /// True when only the delays of the envelope are those of the radio wave, not the delays of single
    /// oscillations: so it is after a receiver that moved the band down (see [`super::sigmf`]). Correlation
    /// must then be of envelopes.
    pub envelope_only: bool,
}

/// A format of capture files.
pub trait CaptureFormat: fmt::Debug + Sync {
    /// What the format is called.
    fn name(&self) -> &'static str;

    /// Whether the regular file at `path`, which begins with `first_bytes` (4096 at most), is of this format.
    fn recognises(&self, path: &Path, first_bytes: &[u8]) -> bool;

    /// Opens a file of this format: reads what describes it, and no samples.
    ///
    /// # Errors
    /// [`FormatError`] when nothing of the file can be read.
    fn open(&self, path: &Path, settings: &ReadSettings) -> Result<Box<dyn CaptureFile>, FormatError>;
}

/// An opened file of one or more captures. Captures may be read from several threads at once.
pub trait CaptureFile: fmt::Debug + Send + Sync {
    /// How many captures it holds, damaged ones included; one or more.
    fn capture_count(&self) -> usize;

    /// Name of the capture with this index (counted from 0), as [`Recorded::name`].
    fn capture_name(&self, index: usize) -> String;

    /// Reads one capture, and only its bytes.
    ///
    /// # Errors
    /// [`FormatError`] when this capture cannot be read; the others may still be fine.
    fn read(&self, index: usize) -> Result<Recorded, FormatError>;
}

/// Opens a capture file of any known format.
///
/// # Errors
/// [`FormatError::Io`], [`FormatError::NotAFile`] for what is no readable regular file (nothing else is
/// opened), [`FormatError::UnknownFormat`], or what the format has to say.
pub fn open_captures(path: &Path, settings: &ReadSettings) -> Result<Box<dyn CaptureFile>, FormatError> {
    format_of(path)?
        .ok_or_else(|| FormatError::UnknownFormat {
            path: path.to_owned(),
            known: FORMATS.iter().map(|format| format.name()).collect::<Vec<_>>().join(", "),
        })?
        .open(path, settings)
}

/// The format of the regular file at `path`, if it is a known one.
pub(super) fn format_of(path: &Path) -> Result<Option<&'static dyn CaptureFormat>, FormatError> {
    let first_bytes = RegularFile::find(path)?.first_bytes(FIRST_BYTES)?;
    Ok(FORMATS.iter().find(|format| format.recognises(path, &first_bytes)).copied())
}

/// The name of capture `index` in a file of `count`.
pub(super) fn capture_name(file_name: &str, index: usize, count: usize) -> String {
    if count == 1 { file_name.to_owned() } else { format!("{file_name}#{}", index + 1) }
}

/// Whether the file name ends in `ending`, in small or capital letters.
pub(super) fn has_ending(path: &Path, ending: &str) -> bool {
    path.file_name().and_then(|name| name.to_str()).is_some_and(|name| {
        // Bytes, because the cut might fall into a letter; a name that is the ending alone is a hidden file.
        let (name, ending) = (name.as_bytes(), ending.as_bytes());
        name.len() > ending.len() && name[name.len() - ending.len()..].eq_ignore_ascii_case(ending)
    })
}
