//! Energy criterion.

use std::ops::Range;

use super::Onset;

/// The onset where the energy begins to rise faster than its mean rate in `window`: the minimum of
/// `S_i = sum_(k <= i) x_k^2 - i d`, `d = S_N / (alpha N)`, with S_N the energy of the N samples of the window.
///
/// It works only while the power of the noise is below d and that of the pulse above it: the window should begin
/// not long before the pulse and end near its peak. `alpha` 1 or more; a greater one picks earlier.
/// The minimum is where |x| rises through sqrt(d) for the last time before the energy takes off, and is refined
/// between the samples there.
///
/// None when the window holds fewer than three samples, reaches beyond the samples, or holds no energy. A minimum at
/// the start of the window is no onset either: the pulse began before it.
///
/// Source: P. Wagenaars, P. Wouters, P. van der Wielen, E. Steennis, 2008; S. Markalous, S. Tenbohlen, K. Feser, 2008.
///
/// ```
/// let mut samples = vec![0.0; 150];
/// samples.resize(400, 1.0);
/// assert_eq!(arcstead_core::energy_onset(&samples, 0..400, 1.0).map(|onset| onset.sample), Some(149));
/// ```
#[must_use]
pub fn energy_onset(samples: &[f64], window: Range<usize>, alpha: f64) -> Option<Onset> {
    let start = window.start;
    let inside = samples.get(window)?;
    if inside.len() < 3 {
        return None;
    }
    let energy: f64 = inside.iter().map(|x| x * x).sum();
    let rate = energy / (alpha * inside.len() as f64);
    if !(rate.is_finite() && rate > 0.0) {
        return None;
    }
    let (mut sum, mut least, mut at) = (0.0, f64::INFINITY, 0);
    for (index, x) in inside.iter().enumerate() {
        sum += x * x - rate;
        if sum < least {
            (least, at) = (sum, index);
        }
    }
    let onset = (at > 0 && at + 1 < inside.len()).then_some(at + start)?;
    Some(Onset::refined(samples, onset, rate.sqrt()))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_step_of_power_is_found_at_its_last_quiet_sample() {
        // Wagenaars et al. 2008, Markalous et al. 2008 (formula from memory): 150 zeros, then 250 ones.
        let samples: Vec<f64> = (0..400).map(|n| f64::from(u8::from(n >= 150))).collect();
        for alpha in [1.0, 2.0, 5.0, 10.0] {
            let onset = energy_onset(&samples, 0..400, alpha).unwrap();
            assert_eq!(onset.sample, 149);
            assert!((149.0..=150.0).contains(&onset.position_samples));
        }
    }

    #[test]
    fn silence_and_slivers_have_no_onset() {
        assert_eq!(energy_onset(&[0.0; 50], 0..50, 1.0), None);
        assert_eq!(energy_onset(&[1.0, 2.0], 0..2, 1.0), None);
        assert_eq!(energy_onset(&[1.0; 10], 5..20, 1.0), None);
        // Loud from the first sample: the onset is not in the window.
        let fading: Vec<f64> = (0..100).map(|n| (-f64::from(n) / 10.0).exp()).collect();
        assert_eq!(energy_onset(&fading, 0..100, 1.0), None);
    }
}
