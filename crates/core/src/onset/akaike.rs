//! Akaike's information criterion.

use std::ops::Range;

use super::Onset;

/// The onset that splits `window` best into two stretches of unlike variance: the minimum of
/// `AIC(k) = k ln var(x_1 .. x_k) + (N - k - 1) ln var(x_(k+1) .. x_N)`.
///
/// Variances are kept above 1e-12 of the variance of the whole window, so silence before the pulse is no trouble. There
/// is always a minimum, pulse or not: whether there is a pulse must be known before. The criterion turns where x^2
/// rises through `ln(v2 / v1) / (1 / v1 - 1 / v2)`, and the onset is refined between the samples there.
///
/// None when the window holds fewer than eight samples, reaches beyond the samples, holds only one value, or is
/// split best with the louder stretch first.
///
/// Source: N. Maeda, 1985; H. Zhang, C. Thurber, C. Rowe, Bull. Seism. Soc. Am. 93(5), 2003.
///
/// ```
/// let samples: Vec<f64> = (0..200).map(|n| if n < 120 { 0.1 } else { 2.0 } * f64::from(n % 2 * 2 - 1)).collect();
/// let onset = arcstead_core::akaike_onset(&samples, 0..200).ok_or("no onset")?;
/// assert_eq!(onset.sample, 119);
/// # Ok::<(), &str>(())
/// ```
#[must_use]
pub fn akaike_onset(samples: &[f64], window: Range<usize>) -> Option<Onset> {
    let start = window.start;
    let inside = samples.get(window)?;
    let count = inside.len();
    if count < 8 {
        return None;
    }
    let total = count as f64;
    let mean = inside.iter().sum::<f64>() / total;
    // About the mean the two sums lose no digits to an offset.
    let all: f64 = inside.iter().map(|x| (x - mean) * (x - mean)).sum();
    let floor = 1e-12 * all / total;
    if !(floor.is_finite() && floor > 0.0) {
        return None;
    }
    let (mut sum, mut square) = (0.0, 0.0);
    let mut best = (f64::INFINITY, 0, 0.0, 0.0);
    for (index, x) in inside.iter().enumerate().take(count - 2) {
        let x = x - mean;
        sum += x;
        square += x * x;
        let before = (index + 1) as f64;
        let after = total - before;
        if index < 1 {
            continue;
        }
        let early = (square / before - (sum / before).powi(2)).max(floor);
        let late = ((all - square) / after - (sum / after).powi(2)).max(floor);
        let criterion = before * early.ln() + (after - 1.0) * late.ln();
        if criterion < best.0 {
            best = (criterion, index, early, late);
        }
    }
    let (_, at, early, late) = best;
    if late <= early {
        return None;
    }
    let level = ((late / early).ln() / (1.0 / early - 1.0 / late)).sqrt();
    Some(Onset::refined(samples, at + start, level))
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::SeedableRng;
    use rand_chacha::ChaCha8Rng;
    use rand_distr::{Distribution, StandardNormal};

    #[test]
    fn a_step_of_variance_is_found_where_it_is() {
        // Maeda 1985, Zhang et al. 2003: variance 1, then 25 from sample 150 of 400; the expected minimum is at 150.
        let mut rng = ChaCha8Rng::seed_from_u64(1);
        let mut picks: Vec<usize> = (0..401)
            .map(|_| {
                let samples: Vec<f64> = (0..400)
                    .map(|n| {
                        let x: f64 = StandardNormal.sample(&mut rng);
                        if n < 150 { x } else { 5.0 * x }
                    })
                    .collect();
                akaike_onset(&samples, 0..400).unwrap().sample + 1
            })
            .collect();
        picks.sort_unstable();
        assert!(picks[200].abs_diff(150) <= 1, "median {}", picks[200]);
        assert!(picks[20] >= 140 && picks[380] <= 160, "{} {}", picks[20], picks[380]);
    }

    #[test]
    fn silence_before_the_pulse_is_no_trouble() {
        let samples: Vec<f64> =
            (0..100).map(|n| if n < 60 { 0.0 } else { f64::from(n % 2 * 2 - 1) }).collect();
        assert_eq!(akaike_onset(&samples, 0..100).map(|onset| onset.sample), Some(59));
        assert_eq!(akaike_onset(&[3.0; 100], 0..100), None);
        assert_eq!(akaike_onset(&samples[..7], 0..7), None);
        assert_eq!(akaike_onset(&samples, 90..101), None);
    }

    #[test]
    fn an_offset_or_a_scale_changes_nothing() {
        let samples: Vec<f64> =
            (0..200).map(|n| (f64::from(n) * 0.9).sin() * if n < 120 { 0.05 } else { 1.0 }).collect();
        let plain = akaike_onset(&samples, 0..200).unwrap().sample;
        let changed: Vec<f64> = samples.iter().map(|x| 1e-6 * (x + 40.0)).collect();
        assert_eq!(akaike_onset(&changed, 0..200).unwrap().sample, plain);
    }
}
