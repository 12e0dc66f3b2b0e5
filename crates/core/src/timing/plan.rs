//! The planned timing of captures of one shape.

use nalgebra::DMatrix;

use super::conditioning::{Conditioned, Conditioning};
use super::correlated::Correlated;
use super::gated::{Aligned, Gated};
use super::onsets::{Picked, Picker};
use super::{Method, TimingError, TimingOptions};
use crate::capture::Capture;
use crate::channel_times::{ChannelFlags, ChannelTime, ChannelTimes};
use crate::clipping::{is_clipped, is_dead};

/// A pulse whose peak is less than this over the noise is flagged as weak, in dB: near the threshold of detection the
/// noise decides which cycle is the first.
const WEAK_DB: f64 = 14.0;
/// Onset and correlation disagree when they differ by more than this many of their sigmas.
const DISAGREE_SIGMAS: f64 = 4.0;

/// Finds the arrival times of captures of one shape: planned once, then run on any number of captures.
///
/// Whether a channel holds a pulse is decided by its energy in a sliding window two periods of the band's centre long: noise
/// alone exceeds the threshold anywhere in the record with the probability `false_alarm`. A channel without pulse has
/// no arrival; a capture without any pulse is a result with no arrival at all. Where `max_delay_s` is given, a channel
/// that has no pulse, or has its first one too far from that of the strongest channel, is searched again only where
/// a pulse may be, with the threshold of that shorter stretch.
///
/// ```
/// use arcstead_core::{Capture, Timing, TimingOptions};
/// let pulse = |delay: f64| -> Vec<f32> {
///     (0..800).map(|n| {
///         let t = (f64::from(n) - 300.0 - delay) / 5.0;
///         let quiet = 1e-3 * (f64::from(n * n) * 0.7).sin();
///         (quiet + if t > 0.0 { t * (-t).exp() * (4.0 * t).sin() } else { 0.0 }) as f32
///     }).collect()
/// };
/// let capture = Capture::new(5e9, vec![pulse(0.0), pulse(7.5)])?;
/// let mut timing = Timing::plan(&TimingOptions::default(), 5e9, 800, 2)?;
/// let times = timing.process(&capture)?;
/// let arrival = |channel: usize| times.channels[channel].arrival_s.unwrap_or(f64::NAN);
/// assert!((arrival(1) - arrival(0) - 1.5e-9).abs() < 5e-12);
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
#[derive(Debug)]
pub struct Timing {
    method: Method,
    conditioning: Conditioning,
    picker: Picker,
    gated: Gated,
    correlated: Option<Correlated>,
    sample_rate_hz: f64,
    sample_count: usize,
    /// Greatest delays in samples, widened for the noise.
    max_delay: Option<DMatrix<f64>>,
    channels: Vec<Conditioned>,
    onsets: Vec<Option<Picked>>,
    clipped_or_dead: Vec<(bool, bool)>,
}

impl Timing {
    /// Plans for captures of `channel_count` channels of `sample_count` samples at `sample_rate_hz`.
    ///
    /// # Errors
    /// [`TimingError`] when an option is out of range, the band does not fit the sample rate, or the captures are too
    /// short to hold a gate and some noise.
    pub fn plan(
        options: &TimingOptions,
        sample_rate_hz: f64,
        sample_count: usize,
        channel_count: usize,
    ) -> Result<Self, TimingError> {
        if channel_count == 0 {
            return Err(TimingError::NoChannels);
        }
        options.check(channel_count)?;
        let whole = options.method == Method::Correlation;
        let wrap = if whole { sample_count } else { 0 };
        let conditioning = Conditioning::plan(options, sample_rate_hz, sample_count, wrap)?;
        let slack = 0.5 * conditioning.gate.length();
        let max_delay = options.max_delay_s.as_ref().map(|limit| limit.map(|s| s * sample_rate_hz + slack));
        Ok(Self {
            method: options.method,
            picker: Picker::plan(options, &conditioning, sample_count),
            gated: Gated::default(),
            correlated: whole.then(|| Correlated::plan(options.weighting, &conditioning, channel_count)),
            conditioning,
            sample_rate_hz,
            sample_count,
            max_delay,
            channels: vec![Conditioned::default(); channel_count],
            onsets: vec![None; channel_count],
            clipped_or_dead: vec![(false, false); channel_count],
        })
    }

    /// The band in use, in hertz.
    #[must_use]
    pub fn band_hz(&self) -> (f64, f64) {
        self.conditioning.band_hz
    }

    /// Arrival times of one capture.
    ///
    /// # Errors
    /// [`TimingError::Shape`] when the capture does not have the shape that was planned for.
    pub fn process(&mut self, capture: &Capture) -> Result<ChannelTimes, TimingError> {
        self.check(capture)?;
        let undelayed = matches!(self.method, Method::Gated | Method::Correlation);
        for (index, samples) in capture.channels().enumerate() {
            let channel = &mut self.channels[index];
            let (clipped, dead) = (is_clipped(samples, capture.range(index)), is_dead(samples));
            self.clipped_or_dead[index] = (clipped, dead);
            let spectrum = self.correlated.as_mut().map(|correlated| correlated.spectrum_mut(index));
            self.conditioning.process(samples, undelayed, spectrum, channel);
            if dead {
                channel.start = None;
            }
        }
        self.pick();
        let aligned = match self.method {
            Method::Gated => self.gated.align(&self.conditioning, &self.channels, &self.onsets),
            Method::Correlation => self.correlated.as_mut().and_then(|correlated| {
                correlated.align(
                    &mut self.conditioning,
                    &self.channels,
                    &self.onsets,
                    self.max_delay.as_ref(),
                )
            }),
            Method::Energy | Method::Akaike | Method::Threshold => None,
        };
        Ok(self.times(aligned))
    }

    fn check(&self, capture: &Capture) -> Result<(), TimingError> {
        let same_rate = (capture.sample_rate_hz() / self.sample_rate_hz - 1.0).abs() < 1e-9;
        if same_rate
            && capture.sample_count() == self.sample_count
            && capture.channel_count() == self.channels.len()
        {
            return Ok(());
        }
        Err(TimingError::Shape {
            found_channels: capture.channel_count(),
            found_samples: capture.sample_count(),
            found_rate_hz: capture.sample_rate_hz(),
            expected_channels: self.channels.len(),
            expected_samples: self.sample_count,
            expected_rate_hz: self.sample_rate_hz,
        })
    }

    /// Onsets of all channels; where greatest delays are known, once more where they say a pulse may be.
    fn pick(&mut self) {
        for (onset, channel) in self.onsets.iter_mut().zip(&self.channels) {
            *onset = self.picker.pick(channel, &self.conditioning);
        }
        let Some(max_delay) = &self.max_delay else { return };
        let strength =
            |index: usize| peak_near(&self.channels[index], self.onsets[index], &self.conditioning);
        let strongest = (0..self.channels.len())
            .filter(|&index| self.onsets[index].is_some())
            .max_by(|&a, &b| strength(a).total_cmp(&strength(b)));
        let Some((reference, sure)) = strongest.and_then(|index| Some((index, self.onsets[index]?))) else {
            return;
        };
        for index in 0..self.channels.len() {
            let limit = max_delay[(reference, index)];
            let possible =
                self.onsets[index].is_some_and(|onset| (onset.position - sure.position).abs() <= limit);
            if index == reference || possible || self.clipped_or_dead[index].1 {
                continue;
            }
            // The detector's window may begin a window before the onset it holds.
            let margin = self.conditioning.detector.window() as f64;
            let from = (sure.position - limit - margin).max(0.0);
            let to = (sure.position + limit + margin).clamp(0.0, self.sample_count as f64);
            let channel = &mut self.channels[index];
            let noise_power = channel.noise_power;
            channel.start = self.conditioning.detector.first_above(
                &channel.causal,
                from as usize..to as usize,
                noise_power,
            );
            self.onsets[index] = self
                .picker
                .pick(channel, &self.conditioning)
                .filter(|onset| (onset.position - sure.position).abs() <= limit);
        }
    }

    fn times(&self, aligned: Option<Aligned>) -> ChannelTimes {
        let count = self.channels.len();
        let interval_s = 1.0 / self.sample_rate_hz;
        let mut covariance_s2 = DMatrix::zeros(count, count);
        let mut arrivals = vec![None; count];
        for (index, onset) in self.onsets.iter().enumerate() {
            if let Some(onset) = onset {
                arrivals[index] = Some(onset.position);
                covariance_s2[(index, index)] = onset.variance;
            }
        }
        let mut disagree = vec![false; count];
        if let Some(aligned) = &aligned {
            for (row, &i) in aligned.channels.iter().enumerate() {
                arrivals[i] = Some(aligned.times[row]);
                for (column, &j) in aligned.channels.iter().enumerate() {
                    covariance_s2[(i, j)] = aligned.covariance[(row, column)];
                }
                if let Some(onset) = self.onsets[i] {
                    let sigma = (onset.variance + aligned.covariance[(row, row)]).sqrt();
                    disagree[i] = (onset.position - aligned.times[row]).abs() > DISAGREE_SIGMAS * sigma;
                }
            }
        }
        let channels = (0..count)
            .map(|index| {
                let channel = &self.channels[index];
                let (clipped, dead) = self.clipped_or_dead[index];
                let snr_db = (!dead)
                    .then(|| peak_near(channel, self.onsets[index], &self.conditioning))
                    .and_then(|ratio| (ratio > 0.0 && ratio.is_finite()).then(|| 20.0 * ratio.log10()));
                ChannelTime {
                    arrival_s: arrivals[index].map(|samples| samples * interval_s),
                    snr_db,
                    flags: ChannelFlags {
                        clipped,
                        dead,
                        weak: arrivals[index].is_some() && snr_db.is_none_or(|db| db < WEAK_DB),
                        carrier: !channel.carriers.is_empty(),
                        disagree: disagree[index],
                    },
                }
            })
            .collect();
        let closure_s = aligned.and_then(|aligned| aligned.closure).map(|samples| samples * interval_s);
        ChannelTimes { channels, covariance_s2: covariance_s2 * (interval_s * interval_s), closure_s }
    }
}

/// Peak over noise rms after the causal band-pass: of the pulse that was timed where there is one (from its onset to two
/// gates after it), of the whole record where there is none.
fn peak_near(channel: &Conditioned, onset: Option<Picked>, conditioning: &Conditioning) -> f64 {
    let samples = channel.causal.as_slice();
    let range = onset.map_or(0..samples.len(), |onset| {
        let from = (onset.position.max(0.0) as usize).min(samples.len());
        from..(from + (2.0 * conditioning.gate.length()) as usize).min(samples.len())
    });
    let peak = samples[range].iter().fold(0.0, |peak: f64, x| peak.max(x.abs()));
    peak / channel.noise_power.sqrt()
}
