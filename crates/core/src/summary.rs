//! What is in the channels of a capture, before anything is known of the site.

use crate::capture::Capture;
use crate::carriers::Carrier;
use crate::clipping::{is_clipped, is_dead};
use crate::timing::{Conditioned, Conditioning, TimingError, TimingOptions};

/// What one channel of a capture holds. Levels are in the unit of the samples, which is not calibrated.
#[derive(Debug, Clone, PartialEq)]
pub struct ChannelSummary {
    /// Mean of the samples.
    pub offset: f64,
    /// Greatest magnitude of a sample, with the offset taken off.
    pub largest: f64,
    /// Rms of the noise before the pulse, after the timing band-pass; zero on a dead channel.
    pub noise_rms: f64,
    /// 20 log10 of the greatest magnitude over the noise rms, both after the timing band-pass, in dB; none on a dead
    /// channel. Noise alone reaches some 10 dB.
    pub snr_db: Option<f64>,
    /// Whether the channel holds a pulse, by the test that [`Timing`](crate::Timing) uses.
    pub pulse: bool,
    /// Whether samples stand at the end of the recorder's range.
    pub clipped: bool,
    /// Whether the channel carries nothing.
    pub dead: bool,
    /// Narrow lines, strongest first; none are looked for when `excise` is off.
    pub carriers: Vec<Carrier>,
}

/// Summarises every channel of a capture. Of the options the band, the false alarm probability, the order of the filter
/// and `excise` count.
///
/// ```
/// use arcstead_core::{Capture, TimingOptions, summarise};
/// let tone: Vec<f32> = (0..1000).map(|n| 3.0 + (n as f32 * 0.9).sin() + (n as f32 * n as f32).sin() * 0.1).collect();
/// let summary = summarise(&Capture::new(5e9, vec![tone, vec![0.5; 1000]])?, &TimingOptions::default())?;
/// assert!((summary[0].carriers[0].frequency_hz - 0.9 / std::f64::consts::TAU * 5e9).abs() < 2e6);
/// assert!(summary[1].dead && summary[1].snr_db.is_none());
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
///
/// # Errors
/// [`TimingError`] when the band does not fit the sample rate or the capture is too short for it.
pub fn summarise(capture: &Capture, options: &TimingOptions) -> Result<Vec<ChannelSummary>, TimingError> {
    let mut conditioning = Conditioning::plan(options, capture.sample_rate_hz(), capture.sample_count(), 0)?;
    let mut channel = Conditioned::default();
    let summaries = capture.channels().enumerate().map(|(index, samples)| {
        conditioning.process(samples, false, None, &mut channel);
        let dead = is_dead(samples);
        let peak = channel.causal.iter().fold(0.0, |peak: f64, x| peak.max(x.abs()));
        let noise_rms = if dead { 0.0 } else { channel.noise_power.sqrt() };
        let largest =
            samples.iter().fold(0.0, |most: f64, &x| most.max((f64::from(x) - channel.offset).abs()));
        let mut carriers = if dead { Vec::new() } else { channel.carriers.clone() };
        carriers.sort_by(|a, b| b.level_db.total_cmp(&a.level_db));
        ChannelSummary {
            offset: channel.offset,
            largest,
            noise_rms,
            snr_db: (peak > 0.0 && noise_rms > 0.0).then(|| 20.0 * (peak / noise_rms).log10()),
            pulse: !dead && channel.start.is_some(),
            clipped: is_clipped(samples, capture.range(index)),
            dead,
            carriers,
        }
    });
    Ok(summaries.collect())
}
