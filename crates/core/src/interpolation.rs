//! The value of a sampled signal between its samples.

use std::f64::consts::PI;

/// Samples on either side that count. With the Blackman window below, what is missed of a signal under 0.3 of the
/// sample rate stays below 1e-4 of its amplitude.
const REACH: isize = 12;

/// Value at `position_samples` of the band-limited signal through `samples`: a sinc under a Blackman window.
/// Outside the record the signal counts as zero. Exact on the samples.
pub(crate) fn value_between(samples: &[f64], position_samples: f64) -> f64 {
    let base = position_samples.floor();
    let fraction = position_samples - base;
    let base = base as isize;
    // sin(pi (x - k)) alternates in sign, so one sine serves all taps.
    let sine = (PI * fraction).sin();
    let mut sum = 0.0;
    for k in 1 - REACH..=REACH {
        let Some(sample) = usize::try_from(base + k).ok().and_then(|at| samples.get(at)) else { continue };
        let distance = fraction - k as f64;
        let sinc = if distance.abs() < 1e-9 {
            1.0
        } else {
            let sign = if k.rem_euclid(2) == 0 { 1.0 } else { -1.0 };
            sign * sine / (PI * distance)
        };
        let along = PI * distance / REACH as f64;
        sum += sample * sinc * (0.42 + 0.5 * along.cos() + 0.08 * (2.0 * along).cos());
    }
    sum
}

/// Where between `from` and `from + 1` the magnitude of the signal rises through `level`, in samples.
///
/// The caller has seen `|samples[from]| < level <= |samples[from + 1]|`. The band-limited signal is bisected until
/// the place is known to a thousandth of a sample.
pub(crate) fn rise_through(samples: &[f64], from: usize, level: f64) -> f64 {
    let (mut low, mut high) = (from as f64, from as f64 + 1.0);
    for _ in 0..10 {
        let middle = 0.5 * (low + high);
        if value_between(samples, middle).abs() < level {
            low = middle;
        } else {
            high = middle;
        }
    }
    // What is left of the interval is straight.
    let (below, above) = (value_between(samples, low).abs(), value_between(samples, high).abs());
    if above > below { low + (high - low) * ((level - below) / (above - below)).clamp(0.0, 1.0) } else { low }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn finds_the_signal_between_its_samples() {
        let signal = |t: f64| (1.7 * t + 0.3).sin() + 0.5 * (0.9 * t).cos();
        let samples: Vec<f64> = (0..80).map(|n| signal(f64::from(n))).collect();
        for k in 0..100 {
            let at = 30.0 + f64::from(k) * 0.173;
            assert_relative_eq!(value_between(&samples, at), signal(at), epsilon = 2e-4);
        }
        assert_relative_eq!(value_between(&samples, 33.0), samples[33], epsilon = 1e-12);
        assert!(value_between(&[], 0.0).abs() < 1e-12);
    }

    #[test]
    fn a_rise_is_found_to_a_thousandth_of_a_sample() {
        for k in 0..10 {
            let shift = f64::from(k) * 0.1;
            let signal =
                |t: f64| -((t - 40.0 - shift) * 1.1).sin() * (-((t - 45.0 - shift) / 8.0).powi(2)).exp();
            let samples: Vec<f64> = (0..90).map(|n| signal(f64::from(n))).collect();
            let from = (40..60).find(|&n| samples[n].abs() < 0.3 && samples[n + 1].abs() >= 0.3).unwrap();
            assert_relative_eq!(signal(rise_through(&samples, from, 0.3)).abs(), 0.3, epsilon = 1e-3);
        }
    }
}
