//! The greatest and least numbers believed of a capture file.

/// Most channels of one capture. Antennas number in the tens at most; more is a table read the wrong way
/// round.
pub const MAX_CHANNELS: usize = 256;

/// Most samples of one capture, all channels together: 2^28, one gibibyte in memory.
pub const MAX_SAMPLES: usize = 1 << 28;

/// Least sample rate, in hertz.
pub const MIN_SAMPLE_RATE_HZ: f64 = 1.0;

/// Greatest sample rate, in hertz: the limit of `core:sample_rate` in SigMF 1.2.
pub const MAX_SAMPLE_RATE_HZ: f64 = 1e12;
