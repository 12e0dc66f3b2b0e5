//! Least squares by the method of Levenberg and Marquardt, written as an argmin [`Solver`].
//!
//! The residuals are whitened with the emission time taken out, the unknowns are scaled by the norms of the columns
//! they multiply (so neither the unit of length nor that of time changes the way), the damped step is solved by an
//! orthogonal decomposition rather than from the normal equations, and steps end at the walls of the search box.
//!
//! Sources: K. Levenberg, Quart. Appl. Math. 2, 1944; D. Marquardt, SIAM J. Appl. Math. 11(2), 1963; the damping
//! follows H. B. Nielsen, *Damping parameter in Marquardt's method*, IMM-REP-1999-05, 1999.

use std::cell::RefCell;

use argmin::core::{
    Error as ArgminError, Executor, IterState, KV, Operator, Problem, Solver, State, TerminationReason,
    TerminationStatus,
};
use nalgebra::{DMatrix, DVector, Vector3};

use crate::error::SolveError;
use crate::likelihood::{Evaluator, Linearised, Value};
use crate::site::SearchBox;

/// How a search for the best point ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum Ended {
    /// No step promises a further gain that could matter.
    Converged,
    /// The iterations were used up; the point is the best seen, not a minimum.
    IterationLimit,
}

/// A local minimum of -2 ln likelihood in the search box.
#[derive(Debug, Clone, PartialEq)]
pub struct Minimum {
    /// Where it is, in metres.
    pub position_m: Vector3<f64>,
    /// The likelihood there.
    pub value: Value,
    /// How the search ended.
    pub ended: Ended,
    /// Iterations made.
    pub iterations: u64,
}

const ITERATION_LIMIT: u64 = 200;
/// A predicted gain in -2 ln likelihood below this, absolute or relative to the value, matters to nothing that is
/// told: probabilities move by half of it.
const GAIN_TOLERANCE: f64 = 1e-12;
/// Damping at the start, relative to the squared column norms: nearly a Gauss-Newton step.
const FIRST_DAMPING: f64 = 1e-3;

/// The minimum reached downhill from `start_m`, inside the search box.
///
/// Each step takes the weights as they are at the point; where sigmas differ by axis they change with the direction, and the
/// search may end a fraction of a sigma from the minimum of -2 ln likelihood. Regions and verdicts do not depend on it.
///
/// # Errors
/// [`SolveError`] when the start is not finite.
pub fn refine(
    evaluator: &mut Evaluator<'_>,
    search: &SearchBox,
    start_m: &Vector3<f64>,
) -> Result<Minimum, SolveError> {
    if start_m.iter().any(|value| !value.is_finite()) {
        return Err(SolveError::NotFinite { what: "the start of the least squares" });
    }
    let start_m = search.nearest(start_m);
    let first = evaluator.linearise(&start_m)?;
    let value = first.value;
    if value.minus_two_ln.is_infinite() {
        // From inside an obstacle no step can be compared with where it begins.
        return Ok(Minimum { position_m: start_m, value, ended: Ended::IterationLimit, iterations: 0 });
    }
    let method = LevenbergMarquardt::new(*search, first);
    let outcome = Executor::new(Whitened { evaluator: RefCell::new(evaluator) }, method)
        .configure(|state| state.param(start_m).cost(value.minus_two_ln).max_iters(ITERATION_LIMIT))
        .timer(false)
        .ctrlc(false)
        .run()
        .map_err(|_| SolveError::NotFinite { what: "a step of the least squares" })?;
    let state = outcome.state();
    let ended = match state.get_termination_reason() {
        Some(TerminationReason::SolverConverged) => Ended::Converged,
        _ => Ended::IterationLimit,
    };
    Ok(Minimum {
        position_m: state.get_param().copied().unwrap_or(start_m),
        value: outcome.solver.current.value,
        ended,
        iterations: state.get_iter(),
    })
}

/// The problem as argmin sees it: a place goes in, the whitened problem about it comes out.
struct Whitened<'e, 'l> {
    evaluator: RefCell<&'e mut Evaluator<'l>>,
}

impl Operator for Whitened<'_, '_> {
    type Param = Vector3<f64>;
    type Output = Linearised;

    fn apply(&self, at_m: &Vector3<f64>) -> Result<Linearised, ArgminError> {
        Ok(self.evaluator.borrow_mut().linearise(at_m)?)
    }
}

/// The method: the damping, and the whitened problem about the current point.
struct LevenbergMarquardt {
    search: SearchBox,
    current: Linearised,
    damping: f64,
    growth: f64,
    scale: [f64; 3],
    converged: bool,
}

impl LevenbergMarquardt {
    fn new(search: SearchBox, first: Linearised) -> Self {
        Self {
            search,
            scale: scales(&first),
            current: first,
            damping: FIRST_DAMPING,
            growth: 2.0,
            converged: false,
        }
    }

    /// The coordinates that may move: not the height on a plane, and not into a wall.
    fn free(&self, at_m: &Vector3<f64>) -> Vec<usize> {
        (0..self.search.unknowns())
            .filter(|&axis| {
                let slope = dot(&self.current.columns[axis], &self.current.residuals);
                let at_low = at_m[axis] <= self.search.min_m[axis] && slope > 0.0;
                let at_high = at_m[axis] >= self.search.max_m[axis] && slope < 0.0;
                !at_low && !at_high
            })
            .collect()
    }

    /// The damped step: the least of `|z + M d|^2 + damping |D d|^2`.
    fn step(&self, free: &[usize]) -> Vector3<f64> {
        let n = self.current.residuals.len();
        let stacked = DMatrix::from_fn(n + free.len(), free.len(), |row, column| {
            if row < n {
                self.current.columns[free[column]][row]
            } else if row - n == column {
                self.damping.sqrt() * self.scale[free[column]]
            } else {
                0.0
            }
        });
        let target =
            DVector::from_fn(
                n + free.len(),
                |row, _| {
                    if row < n { -self.current.residuals[row] } else { 0.0 }
                },
            );
        let decomposed = stacked.qr();
        let mut projected = target;
        decomposed.q_tr_mul(&mut projected);
        let upper = decomposed.unpack_r();
        let mut step = Vector3::zeros();
        if let Some(solution) = upper.solve_upper_triangular(&projected.rows(0, free.len()).into_owned()) {
            for (&axis, value) in free.iter().zip(solution.iter()) {
                step[axis] = *value;
            }
        }
        step
    }
}

impl<O> Solver<O, IterState<Vector3<f64>, (), (), (), (), f64>> for LevenbergMarquardt
where
    O: Operator<Param = Vector3<f64>, Output = Linearised>,
{
    fn name(&self) -> &str {
        "Levenberg-Marquardt"
    }

    fn next_iter(
        &mut self,
        problem: &mut Problem<O>,
        mut state: IterState<Vector3<f64>, (), (), (), (), f64>,
    ) -> Result<(IterState<Vector3<f64>, (), (), (), (), f64>, Option<KV>), ArgminError> {
        let at_m = state.take_param().unwrap_or(self.search.min_m);
        let free = self.free(&at_m);
        let trial_m = self.search.nearest(&(at_m + self.step(&free)));
        let step = trial_m - at_m;
        let chi_square = self.current.value.chi_square;
        let predicted: f64 = (0..self.current.residuals.len())
            .map(|row| {
                let moved: f64 = (0..3).map(|axis| self.current.columns[axis][row] * step[axis]).sum();
                (self.current.residuals[row] + moved).powi(2)
            })
            .sum();
        let promised = chi_square - predicted;
        if promised <= GAIN_TOLERANCE * (1.0 + chi_square) || step == Vector3::zeros() {
            self.converged = true;
            return Ok((state.param(at_m).cost(self.current.value.minus_two_ln), None));
        }
        let trial = problem.problem("places", |place| place.apply(&trial_m))?;
        let gained = self.current.value.minus_two_ln - trial.value.minus_two_ln;
        if gained > 0.0 {
            let ratio = gained / promised;
            self.damping *= (1.0 - (2.0 * ratio - 1.0).powi(3)).clamp(1.0 / 3.0, 2.0);
            self.growth = 2.0;
            for (kept, new) in self.scale.iter_mut().zip(scales(&trial)) {
                *kept = kept.max(new);
            }
            self.current = trial;
            Ok((state.param(trial_m).cost(self.current.value.minus_two_ln), None))
        } else {
            self.damping *= self.growth;
            self.growth *= 2.0;
            Ok((state.param(at_m).cost(self.current.value.minus_two_ln), None))
        }
    }

    fn terminate(&mut self, _: &IterState<Vector3<f64>, (), (), (), (), f64>) -> TerminationStatus {
        if self.converged {
            TerminationStatus::Terminated(TerminationReason::SolverConverged)
        } else {
            TerminationStatus::NotTerminated
        }
    }
}

/// Marquardt's scaling: the norms of the columns, none of them zero.
fn scales(linearised: &Linearised) -> [f64; 3] {
    let norms = linearised.columns.each_ref().map(|column| dot(column, column).sqrt());
    let greatest = norms.iter().copied().fold(0.0, f64::max);
    norms.map(|norm| norm.max(1e-9 * greatest).max(f64::MIN_POSITIVE))
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}
