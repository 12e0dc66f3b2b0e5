//! Which source discharges when, how strongly, and with which sign.

use rand::{Rng, RngExt};
use rand_distr::{Distribution, Exp1, StandardNormal};

use crate::settings::VisitSettings;
use crate::truth::{TrueCapture, TrueSource};

/// Standard deviation of the phase of the mains about that of its source, in degrees.
const MAINS_PHASE_SPREAD_DEG: f64 = 12.0;

/// Draws all captures of a visit.
///
/// Intervals are exponential. With a mains frequency the captures fall into different cycles, each near the
/// phase of its source, half a cycle later for a negative pulse. The first arrival lies at a third of the
/// record, give or take the trigger jitter.
pub(crate) fn draw(
    settings: &VisitSettings,
    sources: &[TrueSource],
    rng: &mut (impl Rng + ?Sized),
) -> Vec<TrueCapture> {
    let shares: f64 = settings.sources.iter().map(|source| source.share).sum();
    let last = settings.sources.iter().rposition(|source| source.share > 0.0).unwrap_or(0);
    let first_arrival_s = first_arrival_s(settings);
    let (mut time_s, mut cycle) = (0.0_f64, 0.0_f64);
    (0..settings.captures)
        .map(|_| {
            let mut left = shares * rng.random::<f64>();
            let source = settings
                .sources
                .iter()
                .position(|source| {
                    left -= source.share;
                    left < 0.0
                })
                // Rounding of the sum may leave a crumb: it belongs to the last source that has a share.
                .unwrap_or(last);
            let setting = &settings.sources[source];
            let positive = rng.random::<bool>();
            let level: f64 = StandardNormal.sample(rng);
            let wait: f64 = Exp1.sample(rng);
            let phase: f64 = StandardNormal.sample(rng);
            let jitter_s = settings.trigger_jitter_s * rng.random_range(-1.0..=1.0);

            time_s += wait * settings.mean_interval_s;
            let emission_s = settings.mains_frequency_hz.map_or(time_s, |mains_hz| {
                cycle = (time_s * mains_hz).floor().max(cycle + 1.0);
                let half_deg = if positive { 0.0 } else { 180.0 };
                let phase_deg = setting.mains_phase_deg + half_deg + MAINS_PHASE_SPREAD_DEG * phase;
                (cycle + (phase_deg / 360.0).rem_euclid(1.0)) / mains_hz
            });
            let soonest_s = sources[source].delay_s.iter().copied().fold(f64::INFINITY, f64::min);
            TrueCapture {
                source,
                emission_s,
                emission_in_record_s: first_arrival_s + jitter_s - soonest_s,
                level_db: setting.level_spread_db * level,
                positive,
            }
        })
        .collect()
}

/// Where the first arrival lies in a record without jitter, in seconds.
pub(crate) fn first_arrival_s(settings: &VisitSettings) -> f64 {
    settings.recorder.sample_count as f64 / settings.recorder.sample_rate_hz / 3.0
}
