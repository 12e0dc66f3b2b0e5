//! Where a pulse begins, picked three ways. Each works on one channel of band-passed samples, each is refined below
//! a sample, and none depends on the scale of the samples.

mod akaike;
mod energy;
mod threshold;

pub use akaike::akaike_onset;
pub use energy::energy_onset;
pub use threshold::threshold_onset;

/// An onset picked on one channel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Onset {
    /// The last sample that is still noise, counted from the first sample of the slice.
    pub sample: usize,
    /// The onset in samples after the first sample of the slice: where between `sample` and the next one the
    /// magnitude of the band-limited signal rises through `level`.
    pub position_samples: f64,
    /// The magnitude that separates noise from pulse by the criterion, in the unit of the samples.
    pub level: f64,
}

impl Onset {
    /// The onset after `sample`, refined where the magnitude of `samples` rises through `level` there.
    fn refined(samples: &[f64], sample: usize, level: f64) -> Self {
        let next = (sample + 1).min(samples.len() - 1);
        let rises = samples[sample].abs() < level && level <= samples[next].abs();
        let position_samples = if rises {
            crate::interpolation::rise_through(samples, sample, level)
        } else {
            sample as f64 + 0.5
        };
        Self { sample, position_samples, level }
    }
}
