//! Carriers: narrow lines in the spectrum that are no part of a pulse, found and cut out.
//!
//! A pulse of a few nanoseconds and its echoes have a smooth or rippled spectrum; a broadcast or telephone carrier
//! stands over its neighbours as a line. The line is taken out where it lies in time, by least squares, and not by a
//! notch in the spectrum: the ends of a short record smear a line over its neighbours, which a notch leaves behind.

use realfft::num_complex::Complex64;
use std::f64::consts::TAU;

use crate::spectrum::Transform;

/// A narrow line that was found in a channel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Carrier {
    /// Its frequency in hertz.
    pub frequency_hz: f64,
    /// Its rms over the rms of the channel's noise, both after the causal timing band-pass, in dB.
    pub level_db: f64,
}

/// A bin is part of a line when its power exceeds the median of its neighbours by this ratio (13 dB): noise alone does
/// so once in a million bins.
const LEAST_RATIO: f64 = 20.0;
/// Width, in resolution cells, of the blocks whose median tells what surrounds a line; a share of the band where that
/// is wider.
const LEAST_BLOCK: f64 = 24.0;
const BLOCK_SHARE: f64 = 0.05;
/// A line is followed by sine and cosine with amplitudes that are polynomials of this many terms: a slow modulation, or
/// a frequency between two bins, is followed too.
const TERMS: usize = 3;
/// Passes over the spectrum: a strong line hides weaker ones nearby until it is gone.
const PASSES: usize = 6;
/// Lines cut in one pass at most.
const LINES_PER_PASS: usize = 4;
/// Two lines of one pass are at least this many resolution cells apart.
const APART: f64 = 8.0;
/// Lines are looked for from this share of the lower edge of the band to this multiple of the upper one: further out
/// the band-pass holds them off.
const REACH: (f64, f64) = (0.25, 1.4);

/// Finds and cuts carriers in channels of one length.
#[derive(Debug, Clone)]
pub(crate) struct CarrierCutter {
    sample_rate_hz: f64,
    band_hz: (f64, f64),
    powers: Vec<f64>,
    sorted: Vec<f64>,
    medians: Vec<f64>,
    found: Vec<usize>,
    /// Legendre polynomials over the record, of unit energy; `TERMS` side by side for each sample.
    polynomials: Vec<[f64; TERMS]>,
}

impl CarrierCutter {
    pub(crate) fn plan(band_hz: (f64, f64), sample_rate_hz: f64, sample_count: usize) -> Self {
        let mut polynomials: Vec<[f64; TERMS]> = (0..sample_count)
            .map(|n| {
                let x = (2 * n + 1) as f64 / sample_count as f64 - 1.0;
                [1.0, x, 1.5 * x * x - 0.5]
            })
            .collect();
        for term in 0..TERMS {
            let norm =
                polynomials.iter().map(|p| p[term] * p[term]).sum::<f64>().sqrt().max(f64::MIN_POSITIVE);
            polynomials.iter_mut().for_each(|p| p[term] /= norm);
        }
        Self {
            sample_rate_hz,
            band_hz,
            powers: Vec::new(),
            sorted: Vec::new(),
            medians: Vec::new(),
            found: Vec::new(),
            polynomials,
        }
    }

    /// Cuts all lines out of `samples`, whose spectrum is `spectrum`, and adds them to `carriers`, with
    /// the level in dB of their mean power (the caller sets it against the noise). Gives whether there
    /// was one; `spectrum` is that of the samples left.
    pub(crate) fn cut(
        &mut self,
        samples: &mut [f64],
        spectrum: &mut [Complex64],
        transform: &mut Transform,
        carriers: &mut Vec<Carrier>,
    ) -> bool {
        let mut any = false;
        for _ in 0..PASSES {
            self.find(spectrum, transform.length());
            if self.found.is_empty() {
                break;
            }
            any = true;
            for index in 0..self.found.len() {
                let bin = self.found[index];
                let omega = self.frequency(spectrum, transform.length(), bin);
                let power = self.subtract(samples, omega);
                let frequency_hz = omega / TAU * self.sample_rate_hz;
                self.note(carriers, frequency_hz, power);
            }
            transform.forward(samples, spectrum);
        }
        any
    }

    /// The bins of the strongest lines of the spectrum, well apart.
    fn find(&mut self, spectrum: &[Complex64], length: usize) {
        let cell = length as f64 / self.polynomials.len() as f64;
        let bin = |hz: f64| hz / self.sample_rate_hz * length as f64;
        let first = (bin(REACH.0 * self.band_hz.0).ceil() as usize).max((2.0 * cell).ceil() as usize);
        let last = (bin(REACH.1 * self.band_hz.1).floor() as usize).min(spectrum.len().saturating_sub(3));
        self.found.clear();
        if last <= first {
            return;
        }
        self.powers.clear();
        self.powers.extend(spectrum[first..=last].iter().map(Complex64::norm_sqr));
        let block = (LEAST_BLOCK * cell).max(BLOCK_SHARE * bin(self.band_hz.1 - self.band_hz.0)) as usize;
        self.medians.clear();
        for powers in self.powers.chunks(block) {
            self.sorted.clear();
            self.sorted.extend_from_slice(powers);
            let middle = powers.len() / 2;
            self.medians.push(*self.sorted.select_nth_unstable_by(middle, f64::total_cmp).1);
        }
        for (index, &power) in self.powers.iter().enumerate() {
            // The block on the nearer side counts as well: a pulse's spectrum may slope.
            let own = index / block;
            let near = if index % block < block / 2 { own.saturating_sub(1) } else { own + 1 };
            let around = self.medians[own].max(self.medians.get(near).copied().unwrap_or(0.0));
            if power > LEAST_RATIO * around && around > 0.0 {
                self.found.push(first + index);
            }
        }
        let powers = &self.powers;
        self.found.sort_unstable_by(|a, b| powers[b - first].total_cmp(&powers[a - first]));
        let apart = (APART * cell) as usize;
        let mut kept = 0;
        for index in 0..self.found.len() {
            let line = self.found[index];
            if kept < LINES_PER_PASS && self.found[..kept].iter().all(|other| other.abs_diff(line) >= apart) {
                self.found[kept] = line;
                kept += 1;
            }
        }
        self.found.truncate(kept);
    }

    /// The frequency of the line about `bin`, between the bins, in radians per sample (E. Jacobsen, P. Kootsookos, IEEE
    /// Signal Processing Magazine 24(3), 2007).
    fn frequency(&self, spectrum: &[Complex64], length: usize, bin: usize) -> f64 {
        let cell = length as f64 / self.polynomials.len() as f64;
        let side = (cell.round() as usize).max(1);
        let here = spectrum[bin];
        let (below, above) = match (bin.checked_sub(side), spectrum.get(bin + side)) {
            (Some(below), Some(&above)) => (spectrum[below], above),
            _ => return TAU * bin as f64 / length as f64,
        };
        // Phases of a zero-padded record turn with its middle; taken back, the three bins are those of the formula.
        let turn = Complex64::from_polar(1.0, std::f64::consts::PI * (side as f64 / cell - 1.0));
        let (below, above) = (below * turn.conj(), above * turn);
        let offset = ((below - above) / (2.0 * here - below - above)).re;
        let offset = if offset.is_finite() { offset.clamp(-0.6, 0.6) } else { 0.0 };
        TAU * (bin as f64 + offset * side as f64) / length as f64
    }

    /// Takes the line at `omega` out of the samples; gives the mean power that went.
    fn subtract(&self, samples: &mut [f64], omega: f64) -> f64 {
        let step = Complex64::from_polar(1.0, omega);
        let mut turn = Complex64::ONE;
        let mut parts = [Complex64::ZERO; TERMS];
        for (x, polynomial) in samples.iter().zip(&self.polynomials) {
            for (part, p) in parts.iter_mut().zip(polynomial) {
                *part += turn.conj() * (x * p);
            }
            turn *= step;
        }
        // A real line puts half of itself at minus its frequency.
        let parts = parts.map(|part| part * 2.0);
        let mut turn = Complex64::ONE;
        for (x, polynomial) in samples.iter_mut().zip(&self.polynomials) {
            let amplitude: Complex64 = parts.iter().zip(polynomial).map(|(part, p)| part * *p).sum();
            *x -= amplitude.re * turn.re - amplitude.im * turn.im;
            turn *= step;
        }
        0.5 * parts.iter().map(Complex64::norm_sqr).sum::<f64>() / samples.len() as f64
    }

    /// Adds a line of mean power `power` to `carriers`; what is left of one already there belongs to it.
    fn note(&self, carriers: &mut Vec<Carrier>, frequency_hz: f64, power: f64) {
        let level_db = 10.0 * power.log10();
        let same = 1.5 * APART * self.sample_rate_hz / self.polynomials.len() as f64;
        match carriers.iter_mut().find(|carrier| (carrier.frequency_hz - frequency_hz).abs() < same) {
            Some(known) if known.level_db < level_db => *known = Carrier { frequency_hz, level_db },
            Some(_) => {}
            None => carriers.push(Carrier { frequency_hz, level_db }),
        }
    }
}
