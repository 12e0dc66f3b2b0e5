//! How wrong the position may be, to first order: covariance in its random and systematic parts, and the ellipse in plan.

use nalgebra::{DMatrix, DVector, Matrix2, Matrix3, Vector3};
use statrs::distribution::{ChiSquared, ContinuousCDF};

use crate::error::SolveError;
use crate::likelihood::Evaluator;

/// Covariance of a position in m^2, linearised about it. On a plane the row and column of z are zero.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Covariance {
    /// From the timing error of the captures, `A S_rand A'`: falls as captures are added.
    pub random_m2: Matrix3<f64>,
    /// From delays, survey and responses, `A S_sys A'`: the same in every capture, never averaged away.
    pub systematic_m2: Matrix3<f64>,
}

impl Covariance {
    /// Both parts together.
    #[must_use]
    pub fn total_m2(&self) -> Matrix3<f64> {
        self.random_m2 + self.systematic_m2
    }
}

/// The covariance about `at_m`: with `A = (G' P G)^-1 G' P`, `A S A'` for the random and the systematic part of S. None
/// where the geometry leaves a direction undetermined.
///
/// # Errors
/// [`SolveError`] when the place is not finite.
pub fn covariance(
    evaluator: &mut Evaluator<'_>,
    at_m: &Vector3<f64>,
    unknowns: usize,
) -> Result<Option<Covariance>, SolveError> {
    let Some(sensitivity) = evaluator.sensitivity(at_m, unknowns)? else { return Ok(None) };
    let systematic = DVector::from_vec(evaluator.likelihood().systematic_variances_m2(at_m));
    let part = |covariance: &DMatrix<f64>| {
        let part = &sensitivity * covariance * sensitivity.transpose();
        // Symmetric to the last digit, whatever the rounding.
        Matrix3::from_fn(|row, column| 0.5 * (part[(row, column)] + part[(column, row)]))
    };
    let result = Covariance {
        random_m2: part(evaluator.likelihood().random_m2()),
        systematic_m2: part(&DMatrix::from_diagonal(&systematic)),
    };
    let finite = result.total_m2().iter().all(|value| value.is_finite());
    Ok(finite.then_some(result))
}

/// An ellipse in plan that holds the position with the probability stated, as far as the problem is linear.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ellipse {
    /// Probability that it holds the position.
    pub confidence: f64,
    /// Half the longer axis in metres.
    pub semi_major_m: f64,
    /// Half the shorter axis in metres.
    pub semi_minor_m: f64,
    /// Direction of the longer axis, clockwise from north (+y), 0 to 180 degrees.
    pub azimuth_deg: f64,
}

impl Ellipse {
    /// The ellipse of the plan part of a covariance in m^2.
    ///
    /// Axes are the square roots of the eigenvalues times the root of the chi-square quantile of 2 degrees of freedom
    /// (2.4477 at 0.95).
    #[must_use]
    pub fn in_plan(covariance_m2: &Matrix3<f64>, confidence: f64) -> Self {
        let plan: Matrix2<f64> = covariance_m2.fixed_view::<2, 2>(0, 0).into_owned();
        let eigen = plan.symmetric_eigen();
        let (major, minor) = if eigen.eigenvalues[0] >= eigen.eigenvalues[1] { (0, 1) } else { (1, 0) };
        let scale = chi_square_quantile(2, confidence).sqrt();
        let axis = eigen.eigenvectors.column(major);
        Self {
            confidence,
            semi_major_m: scale * eigen.eigenvalues[major].max(0.0).sqrt(),
            semi_minor_m: scale * eigen.eigenvalues[minor].max(0.0).sqrt(),
            azimuth_deg: axis[0].atan2(axis[1]).to_degrees().rem_euclid(180.0),
        }
    }
}

/// The value that chi-square with so many degrees of freedom stays below with this probability; zero for no degrees, and
/// for a probability of zero or less; infinite for one or more.
#[must_use]
pub fn chi_square_quantile(degrees: usize, probability: f64) -> f64 {
    if probability >= 1.0 {
        return f64::INFINITY;
    }
    if probability.is_nan() || probability <= 0.0 {
        return 0.0;
    }
    ChiSquared::new(degrees as f64).map_or(0.0, |distribution| distribution.inverse_cdf(probability))
}

/// Probability that chi-square with so many degrees of freedom exceeds `value`; none for no degrees.
#[must_use]
pub fn chi_square_exceedance(degrees: usize, value: f64) -> Option<f64> {
    ChiSquared::new(degrees as f64).ok().map(|distribution| distribution.sf(value))
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn the_ellipse_of_a_turned_covariance() {
        // Axes 3 and 1, the long one 30 degrees east of north.
        let azimuth = 30_f64.to_radians();
        let long = Vector3::new(azimuth.sin(), azimuth.cos(), 0.0);
        let short = Vector3::new(azimuth.cos(), -azimuth.sin(), 0.0);
        let covariance = long * long.transpose() * 9.0 + short * short.transpose();
        let ellipse = Ellipse::in_plan(&covariance, 0.95);
        assert_relative_eq!(ellipse.semi_major_m, 3.0 * 2.447_747, max_relative = 1e-6);
        assert_relative_eq!(ellipse.semi_minor_m, 2.447_747, max_relative = 1e-6);
        assert_relative_eq!(ellipse.azimuth_deg, 30.0, epsilon = 1e-9);
    }
}
