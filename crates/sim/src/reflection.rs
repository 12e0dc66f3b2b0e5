//! The later, weaker ways of a pulse: off the ground, and off things that stand about.

use arcstead_solver::Obstacle;
use arcstead_solver::nalgebra::Vector3;
use rand::{Rng, RngExt};

/// Length in metres of the way from `from_m` to `to_m` off the ground at z = 0, by the image of the source at -z.
///
/// None when an end is not above the ground.
#[must_use]
pub fn ground_way_m(from_m: &Vector3<f64>, to_m: &Vector3<f64>) -> Option<f64> {
    let image_m = Vector3::new(from_m.x, from_m.y, -from_m.z);
    (from_m.z > 0.0 && to_m.z > 0.0).then(|| (to_m - image_m).norm())
}

/// Whether obstacles leave both legs of the way off the ground clear.
pub(crate) fn ground_way_is_clear(
    obstacles: &[Obstacle],
    from_m: &Vector3<f64>,
    to_m: &Vector3<f64>,
) -> bool {
    let mut at_m = from_m.lerp(to_m, from_m.z / (from_m.z + to_m.z));
    at_m.z = 0.0;
    obstacles.iter().all(|o| !o.blocks(from_m, &at_m) && !o.blocks(&at_m, to_m))
}

/// Something fixed about the site that scatters a pulse.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Scatterer {
    /// Its position in metres.
    pub position_m: Vector3<f64>,
    /// Its strength k in metres, of either sign: the amplitude it sends on is k/(d1 d2), where a clear line of
    /// length d brings 1/d.
    pub strength_m: f64,
}

impl Scatterer {
    /// One at a random place about these points (up to 5 m beyond them, 0.5 to 6 m above the ground).
    pub(crate) fn draw(points_m: &[Vector3<f64>], rng: &mut (impl Rng + ?Sized)) -> Self {
        let low = points_m.iter().fold(points_m[0], |low, p| low.inf(p));
        let high = points_m.iter().fold(points_m[0], |high, p| high.sup(p));
        let x = rng.random_range(low.x - 5.0..=high.x + 5.0);
        let y = rng.random_range(low.y - 5.0..=high.y + 5.0);
        let z = rng.random_range(0.5..=6.0);
        let strength_m = rng.random_range(0.1..=0.5) * if rng.random::<bool>() { 1.0 } else { -1.0 };
        Self { position_m: Vector3::new(x, y, z), strength_m }
    }

    /// Length in metres and amplitude of the way over this scatterer; none when a leg is blocked. The amplitude is
    /// held below half that of the straight line: nothing that stands about is louder than the source.
    pub(crate) fn way(
        &self,
        obstacles: &[Obstacle],
        from_m: &Vector3<f64>,
        to_m: &Vector3<f64>,
    ) -> Option<(f64, f64)> {
        if obstacles.iter().any(|o| o.blocks(from_m, &self.position_m) || o.blocks(&self.position_m, to_m)) {
            return None;
        }
        let legs_m = ((self.position_m - from_m).norm(), (to_m - self.position_m).norm());
        let most = 0.5 / (to_m - from_m).norm();
        let amplitude = (self.strength_m / (legs_m.0 * legs_m.1)).clamp(-most, most);
        Some((legs_m.0 + legs_m.1, amplitude))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_abs_diff_eq;
    use arcstead_solver::SPEED_OF_LIGHT_M_PER_S;
    use rand::SeedableRng;
    use rand_chacha::ChaCha8Rng;

    #[test]
    fn lateness_of_the_ground_reflection() {
        // Image method, worked by hand: distance and heights in metres, lateness in nanoseconds.
        for (distance_m, low_m, high_m, late_ns) in
            [(20.0, 2.0, 5.0, 3.2218), (10.0, 1.5, 4.0, 3.6857), (30.0, 2.0, 8.0, 3.4312)]
        {
            let (from, to) = (Vector3::new(0.0, 0.0, low_m), Vector3::new(distance_m, 0.0, high_m));
            let late_s = (ground_way_m(&from, &to).unwrap() - (to - from).norm()) / SPEED_OF_LIGHT_M_PER_S;
            assert_abs_diff_eq!(late_s * 1e9, late_ns, epsilon = 1e-4);
        }
        assert_eq!(ground_way_m(&Vector3::zeros(), &Vector3::new(1.0, 0.0, 1.0)), None);
    }

    #[test]
    fn what_is_scattered_is_later_and_weaker() {
        let mut rng = ChaCha8Rng::seed_from_u64(3);
        let (from, to) = (Vector3::new(0.0, 0.0, 5.0), Vector3::new(12.0, 3.0, 2.0));
        for _ in 0..1000 {
            let (length_m, amplitude) = Scatterer::draw(&[from, to], &mut rng).way(&[], &from, &to).unwrap();
            let straight_m = (to - from).norm();
            assert!(length_m > straight_m);
            assert!(amplitude.abs() <= 0.5 / straight_m && amplitude.abs() > 0.0);
        }
    }
}
