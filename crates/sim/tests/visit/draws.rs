//! What is drawn: repeatable, and distributed as stated.

use approx::{assert_abs_diff_eq, assert_relative_eq};
use arcstead_sim::{
    CarrierSetting, SimError, SourceSetting, SystematicErrors, Visit, VisitSettings, draw_arrivals,
};
use arcstead_solver::nalgebra::Vector3;
use arcstead_solver::{Air, PositionSigma};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;

use crate::bay::{bare, settings, site, source};

#[test]
fn same_seed_same_bytes_in_any_order_and_thread() {
    let disturbed = VisitSettings { carriers: CarrierSetting::usual(10.0), ..settings() };
    let visit = Visit::new(&site(), disturbed.clone()).unwrap();
    let mut worker = visit.worker();
    let forward: Vec<_> = (0..20).map(|k| worker.capture(k)).collect();
    for k in (0..20).rev() {
        assert_eq!(worker.capture(k), forward[k], "a used worker, backwards");
    }
    std::thread::scope(|scope| {
        let other = scope.spawn(|| Visit::new(&site(), disturbed.clone()).unwrap().capture(7));
        assert_eq!(other.join().unwrap(), forward[7]);
    });
    // More captures do not change the first ones.
    let longer = Visit::new(&site(), VisitSettings { captures: 30, ..disturbed }).unwrap();
    assert_eq!(longer.capture(19), forward[19]);
    assert_ne!(forward[0], forward[1]);
    let other = Visit::new(&site(), VisitSettings { seed: 43, ..settings() }).unwrap();
    assert_ne!(other.truth().errors, visit.truth().errors);
    assert_ne!(other.capture(0), forward[0]);
}

#[test]
fn errors_have_the_sigmas_of_the_site() {
    let mut site = site();
    site.antennas[1].position_sigma = PositionSigma::PerAxis(Vector3::new(0.01, 0.05, 0.2));
    site.antennas[2].delay_sigma_s = 4e-10;
    site.antennas[3].response_sigma_s = 2e-10;
    let visits = 1500;
    let mut sums = [0.0; 6];
    for seed in 0..visits {
        let two = VisitSettings { sources: vec![source(), source()], captures: 1, seed, ..settings() };
        let visit = Visit::new(&site, two).unwrap();
        let errors = &visit.truth().errors;
        let values = [
            errors.delay_error_s[0] / 1e-10,
            errors.delay_error_s[2] / 4e-10,
            errors.survey_error_m[0].y / 0.03,
            errors.survey_error_m[1].z / 0.2,
            errors.response_error_s[1][3] / 2e-10,
            (errors.response_error_s[0][0] - errors.response_error_s[1][0]) / (2.0_f64.sqrt() * 5e-11),
        ];
        for (sum, value) in sums.iter_mut().zip(values) {
            *sum += value * value;
        }
        let moved_m = visit.truth().antenna_position_m[1] - site.antennas[1].position_m;
        assert!((moved_m - errors.survey_error_m[1]).norm() < 1e-12);
    }
    // Relative standard error of a variance is sqrt(2/n): 3.7 %; 15 % of sigma would be 30 % of it.
    let visits = visits as f64;
    for sum in sums {
        assert_abs_diff_eq!(sum / visits, 1.0, epsilon = 4.9 * (2.0 / visits).sqrt());
    }
    let perfect = Visit::new(&site, VisitSettings { draw_errors: false, ..settings() }).unwrap();
    assert_eq!(perfect.truth().errors, SystematicErrors::none(1, 4));
}

#[test]
fn captures_are_shared_out_as_stated() {
    let captures = 20_000;
    let shared = VisitSettings {
        sources: [0.5, 0.0, 1.5].map(|share| SourceSetting { share, ..source() }).to_vec(),
        captures,
        mains_frequency_hz: Some(50.0),
        mean_interval_s: 0.01,
        ..bare()
    };
    let visit = Visit::new(&site(), shared).unwrap();
    let truth = visit.truth();
    let n = captures as f64;
    let count = |of: &dyn Fn(&arcstead_sim::TrueCapture) -> bool| {
        truth.captures.iter().filter(|c| of(c)).count() as f64
    };
    assert_abs_diff_eq!(count(&|c| c.source == 0) / n, 0.25, epsilon = 4.9 * (0.25 * 0.75 / n).sqrt());
    assert_abs_diff_eq!(count(&|c| c.source == 1), 0.0);
    assert_abs_diff_eq!(count(&|c| c.positive) / n, 0.5, epsilon = 4.9 * (0.25 / n).sqrt());
    let spread = truth.captures.iter().map(|c| c.level_db.powi(2)).sum::<f64>() / n;
    assert_relative_eq!(spread, 9.0, max_relative = 4.9 * (2.0 / n).sqrt());
    assert!(truth.captures.windows(2).all(|pair| pair[0].emission_s < pair[1].emission_s));
    for capture in &truth.captures {
        // Within five deviations of 60 degrees, or of 240 when negative.
        let phase_deg = capture.emission_s * 50.0 % 1.0 * 360.0 - if capture.positive { 60.0 } else { 240.0 };
        let off_deg = (phase_deg + 180.0).rem_euclid(360.0) - 180.0;
        assert!(off_deg.abs() < 60.0, "{off_deg}");
        let first_s = capture.emission_in_record_s
            + truth.sources[capture.source].delay_s.iter().copied().fold(f64::INFINITY, f64::min);
        assert!((first_s - 100e-9).abs() <= 5e-9 * (1.0 + 1e-9));
    }
}

#[test]
fn arrivals_without_samples_agree_with_the_captures_truth() {
    let visit = Visit::new(&site(), settings()).unwrap();
    let truth = visit.truth();
    let times_s = truth.errors.arrivals(&site(), 0, &source().position_m).unwrap();
    for (a, time_s) in times_s.iter().enumerate() {
        assert_abs_diff_eq!(
            truth.captures[5].emission_in_record_s + time_s,
            truth.arrival_s(5, a),
            epsilon = 1e-18
        );
    }

    // Drawn anew each time: variance of delay, survey along the line, response and timing together.
    let mut rng = ChaCha8Rng::seed_from_u64(1);
    let (trials, sigma_s) = (4000, [1e-10, 2e-10, 5e-11, 0.0]);
    let exact_s = SystematicErrors::none(1, 4).arrivals(&site(), 0, &source().position_m).unwrap();
    let mut sums = [0.0; 4];
    for _ in 0..trials {
        let drawn = draw_arrivals(&site(), &source().position_m, &sigma_s, &mut rng).unwrap();
        for a in 0..4 {
            sums[a] += (drawn[a] - exact_s[a]).powi(2) / f64::from(trials);
        }
    }
    let speed = Air::default().speed_m_per_s;
    for a in 0..4 {
        let expected = 1e-20 + 25e-22 + (0.03 / speed).powi(2) + sigma_s[a].powi(2);
        assert_relative_eq!(sums[a], expected, max_relative = 4.9 * (2.0 / f64::from(trials)).sqrt());
    }
    let wrong = draw_arrivals(&site(), &source().position_m, &[1e-10; 3], &mut rng);
    assert_eq!(wrong, Err(SimError::TimingSigma { found: 3, expected: 4 }));
}
