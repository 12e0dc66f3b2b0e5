//! All pair delays fused into one time per channel.

use nalgebra::{DMatrix, DVector};

/// The delay of one pair of channels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PairDelay {
    /// First channel.
    pub a: usize,
    /// Second channel.
    pub b: usize,
    /// Arrival at B minus arrival at A, in any unit of time.
    pub delay: f64,
    /// Its variance, in that unit squared.
    pub variance: f64,
}

/// Fuses pair delays of `channel_count` channels into times by weighted least squares: the times t that minimise
/// `sum (t_b - t_a - delay)^2 / variance`, with mean zero.
///
/// None when the pairs do not connect all channels, or a variance is not positive and finite.
///
/// Source: common practice, no source.
///
/// ```
/// use arcstead_core::{PairDelay, fuse_delays};
/// let pair = |a, b, delay| PairDelay { a, b, delay, variance: 1.0 };
/// let times = fuse_delays(&[pair(0, 1, 1.0), pair(1, 2, 1.0), pair(0, 2, 2.3)], 3).ok_or("not connected")?;
/// assert!((times[2] - times[0] - 2.2).abs() < 1e-12);
/// # Ok::<(), &str>(())
/// ```
#[must_use]
pub fn fuse_delays(pairs: &[PairDelay], channel_count: usize) -> Option<Vec<f64>> {
    if pairs.iter().any(|pair| !(pair.variance > 0.0 && pair.variance.is_finite() && pair.delay.is_finite()))
    {
        return None;
    }
    let greatest = pairs.iter().fold(0.0, |most: f64, pair| most.max(1.0 / pair.variance));
    let mut normal = DMatrix::from_element(channel_count, channel_count, 1.0);
    let mut right = DVector::zeros(channel_count);
    for pair in pairs {
        // Weights relative to the greatest keep the matrix well scaled whatever the unit of time.
        let weight = 1.0 / (pair.variance * greatest);
        normal[(pair.a, pair.a)] += weight;
        normal[(pair.b, pair.b)] += weight;
        normal[(pair.a, pair.b)] -= weight;
        normal[(pair.b, pair.a)] -= weight;
        right[pair.b] += weight * pair.delay;
        right[pair.a] -= weight * pair.delay;
    }
    // The ones fix the mean; what is left singular then is a group of channels no pair leads to.
    let cholesky = normal.cholesky()?;
    let diagonal = cholesky.l_dirty().diagonal();
    if diagonal.min() < 1e-7 * diagonal.max() {
        return None;
    }
    Some(cholesky.solve(&right).iter().copied().collect())
}

/// Root mean square of `tau_ij + tau_jk + tau_ki` over all triangles of pairs given; none when there is no triangle.
#[must_use]
pub fn closure_error(pairs: &[PairDelay]) -> Option<f64> {
    let delay = |from: usize, to: usize| {
        pairs.iter().find_map(|pair| match (pair.a, pair.b) {
            (a, b) if (a, b) == (from, to) => Some(pair.delay),
            (a, b) if (b, a) == (from, to) => Some(-pair.delay),
            _ => None,
        })
    };
    let channels = pairs.iter().map(|pair| pair.a.max(pair.b) + 1).max()?;
    let (mut sum, mut count) = (0.0, 0);
    for i in 0..channels {
        for j in i + 1..channels {
            for k in j + 1..channels {
                if let (Some(ij), Some(jk), Some(ki)) = (delay(i, j), delay(j, k), delay(k, i)) {
                    sum += (ij + jk + ki).powi(2);
                    count += 1;
                }
            }
        }
    }
    (count > 0).then(|| (sum / f64::from(count)).sqrt())
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    fn pair(a: usize, b: usize, delay: f64, variance: f64) -> PairDelay {
        PairDelay { a, b, delay, variance }
    }

    #[test]
    fn consistent_delays_come_back_whatever_their_weights() {
        let times = [1.0, -2.0, 0.5, 3.0];
        let pairs: Vec<PairDelay> = (0..4)
            .flat_map(|a| (a + 1..4).map(move |b| (a, b)))
            .map(|(a, b)| pair(a, b, 1e-9 * (times[b] - times[a]), 1e-24 * (a + 2 * b) as f64))
            .collect();
        let fused = fuse_delays(&pairs, 4).unwrap();
        let mean = times.iter().sum::<f64>() / 4.0;
        for (found, time) in fused.iter().zip(times) {
            assert_relative_eq!(*found, 1e-9 * (time - mean), epsilon = 1e-20);
        }
        assert!(closure_error(&pairs).unwrap() < 1e-20);
    }

    #[test]
    fn an_uncertain_pair_moves_little() {
        let pairs = [pair(0, 1, 1.0, 1.0), pair(1, 2, 1.0, 1.0), pair(0, 2, 5.0, 1e6)];
        let fused = fuse_delays(&pairs, 3).unwrap();
        assert_relative_eq!(fused[2] - fused[0], 2.0, epsilon = 1e-4);
        assert_relative_eq!(closure_error(&pairs).unwrap(), 3.0);
    }

    #[test]
    fn channels_without_a_pair_cannot_be_fused() {
        assert_eq!(fuse_delays(&[pair(0, 1, 1.0, 1.0)], 3), None);
        assert_eq!(fuse_delays(&[pair(0, 1, 1.0, 0.0)], 2), None);
        assert_eq!(closure_error(&[pair(0, 1, 1.0, 1.0)]), None);
    }
}
