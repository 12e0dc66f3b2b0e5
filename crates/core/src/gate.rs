//! A short tapered window around an arrival, and the spectrum of what it lets through.

use realfft::num_complex::Complex64;
use std::f64::consts::{PI, TAU};

use crate::bandpass::ZeroPhaseBandPass;

/// Where the gate begins to open and is fully open, before the onset, in periods. A band-passed pulse without delay
/// swings about half a period before its onset.
const OPENS: f64 = -0.75;
const OPEN: f64 = -0.25;
/// How long it takes to close, in periods.
const CLOSING: f64 = 1.0;
/// Frequencies where the band-pass lets less through than this tell nothing.
const LEAST_GAIN: f64 = 0.2;
/// How far, in gates, the correlation of two gates must be from its next copy: the spacing of the frequencies.
const COPY_DISTANCE: f64 = 2.0;

/// The gate and the few frequencies at which gated pulses are compared. Times are in samples.
#[derive(Debug, Clone)]
pub(crate) struct Gate {
    /// Period at the centre of the band, in samples.
    pub(crate) period: f64,
    /// Where the gate opens, is open, begins to close, is closed; relative to the onset, in samples.
    edges: [f64; 4],
    /// Angular frequencies in radians per sample, evenly spaced.
    pub(crate) omega: Vec<f64>,
    /// Power gain of the band-pass at each frequency.
    pub(crate) power_gain: Vec<f64>,
    /// Sum of the squared window.
    pub(crate) window_energy: f64,
    /// `exp(-i omega m)` for each sample m of the gate, frequencies side by side.
    phases: Vec<Complex64>,
}

impl Gate {
    /// For a band and a gate of `periods` periods of its centre (of half the inverse bandwidth, where that is longer).
    pub(crate) fn plan(
        band_hz: (f64, f64),
        filter: &ZeroPhaseBandPass,
        periods: f64,
        sample_rate_hz: f64,
    ) -> Self {
        let centre_hz = 0.5 * (band_hz.0 + band_hz.1);
        let period = sample_rate_hz * (1.0 / centre_hz).max(0.5 / (band_hz.1 - band_hz.0));
        let closed = OPENS + periods;
        let edges = [OPENS, OPEN, (closed - CLOSING).max(OPEN), closed].map(|edge| edge * period);

        let spacing_hz = sample_rate_hz / (COPY_DISTANCE * periods * period);
        let (low_hz, high_hz) = filter.support_hz();
        let bins: Vec<f64> = ((low_hz / spacing_hz).ceil() as usize
            ..=(high_hz / spacing_hz).floor() as usize)
            .map(|bin| bin as f64 * spacing_hz)
            .filter(|&hz| filter.gain(hz) >= LEAST_GAIN)
            .collect();
        let omega: Vec<f64> = bins.iter().map(|hz| TAU * hz / sample_rate_hz).collect();
        let power_gain = bins.iter().map(|&hz| filter.gain(hz).powi(2)).collect();
        let length = (edges[3] - edges[0]).floor() as usize + 2;
        let phases = (0..length)
            .flat_map(|m| omega.iter().map(move |w| Complex64::from_polar(1.0, -w * m as f64)))
            .collect();
        let mut gate = Self { period, edges, omega, power_gain, window_energy: 0.0, phases };
        // The mean over all positions between the samples, by the midpoints of hundredths.
        gate.window_energy =
            (0..length * 100).map(|k| gate.window(edges[0] + (k as f64 + 0.5) / 100.0).powi(2) / 100.0).sum();
        gate
    }

    /// Spacing of the frequencies in cycles per sample.
    pub(crate) fn spacing(&self) -> f64 {
        match *self.omega.as_slice() {
            [first, second, ..] => (second - first) / TAU,
            _ => 1.0 / (COPY_DISTANCE * (self.edges[3] - self.edges[0])),
        }
    }

    /// Length in samples.
    pub(crate) fn length(&self) -> f64 {
        self.edges[3] - self.edges[0]
    }

    /// Whether the gate of an onset lies wholly inside a record of `count` samples.
    pub(crate) fn fits(&self, onset: f64, count: usize) -> bool {
        onset + self.edges[0] >= 0.0 && onset + self.edges[3] <= count as f64 - 1.0
    }

    /// The gate `u` samples after the onset, between zero and one.
    fn window(&self, u: f64) -> f64 {
        let [opens, open, closes, closed] = self.edges;
        let along = if u < open { (u - opens) / (open - opens) } else { (closed - u) / (closed - closes) };
        let along = along.clamp(0.0, 1.0);
        0.5 - 0.5 * (PI * along).cos()
    }

    /// Writes the spectrum of `samples` under the gate at `onset` (in samples), phases counted from the onset, divided
    /// by `scale`. Samples outside the record count as zero.
    pub(crate) fn spectrum(&self, samples: &[f64], onset: f64, scale: f64, spectrum: &mut [Complex64]) {
        spectrum.fill(Complex64::ZERO);
        let first = (onset + self.edges[0]).ceil();
        let count = self.omega.len();
        for (m, phases) in self.phases.chunks_exact(count.max(1)).enumerate() {
            let position = first + m as f64;
            if position < 0.0 || position >= samples.len() as f64 {
                continue;
            }
            let value = samples[position as usize] * self.window(position - onset);
            for (bin, phase) in spectrum.iter_mut().zip(phases) {
                *bin += phase * value;
            }
        }
        let scale = 1.0 / scale;
        for (bin, turn) in spectrum.iter_mut().zip(self.turns(onset - first)) {
            *bin *= turn * scale;
        }
    }

    /// `exp(i omega tau)` for every frequency.
    pub(crate) fn turns(&self, tau: f64) -> impl Iterator<Item = Complex64> {
        let start = self.omega.first().copied().unwrap_or(0.0);
        let step = Complex64::from_polar(1.0, TAU * self.spacing() * tau);
        let mut turn = Complex64::from_polar(1.0, start * tau);
        (0..self.omega.len()).map(move |_| {
            let now = turn;
            turn *= step;
            now
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn gate() -> Gate {
        let filter = ZeroPhaseBandPass::design(300e6, 1500e6, 5e9).unwrap();
        Gate::plan((300e6, 1500e6), &filter, 3.0, 5e9)
    }

    #[test]
    fn spectrum_is_the_plain_sum() {
        let gate = gate();
        let samples: Vec<f64> = (0..100).map(|n| (f64::from(n) * 0.7).sin()).collect();
        let mut spectrum = vec![Complex64::new(3.0, 1.0); gate.omega.len()];
        for onset in [50.0, 40.37, 2.2, 98.9] {
            gate.spectrum(&samples, onset, 2.0, &mut spectrum);
            for (k, &omega) in gate.omega.iter().enumerate() {
                let plain: Complex64 = samples
                    .iter()
                    .enumerate()
                    .map(|(n, x)| {
                        let u = n as f64 - onset;
                        let inside = u > gate.edges[0] && u < gate.edges[3];
                        let weight = if inside { gate.window(u) } else { 0.0 };
                        Complex64::from_polar(0.5 * x * weight, -omega * u)
                    })
                    .sum();
                assert!((plain - spectrum[k]).norm() < 1e-10);
            }
        }
    }

    #[test]
    fn is_about_three_periods_long_and_shuts_out_what_is_three_nanoseconds_late() {
        let gate = gate();
        assert!((gate.length() / 5.0 - 3.333).abs() < 0.01, "{}", gate.length());
        assert!(gate.edges[3] / 5.0 < 3.0);
    }
}
