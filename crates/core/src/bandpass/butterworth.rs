//! Butterworth band-pass as second-order sections, run once forward.

use realfft::num_complex::Complex64;
use std::f64::consts::PI;
use thiserror::Error;

/// One second-order section: `H(z) = (b0 + b1 z^-1 + b2 z^-2) / (1 + a1 z^-1 + a2 z^-2)`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Section {
    /// Numerator b0, b1, b2.
    pub b: [f64; 3],
    /// Denominator a1, a2 (a0 is 1).
    pub a: [f64; 2],
}

/// Why a band is no band at this sample rate.
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
pub enum BandPassError {
    /// The edges are not `0 < low < high < half the sample rate`.
    #[error(
        "a band from {} to {} MHz at {} million samples a second; expected 0 < low < high < {} MHz, half the sample rate",
        low_hz / 1e6, high_hz / 1e6, sample_rate_hz / 1e6, sample_rate_hz / 2e6
    )]
    Band {
        /// Lower edge given, in hertz.
        low_hz: f64,
        /// Upper edge given, in hertz.
        high_hz: f64,
        /// Sample rate in hertz.
        sample_rate_hz: f64,
    },
    /// The order is zero or beyond 12.
    #[error("a filter of order {found}; expected 1 to 12")]
    Order {
        /// The order given.
        found: usize,
    },
}

/// A Butterworth band-pass: flat in the band, -3 dB at both edges, causal.
///
/// The analogue low-pass of `order` poles is turned into a band-pass of twice as many and mapped by the bilinear
/// transform with both edges prewarped (A. Oppenheim, R. Schafer, *Discrete-Time Signal Processing*, 3rd ed.,
/// ch. 7). The gain at the centre of the band is one.
///
/// ```
/// use arcstead_core::ButterworthBandPass;
/// let filter = ButterworthBandPass::design(2, 300e6, 1500e6, 5e9)?;
/// assert_eq!(filter.sections().len(), 2);
/// assert!((filter.response(300e6).norm() - 0.5_f64.sqrt()).abs() < 1e-12);
/// # Ok::<(), arcstead_core::BandPassError>(())
/// ```
#[derive(Debug, Clone, PartialEq)]
pub struct ButterworthBandPass {
    sections: Vec<Section>,
    sample_rate_hz: f64,
}

/// Greatest order: beyond it the sections of a narrow band lose digits.
const GREATEST_ORDER: usize = 12;

impl ButterworthBandPass {
    /// Designs the filter of `order` (1 to 12; `order` sections) with edges `low_hz` and `high_hz`.
    ///
    /// # Errors
    /// [`BandPassError`] when the order or the edges cannot be had at this sample rate.
    pub fn design(
        order: usize,
        low_hz: f64,
        high_hz: f64,
        sample_rate_hz: f64,
    ) -> Result<Self, BandPassError> {
        if order == 0 || order > GREATEST_ORDER {
            return Err(BandPassError::Order { found: order });
        }
        check_band(low_hz, high_hz, sample_rate_hz)?;
        // Frequencies in units of twice the sample rate, as the bilinear transform s = (z - 1) / (z + 1) wants.
        let low = (PI * low_hz / sample_rate_hz).tan();
        let high = (PI * high_hz / sample_rate_hz).tan();
        let (width, centre) = (high - low, (low * high).sqrt());
        let at_centre = Complex64::from_polar(1.0, 2.0 * centre.atan());

        let mut sections = Vec::with_capacity(order);
        let mut section = |sum: f64, product: f64| {
            let shape = Section { b: [1.0, 0.0, -1.0], a: [-sum, product] };
            let gain = 1.0 / shape.response(at_centre).norm();
            sections.push(Section { b: [gain, 0.0, -gain], ..shape });
        };
        // Poles come in conjugate pairs; one of each pair of the low-pass is enough.
        for k in 0..order.div_ceil(2) {
            let angle = PI * (2 * k + 1 + order) as f64 / (2 * order) as f64;
            let half = Complex64::from_polar(1.0, angle) * (width / 2.0);
            if 2 * k + 1 == order {
                // The real pole of an odd order: two band-pass poles that are conjugate, or both real.
                let half = half.re;
                let root = Complex64::new(half * half - centre * centre, 0.0).sqrt();
                let (p, q) = (bilinear(half + root), bilinear(half - root));
                section((p + q).re, (p * q).re);
            } else {
                let root = (half * half - centre * centre).sqrt();
                for pole in [bilinear(half + root), bilinear(half - root)] {
                    section(2.0 * pole.re, pole.norm_sqr());
                }
            }
        }
        Ok(Self { sections, sample_rate_hz })
    }

    /// The sections, in the order in which they are run.
    #[must_use]
    pub fn sections(&self) -> &[Section] {
        &self.sections
    }

    /// Complex gain at `frequency_hz`.
    #[must_use]
    pub fn response(&self, frequency_hz: f64) -> Complex64 {
        let z = Complex64::from_polar(1.0, 2.0 * PI * frequency_hz / self.sample_rate_hz);
        self.sections.iter().map(|section| section.response(z)).product()
    }

    /// Runs the filter once forward from rest; `filtered` is cleared and holds as many samples as `samples` after.
    pub fn filter_forward(&self, samples: &[f64], filtered: &mut Vec<f64>) {
        filtered.clear();
        filtered.extend_from_slice(samples);
        self.filter_in_place(filtered);
    }

    /// As [`Self::filter_forward`], in place.
    pub(crate) fn filter_in_place(&self, samples: &mut [f64]) {
        // Two sections a sweep: the second works while the first waits for its own last result.
        for pair in self.sections.chunks(2) {
            match pair {
                [one, two] => {
                    let (mut s, mut t) = ([0.0; 2], [0.0; 2]);
                    for x in &mut *samples {
                        *x = two.step(one.step(*x, &mut s), &mut t);
                    }
                }
                alone => {
                    for section in alone {
                        let mut state = [0.0; 2];
                        for x in &mut *samples {
                            *x = section.step(*x, &mut state);
                        }
                    }
                }
            }
        }
    }

    /// The answer to a single one at sample 0, `count` samples long.
    #[must_use]
    pub fn impulse_response(&self, count: usize) -> Vec<f64> {
        let mut answer = vec![0.0; count];
        if let Some(first) = answer.first_mut() {
            *first = 1.0;
        }
        self.filter_in_place(&mut answer);
        answer
    }
}

impl Section {
    /// One sample through the section (transposed direct form II, which keeps digits when poles are near the circle).
    #[inline]
    fn step(&self, x: f64, state: &mut [f64; 2]) -> f64 {
        let y = self.b[0] * x + state[0];
        state[0] = self.b[1] * x - self.a[0] * y + state[1];
        state[1] = self.b[2] * x - self.a[1] * y;
        y
    }

    fn response(&self, z: Complex64) -> Complex64 {
        let d = z.inv();
        (self.b[0] + d * (self.b[1] + d * self.b[2])) / (1.0 + d * (self.a[0] + d * self.a[1]))
    }
}

fn bilinear(s: Complex64) -> Complex64 {
    (1.0 + s) / (1.0 - s)
}

/// Whether a band can be had at a sample rate.
pub(crate) fn check_band(low_hz: f64, high_hz: f64, sample_rate_hz: f64) -> Result<(), BandPassError> {
    let usable =
        low_hz > 0.0 && low_hz < high_hz && high_hz < sample_rate_hz / 2.0 && sample_rate_hz.is_finite();
    usable.then_some(()).ok_or(BandPassError::Band { low_hz, high_hz, sample_rate_hz })
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn magnitude_is_that_of_the_butterworth_formula() {
        // |H|^2 = 1 / (1 + W^(2n)), W = (w^2 - w0^2) / (w bw) of the prewarped frequencies (Oppenheim, Schafer).
        for (order, low, high, rate) in [
            (1, 0.2, 0.3, 1.0),
            (2, 300e6, 1500e6, 5e9),
            (3, 30e6, 300e6, 1e9),
            (3, 1e6, 450e6, 1e9),
            (4, 30e6, 300e6, 1e9),
        ] {
            let filter = ButterworthBandPass::design(order, low, high, rate).unwrap();
            assert_eq!(filter.sections().len(), order);
            let warp = |f: f64| (PI * f / rate).tan();
            for k in 1..50 {
                let f = rate / 2.0 * f64::from(k) / 50.0;
                let w = warp(f);
                let ratio = (w * w - warp(low) * warp(high)) / (w * (warp(high) - warp(low)));
                let expected = 1.0 / (1.0 + ratio.powi(2 * order as i32));
                assert_relative_eq!(
                    filter.response(f).norm_sqr(),
                    expected,
                    max_relative = 1e-9,
                    epsilon = 1e-15
                );
            }
        }
    }

    #[test]
    fn answer_to_an_impulse_has_the_spectrum_of_the_response() {
        let filter = ButterworthBandPass::design(3, 0.1, 0.3, 1.0).unwrap();
        let answer = filter.impulse_response(600);
        for f in [0.05, 0.1, 0.2, 0.37] {
            let sum: Complex64 = answer
                .iter()
                .enumerate()
                .map(|(n, h)| Complex64::from_polar(*h, -2.0 * PI * f * n as f64))
                .sum();
            assert_relative_eq!(sum.re, filter.response(f).re, epsilon = 1e-10);
            assert_relative_eq!(sum.im, filter.response(f).im, epsilon = 1e-10);
        }
    }

    #[test]
    fn nothing_comes_before_its_cause() {
        let filter = ButterworthBandPass::design(2, 0.1, 0.3, 1.0).unwrap();
        let mut samples = vec![0.0; 60];
        samples[20] = 1.0;
        let mut filtered = vec![7.0; 3];
        filter.filter_forward(&samples, &mut filtered);
        assert!(filtered[..20].iter().all(|y| y.abs() < f64::MIN_POSITIVE));
        assert_relative_eq!(filtered[20..], filter.impulse_response(40)[..], epsilon = 1e-15);
    }

    #[test]
    fn refuses_what_is_no_band() {
        assert!(ButterworthBandPass::design(0, 0.1, 0.2, 1.0).is_err());
        for (low, high) in [(0.0, 0.2), (0.2, 0.1), (0.1, 0.5), (f64::NAN, 0.2)] {
            assert!(ButterworthBandPass::design(2, low, high, 1.0).is_err());
        }
    }
}
