//! What can be wrong with a SigMF recording.

use thiserror::Error;

use crate::CaptureTimeError;

/// What is wrong with a SigMF recording.
#[derive(Debug, Error)]
#[non_exhaustive]
pub enum SigmfError {
    /// It is an archive.
    #[error(
        "a .sigmf archive is not read; unpack it (it is a tar file) and give the .sigmf-meta files in it"
    )]
    Archive,
    /// A data file stands alone.
    #[error("there is no {expected} beside it; a SigMF recording is the two files together")]
    NoMeta {
        /// File name of the meta file that was looked for.
        expected: String,
    },
    /// The meta file is far too long.
    #[error("the meta file holds {found} bytes; at most {most} are read")]
    MetaTooLong {
        /// Its bytes.
        found: u64,
        /// The limit.
        most: u64,
    },
    /// The meta file is no JSON.
    #[error("the meta file is no JSON")]
    Json(#[source] serde_json::Error),
    /// A key is missing.
    #[error("`{key}` is missing; expected {expected}")]
    Missing {
        /// The key, with its place.
        key: String,
        /// What it should hold.
        expected: &'static str,
    },
    /// A key holds something else than it should.
    #[error("`{key}` is {found}; expected {expected}")]
    Value {
        /// The key, with its place.
        key: String,
        /// What it holds, as JSON.
        found: String,
        /// What it should hold.
        expected: &'static str,
    },
    /// The segments are not in order.
    #[error(
        "segment {segment} begins at sample {found}, before sample {expected}; segments must be sorted by \
         `core:sample_start` and begin at `core:offset` or later"
    )]
    Unsorted {
        /// Segment counted from 1.
        segment: usize,
        /// Its start.
        found: u64,
        /// Where it could begin at the earliest.
        expected: u64,
    },
    /// An extension that must be understood is not.
    #[error("the recording needs the extension `{name}`, which is not known here")]
    Extension {
        /// Name of the extension.
        name: String,
    },
    /// A segment does not lie in the data file.
    #[error(
        "the capture ends at byte {end} of {dataset}, which holds {found} bytes for samples; it was cut \
         short, or the meta file is of another recording"
    )]
    PastEnd {
        /// The data file.
        dataset: String,
        /// First byte after the capture.
        end: u64,
        /// Bytes for samples in the file.
        found: u64,
    },
    /// The last segment ends inside a sample.
    #[error(
        "{dataset} ends inside a sample: {over} bytes remain where all channels of a sample take {frame}; \
         it was cut short, or `core:datatype` or `core:num_channels` is wrong"
    )]
    PartialFrame {
        /// The data file.
        dataset: String,
        /// Bytes that remain.
        over: u64,
        /// Bytes of one sample of all channels.
        frame: u64,
    },
    /// A segment has no samples.
    #[error(
        "the capture has no samples: the next one begins at the same sample, or the data file ends there"
    )]
    NoSamples,
    /// A place or count in the file is beyond all that can be.
    #[error("segment {segment}: its place in the file is beyond 2^64 bytes")]
    Overflow {
        /// Segment counted from 1.
        segment: usize,
    },
    /// The data file lies somewhere else.
    #[error(
        "`core:dataset` is {found}, which leads out of the folder of the meta file; expected the name of \
         a file beside it"
    )]
    OutsideFolder {
        /// What it says.
        found: String,
    },
    /// The time of a segment is no time.
    #[error("`core:datetime` of segment {segment}")]
    Time {
        /// Segment counted from 1.
        segment: usize,
        /// Why it is none.
        source: CaptureTimeError,
    },
}
