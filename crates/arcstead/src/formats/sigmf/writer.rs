//! Writing captures as a SigMF recording.

use std::io::{BufWriter, Write};
use std::path::{Path, PathBuf};

use arcstead_core::Capture;
use serde_json::{Map, Value, json};
use tempfile::NamedTempFile;
use thiserror::Error;

use super::metadata::{EXTENSION, VOLTS_PER_COUNT};
use crate::CaptureTime;
use crate::formats::limits::{MAX_CHANNELS, MAX_SAMPLE_RATE_HZ, MIN_SAMPLE_RATE_HZ};
use crate::formats::regular_file::file_name;
use crate::whole_file::temporary_beside;

/// How samples lie in the file; little-endian.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum StoredAs {
    /// 8-bit integers, `ri8`.
    I8,
    /// 16-bit integers, `ri16_le`.
    I16,
    /// 32-bit floats, `rf32_le`: exactly the samples of the capture.
    F32,
}

/// What all captures of a recording share.
#[derive(Debug, Clone, PartialEq)]
pub struct WriterSettings {
    /// Number of channels.
    pub channel_count: usize,
    /// Sample rate in hertz.
    pub sample_rate_hz: f64,
    /// How samples are stored.
    pub stored_as: StoredAs,
    /// Volts per count of each channel, for integers: samples are divided by it and rounded, and it is
    /// written beside them (the extension described in [`super`]). Without it samples are counts already.
    pub volts_per_count: Option<Vec<f64>>,
    /// `core:description`, free text.
    pub description: Option<String>,
}

/// Why a recording cannot be written.
#[derive(Debug, Error)]
#[non_exhaustive]
pub enum SigmfWriteError {
    /// The system refused.
    #[error("{path} cannot be written")]
    Io {
        /// The file.
        path: PathBuf,
        /// What the system said.
        source: std::io::Error,
    },
    /// The path has no file name.
    #[error("{path} names no file; expected NAME or NAME.sigmf-meta")]
    Name {
        /// The path.
        path: PathBuf,
    },
    /// The number of channels or the rate cannot be read back.
    #[error(
        "{channels} channels at {rate_hz} Hz; expected 1 to {MAX_CHANNELS} channels at {MIN_SAMPLE_RATE_HZ:e} to \
         {MAX_SAMPLE_RATE_HZ:e} Hz"
    )]
    Settings {
        /// Channels.
        channels: usize,
        /// Rate in hertz.
        rate_hz: f64,
    },
    /// The scales do not fit.
    #[error(
        "volts per count goes with integer samples, one positive finite number for each of {channels} channels"
    )]
    VoltsPerCount {
        /// Channels.
        channels: usize,
    },
    /// A capture does not belong to this recording.
    #[error(
        "a capture of {found_channels} channels at {found_hz} Hz in a recording of {channels} channels at {rate_hz} Hz"
    )]
    Other {
        /// Channels of the capture.
        found_channels: usize,
        /// Its rate in hertz.
        found_hz: f64,
        /// Channels of the recording.
        channels: usize,
        /// Rate of the recording in hertz.
        rate_hz: f64,
    },
    /// An integer cannot hold a sample.
    #[error("sample {sample} of channel {channel} is {counts} counts; expected {least} to {most}")]
    Counts {
        /// Channel counted from 1.
        channel: usize,
        /// Sample counted from 0.
        sample: usize,
        /// Counts after rounding.
        counts: f64,
        /// Least count of the integer.
        least: f64,
        /// Greatest count of the integer.
        most: f64,
    },
}

/// Writes captures, one `captures` segment each, to `NAME.sigmf-data` and `NAME.sigmf-meta`.
///
/// Both grow under temporary names in the same folder and appear when [`Self::finish`] succeeds, the data
/// first: a recording is there whole or not at all. An older recording of the name is replaced: its meta file
/// goes first, so that no moment pairs old and new. A writer that is dropped leaves nothing behind.
///
/// ```
/// use arcstead_core::Capture;
/// use arcstead::formats::sigmf::{SigmfWriter, StoredAs, WriterSettings};
/// # let folder = tempfile::tempdir()?;
/// # let path = folder.path().join("visit");
/// let settings = WriterSettings {
///     channel_count: 2,
///     sample_rate_hz: 5e9,
///     stored_as: StoredAs::I8,
///     volts_per_count: Some(vec![0.004, 0.004]),
///     description: None,
/// };
/// let mut writer = SigmfWriter::create(&path, settings)?;
/// writer.write(&Capture::new(5e9, vec![vec![0.0, 0.1], vec![0.0, -0.2]])?, None)?;
/// let meta = writer.finish()?;
/// # assert!(meta.ends_with("visit.sigmf-meta"));
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
#[derive(Debug)]
pub struct SigmfWriter {
    meta: PathBuf,
    data: PathBuf,
    settings: WriterSettings,
    file: BufWriter<NamedTempFile>,
    segments: Vec<Value>,
    samples_written: u64,
    /// The bytes of one capture, kept between captures.
    bytes: Vec<u8>,
}

impl SigmfWriter {
    /// Begins a recording called `path`, given without an ending or as `NAME.sigmf-meta`; the folder must
    /// exist.
    ///
    /// # Errors
    /// [`SigmfWriteError::Name`], [`SigmfWriteError::Settings`], [`SigmfWriteError::VoltsPerCount`] for what
    /// could not be read back, [`SigmfWriteError::Io`] when the folder cannot be written to.
    pub fn create(path: &Path, settings: WriterSettings) -> Result<Self, SigmfWriteError> {
        let name = path.file_name().map(|_| file_name(path)).unwrap_or_default();
        let name = name.strip_suffix(".sigmf-meta").unwrap_or(&name);
        if name.is_empty() {
            return Err(SigmfWriteError::Name { path: path.to_owned() });
        }
        let (channels, rate_hz) = (settings.channel_count, settings.sample_rate_hz);
        if !(1..=MAX_CHANNELS).contains(&channels)
            || !(MIN_SAMPLE_RATE_HZ..=MAX_SAMPLE_RATE_HZ).contains(&rate_hz)
        {
            return Err(SigmfWriteError::Settings { channels, rate_hz });
        }
        let scales_fit = settings.volts_per_count.as_ref().is_none_or(|scales| {
            scales.len() == channels
                && settings.stored_as != StoredAs::F32
                && scales.iter().all(|scale| *scale > 0.0 && scale.is_finite())
        });
        if !scales_fit {
            return Err(SigmfWriteError::VoltsPerCount { channels });
        }
        let (meta, data) = (
            path.with_file_name(format!("{name}.sigmf-meta")),
            path.with_file_name(format!("{name}.sigmf-data")),
        );
        let file = BufWriter::new(temporary(&data)?);
        Ok(Self { meta, data, settings, file, segments: Vec::new(), samples_written: 0, bytes: Vec::new() })
    }

    /// Adds a capture, taken at `time`.
    ///
    /// # Errors
    /// [`SigmfWriteError::Other`] for another number of channels or another rate, [`SigmfWriteError::Counts`]
    /// for a sample that its integer cannot hold (nothing of the capture is written then),
    /// [`SigmfWriteError::Io`].
    pub fn write(&mut self, capture: &Capture, time: Option<CaptureTime>) -> Result<(), SigmfWriteError> {
        let (channels, rate_hz) = (self.settings.channel_count, self.settings.sample_rate_hz);
        if capture.channel_count() != channels || capture.sample_rate_hz().to_bits() != rate_hz.to_bits() {
            return Err(SigmfWriteError::Other {
                found_channels: capture.channel_count(),
                found_hz: capture.sample_rate_hz(),
                channels,
                rate_hz,
            });
        }
        self.encode(capture)?;
        let data = &self.data;
        self.file.write_all(&self.bytes).map_err(|source| write_error(data, source))?;
        let mut segment = Map::from_iter([("core:sample_start".to_owned(), json!(self.samples_written))]);
        if let Some(time) = time {
            segment.insert("core:datetime".into(), json!(time.to_string()));
        }
        self.segments.push(Value::Object(segment));
        self.samples_written += capture.sample_count() as u64;
        Ok(())
    }

    /// Ends the recording and makes it appear. Gives the path of the meta file.
    ///
    /// # Errors
    /// [`SigmfWriteError::Io`]: nothing is left then but, when the very last step failed, a data file without
    /// meta.
    pub fn finish(mut self) -> Result<PathBuf, SigmfWriteError> {
        let (meta, data) = (self.meta.clone(), self.data.clone());
        let mut meta_file = temporary(&meta)?;
        let mut text = serde_json::to_string_pretty(&self.document())
            .map_err(|error| write_error(&meta, error.into()))?;
        text.push('\n');
        meta_file.write_all(text.as_bytes()).map_err(|source| write_error(&meta, source))?;
        self.file.flush().map_err(|source| write_error(&data, source))?;
        let (data_file, _) = self.file.into_parts();
        match std::fs::remove_file(&meta) {
            Err(error) if error.kind() != std::io::ErrorKind::NotFound => {
                return Err(write_error(&meta, error));
            }
            _ => {}
        }
        data_file.persist(&data).map_err(|error| write_error(&data, error.error))?;
        meta_file.persist(&meta).map_err(|error| write_error(&meta, error.error))?;
        Ok(meta)
    }

    /// The contents of the meta file.
    fn document(&self) -> Value {
        let datatype = match self.settings.stored_as {
            StoredAs::I8 => "ri8",
            StoredAs::I16 => "ri16_le",
            StoredAs::F32 => "rf32_le",
        };
        let mut global = Map::from_iter([
            ("core:datatype".to_owned(), json!(datatype)),
            ("core:version".to_owned(), json!("1.2.5")),
            ("core:sample_rate".to_owned(), json!(self.settings.sample_rate_hz)),
            ("core:num_channels".to_owned(), json!(self.settings.channel_count)),
            ("core:recorder".to_owned(), json!(concat!("arcstead ", env!("CARGO_PKG_VERSION")))),
        ]);
        if let Some(description) = &self.settings.description {
            global.insert("core:description".into(), json!(description));
        }
        if let Some(scales) = &self.settings.volts_per_count {
            let extension = json!([{"name": EXTENSION, "version": "1.0.0", "optional": true}]);
            global.insert("core:extensions".into(), extension);
            global.insert(VOLTS_PER_COUNT.into(), json!(scales));
        }
        json!({"global": global, "captures": self.segments, "annotations": []})
    }

    /// Interleaves the samples of a capture into `self.bytes`.
    fn encode(&mut self, capture: &Capture) -> Result<(), SigmfWriteError> {
        let channels = capture.channels().collect::<Vec<_>>();
        let width = match self.settings.stored_as {
            StoredAs::I8 => 1,
            StoredAs::I16 => 2,
            StoredAs::F32 => 4,
        };
        self.bytes.clear();
        self.bytes.reserve(width * channels.len() * capture.sample_count());
        let scales = self.settings.volts_per_count.as_deref();
        for sample in 0..capture.sample_count() {
            for (channel, samples) in channels.iter().enumerate() {
                let value = samples[sample];
                let scale = scales.map_or(1.0, |scales| scales[channel]);
                let counts = |least: f64, most: f64| {
                    let counts = (f64::from(value) / scale).round();
                    if (least..=most).contains(&counts) {
                        Ok(counts)
                    } else {
                        Err(SigmfWriteError::Counts { channel: channel + 1, sample, counts, least, most })
                    }
                };
                match self.settings.stored_as {
                    StoredAs::I8 => {
                        let counts = counts(i8::MIN.into(), i8::MAX.into())?;
                        self.bytes.extend((counts as i8).to_le_bytes());
                    }
                    StoredAs::I16 => {
                        let counts = counts(i16::MIN.into(), i16::MAX.into())?;
                        self.bytes.extend((counts as i16).to_le_bytes());
                    }
                    StoredAs::F32 => self.bytes.extend(value.to_le_bytes()),
                }
            }
        }
        Ok(())
    }
}

fn write_error(path: &Path, source: std::io::Error) -> SigmfWriteError {
    SigmfWriteError::Io { path: path.to_owned(), source }
}

fn temporary(path: &Path) -> Result<NamedTempFile, SigmfWriteError> {
    temporary_beside(path).map_err(|source| write_error(path, source))
}
