//! The search that cannot miss: branch and bound over a body.
//!
//! In a box of half-diagonal h about c every way changes by at most h, and by `u . d` to within
//! `h^2 / (2 (l - h))` where l is the way from c and u its direction. So the whitened residuals of every place of the
//! box differ from those of its centre by at most
//!
//! `spread = min( sum_j h_j |W u_j| + sum_i |w_i| h^2 / (2 (l_i - h)),  sum_i |w_i| h )`
//!
//! (w_i the columns of W), and chi-square is at least `(|z(c)| - spread)^2` all over the box. The first form keeps what
//! all antennas share out of the bound, which is what makes places far from the array cheap to exclude.
//! An antenna that may be in shadow for part of the box is left out of the bound: data left out can only lower
//! chi-square. Boxes whose bound exceeds the best value found by more than [`MARGIN`] are dropped; every other box
//! is split until the likelihood hardly changes in it. Hence the certificate: **every place of the search box
//! whose -2 ln likelihood is within `MARGIN` of the best found lies in one of the cells returned.** In an asset's capsule the
//! boxes are the same, but of those that its surface crosses only the parts with their centres inside are kept.

use std::collections::BinaryHeap;

use nalgebra::Vector3;

use crate::domain::{Domain, Overlap};
use crate::error::SolveError;
use crate::likelihood::{BoxBound, Evaluator, Shadows};

/// How far -2 ln likelihood may lie above the best before a place is dropped: a share below 2e-5 of a Gaussian
/// posterior in space, and below 1e-3 where shadows give it long tails.
pub(crate) const MARGIN: f64 = 25.0;

/// Boxes looked into before refinement stops and what is left is told as it is.
const MOST_BOXES: usize = 400_000;

/// A box is fine enough when the whitened residuals move by no more than this from its centre to its faces.
const FINE_STEP: f64 = 1.0;

/// A small box with the likelihood of its centre.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Cell {
    pub(crate) centre_m: Vector3<f64>,
    pub(crate) half_m: Vector3<f64>,
    pub(crate) minus_two_ln: f64,
}

impl Cell {
    /// Integral of the likelihood over the cell, in units of exp(-`from`/2).
    pub(crate) fn mass(&self, from: f64) -> f64 {
        self.measure() * (-0.5 * (self.minus_two_ln - from)).exp()
    }

    /// Volume, or area of a flat cell.
    pub(crate) fn measure(&self) -> f64 {
        self.half_m.iter().filter(|&&half| half > 0.0).map(|half| 2.0 * half).product()
    }
}

/// What a search found.
#[derive(Debug, Clone)]
pub(crate) struct Search {
    /// Cells that together hold every place within the margin of the best.
    pub(crate) cells: Vec<Cell>,
    /// Whether every cell is as fine as it should be.
    pub(crate) resolved: bool,
}

impl Search {
    /// The least -2 ln likelihood of the cells; infinite when there are none.
    pub(crate) fn least(&self) -> f64 {
        self.cells.iter().map(|cell| cell.minus_two_ln).fold(f64::INFINITY, f64::min)
    }

    /// ln of the integral of the likelihood over the body; none when nothing of it is near enough to the best.
    pub(crate) fn ln_mass(&self) -> Option<f64> {
        let best = self.least();
        if best.is_infinite() {
            return None;
        }
        let sum: f64 = self.cells.iter().map(|cell| cell.mass(best)).sum();
        Some(sum.ln() - 0.5 * best)
    }
}

/// A box that waits, least bound first.
struct Waiting {
    centre_m: Vector3<f64>,
    half_m: Vector3<f64>,
    bound: BoxBound,
    overlap: Overlap,
}

impl PartialEq for Waiting {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other).is_eq()
    }
}
impl Eq for Waiting {}
impl PartialOrd for Waiting {
    fn partial_cmp(&self, other: &Self) -> Option<std::cmp::Ordering> {
        Some(self.cmp(other))
    }
}
impl Ord for Waiting {
    fn cmp(&self, other: &Self) -> std::cmp::Ordering {
        // The heap gives its greatest first; ties go by place, so that the order never depends on chance.
        other.bound.least.total_cmp(&self.bound.least).then_with(|| {
            let ordered = |w: &Self| [w.centre_m.x, w.centre_m.y, w.centre_m.z];
            ordered(self)
                .iter()
                .zip(ordered(other))
                .map(|(a, b)| a.total_cmp(&b))
                .find(|order| order.is_ne())
                .unwrap_or(std::cmp::Ordering::Equal)
        })
    }
}

/// Searches the body for every place whose -2 ln likelihood is within the margin of the best: of `known_best`, or of
/// what the search itself finds better.
///
/// # Errors
/// [`SolveError::SearchBox`] when the body's bounds are empty or not finite.
pub(crate) fn search(
    evaluator: &mut Evaluator<'_>,
    domain: &impl Domain,
    known_best: f64,
) -> Result<Search, SolveError> {
    let (min_m, max_m) = domain.bounds_m();
    let half_m = (max_m - min_m) / 2.0;
    if !(half_m.iter().all(|half| half.is_finite()) && half_m.x > 0.0 && half_m.y > 0.0 && half_m.z >= 0.0) {
        return Err(SolveError::SearchBox);
    }
    let finest_m = 1e-7 * half_m.norm();
    let mut best = known_best;
    let mut queue = BinaryHeap::new();
    let mut coarse = Vec::new();
    enqueue(evaluator, domain, &mut queue, &mut best, None, (min_m + half_m, half_m))?;
    let mut examined = 1;
    while let Some(waiting) = queue.pop() {
        if waiting.bound.least > best + MARGIN {
            break;
        }
        if is_fine(&waiting, domain, finest_m) {
            coarse.push(waiting);
        } else if examined >= MOST_BOXES {
            coarse.push(waiting);
            coarse.extend(queue.drain().filter(|left| left.bound.least <= best + MARGIN));
        } else {
            let axis = split_axis(&waiting);
            let mut half_m = waiting.half_m;
            half_m[axis] /= 2.0;
            for side in [-1.0, 1.0] {
                let mut centre_m = waiting.centre_m;
                centre_m[axis] += side * half_m[axis];
                let around = Some(waiting.bound.shadows);
                enqueue(evaluator, domain, &mut queue, &mut best, around, (centre_m, half_m))?;
                examined += 1;
            }
        }
    }
    let resolved = coarse.iter().all(|waiting| is_fine(waiting, domain, finest_m));
    let mut cells = Vec::new();
    for waiting in coarse.iter().filter(|waiting| waiting.bound.least <= best + MARGIN) {
        quarter(evaluator, domain, waiting, best + MARGIN, &mut cells)?;
    }
    Ok(Search { cells, resolved })
}

fn enqueue(
    evaluator: &mut Evaluator<'_>,
    domain: &impl Domain,
    queue: &mut BinaryHeap<Waiting>,
    best: &mut f64,
    around: Option<Shadows>,
    (centre_m, half_m): (Vector3<f64>, Vector3<f64>),
) -> Result<(), SolveError> {
    let overlap = domain.overlap(&centre_m, &half_m);
    if overlap == Overlap::None {
        return Ok(());
    }
    let bound = evaluator.bound(&centre_m, &half_m, around);
    if bound.least > *best + MARGIN {
        return Ok(());
    }
    if domain.contains(&centre_m) {
        let value = match bound.at_centre {
            Some(value) => value,
            None => evaluator.at(&centre_m)?.minus_two_ln,
        };
        *best = best.min(value);
    }
    queue.push(Waiting { centre_m, half_m, bound, overlap });
    Ok(())
}

fn is_fine(waiting: &Waiting, domain: &impl Domain, finest_m: f64) -> bool {
    let half_diagonal_m = waiting.half_m.norm();
    let steps = waiting.bound.steps.iter().map(|step| step * step).sum::<f64>().sqrt();
    let surface_is_fine =
        waiting.overlap == Overlap::Whole || half_diagonal_m <= domain.surface_resolution_m();
    half_diagonal_m <= finest_m
        || (surface_is_fine && steps <= FINE_STEP && waiting.bound.curvature <= 2.0 * FINE_STEP)
}

/// The side along which the likelihood changes most; the longest where it hardly changes.
fn split_axis(waiting: &Waiting) -> usize {
    let steps = waiting.bound.steps;
    let (by_step, greatest) =
        (0..3).map(|axis| (axis, steps[axis])).fold((0, 0.0), |a, b| if b.1 > a.1 { b } else { a });
    if greatest > 0.5 * FINE_STEP && waiting.half_m[by_step] > 0.0 { by_step } else { waiting.half_m.imax() }
}

/// Cuts a box into halves along each side and keeps the parts whose centres are in the body, but for those in which
/// surely no place is within the margin.
fn quarter(
    evaluator: &mut Evaluator<'_>,
    domain: &impl Domain,
    waiting: &Waiting,
    ceiling: f64,
    cells: &mut Vec<Cell>,
) -> Result<(), SolveError> {
    let half_m = waiting.half_m / 2.0;
    let flat = half_m.z == 0.0;
    for corner in 0..if flat { 4_u8 } else { 8 } {
        let sign = |axis: u8| if corner >> axis & 1 == 1 { 1.0 } else { -1.0 };
        let centre_m = waiting.centre_m + Vector3::new(sign(0), sign(1), sign(2)).component_mul(&half_m);
        if !domain.contains(&centre_m) {
            continue;
        }
        let bound = evaluator.bound(&centre_m, &half_m, Some(waiting.bound.shadows));
        if bound.least <= ceiling {
            let minus_two_ln = match bound.at_centre {
                Some(value) => value,
                None => evaluator.at(&centre_m)?.minus_two_ln,
            };
            // A cell that is all inside an obstacle holds nothing; one whose centre is may still reach out of it.
            if minus_two_ln.is_finite() || !evaluator.likelihood().is_walled_in(&centre_m, half_m.norm()) {
                cells.push(Cell { centre_m, half_m, minus_two_ln });
            }
        }
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::arrivals::Arrivals;
    use crate::likelihood::Likelihood;
    use crate::obstacle::Obstacle;
    use crate::site::{Air, Antenna, PositionSigma, Priors, SearchBox, Site};
    use nalgebra::Vector2;
    use rand::{RngExt, SeedableRng};
    use rand_chacha::ChaCha8Rng;

    fn holds(cells: &[Cell], at_m: &Vector3<f64>) -> bool {
        cells.iter().any(|cell| {
            let away = (at_m - cell.centre_m).abs();
            (0..3).all(|axis| away[axis] <= cell.half_m[axis] * (1.0 + 1e-9) + 1e-12)
        })
    }

    /// A random site: flat and collinear arrays, per-axis sigmas, an obstacle and plane searches among them.
    fn random_case(rng: &mut ChaCha8Rng, kind: usize) -> (Site, Arrivals, Vector3<f64>) {
        let count = 4 + kind % 3;
        let antennas: Vec<Antenna> = (0..count)
            .map(|i| {
                let mut position_m = Vector3::new(
                    rng.random_range(0.0..12.0),
                    rng.random_range(0.0..9.0),
                    rng.random_range(1.0..5.0),
                );
                match kind % 5 {
                    1 => position_m.z = 2.0,
                    2 => position_m = Vector3::new(i as f64 * 3.0, 1.0 + i as f64 * 0.5, 2.0),
                    _ => {}
                }
                Antenna {
                    name: i.to_string(),
                    position_m,
                    position_sigma: if kind % 7 == 3 {
                        PositionSigma::PerAxis(Vector3::new(0.02, 0.05, 0.1))
                    } else {
                        PositionSigma::Isotropic(0.03)
                    },
                    delay_sigma_s: 3e-10,
                    response_sigma_s: 1e-10,
                }
            })
            .collect();
        let plane = kind % 4 == 3;
        let search = SearchBox {
            min_m: Vector3::new(-8.0, -8.0, if plane { 4.0 } else { 0.0 }),
            max_m: Vector3::new(20.0, 16.0, if plane { 4.0 } else { 8.0 }),
        };
        let source = Vector3::from_fn(|axis, _| {
            search.min_m[axis] + rng.random_range(0.0..1.0) * (search.max_m[axis] - search.min_m[axis])
        });
        let obstacles = if kind % 3 == 2 {
            let corner = |x, y| Vector2::new(x, y);
            vec![Obstacle {
                name: "house".into(),
                footprint_m: vec![corner(5.0, 3.0), corner(9.0, 3.0), corner(9.0, 6.0), corner(5.0, 6.0)],
                base_m: 0.0,
                top_m: 3.5,
            }]
        } else {
            vec![]
        };
        let site = Site {
            antennas,
            assets: vec![],
            obstacles,
            air: Air { speed_m_per_s: 3e8 },
            search,
            priors: Priors::default(),
        };
        let times: Vec<f64> = site
            .antennas
            .iter()
            .map(|a| (a.position_m - source).norm() / 3e8 + rng.random_range(-4e-10..4e-10))
            .collect();
        let arrivals = Arrivals::independent(&times, &vec![1e-10; count]);
        (site, arrivals, source)
    }

    #[test]
    fn every_place_within_the_margin_lies_in_a_cell() {
        let mut rng = ChaCha8Rng::seed_from_u64(21);
        let mut checked = 0;
        for kind in 0..200 {
            let (site, arrivals, source) = random_case(&mut rng, kind);
            let likelihood = Likelihood::new(&site, &arrivals).unwrap();
            let mut evaluator = Evaluator::new(&likelihood);
            let found = search(&mut evaluator, &site.search, f64::INFINITY).unwrap();
            let mut best = found.cells.iter().map(|cell| cell.minus_two_ln).fold(f64::INFINITY, f64::min);
            let side = site.search.max_m - site.search.min_m;
            // Brute force: places all over the box, and a crowd about the truth and about the best cells.
            let mut places: Vec<Vector3<f64>> =
                (0..3000).map(|_| site.search.min_m + side.map(|s| s * rng.random_range(0.0..1.0))).collect();
            for centre in [source, found.cells[0].centre_m] {
                places.extend((0..300).map(|_| {
                    let offset = side.map(|s| 0.05 * s * rng.random_range(-1.0..1.0));
                    site.search.nearest(&(centre + offset))
                }));
            }
            let values: Vec<f64> =
                places.iter().map(|place| evaluator.at(place).unwrap().minus_two_ln).collect();
            best = values.iter().copied().fold(best, f64::min);
            for (place, value) in places.iter().zip(values) {
                // A margin's half: the margin itself is counted from the best the search found.
                if value <= best + 0.5 * MARGIN {
                    assert!(holds(&found.cells, place), "case {kind}: {place} with {value} above {best}");
                    checked += 1;
                }
            }
        }
        assert!(checked > 5_000, "too few places were put to the test: {checked}");
    }

    #[test]
    fn a_bound_is_never_above_a_value_in_its_box() {
        let mut rng = ChaCha8Rng::seed_from_u64(22);
        for kind in 0..300 {
            let (site, arrivals, _) = random_case(&mut rng, kind);
            let likelihood = Likelihood::new(&site, &arrivals).unwrap();
            let mut evaluator = Evaluator::new(&likelihood);
            let side = site.search.max_m - site.search.min_m;
            for _ in 0..20 {
                let half_m = side * 0.5 * 0.5_f64.powi(rng.random_range(0..9));
                let centre_m = site.search.min_m + side.map(|s| s * rng.random_range(0.0..1.0));
                let bound = evaluator.bound(&centre_m, &half_m, None);
                for _ in 0..20 {
                    let at_m = centre_m + half_m.map(|h| h * rng.random_range(-1.0..1.0));
                    let value = evaluator.at(&at_m).unwrap().minus_two_ln;
                    assert!(bound.least <= value * (1.0 + 1e-9) + 1e-9, "{kind}: {} > {value}", bound.least);
                }
            }
        }
    }
}
