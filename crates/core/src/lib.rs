//! Captures, and the arrival time of a radio pulse on every channel.
//!
//! A [`Capture`] goes in, [`ChannelTimes`] come out; [`Timing`] is the way between, planned once for captures of one
//! shape and run on any number of them. What it is built of can be used alone: band-passes, onset pickers on plain
//! slices, generalised cross-correlation, fusion of pair delays, and the bounds on what a delay can be measured to.
//!
//! Conventions: times in seconds after the first sample of the capture (in samples where a name says so); a delay
//! between A and B, and the lag of a correlation, is *arrival at B minus arrival at A*; the signal to noise of a
//! channel is 20 log10 of pulse peak over noise rms, both after the causal timing band-pass. Channels count from 0 in
//! the library and from 1 in the text of errors. No result depends on the scale of the samples or on their offset.

mod alignment;
mod bandpass;
mod bounds;
mod capture;
mod carriers;
mod channel_times;
mod clipping;
mod correlation;
mod detection;
mod fusion;
mod gate;
mod interpolation;
mod noise;
mod offset;
mod onset;
mod spectrum;
mod summary;
mod timing;

pub use bandpass::{BandPassError, ButterworthBandPass, Section, ZeroPhaseBandPass};
pub use bounds::{flat_band_delay_variance_s2, known_pulse_variance_s2};
pub use capture::{Capture, CaptureError};
pub use carriers::Carrier;
pub use channel_times::{ChannelFlags, ChannelTime, ChannelTimes};
pub use clipping::{is_clipped, is_dead};
pub use correlation::{CrossCorrelation, GeneralisedCorrelation, Weighting};
pub use fusion::{PairDelay, closure_error, fuse_delays};
pub use offset::offset;
pub use onset::{Onset, akaike_onset, energy_onset, threshold_onset};
pub use summary::{ChannelSummary, summarise};
pub use timing::{Method, Timing, TimingError, TimingOptions};
