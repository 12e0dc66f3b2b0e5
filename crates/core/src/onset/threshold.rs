//! First rise through a threshold.

use std::ops::Range;

use super::Onset;

/// The onset where the magnitude first rises through `level` in `window`, refined between the samples there.
///
/// A pulse of another amplitude crosses the same level at another point of its rise, so a level that is a share of
/// the channel's own peak compares channels more fairly than one for all of them.
///
/// None when the window reaches beyond the samples or the magnitude never rises through the level in it.
///
/// Source: common practice, no source.
///
/// ```
/// let onset = arcstead_core::threshold_onset(&[0.0, 0.1, -0.2, -2.0, 1.0], 0..5, 0.5);
/// assert_eq!(onset.map(|onset| onset.sample), Some(2));
/// ```
#[must_use]
pub fn threshold_onset(samples: &[f64], window: Range<usize>, level: f64) -> Option<Onset> {
    let start = window.start;
    let inside = samples.get(window)?;
    let at = inside.windows(2).position(|pair| pair[0].abs() < level && level <= pair[1].abs())?;
    Some(Onset::refined(samples, at + start, level))
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn the_crossing_lies_between_the_samples_that_straddle_it() {
        let signal = |t: f64| (-((t - 40.3) / 6.0).powi(2)).exp();
        let samples: Vec<f64> = (0..80).map(|n| signal(f64::from(n))).collect();
        let onset = threshold_onset(&samples, 0..80, 0.4).unwrap();
        assert_relative_eq!(signal(onset.position_samples), 0.4, epsilon = 1e-4);
        assert_eq!(threshold_onset(&samples, 0..80, 1.5), None);
        assert_eq!(threshold_onset(&samples, 50..80, 0.4), None);
    }
}
