//! The separate answers within the data: the minima of -2 ln likelihood, and the probability each of them holds.

use std::collections::HashSet;

use nalgebra::Vector3;

use crate::branch_and_bound::Cell;
use crate::error::SolveError;
use crate::least_squares::{Minimum, refine};
use crate::likelihood::Evaluator;
use crate::site::SearchBox;

/// A separate answer.
#[derive(Debug, Clone, PartialEq)]
pub struct Mode {
    /// Its best point.
    pub minimum: Minimum,
    /// Share of the posterior (uniform prior over the search box) that belongs to it.
    pub probability: f64,
}

/// Minima between which -2 ln likelihood rises by less than this along the straight line are one answer: the saddle is as
/// likely as they are, to a factor of the square root of e.
const SHALLOW: f64 = 1.0;

/// Starts of least squares are taken at most this far above the best, in -2 ln likelihood: what lies above holds too
/// little probability to be an answer by itself.
const START_CEILING: f64 = 18.0;

/// Finds the minima among `starts_m` and the cells, and shares the cells out among them: the modes, most probable
/// first, and for every cell the index of its mode.
///
/// # Errors
/// [`SolveError`] when a start is not finite.
pub(crate) fn find(
    evaluator: &mut Evaluator<'_>,
    search: &SearchBox,
    cells: &[Cell],
    starts: Vec<Minimum>,
) -> Result<(Vec<Mode>, Vec<usize>), SolveError> {
    let mut minima: Vec<Minimum> = Vec::new();
    for start in starts.into_iter().filter(|start| start.value.minus_two_ln.is_finite()) {
        add(evaluator, &mut minima, start)?;
    }
    let mut order: Vec<usize> = (0..cells.len()).collect();
    order.sort_by(|&a, &b| cells[a].minus_two_ln.total_cmp(&cells[b].minus_two_ln));
    let least = order.first().map_or(f64::INFINITY, |&first| cells[first].minus_two_ln);
    let mut seen = HashSet::new();
    for &index in order.iter().take_while(|&&index| cells[index].minus_two_ln <= least + START_CEILING) {
        let cell = &cells[index];
        if !seen.insert(coarse_place(search, &cell.centre_m)) {
            continue;
        }
        let mut explained = false;
        for minimum in &minima {
            explained = explained || descends(evaluator, cell, minimum)?;
        }
        if !explained {
            let minimum = refine(evaluator, search, &cell.centre_m)?;
            add(evaluator, &mut minima, minimum)?;
        }
    }
    minima.retain(|minimum| minimum.value.minus_two_ln <= least + START_CEILING);
    share_out(evaluator, cells, minima)
}

/// Places are told apart on a coarse grid, so that the cells of one valley do not each start a search.
fn coarse_place(search: &SearchBox, at_m: &Vector3<f64>) -> [i64; 3] {
    let side_m = (search.max_m - search.min_m).max() / 48.0;
    let place = (at_m - search.min_m) / side_m;
    [place.x as i64, place.y as i64, place.z as i64]
}

/// Whether the way from the cell to the minimum leads downhill.
fn descends(evaluator: &mut Evaluator<'_>, cell: &Cell, minimum: &Minimum) -> Result<bool, SolveError> {
    let mut above = cell.minus_two_ln;
    for step in 1..=8 {
        let value =
            evaluator.at(&cell.centre_m.lerp(&minimum.position_m, f64::from(step) / 8.0))?.minus_two_ln;
        if value > above + 0.5 * SHALLOW {
            return Ok(false);
        }
        above = above.min(value);
    }
    Ok(true)
}

/// Keeps the minimum when it is a new answer, or the better end of one that is known.
fn add(evaluator: &mut Evaluator<'_>, minima: &mut Vec<Minimum>, minimum: Minimum) -> Result<(), SolveError> {
    for known in minima.iter_mut() {
        if is_same(evaluator, known, &minimum)? {
            if minimum.value.minus_two_ln < known.value.minus_two_ln {
                *known = minimum;
            }
            return Ok(());
        }
    }
    minima.push(minimum);
    Ok(())
}

fn is_same(evaluator: &mut Evaluator<'_>, a: &Minimum, b: &Minimum) -> Result<bool, SolveError> {
    let higher = a.value.minus_two_ln.max(b.value.minus_two_ln);
    for step in 1..16 {
        let between_m = a.position_m.lerp(&b.position_m, f64::from(step) / 16.0);
        if evaluator.at(&between_m)?.minus_two_ln > higher + SHALLOW {
            return Ok(false);
        }
    }
    Ok(true)
}

/// Every cell goes to the minimum that is nearest in the metric of that minimum's own linearised problem.
fn share_out(
    evaluator: &mut Evaluator<'_>,
    cells: &[Cell],
    minima: Vec<Minimum>,
) -> Result<(Vec<Mode>, Vec<usize>), SolveError> {
    if minima.len() <= 1 {
        let modes = minima.into_iter().map(|minimum| Mode { minimum, probability: 1.0 }).collect();
        return Ok((modes, vec![0; cells.len()]));
    }
    let least = cells.iter().map(|cell| cell.minus_two_ln).fold(f64::INFINITY, f64::min);
    let mut metrics = Vec::new();
    for minimum in &minima {
        metrics.push(evaluator.linearise(&minimum.position_m)?.columns);
    }
    let distance = |mode: usize, at_m: &Vector3<f64>| -> f64 {
        let way = at_m - minima[mode].position_m;
        let [x, y, z] = &metrics[mode];
        let whitened: f64 =
            (0..x.len()).map(|row| (x[row] * way.x + y[row] * way.y + z[row] * way.z).powi(2)).sum();
        // Where two metrics cannot tell, the nearer in metres has it.
        whitened + 1e-9 * way.norm_squared()
    };
    let mut masses = vec![0.0; minima.len()];
    let mut owner: Vec<usize> = Vec::with_capacity(cells.len());
    for cell in cells {
        let nearest = (0..minima.len())
            .map(|mode| (mode, distance(mode, &cell.centre_m)))
            .fold((0, f64::INFINITY), |a, b| if b.1 < a.1 { b } else { a });
        masses[nearest.0] += cell.mass(least);
        owner.push(nearest.0);
    }
    let total: f64 = masses.iter().sum();
    let mut order: Vec<usize> = (0..minima.len()).collect();
    order.sort_by(|&a, &b| masses[b].total_cmp(&masses[a]));
    let mut rank = vec![0; minima.len()];
    for (place, &mode) in order.iter().enumerate() {
        rank[mode] = place;
    }
    let modes = order
        .iter()
        .map(|&mode| Mode { minimum: minima[mode].clone(), probability: masses[mode] / total })
        .collect();
    Ok((modes, owner.into_iter().map(|mode| rank[mode]).collect()))
}
