//! What several of the checks begin from.

use arcstead_solver::nalgebra::Vector3;
use arcstead_solver::{Air, Antenna, PositionSigma, Priors, SearchBox, Site};

/// Antennas at these places in air of this speed, and nothing else: no assets, no obstacles, and no systematic errors, so that
/// what counts is the timing given with the arrivals.
#[must_use]
pub fn bare_site(places_m: &[Vector3<f64>], speed_m_per_s: f64, search: SearchBox) -> Site {
    Site {
        antennas: places_m
            .iter()
            .enumerate()
            .map(|(index, &position_m)| Antenna {
                name: format!("A{}", index + 1),
                position_m,
                position_sigma: PositionSigma::Isotropic(0.0),
                delay_sigma_s: 0.0,
                response_sigma_s: 0.0,
            })
            .collect(),
        assets: vec![],
        obstacles: vec![],
        air: Air { speed_m_per_s },
        search,
        priors: Priors::default(),
    }
}
