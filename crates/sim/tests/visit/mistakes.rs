//! Settings that are wrong, and settings that are only odd.

use arcstead_sim::{
    CarrierSetting, PulseSetting, RecorderSetting, SimError, SourceSetting, Visit, VisitSettings,
};
use arcstead_solver::Obstacle;
use arcstead_solver::nalgebra::{Vector2, Vector3};

use crate::bay::{energy, settings, site, site_of, source};

#[test]
fn wrong_settings_are_told() {
    let refused = |change: &dyn Fn(&mut VisitSettings)| {
        let mut changed = settings();
        change(&mut changed);
        Visit::new(&site(), changed).unwrap_err()
    };
    assert_eq!(Visit::new(&site_of(&[]), settings()).unwrap_err(), SimError::NoAntennas);
    assert_eq!(refused(&|s| s.sources.clear()), SimError::NoSources);
    assert_eq!(refused(&|s| s.captures = 0), SimError::NoCaptures);
    assert_eq!(refused(&|s| s.recorder.bits = 3), SimError::Bits { found: 3 });
    assert_eq!(
        refused(&|s| s.nominal_delay_s = vec![0.0; 3]),
        SimError::DelayCount { found: 3, expected: 4 }
    );
    let is = |name: &str, change: &dyn Fn(&mut VisitSettings)| match refused(change) {
        SimError::Setting { name: found, .. } | SimError::Source { name: found, .. } => {
            assert_eq!(found, name)
        }
        other => panic!("{name}: {other}"),
    };
    is("sample_rate_hz", &|s| s.recorder.sample_rate_hz = 0.0);
    is("sample_rate_hz", &|s| s.recorder.sample_rate_hz = f64::NAN);
    is("bandwidth_hz", &|s| s.recorder.bandwidth_hz = -1.0);
    is("gain_spread_db", &|s| s.gain_spread_db = f64::INFINITY);
    is("ground_reflection", &|s| s.ground_reflection = Some(1.5));
    is("scatterers", &|s| s.scatterers = usize::MAX);
    is("nominal_delay_s", &|s| s.nominal_delay_s = vec![0.0, 0.0, f64::NAN, 0.0]);
    is("share", &|s| s.sources[0].share = -1.0);
    is("the sum of all shares", &|s| s.sources[0].share = 0.0);
    is("position_m", &|s| s.sources[0].position_m.x = f64::NAN);
    is("pulse.damping", &|s| s.sources[0].pulse.damping = 0.0);
    is("frequency_hz of a carrier", &|s| {
        s.carriers = vec![CarrierSetting { frequency_hz: 3e9, level_db: 0.0, width_hz: 0.0 }];
    });
    for band_hz in [(300e6, 2.6e9), (0.0, 1e9), (1e9, 1e9), (f64::NAN, 1e9), (300e6, f64::INFINITY)] {
        assert!(matches!(refused(&|s| s.band_hz = band_hz), SimError::Band { .. }), "{band_hz:?}");
    }
    assert!(matches!(refused(&|s| s.recorder.sample_count = 4), SimError::SampleCount { found: 4, .. }));
    assert!(matches!(
        refused(&|s| s.nominal_delay_s = vec![0.0, 0.0, 210e-9, 0.0]),
        SimError::RecordTooShort { source_index: 0, .. }
    ));
    assert!(matches!(refused(&|s| s.trigger_jitter_s = 200e-9), SimError::RecordTooShort { .. }));
    assert!(matches!(
        refused(&|s| s.sources[0].position_m = Vector3::new(12.0, 0.0, 2.05)),
        SimError::TooNear { source_index: 0, .. }
    ));
    let mut housed = site();
    housed.obstacles.push(Obstacle {
        name: "house".into(),
        footprint_m: [(7.0, 5.0), (9.0, 5.0), (9.0, 7.0), (7.0, 7.0)]
            .map(|(x, y)| Vector2::new(x, y))
            .to_vec(),
        base_m: 0.0,
        top_m: 6.0,
    });
    let error = Visit::new(&housed, settings()).unwrap_err();
    assert_eq!(error, SimError::SourceInside { source_index: 0, obstacle: "house".into() });
    assert!(error.to_string().contains("house"));
}

#[test]
fn the_narrowest_and_oddest_visits_stay_finite() {
    let odd = VisitSettings {
        band_hz: (1e6, 2.49e9),
        recorder: RecorderSetting {
            sample_count: 20_001,
            bits: 16,
            bandwidth_hz: 50e6,
            ..RecorderSetting::default()
        },
        mean_interval_s: 0.0,
        sources: vec![SourceSetting {
            pulse: PulseSetting { damping: 3.0, shape_spread: 0.5, ..PulseSetting::default() },
            ..source()
        }],
        ..settings()
    };
    let visit = Visit::new(&site(), odd).unwrap();
    for wave in visit.worker().noiseless(0) {
        assert_eq!(wave.len(), 20_001);
        assert!(energy(&wave).is_finite() && energy(&wave) > 0.0);
    }
    // One antenna is enough to simulate.
    let alone = site_of(&[[0.0, 0.0, 2.0]]);
    assert_eq!(Visit::new(&alone, settings()).unwrap().capture(0).channel_count(), 1);
}
