//! Is there a pulse at all?

use statrs::function::gamma::gamma_ur;
use std::ops::Range;

use crate::noise::{mean_power, median_block_power, median_over_mean};

/// Noise below this share of the strongest sample's power is taken as this much: what is left where a record holds no
/// noise at all is rounding.
const LEAST_NOISE_SHARE: f64 = 1e-12;

/// Decides for one channel of band-passed samples whether it holds a pulse, and where the first one starts.
///
/// The statistic is the energy in a sliding window of `window` samples over what the noise alone brings. Of
/// noise alone it is distributed as a gamma with the mean and variance that the filter's autocorrelation gives
/// (F. E. Satterthwaite, Biometrics Bull. 2(6), 1946); the threshold is what its greatest value over all
/// places exceeds with the false alarm probability, counting every place as independent.
#[derive(Debug, Clone)]
pub(crate) struct Detector {
    window: usize,
    block: usize,
    block_bias: f64,
    /// Least ratio of window energy to noise energy, for 2^k places at index k.
    thresholds: Vec<f64>,
    powers: Vec<f64>,
}

/// What the detector found on one channel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Detection {
    /// Power of the noise.
    pub(crate) noise_power: f64,
    /// First sample of the first window that is too strong for noise.
    pub(crate) start: Option<usize>,
}

impl Detector {
    /// For samples that passed a filter with this `impulse_response`.
    pub(crate) fn plan(
        impulse_response: &[f64],
        window: usize,
        sample_count: usize,
        false_alarm: f64,
    ) -> Self {
        let correlations = autocorrelation(impulse_response, 2 * window);
        let degrees = degrees_of_freedom(&correlations, window);
        let places = sample_count.max(2).next_power_of_two().trailing_zeros();
        let thresholds =
            (0..=places).map(|k| gamma_tail(degrees, false_alarm / 2_f64.powi(k as i32)) / degrees).collect();
        let block = 2 * window;
        let block_bias = median_over_mean(degrees_of_freedom(&correlations, block));
        Self { window, block, block_bias, thresholds, powers: Vec::with_capacity(sample_count / block + 1) }
    }

    /// Looks for the first pulse in the whole record but `margin` samples at either end.
    pub(crate) fn detect(&mut self, samples: &[f64], margin: usize) -> Detection {
        let places = margin.min(samples.len() / 4)..samples.len() - margin.min(samples.len() / 4);
        let peak = samples.iter().fold(0.0, |peak: f64, x| peak.max(x.abs()));
        let least = LEAST_NOISE_SHARE * peak * peak;
        let rough = median_block_power(samples, self.block, &mut self.powers) / self.block_bias;
        let rough = rough.max(least);
        let first = self.first_above(samples, places.clone(), rough);
        // The quiet part before the pulse tells more than the median does; the first samples, where the filter
        // starts from rest, tell too little.
        let quiet =
            places.start.max(self.window)..first.map_or(places.end, |at| at.saturating_sub(self.window));
        if quiet.len() < 8 * self.block {
            return Detection { noise_power: rough, start: first };
        }
        let noise_power = mean_power(&samples[quiet]).max(least);
        Detection { noise_power, start: self.first_above(samples, places, noise_power) }
    }

    /// First window inside `range` whose energy is too great for noise of `noise_power`, at the false alarm probability for
    /// that many places.
    pub(crate) fn first_above(
        &self,
        samples: &[f64],
        range: Range<usize>,
        noise_power: f64,
    ) -> Option<usize> {
        let range = range.start..range.end.min(samples.len());
        if noise_power <= 0.0 || range.len() < self.window {
            return None;
        }
        let places = range.len().next_power_of_two().trailing_zeros() as usize;
        let threshold = self.thresholds[places.min(self.thresholds.len() - 1)];
        let least = threshold * noise_power * self.window as f64;
        let mut energy = 0.0;
        for at in range.clone() {
            energy += samples[at] * samples[at];
            if at >= range.start + self.window {
                energy -= samples[at - self.window] * samples[at - self.window];
            }
            if energy > least {
                return Some((at + 1).saturating_sub(self.window).max(range.start));
            }
        }
        None
    }

    /// Samples over which energy is summed.
    pub(crate) fn window(&self) -> usize {
        self.window
    }
}

/// Normalised autocorrelation of the filter's answer at lags 0 .. `lags`.
fn autocorrelation(answer: &[f64], lags: usize) -> Vec<f64> {
    let at = |lag: usize| answer.iter().zip(answer.iter().skip(lag)).map(|(a, b)| a * b).sum::<f64>();
    let zero = at(0).max(f64::MIN_POSITIVE);
    (0..=lags).map(|lag| at(lag) / zero).collect()
}

/// Equivalent degrees of freedom of the energy of `window` samples with these correlations.
fn degrees_of_freedom(correlations: &[f64], window: usize) -> f64 {
    let n = window as f64;
    let sum: f64 = (1..window).map(|lag| 2.0 * (n - lag as f64) * correlations[lag].powi(2)).sum::<f64>() + n;
    n * n / sum
}

/// The value that a chi-square with `degrees` exceeds with `probability`.
fn gamma_tail(degrees: f64, probability: f64) -> f64 {
    let (mut low, mut high) = (0.0, 20.0 * (degrees + 100.0));
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if gamma_ur(0.5 * degrees, 0.5 * middle) > probability {
            low = middle;
        } else {
            high = middle;
        }
    }
    high
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bandpass::ButterworthBandPass;
    use approx::assert_relative_eq;
    use rand::SeedableRng;
    use rand_chacha::ChaCha8Rng;
    use rand_distr::{Distribution, StandardNormal};

    #[test]
    fn tail_is_that_of_the_table() {
        // NIST/SEMATECH e-Handbook 1.3.6.7.4.
        for (degrees, probability, value) in [(1.0, 0.05, 3.841), (6.0, 0.05, 12.592), (10.0, 0.01, 23.209)] {
            assert_relative_eq!(gamma_tail(degrees, probability), value, max_relative = 2e-4);
        }
    }

    #[test]
    fn noise_alone_raises_the_stated_share_of_false_alarms_at_most() {
        let filter = ButterworthBandPass::design(2, 0.06, 0.3, 1.0).unwrap();
        let mut detector = Detector::plan(&filter.impulse_response(200), 11, 1500, 1e-2);
        let mut rng = ChaCha8Rng::seed_from_u64(5);
        let trials = 3000;
        let alarms = (0..trials)
            .filter(|_| {
                let mut samples: Vec<f64> = (0..1500).map(|_| StandardNormal.sample(&mut rng)).collect();
                filter.filter_in_place(&mut samples);
                detector.detect(&samples, 0).start.is_some()
            })
            .count();
        let share = alarms as f64 / f64::from(trials);
        // 4.9 standard errors of a share of 0.01 over 3000 trials are 0.009.
        assert!(share > 1e-4 && share < 0.019, "{share}");
    }

    #[test]
    fn a_record_without_noise_or_without_anything() {
        let filter = ButterworthBandPass::design(2, 0.06, 0.3, 1.0).unwrap();
        let mut detector = Detector::plan(&filter.impulse_response(200), 11, 400, 1e-3);
        assert_eq!(detector.detect(&[0.0; 400], 0), Detection { noise_power: 0.0, start: None });
        let mut pulse = vec![0.0; 400];
        pulse[200..210].copy_from_slice(&[1.0, -2.0, 3.0, -3.0, 2.0, -2.0, 1.0, -1.0, 0.5, -0.5]);
        let found = detector.detect(&pulse, 0);
        assert!(found.start.is_some_and(|at| (185..=200).contains(&at)), "{found:?}");
        assert!(detector.detect(&[1.0; 5], 0).start.is_none());
    }
}
