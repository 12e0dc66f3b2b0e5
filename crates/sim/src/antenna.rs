//! What one antenna adds to the band all antennas share.

use rand::Rng;
use rand_distr::{Distribution, StandardNormal};
use realfft::num_complex::Complex;

/// Number of ripples across the band: one to this many periods.
const RIPPLES: usize = 3;

/// A smooth ripple of magnitude that is an antenna's own, with the phase that causality gives it:
/// `R(f) = exp(sum a_m exp(-j 2 pi f m/W))`, W the width of the band, m = 1 to 3.
///
/// It is a train of small echoes at multiples of 1/W, so nothing comes early. The ripples have whole periods
/// in the band, so the mean of the group delay over the band is exactly zero: what an antenna delays on the whole
/// is in its delay and response error, not here.
#[derive(Debug, Clone, PartialEq)]
pub struct Ripple {
    /// The amplitudes a_m, in nepers of magnitude and radians of phase.
    pub amplitudes: [f64; RIPPLES],
    /// Width of the band in hertz.
    pub width_hz: f64,
}

impl Ripple {
    /// A ripple whose magnitude has this root mean square in dB, on average over many antennas.
    pub(crate) fn draw(rms_db: f64, band_hz: (f64, f64), rng: &mut (impl Rng + ?Sized)) -> Self {
        // sum a_m cos(..) has the mean square sum a_m^2 / 2.
        let sigma = rms_db / 20.0 * std::f64::consts::LN_10 * (2.0 / RIPPLES as f64).sqrt();
        let amplitudes = [(); RIPPLES].map(|()| {
            let deviation: f64 = StandardNormal.sample(rng);
            sigma * deviation
        });
        Self { amplitudes, width_hz: band_hz.1 - band_hz.0 }
    }

    /// The response at one frequency.
    #[must_use]
    pub fn at(&self, frequency_hz: f64) -> Complex<f64> {
        (1..)
            .zip(&self.amplitudes)
            .map(|(m, &a)| {
                let angle = -std::f64::consts::TAU * frequency_hz * f64::from(m) / self.width_hz;
                Complex::from_polar(a, angle)
            })
            .sum::<Complex<f64>>()
            .exp()
    }

    /// How long its echoes last, in seconds.
    pub(crate) fn lasts_s(&self) -> f64 {
        // Echo n of a train has a^n/n!: twelve of the longest are more than enough for amplitudes below two.
        12.0 * RIPPLES as f64 / self.width_hz
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use rand::SeedableRng;
    use rand_chacha::ChaCha8Rng;

    const BAND_HZ: (f64, f64) = (300e6, 1500e6);

    #[test]
    fn mean_group_delay_over_the_band_is_zero() {
        let mut rng = ChaCha8Rng::seed_from_u64(8);
        for _ in 0..20 {
            let ripple = Ripple::draw(1.0, BAND_HZ, &mut rng);
            let steps = 4000;
            // The phase between neighbouring frequencies sums to the phase over the band without unwrapping.
            let turned: f64 = (0..steps)
                .map(|k| {
                    let f = |k: i32| BAND_HZ.0 + (BAND_HZ.1 - BAND_HZ.0) * f64::from(k) / f64::from(steps);
                    (ripple.at(f(k + 1)) / ripple.at(f(k))).arg()
                })
                .sum();
            let mean_delay_s = -turned / (std::f64::consts::TAU * (BAND_HZ.1 - BAND_HZ.0));
            assert!(mean_delay_s.abs() < 1e-18, "{mean_delay_s}");
        }
    }

    #[test]
    fn magnitude_has_the_stated_ripple() {
        let mut rng = ChaCha8Rng::seed_from_u64(9);
        let (antennas, steps) = (4000, 64);
        let mean_square_db2 = (0..antennas)
            .map(|_| {
                let ripple = Ripple::draw(0.5, BAND_HZ, &mut rng);
                (0..steps)
                    .map(|k| {
                        let f = BAND_HZ.0 + (BAND_HZ.1 - BAND_HZ.0) * f64::from(k) / f64::from(steps);
                        (20.0 * ripple.at(f).norm().log10()).powi(2)
                    })
                    .sum::<f64>()
                    / f64::from(steps)
            })
            .sum::<f64>()
            / f64::from(antennas);
        // A sum of three squares an antenna: relative standard error sqrt(2/3n); 4.9 of them.
        let tolerance = 4.9 * (2.0 / (3.0 * f64::from(antennas))).sqrt();
        assert_relative_eq!(mean_square_db2, 0.25, max_relative = tolerance);
    }
}
