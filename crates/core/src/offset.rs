//! The constant part of a channel.

/// Mean of the samples in their own unit; zero when there are none.
///
/// A band-pass removes any constant by itself, but answers its sudden start at the first sample with a transient:
/// taken off before, there is nothing to start. The pulse's own mean that goes with it is constant too.
#[must_use]
pub fn offset(samples: &[f32]) -> f64 {
    if samples.is_empty() {
        return 0.0;
    }
    samples.iter().map(|&x| f64::from(x)).sum::<f64>() / samples.len() as f64
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn is_the_mean_even_far_from_zero() {
        let samples: Vec<f32> = (0..10_000).map(|n| 1e6 + if n % 2 == 0 { 0.5 } else { -0.5 }).collect();
        assert_relative_eq!(offset(&samples), 1e6, max_relative = 1e-12);
        assert_relative_eq!(offset(&[]), 0.0);
    }
}
