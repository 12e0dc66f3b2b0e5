//! Whitening with the emission time taken out.

use nalgebra::DMatrix;

/// What a covariance S of arrival errors turns residuals r into: `z = W r` with `|z|^2 = r' P r`, where
/// `P = S^-1 - S^-1 1 1' S^-1 / (1' S^-1 1)` is the precision that is left when the unknown moment of emission,
/// common to all arrivals, is marginalised with a flat prior.
///
/// With S = L L' and u the unit vector along L^-1 1, `W = (I - u u') L^-1`. W never differences against a chosen
/// reference antenna, so no antenna is special.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Weights {
    /// W, row-major, n x n.
    whitener: Vec<f64>,
    /// Euclidean norm of each column of W: how far z moves when one residual moves by one metre.
    pub(crate) column_norms: Vec<f64>,
    /// `ln det S + ln(1' S^-1 1)`: the part of -2 ln likelihood that depends on S alone.
    pub(crate) ln_determinants: f64,
    /// `S^-1 1 / (1' S^-1 1)`: the weighted mean that estimates the emission time.
    mean: Vec<f64>,
    /// Scratch: the Cholesky factor L.
    lower: Vec<f64>,
}

impl Weights {
    /// None when S (row-major, n x n) is not positive definite, or not finite.
    pub(crate) fn new(covariance: &[f64], n: usize) -> Option<Self> {
        let mut weights = Self {
            whitener: vec![0.0; n * n],
            column_norms: vec![0.0; n],
            ln_determinants: 0.0,
            mean: vec![0.0; n],
            lower: vec![0.0; n * n],
        };
        weights.refill(covariance).then_some(weights)
    }

    /// Makes these the weights of another covariance of the same size, in the memory there is. False when it is not
    /// positive definite; the weights are then of no use.
    ///
    /// Plain loops: this runs for every place where antennas' sigmas differ by direction, on a handful of antennas.
    pub(crate) fn refill(&mut self, covariance: &[f64]) -> bool {
        let n = self.mean.len();
        let lower = &mut self.lower;
        let mut ln_det_s = 0.0;
        for i in 0..n {
            for j in 0..=i {
                let known: f64 = (0..j).map(|k| lower[i * n + k] * lower[j * n + k]).sum();
                let left = covariance[i * n + j] - known;
                if i == j {
                    // Written so that NaN is refused too.
                    if !(left > 0.0 && left.is_finite()) {
                        return false;
                    }
                    lower[i * n + i] = left.sqrt();
                    ln_det_s += left.ln();
                } else {
                    lower[i * n + j] = left / lower[j * n + j];
                }
            }
        }
        // L^-1 into `whitener`, row by row, and L^-1 1 into `column_norms` until they are known.
        let inverse = &mut self.whitener;
        inverse.fill(0.0);
        for i in 0..n {
            let pivot = 1.0 / lower[i * n + i];
            inverse[i * n + i] = pivot;
            for j in 0..i {
                let known: f64 = (j..i).map(|k| lower[i * n + k] * inverse[k * n + j]).sum();
                inverse[i * n + j] = -pivot * known;
            }
            self.column_norms[i] = inverse[i * n..(i + 1) * n].iter().sum();
        }
        let ones_norm = self.column_norms.iter().map(|value| value * value).sum::<f64>().sqrt();
        self.ln_determinants = ln_det_s + 2.0 * ones_norm.ln();
        // u' L^-1; over the norm of L^-1 1 it is the weighted mean.
        for j in 0..n {
            let row: f64 = (j..n).map(|i| self.column_norms[i] * inverse[i * n + j]).sum();
            self.mean[j] = row / (ones_norm * ones_norm);
        }
        for i in 0..n {
            for j in 0..n {
                inverse[i * n + j] -= self.column_norms[i] * self.mean[j];
            }
        }
        for j in 0..n {
            self.column_norms[j] = (0..n).map(|i| inverse[i * n + j].powi(2)).sum::<f64>().sqrt();
        }
        self.ln_determinants.is_finite() && self.column_norms.iter().all(|value| value.is_finite())
    }

    /// Writes `W r` to `whitened`.
    pub(crate) fn apply(&self, residuals: &[f64], whitened: &mut [f64]) {
        let n = residuals.len();
        for (row, z) in self.whitener.chunks_exact(n).zip(whitened) {
            *z = row.iter().zip(residuals).map(|(w, r)| w * r).sum();
        }
    }

    /// W as a matrix.
    pub(crate) fn matrix(&self) -> DMatrix<f64> {
        let n = self.mean.len();
        DMatrix::from_row_slice(n, n, &self.whitener)
    }

    /// The estimate of the common part of the residuals.
    pub(crate) fn common(&self, residuals: &[f64]) -> f64 {
        self.mean.iter().zip(residuals).map(|(w, r)| w * r).sum()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use nalgebra::DVector;

    fn of(covariance: &DMatrix<f64>) -> Option<Weights> {
        // Symmetric, so that column-major is row-major.
        Weights::new(covariance.as_slice(), covariance.nrows())
    }

    fn covariance() -> DMatrix<f64> {
        DMatrix::from_row_slice(3, 3, &[2.0, 0.3, 0.1, 0.3, 1.0, -0.2, 0.1, -0.2, 0.5])
    }

    fn chi_square(weights: &Weights, residuals: &[f64]) -> f64 {
        let mut z = vec![0.0; residuals.len()];
        weights.apply(residuals, &mut z);
        z.iter().map(|value| value * value).sum()
    }

    #[test]
    fn is_the_least_over_all_emission_times() {
        let covariance = covariance();
        let weights = of(&covariance).unwrap();
        let residuals = DVector::from_row_slice(&[0.4, -1.0, 2.0]);
        let inverse = covariance.try_inverse().unwrap();
        let at = |t0: f64| {
            let r = residuals.add_scalar(-t0);
            (r.transpose() * &inverse * r)[0]
        };
        let t0 = weights.common(residuals.as_slice());
        assert_relative_eq!(chi_square(&weights, residuals.as_slice()), at(t0), max_relative = 1e-12);
        assert!(at(t0) < at(t0 + 1e-3) && at(t0) < at(t0 - 1e-3));
    }

    #[test]
    fn equals_differences_with_their_full_covariance() {
        // T. Chan, K. Ho 1994 and common practice use N - 1 differences; with their full covariance they are
        // the same thing, whichever antenna is the reference.
        let covariance = covariance();
        let weights = of(&covariance).unwrap();
        let residuals = DVector::from_row_slice(&[0.4, -1.0, 2.0]);
        for reference in 0..3 {
            let others: Vec<usize> = (0..3).filter(|&i| i != reference).collect();
            let difference = DMatrix::from_fn(2, 3, |row, column| {
                f64::from(u8::from(column == others[row])) - f64::from(u8::from(column == reference))
            });
            let d = &difference * &residuals;
            let c = (&difference * &covariance * difference.transpose()).try_inverse().unwrap();
            let expected = (d.transpose() * c * d)[0];
            assert_relative_eq!(chi_square(&weights, residuals.as_slice()), expected, max_relative = 1e-12);
        }
    }

    #[test]
    fn determinants_are_those_of_the_differences() {
        // ln det S + ln(1' S^-1 1) is ln det of the covariance of differences.
        let covariance = covariance();
        let weights = of(&covariance).unwrap();
        let difference = DMatrix::from_row_slice(2, 3, &[-1.0, 1.0, 0.0, -1.0, 0.0, 1.0]);
        let c = &difference * &covariance * difference.transpose();
        assert_relative_eq!(weights.ln_determinants, c.determinant().ln(), max_relative = 1e-12);
    }

    #[test]
    fn refuses_what_is_no_covariance() {
        assert!(of(&DMatrix::from_element(2, 2, 1.0)).is_none());
        assert!(of(&DMatrix::from_element(2, 2, f64::NAN)).is_none());
    }
}
