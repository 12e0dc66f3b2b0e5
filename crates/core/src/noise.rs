//! The noise of a channel, found without knowing where the pulse is.

/// How much of the noise the median over blocks of `degrees_of_freedom` each falls short of their mean: the median of
/// a chi-square over its mean (E. B. Wilson, M. M. Hilferty, Proc. Natl. Acad. Sci. 17, 1931).
pub(crate) fn median_over_mean(degrees_of_freedom: f64) -> f64 {
    (1.0 - 2.0 / (9.0 * degrees_of_freedom)).max(0.1).powi(3)
}

/// Median of the mean powers of consecutive blocks of `block` samples: the power of the noise before the pulse is
/// known, right as long as the pulse and its echoes fill less than half of the record. `powers` is scratch.
///
/// The last, shorter block is left out unless it is the only one. Zero when there are no samples.
pub(crate) fn median_block_power(samples: &[f64], block: usize, powers: &mut Vec<f64>) -> f64 {
    powers.clear();
    powers.extend(samples.chunks_exact(block).map(mean_power));
    if powers.is_empty() {
        return mean_power(samples);
    }
    let middle = powers.len() / 2;
    *powers.select_nth_unstable_by(middle, f64::total_cmp).1
}

/// Mean square of the samples; zero when there are none.
pub(crate) fn mean_power(samples: &[f64]) -> f64 {
    if samples.is_empty() {
        return 0.0;
    }
    // Four sums side by side: one alone waits for each addition.
    let mut sums = [0.0; 4];
    let quads = samples.chunks_exact(4);
    let rest: f64 = quads.remainder().iter().map(|x| x * x).sum();
    for quad in quads {
        for (sum, x) in sums.iter_mut().zip(quad) {
            *sum += x * x;
        }
    }
    (sums.iter().sum::<f64>() + rest) / samples.len() as f64
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use rand::SeedableRng;
    use rand_chacha::ChaCha8Rng;
    use rand_distr::{Distribution, StandardNormal};

    #[test]
    fn a_pulse_does_not_raise_the_noise() {
        let mut rng = ChaCha8Rng::seed_from_u64(3);
        let mut samples: Vec<f64> = (0..40_000).map(|_| StandardNormal.sample(&mut rng)).collect();
        for x in &mut samples[9_000..20_000] {
            *x *= 100.0;
        }
        let found = median_block_power(&samples, 20, &mut Vec::new()) / median_over_mean(20.0);
        // A quarter of the blocks are loud, so the median stands at the 0.69 quantile of the quiet ones.
        assert!((0.95..1.35).contains(&found), "{found}");
    }

    #[test]
    fn mean_power_is_the_plain_sum() {
        for count in 0..12 {
            let samples: Vec<f64> = (0..count).map(|n| f64::from(n) - 3.0).collect();
            let plain = samples.iter().map(|x| x * x).sum::<f64>() / f64::from(count.max(1));
            assert_relative_eq!(mean_power(&samples), plain, max_relative = 1e-14);
        }
    }

    #[test]
    fn the_median_of_a_chi_square() {
        // NIST/SEMATECH e-Handbook 1.3.6.7.4: medians of chi-square with 2 and 10 degrees: 1.386, 9.342.
        assert_relative_eq!(median_over_mean(2.0) * 2.0, 1.386, epsilon = 0.02);
        assert_relative_eq!(median_over_mean(10.0) * 10.0, 9.342, epsilon = 0.01);
    }
}
