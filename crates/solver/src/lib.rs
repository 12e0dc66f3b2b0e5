//! Position, region and verdict from arrival times at antennas.
//!
//! [`Arrivals`] and a [`Site`] go in, a [`Fix`] comes out of [`locate`]. Everything between asks one function, the
//! profile likelihood ([`likelihood`]): the unknown moment of emission is marginalised, never differenced against a chosen
//! antenna.
//!
//! ```
//! use arcstead_solver::nalgebra::Vector3;
//! use arcstead_solver::{Air, Antenna, Arrivals, PositionSigma, Priors, SearchBox, Site, locate};
//!
//! let antennas: Vec<Antenna> = [[0.0, 0.0, 1.5], [15.0, 1.0, 4.0], [14.0, 13.0, 1.5], [1.0, 12.0, 5.0], [8.0, -4.0, 3.0]]
//!     .into_iter()
//!     .enumerate()
//!     .map(|(i, position)| Antenna {
//!         name: format!("A{}", i + 1),
//!         position_m: position.into(),
//!         position_sigma: PositionSigma::Isotropic(0.03),
//!         delay_sigma_s: 0.1e-9,
//!         response_sigma_s: 0.05e-9,
//!     })
//!     .collect();
//! let site = Site {
//!     search: SearchBox::around(&antennas, &[]).ok_or("no antennas")?,
//!     antennas,
//!     assets: vec![],
//!     obstacles: vec![],
//!     air: Air::default(),
//!     priors: Priors::default(),
//! };
//! let source = Vector3::new(6.0, 7.0, 5.0);
//! let times: Vec<f64> = site
//!     .antennas
//!     .iter()
//!     .map(|antenna| (antenna.position_m - source).norm() / site.air.speed_m_per_s)
//!     .collect();
//! let fix = locate(&site, &Arrivals::independent(&times, &[5e-11; 5]), 0.95)?;
//! assert!((fix.position_m - source).norm() < 1e-3);
//! assert_eq!(fix.fit.degrees_of_freedom, 1);
//! # Ok::<(), Box<dyn std::error::Error>>(())
//! ```
//!
//! | module | holds |
//! |---|---|
//! | `site`, `obstacle` | antennas, assets, what is in the way, the medium, the search box, priors |
//! | `arrivals`, `combine`, `consensus` | arrival times; many captures of one source as one; which captures are of one source |
//! | [`likelihood`], `weights` | the function all others ask, and its whitening |
//! | [`closed_form`], [`least_squares`] | the algebraic start, and the refinement |
//! | `branch_and_bound`, `domain`, `modes` | the search that cannot miss, over a box or an asset, and the separate answers in it |
//! | `covariance`, `region`, `verdict` | how wrong it may be, where it may be, what it is |
//! | `impossible`, `fix` | delays no place can cause; all of it together |
//!
//! Conventions: SI units; local coordinates, right-handed, in metres, x east, y north, z up; azimuth clockwise from north;
//! a delay between A and B is arrival at B minus arrival at A; a confidence level is the probability that a region holds
//! the source.

mod arrivals;
mod branch_and_bound;
pub mod closed_form;
mod combine;
mod consensus;
mod covariance;
mod domain;
mod error;
mod fix;
mod impossible;
pub mod least_squares;
pub mod likelihood;
mod modes;
mod obstacle;
mod region;
mod site;
mod verdict;
mod weights;

pub use arrivals::Arrivals;
pub use combine::{Combined, combine, disagreement};
pub use consensus::{Consensus, consensus};
pub use covariance::{Covariance, Ellipse, chi_square_exceedance, chi_square_quantile, covariance};
pub use error::SolveError;
pub use fix::{AMBIGUOUS, AntennaFit, Fit, Fix, Flag, locate};
pub use impossible::{ImpossibleDelay, LATE_SCALES, SLACK_SIGMAS, set_aside};
pub use modes::Mode;
pub use nalgebra;
pub use obstacle::Obstacle;
pub use region::{Bearing, Region};
pub use site::{Air, Antenna, Asset, PositionSigma, Priors, SPEED_OF_LIGHT_M_PER_S, SearchBox, Site};
pub use verdict::{MOST_NAMED, NEARLY_ALL, POOR_FIT, SURE, Statement, Verdict};
