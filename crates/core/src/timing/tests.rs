//! Timing of captures whose truth is known: pulses of random shape, delayed exactly, in white noise.

use nalgebra::DMatrix;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};
use realfft::num_complex::Complex64;
use std::f64::consts::TAU;

use crate::bandpass::ButterworthBandPass;
use crate::spectrum::Transform;
use crate::{Capture, ChannelTimes, Method, Timing, TimingError, TimingOptions, summarise};

const RATE_HZ: f64 = 5e9;
const BAND_HZ: (f64, f64) = (300e6, 1500e6);
const COUNT: usize = 1500;

/// One capture and when its pulse really arrived, in samples.
struct Shot {
    channels: Vec<Vec<f64>>,
    truth: Vec<f64>,
    noise_rms: f64,
}

impl Shot {
    fn capture(&self) -> Capture {
        scaled(&self.channels, 1.0, 0.0)
    }
}

fn scaled(channels: &[Vec<f64>], scale: f64, offset: f64) -> Capture {
    let samples = channels.iter().map(|x| x.iter().map(|v| (v * scale + offset) as f32).collect()).collect();
    Capture::new(RATE_HZ, samples).unwrap()
}

/// Makes shots: white noise under a decaying envelope, through a causal band-pass, delayed by an exact phase.
struct Range {
    rng: ChaCha8Rng,
    timing_filter: ButterworthBandPass,
    antenna: ButterworthBandPass,
    noise_gain: f64,
    transform: Transform,
}

impl Range {
    fn new(seed: u64) -> Self {
        let timing_filter = ButterworthBandPass::design(2, BAND_HZ.0, BAND_HZ.1, RATE_HZ).unwrap();
        Self {
            rng: ChaCha8Rng::seed_from_u64(seed),
            noise_gain: timing_filter.impulse_response(1000).iter().map(|h| h * h).sum(),
            timing_filter,
            antenna: ButterworthBandPass::design(3, 250e6, 1700e6, RATE_HZ).unwrap(),
            transform: Transform::plan(2048),
        }
    }

    fn normal(&mut self) -> f64 {
        StandardNormal.sample(&mut self.rng)
    }

    /// A pulse at `arrivals`, of amplitude one times `gains`, each followed by an echo of that share 3 to 4 ns later;
    /// noise so that the mean peak over noise rms after the timing band-pass is `snr_db`.
    fn shot(&mut self, snr_db: f64, arrivals: &[f64], gains: &[f64], echo: f64) -> Shot {
        let length = self.transform.length();
        let (decay, rise) = (self.rng.random_range(2.5..7.5), self.rng.random_range(0.5..2.0));
        let pulse: Vec<f64> = (0..120)
            .map(f64::from)
            .map(|n| self.normal() * (-n / decay).exp() * (1.0 - (-n / rise).exp()))
            .collect();
        let mut shape = vec![Complex64::ZERO; self.transform.bins()];
        self.transform.forward(&pulse, &mut shape);
        let (mut channels, mut peaks) = (Vec::new(), 0.0);
        for (&arrival, &gain) in arrivals.iter().zip(gains) {
            let late = self.rng.random_range(15.0..20.0);
            let mut spectrum = shape.clone();
            for (k, bin) in spectrum.iter_mut().enumerate() {
                let cycles = k as f64 / length as f64;
                *bin *= self.antenna.response(cycles * RATE_HZ)
                    * Complex64::from_polar(gain, -TAU * cycles * arrival);
                *bin *= 1.0 + Complex64::from_polar(echo, -TAU * cycles * late);
            }
            let samples = self.transform.inverse(&mut spectrum)[..COUNT].to_vec();
            let mut filtered = Vec::new();
            self.timing_filter.filter_forward(&samples, &mut filtered);
            peaks += filtered.iter().fold(0.0, |peak: f64, x| peak.max(x.abs()));
            channels.push(samples);
        }
        let noise_rms = peaks / arrivals.len() as f64 / 10_f64.powf(snr_db / 20.0);
        let white = noise_rms / self.noise_gain.sqrt();
        for x in channels.iter_mut().flatten() {
            *x += white * self.normal();
        }
        Shot { channels, truth: arrivals.to_vec(), noise_rms }
    }

    /// A shot on four channels with random delays of up to 12 ns and either polarity.
    fn random_shot(&mut self, snr_db: f64, echo: f64) -> Shot {
        let base = 500.0 + self.rng.random_range(0.0..1.0);
        let arrivals: Vec<f64> = (0..4).map(|_| base + self.rng.random_range(-60.0..60.0)).collect();
        let gains: Vec<f64> = (0..4).map(|_| if self.rng.random_bool(0.3) { -1.0 } else { 1.0 }).collect();
        self.shot(snr_db, &arrivals, &gains, echo)
    }
}

fn options(method: Method) -> TimingOptions {
    TimingOptions { method, band_hz: Some(BAND_HZ), ..TimingOptions::default() }
}

/// Options for random shots: the greatest delay of a site 8 m across.
fn limited(method: Method) -> TimingOptions {
    TimingOptions { max_delay_s: Some(DMatrix::from_element(4, 4, 125.0 / RATE_HZ)), ..options(method) }
}

fn plan(options: &TimingOptions, channels: usize) -> Timing {
    Timing::plan(options, RATE_HZ, COUNT, channels).unwrap()
}

const METHODS: [Method; 5] =
    [Method::Gated, Method::Correlation, Method::Energy, Method::Akaike, Method::Threshold];

/// Errors of all pair delays, in samples, each with its stated sigma.
fn pair_errors(shot: &Shot, times: &ChannelTimes) -> Vec<(f64, f64)> {
    let received: Vec<usize> = times.received().collect();
    let mut errors = Vec::new();
    for (k, &i) in received.iter().enumerate() {
        for &j in &received[k + 1..] {
            let arrival = |c: usize| times.channels[c].arrival_s.unwrap() * RATE_HZ;
            let s = &times.covariance_s2;
            let variance = s[(i, i)] + s[(j, j)] - 2.0 * s[(i, j)];
            let error = (arrival(j) - arrival(i)) - (shot.truth[j] - shot.truth[i]);
            errors.push((error, variance.sqrt() * RATE_HZ));
        }
    }
    errors
}

fn rms(values: impl Iterator<Item = f64>) -> f64 {
    let (sum, count) = values.fold((0.0, 0), |(sum, count), x| (sum + x * x, count + 1));
    (sum / f64::from(count)).sqrt()
}

fn errors_of(options: &TimingOptions, seed: u64, trials: usize, snr_db: f64, echo: f64) -> Vec<(f64, f64)> {
    let (mut range, mut timing) = (Range::new(seed), plan(options, 4));
    (0..trials)
        .flat_map(|_| {
            let shot = range.random_shot(snr_db, echo);
            pair_errors(&shot, &timing.process(&shot.capture()).unwrap())
        })
        .collect()
}

/// Standard deviation of error over stated sigma for every SNR, told together where one is outside `bounds`.
fn check_pulls(method: Method, seed: u64, cases: &[(f64, usize)], bounds: std::ops::Range<f64>) {
    let mut told = String::new();
    let mut good = true;
    for &(snr_db, trials) in cases {
        let errors = errors_of(&limited(method), seed, trials, snr_db, 0.0);
        let pull = rms(errors.iter().map(|(error, sigma)| error / sigma));
        good &= bounds.contains(&pull) && errors.len() > 300;
        told += &format!("{method:?} {snr_db} dB: pull {pull:.3} of {} delays\n", errors.len());
    }
    assert!(good, "expected {bounds:?}\n{told}");
}

#[test]
fn sigmas_of_gated_delays_are_true() {
    check_pulls(Method::Gated, 1, &[(20.0, 1500), (30.0, 500), (45.0, 300)], 0.85..1.15);
}

#[test]
fn sigmas_of_gated_delays_grow_where_a_cycle_may_slip() {
    // A few slips of many sigmas make up half of the variance here, so what is measured scatters more.
    check_pulls(Method::Gated, 1, &[(12.0, 2500), (13.0, 1500), (15.0, 1500), (17.5, 1500)], 0.75..1.25);
}

#[test]
fn sigmas_of_energy_onsets_are_true() {
    check_pulls(
        Method::Energy,
        2,
        &[(16.0, 1000), (20.0, 1000), (25.0, 1000), (30.0, 1000), (45.0, 1000)],
        0.8..1.2,
    );
}

#[test]
fn sigmas_of_akaike_onsets_are_true() {
    check_pulls(
        Method::Akaike,
        3,
        &[(16.0, 1000), (20.0, 1000), (25.0, 1000), (30.0, 1000), (45.0, 1000)],
        0.75..1.25,
    );
}

#[test]
fn sigmas_of_threshold_onsets_are_true() {
    check_pulls(
        Method::Threshold,
        4,
        &[(16.0, 1000), (20.0, 1000), (25.0, 1000), (30.0, 1000), (45.0, 1000)],
        0.8..1.2,
    );
}

#[test]
fn correlation_of_whole_records_does_not_lie() {
    check_pulls(
        Method::Correlation,
        5,
        &[(17.0, 300), (20.0, 300), (25.0, 300), (30.0, 300), (45.0, 300)],
        0.4..1.2,
    );
}

#[test]
fn an_echo_three_nanoseconds_late_stays_outside_the_gate() {
    for echo in [0.7, -0.7] {
        let errors = errors_of(&limited(Method::Gated), 12, 500, 25.0, echo);
        let slips = errors.iter().filter(|(error, _)| error.abs() > 1.25).count();
        assert!(slips * 100 < errors.len(), "{slips} of {}", errors.len());
        let kept = rms(errors.iter().map(|(error, _)| *error).filter(|error| error.abs() <= 1.25));
        let clean = errors_of(&limited(Method::Gated), 12, 500, 25.0, 0.0);
        let alone = rms(clean.iter().map(|(error, _)| *error).filter(|error| error.abs() <= 1.25));
        assert!(kept < 1.15 * alone, "{kept} with the echo, {alone} without");
    }
}

#[test]
fn a_carrier_ten_decibels_over_the_noise_costs_little() {
    let (mut range, mut timing) = (Range::new(13), plan(&limited(Method::Gated), 4));
    let (mut clean, mut cut, mut found) = (Vec::new(), Vec::new(), 0);
    for _ in 0..400 {
        let mut shot = range.random_shot(25.0, 0.0);
        clean.extend(pair_errors(&shot, &timing.process(&shot.capture()).unwrap()));
        let frequency = range.rng.random_range(350e6..1400e6);
        let amplitude = shot.noise_rms * 20_f64.sqrt();
        for x in &mut shot.channels {
            let phase = range.rng.random_range(0.0..TAU);
            for (n, x) in x.iter_mut().enumerate() {
                *x += amplitude * (TAU * frequency / RATE_HZ * n as f64 + phase).cos();
            }
        }
        let times = timing.process(&shot.capture()).unwrap();
        found += times.channels.iter().filter(|channel| channel.flags.carrier).count();
        cut.extend(pair_errors(&shot, &times));
    }
    assert_eq!(found, 1600);
    assert_eq!(cut.len(), clean.len());
    let of = |errors: &[(f64, f64)]| rms(errors.iter().map(|e| e.0).filter(|e| e.abs() < 1.25));
    assert!(of(&cut) < 1.2 * of(&clean), "{} against {}", of(&cut), of(&clean));
}

#[test]
fn a_fraction_of_a_sample_moves_the_answer_by_that_fraction() {
    for (seed, method, tolerance) in [(14, Method::Gated, 0.005), (15, Method::Correlation, 0.005)] {
        let (mut range, mut timing) = (Range::new(seed), plan(&options(method), 2));
        for k in 0..20 {
            let delay = 30.0 + f64::from(k) * 0.05;
            let shot = range.shot(80.0, &[500.0, 500.0 + delay], &[1.0, -0.6], 0.0);
            let times = timing.process(&shot.capture()).unwrap();
            let (error, _) = pair_errors(&shot, &times)[0];
            assert!(error.abs() < tolerance, "{method:?}: {error} samples at {delay}");
        }
    }
}

#[test]
fn neither_scale_nor_offset_moves_a_time() {
    for method in METHODS {
        let mut timing = plan(&limited(method), 4);
        let shot = Range::new(16).random_shot(25.0, 0.3);
        let plain = timing.process(&shot.capture()).unwrap();
        for (scale, offset) in [(1e-6, 0.0), (1e6, 0.0), (-1.0, 0.0), (1.0, 0.7)] {
            let changed = timing.process(&scaled(&shot.channels, scale, offset)).unwrap();
            for (a, b) in plain.channels.iter().zip(&changed.channels) {
                let difference = (a.arrival_s.unwrap() - b.arrival_s.unwrap()).abs() * RATE_HZ;
                assert!(difference < 1e-3, "{method:?} {scale} {offset}: {difference} samples");
            }
        }
    }
}

#[test]
fn a_plan_used_before_gives_what_a_fresh_one_gives() {
    for method in METHODS {
        let mut range = Range::new(17);
        let (first, second) =
            (range.random_shot(15.0, 0.0).capture(), range.random_shot(25.0, 0.5).capture());
        let mut used = plan(&options(method), 4);
        used.process(&first).unwrap();
        assert_eq!(used.process(&second), plan(&options(method), 4).process(&second));
    }
}

#[test]
fn noise_alone_has_no_arrivals_and_a_silent_channel_none_of_its_own() {
    let mut range = Range::new(18);
    for method in METHODS {
        let mut timing = plan(&options(method), 4);
        let mut shot = range.random_shot(25.0, 0.0);
        for x in &mut shot.channels[2] {
            *x = shot.noise_rms * range.rng.random_range(-1.0..1.0);
        }
        shot.channels[3].fill(0.25);
        let times = timing.process(&shot.capture()).unwrap();
        assert_eq!(times.received().collect::<Vec<_>>(), [0, 1], "{method:?}");
        assert!(times.channels[3].flags.dead && times.channels[3].snr_db.is_none());
        assert!(times.channels[2].snr_db.is_some_and(|db| db < 15.0));
        assert!(
            times
                .covariance_s2
                .row(2)
                .iter()
                .chain(times.covariance_s2.row(3).iter())
                .all(|v| v.abs() <= 0.0)
        );
    }
}

#[test]
fn a_missing_or_earlier_pulse_is_looked_for_only_where_it_may_be() {
    let mut range = Range::new(19);
    let mut shot = range.shot(30.0, &[500.0, 540.0, 480.0, 520.0], &[1.0; 4], 0.0);
    // A disturbance on one channel alone, long before.
    for (n, x) in shot.channels[1][100..130].iter_mut().enumerate() {
        *x += shot.noise_rms * 20.0 * (n as f64 * 1.1).sin();
    }
    let unlimited = plan(&options(Method::Gated), 4).process(&shot.capture()).unwrap();
    assert!(unlimited.channels[1].arrival_s.unwrap() * RATE_HZ < 200.0);
    let times = plan(&limited(Method::Gated), 4).process(&shot.capture()).unwrap();
    assert!(pair_errors(&shot, &times).iter().all(|(error, _)| error.abs() < 0.5));
}

#[test]
fn clipping_is_flagged_and_timed() {
    let mut shot = Range::new(20).shot(30.0, &[500.0, 540.0, 480.0, 520.0], &[1.0; 4], 0.0);
    let peak = shot.channels[0].iter().fold(0.0, |peak: f64, x| peak.max(x.abs()));
    for x in &mut shot.channels[0] {
        *x = x.clamp(-0.5 * peak, 0.5 * peak);
    }
    let ends = (-0.5 * peak as f32, 0.5 * peak as f32);
    let range = vec![ends, (-1e9, 1e9), (-1e9, 1e9), (-1e9, 1e9)];
    let times = plan(&limited(Method::Gated), 4).process(&shot.capture().with_range(range).unwrap()).unwrap();
    assert!(times.channels[0].flags.clipped && !times.channels[1].flags.clipped);
    assert!(pair_errors(&shot, &times).iter().all(|(error, _)| error.abs() < 1.0));
}

#[test]
fn pulses_at_the_edge_and_odd_records_give_numbers_or_nothing() {
    let mut range = Range::new(21);
    for method in METHODS {
        let mut timing = plan(&options(method), 2);
        for at in [-5.0, 0.0, 3.0, 1480.0, 1495.0, 1499.0] {
            let shot = range.shot(30.0, &[at, 700.0], &[1.0, 1.0], 0.0);
            let times = timing.process(&shot.capture()).unwrap();
            assert!(times.covariance_s2.iter().all(|v| v.is_finite()));
            assert!(times.channels.iter().filter_map(|c| c.arrival_s).all(f64::is_finite));
        }
        for samples in [vec![0.0; COUNT], vec![1e30; COUNT], (0..COUNT).map(|n| n as f32).collect()] {
            let mut spike = vec![0.0; COUNT];
            spike[COUNT / 2] = 1e30;
            let times = timing.process(&Capture::new(RATE_HZ, vec![samples, spike]).unwrap()).unwrap();
            assert!(times.covariance_s2.iter().all(|v| v.is_finite()));
        }
    }
}

#[test]
fn what_cannot_be_planned_or_processed_is_told() {
    let plan =
        |options: &TimingOptions, rate, count, channels| Timing::plan(options, rate, count, channels).err();
    let usual = options(Method::Gated);
    assert_eq!(plan(&usual, RATE_HZ, COUNT, 0), Some(TimingError::NoChannels));
    for count in 0..60 {
        assert!(matches!(plan(&usual, RATE_HZ, count, 2), Some(TimingError::TooShort { .. })));
    }
    assert!(matches!(plan(&usual, f64::NAN, COUNT, 2), Some(TimingError::SampleRate { .. })));
    assert!(matches!(plan(&usual, 1e9, COUNT, 2), Some(TimingError::BandPass(_))));
    let wrong = TimingOptions { max_delay_s: Some(DMatrix::zeros(3, 2)), ..usual.clone() };
    assert!(matches!(plan(&wrong, RATE_HZ, COUNT, 2), Some(TimingError::MaxDelayShape { .. })));
    let wrong = TimingOptions { max_delay_s: Some(DMatrix::from_element(2, 2, f64::NAN)), ..usual.clone() };
    assert!(matches!(plan(&wrong, RATE_HZ, COUNT, 2), Some(TimingError::MaxDelay { a: 1, b: 2, .. })));
    let wrong = TimingOptions { false_alarm: 0.0, ..usual.clone() };
    assert!(matches!(plan(&wrong, RATE_HZ, COUNT, 2), Some(TimingError::Option { name: "false_alarm", .. })));
    let mut timing = Timing::plan(&usual, RATE_HZ, COUNT, 2).unwrap();
    let other = Capture::new(RATE_HZ, vec![vec![0.0; 1499]; 2]).unwrap();
    assert!(matches!(timing.process(&other), Err(TimingError::Shape { found_samples: 1499, .. })));
}

#[test]
fn a_summary_needs_no_site() {
    let mut range = Range::new(22);
    let mut shot = range.random_shot(25.0, 0.0);
    shot.channels[3].fill(0.0);
    for (n, x) in shot.channels[1].iter_mut().enumerate() {
        *x += shot.noise_rms * 10.0 * (TAU * 944e6 / RATE_HZ * n as f64).cos();
    }
    let summary = summarise(&shot.capture(), &options(Method::Gated)).unwrap();
    assert!((summary[0].noise_rms / shot.noise_rms - 1.0).abs() < 0.2);
    assert!(
        summary[0].pulse && summary[0].carriers.is_empty() && (summary[0].snr_db.unwrap() - 25.0).abs() < 6.0
    );
    let carrier = summary[1].carriers[0];
    assert!((carrier.frequency_hz - 944e6).abs() < 1e6, "{carrier:?}");
    // 10 times the noise rms as an amplitude is 17 dB over it.
    assert!((carrier.level_db - 17.0).abs() < 4.0, "{carrier:?}");
    assert!(summary[3].dead && !summary[3].pulse && summary[3].snr_db.is_none());
}
