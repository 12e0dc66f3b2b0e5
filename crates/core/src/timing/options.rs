//! What a timing plan may be asked for.

use nalgebra::DMatrix;

use super::TimingError;
use crate::correlation::Weighting;

/// How arrivals are found.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default)]
pub enum Method {
    /// An onset picked by energy gates a short window; the correlation of those windows gives the delays.
    #[default]
    Gated,
    /// Generalised cross-correlation of the whole records. Echoes correlate too, and a periodic pulse slips by cycles.
    Correlation,
    /// The onset alone, by the energy criterion.
    Energy,
    /// The onset alone, by Akaike's criterion.
    Akaike,
    /// The onset alone, where a share of the pulse's peak is first reached.
    Threshold,
}

/// Options of a timing plan; the defaults suit a discharge pulse of a few nanoseconds.
#[derive(Debug, Clone, PartialEq)]
pub struct TimingOptions {
    /// How arrivals are found.
    pub method: Method,
    /// The band that is used, low and high edge in hertz; none: from 0.02 to 0.4 of the sample rate.
    pub band_hz: Option<(f64, f64)>,
    /// Whether carriers (narrow lines) are cut out.
    pub excise: bool,
    /// Greatest |arrival at B - arrival at A| that geometry and cables allow, in seconds, channels x channels and
    /// symmetric; infinite where nothing is known, none: no limit at all. It is widened by half a gate for the noise.
    pub max_delay_s: Option<DMatrix<f64>>,
    /// Probability that noise alone makes one channel of one capture seem to hold a pulse (default 1e-4).
    pub false_alarm: f64,
    /// Length of the gate in periods of the band's centre (default 3; in a narrow band, where it is longer, of half the
    /// inverse bandwidth): long enough for the first swings, too short for a reflection some nanoseconds later.
    pub gate_periods: f64,
    /// Order of the causal band-pass before the onset pickers (default 2).
    pub filter_order: usize,
    /// Divisor of the mean power in the energy criterion (default 1; more picks earlier).
    pub energy_alpha: f64,
    /// Share of the pulse's peak that [`Method::Threshold`] waits for (default 0.4); never less than what noise alone
    /// reaches with the false alarm probability.
    pub threshold_share: f64,
    /// Weight of the frequencies in [`Method::Correlation`] (default: plain).
    pub weighting: Weighting,
}

impl Default for TimingOptions {
    fn default() -> Self {
        Self {
            method: Method::default(),
            band_hz: None,
            excise: true,
            max_delay_s: None,
            false_alarm: 1e-4,
            gate_periods: 3.0,
            filter_order: 2,
            energy_alpha: 1.0,
            threshold_share: 0.4,
            weighting: Weighting::default(),
        }
    }
}

impl TimingOptions {
    /// The band in hertz: the one given, or from 0.02 to 0.4 of the sample rate.
    #[must_use]
    pub fn band_or_default_hz(&self, sample_rate_hz: f64) -> (f64, f64) {
        self.band_hz.unwrap_or((0.02 * sample_rate_hz, 0.4 * sample_rate_hz))
    }

    /// Checks what does not depend on anything but itself and the number of channels.
    pub(super) fn check(&self, channel_count: usize) -> Result<(), TimingError> {
        let option = |good: bool, name, found, expected| {
            if good { Ok(()) } else { Err(TimingError::Option { name, found, expected }) }
        };
        option(
            self.false_alarm >= 1e-12 && self.false_alarm < 1.0,
            "false_alarm",
            self.false_alarm,
            "a probability from 1e-12 to less than 1",
        )?;
        option(
            (1.5..=1000.0).contains(&self.gate_periods),
            "gate_periods",
            self.gate_periods,
            "1.5 to 1000",
        )?;
        option((1.0..=100.0).contains(&self.energy_alpha), "energy_alpha", self.energy_alpha, "1 to 100")?;
        option(
            self.threshold_share > 0.0 && self.threshold_share < 1.0,
            "threshold_share",
            self.threshold_share,
            "more than 0 and less than 1",
        )?;
        if let Weighting::PhaseTransform { exponent } = self.weighting {
            option((0.0..=1.0).contains(&exponent), "weighting.exponent", exponent, "0 to 1")?;
        }
        let Some(max_delay_s) = &self.max_delay_s else { return Ok(()) };
        if max_delay_s.shape() != (channel_count, channel_count) {
            let (found_rows, found_columns) = max_delay_s.shape();
            return Err(TimingError::MaxDelayShape { found_rows, found_columns, expected: channel_count });
        }
        for a in 0..channel_count {
            for b in 0..channel_count {
                let found_s = max_delay_s[(a, b)];
                if a != b && (found_s.is_nan() || found_s < 0.0) {
                    return Err(TimingError::MaxDelay { a: a + 1, b: b + 1, found_s });
                }
            }
        }
        Ok(())
    }
}
