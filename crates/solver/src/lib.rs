//! Position, region and verdict from arrival times at antennas.

mod arrivals;
mod obstacle;
mod site;

pub use arrivals::Arrivals;
pub use nalgebra;
pub use obstacle::Obstacle;
pub use site::{Air, Antenna, Asset, PositionSigma, Priors, SPEED_OF_LIGHT_M_PER_S, SearchBox, Site};
