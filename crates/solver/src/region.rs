//! The highest-posterior-density region and what it says of direction and range.

use nalgebra::Vector3;

use crate::branch_and_bound::Cell;
use crate::likelihood::unit_or_zero;
use crate::site::SearchBox;

/// The smallest set of places that holds the source with the probability stated: every place in it is likelier than
/// every place outside. The prior is uniform over the search box.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Region {
    /// Probability that it holds the source.
    pub confidence: f64,
    /// Its volume in m^3, or its area in m^2 on a plane.
    pub measure: f64,
    /// Lowest corner of the box around it, in metres.
    pub min_m: Vector3<f64>,
    /// Highest corner of the box around it, in metres.
    pub max_m: Vector3<f64>,
    /// Whether it keeps clear of the edge of the search box. If not, the source may lie outside. The underside of a box
    /// that reaches down to the ground (z = 0) or below is no edge: no source lies deeper.
    pub bounded: bool,
    /// A place belongs to the region when its -2 ln likelihood is at most this.
    pub level: f64,
}

/// Gathers the cells of highest density until they hold `confidence`. None without cells that hold anything.
pub(crate) fn highest_density(cells: &[Cell], search: &SearchBox, confidence: f64) -> Option<Region> {
    let mut order: Vec<&Cell> = cells.iter().collect();
    order.sort_by(|a, b| a.minus_two_ln.total_cmp(&b.minus_two_ln));
    let first = order.first().filter(|first| first.minus_two_ln.is_finite())?;
    let mass = |cell: &Cell| cell.mass(first.minus_two_ln);
    let total: f64 = order.iter().map(|cell| mass(cell)).sum();
    let mut region = Region {
        confidence,
        measure: 0.0,
        min_m: first.centre_m - first.half_m,
        max_m: first.centre_m + first.half_m,
        bounded: true,
        level: first.minus_two_ln,
    };
    let mut held = 0.0;
    for cell in order {
        if held >= confidence * total {
            break;
        }
        held += mass(cell);
        region.measure += cell.measure();
        region.min_m = region.min_m.inf(&(cell.centre_m - cell.half_m));
        region.max_m = region.max_m.sup(&(cell.centre_m + cell.half_m));
        region.level = cell.minus_two_ln;
        region.bounded = region.bounded && !touches_edge(cell, search);
    }
    Some(region)
}

/// Whether the cell lies at the edge of the search box; the plane of a plane search is no edge, and neither is the ground.
fn touches_edge(cell: &Cell, search: &SearchBox) -> bool {
    (0..search.unknowns()).any(|axis| {
        let slack = 1e-9 * (search.max_m[axis] - search.min_m[axis]);
        let ground = axis == 2 && search.min_m.z <= 0.0;
        (!ground && cell.centre_m[axis] - cell.half_m[axis] <= search.min_m[axis] + slack)
            || cell.centre_m[axis] + cell.half_m[axis] >= search.max_m[axis] - slack
    })
}

/// Where the source lies as seen from the array's centre.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bearing {
    /// The array's centre, in metres.
    pub from_m: Vector3<f64>,
    /// Clockwise from north (+y), 0 to 360 degrees.
    pub azimuth_deg: f64,
    /// Above the horizontal, in degrees.
    pub elevation_deg: f64,
    /// Posterior standard deviation of the azimuth, in degrees.
    pub azimuth_sigma_deg: f64,
    /// Posterior standard deviation of the elevation, in degrees.
    pub elevation_sigma_deg: f64,
    /// Central interval of the distance from the centre at the confidence asked for, in metres.
    pub range_m: (f64, f64),
    /// Whether places at the far end of the range interval lie at the edge of the search box.
    pub range_reaches_edge: bool,
}

/// Mean direction, its spread, and the interval of range, of the cells of one mode. None without cells.
pub(crate) fn bearing(
    cells: &[Cell],
    search: &SearchBox,
    from_m: Vector3<f64>,
    confidence: f64,
) -> Option<Bearing> {
    let least = cells.iter().map(|cell| cell.minus_two_ln).reduce(f64::min)?;
    if least.is_infinite() {
        return None;
    }
    let weigh = |cell: &Cell| cell.mass(least);
    let total: f64 = cells.iter().map(weigh).sum();
    let mean: Vector3<f64> =
        cells.iter().map(|cell| unit_or_zero(&(cell.centre_m - from_m)) * (weigh(cell) / total)).sum();
    let azimuth = mean.x.atan2(mean.y);
    let elevation = mean.z.atan2(mean.xy().norm());
    let (mut azimuth_variance, mut elevation_variance) = (0.0, 0.0);
    let mut ranges: Vec<(f64, f64, bool)> = Vec::with_capacity(cells.len());
    for cell in cells {
        let way = cell.centre_m - from_m;
        let weight = weigh(cell) / total;
        let turned = (way.x.atan2(way.y) - azimuth + std::f64::consts::PI).rem_euclid(std::f64::consts::TAU)
            - std::f64::consts::PI;
        azimuth_variance += weight * turned * turned;
        elevation_variance += weight * (way.z.atan2(way.xy().norm()) - elevation).powi(2);
        ranges.push((way.norm(), weight, touches_edge(cell, search)));
    }
    ranges.sort_by(|a, b| a.0.total_cmp(&b.0));
    let tail = (1.0 - confidence) / 2.0;
    let near_m = quantile(&ranges, tail);
    let far_m = quantile(&ranges, 1.0 - tail);
    // The far end touches the edge when a good part of what lies beyond it does.
    let beyond = ranges.iter().filter(|range| range.0 >= far_m);
    let (all, edge) = beyond
        .fold((0.0, 0.0), |(all, edge), range| (all + range.1, edge + if range.2 { range.1 } else { 0.0 }));
    Some(Bearing {
        from_m,
        azimuth_deg: azimuth.to_degrees().rem_euclid(360.0),
        elevation_deg: elevation.to_degrees(),
        azimuth_sigma_deg: azimuth_variance.sqrt().to_degrees(),
        elevation_sigma_deg: elevation_variance.sqrt().to_degrees(),
        range_m: (near_m, far_m),
        range_reaches_edge: edge > 0.1 * all,
    })
}

/// The value below which a share `part` of the weight lies; `weighted` is sorted and its weights sum to 1.
fn quantile(weighted: &[(f64, f64, bool)], part: f64) -> f64 {
    let mut sum = 0.0;
    for &(value, weight, _) in weighted {
        sum += weight;
        if sum >= part {
            return value;
        }
    }
    weighted.last().map_or(0.0, |last| last.0)
}
