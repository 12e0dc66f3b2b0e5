//! What radio does not pass: upright prisms, and the shadows they cast.

use nalgebra::{Vector2, Vector3};

/// An upright prism that radio does not pass: a relay house, a transformer tank.
#[derive(Debug, Clone, PartialEq)]
pub struct Obstacle {
    /// Name, unique on the site.
    pub name: String,
    /// Corners of the footprint in metres, in order; the last joins the first. It does not cross itself.
    pub footprint_m: Vec<Vector2<f64>>,
    /// Height of the underside in metres.
    pub base_m: f64,
    /// Height of the top in metres.
    pub top_m: f64,
}

impl Obstacle {
    /// Whether the straight way between two points passes through the inside of the prism. A way that only
    /// touches a wall, an edge or the top is clear.
    #[must_use]
    pub fn blocks(&self, from_m: &Vector3<f64>, to_m: &Vector3<f64>) -> bool {
        self.convex_pieces().iter().any(|piece| piece.blocks(from_m, to_m))
    }

    /// Whether the point lies inside the prism, its surface not included.
    #[must_use]
    pub fn contains(&self, point_m: &Vector3<f64>) -> bool {
        self.convex_pieces().iter().any(|piece| piece.contains(point_m, 0.0))
    }

    /// The prism cut into convex ones. Shadows of convex bodies are convex, which is what lets a whole box of
    /// places be judged at once ([`ConvexPrism::shadow_over`]).
    pub(crate) fn convex_pieces(&self) -> Vec<ConvexPrism> {
        let mut corners = self.footprint_m.clone();
        if signed_area(&corners) < 0.0 {
            corners.reverse();
        }
        let polygons = if is_convex(&corners) { vec![corners.clone()] } else { triangles(corners.clone()) };
        let is_wall = |from: &Vector2<f64>, to: &Vector2<f64>| {
            (0..corners.len()).any(|i| corners[i] == *from && corners[(i + 1) % corners.len()] == *to)
        };
        polygons
            .into_iter()
            .filter(|polygon| signed_area(polygon) > 0.0)
            .map(|polygon| ConvexPrism::new(&polygon, is_wall, self.base_m, self.top_m))
            .collect()
    }
}

/// A half-space: the points with `normal . p <= offset_m`.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Face {
    normal: Vector3<f64>,
    offset_m: f64,
    /// Whether it is a wall of the obstacle, and not a cut between two pieces of it.
    wall: bool,
}

impl Face {
    fn height_m(&self, point_m: &Vector3<f64>) -> f64 {
        self.normal.dot(point_m) - self.offset_m
    }
}

/// An upright prism with a convex footprint, as the half-spaces it is the meeting of.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct ConvexPrism {
    faces: Vec<Face>,
}

/// What a prism does to the straight ways from one antenna to all points of a box.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Shadow {
    /// Every way is clear.
    None,
    /// Every way is blocked.
    Whole,
    /// Some may be blocked, some may be clear.
    Part,
}

/// A way that enters a prism by less than this is taken as touching it only, in metres: rounding of
/// coordinates of kilometres is some 1e-13 of them, and a nanometre of wall hides nothing.
const TOUCH_M: f64 = 1e-9;

impl ConvexPrism {
    /// `corners` counter-clockwise; `is_wall` tells which sides are walls and which are cuts.
    fn new(
        corners: &[Vector2<f64>],
        is_wall: impl Fn(&Vector2<f64>, &Vector2<f64>) -> bool,
        base_m: f64,
        top_m: f64,
    ) -> Self {
        let mut faces = vec![
            Face { normal: Vector3::z(), offset_m: top_m, wall: true },
            Face { normal: -Vector3::z(), offset_m: -base_m, wall: true },
        ];
        for (index, start) in corners.iter().enumerate() {
            let end = corners[(index + 1) % corners.len()];
            let edge = end - start;
            if edge.norm() > 0.0 {
                let outward = Vector3::new(edge.y, -edge.x, 0.0) / edge.norm();
                let offset_m = outward.xy().dot(start);
                faces.push(Face { normal: outward, offset_m, wall: is_wall(start, &end) });
            }
        }
        Self { faces }
    }

    /// Whether the point lies inside, more than `deep_m` from every face.
    pub(crate) fn contains(&self, point_m: &Vector3<f64>, deep_m: f64) -> bool {
        // A cut belongs to both pieces, so that no gap is left between them.
        self.faces
            .iter()
            .all(|face| face.height_m(point_m) < if face.wall || deep_m > 0.0 { -deep_m } else { TOUCH_M })
    }

    /// Whether the way between the points passes through the inside.
    pub(crate) fn blocks(&self, from_m: &Vector3<f64>, to_m: &Vector3<f64>) -> bool {
        self.crosses(from_m, to_m, -TOUCH_M)
    }

    /// Whether the way meets the prism with every face moved outward by `grown_m`.
    fn crosses(&self, from_m: &Vector3<f64>, to_m: &Vector3<f64>, grown_m: f64) -> bool {
        // Clip the way against one half-space after the other; `near..far` is what is left of 0..1.
        let (mut near, mut far) = (0.0_f64, 1.0_f64);
        for face in &self.faces {
            let grown_m = if face.wall { grown_m } else { grown_m.max(TOUCH_M) };
            let start = face.height_m(from_m) - grown_m;
            let end = face.height_m(to_m) - grown_m;
            if start > 0.0 && end > 0.0 {
                return false;
            }
            if start > 0.0 {
                near = near.max(start / (start - end));
            } else if end > 0.0 {
                far = far.min(start / (start - end));
            }
            if near > far {
                return false;
            }
        }
        true
    }

    /// The shadow from the antenna over the box with this centre and these half sides. Never `None` where a way
    /// is blocked, never `Whole` where one is clear.
    ///
    /// Ways to points within h of the centre stay within h of the way to the centre, so a prism grown by h that
    /// misses that way is missed by all. The shadow of a convex body, `{a + s (k - a) : k in K, s >= 1}`, is convex, so a
    /// box whose corners all lie in it lies in it.
    pub(crate) fn shadow_over(
        &self,
        antenna_m: &Vector3<f64>,
        centre_m: &Vector3<f64>,
        half_m: &Vector3<f64>,
    ) -> Shadow {
        if !self.crosses(antenna_m, centre_m, half_m.norm()) {
            return Shadow::None;
        }
        let blocked = |corner: u8| {
            let sign = |axis: u8| if corner >> axis & 1 == 1 { 1.0 } else { -1.0 };
            let offset = Vector3::new(sign(0), sign(1), sign(2)).component_mul(half_m);
            self.blocks(antenna_m, &(centre_m + offset))
        };
        if (0..8).all(blocked) { Shadow::Whole } else { Shadow::Part }
    }
}

fn cross(a: &Vector2<f64>, b: &Vector2<f64>) -> f64 {
    a.x * b.y - a.y * b.x
}

fn signed_area(corners: &[Vector2<f64>]) -> f64 {
    (0..corners.len()).map(|i| cross(&corners[i], &corners[(i + 1) % corners.len()])).sum::<f64>() / 2.0
}

fn turn(a: &Vector2<f64>, b: &Vector2<f64>, c: &Vector2<f64>) -> f64 {
    cross(&(b - a), &(c - b))
}

fn is_convex(corners: &[Vector2<f64>]) -> bool {
    let n = corners.len();
    (0..n).all(|i| turn(&corners[i], &corners[(i + 1) % n], &corners[(i + 2) % n]) >= 0.0)
}

/// Cuts a counter-clockwise polygon into triangles by clipping ears: a corner that turns left and whose triangle
/// holds no other corner.
fn triangles(mut corners: Vec<Vector2<f64>>) -> Vec<Vec<Vector2<f64>>> {
    let mut cut = Vec::new();
    while corners.len() > 3 {
        let n = corners.len();
        let ear = (0..n).find(|&i| {
            let (a, b, c) = (corners[(i + n - 1) % n], corners[i], corners[(i + 1) % n]);
            turn(&a, &b, &c) > 0.0
                && corners.iter().all(|p| {
                    *p == a
                        || *p == b
                        || *p == c
                        || turn(&a, &b, p) < 0.0
                        || turn(&b, &c, p) < 0.0
                        || turn(&c, &a, p) < 0.0
                })
        });
        // A polygon that does not cross itself always has an ear; corners in one line may leave none.
        let Some(ear) = ear else { break };
        cut.push(vec![corners[(ear + n - 1) % n], corners[ear], corners[(ear + 1) % n]]);
        corners.remove(ear);
    }
    cut.push(corners);
    cut
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{RngExt, SeedableRng};
    use rand_chacha::ChaCha8Rng;

    fn prism(footprint: &[(f64, f64)]) -> Obstacle {
        Obstacle {
            name: "house".into(),
            footprint_m: footprint.iter().map(|&(x, y)| Vector2::new(x, y)).collect(),
            base_m: 0.0,
            top_m: 3.0,
        }
    }

    fn square() -> Obstacle {
        prism(&[(0.0, 0.0), (4.0, 0.0), (4.0, 4.0), (0.0, 4.0)])
    }

    /// An L, clockwise: the notch is at its upper right.
    fn angled() -> Obstacle {
        prism(&[(0.0, 0.0), (0.0, 4.0), (2.0, 4.0), (2.0, 2.0), (4.0, 2.0), (4.0, 0.0)])
    }

    #[test]
    fn through_over_and_beside() {
        let house = square();
        let west = Vector3::new(-5.0, 2.0, 1.0);
        assert!(house.blocks(&west, &Vector3::new(9.0, 2.0, 1.0)), "through the walls");
        assert!(!house.blocks(&west, &Vector3::new(9.0, 12.0, 1.0)), "past the corner");
        assert!(!house.blocks(&west, &Vector3::new(9.0, 2.0, 9.0)), "over the roof");
        assert!(!house.blocks(&west, &Vector3::new(-1.0, 2.0, 1.0)), "short of it");
        assert!(!house.blocks(&Vector3::new(-1.0, 4.0, 1.0), &Vector3::new(9.0, 4.0, 1.0)), "along a wall");
    }

    #[test]
    fn the_notch_of_a_concave_house_is_clear() {
        let house = angled();
        let inside_notch = Vector3::new(3.0, 3.0, 1.0);
        assert!(!house.contains(&inside_notch));
        assert!(house.contains(&Vector3::new(1.0, 3.0, 1.0)));
        assert!(!house.blocks(&inside_notch, &Vector3::new(9.0, 9.0, 1.0)));
        assert!(house.blocks(&inside_notch, &Vector3::new(-9.0, 3.0, 1.0)));
    }

    #[test]
    fn no_way_slips_through_between_the_pieces() {
        // Along the cut of an L, through its inner corner.
        let house = angled();
        assert!(house.blocks(&Vector3::new(-3.0, -3.0, 1.0), &Vector3::new(6.0, 6.0, 1.0)));
        for share in 1..20 {
            let at = f64::from(share) * 0.1;
            assert!(house.contains(&Vector3::new(at, at, 1.0)), "{at}");
        }
    }

    #[test]
    fn convex_pieces_agree_with_steps_along_the_way() {
        let mut rng = ChaCha8Rng::seed_from_u64(11);
        let house = angled();
        let mut blocked = 0;
        for _ in 0..2000 {
            let mut point = || {
                Vector3::new(
                    rng.random_range(-3.0..7.0),
                    rng.random_range(-3.0..7.0),
                    rng.random_range(0.0..6.0),
                )
            };
            let (from, to) = (point(), point());
            let stepped = (0..=4000).any(|k| house.contains(&from.lerp(&to, f64::from(k) / 4000.0)));
            let clipped = house.blocks(&from, &to);
            // Steps of a few millimetres may step over a clipped corner, never the other way round.
            assert!(clipped || !stepped, "{from} {to}");
            blocked += usize::from(clipped && stepped);
            if clipped && !stepped {
                assert!(
                    (0..=400_000).any(|k| house.contains(&from.lerp(&to, f64::from(k) / 400_000.0)))
                        || crossing_is_short(&house, &from, &to)
                );
            }
        }
        assert!(blocked > 300);
    }

    fn crossing_is_short(house: &Obstacle, from: &Vector3<f64>, to: &Vector3<f64>) -> bool {
        !house.convex_pieces().iter().any(|piece| piece.crosses(from, to, -1e-3))
    }

    #[test]
    fn the_shadow_over_a_box_is_that_of_its_points() {
        let mut rng = ChaCha8Rng::seed_from_u64(12);
        let piece = &square().convex_pieces()[0];
        let mut seen = [0; 3];
        for _ in 0..3000 {
            let antenna = Vector3::new(-6.0, rng.random_range(-6.0..8.0), rng.random_range(0.5..5.0));
            let centre = Vector3::new(
                rng.random_range(-4.0..12.0),
                rng.random_range(-4.0..8.0),
                rng.random_range(0.0..6.0),
            );
            let half = Vector3::from_fn(|_, _| rng.random_range(0.01..1.0));
            let shadow = piece.shadow_over(&antenna, &centre, &half);
            seen[shadow as usize] += 1;
            for _ in 0..20 {
                let at = centre + half.map(|side| side * rng.random_range(-1.0..1.0));
                let blocked = piece.blocks(&antenna, &at);
                match shadow {
                    Shadow::None => assert!(!blocked),
                    Shadow::Whole => assert!(blocked),
                    Shadow::Part => {}
                }
            }
        }
        assert!(seen.iter().all(|&count| count > 100), "every kind must occur: {seen:?}");
    }
}
