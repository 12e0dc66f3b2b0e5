//! One channel made ready: offset off, both band-passes, noise, and whether there is a pulse.

use realfft::num_complex::Complex64;

use super::{TimingError, TimingOptions};
use crate::bandpass::{ButterworthBandPass, ZeroPhaseBandPass};
use crate::carriers::{Carrier, CarrierCutter};
use crate::detection::Detector;
use crate::gate::Gate;
use crate::offset::offset;
use crate::spectrum::{Transform, fast_length};

/// Filters, transform and detector for channels of one length at one rate.
#[derive(Debug)]
pub(crate) struct Conditioning {
    pub(crate) band_hz: (f64, f64),
    pub(crate) sample_rate_hz: f64,
    pub(crate) causal: ButterworthBandPass,
    pub(crate) gate: Gate,
    pub(crate) detector: Detector,
    pub(crate) transform: Transform,
    /// Gain of the causal filter for white noise: power out over power in.
    pub(crate) noise_gain: f64,
    gains: Vec<f64>,
    sample_count: usize,
    raw: Vec<f64>,
    spectrum: Vec<Complex64>,
    cutter: Option<CarrierCutter>,
}

/// What conditioning leaves of one channel.
#[derive(Debug, Clone, Default)]
pub(crate) struct Conditioned {
    /// Samples after the causal band-pass.
    pub(crate) causal: Vec<f64>,
    /// Samples after the band-pass without delay; empty unless asked for.
    pub(crate) undelayed: Vec<f64>,
    /// Power of the noise after the causal band-pass.
    pub(crate) noise_power: f64,
    /// First sample of the first window too strong for noise.
    pub(crate) start: Option<usize>,
    /// The lines that were cut out.
    pub(crate) carriers: Vec<Carrier>,
    /// The constant part that was taken off.
    pub(crate) offset: f64,
}

/// The least record, in gates: some noise, the pulse, and what follows it.
const LEAST_GATES: f64 = 4.0;

/// How much of either end of the record is not believed where carriers were cut, in gates.
const EDGE_GATES: f64 = 3.0;

impl Conditioning {
    /// `wrap` samples are added to the transform, so that what a filter or a correlation shifts does not wrap.
    pub(crate) fn plan(
        options: &TimingOptions,
        sample_rate_hz: f64,
        sample_count: usize,
        wrap: usize,
    ) -> Result<Self, TimingError> {
        if !(sample_rate_hz.is_finite() && sample_rate_hz > 0.0) {
            return Err(TimingError::SampleRate { found_hz: sample_rate_hz });
        }
        let band_hz = options.band_or_default_hz(sample_rate_hz);
        let causal = ButterworthBandPass::design(options.filter_order, band_hz.0, band_hz.1, sample_rate_hz)?;
        let undelayed = ZeroPhaseBandPass::design(band_hz.0, band_hz.1, sample_rate_hz)?;
        let gate = Gate::plan(band_hz, &undelayed, options.gate_periods, sample_rate_hz);
        // A band so narrow or low that its gate is longer than any record: tell it before anything is allocated.
        let least = (LEAST_GATES * gate.length()).ceil();
        if (sample_count as f64) < least || gate.omega.len() < 2 {
            return Err(TimingError::TooShort { found: sample_count, least: least as usize });
        }
        let ring =
            (8.0 * sample_rate_hz / (band_hz.1 - band_hz.0)).ceil() as usize + 8 * gate.length() as usize;
        let answer = causal.impulse_response(ring.min(8 * sample_count));
        let noise_gain = answer.iter().map(|h| h * h).sum();
        let window = ((2.0 * gate.period).round() as usize).max(2);
        let detector = Detector::plan(&answer, window, sample_count, options.false_alarm);
        let transform = Transform::plan(fast_length(sample_count + wrap.max(2 * gate.length() as usize)));
        let gains = undelayed.gains(transform.length(), sample_rate_hz, 1.0 / transform.length() as f64);
        let cutter = options.excise.then(|| CarrierCutter::plan(band_hz, sample_rate_hz, sample_count));
        Ok(Self {
            band_hz,
            sample_rate_hz,
            causal,
            gate,
            detector,
            noise_gain,
            gains,
            sample_count,
            raw: Vec::with_capacity(sample_count),
            spectrum: vec![Complex64::ZERO; transform.bins()],
            transform,
            cutter,
        })
    }

    /// Fills `channel` from the samples of one channel; `undelayed` says whether the second band-pass is wanted.
    /// The spectrum after it is left in `spectrum`, where one is given.
    pub(crate) fn process(
        &mut self,
        samples: &[f32],
        undelayed: bool,
        spectrum: Option<&mut [Complex64]>,
        channel: &mut Conditioned,
    ) {
        channel.offset = offset(samples);
        self.raw.clear();
        self.raw.extend(samples.iter().map(|&x| f64::from(x) - channel.offset));
        channel.carriers.clear();
        let mut ready = false;
        if let Some(cutter) = &mut self.cutter {
            self.transform.forward(&self.raw, &mut self.spectrum);
            ready =
                !cutter.cut(&mut self.raw, &mut self.spectrum, &mut self.transform, &mut channel.carriers);
        }
        self.causal.filter_forward(&self.raw, &mut channel.causal);
        // What is left of a modulated carrier stands at the ends of the record.
        let margin = if channel.carriers.is_empty() { 0 } else { (EDGE_GATES * self.gate.length()) as usize };
        let detection = self.detector.detect(&channel.causal, margin);
        channel.noise_power = detection.noise_power;
        channel.start = detection.start;
        for carrier in &mut channel.carriers {
            let gain = self.causal.response(carrier.frequency_hz).norm_sqr();
            carrier.level_db += 10.0 * (gain / channel.noise_power).log10();
        }
        channel.undelayed.clear();
        if undelayed {
            if !ready {
                self.transform.forward(&self.raw, &mut self.spectrum);
            }
            for (bin, gain) in self.spectrum.iter_mut().zip(&self.gains) {
                *bin *= *gain;
            }
            if let Some(spectrum) = spectrum {
                spectrum.copy_from_slice(&self.spectrum);
            }
            channel
                .undelayed
                .extend_from_slice(&self.transform.inverse(&mut self.spectrum)[..self.sample_count]);
        }
    }
}
