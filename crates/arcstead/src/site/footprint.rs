//! Outlines on the ground: whether one crosses itself, and what lies inside.

use nalgebra::Vector2;

/// The most corners a footprint may have: the check for crossing compares every pair of sides.
pub(super) const MOST_CORNERS: usize = 1000;

/// Twice the area of the triangle a, b, c: positive when they turn left.
fn turn(a: &Vector2<f64>, b: &Vector2<f64>, c: &Vector2<f64>) -> f64 {
    (b - a).perp(&(c - a))
}

/// Whether `p`, known to lie in line with a and b, lies between them or on one of them.
fn between(a: &Vector2<f64>, b: &Vector2<f64>, p: &Vector2<f64>) -> bool {
    let (low, high) = (a.inf(b), a.sup(b));
    low.x <= p.x && p.x <= high.x && low.y <= p.y && p.y <= high.y
}

/// Whether the side a-b and the side c-d have a point in common.
fn meet(a: &Vector2<f64>, b: &Vector2<f64>, c: &Vector2<f64>, d: &Vector2<f64>) -> bool {
    let (c_of_ab, d_of_ab) = (turn(a, b, c), turn(a, b, d));
    let (a_of_cd, b_of_cd) = (turn(c, d, a), turn(c, d, b));
    let apart = |first: f64, second: f64| (first > 0.0 && second < 0.0) || (first < 0.0 && second > 0.0);
    let on = |turned: f64, a, b, p| turned.abs() <= 0.0 && between(a, b, p);
    (apart(c_of_ab, d_of_ab) && apart(a_of_cd, b_of_cd))
        || on(c_of_ab, a, b, c)
        || on(d_of_ab, a, b, d)
        || on(a_of_cd, c, d, a)
        || on(b_of_cd, c, d, b)
}

/// Two corners that are the same point, as indices from 0, the first such pair of neighbours (the last corner and the
/// first are neighbours).
pub(super) fn repeated_corner(corners: &[Vector2<f64>]) -> Option<(usize, usize)> {
    let n = corners.len();
    (0..n).map(|i| (i, (i + 1) % n)).find(|&(i, j)| i != j && corners[i] == corners[j])
}

/// Two sides that cross, touch or fold back on each other, as indices from 0; side i runs from corner i to the next.
/// Neighbours that only share their corner do not count. At least three corners, none repeated.
pub(super) fn crossing_sides(corners: &[Vector2<f64>]) -> Option<(usize, usize)> {
    let n = corners.len();
    let corner = |i: usize| &corners[i % n];
    for i in 0..n {
        // A neighbour shares a corner always; it is wrong only where it runs back along the side.
        let (a, b, c) = (corner(i), corner(i + 1), corner(i + 2));
        if turn(a, b, c).abs() <= 0.0 && (a - b).dot(&(c - b)) > 0.0 {
            return Some((i.min((i + 1) % n), i.max((i + 1) % n)));
        }
        for j in i + 2..n {
            let neighbours = i == 0 && j == n - 1;
            if !neighbours && meet(corner(i), corner(i + 1), corner(j), corner(j + 1)) {
                return Some((i, j));
            }
        }
    }
    None
}

/// Whether the footprint holds the point: an even-odd count of the sides that a ray to the east crosses. A point on a
/// side is held when `edge` says so.
pub(super) fn holds(corners: &[Vector2<f64>], point: &Vector2<f64>, edge: bool) -> bool {
    let mut inside = false;
    for (i, a) in corners.iter().enumerate() {
        let b = &corners[(i + 1) % corners.len()];
        let turned = turn(a, b, point);
        if turned.abs() <= 0.0 && between(a, b, point) {
            return edge;
        }
        if (a.y > point.y) != (b.y > point.y) && (turned > 0.0) == (b.y > a.y) {
            inside = !inside;
        }
    }
    inside
}

#[cfg(test)]
mod tests {
    use super::*;

    fn outline(corners: &[(f64, f64)]) -> Vec<Vector2<f64>> {
        corners.iter().map(|&(x, y)| Vector2::new(x, y)).collect()
    }

    #[test]
    fn crossing_touching_and_folding_sides_are_found() {
        for (corners, expected) in [
            (&[(0.0, 0.0), (4.0, 0.0), (4.0, 4.0), (0.0, 4.0)][..], None),
            (&[(0.0, 0.0), (4.0, 0.0), (0.0, 4.0)], None),
            // A corner in the middle of a straight side is allowed.
            (&[(0.0, 0.0), (2.0, 0.0), (4.0, 0.0), (4.0, 4.0)], None),
            // A concave outline.
            (&[(0.0, 0.0), (0.0, 4.0), (2.0, 4.0), (2.0, 2.0), (4.0, 2.0), (4.0, 0.0)], None),
            // A bow tie.
            (&[(0.0, 0.0), (4.0, 4.0), (4.0, 0.0), (0.0, 4.0)], Some((0, 2))),
            // A corner that touches another side.
            (&[(0.0, 0.0), (4.0, 0.0), (4.0, 4.0), (2.0, 0.0), (0.0, 4.0)], Some((0, 2))),
            // All in one line.
            (&[(0.0, 0.0), (4.0, 0.0), (2.0, 0.0)], Some((0, 1))),
            // A side that runs back along the one before.
            (&[(0.0, 0.0), (4.0, 0.0), (4.0, 4.0), (4.0, 2.0), (0.0, 2.0)], Some((1, 2))),
        ] {
            assert_eq!(crossing_sides(&outline(corners)), expected, "{corners:?}");
        }
    }

    #[test]
    fn repeated_corners_are_found() {
        assert_eq!(
            repeated_corner(&outline(&[(0.0, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 0.0)])),
            Some((3, 0))
        );
        assert_eq!(repeated_corner(&outline(&[(0.0, 0.0), (1.0, 0.0), (1.0, 0.0)])), Some((1, 2)));
        assert_eq!(repeated_corner(&outline(&[(0.0, 0.0), (1.0, 0.0), (1.0, 1.0)])), None);
    }

    #[test]
    fn points_inside_outside_and_on_the_edge() {
        let angled = outline(&[(0.0, 0.0), (0.0, 4.0), (2.0, 4.0), (2.0, 2.0), (4.0, 2.0), (4.0, 0.0)]);
        let mirrored: Vec<_> = angled.iter().rev().copied().collect();
        for corners in [angled, mirrored] {
            for (x, y, inside, on_edge) in [
                (1.0, 3.0, true, true),
                (3.0, 1.0, true, true),
                (3.0, 3.0, false, false),
                (-1.0, 2.0, false, false),
                (5.0, 2.0, false, false),
                (1.0, 2.0, true, true),
                (2.0, 3.0, false, true),
                (0.0, 0.0, false, true),
                (3.0, 2.0, false, true),
            ] {
                assert_eq!(holds(&corners, &Vector2::new(x, y), false), inside, "{x} {y}");
                assert_eq!(holds(&corners, &Vector2::new(x, y), true), on_edge, "{x} {y} with the edge");
            }
        }
    }
}
