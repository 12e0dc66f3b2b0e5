//! From a capture to arrivals: channels become antennas, and the delays of their chains are subtracted.

use std::collections::HashMap;

use arcstead_core::{Capture, Method, Timing, TimingError, TimingOptions};
use nalgebra::DMatrix;
use thiserror::Error;

use crate::arrivals_table::{AntennaArrival, CaptureArrivals};
use crate::formats::Recorded;
use crate::site::Site;

/// How arrival times are found in captures.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ArrivalOptions {
    /// The estimator (default gated).
    pub method: Method,
    /// Band in hertz; none takes the part of the spectrum that all antennas and the recorder share, as the site
    /// file states it.
    pub band_hz: Option<(f64, f64)>,
    /// Whether carriers are cut out of the spectrum (default true).
    pub excise: bool,
}

impl Default for ArrivalOptions {
    fn default() -> Self {
        Self { method: Method::default(), band_hz: None, excise: true }
    }
}

impl ArrivalOptions {
    /// The band in hertz that captures of this site are timed in: the one asked for, else what the antennas and the
    /// recorder share, else none (the estimator's default).
    ///
    /// A recorder's bandwidth ends the band only above; antennas without a stated band do not limit it. Nothing
    /// shared, or no antenna with a stated band, gives none.
    #[must_use]
    pub fn band_of(&self, site: &Site) -> Option<(f64, f64)> {
        if self.band_hz.is_some() {
            return self.band_hz;
        }
        let (mut low, mut high) = (0.0_f64, f64::INFINITY);
        for (antenna_low, antenna_high) in site.chains.iter().filter_map(|chain| chain.band_hz) {
            low = low.max(antenna_low);
            high = high.min(antenna_high);
        }
        let limit = site.recorder.bandwidth_hz.unwrap_or(f64::INFINITY);
        high = high.min(limit);
        (low > 0.0 && low < high && high.is_finite()).then_some((low, high))
    }
}

/// Why a capture gave no arrivals at all.
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
pub enum TimerError {
    /// The capture has no such channel.
    #[error(
        "antenna \"{antenna}\" is on channel {channel}, but the channels of the capture end at {found}; check `channel` in the site file"
    )]
    MissingChannel {
        /// Name of the antenna.
        antenna: String,
        /// Its channel, counted from 1.
        channel: usize,
        /// Channels of the capture.
        found: usize,
    },
    /// The estimator cannot work on this capture.
    #[error(transparent)]
    Timing(#[from] TimingError),
}

/// Sigmas of delays and positions by which a delay may exceed what the geometry allows before it is looked for no
/// more.
const DELAY_SLACK_SIGMAS: f64 = 6.0;

/// Times captures of one site; keeps the plans for the shapes of capture it has met. One per thread.
#[derive(Debug)]
pub struct CaptureTimer<'s> {
    site: &'s Site,
    options: ArrivalOptions,
    band_hz: Option<(f64, f64)>,
    stance: String,
    max_delay_s: DMatrix<f64>,
    plans: HashMap<(u64, usize, bool), Timing>,
}

impl<'s> CaptureTimer<'s> {
    /// A timer for captures taken from `stance`; none when the site has no stance of this name.
    #[must_use]
    pub fn new(site: &'s Site, stance: &str, options: ArrivalOptions) -> Option<Self> {
        let geometry = site.geometry_of_stance(stance)?;
        let antennas = &geometry.antennas;
        let speed = geometry.air.speed_m_per_s;
        let max_delay_s = DMatrix::from_fn(antennas.len(), antennas.len(), |a, b| {
            let way_s = (antennas[a].position_m - antennas[b].position_m).norm() / speed;
            let sigma_s = |i: usize| {
                let survey_s = antennas[i].position_sigma.variance_range_m2().1.sqrt() / speed;
                antennas[i].delay_sigma_s + antennas[i].response_sigma_s + survey_s
            };
            let chains_s = (site.chains[a].delay_s - site.chains[b].delay_s).abs();
            way_s + chains_s + DELAY_SLACK_SIGMAS * (sigma_s(a) + sigma_s(b))
        });
        Some(Self {
            site,
            band_hz: options.band_of(site),
            options,
            stance: stance.to_owned(),
            max_delay_s,
            plans: HashMap::new(),
        })
    }

    /// Arrival times of one capture at the antennas of the site, in their order, delays subtracted. A capture without a
    /// pulse gives rows without arrivals.
    ///
    /// A capture that keeps only envelope delays ([`Recorded::envelope_only`]) is timed by the energy onset where
    /// correlation was asked for, over the whole of its spectrum.
    ///
    /// # Errors
    /// [`TimerError`] when a channel is missing or the estimator cannot work on captures of this shape.
    pub fn time(&mut self, recorded: &Recorded) -> Result<CaptureArrivals, TimerError> {
        let rearranged = self.antenna_channels(&recorded.capture)?;
        let capture = rearranged.as_ref().unwrap_or(&recorded.capture);
        let times = self.plan(capture, recorded.envelope_only)?.process(capture)?;
        let antennas = times
            .channels
            .iter()
            .enumerate()
            .map(|(antenna, time)| AntennaArrival {
                antenna,
                arrival_s: time.arrival_s.map(|arrival_s| arrival_s - self.site.chains[antenna].delay_s),
                sigma_s: time.arrival_s.map(|_| times.covariance_s2[(antenna, antenna)].sqrt()),
                snr_db: time.snr_db,
                flags: time.flags,
            })
            .collect();
        Ok(CaptureArrivals {
            capture: recorded.name.clone(),
            time: recorded.time,
            stance: self.stance.clone(),
            antennas,
            covariance_s2: times.covariance_s2,
        })
    }

    /// The channels of the antennas in the order of the site; none when they are the capture's channels already.
    fn antenna_channels(&self, capture: &Capture) -> Result<Option<Capture>, TimerError> {
        let found = capture.channel_count();
        let channels: Vec<usize> = self.site.chains.iter().map(|chain| chain.channel).collect();
        if let Some(missing) = channels.iter().position(|&channel| channel >= found) {
            return Err(TimerError::MissingChannel {
                antenna: self.site.geometry.antennas[missing].name.clone(),
                channel: channels[missing] + 1,
                found,
            });
        }
        if channels.len() == found && channels.iter().enumerate().all(|(place, &channel)| place == channel) {
            return Ok(None);
        }
        Ok(Some(capture.select(&channels)))
    }

    fn plan(&mut self, capture: &Capture, envelope_only: bool) -> Result<&mut Timing, TimingError> {
        let (rate_hz, samples) = (capture.sample_rate_hz(), capture.sample_count());
        match self.plans.entry((rate_hz.to_bits(), samples, envelope_only)) {
            std::collections::hash_map::Entry::Occupied(plan) => Ok(plan.into_mut()),
            std::collections::hash_map::Entry::Vacant(place) => {
                let method = match self.options.method {
                    Method::Gated | Method::Correlation if envelope_only => Method::Energy,
                    method => method,
                };
                let options = TimingOptions {
                    method,
                    band_hz: if envelope_only { None } else { self.band_hz },
                    excise: self.options.excise,
                    max_delay_s: Some(self.max_delay_s.clone()),
                    ..TimingOptions::default()
                };
                Ok(place.insert(Timing::plan(&options, rate_hz, samples, self.site.chains.len())?))
            }
        }
    }
}
