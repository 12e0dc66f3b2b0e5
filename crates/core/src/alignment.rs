//! Gated pulses of all channels laid on one common shape.
//!
//! Each channel is shifted until it agrees best with the sum of all others (leave one out), again and again: all
//! channels together hold on to the right cycle where a single pair would slip. The pulses may be of opposite
//! polarity.

use nalgebra::DMatrix;
use realfft::num_complex::Complex64;

use crate::correlation::peak::Sinusoids;
use crate::fusion::PairDelay;
use crate::gate::Gate;

/// Steps of the search, per period.
const STEPS_PER_PERIOD: f64 = 8.0;
/// Rounds of laying every channel on the others.
const ROUNDS: usize = 3;
/// Beyond this many periods from the peak it is another cycle.
const MAIN_LOBE: f64 = 0.25;
/// Share of the log-posterior that counts when the chance of another cycle is told: measured, because the shape that
/// the other channels give is noisy itself.
const SLIP_TEMPER: f64 = 0.65;
/// The posterior falls off like this power and not like an exponential: shapes that nearly repeat slip more often than
/// noise explains. Measured.
const SLIP_TAIL: f64 = 10.0;
/// What the onsets of two channels may differ by besides their sigmas when a cycle is chosen, in periods: onsets are
/// sometimes picked one swing apart.
const ONSET_SLACK: f64 = 0.8;
/// Where the spectra show less signal than this share of their noise, this much is assumed, so that no sigma is
/// infinite.
const LEAST_SIGNAL: f64 = 0.1;

/// One channel that takes part. Times in samples.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Member {
    /// Where its gate stands.
    pub(crate) gate: f64,
    /// How much later than the gate the common shape begins.
    pub(crate) shift: f64,
    /// Where the onset was picked, and the variance of that.
    pub(crate) onset: f64,
    pub(crate) onset_variance: f64,
    /// +1, or -1 for a pulse upside down.
    pub(crate) polarity: f64,
    /// Energy under the gate, in units of the noise.
    pub(crate) energy: f64,
}

/// Scratch for the alignment.
#[derive(Debug, Clone, Default)]
pub(crate) struct Alignment {
    cross: Vec<Complex64>,
    template: Vec<Complex64>,
}

impl Alignment {
    /// Sets each member's energy from its spectrum.
    pub(crate) fn measure(gate: &Gate, spectra: &[Complex64], members: &mut [Member]) {
        let count = gate.omega.len();
        for (member, spectrum) in members.iter_mut().zip(spectra.chunks_exact(count)) {
            member.energy = energy(gate, spectrum);
        }
    }

    /// First shifts: each member against the strongest, anywhere within `search` samples of where the onsets say.
    /// `spectra` holds the members' whitened gate spectra one after the other.
    pub(crate) fn coarse(&mut self, gate: &Gate, spectra: &[Complex64], members: &mut [Member], search: f64) {
        let count = gate.omega.len();
        let Some(strongest) =
            (0..members.len()).max_by(|&i, &j| members[i].energy.total_cmp(&members[j].energy))
        else {
            return;
        };
        for index in 0..members.len() {
            members[index].shift = 0.0;
            members[index].polarity = 1.0;
            if index == strongest {
                continue;
            }
            let reference = &spectra[strongest * count..][..count];
            self.cross.clear();
            self.cross
                .extend(reference.iter().zip(&spectra[index * count..][..count]).map(|(a, b)| a.conj() * b));
            let other = members[strongest];
            let variance = members[index].onset_variance + other.onset_variance;
            let expected = (members[index].onset - members[index].gate) - (other.onset - other.gate);
            let energies = (other.energy, members[index].energy);
            let (shift, value) =
                search_peak(gate, &self.cross, Against { energies, expected, variance }, search);
            members[index].shift = shift;
            members[index].polarity = value.signum();
        }
    }

    /// Lays each member on the sum of the others, within `search` samples of where it is.
    pub(crate) fn settle(&mut self, gate: &Gate, spectra: &[Complex64], members: &mut [Member], search: f64) {
        for _ in 0..ROUNDS {
            let mut moved: f64 = 0.0;
            for index in 0..members.len() {
                let against = self.against_others(gate, spectra, members, index);
                let (shift, value) = search_peak(gate, &self.cross, against, search);
                moved = moved.max(shift.abs());
                members[index].shift += shift;
                members[index].polarity = value.signum();
            }
            if moved < 1e-4 {
                break;
            }
        }
    }

    /// What the chance of another cycle adds to the variance of each member, in samples^2: the mean square shift of the
    /// posterior that `search_peak` maximises, over what lies outside the main lobe and within `search` samples.
    pub(crate) fn slip_variance(
        &mut self,
        gate: &Gate,
        spectra: &[Complex64],
        members: &[Member],
        index: usize,
        search: f64,
    ) -> f64 {
        let against = self.against_others(gate, spectra, members, index);
        let sinusoids = sinusoids(gate, &self.cross);
        let step = gate.period / STEPS_PER_PERIOD;
        let steps = (search / step).ceil().max(1.0) as i32;
        let best = against.score(gate, &sinusoids, 0.0);
        let (mut weights, mut squares) = (0.0, 0.0);
        for k in -steps..=steps {
            let shift = f64::from(k) * step;
            let short = SLIP_TEMPER * (best - against.score(gate, &sinusoids, shift)).max(0.0);
            let weight = (1.0 + short / SLIP_TAIL).powf(-SLIP_TAIL);
            weights += weight;
            if shift.abs() > MAIN_LOBE * gate.period {
                squares += weight * shift * shift;
            }
        }
        squares / weights
    }

    /// How well the others explain what is under a member's gate, within `search` samples of where it is: half the energy
    /// that their common shape takes out of it, less the onsets' objection; and which share of the energy that is.
    pub(crate) fn explained(
        &mut self,
        gate: &Gate,
        spectra: &[Complex64],
        members: &[Member],
        index: usize,
        search: f64,
    ) -> (f64, f64) {
        let energy = energy(gate, &spectra[index * gate.omega.len()..][..gate.omega.len()]);
        let mut against = self.against_others(gate, spectra, members, index);
        against.energies.1 = energy;
        let sinusoids = sinusoids(gate, &self.cross);
        let (shift, _) = search_peak(gate, &self.cross, against, search);
        let value = 2.0 * gate.spacing() * sinusoids.value(shift);
        let taken = value * value / against.energies.0.max(f64::MIN_POSITIVE);
        (0.5 * taken - against.objection(gate, shift), taken / energy.max(f64::MIN_POSITIVE))
    }

    /// Leaves in `cross` the cross-spectrum of the sum of all members but one with that one, both as they are
    /// shifted now.
    fn against_others(
        &mut self,
        gate: &Gate,
        spectra: &[Complex64],
        members: &[Member],
        index: usize,
    ) -> Against {
        let count = gate.omega.len();
        self.template.clear();
        self.template.resize(count, Complex64::ZERO);
        let (mut weights, mut late, mut late_variance) = (0.0_f64, 0.0, 0.0);
        for (at, (other, spectrum)) in members.iter().zip(spectra.chunks_exact(count)).enumerate() {
            if at == index {
                continue;
            }
            let weight = other.polarity * other.energy.sqrt();
            weights += weight * weight;
            late += other.gate + other.shift - other.onset;
            late_variance += other.onset_variance;
            for ((sum, bin), turn) in self.template.iter_mut().zip(spectrum).zip(gate.turns(other.shift)) {
                *sum += bin * turn * weight;
            }
        }
        // Scaled so that the noise of the sum is that of one channel.
        let scale = 1.0 / weights.sqrt().max(f64::MIN_POSITIVE);
        self.template.iter_mut().for_each(|bin| *bin *= scale);
        let member = members[index];
        self.cross.clear();
        self.cross.extend(
            self.template
                .iter()
                .zip(&spectra[index * count..][..count])
                .zip(gate.turns(member.shift))
                .map(|((a, b), turn)| a.conj() * b * turn),
        );
        let others = (members.len() - 1).max(1) as f64;
        Against {
            energies: (energy(gate, &self.template), member.energy),
            expected: late / others + member.onset - member.gate - member.shift,
            variance: member.onset_variance + late_variance / (others * others),
        }
    }

    /// The delays of all pairs of members, each refined at most a quarter of a period around the common solution, with
    /// the variance that `information` (see below) gives the pair.
    pub(crate) fn pairs(
        &mut self,
        gate: &Gate,
        spectra: &[Complex64],
        members: &[Member],
        signal: &SignalToNoise,
        pairs: &mut Vec<PairDelay>,
    ) {
        let count = gate.omega.len();
        pairs.clear();
        for a in 0..members.len() {
            for b in a + 1..members.len() {
                let (first, second) = (&spectra[a * count..][..count], &spectra[b * count..][..count]);
                let start = members[b].shift - members[a].shift;
                self.cross.clear();
                self.cross.extend(
                    first.iter().zip(second).zip(gate.turns(start)).map(|((a, b), turn)| a.conj() * b * turn),
                );
                let (shift, _) = sinusoids(gate, &self.cross).refine(0.0, 0.25 * gate.period);
                let delay = members[b].gate - members[a].gate + start + shift;
                pairs.push(PairDelay { a, b, delay, variance: 1.0 / signal.pair_information(gate, a, b) });
            }
        }
    }
}

/// Signal to noise of every member at every frequency under the gate.
#[derive(Debug, Clone, Default)]
pub(crate) struct SignalToNoise {
    shape: Vec<f64>,
    members: Vec<f64>,
}

impl SignalToNoise {
    /// From whitened gate spectra: the common shape from all members together, the strength of each by itself.
    pub(crate) fn measure(&mut self, gate: &Gate, spectra: &[Complex64], members: usize) {
        let count = gate.omega.len();
        self.shape.clear();
        self.shape.resize(count, 0.0);
        self.members.clear();
        for spectrum in spectra.chunks_exact(count).take(members) {
            let mut excess = 0.0;
            for ((shape, bin), gain) in self.shape.iter_mut().zip(spectrum).zip(&gate.power_gain) {
                let ratio = bin.norm_sqr() / (gate.window_energy * gain);
                *shape += ratio;
                excess += ratio - 1.0;
            }
            self.members.push(excess.max(LEAST_SIGNAL * count as f64));
        }
        for shape in &mut self.shape {
            *shape = (*shape - members as f64).max(LEAST_SIGNAL * members as f64);
        }
        let sum: f64 = self.shape.iter().sum();
        for shape in &mut self.shape {
            *shape /= sum;
        }
    }

    /// Fisher information on the delay of a pair, in 1/samples^2: `2 D df sum omega^2 g1 g2 / (1 + g1 + g2)` with D
    /// the energy of the gate's window (C. H. Knapp, G. C. Carter, IEEE Trans. ASSP 24(4), 1976).
    fn pair_information(&self, gate: &Gate, a: usize, b: usize) -> f64 {
        let sum: f64 = self
            .shape
            .iter()
            .zip(&gate.omega)
            .map(|(shape, omega)| {
                let (a, b) = (self.members[a] * shape, self.members[b] * shape);
                omega * omega * a * b / (1.0 + a + b)
            })
            .sum();
        2.0 * gate.window_energy * gate.spacing() * sum
    }

    /// Fisher information on all arrivals, in 1/samples^2, zero along the ones: `2 D df sum omega^2 [diag(g) - g g' / (1 + sum g)]`,
    /// with the common term of the diagonal reduced alike (W. R. Hahn, S. A. Tretter, IEEE Trans. Inf. Theory 19(5), 1973).
    pub(crate) fn information(&self, gate: &Gate) -> DMatrix<f64> {
        let count = self.members.len();
        let mut information = DMatrix::zeros(count, count);
        let scale = 2.0 * gate.window_energy * gate.spacing();
        let total: f64 = self.members.iter().sum();
        for (shape, omega) in self.shape.iter().zip(&gate.omega) {
            let weight = scale * omega * omega * shape * shape / (1.0 + total * shape);
            for i in 0..count {
                for j in i + 1..count {
                    let term = weight * self.members[i] * self.members[j];
                    information[(i, j)] -= term;
                    information[(j, i)] -= term;
                    information[(i, i)] += term;
                    information[(j, j)] += term;
                }
            }
        }
        information
    }
}

/// Covariance of arrivals from their Fisher information, which says nothing of their common part: the pseudo-inverse, plus
/// as much common variance as makes the mean covariance of two different channels zero. None when it cannot be had.
pub(crate) fn covariance(information: &DMatrix<f64>) -> Option<DMatrix<f64>> {
    let count = information.nrows();
    if count < 2 {
        return None;
    }
    let n = count as f64;
    let lift = information.trace() / (n * n);
    let inverse = information.add_scalar(lift).cholesky()?.inverse();
    let pseudo = inverse.add_scalar(-1.0 / (lift * n * n));
    // The pseudo-inverse sums to zero over each row: what stands off the diagonal is minus its trace.
    let common = pseudo.trace() / (n * (n - 1.0));
    let covariance = pseudo.add_scalar(common);
    covariance.iter().all(|value| value.is_finite()).then_some(covariance)
}

fn energy(gate: &Gate, spectrum: &[Complex64]) -> f64 {
    2.0 * gate.spacing() * spectrum.iter().map(Complex64::norm_sqr).sum::<f64>()
}

fn sinusoids<'a>(gate: &Gate, cross: &'a [Complex64]) -> Sinusoids<'a> {
    let step = std::f64::consts::TAU * gate.spacing();
    Sinusoids { cross, first: gate.omega.first().copied().unwrap_or(0.0), step }
}

/// What two gated pulses are judged by, besides their cross-spectrum.
#[derive(Debug, Clone, Copy)]
struct Against {
    /// Energy of either, in units of the noise.
    energies: (f64, f64),
    /// The shift that the onsets expect, and its variance.
    expected: f64,
    variance: f64,
}

impl Against {
    /// Logarithm of the posterior density of `shift`, up to a constant: the likelihood of one common shape of unknown
    /// amplitude and polarity in both, times a Gaussian prior from the onsets.
    fn score(&self, gate: &Gate, sinusoids: &Sinusoids, shift: f64) -> f64 {
        let value = 2.0 * gate.spacing() * sinusoids.value(shift);
        // Twice the log-likelihood is the greater eigenvalue of [[e1, c], [c, e2]].
        let half = 0.5 * (self.energies.0 - self.energies.1);
        0.5 * half.hypot(value) - self.objection(gate, shift)
    }

    /// Half the square of the distance from where the onsets expect the shift, in their sigmas.
    fn objection(&self, gate: &Gate, shift: f64) -> f64 {
        let variance = self.variance + (ONSET_SLACK * gate.period).powi(2);
        0.5 * (shift - self.expected).powi(2) / variance
    }
}

/// The most probable shift within `search` of zero, refined, and the correlation there.
fn search_peak(gate: &Gate, cross: &[Complex64], against: Against, search: f64) -> (f64, f64) {
    let sinusoids = sinusoids(gate, cross);
    let step = gate.period / STEPS_PER_PERIOD;
    let steps = (search / step).ceil().max(1.0) as i32;
    let mut best = (f64::NEG_INFINITY, 0.0);
    for k in -steps..=steps {
        let shift = f64::from(k) * step;
        let score = against.score(gate, &sinusoids, shift);
        if score > best.0 {
            best = (score, shift);
        }
    }
    sinusoids.refine(best.1, 1.5 * step)
}
