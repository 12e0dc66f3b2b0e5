//! Band-pass without delay: a magnitude with cosine edges, laid on the spectrum.

use std::f64::consts::PI;

use super::butterworth::{BandPassError, check_band};

/// How wide an edge is, as a share of the band. Wide edges ring briefly: a reflection some nanoseconds late must
/// not ring back into the gate of the first arrival.
const EDGE_SHARE: f64 = 0.25;

/// A band-pass that delays nothing: gain one inside the band, zero outside, one half at the edges, with edges
/// shaped as half a cosine, a quarter of the band wide (less where the band comes near zero or half the sample
/// rate).
#[derive(Debug, Clone, PartialEq)]
pub struct ZeroPhaseBandPass {
    low_hz: (f64, f64),
    high_hz: (f64, f64),
}

impl ZeroPhaseBandPass {
    /// Designs the band-pass with half amplitude at `low_hz` and `high_hz`.
    ///
    /// # Errors
    /// [`BandPassError::Band`] when the edges cannot be had at this sample rate.
    pub fn design(low_hz: f64, high_hz: f64, sample_rate_hz: f64) -> Result<Self, BandPassError> {
        check_band(low_hz, high_hz, sample_rate_hz)?;
        let half = EDGE_SHARE * (high_hz - low_hz) / 2.0;
        let low_half = half.min(low_hz);
        let high_half = half.min(sample_rate_hz / 2.0 - high_hz);
        Ok(Self {
            low_hz: (low_hz - low_half, low_hz + low_half),
            high_hz: (high_hz - high_half, high_hz + high_half),
        })
    }

    /// Gain at `frequency_hz`, between zero and one.
    #[must_use]
    pub fn gain(&self, frequency_hz: f64) -> f64 {
        let rise = |(from, to): (f64, f64)| {
            let along = ((frequency_hz - from) / (to - from)).clamp(0.0, 1.0);
            0.5 - 0.5 * (PI * along).cos()
        };
        rise(self.low_hz) * (1.0 - rise(self.high_hz))
    }

    /// Where the gain is not zero: lowest and highest frequency in hertz.
    #[must_use]
    pub fn support_hz(&self) -> (f64, f64) {
        (self.low_hz.0, self.high_hz.1)
    }

    /// The gain of every bin of a real transform of `length` samples (shape `length / 2 + 1`), times `scale`.
    #[must_use]
    pub fn gains(&self, length: usize, sample_rate_hz: f64, scale: f64) -> Vec<f64> {
        (0..=length / 2).map(|bin| scale * self.gain(bin as f64 * sample_rate_hz / length as f64)).collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn one_inside_half_at_the_edges_nothing_outside() {
        let filter = ZeroPhaseBandPass::design(300e6, 1500e6, 5e9).unwrap();
        assert_relative_eq!(filter.gain(300e6), 0.5, epsilon = 1e-12);
        assert_relative_eq!(filter.gain(1500e6), 0.5, epsilon = 1e-12);
        assert_relative_eq!(filter.gain(900e6), 1.0, epsilon = 1e-12);
        assert!(filter.gain(100e6).abs() < 1e-12 && filter.gain(1700e6).abs() < 1e-12);
        let (low, high) = filter.support_hz();
        assert!(filter.gain(low + 1e6) > 0.0 && filter.gain(high - 1e6) > 0.0);
    }

    #[test]
    fn an_edge_near_the_end_of_the_spectrum_stays_inside() {
        let filter = ZeroPhaseBandPass::design(1e6, 2.4e9, 5e9).unwrap();
        assert!(filter.gain(0.0).abs() < 1e-12 && filter.gain(2.5e9).abs() < 1e-12);
    }
}
