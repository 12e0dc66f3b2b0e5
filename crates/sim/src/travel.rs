//! The way of a pulse from source to antenna: straight, or over the top of what is between.

use arcstead_solver::Obstacle;
use arcstead_solver::nalgebra::{Vector2, Vector3};

use crate::knife_edge::{knife_edge_loss_db, knife_edge_nu};

/// The least distance at which spreading by one over the distance is believed, in metres.
pub(crate) const NEAREST_M: f64 = 0.1;

/// The first way of a pulse from a source to an antenna.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Way {
    /// Its length in metres.
    pub length_m: f64,
    /// What the edges on it cost in dB; 0 on a clear line. Spreading is not in it.
    pub loss_db: f64,
    /// Whether the straight line is clear.
    pub clear: bool,
}

/// The first way from `from_m` to `to_m` (metres): straight where no obstacle blocks it; otherwise taut over the
/// tops of the obstacles in the vertical plane through both ends, later by the extra length and weakened by the
/// single knife-edge loss (Recommendation ITU-R P.526) of the highest edge at `wavelength_m`.
///
/// None when an obstacle blocks a line that is vertical: there is no plane to go over the top in. An end right
/// under an obstacle is led straight up past it, which is no way radio takes; such a site is simulated for its
/// lateness only.
#[must_use]
pub fn first_way(
    obstacles: &[Obstacle],
    from_m: &Vector3<f64>,
    to_m: &Vector3<f64>,
    wavelength_m: f64,
) -> Option<Way> {
    let straight = Way { length_m: (to_m - from_m).norm(), loss_db: 0.0, clear: true };
    let mut over: Vec<bool> = obstacles.iter().map(|o| o.blocks(from_m, to_m)).collect();
    if !over.contains(&true) {
        return Some(straight);
    }
    let ground_m = (to_m - from_m).xy().norm();
    if ground_m < 1e-9 {
        return None;
    }
    let point = |at: &Vector2<f64>| {
        let plan = from_m.xy().lerp(&to_m.xy(), at.x / ground_m);
        Vector3::new(plan.x, plan.y, at.y)
    };
    // A way raised over one obstacle may run into another; each is added once, so this ends.
    let way = loop {
        let way = taut_over(obstacles, &over, from_m, to_m, ground_m);
        let hit = obstacles.iter().enumerate().position(|(index, obstacle)| {
            !over[index] && way.windows(2).any(|leg| obstacle.blocks(&point(&leg[0]), &point(&leg[1])))
        });
        match hit {
            Some(index) => over[index] = true,
            None => break way,
        }
    };
    let length_m = way.windows(2).map(|leg| (leg[1] - leg[0]).norm()).sum();
    let (start, end) = (way[0], way[way.len() - 1]);
    let loss_db = way[1..way.len() - 1]
        .iter()
        .map(|edge| {
            let height_m = (end - start).perp(&(edge - start)).abs() / straight.length_m;
            let distances_m = ((edge - start).norm(), (end - edge).norm());
            knife_edge_loss_db(knife_edge_nu(height_m, distances_m, wavelength_m))
        })
        .fold(0.0, f64::max);
    Some(Way { length_m, loss_db, clear: false })
}

/// The taut string over the tops of the chosen obstacles, as points (distance along the ground, height) in the
/// vertical plane through both ends: the upper hull of the ends and of the edges the plane cuts.
fn taut_over(
    obstacles: &[Obstacle],
    over: &[bool],
    from_m: &Vector3<f64>,
    to_m: &Vector3<f64>,
    ground_m: f64,
) -> Vec<Vector2<f64>> {
    let mut edges: Vec<Vector2<f64>> = obstacles
        .iter()
        .zip(over)
        .filter(|(_, over)| **over)
        .flat_map(|(obstacle, _)| {
            cuts(&obstacle.footprint_m, &from_m.xy(), &to_m.xy())
                .into_iter()
                .map(|share| Vector2::new(share * ground_m, obstacle.top_m))
        })
        .collect();
    edges.sort_by(|a, b| a.x.total_cmp(&b.x).then(a.y.total_cmp(&b.y)));
    let mut hull = vec![Vector2::new(0.0, from_m.z)];
    for edge in edges.into_iter().chain([Vector2::new(ground_m, to_m.z)]) {
        while let [.., before, last] = hull[..] {
            if (last - before).perp(&(edge - last)) < 0.0 {
                break;
            }
            hull.pop();
        }
        hull.push(edge);
    }
    hull
}

/// Where the line between two points in plan enters and leaves a footprint, as shares 0 to 1 of its length; an
/// end that lies inside counts as such a place.
fn cuts(footprint_m: &[Vector2<f64>], from_m: &Vector2<f64>, to_m: &Vector2<f64>) -> Vec<f64> {
    let along = to_m - from_m;
    let mut shares = Vec::new();
    let mut before = 0;
    let mut after = 0;
    for (index, corner) in footprint_m.iter().enumerate() {
        let side = footprint_m[(index + 1) % footprint_m.len()] - corner;
        // The corner counts to the side that starts on it, so a line through it is counted once.
        let start = along.perp(&(corner - from_m));
        let end = along.perp(&(corner + side - from_m));
        if (start < 0.0) == (end < 0.0) {
            continue;
        }
        let hit = corner + side * (start / (start - end));
        let share = (hit - from_m).dot(&along) / along.norm_squared();
        if share < 0.0 {
            before += 1;
        } else if share > 1.0 {
            after += 1;
        } else {
            shares.push(share);
        }
    }
    if before % 2 == 1 {
        shares.push(0.0);
    }
    if after % 2 == 1 {
        shares.push(1.0);
    }
    shares
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_abs_diff_eq;
    use arcstead_solver::SPEED_OF_LIGHT_M_PER_S;

    fn wall(x: (f64, f64), base_m: f64, top_m: f64) -> Obstacle {
        let corners = [(x.0, -30.0), (x.1, -30.0), (x.1, 30.0), (x.0, 30.0)];
        Obstacle {
            name: "wall".into(),
            footprint_m: corners.iter().map(|&(x, y)| Vector2::new(x, y)).collect(),
            base_m,
            top_m,
        }
    }

    #[test]
    fn a_thin_wall_is_the_knife_edge_of_the_recommendation() {
        // Recommendation ITU-R P.526 and plain geometry: edge 1 m over the line, 10 m and 20 m from the ends:
        // 0.074860 m longer; edge 2 m over it at 5 m and 15 m: 0.517911 m.
        for (top_m, at_m, length_m, longer_m, frequency_hz) in
            [(3.0, 10.0, 30.0, 0.074860, 500e6), (4.0, 5.0, 20.0, 0.517911, 300e6)]
        {
            let wavelength_m = SPEED_OF_LIGHT_M_PER_S / frequency_hz;
            let (from, to) = (Vector3::new(0.0, 0.0, 2.0), Vector3::new(length_m, 0.0, 2.0));
            let way = first_way(&[wall((at_m, at_m + 1e-6), 0.0, top_m)], &from, &to, wavelength_m).unwrap();
            assert!(!way.clear);
            assert_abs_diff_eq!(way.length_m - length_m, longer_m, epsilon = 2e-6);
            let distances_m = ((top_m - 2.0).hypot(at_m), (top_m - 2.0).hypot(length_m - at_m));
            let nu = knife_edge_nu(top_m - 2.0, distances_m, wavelength_m);
            assert_abs_diff_eq!(way.loss_db, knife_edge_loss_db(nu), epsilon = 1e-6);
        }
    }

    #[test]
    fn clear_lines_are_straight() {
        let house = [wall((4.0, 8.0), 0.0, 3.0)];
        let (from, to) = (Vector3::new(0.0, 0.0, 5.0), Vector3::new(12.0, 5.0, 4.0));
        let way = first_way(&house, &from, &to, 0.4).unwrap();
        assert_eq!(way, Way { length_m: (to - from).norm(), loss_db: 0.0, clear: true });
    }

    #[test]
    fn a_broad_roof_is_crossed_on_both_edges() {
        let (from, to) = (Vector3::new(0.0, 0.0, 1.0), Vector3::new(12.0, 0.0, 1.0));
        let way = first_way(&[wall((4.0, 8.0), 0.0, 4.0)], &from, &to, 0.4).unwrap();
        assert_abs_diff_eq!(way.length_m, 5.0 + 4.0 + 5.0, epsilon = 1e-12);
        assert!(way.loss_db > 15.0);
    }

    #[test]
    fn a_way_raised_into_another_obstacle_goes_over_that_too() {
        let (from, to) = (Vector3::new(0.0, 0.0, 1.0), Vector3::new(12.0, 0.0, 1.0));
        let low = wall((5.0, 5.0 + 1e-6), 0.0, 4.0);
        let beam = wall((6.0, 6.0 + 1e-6), 3.0, 5.0);
        let way = first_way(&[low, beam], &from, &to, 0.4).unwrap();
        assert_abs_diff_eq!(way.length_m, 2.0 * 6.0_f64.hypot(4.0), epsilon = 1e-5);
    }

    #[test]
    fn a_vertical_line_has_no_way_over_a_top() {
        let (from, to) = (Vector3::new(5.0, 0.0, 6.0), Vector3::new(5.0, 0.0, 1.0));
        assert_eq!(first_way(&[wall((4.0, 8.0), 2.0, 3.0)], &from, &to, 0.4), None);
    }
}
