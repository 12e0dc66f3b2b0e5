//! The bodies over which the likelihood is searched and averaged: the search box, and the capsule of an asset.

use nalgebra::Vector3;

use crate::site::{Asset, SearchBox};

/// How a box lies to a body.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Overlap {
    /// No point of the box is in the body.
    None,
    /// Every point is.
    Whole,
    /// Some may be.
    Part,
}

/// A body to search in.
pub(crate) trait Domain {
    /// Lowest and highest corner of the smallest box around it.
    fn bounds_m(&self) -> (Vector3<f64>, Vector3<f64>);
    /// How the box lies to it; `Part` is always an honest answer.
    fn overlap(&self, centre_m: &Vector3<f64>, half_m: &Vector3<f64>) -> Overlap;
    /// Whether the point is in it.
    fn contains(&self, point_m: &Vector3<f64>) -> bool;
    /// Volume in m^3, or area in m^2 of a flat one.
    fn measure(&self) -> f64;
    /// A box that the body's surface crosses is fine enough when its half-diagonal is below this, in metres.
    fn surface_resolution_m(&self) -> f64;
}

impl Domain for SearchBox {
    fn bounds_m(&self) -> (Vector3<f64>, Vector3<f64>) {
        (self.min_m, self.max_m)
    }

    fn overlap(&self, _: &Vector3<f64>, _: &Vector3<f64>) -> Overlap {
        Overlap::Whole
    }

    fn contains(&self, point_m: &Vector3<f64>) -> bool {
        SearchBox::contains(self, point_m)
    }

    fn measure(&self) -> f64 {
        SearchBox::measure(self)
    }

    fn surface_resolution_m(&self) -> f64 {
        f64::INFINITY
    }
}

/// A straight piece thickened by a radius: where on its asset a source may be.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Capsule {
    from_m: Vector3<f64>,
    to_m: Vector3<f64>,
    radius_m: f64,
}

/// A body thinner than this is averaged as if it were this thick: no survey is better, and the average over an
/// infinitely thin piece is the same.
const LEAST_RADIUS_M: f64 = 0.02;

impl Capsule {
    pub(crate) fn of(asset: &Asset) -> Self {
        Self { from_m: asset.from_m, to_m: asset.to_m, radius_m: asset.radius_m.max(LEAST_RADIUS_M) }
    }

    fn distance_m(&self, point_m: &Vector3<f64>) -> f64 {
        let along = self.to_m - self.from_m;
        let length2 = along.norm_squared();
        let share =
            if length2 > 0.0 { ((point_m - self.from_m).dot(&along) / length2).clamp(0.0, 1.0) } else { 0.0 };
        (point_m - (self.from_m + along * share)).norm()
    }
}

impl Domain for Capsule {
    fn bounds_m(&self) -> (Vector3<f64>, Vector3<f64>) {
        let radius = Vector3::from_element(self.radius_m);
        (self.from_m.inf(&self.to_m) - radius, self.from_m.sup(&self.to_m) + radius)
    }

    fn overlap(&self, centre_m: &Vector3<f64>, half_m: &Vector3<f64>) -> Overlap {
        let (distance_m, reach_m) = (self.distance_m(centre_m), half_m.norm());
        if distance_m - reach_m > self.radius_m {
            Overlap::None
        } else if distance_m + reach_m <= self.radius_m {
            Overlap::Whole
        } else {
            Overlap::Part
        }
    }

    fn contains(&self, point_m: &Vector3<f64>) -> bool {
        self.distance_m(point_m) <= self.radius_m
    }

    fn measure(&self) -> f64 {
        let (r, length) = (self.radius_m, (self.to_m - self.from_m).norm());
        std::f64::consts::PI * r * r * (length + 4.0 / 3.0 * r)
    }

    fn surface_resolution_m(&self) -> f64 {
        0.4 * self.radius_m
    }
}
