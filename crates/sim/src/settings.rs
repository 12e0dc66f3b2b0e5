//! What is asked of a simulated visit.

use arcstead_solver::Site;
use arcstead_solver::nalgebra::Vector3;

use crate::carrier::CarrierSetting;
use crate::error::SimError;
use crate::pulse::PulseSetting;
use crate::travel::NEAREST_M;

/// Fewest samples of a channel.
pub(crate) const LEAST_SAMPLES: usize = 32;
/// Most samples of a channel: some milliseconds at the rates that time pulses, and a bound on memory.
pub(crate) const MOST_SAMPLES: usize = 1 << 22;

/// A visit to be simulated: what discharges, how it is recorded, and what disturbs it.
///
/// The defaults are four seconds of a working day near a substation, without carriers: a recorder of 5 GS/s,
/// 1500 samples and 8 bits, a band of 300 to 1500 MHz, a ground that reflects, three scatterers, antennas that
/// are not quite alike, and systematic errors drawn as the site states them. Sources and captures have to be
/// named.
///
/// ```
/// use arcstead_sim::{SourceSetting, VisitSettings};
/// let settings = VisitSettings {
///     sources: vec![SourceSetting::at([12.0, 8.0, 6.0])],
///     captures: 40,
///     seed: 7,
///     ..VisitSettings::default()
/// };
/// assert_eq!(settings.band_hz, (300e6, 1500e6));
/// ```
#[derive(Debug, Clone, PartialEq)]
pub struct VisitSettings {
    /// What discharges; at least one.
    pub sources: Vec<SourceSetting>,
    /// Number of captures; at least one.
    pub captures: usize,
    /// Seed of everything that is drawn: the same seed gives the same bytes.
    pub seed: u64,
    /// The recorder, the same on all channels.
    pub recorder: RecorderSetting,
    /// Lower and upper edge of the antennas' band in hertz, which is also the timing band (default 300 to
    /// 1500 MHz).
    pub band_hz: (f64, f64),
    /// Known delay of antenna, cable and recorder channel in seconds, one per antenna; empty for no delays
    /// (default).
    pub nominal_delay_s: Vec<f64>,
    /// Standard deviation of the antennas' gains about their mean, in dB (default 2): levels are not calibrated.
    pub gain_spread_db: f64,
    /// Root mean square ripple of each antenna's own magnitude response, in dB (default 0.5; 0 for flat
    /// antennas, all alike).
    pub ripple_db: f64,
    /// Reflection coefficient of the ground at z = 0, -1 to 1; none draws one between -0.5 and 0.5 for the visit
    /// (default).
    pub ground_reflection: Option<f64>,
    /// Number of fixed things about the site that scatter a weaker, later pulse (default 3).
    pub scatterers: usize,
    /// Transmitters that disturb (default none).
    pub carriers: Vec<CarrierSetting>,
    /// Half-width of the trigger jitter in seconds: the first arrival lies uniformly within this of a third of the
    /// record (default 5 ns).
    pub trigger_jitter_s: f64,
    /// Mean time between two captures in seconds (default 0.1).
    pub mean_interval_s: f64,
    /// Mains frequency in hertz: discharges keep to a part of the mains cycle. None for discharges at any time
    /// (default).
    pub mains_frequency_hz: Option<f64>,
    /// Whether delay, survey and response errors are drawn with the sigmas of the site (default), or are all zero.
    pub draw_errors: bool,
}

/// One source of a simulated visit.
#[derive(Debug, Clone, PartialEq)]
pub struct SourceSetting {
    /// Position in metres.
    pub position_m: Vector3<f64>,
    /// Relative share of the captures, zero or more (default 1).
    pub share: f64,
    /// 20 log10 of pulse peak over noise rms, both after the timing band-pass, of a shot of median level,
    /// 10 m away with a clear line, on an antenna of mean gain, in dB (default 20). The band-pass is that of the
    /// visit's band, causal, Butterworth, two poles at each edge; a steeper one or one without phase tells a level
    /// that differs by about 1 dB.
    pub snr_at_10m_db: f64,
    /// Standard deviation of the shots' level in dB: a log-normal amplitude (default 3).
    pub level_spread_db: f64,
    /// The pulse and how it varies from shot to shot.
    pub pulse: PulseSetting,
    /// Phase of the mains at which its positive pulses gather, in degrees; negative pulses gather half a cycle
    /// later (default 60). Without a mains frequency it has no effect.
    pub mains_phase_deg: f64,
}

impl SourceSetting {
    /// A source at this position (metres) with the default level and pulse.
    #[must_use]
    pub fn at(position_m: impl Into<Vector3<f64>>) -> Self {
        Self {
            position_m: position_m.into(),
            share: 1.0,
            snr_at_10m_db: 20.0,
            level_spread_db: 3.0,
            pulse: PulseSetting::default(),
            mains_phase_deg: 60.0,
        }
    }
}

/// The recorder of a simulated visit, the same on all channels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RecorderSetting {
    /// Samples per second on each channel, in hertz (default 5e9).
    pub sample_rate_hz: f64,
    /// Samples of each channel in one capture (default 1500).
    pub sample_count: usize,
    /// Resolution in bits, 8 to 16 (default 8).
    pub bits: u8,
    /// Bandwidth at -3 dB in hertz (default 1500 MHz). Above 0.75 of half the sample rate the anti-aliasing filter
    /// before the converter sets the bandwidth instead.
    pub bandwidth_hz: f64,
}

impl Default for RecorderSetting {
    fn default() -> Self {
        Self { sample_rate_hz: 5e9, sample_count: 1500, bits: 8, bandwidth_hz: 1.5e9 }
    }
}

impl Default for VisitSettings {
    fn default() -> Self {
        Self {
            sources: Vec::new(),
            captures: 40,
            seed: 1,
            recorder: RecorderSetting::default(),
            band_hz: (300e6, 1500e6),
            nominal_delay_s: Vec::new(),
            gain_spread_db: 2.0,
            ripple_db: 0.5,
            ground_reflection: None,
            scatterers: 3,
            carriers: Vec::new(),
            trigger_jitter_s: 5e-9,
            mean_interval_s: 0.1,
            mains_frequency_hz: None,
            draw_errors: true,
        }
    }
}

impl VisitSettings {
    /// The first mistake in the settings, alone and against the site.
    pub(crate) fn check(&self, site: &Site) -> Result<(), SimError> {
        if site.antennas.is_empty() {
            return Err(SimError::NoAntennas);
        }
        if self.sources.is_empty() {
            return Err(SimError::NoSources);
        }
        if self.captures == 0 {
            return Err(SimError::NoCaptures);
        }
        self.check_recorder()?;
        self.check_numbers()?;
        if !self.nominal_delay_s.is_empty() && self.nominal_delay_s.len() != site.antennas.len() {
            return Err(SimError::DelayCount {
                found: self.nominal_delay_s.len(),
                expected: site.antennas.len(),
            });
        }
        for (index, source) in self.sources.iter().enumerate() {
            source.check(index)?;
        }
        let shares: f64 = self.sources.iter().map(|source| source.share).sum();
        if shares <= 0.0 {
            return Err(SimError::Setting {
                name: "the sum of all shares",
                found: shares,
                expected: "more than zero",
            });
        }
        check_places(site, &self.sources)
    }

    fn check_recorder(&self) -> Result<(), SimError> {
        let recorder = &self.recorder;
        number("sample_rate_hz", recorder.sample_rate_hz, 1e3..=1e13, "1 kHz to 10 THz, in hertz")?;
        number("bandwidth_hz", recorder.bandwidth_hz, 1.0..=1e13, "1 Hz to 10 THz, in hertz")?;
        if !(8..=16).contains(&recorder.bits) {
            return Err(SimError::Bits { found: recorder.bits });
        }
        if !(LEAST_SAMPLES..=MOST_SAMPLES).contains(&recorder.sample_count) {
            return Err(SimError::SampleCount {
                found: recorder.sample_count,
                least: LEAST_SAMPLES,
                most: MOST_SAMPLES,
            });
        }
        let (low_hz, high_hz) = self.band_hz;
        let nyquist_hz = recorder.sample_rate_hz / 2.0;
        // Comparisons written so that NaN fails them.
        if !(low_hz > 0.0 && low_hz < high_hz && high_hz < nyquist_hz) {
            return Err(SimError::Band { low_hz, high_hz, nyquist_hz });
        }
        for carrier in &self.carriers {
            number("level_db of a carrier", carrier.level_db, -60.0..=80.0, "-60 to 80 dB")?;
            number(
                "frequency_hz of a carrier",
                carrier.frequency_hz,
                f64::MIN_POSITIVE..=nyquist_hz,
                "more than zero and at most half the sample rate, in hertz",
            )?;
            number(
                "width_hz of a carrier",
                carrier.width_hz,
                0.0..=carrier.frequency_hz,
                "zero to the carrier's frequency, in hertz",
            )?;
        }
        Ok(())
    }

    fn check_numbers(&self) -> Result<(), SimError> {
        for &delay_s in &self.nominal_delay_s {
            number("nominal_delay_s", delay_s, -1.0..=1.0, "-1 to 1, in seconds")?;
        }
        number("gain_spread_db", self.gain_spread_db, 0.0..=20.0, "0 to 20 dB")?;
        number("ripple_db", self.ripple_db, 0.0..=6.0, "0 to 6 dB")?;
        number("ground_reflection", self.ground_reflection.unwrap_or(0.0), -1.0..=1.0, "-1 to 1")?;
        number("trigger_jitter_s", self.trigger_jitter_s, 0.0..=1.0, "0 to 1, in seconds")?;
        number("mean_interval_s", self.mean_interval_s, 0.0..=1e6, "0 to 1e6, in seconds")?;
        number(
            "mains_frequency_hz",
            self.mains_frequency_hz.unwrap_or(50.0),
            1.0..=1000.0,
            "1 to 1000, in hertz",
        )?;
        let scatterers = u32::try_from(self.scatterers).map_or(f64::INFINITY, f64::from);
        number("scatterers", scatterers, 0.0..=1000.0, "0 to 1000")
    }
}

impl SourceSetting {
    fn check(&self, index: usize) -> Result<(), SimError> {
        let number = |name, found: f64, range: std::ops::RangeInclusive<f64>, expected| {
            if range.contains(&found) {
                Ok(())
            } else {
                Err(SimError::Source { index, name, found, expected })
            }
        };
        for &coordinate in self.position_m.iter() {
            number("position_m", coordinate, -1e6..=1e6, "-1000 to 1000 km, in metres")?;
        }
        number("share", self.share, 0.0..=1e12, "0 to 1e12")?;
        number("snr_at_10m_db", self.snr_at_10m_db, -60.0..=200.0, "-60 to 200 dB")?;
        number("level_spread_db", self.level_spread_db, 0.0..=30.0, "0 to 30 dB")?;
        number("mains_phase_deg", self.mains_phase_deg, -360.0..=360.0, "-360 to 360 degrees")?;
        let pulse = &self.pulse;
        number("pulse.rise_s", pulse.rise_s, 1e-12..=1e-3, "1 ps to 1 ms, in seconds")?;
        number("pulse.decay_s", pulse.decay_s, 1e-12..=1e-3, "1 ps to 1 ms, in seconds")?;
        number("pulse.oscillation_hz", pulse.oscillation_hz, 1e3..=1e13, "1 kHz to 10 THz, in hertz")?;
        number("pulse.oscillation_share", pulse.oscillation_share, 0.0..=10.0, "0 to 10")?;
        number("pulse.damping", pulse.damping, 0.01..=10.0, "0.01 to 10")?;
        number("pulse.shape_spread", pulse.shape_spread, 0.0..=0.5, "0 to 0.5")
    }
}

fn number(
    name: &'static str,
    found: f64,
    range: std::ops::RangeInclusive<f64>,
    expected: &'static str,
) -> Result<(), SimError> {
    if range.contains(&found) { Ok(()) } else { Err(SimError::Setting { name, found, expected }) }
}

fn check_places(site: &Site, sources: &[SourceSetting]) -> Result<(), SimError> {
    let inside =
        |place_m: &Vector3<f64>| site.obstacles.iter().find(|o| o.contains(place_m)).map(|o| o.name.clone());
    for antenna in &site.antennas {
        if let Some(obstacle) = inside(&antenna.position_m) {
            return Err(SimError::AntennaInside { antenna: antenna.name.clone(), obstacle });
        }
    }
    for (source_index, source) in sources.iter().enumerate() {
        if let Some(obstacle) = inside(&source.position_m) {
            return Err(SimError::SourceInside { source_index, obstacle });
        }
        for antenna in &site.antennas {
            let found_m = (antenna.position_m - source.position_m).norm();
            if found_m < NEAREST_M {
                return Err(SimError::TooNear {
                    source_index,
                    antenna: antenna.name.clone(),
                    found_m,
                    least_m: NEAREST_M,
                });
            }
        }
    }
    Ok(())
}
