//! Causal band-pass of the Butterworth kind, as a function of frequency.

use realfft::num_complex::Complex;

/// A high-pass and a low-pass of the same order in cascade:
/// `H(s) = prod s/(w1 - p_k s) * prod w2/(s - p_k w2)`, p_k the left-hand poles of the Butterworth prototype
/// `exp(j pi (2k + n + 1)/(2n))` (S. Butterworth, On the theory of filter amplifiers, Wireless Engineer, 1930;
/// poles from memory).
#[derive(Debug, Clone)]
pub(crate) struct BandPass {
    low_rad_per_s: f64,
    high_rad_per_s: f64,
    poles: Vec<Complex<f64>>,
}

impl BandPass {
    /// The band-pass with -3 dB at both edges (where they lie well apart).
    pub(crate) fn new(order: u32, band_hz: (f64, f64)) -> Self {
        let n = f64::from(order);
        let poles = (0..order)
            .map(|k| {
                let angle = std::f64::consts::PI * (2.0 * f64::from(k) + n + 1.0) / (2.0 * n);
                Complex::from_polar(1.0, angle)
            })
            .collect();
        Self {
            low_rad_per_s: std::f64::consts::TAU * band_hz.0,
            high_rad_per_s: std::f64::consts::TAU * band_hz.1,
            poles,
        }
    }

    /// The response at one frequency.
    pub(crate) fn at(&self, frequency_hz: f64) -> Complex<f64> {
        let s = Complex::new(0.0, std::f64::consts::TAU * frequency_hz);
        let (low, high) = (self.low_rad_per_s, self.high_rad_per_s);
        self.poles.iter().map(|p| s * high / ((-p * s + low) * (s - p * high))).product()
    }

    /// The slowest time constant in seconds.
    pub(crate) fn slowest_s(&self) -> f64 {
        let slowest = self.poles.iter().map(|p| -p.re).fold(f64::INFINITY, f64::min);
        1.0 / (slowest * self.low_rad_per_s)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn magnitude_is_maximally_flat() {
        // |H|^2 = 1/((1 + (f1/f)^2n)(1 + (f/f2)^2n)), the definition of the Butterworth response.
        for order in 1..=5 {
            let filter = BandPass::new(order, (300e6, 1500e6));
            for f in [10e6, 300e6, 700e6, 1500e6, 2400e6] {
                let power = 2 * i32::try_from(order).unwrap();
                let expected =
                    1.0 / ((1.0 + (300e6_f64 / f).powi(power)) * (1.0 + (f / 1500e6_f64).powi(power)));
                assert_relative_eq!(filter.at(f).norm_sqr(), expected, max_relative = 1e-10);
            }
            assert!(filter.at(0.0).norm() < 1e-300);
        }
    }
}
