//! The pulse a discharge radiates, as a causal function of frequency.

use rand::Rng;
use rand_distr::{Distribution, StandardNormal};
use realfft::num_complex::Complex;

/// The pulse of a source and how it varies from shot to shot.
///
/// The current is a double exponential, `i(t) = exp(-t/decay) - exp(-t/rise)` for t > 0; what is radiated goes
/// with its slope, and what it hangs on rings: with `a = 1/decay`, `b = 1/rise`, `w` the angular frequency of the
/// oscillation, g its share and z its damping,
///
/// `F(s) = s / ((s + a)(s + b)) * (1 + g 2 z w s / (s^2 + 2 z w s + w^2))`.
///
/// Every factor is causal: nothing comes before the onset.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PulseSetting {
    /// Rise of the current from 10 to 90 % in seconds (default 0.35 ns); its time constant is taken as this over
    /// ln 9, which holds where the decay is much longer.
    pub rise_s: f64,
    /// Time constant of the current's decay in seconds (default 3 ns).
    pub decay_s: f64,
    /// Frequency of the oscillation in hertz (default 600 MHz).
    pub oscillation_hz: f64,
    /// Weight of the oscillation (default 1; 0 for none).
    pub oscillation_share: f64,
    /// Damping ratio of the oscillation, 0.01 or more (default 0.2).
    pub damping: f64,
    /// How much rise, decay, frequency, share and damping vary from shot to shot: standard deviation of the
    /// logarithm of each, of the frequency a third of it (default 0.15; 0 for all shots alike).
    pub shape_spread: f64,
}

impl Default for PulseSetting {
    fn default() -> Self {
        Self {
            rise_s: 0.35e-9,
            decay_s: 3e-9,
            oscillation_hz: 600e6,
            oscillation_share: 1.0,
            damping: 0.2,
            shape_spread: 0.15,
        }
    }
}

impl PulseSetting {
    /// The pulse of a shot that deviates in nothing.
    pub(crate) fn nominal(&self) -> PulseShape {
        self.deviating([0.0; 5])
    }

    /// The pulse of one shot.
    pub(crate) fn draw(&self, rng: &mut (impl Rng + ?Sized)) -> PulseShape {
        // Four deviations bound the tail, and with it the padding that keeps it from wrapping.
        self.deviating([(); 5].map(|()| {
            let deviation: f64 = StandardNormal.sample(rng);
            deviation.clamp(-4.0, 4.0)
        }))
    }

    fn deviating(&self, deviations: [f64; 5]) -> PulseShape {
        let [rise, decay, frequency, share, damping] = deviations.map(|d| (self.shape_spread * d).exp());
        PulseShape {
            decay_per_s: 1.0 / (self.decay_s * decay),
            rise_per_s: 9.0_f64.ln() / (self.rise_s * rise),
            oscillation_rad_per_s: std::f64::consts::TAU * self.oscillation_hz * frequency.cbrt(),
            share: self.oscillation_share * share,
            damping: self.damping * damping,
        }
    }

    /// The slowest time constant any shot may have, in seconds.
    pub(crate) fn slowest_s(&self) -> f64 {
        let longest = self.deviating([4.0, 4.0, -4.0, 0.0, -4.0]);
        let over = self.deviating([4.0, 4.0, -4.0, 0.0, 4.0]);
        let ringing_s = |shape: &PulseShape| {
            // The slower pole of s^2 + 2 z w s + w^2: z w below critical damping, about w/(2 z) above.
            let z = shape.damping;
            let rate = if z < 1.0 { z } else { z - (z * z - 1.0).sqrt() };
            1.0 / (rate * shape.oscillation_rad_per_s)
        };
        (1.0 / longest.decay_per_s)
            .max(1.0 / longest.rise_per_s)
            .max(ringing_s(&longest))
            .max(ringing_s(&over))
    }
}

/// The pulse of one shot; see [`PulseSetting`] for the formula.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct PulseShape {
    decay_per_s: f64,
    rise_per_s: f64,
    oscillation_rad_per_s: f64,
    share: f64,
    damping: f64,
}

impl PulseShape {
    /// Its transform at `s = j 2 pi frequency_hz`, in seconds.
    pub(crate) fn at(&self, frequency_hz: f64) -> Complex<f64> {
        let s = Complex::new(0.0, std::f64::consts::TAU * frequency_hz);
        let w = self.oscillation_rad_per_s;
        let ringing = s * (2.0 * self.damping * w);
        let resonance = s * s + ringing + w * w;
        s * (resonance + ringing * self.share) / ((s + self.decay_per_s) * (s + self.rise_per_s) * resonance)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use rand::SeedableRng;
    use rand_chacha::ChaCha8Rng;

    #[test]
    fn transform_is_that_of_the_slope_of_a_double_exponential() {
        // Without oscillation: the numerical Fourier integral of b exp(-b t) - a exp(-a t), over b - a, is the
        // slope of the current scaled to start at one.
        let setting = PulseSetting { oscillation_share: 0.0, ..PulseSetting::default() };
        let (a, b) = (1.0 / 3e-9, 9.0_f64.ln() / 0.35e-9);
        let step_s = 2e-12;
        for frequency_hz in [50e6, 300e6, 1.2e9] {
            let mut sum = Complex::new(0.0, 0.0);
            for k in 0..60_000 {
                let t_s = (f64::from(k) + 0.5) * step_s;
                let slope = (b * (-b * t_s).exp() - a * (-a * t_s).exp()) / (b - a);
                sum += Complex::from_polar(slope * step_s, -std::f64::consts::TAU * frequency_hz * t_s);
            }
            let found = setting.nominal().at(frequency_hz);
            assert_relative_eq!(found.re, sum.re, max_relative = 1e-4, epsilon = 1e-14);
            assert_relative_eq!(found.im, sum.im, max_relative = 1e-4, epsilon = 1e-14);
        }
    }

    #[test]
    fn shots_vary_as_stated() {
        let mut rng = ChaCha8Rng::seed_from_u64(5);
        let setting = PulseSetting { shape_spread: 0.2, ..PulseSetting::default() };
        let trials = 20_000;
        let mean_square = (0..trials)
            .map(|_| (setting.draw(&mut rng).rise_per_s / setting.nominal().rise_per_s).ln().powi(2))
            .sum::<f64>()
            / f64::from(trials);
        // Relative standard error of a variance is sqrt(2/n); 4.9 of them.
        assert_relative_eq!(mean_square, 0.04, max_relative = 4.9 * (2.0 / f64::from(trials)).sqrt());
        let alike = PulseSetting { shape_spread: 0.0, ..setting };
        assert_eq!(alike.draw(&mut rng), alike.nominal());
    }
}
