//! The profile likelihood of a place: the one function that least squares, search, region and verdict share.
//!
//! Antenna i hears the source at x at `t_i = t0 + L_i(x)/v + e_i`, with S the covariance of e. The emission time t0
//! is marginalised, so with `r_i = t_i - L_i(x)/v`
//!
//! `-2 ln likelihood(x) = r' P r + ln det S + ln(1' S^-1 1)`.
//!
//! Inside, times are turned into ranges (multiplied by v), so that everything is in metres.
//!
//! Where an obstacle stands in the way, the direct wave does not arrive; what arrives is later by an excess taken as
//! exponential with mean `late_scale_s`. It enters with the first two moments of that density: the expected
//! arrival is later by the mean, and its variance is greater by the mean squared. The determinants of S keep the
//! density normalised, so a place gains nothing from being in shadow. Inside an obstacle there is no source that any
//! antenna could hear: the likelihood is zero there.

use std::collections::HashMap;

use nalgebra::{DMatrix, Vector3};

use crate::arrivals::Arrivals;
use crate::error::SolveError;
use crate::obstacle::{ConvexPrism, Shadow};
use crate::site::{PositionSigma, Site};
use crate::weights::Weights;

/// Antennas that can be solved together: their visibility is one bit each.
pub const MOST_ANTENNAS: usize = 64;

/// The data and the geometry of one solve. Make an [`Evaluator`] of it to ask for values.
#[derive(Debug, Clone)]
pub struct Likelihood {
    positions_m: Vec<Vector3<f64>>,
    position_sigmas: Vec<PositionSigma>,
    /// Times the speed, about their mean.
    ranges_m: Vec<f64>,
    random_m2: DMatrix<f64>,
    /// Delay and response variance, in m^2.
    chain_m2: Vec<f64>,
    late_m: f64,
    prisms: Vec<ConvexPrism>,
    isotropic: bool,
    speed_m_per_s: f64,
    /// The determinants with every line clear and the smallest position variances: the least there can be.
    least_determinants: f64,
}

/// Singular value decompositions are given up after this many sweeps; without a limit they do not end on NaN.
const SVD_SWEEPS: usize = 200;
/// A direction whose influence on the data is this much smaller than the best one's is undetermined.
const LEAST_CONDITION: f64 = 1e-9;

/// The likelihood of one place.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Value {
    /// `r' P r` at this place.
    pub chi_square: f64,
    /// -2 ln likelihood, up to a constant that is the same for all places of one [`Likelihood`]; never less than
    /// `chi_square`.
    pub minus_two_ln: f64,
}

/// Which antennas are in shadow, one bit each.
pub(crate) type Mask = u64;

/// Which antennas are in shadow over a box.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Shadows {
    /// Those that are so in some places of the box and perhaps not in others.
    pub(crate) part: Mask,
    /// Those that are so in every place of the box.
    pub(crate) whole: Mask,
}

impl Likelihood {
    /// Gathers what one solve needs.
    ///
    /// # Errors
    /// [`SolveError`] when shapes or indices do not fit, something is not finite, or the covariance with the site's
    /// systematic errors is not positive definite.
    pub fn new(site: &Site, arrivals: &Arrivals) -> Result<Self, SolveError> {
        arrivals.check(site)?;
        let speed_m_per_s = site.air.speed_m_per_s;
        if !(speed_m_per_s.is_finite() && speed_m_per_s > 0.0) {
            return Err(SolveError::NotFinite { what: "the speed of the wave" });
        }
        let chosen: Vec<_> = arrivals.antennas.iter().map(|&index| &site.antennas[index]).collect();
        let positions_m: Vec<_> = chosen.iter().map(|antenna| antenna.position_m).collect();
        if positions_m.iter().any(|position| position.iter().any(|value| !value.is_finite())) {
            return Err(SolveError::NotFinite { what: "the position of an antenna" });
        }
        let spread_m = positions_m.iter().map(|p| (p - positions_m[0]).norm()).fold(0.0, f64::max);
        if spread_m <= f64::EPSILON * positions_m[0].norm() {
            return Err(SolveError::CoincidentAntennas);
        }
        let mean_s = arrivals.times_s.mean();
        let mut likelihood = Self {
            position_sigmas: chosen.iter().map(|antenna| antenna.position_sigma).collect(),
            ranges_m: arrivals.times_s.iter().map(|time| (time - mean_s) * speed_m_per_s).collect(),
            random_m2: symmetric(&arrivals.random_covariance_s2) * speed_m_per_s.powi(2),
            chain_m2: chosen
                .iter()
                .map(|antenna| antenna.chain_variance_s2() * speed_m_per_s.powi(2))
                .collect(),
            late_m: site.priors.late_scale_s * speed_m_per_s,
            prisms: site.obstacles.iter().flat_map(crate::obstacle::Obstacle::convex_pieces).collect(),
            isotropic: chosen.iter().all(|a| matches!(a.position_sigma, PositionSigma::Isotropic(_))),
            speed_m_per_s,
            least_determinants: 0.0,
            positions_m,
        };
        let least = likelihood.systematic_m2(0, |sigma, _| sigma.variance_range_m2().0);
        likelihood.least_determinants =
            likelihood.weights(&least).ok_or(SolveError::Covariance)?.ln_determinants;
        Ok(likelihood)
    }

    /// Number of arrivals.
    #[must_use]
    pub fn len(&self) -> usize {
        self.positions_m.len()
    }

    /// Whether there are no arrivals; never, for a likelihood that could be made.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.positions_m.is_empty()
    }

    /// Positions of the antennas of the arrivals, in metres.
    #[must_use]
    pub fn positions_m(&self) -> &[Vector3<f64>] {
        &self.positions_m
    }

    /// Arrival times times the speed, in metres, about their mean.
    #[must_use]
    pub fn ranges_m(&self) -> &[f64] {
        &self.ranges_m
    }

    /// Mean of the antennas' positions, in metres.
    #[must_use]
    pub fn array_centre_m(&self) -> Vector3<f64> {
        self.positions_m.iter().sum::<Vector3<f64>>() / self.len() as f64
    }

    /// Speed of the wave in m/s.
    #[must_use]
    pub fn speed_m_per_s(&self) -> f64 {
        self.speed_m_per_s
    }

    /// Random covariance of the ranges, in m^2.
    #[must_use]
    pub fn random_m2(&self) -> &DMatrix<f64> {
        &self.random_m2
    }

    /// Systematic variances of the ranges for a source at `at_m`, in m^2, an antenna in shadow included with what
    /// its unknown excess adds.
    #[must_use]
    pub fn systematic_variances_m2(&self, at_m: &Vector3<f64>) -> Vec<f64> {
        self.systematic_m2(self.shadowed(at_m), |sigma, antenna| {
            sigma.variance_along_m2(&unit_or_zero(&(at_m - self.positions_m[antenna])))
        })
    }

    /// Whether the straight way from arrival `index`'s antenna to the place is clear.
    #[must_use]
    pub fn line_of_sight(&self, index: usize, at_m: &Vector3<f64>) -> bool {
        !self.prisms.iter().any(|prism| prism.blocks(&self.positions_m[index], at_m))
    }

    /// Whether the place is inside an obstacle, at least `deep_m` from its surface.
    pub(crate) fn is_walled_in(&self, at_m: &Vector3<f64>, deep_m: f64) -> bool {
        self.prisms.iter().any(|prism| prism.contains(at_m, deep_m))
    }

    fn shadowed(&self, at_m: &Vector3<f64>) -> Mask {
        if self.prisms.is_empty() {
            return 0;
        }
        (0..self.len()).filter(|&index| !self.line_of_sight(index, at_m)).fold(0, |mask, i| mask | 1 << i)
    }

    /// Which antennas may be in shadow, and which surely are, over a box.
    fn shadows_over(&self, centre_m: &Vector3<f64>, half_m: &Vector3<f64>) -> Shadows {
        let (mut part, mut whole) = (0, 0);
        for (index, antenna_m) in self.positions_m.iter().enumerate() {
            for prism in &self.prisms {
                match prism.shadow_over(antenna_m, centre_m, half_m) {
                    Shadow::None => {}
                    Shadow::Part => part |= 1 << index,
                    Shadow::Whole => whole |= 1 << index,
                }
            }
        }
        Shadows { part: part & !whole, whole }
    }

    fn systematic_m2(&self, shadowed: Mask, position: impl Fn(&PositionSigma, usize) -> f64) -> Vec<f64> {
        (0..self.len()).map(|i| self.systematic_of(i, shadowed, &position)).collect()
    }

    fn systematic_of(
        &self,
        index: usize,
        shadowed: Mask,
        position: impl Fn(&PositionSigma, usize) -> f64,
    ) -> f64 {
        let late = if shadowed >> index & 1 == 1 { self.late_m.powi(2) } else { 0.0 };
        self.chain_m2[index] + position(&self.position_sigmas[index], index) + late
    }

    fn weights(&self, systematic_m2: &[f64]) -> Option<Weights> {
        let mut covariance = self.random_m2.as_slice().to_vec();
        for (i, variance) in systematic_m2.iter().enumerate() {
            covariance[i * self.len() + i] += variance;
        }
        Weights::new(&covariance, self.len())
    }

    /// Weights for the arrivals not in `dropped`, whose rows and columns are left out of S; whitened residuals then
    /// ignore the dropped ones.
    fn weights_without(&self, systematic_m2: &[f64], dropped: Mask) -> Option<Weights> {
        if dropped == 0 {
            return self.weights(systematic_m2);
        }
        // An arrival of boundless variance weighs nothing: the limit is reached to rounding long before 1e12 x.
        let greatest = (0..self.len()).map(|i| systematic_m2[i] + self.random_m2[(i, i)]).fold(0.0, f64::max);
        let boundless = 1e12 * greatest;
        let mut systematic_m2 = systematic_m2.to_vec();
        for (i, variance) in systematic_m2.iter_mut().enumerate() {
            if dropped >> i & 1 == 1 {
                *variance = boundless;
            }
        }
        self.weights(&systematic_m2)
    }
}

/// The symmetric part: rounding may have left the halves of a covariance unlike in the last digit.
fn symmetric(matrix: &DMatrix<f64>) -> DMatrix<f64> {
    (matrix + matrix.transpose()) * 0.5
}

/// The unit vector along `way`, or zero where the source sits on the antenna and has no direction.
pub(crate) fn unit_or_zero(way: &Vector3<f64>) -> Vector3<f64> {
    way.try_normalize(0.0).unwrap_or_else(Vector3::zeros)
}

/// Asks a [`Likelihood`] for values; holds the scratch and the weights that are used again.
#[derive(Debug, Clone)]
pub struct Evaluator<'a> {
    likelihood: &'a Likelihood,
    /// Weights by which antennas are in shadow, kept while they do not depend on the place.
    by_shadow: HashMap<Mask, Weights>,
    /// Weights for bounds, by shadowed and dropped antennas.
    bounding: HashMap<(Mask, Mask), Weights>,
    /// Weights that are made anew for every place, where they depend on it.
    spare: Option<Weights>,
    covariance: Vec<f64>,
    residuals: Vec<f64>,
    whitened: Vec<f64>,
    column: Vec<f64>,
    pub(crate) directions: Vec<Vector3<f64>>,
    distances: Vec<f64>,
}

/// The whitened problem about one place: `z(x + d) = z + M d` to first order.
#[derive(Debug, Clone, PartialEq)]
pub struct Linearised {
    /// Value at the place.
    pub value: Value,
    /// Whitened residuals z, one per arrival; `|z|^2` is chi-square.
    pub residuals: Vec<f64>,
    /// Derivative M of the whitened residuals by x, y and z in 1/m: one column per coordinate.
    pub columns: [Vec<f64>; 3],
}

impl<'a> Evaluator<'a> {
    /// An evaluator with empty caches.
    #[must_use]
    pub fn new(likelihood: &'a Likelihood) -> Self {
        let n = likelihood.len();
        Self {
            likelihood,
            by_shadow: HashMap::new(),
            bounding: HashMap::new(),
            spare: None,
            covariance: Vec::new(),
            residuals: vec![0.0; n],
            whitened: vec![0.0; n],
            column: vec![0.0; n],
            directions: vec![Vector3::zeros(); n],
            distances: vec![0.0; n],
        }
    }

    /// What the evaluator asks.
    #[must_use]
    pub fn likelihood(&self) -> &'a Likelihood {
        self.likelihood
    }

    /// The likelihood of a source at `at_m`; -2 ln of it is infinite inside an obstacle.
    ///
    /// # Errors
    /// [`SolveError::NotFinite`] for a place that is not finite.
    pub fn at(&mut self, at_m: &Vector3<f64>) -> Result<Value, SolveError> {
        if at_m.iter().any(|value| !value.is_finite()) {
            return Err(SolveError::NotFinite { what: "the place asked for" });
        }
        let shadowed = self.likelihood.shadowed(at_m);
        self.travel(at_m, shadowed);
        let (mut value, ()) = self.with_weights(shadowed, |_, _| ()).ok_or(SolveError::Covariance)?;
        if shadowed != 0 && self.likelihood.is_walled_in(at_m, 0.0) {
            value.minus_two_ln = f64::INFINITY;
        }
        Ok(value)
    }

    /// The whitened residuals and their derivative about `at_m`, the weights held as they are there.
    ///
    /// # Errors
    /// As [`Evaluator::at`].
    pub fn linearise(&mut self, at_m: &Vector3<f64>) -> Result<Linearised, SolveError> {
        if at_m.iter().any(|value| !value.is_finite()) {
            return Err(SolveError::NotFinite { what: "the place asked for" });
        }
        let shadowed = self.likelihood.shadowed(at_m);
        self.travel(at_m, shadowed);
        let (mut value, columns) = self
            .with_weights(shadowed, |weights, evaluator| {
                [0, 1, 2].map(|axis| {
                    evaluator.whiten_direction(weights, axis);
                    evaluator.column.clone()
                })
            })
            .ok_or(SolveError::Covariance)?;
        if shadowed != 0 && self.likelihood.is_walled_in(at_m, 0.0) {
            value.minus_two_ln = f64::INFINITY;
        }
        Ok(Linearised { value, residuals: self.whitened.clone(), columns })
    }

    /// How the least-squares position moves with each range: the matrix A = -M^+ W with `dx = A e` for errors e of the
    /// ranges in metres, shape 3 x arrivals, linearised about `at_m`. Only the first `unknowns` coordinates move (2
    /// on a plane). None where the geometry leaves a direction undetermined.
    ///
    /// # Errors
    /// As [`Evaluator::at`].
    pub fn sensitivity(
        &mut self,
        at_m: &Vector3<f64>,
        unknowns: usize,
    ) -> Result<Option<DMatrix<f64>>, SolveError> {
        let linearised = self.linearise(at_m)?;
        let n = self.residuals.len();
        let unknowns = unknowns.clamp(1, 3);
        let columns = DMatrix::from_fn(n, unknowns, |row, axis| linearised.columns[axis][row]);
        let Some(svd) = columns.try_svd(true, true, f64::EPSILON, SVD_SWEEPS) else { return Ok(None) };
        if svd.singular_values.min() <= LEAST_CONDITION * svd.singular_values.max() {
            return Ok(None);
        }
        let Ok(inverse) = svd.pseudo_inverse(0.0) else { return Ok(None) };
        let shadowed = self.likelihood.shadowed(at_m);
        let whitener = self.with_weights(shadowed, |weights, _| weights.matrix());
        Ok(whitener.map(|(_, whitener)| {
            let mut sensitivity = DMatrix::zeros(3, n);
            sensitivity.rows_mut(0, unknowns).copy_from(&(-(inverse * whitener)));
            sensitivity
        }))
    }

    /// Per-arrival residuals in metres with the estimated common part removed, at `at_m`.
    ///
    /// # Errors
    /// As [`Evaluator::at`].
    pub fn residuals_m(&mut self, at_m: &Vector3<f64>) -> Result<Vec<f64>, SolveError> {
        self.at(at_m)?;
        let shadowed = self.likelihood.shadowed(at_m);
        let (_, common) = self
            .with_weights(shadowed, |weights, evaluator| weights.common(&evaluator.residuals))
            .ok_or(SolveError::Covariance)?;
        Ok(self.residuals.iter().map(|residual| residual - common).collect())
    }

    /// A lower bound of -2 ln likelihood over the box (`around`: the shadows over a box it lies in), and how far the
    /// whitened residuals move within it at most; see [`crate::branch_and_bound`] for the argument.
    pub(crate) fn bound(
        &mut self,
        centre_m: &Vector3<f64>,
        half_m: &Vector3<f64>,
        around: Option<Shadows>,
    ) -> BoxBound {
        let likelihood = self.likelihood;
        // Inside a box with the same shadows all over there is nothing to find out.
        let shadows = match around {
            Some(shadows) if shadows.part == 0 => shadows,
            _ => likelihood.shadows_over(centre_m, half_m),
        };
        let Shadows { part, whole } = shadows;
        self.travel(centre_m, whole);
        let key = (whole, part);
        let Some(weights) = self.take_bounding_weights(key) else { return BoxBound::UNKNOWN };
        weights.apply(&self.residuals, &mut self.whitened);
        let steps = self.steps(&weights, half_m);
        let reach_m = half_m.norm();
        let (mut curvature, mut lipschitz) = (0.0, 0.0);
        for (distance_m, column_norm) in self.distances.iter().zip(&weights.column_norms) {
            let nearest_m = distance_m - reach_m;
            let remainder_m = if nearest_m > 0.0 {
                (reach_m * reach_m / (2.0 * nearest_m)).min(2.0 * reach_m)
            } else {
                2.0 * reach_m
            };
            curvature += column_norm * remainder_m;
            lipschitz += column_norm * reach_m;
        }
        let spread = (steps.iter().sum::<f64>() + curvature).min(lipschitz);
        let least_norm = (norm(&self.whitened) - spread).max(0.0);
        // With an antenna in part shadow the determinants can only be greater than with it clear.
        let determinants = if part == 0 && likelihood.isotropic {
            weights.ln_determinants
        } else {
            likelihood.least_determinants
        };
        let excess = (determinants - likelihood.least_determinants).max(0.0);
        let uniform = part == 0;
        // In shadow the centre may be inside an obstacle, which is asked only of the places that need it.
        let at_centre =
            (part | whole == 0 && likelihood.isotropic).then(|| norm(&self.whitened).powi(2) + excess);
        self.bounding.insert(key, weights);
        // What is dropped from the bound still moves the likelihood where it is clear.
        let steps = if uniform { steps } else { self.clear_steps(whole, half_m).unwrap_or(steps) };
        BoxBound { least: least_norm * least_norm + excess, steps, curvature, shadows, at_centre }
    }

    fn take_bounding_weights(&mut self, key: (Mask, Mask)) -> Option<Weights> {
        let likelihood = self.likelihood;
        self.bounding.remove(&key).or_else(|| {
            // The greatest variances give the smallest chi-square, whatever the direction.
            let greatest = likelihood.systematic_m2(key.0, |sigma, _| sigma.variance_range_m2().1);
            likelihood.weights_without(&greatest, key.1)
        })
    }

    fn clear_steps(&mut self, whole: Mask, half_m: &Vector3<f64>) -> Option<[f64; 3]> {
        let weights = self.take_bounding_weights((whole, 0))?;
        let steps = self.steps(&weights, half_m);
        self.bounding.insert((whole, 0), weights);
        Some(steps)
    }

    fn steps(&mut self, weights: &Weights, half_m: &Vector3<f64>) -> [f64; 3] {
        [0, 1, 2].map(|axis| {
            self.whiten_direction(weights, axis);
            half_m[axis] * norm(&self.column)
        })
    }

    /// Distances, directions and residuals at a place.
    fn travel(&mut self, at_m: &Vector3<f64>, shadowed: Mask) {
        let likelihood = self.likelihood;
        for (i, antenna_m) in likelihood.positions_m.iter().enumerate() {
            let way = at_m - antenna_m;
            let distance_m = way.norm();
            let late_m = if shadowed >> i & 1 == 1 { likelihood.late_m } else { 0.0 };
            self.distances[i] = distance_m;
            self.directions[i] = if distance_m > 0.0 { way / distance_m } else { Vector3::zeros() };
            self.residuals[i] = likelihood.ranges_m[i] - distance_m - late_m;
        }
    }

    /// Whitens the residuals with the weights of this place and lets `use_weights` work with them.
    fn with_weights<R>(
        &mut self,
        shadowed: Mask,
        use_weights: impl FnOnce(&Weights, &mut Self) -> R,
    ) -> Option<(Value, R)> {
        let likelihood = self.likelihood;
        let kept = if likelihood.isotropic { self.by_shadow.remove(&shadowed) } else { None };
        let weights = match kept {
            Some(weights) => weights,
            None => self.weights_at(shadowed)?,
        };
        let mut whitened = std::mem::take(&mut self.whitened);
        weights.apply(&self.residuals, &mut whitened);
        let chi_square: f64 = whitened.iter().map(|z| z * z).sum();
        self.whitened = whitened;
        let excess = (weights.ln_determinants - likelihood.least_determinants).max(0.0);
        let result = use_weights(&weights, self);
        if likelihood.isotropic {
            self.by_shadow.insert(shadowed, weights);
        } else {
            self.spare = Some(weights);
        }
        Some((Value { chi_square, minus_two_ln: chi_square + excess }, result))
    }

    /// The weights of the place last travelled to.
    fn weights_at(&mut self, shadowed: Mask) -> Option<Weights> {
        let likelihood = self.likelihood;
        let n = likelihood.len();
        self.covariance.clear();
        self.covariance.extend_from_slice(likelihood.random_m2.as_slice());
        for i in 0..n {
            let along = |sigma: &PositionSigma, i: usize| sigma.variance_along_m2(&self.directions[i]);
            let systematic = likelihood.systematic_of(i, shadowed, along);
            self.covariance[i * n + i] += systematic;
        }
        match self.spare.take() {
            Some(mut weights) => weights.refill(&self.covariance).then_some(weights),
            None => Weights::new(&self.covariance, n),
        }
    }

    /// Writes the derivative of the whitened residuals by one coordinate to `column`.
    fn whiten_direction(&mut self, weights: &Weights, axis: usize) {
        let mut column = std::mem::take(&mut self.column);
        // The residual falls where the distance grows.
        let n = self.directions.len();
        let mut slopes = [0.0; MOST_ANTENNAS];
        for (slope, direction) in slopes.iter_mut().zip(&self.directions) {
            *slope = -direction[axis];
        }
        weights.apply(&slopes[..n], &mut column);
        self.column = column;
    }
}

/// What is known of a whole box.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct BoxBound {
    /// No place of the box has a smaller -2 ln likelihood.
    pub(crate) least: f64,
    /// How far the whitened residuals move along each half side, to first order.
    pub(crate) steps: [f64; 3],
    /// How far they may move beyond first order.
    pub(crate) curvature: f64,
    /// Which antennas are in shadow over the box.
    pub(crate) shadows: Shadows,
    /// -2 ln likelihood of the centre, where it came for nothing.
    pub(crate) at_centre: Option<f64>,
}

impl BoxBound {
    /// Of a box of which nothing can be said.
    const UNKNOWN: Self = Self {
        least: 0.0,
        steps: [f64::INFINITY; 3],
        curvature: 0.0,
        shadows: Shadows { part: Mask::MAX, whole: 0 },
        at_centre: None,
    };
}

fn norm(values: &[f64]) -> f64 {
    values.iter().map(|value| value * value).sum::<f64>().sqrt()
}
