//! Why no position can be computed from arrivals.

use thiserror::Error;

/// Why no position can be computed from arrivals.
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
pub enum SolveError {
    /// Times, antennas and covariance do not belong together.
    #[error(
        "{antennas} antennas, {times} times and a covariance of {rows} x {columns}; expected one time per antenna and a square covariance of that size"
    )]
    Shape {
        /// Number of antenna indices.
        antennas: usize,
        /// Number of times.
        times: usize,
        /// Rows of the covariance.
        rows: usize,
        /// Columns of the covariance.
        columns: usize,
    },
    /// An antenna index is beyond the antennas of the site, or occurs twice.
    #[error("antenna index {index} occurs twice or is beyond the {antennas} antennas of the site")]
    AntennaIndex {
        /// The index.
        index: usize,
        /// Number of antennas of the site.
        antennas: usize,
    },
    /// Not enough arrivals for the unknowns.
    #[error("{received} arrivals; a place with {unknowns} unknown coordinates needs at least {needed}")]
    TooFewArrivals {
        /// Number of arrivals.
        received: usize,
        /// Number of unknown coordinates.
        unknowns: usize,
        /// Least number of arrivals.
        needed: usize,
    },
    /// More antennas than the visibility mask can hold.
    #[error("{antennas} antennas; at most {limit} can be solved together")]
    TooManyAntennas {
        /// Number of antennas.
        antennas: usize,
        /// The limit.
        limit: usize,
    },
    /// A time, a covariance or a coordinate is NaN or infinite.
    #[error("{what} is not a finite number")]
    NotFinite {
        /// What it is.
        what: &'static str,
    },
    /// The covariance of random and systematic errors is not positive definite.
    #[error(
        "the covariance of the arrival times is not positive definite; a sigma of zero, or wrong correlations"
    )]
    Covariance,
    /// The antennas are all at one place, so that delays tell nothing.
    #[error(
        "the antennas that received the pulse all stand at one place; no delay between them tells a direction"
    )]
    CoincidentAntennas,
    /// A number of the site is out of its range.
    #[error("{what} is {found}; expected {expected}")]
    Site {
        /// Which number.
        what: &'static str,
        /// Its value.
        found: f64,
        /// What it may be.
        expected: &'static str,
    },
    /// The search box is empty.
    #[error("the search box is empty or not finite; expected min below max on x and y")]
    SearchBox,
}
