//! Delays, levels and echoes of the pulse before the recorder.

use approx::{assert_abs_diff_eq, assert_relative_eq};
use arcstead_sim::{RecorderSetting, SourceSetting, Visit, VisitSettings};
use arcstead_solver::nalgebra::{Vector2, Vector3};
use arcstead_solver::{Air, Obstacle};
use realfft::num_complex::Complex;

use crate::bay::{BIN_HZ, bare, energy, settings, site, site_of, source, spectrum};

/// By how much the delay from `a` to `b` differs from `expected_s`, in seconds: slope through zero of the phase that is
/// left of their cross-spectrum over 300 to 1500 MHz, weighted with its magnitude.
fn delay_off_s(a: &[f64], b: &[f64], expected_s: f64) -> f64 {
    let (mut slope, mut weight) = (0.0, 0.0);
    for (k, (a, b)) in spectrum(a).iter().zip(&spectrum(b)).enumerate().take(450).skip(90) {
        let omega = std::f64::consts::TAU * BIN_HZ * k as f64;
        let cross = a * b.conj() * Complex::from_polar(1.0, -omega * expected_s);
        slope += omega * cross.arg() * cross.norm();
        weight += omega * omega * cross.norm();
    }
    slope / weight
}

#[test]
fn delays_between_channels_are_exact() {
    let delayed = VisitSettings { nominal_delay_s: vec![52.1e-9, 48.33e-9, 50e-9, 61.7e-9], ..bare() };
    let visit = Visit::new(&site(), delayed).unwrap();
    for index in 0..5 {
        let waves = visit.worker().noiseless(index);
        for b in 1..4 {
            let expected_s = visit.truth().arrival_s(index, b) - visit.truth().arrival_s(index, 0);
            let way_m = |a: usize| (site().antennas[a].position_m - source().position_m).norm();
            let stated_s = [52.1e-9, 48.33e-9, 50e-9, 61.7e-9];
            let by_hand_s = (way_m(b) - way_m(0)) / Air::default().speed_m_per_s + stated_s[b] - stated_s[0];
            assert_abs_diff_eq!(expected_s, by_hand_s, epsilon = 1e-18);
            let off_s = delay_off_s(&waves[0], &waves[b], expected_s);
            assert!(off_s.abs() < 1e-15, "capture {index}, antenna {b}: {off_s} s");
        }
    }
}

#[test]
fn antennas_that_are_not_alike_keep_near_their_delay() {
    // The delay a correlation over the band would see, ripples of half a dB: well below the response sigma of 50 ps
    // that sites state for it.
    let mut sum_s2 = 0.0;
    let visits = 200;
    for seed in 0..visits {
        let visit = Visit::new(&site(), VisitSettings { ripple_db: 0.5, seed, ..bare() }).unwrap();
        let waves = visit.worker().noiseless(0);
        let expected_s = visit.truth().arrival_s(0, 1) - visit.truth().arrival_s(0, 0);
        sum_s2 += delay_off_s(&waves[0], &waves[1], expected_s).powi(2) / visits as f64;
    }
    let rms_s = sum_s2.sqrt();
    assert!(rms_s > 1e-13 && rms_s < 25e-12, "{rms_s}");
}

#[test]
fn amplitude_falls_with_distance() {
    let far = site_of(&[[10.0, 0.0, 2.0], [0.0, 20.0, 2.0], [-5.0, 0.0, 2.0]]);
    let here = VisitSettings { sources: vec![SourceSetting::at([0.0, 0.0, 2.0])], ..bare() };
    let visit = Visit::new(&far, here).unwrap();
    let waves = visit.worker().noiseless(0);
    // Energy does not depend on where the samples fall, but for what is above half the sample rate.
    let level = |a: usize| energy(&waves[a]).sqrt();
    assert_relative_eq!(level(0) / level(1), 2.0, max_relative = 1e-4);
    assert_relative_eq!(level(2) / level(0), 2.0, max_relative = 1e-4);
    let snr_db = &visit.truth().sources[0].snr_db;
    assert_abs_diff_eq!(snr_db[0], 20.0, epsilon = 1e-9);
    assert_abs_diff_eq!(snr_db[1], 20.0 - 20.0 * 2.0_f64.log10(), epsilon = 1e-9);
}

#[test]
fn nothing_comes_before_its_onset() {
    for recorder in [
        RecorderSetting::default(),
        RecorderSetting { bandwidth_hz: 500e6, ..RecorderSetting::default() },
        RecorderSetting { bandwidth_hz: 2.4e9, ..RecorderSetting::default() },
        RecorderSetting { sample_rate_hz: 10e9, sample_count: 3000, bandwidth_hz: 3e9, bits: 8 },
    ] {
        // Antennas with ripples, reflections and errors: none of them may bring anything early.
        let band_hz = (300e6, recorder.bandwidth_hz);
        let reflecting = VisitSettings { recorder, band_hz, ground_reflection: Some(-0.9), ..settings() };
        let visit = Visit::new(&site(), reflecting).unwrap();
        for index in 0..20 {
            for (a, wave) in visit.worker().noiseless(index).iter().enumerate() {
                let onset = (visit.truth().arrival_s(index, a) * recorder.sample_rate_hz).ceil() as usize;
                let early_db = 10.0 * (energy(&wave[..onset]) / energy(wave)).log10();
                assert!(early_db < -60.0, "{recorder:?}, capture {index}, antenna {a}: {early_db} dB");
                // And the pulse does come: most of it within 15 ns.
                let late = onset + (15e-9 * recorder.sample_rate_hz) as usize;
                assert!(energy(&wave[onset..late]) > 0.5 * energy(wave));
            }
        }
    }
}

#[test]
fn a_wall_makes_the_pulse_late_and_weak() {
    let mut site = site_of(&[[0.0, 0.0, 2.0], [30.0, 0.0, 2.0], [10.0, -10.0, 2.0]]);
    site.obstacles.push(Obstacle {
        name: "wall".into(),
        footprint_m: [(20.0, -5.0), (20.01, -5.0), (20.01, 5.0), (20.0, 5.0)]
            .map(|(x, y)| Vector2::new(x, y))
            .to_vec(),
        base_m: 0.0,
        top_m: 5.0,
    });
    let here = VisitSettings { sources: vec![SourceSetting::at([10.0, 0.0, 2.0])], ..bare() };
    let visit = Visit::new(&site, here).unwrap();
    let truth = &visit.truth().sources[0];
    assert_eq!(truth.clear, [true, false, true]);
    assert!((truth.way_m[1] - 2.0 * 10.0_f64.hypot(3.0)).abs() < 0.01);
    assert!(truth.loss_db[1] > 15.0);
    let waves = visit.worker().noiseless(0);
    let found_db = 10.0 * (energy(&waves[1]) / energy(&waves[0])).log10();
    let expected_db = -truth.loss_db[1] - 20.0 * (truth.way_m[1] / 10.0).log10();
    assert_abs_diff_eq!(found_db, expected_db, epsilon = 0.01);
}

#[test]
fn the_ground_adds_its_image() {
    let still = VisitSettings { trigger_jitter_s: 0.0, ..bare() };
    let visit = |coefficient: f64| {
        Visit::new(&site(), VisitSettings { ground_reflection: Some(coefficient), ..still.clone() }).unwrap()
    };
    let (without, with) = (visit(0.0).worker().noiseless(0), visit(-0.6).worker().noiseless(0));
    for a in 0..4 {
        let (direct, both) = (spectrum(&without[a]), spectrum(&with[a]));
        let to_m = site().antennas[a].position_m;
        let from_m = source().position_m;
        let direct_m = (to_m - from_m).norm();
        let image_m = (to_m - Vector3::new(from_m.x, from_m.y, -from_m.z)).norm();
        let late_s = (image_m - direct_m) / Air::default().speed_m_per_s;
        for k in (100..440).step_by(20) {
            let omega = std::f64::consts::TAU * BIN_HZ * k as f64;
            let expected = 1.0 + Complex::from_polar(-0.6 * direct_m / image_m, -omega * late_s);
            assert!((both[k] / direct[k] - expected).norm() < 1e-4, "antenna {a}, bin {k}");
        }
    }
    let drawn =
        |seed| Visit::new(&site(), VisitSettings { seed, ground_reflection: None, ..still.clone() }).unwrap();
    let coefficients: Vec<f64> = (0..40).map(|seed| drawn(seed).truth().ground_reflection).collect();
    assert!(coefficients.iter().all(|c| c.abs() <= 0.5));
    assert!(coefficients.iter().any(|c| *c < -0.1) && coefficients.iter().any(|c| *c > 0.1));
}

#[test]
fn scatterers_add_weaker_later_pulses() {
    let still = VisitSettings { trigger_jitter_s: 0.0, ..bare() };
    let scattered = Visit::new(&site(), VisitSettings { scatterers: 4, ..still.clone() }).unwrap();
    let places = &scattered.truth().scatterers;
    assert_eq!(places.len(), 4);
    // Another number of scatterers draws another shot into the schedule, so the two are compared per channel by the
    // ratio to channel 0 of the same visit.
    let (with, without) =
        (scattered.worker().noiseless(0), Visit::new(&site(), still).unwrap().worker().noiseless(0));
    let ratio = |waves: &[Vec<f64>], a: usize, k: usize| spectrum(&waves[a])[k] / spectrum(&waves[0])[k];
    let factor = |a: usize, omega: f64| {
        let (from_m, to_m) = (source().position_m, site().antennas[a].position_m);
        let direct_m = (to_m - from_m).norm();
        let mut sum = Complex::new(1.0, 0.0);
        for scatterer in places {
            let legs_m = ((scatterer.position_m - from_m).norm(), (to_m - scatterer.position_m).norm());
            let late_s = (legs_m.0 + legs_m.1 - direct_m) / Air::default().speed_m_per_s;
            let share = (scatterer.strength_m / (legs_m.0 * legs_m.1) * direct_m).clamp(-0.5, 0.5);
            sum += Complex::from_polar(share, -omega * late_s);
        }
        sum
    };
    for a in 1..4 {
        for k in (100..440).step_by(85) {
            let omega = std::f64::consts::TAU * BIN_HZ * k as f64;
            let expected = factor(a, omega) / factor(0, omega);
            let found = ratio(&with, a, k) / ratio(&without, a, k);
            assert!((found - expected).norm() < 1e-3, "antenna {a}, bin {k}: {found} {expected}");
        }
    }
}
