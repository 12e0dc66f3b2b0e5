//! The onset of one conditioned channel and how sure it is.

use std::ops::Range;

use super::conditioning::{Conditioned, Conditioning};
use super::{Method, TimingOptions};
use crate::onset::{Onset, akaike_onset, energy_onset, threshold_onset};

/// How far before the pulse the search for an onset begins, in gates.
const BEFORE: f64 = 2.0;
/// How far after an onset its window ends when it is set anew, in gates.
const AFTER: f64 = 0.6;
/// Times the window is set anew.
const RECENTRINGS: usize = 3;

/// An onset in samples after the first of the record, and its variance in samples^2.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Picked {
    pub(crate) position: f64,
    pub(crate) variance: f64,
}

/// The picker of a method, with the delay of the causal band-pass known.
#[derive(Debug, Clone)]
pub(crate) struct Picker {
    method: Method,
    alpha: f64,
    share: f64,
    /// Greatest magnitude that noise alone reaches, in units of its rms, at the false alarm probability.
    noise_peak: f64,
    /// How much later than a single impulse its onset is picked, in samples.
    delay: f64,
}

impl Picker {
    pub(crate) fn plan(options: &TimingOptions, conditioning: &Conditioning, sample_count: usize) -> Self {
        let mut picker = Self {
            method: options.method,
            alpha: options.energy_alpha,
            share: options.threshold_share,
            noise_peak: gaussian_extreme(sample_count, options.false_alarm),
            delay: 0.0,
        };
        // The same road a capture goes, with a lone impulse on it.
        let length = (8.0 * conditioning.gate.length()).ceil() as usize;
        let at = length / 2;
        let mut impulse = vec![0.0; length];
        impulse[at] = 1.0;
        conditioning.causal.filter_in_place(&mut impulse);
        let channel =
            Conditioned { causal: impulse, noise_power: 1e-12, start: Some(at), ..Conditioned::default() };
        picker.delay = picker.pick(&channel, conditioning).map_or(0.0, |picked| picked.position - at as f64);
        picker
    }

    /// The onset of a channel that holds a pulse; none where the pulse began before the record or the criterion finds
    /// no onset.
    pub(crate) fn pick(&self, channel: &Conditioned, conditioning: &Conditioning) -> Option<Picked> {
        let samples = channel.causal.as_slice();
        let noise = channel.noise_power.sqrt();
        let mut window = search_window(channel, conditioning)?;
        let mut found = self.pick_in(samples, window.clone(), noise)?;
        // The level depends on how much of the pulse the window holds: set anew around what was found, the window
        // holds the same part of the pulse on every channel.
        for _ in 0..RECENTRINGS {
            window = window_around(found.sample, conditioning.gate.length(), samples.len());
            let Some(again) = self.pick_in(samples, window.clone(), noise) else { break };
            let same = again.sample == found.sample;
            found = again;
            if same {
                break;
            }
        }
        let peak = greatest(&samples[window]);
        let variance = self.variance(noise, peak, conditioning.gate.period);
        Some(Picked { position: found.position_samples - self.delay, variance })
    }

    fn pick_in(&self, samples: &[f64], window: Range<usize>, noise: f64) -> Option<Onset> {
        match self.method {
            Method::Akaike => akaike_onset(samples, window),
            Method::Threshold => {
                let peak = greatest(samples.get(window.clone())?);
                threshold_onset(samples, window, (self.share * peak).max(self.noise_peak * noise).min(peak))
            }
            Method::Gated | Method::Correlation | Method::Energy => energy_onset(samples, window, self.alpha),
        }
    }

    /// Variance of the onset in samples^2: see [`Scatter`].
    fn variance(&self, noise: f64, peak: f64, period: f64) -> f64 {
        let scatter = match self.method {
            Method::Akaike => AKAIKE,
            Method::Threshold => THRESHOLD,
            Method::Gated | Method::Correlation | Method::Energy => ENERGY,
        };
        let ratio = peak / noise.max(f64::MIN_POSITIVE);
        let noisy = scatter.noise / ratio * (1.0 + (scatter.knee / ratio).powi(scatter.steepness));
        period * period * (scatter.floor * scatter.floor + noisy * noisy)
    }
}

/// Scatter of an onset in periods of the band's centre, for a peak of r times the noise rms:
/// `sqrt(floor^2 + (noise / r (1 + (knee / r)^steepness))^2)`.
///
/// Measured on pulses of random shape (tests `sigmas_of_..._onsets_are_true`), whose onsets now and then are picked one
/// swing apart on two channels even where there is hardly any noise: that is the floor.
#[derive(Debug, Clone, Copy)]
struct Scatter {
    floor: f64,
    noise: f64,
    knee: f64,
    steepness: i32,
}

const ENERGY: Scatter = Scatter { floor: 0.075, noise: 1.4, knee: 3.0, steepness: 2 };
const AKAIKE: Scatter = Scatter { floor: 0.045, noise: 2.1, knee: 4.0, steepness: 4 };
const THRESHOLD: Scatter = Scatter { floor: 0.077, noise: 1.1, knee: 5.0, steepness: 2 };

/// Where the onset is searched: from well before the detected window to the peak of the pulse in it.
fn search_window(channel: &Conditioned, conditioning: &Conditioning) -> Option<Range<usize>> {
    let start = channel.start?;
    let gate = conditioning.gate.length();
    let end = start + conditioning.detector.window() + (0.5 * gate) as usize;
    let head = channel.causal.get(start..end.min(channel.causal.len()))?;
    let peak = head.iter().enumerate().max_by(|a, b| a.1.abs().total_cmp(&b.1.abs()))?.0;
    Some(start.saturating_sub((BEFORE * gate) as usize)..start + peak + 1)
}

/// The window around an onset found before.
fn window_around(sample: usize, gate: f64, count: usize) -> Range<usize> {
    sample.saturating_sub((BEFORE * gate) as usize)..(sample + 1 + (AFTER * gate) as usize).min(count)
}

fn greatest(samples: &[f64]) -> f64 {
    samples.iter().fold(0.0, |peak: f64, x| peak.max(x.abs()))
}

/// The magnitude that the greatest of `count` Gaussian samples of unit variance exceeds with `probability`, the samples
/// counted as independent.
fn gaussian_extreme(count: usize, probability: f64) -> f64 {
    // P(|x| > t) = erfc(t / sqrt 2) for one sample.
    let one = probability / count.max(1) as f64;
    std::f64::consts::SQRT_2 * statrs::function::erf::erfc_inv(one)
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn extremes_of_gaussian_samples() {
        // NIST/SEMATECH e-Handbook 1.3.6.7.1: 1.960 leaves 0.025 on either side.
        assert_relative_eq!(gaussian_extreme(1, 0.05), 1.96, epsilon = 1e-3);
        assert!(gaussian_extreme(1500, 1e-3) > 4.9 && gaussian_extreme(1500, 1e-3) < 5.1);
    }
}
