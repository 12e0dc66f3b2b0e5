//! From a capture to arrival times: the plan that strings the steps together.
//!
//! 1. Each channel loses its offset and, if asked, its carriers.
//! 2. A causal band-pass, the noise before the pulse, and whether there is a pulse at all.
//! 3. Its onset, picked by energy (or by Akaike's criterion or a threshold, if that is the method).
//! 4. A band-pass without delay, and a short gate around each onset.
//! 5. The gated pulses of all channels are laid on one common shape; the onsets keep them from slipping a cycle.
//! 6. The delays of all pairs are fused into one time per channel, with their covariance.

mod conditioning;
mod correlated;
mod error;
mod gated;
mod onsets;
mod options;
mod plan;
#[cfg(test)]
mod tests;

pub(crate) use conditioning::{Conditioned, Conditioning};
pub use error::TimingError;
pub use options::{Method, TimingOptions};
pub use plan::Timing;
