//! What the solver starts from: arrival times at antennas.

use nalgebra::{DMatrix, DVector};

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
