//! Reading a SigMF recording.

use std::fmt;
use std::path::{Path, PathBuf};
use std::sync::{Mutex, PoisonError};

use arcstead_core::Capture;
use rustfft::FftPlanner;

use super::error::SigmfError;
use super::metadata::{ChannelCount, Metadata, Segment};
use super::real_equivalent::RealEquivalent;
use crate::formats::capture_file::{
    CaptureFile, CaptureFormat, ReadSettings, Recorded, capture_name, has_ending,
};
use crate::formats::error::FormatError;
use crate::formats::limits::MAX_SAMPLES;
use crate::formats::regular_file::{FileReader, RegularFile, file_name, io_error};
use crate::formats::sample_rate::{agreed_rate_hz, same_rate};

const META_ENDING: &str = ".sigmf-meta";
pub(in crate::formats) const DATA_ENDING: &str = ".sigmf-data";
const ARCHIVE_ENDING: &str = ".sigmf";

/// Longest meta file that is read, in bytes: room for some hundred thousand captures.
const MAX_META_BYTES: u64 = 1 << 26;

/// Bytes decoded at a time, about.
const BLOCK_BYTES: usize = 1 << 18;

/// The format SigMF 1.x.
#[derive(Debug, Clone, Copy)]
pub struct Sigmf;

impl CaptureFormat for Sigmf {
    fn name(&self) -> &'static str {
        "SigMF (.sigmf-meta with .sigmf-data)"
    }

    fn recognises(&self, path: &Path, _: &[u8]) -> bool {
        [META_ENDING, DATA_ENDING, ARCHIVE_ENDING].iter().any(|ending| has_ending(path, ending))
    }

    fn open(&self, path: &Path, settings: &ReadSettings) -> Result<Box<dyn CaptureFile>, FormatError> {
        let wrong = |source| FormatError::Sigmf { path: path.to_owned(), source };
        if has_ending(path, ARCHIVE_ENDING) {
            return Err(wrong(SigmfError::Archive));
        }
        if has_ending(path, DATA_ENDING) {
            let meta = path.with_extension("sigmf-meta");
            if !meta.is_file() {
                return Err(wrong(SigmfError::NoMeta { expected: file_name(&meta) }));
            }
            return self.open(&meta, settings);
        }
        let meta_file = RegularFile::find(path)?;
        if meta_file.len() > MAX_META_BYTES {
            return Err(wrong(SigmfError::MetaTooLong { found: meta_file.len(), most: MAX_META_BYTES }));
        }
        let mut text = vec![0; usize::try_from(meta_file.len()).unwrap_or(0)];
        meta_file.open_at(0)?.fill(&mut text)?;
        let metadata = Metadata::parse(&text).map_err(wrong)?;
        let channel_count = match metadata.channel_count {
            ChannelCount::Read(count) => count,
            ChannelCount::TooMany(found) => {
                return Err(FormatError::Channels { path: path.to_owned(), found });
            }
        };
        let sample_rate_hz = agreed_rate_hz(path, metadata.sample_rate_hz, settings.sample_rate_hz)?;
        let data = RegularFile::find(&data_path(path, metadata.dataset.as_deref())?)?;
        let places = places(&metadata, channel_count, data.len()).map_err(wrong)?;
        Ok(Box::new(Recording {
            meta: path.to_owned(),
            data,
            metadata,
            channel_count,
            sample_rate_hz,
            places,
            planner: Mutex::new(FftPlanner::new()),
        }))
    }
}

/// Where the samples are: beside the meta file, nowhere else.
fn data_path(meta: &Path, dataset: Option<&str>) -> Result<PathBuf, FormatError> {
    let Some(name) = dataset else { return Ok(meta.with_extension("sigmf-data")) };
    let outside = || FormatError::Sigmf {
        path: meta.to_owned(),
        source: SigmfError::OutsideFolder { found: format!("{name:?}") },
    };
    // Both kinds of separators, and the colon of drives and streams, on every system.
    if name.is_empty() || name == "." || name == ".." || name.contains(['/', '\\', ':', '\0']) {
        return Err(outside());
    }
    let path = meta.with_file_name(name);
    // The name was chosen by whoever made the file, and so might a link of that name have been.
    let real = std::fs::canonicalize(&path).map_err(|source| io_error(&path, source))?;
    let folder = meta.parent().filter(|parent| !parent.as_os_str().is_empty()).unwrap_or(Path::new("."));
    let folder = std::fs::canonicalize(folder).map_err(|source| io_error(folder, source))?;
    if real.parent() == Some(&folder) { Ok(path) } else { Err(outside()) }
}

/// Where the samples of a capture begin, and the first byte after them.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
struct Place {
    begin: u64,
    end: u64,
}

/// The places of all segments in a file of `len` bytes. Headers lie before the samples of their segments and
/// move all that follows.
fn places(metadata: &Metadata, channel_count: usize, len: u64) -> Result<Vec<Place>, SigmfError> {
    let frame = frame_bytes(metadata, channel_count);
    let mut headers = 0_u64;
    let mut places: Vec<Place> = Vec::with_capacity(metadata.segments.len());
    for (index, segment) in metadata.segments.iter().enumerate() {
        let overflow = || SigmfError::Overflow { segment: index + 1 };
        // The metadata's reader has seen to start >= offset.
        let before = (segment.start - metadata.offset)
            .checked_mul(frame)
            .and_then(|samples| samples.checked_add(headers))
            .ok_or_else(overflow)?;
        let begin = before.checked_add(segment.header_bytes).ok_or_else(overflow)?;
        headers = headers.checked_add(segment.header_bytes).ok_or_else(overflow)?;
        if let Some(last) = places.last_mut() {
            last.end = before;
        }
        places.push(Place { begin, end: len.saturating_sub(metadata.trailing_bytes) });
    }
    Ok(places)
}

/// Bytes of one sample of all channels.
fn frame_bytes(metadata: &Metadata, channel_count: usize) -> u64 {
    // At most 16 bytes times MAX_CHANNELS.
    (metadata.datatype.bytes() * channel_count) as u64
}

/// An opened recording.
struct Recording {
    meta: PathBuf,
    data: RegularFile,
    metadata: Metadata,
    channel_count: usize,
    sample_rate_hz: f64,
    places: Vec<Place>,
    /// Keeps the plans of complex recordings; captures are mostly of one length.
    planner: Mutex<FftPlanner<f64>>,
}

impl fmt::Debug for Recording {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Recording").field("meta", &self.meta).finish_non_exhaustive()
    }
}

impl CaptureFile for Recording {
    fn capture_count(&self) -> usize {
        self.places.len()
    }

    fn capture_name(&self, index: usize) -> String {
        capture_name(&file_name(&self.meta), index, self.places.len())
    }

    fn read(&self, index: usize) -> Result<Recorded, FormatError> {
        let (Some(segment), Some(&place)) = (self.metadata.segments.get(index), self.places.get(index))
        else {
            return Err(FormatError::NoSuchCapture {
                path: self.meta.clone(),
                index,
                count: self.places.len(),
            });
        };
        let wrong = |source| FormatError::Sigmf { path: self.meta.clone(), source };
        let name = self.capture_name(index);
        let sample_count = self.sample_count(index, place).map_err(wrong)?;
        let found = sample_count.saturating_mul(self.channel_count as u64);
        let most = if self.metadata.datatype.complex { MAX_SAMPLES / 2 } else { MAX_SAMPLES };
        let sample_count = match usize::try_from(sample_count) {
            Ok(count) if found <= most as u64 => count,
            _ => return Err(FormatError::Samples { name, found }),
        };
        let time =
            segment.time.clone().map_err(|source| wrong(SigmfError::Time { segment: index + 1, source }))?;
        let mut reader = self.data.open_at(place.begin)?;
        let (capture, envelope_only) = if self.metadata.datatype.complex {
            (self.read_complex(&mut reader, sample_count)?, self.is_envelope_only(segment))
        } else {
            (self.read_real(&mut reader, sample_count)?, false)
        };
        let capture = capture.map_err(|source| FormatError::Capture { name: name.clone(), source })?;
        Ok(Recorded { name, time, capture, envelope_only })
    }
}

type Made = Result<Capture, arcstead_core::CaptureError>;

impl Recording {
    /// Samples per channel at a place, once it is certain that the file holds them.
    fn sample_count(&self, index: usize, place: Place) -> Result<u64, SigmfError> {
        let frame = frame_bytes(&self.metadata, self.channel_count);
        let dataset = || file_name(self.data.path());
        let found = self.data.len().saturating_sub(self.metadata.trailing_bytes);
        let last = index + 1 == self.places.len();
        if place.begin > found || place.end > found {
            return Err(SigmfError::PastEnd { dataset: dataset(), end: place.end.max(place.begin), found });
        }
        // Of all but the last place the length is a multiple of the frame; end < begin cannot be: sorted
        // starts.
        let bytes = place.end.saturating_sub(place.begin);
        if last && !bytes.is_multiple_of(frame) {
            return Err(SigmfError::PartialFrame { dataset: dataset(), over: bytes % frame, frame });
        }
        if bytes < frame { Err(SigmfError::NoSamples) } else { Ok(bytes / frame) }
    }

    /// See [`super`]: the oscillations are right only when they were moved by what they are moved back.
    fn is_envelope_only(&self, segment: &Segment) -> bool {
        !segment.frequency_hz.is_some_and(|frequency_hz| same_rate(frequency_hz, self.sample_rate_hz / 2.0))
    }

    fn volts_per_count(&self, channel: usize) -> f64 {
        // The metadata's reader has seen to one per channel.
        self.metadata.volts_per_count.as_ref().map_or(1.0, |volts| volts[channel])
    }

    fn read_real(&self, reader: &mut FileReader, sample_count: usize) -> Result<Made, FormatError> {
        let mut samples = vec![0_f32; sample_count * self.channel_count];
        let scales = (0..self.channel_count).map(|channel| self.volts_per_count(channel)).collect::<Vec<_>>();
        self.blocks(reader, sample_count, |at, block| {
            let (mut channel, mut sample) = (0, at);
            self.metadata.datatype.decode(block, |number| {
                samples[channel * sample_count + sample] = (number * scales[channel]) as f32;
                channel += 1;
                if channel == scales.len() {
                    channel = 0;
                    sample += 1;
                }
            });
        })?;
        let capture = Capture::from_planar(self.sample_rate_hz, self.channel_count, samples);
        Ok(match self.metadata.datatype.number.range() {
            None => capture,
            Some((low, high)) => capture.and_then(|capture| {
                let range = |scale: &f64| ((low * scale) as f32, (high * scale) as f32);
                capture.with_range(scales.iter().map(range).collect())
            }),
        })
    }

    fn read_complex(&self, reader: &mut FileReader, sample_count: usize) -> Result<Made, FormatError> {
        let mut parts = vec![0_f64; 2 * sample_count * self.channel_count];
        let width = 2 * self.channel_count;
        self.blocks(reader, sample_count, |at, block| {
            let mut slots = parts[at * width..].iter_mut();
            self.metadata.datatype.decode(block, |number| {
                if let Some(slot) = slots.next() {
                    *slot = number;
                }
            });
        })?;
        if let Some(bad) = parts.iter().position(|part| !part.is_finite()) {
            // The transform would spread it over the whole channel.
            return Ok(Err(arcstead_core::CaptureError::NotFinite {
                channel: bad % width / 2 + 1,
                sample: bad / width,
                found: parts[bad] as f32,
            }));
        }
        let mut equivalent = {
            // A thread that panicked while planning has left no half plan behind.
            let mut planner = self.planner.lock().unwrap_or_else(PoisonError::into_inner);
            RealEquivalent::new(&mut planner, sample_count)
        };
        let mut samples = vec![0_f32; parts.len()];
        for (channel, output) in samples.chunks_exact_mut(2 * sample_count).enumerate() {
            let scale = self.volts_per_count(channel);
            for (z, frame) in equivalent.input().iter_mut().zip(parts.chunks_exact(width)) {
                (z.re, z.im) = (frame[2 * channel] * scale, frame[2 * channel + 1] * scale);
            }
            equivalent.process(output);
        }
        Ok(Capture::from_planar(2.0 * self.sample_rate_hz, self.channel_count, samples))
    }

    /// Reads `sample_count` samples of all channels in blocks of whole ones; `take` gets the number of the
    /// first sample of a block, and its bytes.
    fn blocks(
        &self,
        reader: &mut FileReader,
        sample_count: usize,
        mut take: impl FnMut(usize, &[u8]),
    ) -> Result<(), FormatError> {
        let frame = self.metadata.datatype.bytes() * self.channel_count;
        let per_block = (BLOCK_BYTES / frame).max(1).min(sample_count);
        let mut block = vec![0_u8; per_block * frame];
        let mut at = 0;
        while at < sample_count {
            let now = per_block.min(sample_count - at);
            let bytes = &mut block[..now * frame];
            reader.fill(bytes)?;
            take(at, bytes);
            at += now;
        }
        Ok(())
    }
}
