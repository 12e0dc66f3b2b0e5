//! Generalised cross-correlation of the whole records, all pairs.

use nalgebra::DMatrix;
use realfft::num_complex::Complex64;
use std::f64::consts::TAU;

use super::conditioning::{Conditioned, Conditioning};
use super::gated::Aligned;
use super::onsets::Picked;
use crate::alignment::covariance;
use crate::bounds::flat_band_delay_variance_s2;
use crate::correlation::peak::Sinusoids;
use crate::correlation::{Weighting, apply_weighting};
use crate::fusion::{PairDelay, closure_error, fuse_delays};

/// Measured variance of the delays over the bound for a flat band.
const INEFFICIENCY: f64 = 2.0;

/// Median of the magnitude of a Gaussian over its sigma.
const GAUSSIAN_MEDIAN: f64 = 0.674_49;
/// Share of the log-likelihood ratio of two lags that counts: measured.
const ANOMALY_TEMPER: f64 = 0.3;
/// Peaks between the samples may be higher than any sample shows: those that come near the highest are all refined.
const NEAR_HIGHEST: f64 = 0.6;

/// Buffers of the correlation method.
#[derive(Debug, Clone)]
pub(crate) struct Correlated {
    weighting: Weighting,
    spectra: Vec<Vec<Complex64>>,
    cross: Vec<Complex64>,
    weighted: Vec<Complex64>,
    sums: Vec<[f64; 4]>,
    levels: Vec<f64>,
    pairs: Vec<PairDelay>,
}

impl Correlated {
    pub(crate) fn plan(weighting: Weighting, conditioning: &Conditioning, channel_count: usize) -> Self {
        let spectrum = vec![Complex64::ZERO; conditioning.transform.bins()];
        Self {
            weighting,
            spectra: vec![spectrum.clone(); channel_count],
            cross: spectrum.clone(),
            weighted: spectrum,
            sums: Vec::new(),
            levels: Vec::new(),
            pairs: Vec::new(),
        }
    }

    /// Where the spectrum of a channel is to be left.
    pub(crate) fn spectrum_mut(&mut self, channel: usize) -> &mut [Complex64] {
        &mut self.spectra[channel]
    }

    /// Times of the channels that hold a pulse; none when fewer than two do.
    pub(crate) fn align(
        &mut self,
        conditioning: &mut Conditioning,
        channels: &[Conditioned],
        onsets: &[Option<Picked>],
        max_delay: Option<&DMatrix<f64>>,
    ) -> Option<Aligned> {
        let taking_part: Vec<usize> = (0..channels.len()).filter(|&index| onsets[index].is_some()).collect();
        if taking_part.len() < 2 {
            return None;
        }
        let samples = channels[taking_part[0]].causal.len();
        self.pairs.clear();
        let mut information = DMatrix::zeros(taking_part.len(), taking_part.len());
        for (row, &a) in taking_part.iter().enumerate() {
            for (column, &b) in taking_part.iter().enumerate().skip(row + 1) {
                let limit = max_delay.map_or(f64::INFINITY, |limit| limit[(a, b)]).min(samples as f64 - 1.0);
                let (delay, anomaly) = self.delay(conditioning, a, b, limit);
                let variance = pair_variance(conditioning, &channels[a], &channels[b]) + anomaly;
                self.pairs.push(PairDelay { a: row, b: column, delay, variance });
                for (i, j, sign) in
                    [(row, row, 1.0), (column, column, 1.0), (row, column, -1.0), (column, row, -1.0)]
                {
                    // Pairs share their channels' noise: n (n - 1) / 2 of them know no more than n - 1.
                    information[(i, j)] += sign * 2.0 / (variance * taking_part.len() as f64);
                }
            }
        }
        let mut times = fuse_delays(&self.pairs, taking_part.len())?;
        let covariance = covariance(&information)?;
        let (late, weights) =
            taking_part.iter().zip(&times).fold((0.0, 0.0), |(late, weights), (&index, time)| {
                onsets[index].map_or((late, weights), |onset| {
                    (late + (onset.position - time) / onset.variance, weights + 1.0 / onset.variance)
                })
            });
        times.iter_mut().for_each(|time| *time += late / weights);
        Some(Aligned { channels: taking_part, times, covariance, closure: closure_error(&self.pairs) })
    }

    /// The delay of one pair, in samples, within `limit` of zero; and what the chance that the peak is noise, or another
    /// cycle, adds to its variance.
    fn delay(&mut self, conditioning: &mut Conditioning, a: usize, b: usize, limit: f64) -> (f64, f64) {
        let length = conditioning.transform.length();
        for ((cross, a), b) in self.cross.iter_mut().zip(&self.spectra[a]).zip(&self.spectra[b]) {
            *cross = a.conj() * b;
        }
        apply_weighting(self.weighting, &self.spectra[a], &self.spectra[b], &mut self.cross, &mut self.sums);
        self.weighted.copy_from_slice(&self.cross);
        let circular = conditioning.transform.inverse(&mut self.weighted);
        let limit = limit.max(0.0).ceil() as isize;
        let best = (-limit..=limit)
            .max_by(|&i, &j| {
                let at = |lag: isize| circular[lag.rem_euclid(length as isize) as usize].abs();
                at(i).total_cmp(&at(j))
            })
            .unwrap_or(0);
        let at = |lag: isize| circular[lag.rem_euclid(length as isize) as usize];
        // The noise of the correlation is seen where there is no peak: half of all lags are quiet.
        self.levels.clear();
        self.levels.extend((0..length).map(|lag| circular[lag].abs()));
        let middle = length / 2;
        let noise = *self.levels.select_nth_unstable_by(middle, f64::total_cmp).1 / GAUSSIAN_MEDIAN;
        let peak = at(best);
        let (mut weights, mut squares) = (0.0, 0.0);
        for lag in -limit..=limit {
            // A lag whose value falls short of the peak by d is the true one with a probability that falls like a
            // Gaussian of the difference of the two.
            let short = (peak.abs() - at(lag).abs()) / noise.max(f64::MIN_POSITIVE);
            let weight = (-0.5 * ANOMALY_TEMPER * short * (peak.abs() + at(lag).abs())
                / noise.max(f64::MIN_POSITIVE))
            .exp();
            weights += weight;
            squares += if (lag - best).abs() > 1 { weight * ((lag - best) as f64).powi(2) } else { 0.0 };
        }
        let sinusoids = Sinusoids { cross: &self.cross, first: 0.0, step: TAU / length as f64 };
        let mut refined = sinusoids.refine(best as f64, 1.0);
        for lag in -limit..=limit {
            let (here, least) = (at(lag).abs(), NEAR_HIGHEST * peak.abs());
            if lag != best && here >= least && here >= at(lag - 1).abs() && here >= at(lag + 1).abs() {
                let other = sinusoids.refine(lag as f64, 1.0);
                if other.1.abs() > refined.1.abs() {
                    refined = other;
                }
            }
        }
        (refined.0, squares / weights)
    }
}

/// Variance of a pair's delay in samples^2: the bound for a flat band with the energy of both pulses spread over the
/// record, times the measured inefficiency.
fn pair_variance(conditioning: &Conditioning, a: &Conditioned, b: &Conditioned) -> f64 {
    let count = a.causal.len() as f64;
    let ratio = |channel: &Conditioned| {
        let power = channel.causal.iter().map(|x| x * x).sum::<f64>() / count;
        // Never below what detection needs.
        (power / channel.noise_power - 1.0).max(4.0 * conditioning.detector.window() as f64 / count)
    };
    let (a, b) = (ratio(a), ratio(b));
    // The equal ratio that carries as much as the two unlike ones.
    let both = a * b / (1.0 + a + b);
    let equal = both + (both * both + both).sqrt();
    let (low, high) = conditioning.band_hz;
    let rate = conditioning.sample_rate_hz;
    INEFFICIENCY * flat_band_delay_variance_s2(equal, count / rate, low, high) * rate * rate
}
