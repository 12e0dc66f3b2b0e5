//! SigMF 1.x: a `.sigmf-meta` (JSON) beside a `.sigmf-data` (samples only), read and written.
//!
//! Source: *Signal Metadata Format (SigMF) Specification*, version 1.2.5, 2025. What is read:
//!
//! - All real and complex integer and float datatypes of the standard. Unsigned integers lose their mid-scale
//!   offset (2^7, 2^15, 2^31). Integers of 8 bits give the recorder's range
//!   ([`arcstead_core::Capture::range`]); wider ones do not, because recorders of 10 to 14 bits store in them
//!   too and clip long before their ends.
//! - `core:num_channels` channels, interleaved sample by sample.
//! - **Every `captures` segment is one capture**, `core:datetime` its time (also segments the standard would
//!   join because nothing in them differs: a trigger is a capture). No segment: one capture, the whole file.
//!   The last one ends with the file. A segment that begins or ends beyond the data is an error of that
//!   capture; the ones before it are read.
//! - `core:offset`, `core:header_bytes` of each segment, `core:trailing_bytes`.
//! - `core:dataset`, when it is a file in the folder of the meta file. A path, or a link out of that folder,
//!   is refused.
//! - An extension that is not `optional` and not known here is an error, as the standard wants it.
//! - `core:sha512` is not compared; `annotations` are passed over; a `.sigmf` archive must be unpacked first.
//!
//! # Volts
//! The core namespace of the standard has no scale: integer samples are counts. The extension `arcstead`,
//! declared in `core:extensions` as optional, adds one key to `global`: `arcstead:volts_per_count`, an array
//! of one positive number per channel. Samples (after the removal of the mid-scale offset) and range are
//! multiplied by it. It goes with integer datatypes only.
//!
//! # Complex samples
//! A receiver that moves the band down to zero gives complex samples z at a rate fs. They become a real
//! signal x at 2 fs: z is interpolated by two (zero-padded transform) and moved up by fs/2, x(t) = Re(z(t)
//! exp(i pi fs t)), so that the whole band lies between 0 and fs.
//!
//! - *Kept:* the envelope. The analytic signal of x has the magnitude of z, so pulse shape, energy and every
//!   delay of the envelope, between channels too, are those of z. (Exact but for what lies at the very edge
//!   of the band, fs/2 away from its middle. The transform takes the capture as one turn of a ring: its first
//!   and last few samples mix.)
//! - *Not kept:* the phase of the oscillation under the envelope. A wave of frequency fc that arrives tau
//!   later is turned by -2 pi fc tau; x would need -pi fs tau. So the oscillations of x are displaced against
//!   its envelope by an amount that differs from channel to channel, half an oscillation of x at most: 1/fs
//!   at the middle of the band. A correlation of waveforms between channels would be wrong by that; a
//!   correlation of envelopes is right. This is told by [`super::Recorded::envelope_only`], true for complex
//!   samples unless `core:frequency` is fs/2, where both turn alike.
//! - The samples have no range: clipping of z does not show as a greatest value of x.

mod datatype;
mod error;
mod metadata;
mod real_equivalent;
mod recording;
#[cfg(test)]
mod recordings;
mod writer;

pub use error::SigmfError;
pub(super) use recording::DATA_ENDING;
pub use recording::Sigmf;
pub use writer::{SigmfWriteError, SigmfWriter, StoredAs, WriterSettings};
