//! What the solver starts from: arrival times at antennas.

use nalgebra::{DMatrix, DVector};

use crate::error::SolveError;
use crate::likelihood::MOST_ANTENNAS;
use crate::site::Site;

/// Arrival times of one source at some of the antennas of a site, delays already subtracted.
///
/// The times are known up to a common offset, the moment of emission: `t_i = t0 + L_i(x)/v + e_i`. The
/// covariance given here is the random part; the systematic part comes from the site.
#[derive(Debug, Clone, PartialEq)]
pub struct Arrivals {
    /// Index into the antennas of the site, one per arrival; each antenna at most once.
    pub antennas: Vec<usize>,
    /// Arrival times in seconds, one per entry of `antennas`.
    pub times_s: DVector<f64>,
    /// Random covariance in s^2, shape arrivals x arrivals; only its part for time differences counts.
    pub random_covariance_s2: DMatrix<f64>,
}

impl Arrivals {
    /// Arrivals with independent errors of `sigma_s` each, at the first antennas of a site in their order.
    #[must_use]
    pub fn independent(times_s: &[f64], sigma_s: &[f64]) -> Self {
        Self {
            antennas: (0..times_s.len()).collect(),
            times_s: DVector::from_row_slice(times_s),
            random_covariance_s2: DMatrix::from_diagonal(
                &DVector::from_row_slice(sigma_s).map(|sigma| sigma * sigma),
            ),
        }
    }

    /// The arrivals whose place in the list satisfies `keep`.
    #[must_use]
    pub fn only(&self, keep: impl Fn(usize) -> bool) -> Self {
        let kept: Vec<usize> = (0..self.antennas.len()).filter(|&i| keep(i)).collect();
        Self {
            antennas: kept.iter().map(|&i| self.antennas[i]).collect(),
            times_s: self.times_s.select_rows(&kept),
            random_covariance_s2: self.random_covariance_s2.select_rows(&kept).select_columns(&kept),
        }
    }

    /// Whether there are as many times, and as many rows and columns of the covariance, as antennas, all of them finite.
    #[must_use]
    pub fn is_consistent(&self) -> bool {
        let n = self.antennas.len();
        self.times_s.len() == n
            && self.random_covariance_s2.shape() == (n, n)
            && self.times_s.iter().chain(self.random_covariance_s2.iter()).all(|value| value.is_finite())
    }

    /// Whether the arrivals fit together and to the site.
    ///
    /// # Errors
    /// The first thing found wrong.
    pub fn check(&self, site: &Site) -> Result<(), SolveError> {
        let n = self.antennas.len();
        let covariance = &self.random_covariance_s2;
        if self.times_s.len() != n || covariance.nrows() != n || covariance.ncols() != n {
            return Err(SolveError::Shape {
                antennas: n,
                times: self.times_s.len(),
                rows: covariance.nrows(),
                columns: covariance.ncols(),
            });
        }
        if n > MOST_ANTENNAS {
            return Err(SolveError::TooManyAntennas { antennas: n, limit: MOST_ANTENNAS });
        }
        for (place, &index) in self.antennas.iter().enumerate() {
            if index >= site.antennas.len() || self.antennas[..place].contains(&index) {
                return Err(SolveError::AntennaIndex { index, antennas: site.antennas.len() });
            }
        }
        if !self.times_s.iter().chain(covariance.iter()).all(|value| value.is_finite()) {
            return Err(SolveError::NotFinite { what: "an arrival time or its covariance" });
        }
        let unknowns = site.search.unknowns();
        if n < 2 {
            return Err(SolveError::TooFewArrivals { received: n, unknowns, needed: unknowns + 1 });
        }
        Ok(())
    }
}
