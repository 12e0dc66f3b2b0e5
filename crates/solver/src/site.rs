//! The geometry of a site: antennas, what may discharge, what hides it, and the air between.

use nalgebra::Vector3;

use crate::error::SolveError;
use crate::obstacle::Obstacle;

/// Speed of light in vacuum, m/s (exact; SI definition of the metre).
pub const SPEED_OF_LIGHT_M_PER_S: f64 = 299_792_458.0;

/// Everything the solver must know about a site.
///
/// Coordinates are local, right-handed, in metres: x east, y north, z up.
#[derive(Debug, Clone, PartialEq)]
pub struct Site {
    /// The antennas, in the order the arrivals refer to.
    pub antennas: Vec<Antenna>,
    /// What the source may be on.
    pub assets: Vec<Asset>,
    /// What radio does not pass.
    pub obstacles: Vec<Obstacle>,
    /// The medium between source and antennas.
    pub air: Air,
    /// Where a source is searched.
    pub search: SearchBox,
    /// What is believed before any pulse is heard.
    pub priors: Priors,
}

impl Site {
    /// Whether assets, priors and search box are usable; antennas and arrivals are checked with each other.
    ///
    /// # Errors
    /// [`SolveError`] with the first thing out of its range.
    pub fn check(&self) -> Result<(), SolveError> {
        let range = |good: bool, what, found, expected| {
            if good { Ok(()) } else { Err(SolveError::Site { what, found, expected }) }
        };
        let SearchBox { min_m, max_m } = &self.search;
        let finite = min_m.iter().chain(max_m.iter()).all(|value| value.is_finite());
        if !(finite && min_m.x < max_m.x && min_m.y < max_m.y && min_m.z <= max_m.z) {
            return Err(SolveError::SearchBox);
        }
        let Priors { elsewhere, late, late_scale_s } = self.priors;
        range((0.0..=1.0).contains(&elsewhere), "the prior of elsewhere", elsewhere, "0 to 1")?;
        range((0.0..=1.0).contains(&late), "the prior of a late arrival", late, "0 to 1")?;
        range(
            late_scale_s > 0.0 && late_scale_s.is_finite(),
            "the scale of late arrivals in seconds",
            late_scale_s,
            "more than 0",
        )?;
        for asset in &self.assets {
            let ends = asset.from_m.iter().chain(asset.to_m.iter());
            if !ends.chain([&asset.radius_m]).all(|value| value.is_finite()) {
                return Err(SolveError::NotFinite { what: "the place or radius of an asset" });
            }
            let weight = asset.weight;
            range(weight > 0.0 && weight.is_finite(), "the weight of an asset", weight, "more than 0")?;
        }
        Ok(())
    }
}

/// One antenna and how well its place and its chain are known.
#[derive(Debug, Clone, PartialEq)]
pub struct Antenna {
    /// Name, unique on the site.
    pub name: String,
    /// Phase centre in metres.
    pub position_m: Vector3<f64>,
    /// How well the phase centre is known.
    pub position_sigma: PositionSigma,
    /// Standard deviation of the delay of antenna, cable and recorder channel, in seconds.
    pub delay_sigma_s: f64,
    /// Standard deviation of what unlike antennas, polarisation and dispersion add for one source, in seconds.
    pub response_sigma_s: f64,
}

impl Antenna {
    /// Variance of what delay and response leave open, in s^2: the systematic part of an arrival that is not the survey's.
    #[must_use]
    pub fn chain_variance_s2(&self) -> f64 {
        self.delay_sigma_s.powi(2) + self.response_sigma_s.powi(2)
    }
}

/// Standard deviation of an antenna's position.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum PositionSigma {
    /// The same along the line of sight, whatever its direction, in metres.
    Isotropic(f64),
    /// Along x, y and z, in metres; what counts is its projection on the line to the source.
    PerAxis(Vector3<f64>),
}

impl PositionSigma {
    /// Variance of the distance along the unit vector `direction`, in m^2.
    #[must_use]
    pub fn variance_along_m2(&self, direction: &Vector3<f64>) -> f64 {
        match self {
            Self::Isotropic(sigma_m) => sigma_m * sigma_m,
            Self::PerAxis(sigma_m) => sigma_m.component_mul(direction).norm_squared(),
        }
    }

    /// Smallest and greatest variance over all directions, in m^2.
    #[must_use]
    pub fn variance_range_m2(&self) -> (f64, f64) {
        match self {
            Self::Isotropic(sigma_m) => (sigma_m * sigma_m, sigma_m * sigma_m),
            Self::PerAxis(sigma_m) => (sigma_m.min().powi(2), sigma_m.max().powi(2)),
        }
    }
}

/// Something that may discharge: a point or a straight piece, thickened by a radius.
#[derive(Debug, Clone, PartialEq)]
pub struct Asset {
    /// Name, unique on the site.
    pub name: String,
    /// What it is, in free text.
    pub kind: String,
    /// One end of the piece, in metres.
    pub from_m: Vector3<f64>,
    /// The other end; the same as `from_m` for a point.
    pub to_m: Vector3<f64>,
    /// How far from the piece its surface, or its survey, may be, in metres.
    pub radius_m: f64,
    /// Relative prior weight.
    pub weight: f64,
}

/// The medium between source and antennas.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Air {
    /// Speed of the wave in m/s.
    pub speed_m_per_s: f64,
}

impl Air {
    /// Air of radio refractivity `n_units` (N): speed c / (1 + N 1e-6) (Recommendation ITU-R P.453, eq. 1).
    #[must_use]
    pub fn from_refractivity(n_units: f64) -> Self {
        Self { speed_m_per_s: SPEED_OF_LIGHT_M_PER_S / (1.0 + n_units * 1e-6) }
    }
}

impl Default for Air {
    /// Refractivity 315, the reference of Recommendation ITU-R P.453.
    fn default() -> Self {
        Self::from_refractivity(315.0)
    }
}

/// The axis-parallel box in which a source is searched; flat (equal z) for a search on a plane.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SearchBox {
    /// Lowest corner in metres.
    pub min_m: Vector3<f64>,
    /// Highest corner in metres.
    pub max_m: Vector3<f64>,
}

impl SearchBox {
    /// The search box of a site that names none: around antennas and assets, each side widened by 25 %
    /// (at least 5 m); z from 0 to 5 m above the highest of them.
    ///
    /// None when there is nothing to search around.
    #[must_use]
    pub fn around(antennas: &[Antenna], assets: &[Asset]) -> Option<Self> {
        let mut points =
            antennas.iter().map(|a| a.position_m).chain(assets.iter().flat_map(|a| [a.from_m, a.to_m]));
        let first = points.next()?;
        let (low, high) = points.fold((first, first), |(low, high), p| (low.inf(&p), high.sup(&p)));
        let margin = ((high - low) * 0.25).map(|side| side.max(5.0));
        let (mut min_m, mut max_m) = (low - margin, high + margin);
        min_m.z = low.z.min(0.0);
        max_m.z = high.z + 5.0;
        Some(Self { min_m, max_m })
    }

    /// Whether the search is on a horizontal plane: the box has no height.
    #[must_use]
    pub fn is_plane(&self) -> bool {
        self.max_m.z <= self.min_m.z
    }

    /// Number of unknown coordinates: 2 on a plane, 3 in space.
    #[must_use]
    pub fn unknowns(&self) -> usize {
        if self.is_plane() { 2 } else { 3 }
    }

    /// Volume in m^3, or area in m^2 on a plane.
    #[must_use]
    pub fn measure(&self) -> f64 {
        let side = self.max_m - self.min_m;
        if self.is_plane() { side.x * side.y } else { side.x * side.y * side.z }
    }

    /// Whether the point lies in the box or on its surface.
    #[must_use]
    pub fn contains(&self, point_m: &Vector3<f64>) -> bool {
        (0..3).all(|axis| self.min_m[axis] <= point_m[axis] && point_m[axis] <= self.max_m[axis])
    }

    /// The point of the box nearest to `point_m`.
    #[must_use]
    pub fn nearest(&self, point_m: &Vector3<f64>) -> Vector3<f64> {
        point_m.sup(&self.min_m).inf(&self.max_m)
    }
}

/// What is believed before any pulse is heard.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Priors {
    /// Probability that the source is on none of the assets.
    pub elsewhere: f64,
    /// Probability that an arrival with a clear line of sight is late all the same. Kept for the mixture of direct and late
    /// arrivals; the likelihood does not use it yet.
    pub late: f64,
    /// Mean excess of a late arrival over the direct way, in seconds.
    pub late_scale_s: f64,
}

impl Default for Priors {
    fn default() -> Self {
        Self { elsewhere: 0.1, late: 0.02, late_scale_s: 10e-9 }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn air_of_the_reference_refractivity() {
        // Recommendation ITU-R P.453: n = 1 + N 1e-6, reference N = 315.
        assert_relative_eq!(Air::default().speed_m_per_s, 299_698_053.1, epsilon = 0.05);
    }

    #[test]
    fn default_box_widens_each_side() {
        let antenna = |x: f64, y: f64, z: f64| Antenna {
            name: format!("{x}/{y}"),
            position_m: Vector3::new(x, y, z),
            position_sigma: PositionSigma::Isotropic(0.03),
            delay_sigma_s: 1e-10,
            response_sigma_s: 5e-11,
        };
        let search = SearchBox::around(&[antenna(0.0, 0.0, 2.0), antenna(40.0, 10.0, 3.0)], &[]).unwrap();
        assert_eq!(search.min_m, Vector3::new(-10.0, -5.0, 0.0));
        assert_eq!(search.max_m, Vector3::new(50.0, 15.0, 8.0));
        assert!(SearchBox::around(&[], &[]).is_none());
    }
}
