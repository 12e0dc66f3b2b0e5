//! The two band-passes: one that looks only back, for onsets, and one without delay, for correlations.
//!
//! A filter before an onset picker must be causal: one without phase rings before the onset and pulls the pick
//! early. Before a correlation the one without phase is right. Every channel passes the same filter, so its delay
//! cancels.

mod butterworth;
mod zero_phase;

pub use butterworth::{BandPassError, ButterworthBandPass, Section};
pub use zero_phase::ZeroPhaseBandPass;
