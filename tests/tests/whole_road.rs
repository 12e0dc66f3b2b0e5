//! From simulated waveforms through timing, combining and solving: the covariance told is the one found, and no wrong
//! asset is named.
//!
//! The relay house of the demo site is taken away, so that every line is clear; the bench `whole_road` measures the site
//! as it is. Fixed seeds, bounds of 4.9 standard errors.

#![allow(clippy::unwrap_used, reason = "a test that unwraps fails with the line it stands on")]

use std::path::Path;

use arcstead::documents::{SourceResult, Statement};
use arcstead::formats::Recorded;
use arcstead::site::{MAIN_STANCE, Site};
use arcstead::{ArrivalOptions, CaptureTimer, LocateOptions, TimedVisit, Unwatched, locate};
use arcstead_sim::{RecorderSetting, SourceSetting, Visit, VisitSettings};
use arcstead_solver::nalgebra::{Matrix3, Vector3};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

const VISITS: u64 = 300;
const CAPTURES: usize = 10;

#[test]
fn errors_are_as_large_as_told_and_names_are_right() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).parent().unwrap().join("demo-sites/marl-bank/site.toml");
    let mut site = Site::read(&path).unwrap();
    site.geometry.obstacles.clear();
    let mut distances2 = Vec::new();
    let (mut named, mut wrong) = (0, 0);
    for seed in 0..VISITS {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        let asset = &site.geometry.assets[rng.random_range(0..site.geometry.assets.len())];
        let truth_m = asset.from_m.lerp(&asset.to_m, rng.random_range(0.0..1.0));
        let Some(source) = told(&site, truth_m, seed) else { continue };
        if source.verdict.statement == Statement::One {
            named += 1;
            wrong += u32::from(source.verdict.assets != [asset.name.clone()]);
        }
        let covariance = source.covariance_m2.unwrap();
        let inverse = Matrix3::from_fn(|i, j| covariance[i][j]).try_inverse().unwrap();
        let error = Vector3::from(source.position_m) - truth_m;
        distances2.push((error.transpose() * inverse * error)[0]);
    }
    assert!(distances2.len() > 250, "{} of {VISITS} visits gave a source", distances2.len());
    assert!(named > 200 && wrong == 0, "{wrong} wrong of {named} named");
    // Chi-square with 3 degrees: mean 3, variance 6. Sigmas wrong by 15 % move the mean to 2.3 or 4.2.
    let mean = distances2.iter().sum::<f64>() / distances2.len() as f64;
    let bound = 4.9 * (6.0 / distances2.len() as f64).sqrt();
    assert!((mean - 3.0).abs() < bound, "{mean}");
}

fn told(site: &Site, truth_m: Vector3<f64>, seed: u64) -> Option<SourceResult> {
    let settings = VisitSettings {
        sources: vec![SourceSetting { snr_at_10m_db: 26.0, ..SourceSetting::at(truth_m) }],
        captures: CAPTURES,
        seed,
        recorder: RecorderSetting { bits: 12, ..RecorderSetting::default() },
        nominal_delay_s: site.chains.iter().map(|chain| chain.delay_s).collect(),
        ..VisitSettings::default()
    };
    let visit = Visit::new(&site.geometry, settings).unwrap();
    let mut worker = visit.worker();
    let mut timer = CaptureTimer::new(site, MAIN_STANCE, ArrivalOptions::default()).unwrap();
    let arrivals = (0..CAPTURES)
        .map(|index| {
            let capture = worker.capture(index);
            timer
                .time(&Recorded { name: index.to_string(), time: None, capture, envelope_only: false })
                .unwrap()
        })
        .collect();
    let timed = TimedVisit { captures: CAPTURES, arrivals, ..TimedVisit::default() };
    let document = locate(site, &timed, &LocateOptions::default(), &Unwatched).unwrap();
    document.sources.into_iter().next()
}
