//! Generalised cross-correlation of two records.

use realfft::num_complex::Complex64;

use super::weighting::{self, Weighting};
use crate::spectrum::{Transform, fast_length};

/// A cross-correlation with the lag of every value.
#[derive(Debug, Clone, PartialEq)]
pub struct CrossCorrelation {
    /// Lag of the first value, in samples; the others follow one by one.
    pub first_lag: isize,
    /// The correlation at each lag.
    pub values: Vec<f64>,
}

impl CrossCorrelation {
    /// The lag with the greatest magnitude and the value there; none when there are no values.
    #[must_use]
    pub fn peak(&self) -> Option<(isize, f64)> {
        let strongest = self.values.iter().enumerate().max_by(|a, b| a.1.abs().total_cmp(&b.1.abs()))?;
        Some((self.first_lag + isize::try_from(strongest.0).ok()?, *strongest.1))
    }
}

/// Planned generalised cross-correlation: `r(lag) = sum over frequencies of W conj(A) B exp(i omega lag)`; with the
/// plain weight `r(lag) = sum_n a[n] b[n + lag]`, so the greatest value stands at *arrival at B minus arrival at A*.
///
/// Source: C. H. Knapp, G. C. Carter, IEEE Trans. ASSP 24(4), 1976.
///
/// ```
/// use arcstead_core::{GeneralisedCorrelation, Weighting};
/// let mut correlation = GeneralisedCorrelation::plan(5, Weighting::Plain);
/// let found = correlation.process(&[0.0, 1.0, 0.0, 0.0, 0.0], &[0.0, 0.0, 0.0, 2.0, 0.0], 4);
/// assert_eq!(found.peak().map(|(lag, _)| lag), Some(2));
/// ```
#[derive(Debug)]
pub struct GeneralisedCorrelation {
    transform: Transform,
    weighting: Weighting,
    a: Vec<Complex64>,
    b: Vec<Complex64>,
    cross: Vec<Complex64>,
    sums: Vec<[f64; 4]>,
}

impl GeneralisedCorrelation {
    /// For records of up to `sample_count` samples, padded so that no lag wraps onto another.
    #[must_use]
    pub fn plan(sample_count: usize, weighting: Weighting) -> Self {
        Self::with_length(fast_length(2 * sample_count.max(1)), weighting)
    }

    /// Circular correlation of records of exactly `length` samples: what leaves at one end enters at the other.
    #[must_use]
    pub fn plan_circular(length: usize, weighting: Weighting) -> Self {
        Self::with_length(length.max(2), weighting)
    }

    fn with_length(length: usize, weighting: Weighting) -> Self {
        let transform = Transform::plan(length);
        let spectrum = vec![Complex64::ZERO; transform.bins()];
        Self {
            a: spectrum.clone(),
            b: spectrum.clone(),
            cross: spectrum,
            transform,
            weighting,
            sums: Vec::new(),
        }
    }

    /// Correlates `a` and `b` at all lags from `-greatest_lag` to `greatest_lag` (fewer where the plan holds fewer).
    /// Samples beyond the planned length are not looked at.
    #[must_use]
    pub fn process(&mut self, a: &[f64], b: &[f64], greatest_lag: usize) -> CrossCorrelation {
        let length = self.transform.length();
        self.transform.forward(&a[..a.len().min(length)], &mut self.a);
        self.transform.forward(&b[..b.len().min(length)], &mut self.b);
        for ((cross, a), b) in self.cross.iter_mut().zip(&self.a).zip(&self.b) {
            *cross = a.conj() * b;
        }
        weighting::apply(self.weighting, &self.a, &self.b, &mut self.cross, &mut self.sums);
        let circular = self.transform.inverse(&mut self.cross);
        let greatest = greatest_lag.min((length - 1) / 2);
        let values =
            (0..=2 * greatest).map(|k| circular[(k + length - greatest) % length] / length as f64).collect();
        CrossCorrelation { first_lag: -(greatest as isize), values }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use rand::SeedableRng;
    use rand_chacha::ChaCha8Rng;
    use rand_distr::{Distribution, StandardNormal};

    fn noise(seed: u64, count: usize) -> Vec<f64> {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        (0..count).map(|_| StandardNormal.sample(&mut rng)).collect()
    }

    #[test]
    fn plain_equals_the_double_loop() {
        for count in 1..14 {
            let (a, b) = (noise(1, count), noise(2, count));
            let found = GeneralisedCorrelation::plan(count, Weighting::Plain).process(&a, &b, count - 1);
            for (k, value) in found.values.iter().enumerate() {
                let lag = found.first_lag + k as isize;
                let plain: f64 = (0..count as isize)
                    .filter(|n| (0..count as isize).contains(&(n + lag)))
                    .map(|n| a[n as usize] * b[(n + lag) as usize])
                    .sum();
                assert_relative_eq!(*value, plain, epsilon = 1e-12);
            }
        }
    }

    #[test]
    fn phase_transform_of_a_circular_shift_is_one_at_the_shift() {
        // Knapp, Carter 1976: white noise against its own circular shift by d.
        let a = noise(3, 240);
        let b: Vec<f64> = (0..240).map(|n| a[(n + 240 - 17) % 240]).collect();
        let weighting = Weighting::PhaseTransform { exponent: 1.0 };
        let found = GeneralisedCorrelation::plan_circular(240, weighting).process(&a, &b, 100);
        for (k, value) in found.values.iter().enumerate() {
            let expected = if found.first_lag + k as isize == 17 { 1.0 } else { 0.0 };
            assert_relative_eq!(*value, expected, epsilon = 1e-10);
        }
    }

    #[test]
    fn every_weight_finds_the_delay_of_a_noisy_copy_of_either_sign() {
        let source = noise(4, 600);
        for weighting in [
            Weighting::Plain,
            Weighting::PhaseTransform { exponent: 0.7 },
            Weighting::Scot,
            Weighting::MaximumLikelihood,
        ] {
            for sign in [1.0, -1.0] {
                let a: Vec<f64> = noise(5, 500).iter().zip(&source[20..]).map(|(n, s)| 0.5 * n + s).collect();
                let b: Vec<f64> =
                    noise(6, 500).iter().zip(&source[9..]).map(|(n, s)| 0.5 * n + sign * s).collect();
                let found = GeneralisedCorrelation::plan(500, weighting).process(&a, &b, 40);
                let (lag, value) = found.peak().unwrap();
                assert_eq!(lag, 11, "{weighting:?}");
                assert!(value * sign > 0.0);
            }
        }
    }

    #[test]
    fn silence_correlates_to_zero() {
        let found = GeneralisedCorrelation::plan(8, Weighting::Scot).process(&[0.0; 8], &[0.0; 8], 3);
        assert!(found.values.iter().all(|value| value.abs() < f64::MIN_POSITIVE));
    }
}
