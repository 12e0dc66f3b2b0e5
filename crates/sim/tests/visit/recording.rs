//! Level, noise, carriers, steps and clipping of what is recorded.

use approx::{assert_abs_diff_eq, assert_relative_eq};
use arcstead_sim::{CarrierSetting, PulseSetting, RecorderSetting, SourceSetting, Visit, VisitSettings};
use realfft::RealFftPlanner;
use realfft::num_complex::Complex;

use crate::bay::{BIN_HZ, bare, energy, peak, settings, site, site_of, source, spectrum};

/// Mean over captures and channels of 20 log10 of peak over noise rms, after a filter with this response.
fn measured_snr_db(visit: &Visit, filter: &dyn Fn(f64) -> Complex<f64>) -> f64 {
    let plan = RealFftPlanner::new().plan_fft_inverse(1500);
    let mut levels_db = Vec::new();
    for index in 0..visit.capture_count() {
        for samples in visit.capture(index).channels() {
            let samples: Vec<f64> = samples.iter().map(|&v| f64::from(v)).collect();
            let mut band = spectrum(&samples);
            for (k, value) in band.iter_mut().enumerate() {
                *value *= filter(BIN_HZ * k as f64);
            }
            band[0].im = 0.0;
            band[750].im = 0.0;
            let mut wave = vec![0.0; 1500];
            plan.process(&mut band, &mut wave).expect("no imaginary part at either end");
            // The jitter keeps every pulse beyond sample 470.
            let noise = (energy(&wave[20..420]) / 400.0).sqrt();
            levels_db.push(20.0 * (peak(&wave) / noise).log10());
        }
    }
    levels_db.iter().sum::<f64>() / levels_db.len() as f64
}

#[test]
fn level_is_the_stated_one() {
    // Antennas 10 m away, shots of median level and varying shape.
    let round = site_of(&[[10.0, 0.0, 2.0], [0.0, 10.0, 2.0], [-10.0, 0.0, 2.0]]);
    let slow = PulseSetting { oscillation_share: 0.0, rise_s: 0.8e-9, ..PulseSetting::default() };
    for pulse in [PulseSetting::default(), slow] {
        let shots = SourceSetting {
            level_spread_db: 0.0,
            snr_at_10m_db: 40.0,
            pulse,
            ..SourceSetting::at([0.0, 0.0, 2.0])
        };
        let spread = VisitSettings {
            sources: vec![shots],
            gain_spread_db: 3.0,
            captures: 60,
            recorder: RecorderSetting { bits: 16, ..RecorderSetting::default() },
            ..bare()
        };
        let visit = Visit::new(&round, spread).unwrap();
        // The filter that defines the level: a causal Butterworth high-pass and low-pass of order 2.
        let butterworth = |f: f64| {
            let ring = |edge: f64| Complex::new(edge * edge - f * f, 2.0_f64.sqrt() * edge * f);
            Complex::from(-f * f) / ring(300e6) * (1500e6 * 1500e6 / ring(1500e6))
        };
        assert_abs_diff_eq!(measured_snr_db(&visit, &butterworth), 40.0, epsilon = 0.3);
        // Another band-pass of the same band, a wall without phase, tells another level, but not by much.
        let wall = |f: f64| Complex::from(if (300e6..=1500e6).contains(&f) { 1.0 } else { 0.0 });
        assert_abs_diff_eq!(measured_snr_db(&visit, &wall), 40.0, epsilon = 2.0);
    }
}

#[test]
fn noise_is_white_and_of_the_stated_rms() {
    let silent = VisitSettings {
        sources: vec![SourceSetting { snr_at_10m_db: -60.0, ..source() }],
        recorder: RecorderSetting { bits: 16, ..RecorderSetting::default() },
        ..bare()
    };
    let visit = Visit::new(&site(), silent).unwrap();
    let samples: Vec<f64> = (0..20)
        .flat_map(|k| visit.capture(k).channels().flatten().map(|&v| f64::from(v)).collect::<Vec<_>>())
        .collect();
    let n = samples.len() as f64;
    let variance = energy(&samples) / n;
    assert_relative_eq!(variance, visit.truth().noise_rms_v.powi(2), max_relative = 4.9 * (2.0 / n).sqrt());
    for lag in [1, 2, 5, 1500] {
        let covariance = samples.windows(lag + 1).map(|w| w[0] * w[lag]).sum::<f64>() / n;
        assert!((covariance / variance).abs() < 4.9 / n.sqrt(), "lag {lag}");
    }
}

#[test]
fn recorder_steps_and_clips() {
    for bits in [8, 12, 16] {
        let strong = VisitSettings {
            sources: vec![SourceSetting { snr_at_10m_db: 40.0, level_spread_db: 8.0, ..source() }],
            captures: 60,
            recorder: RecorderSetting { bits, ..RecorderSetting::default() },
            ..settings()
        };
        let visit = Visit::new(&site(), strong).unwrap();
        let (mut clipped, mut clean) = (0, 0);
        for k in 0..60 {
            let capture = visit.capture(k);
            let noiseless = visit.worker().noiseless(k);
            for (a, samples) in capture.channels().enumerate() {
                let (low, high) = capture.range(a).unwrap();
                let step = f64::from(high - low) / f64::from((1_u32 << bits) - 1);
                for &v in samples {
                    assert!(low <= v && v <= high);
                    let steps = f64::from(v - low) / step;
                    assert!((steps - steps.round()).abs() < 0.02, "{bits} bits: {v} is {steps} steps up");
                }
                let at_an_end = samples.iter().any(|&v| v <= low || v >= high);
                let full_scale_v = visit.truth().full_scale_v[a];
                // Noise is a hundredth of the typical peak here: it decides only near the end itself.
                if peak(&noiseless[a]) > 1.1 * full_scale_v {
                    assert!(at_an_end, "capture {k} antenna {a}");
                    clipped += 1;
                } else if peak(&noiseless[a]) < 0.9 * full_scale_v {
                    assert!(!at_an_end, "capture {k} antenna {a}");
                    clean += 1;
                }
            }
        }
        assert!(clipped > 20 && clean > 60, "{clipped} clipped, {clean} not");
    }
}

#[test]
fn typical_peak_is_at_sixty_per_cent() {
    let alike = PulseSetting { shape_spread: 0.0, ..PulseSetting::default() };
    let loud = SourceSetting { snr_at_10m_db: 40.0, level_spread_db: 0.0, pulse: alike, ..source() };
    let visit = Visit::new(&site(), VisitSettings { sources: vec![loud], ..settings() }).unwrap();
    for (a, wave) in visit.worker().noiseless(0).iter().enumerate() {
        // Where the samples fall between the crests moves the peak of the samples.
        assert_relative_eq!(peak(wave) / visit.truth().full_scale_v[a], 0.6, max_relative = 0.2);
    }
}

#[test]
fn carriers_stand_out_of_the_noise() {
    let carrier = CarrierSetting { frequency_hz: 796e6, level_db: 20.0, width_hz: 0.0 };
    let disturbed = VisitSettings {
        sources: vec![SourceSetting { snr_at_10m_db: -60.0, ..source() }],
        carriers: vec![carrier],
        ..bare()
    };
    let visit = Visit::new(&site(), disturbed).unwrap();
    for samples in visit.capture(0).channels() {
        let samples: Vec<f64> = samples.iter().map(|&v| f64::from(v)).collect();
        let rms = (energy(&samples) / 1500.0).sqrt() / visit.truth().noise_rms_v;
        // A line of amplitude 10 has an rms of 7.07, its slow modulation of 30 % moves it by that at most.
        assert!((0.68 * 7.07..1.33 * 7.07).contains(&rms), "{rms}");
        assert!(peak(&samples) < visit.truth().full_scale_v[0], "an operator leaves room for carriers");
    }
}
