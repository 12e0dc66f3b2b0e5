//! Many captures of one source, put together into one set of arrivals.
//!
//! Each capture has its own unknown emission time, so what it tells is its precision with that time taken out,
//! `P_k`. They add: `Lambda = sum P_k`, the combined times are `Lambda^+ sum P_k t_k` and their random covariance
//! `Lambda^+`. Systematic errors are the same in every capture; they are not touched here.

use nalgebra::{DMatrix, DVector};

use crate::arrivals::Arrivals;
use crate::covariance::chi_square_quantile;

/// Several captures as one.
#[derive(Debug, Clone, PartialEq)]
pub struct Combined {
    /// The combined arrivals at every antenna that any capture heard. The random covariance is already enlarged where
    /// the captures scatter more than they state.
    pub arrivals: Arrivals,
    /// Number of captures.
    pub captures: usize,
    /// How the captures scatter about the combined times: a chi-square.
    pub scatter_chi_square: f64,
    /// Its degrees of freedom.
    pub scatter_degrees: usize,
    /// Factor by which the random covariance was enlarged, 1 or more: the scatter found over the scatter stated.
    pub enlargement: f64,
}

/// Puts captures of one source together.
///
/// None when there is no capture, when the parts of one do not fit together or are not finite, when their antennas do not
/// hang together (no chain of captures links two of the antennas), or when a covariance is not positive definite.
#[must_use]
pub fn combine(captures: &[&Arrivals]) -> Option<Combined> {
    if !captures.iter().all(|capture| capture.is_consistent()) {
        return None;
    }
    let mut antennas: Vec<usize> =
        captures.iter().flat_map(|capture| capture.antennas.iter().copied()).collect();
    antennas.sort_unstable();
    antennas.dedup();
    let n = antennas.len();
    let places: Vec<Vec<usize>> = captures
        .iter()
        .map(|capture| capture.antennas.iter().filter_map(|a| antennas.binary_search(a).ok()).collect())
        .collect();
    let precisions: Vec<DMatrix<f64>> = captures
        .iter()
        .map(|capture| contrast_precision(&capture.random_covariance_s2))
        .collect::<Option<_>>()?;

    let mut lambda = DMatrix::zeros(n, n);
    let mut eta = DVector::zeros(n);
    for ((capture, place), precision) in captures.iter().zip(&places).zip(&precisions) {
        // About the first arrival, which P takes out again: keeps the digits of the differences.
        let told = precision * capture.times_s.add_scalar(-capture.times_s[0]);
        for (i, &row) in place.iter().enumerate() {
            eta[row] += told[i];
            for (j, &column) in place.iter().enumerate() {
                lambda[(row, column)] += precision[(i, j)];
            }
        }
    }
    let covariance = contrast_inverse(&lambda)?;
    let times_s = &covariance * eta;

    let scatter_chi_square: f64 = captures
        .iter()
        .zip(&places)
        .zip(&precisions)
        .map(|((capture, place), precision)| misfit(capture, &times_s.select_rows(place), precision))
        .sum();
    let told: usize = captures.iter().map(|capture| capture.antennas.len() - 1).sum();
    let scatter_degrees = told - (n - 1);
    let enlargement = enlargement(scatter_chi_square, scatter_degrees);
    Some(Combined {
        arrivals: Arrivals { antennas, times_s, random_covariance_s2: covariance * enlargement },
        captures: captures.len(),
        scatter_chi_square,
        scatter_degrees,
        enlargement,
    })
}

/// Scatter beyond what chance explains (95 %) is used in place of the stated one. Scatter below it changes nothing.
fn enlargement(chi_square: f64, degrees: usize) -> f64 {
    if degrees == 0 || chi_square <= chi_square_quantile(degrees, 0.95) {
        return 1.0;
    }
    (chi_square / degrees as f64).max(1.0)
}

/// Chi-square of one capture against times known at the same antennas, its emission time free.
fn misfit(capture: &Arrivals, times_s: &DVector<f64>, precision: &DMatrix<f64>) -> f64 {
    let residual = &capture.times_s - times_s;
    let residual = residual.add_scalar(-residual[0]);
    (residual.transpose() * precision * residual)[0].max(0.0)
}

/// Chi-square of the difference between two sets of arrivals at their common antennas, both emission times free, and
/// its degrees of freedom. None when fewer than two antennas are common, or the parts of one do not fit together.
#[must_use]
pub fn disagreement(a: &Arrivals, b: &Arrivals) -> Option<(f64, usize)> {
    let common: Vec<(usize, usize)> = a
        .antennas
        .iter()
        .enumerate()
        .filter_map(|(i, antenna)| b.antennas.iter().position(|other| other == antenna).map(|j| (i, j)))
        .collect();
    if common.len() < 2 || !a.is_consistent() || !b.is_consistent() {
        return None;
    }
    let (of_a, of_b): (Vec<usize>, Vec<usize>) = common.into_iter().unzip();
    let covariance = a.random_covariance_s2.select_rows(&of_a).select_columns(&of_a)
        + b.random_covariance_s2.select_rows(&of_b).select_columns(&of_b);
    let precision = contrast_precision(&covariance)?;
    let first = a.only(|place| of_a.contains(&place));
    // `only` keeps the order of a, as `of_a` does.
    Some((misfit(&first, &b.times_s.select_rows(&of_b), &precision), of_a.len() - 1))
}

/// P: the precision of a covariance once a common offset is taken out. The covariance need only be positive definite
/// for differences; a single arrival tells nothing.
fn contrast_precision(covariance: &DMatrix<f64>) -> Option<DMatrix<f64>> {
    let n = covariance.nrows();
    if n == 0 {
        return None;
    }
    if n == 1 {
        return Some(DMatrix::zeros(1, 1));
    }
    let difference = DMatrix::from_fn(n - 1, n, |row, column| match column {
        0 => -1.0,
        _ if column == row + 1 => 1.0,
        _ => 0.0,
    });
    let inverse = (&difference * covariance * difference.transpose()).cholesky()?.inverse();
    Some(difference.transpose() * inverse * difference)
}

/// The pseudo-inverse of a precision whose only null direction is the common offset.
fn contrast_inverse(precision: &DMatrix<f64>) -> Option<DMatrix<f64>> {
    let n = precision.nrows();
    if n == 1 {
        return Some(DMatrix::zeros(1, 1));
    }
    let size = precision.trace() / n as f64;
    if !(size.is_finite() && size > 0.0) {
        return None;
    }
    // Lambda + size 11'/n has the inverse Lambda^+ + 11'/(n size).
    let share = 1.0 / n as f64;
    let full = precision.map(|value| value / size).add_scalar(share);
    let cholesky = full.cholesky()?;
    let least = cholesky.l_dirty().diagonal().min();
    // A second null direction shows as a pivot of rounding size.
    (least > 1e-7).then(|| cholesky.inverse().add_scalar(-share) / size)
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use rand::SeedableRng;
    use rand_chacha::ChaCha8Rng;
    use rand_distr::{Distribution, StandardNormal};

    fn captures(count: usize, stated_s: f64, true_s: f64) -> Vec<Arrivals> {
        let mut rng = ChaCha8Rng::seed_from_u64(5);
        let truth = [10e-9, 25e-9, 3e-9, 40e-9];
        (0..count)
            .map(|k| {
                let times: Vec<f64> = truth
                    .iter()
                    .map(|time| {
                        let error: f64 = StandardNormal.sample(&mut rng);
                        time + k as f64 * 1e-6 + true_s * error
                    })
                    .collect();
                Arrivals::independent(&times, &[stated_s; 4])
            })
            .collect()
    }

    fn combined(captures: &[Arrivals]) -> Combined {
        combine(&captures.iter().collect::<Vec<_>>()).unwrap()
    }

    #[test]
    fn the_random_part_falls_with_the_number_of_captures() {
        let one = combined(&captures(1, 1e-10, 0.0));
        let many = combined(&captures(16, 1e-10, 0.0));
        assert_relative_eq!(
            one.arrivals.random_covariance_s2,
            many.arrivals.random_covariance_s2 * 16.0,
            epsilon = 1e-30
        );
        // Lambda^+ of independent arrivals of equal sigma: sigma^2 (I - 11'/n).
        assert_relative_eq!(one.arrivals.random_covariance_s2[(0, 0)], 0.75e-20, max_relative = 1e-9);
        let delay = many.arrivals.times_s[3] - many.arrivals.times_s[2];
        assert_relative_eq!(delay, 37e-9, max_relative = 1e-9);
    }

    #[test]
    fn scatter_above_the_stated_sigma_is_used() {
        let honest = combined(&captures(400, 1e-10, 1e-10));
        assert_relative_eq!(honest.enlargement, 1.0);
        let liars = combined(&captures(400, 1e-10, 3e-10));
        assert!((liars.enlargement - 9.0).abs() < 1.5, "{}", liars.enlargement);
    }

    #[test]
    fn captures_that_missed_an_antenna_still_count() {
        let mut all = captures(2, 1e-10, 0.0);
        all[0] = all[0].only(|place| place != 1);
        let together = combined(&all);
        assert_eq!(together.arrivals.antennas, [0, 1, 2, 3]);
        let delay = together.arrivals.times_s[1] - together.arrivals.times_s[0];
        assert_relative_eq!(delay, 15e-9, max_relative = 1e-9);
    }

    #[test]
    fn antennas_that_do_not_hang_together_are_no_whole() {
        let whole = captures(1, 1e-10, 0.0).remove(0);
        let (left, right) = (whole.only(|place| place < 2), whole.only(|place| place >= 2));
        assert!(combine(&[&left, &right]).is_none());
        assert!(combine(&[]).is_none());
    }

    #[test]
    fn two_captures_of_one_source_disagree_by_chance_only() {
        let all = captures(200, 1e-10, 1e-10);
        let mean: f64 = (1..200).map(|k| disagreement(&all[0], &all[k]).unwrap().0).sum::<f64>() / 199.0;
        assert!(mean > 1.0 && mean < 8.0, "{mean}");
        let mut other = all[1].clone();
        other.times_s[2] += 5e-9;
        assert!(disagreement(&all[0], &other).unwrap().0 > 300.0);
    }
}
