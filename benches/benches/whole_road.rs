//! Regions and verdicts from simulated waveforms through the whole road: do they hold what they say?
//!
//! `cargo bench --bench whole_road`. Every visit of the demo site has its own source (uniform on a random asset, or in the
//! search box with the prior of elsewhere), its own delay, survey and response errors, pulses, reflections and noise.
//! Prints one row a signal-to-noise ratio.

use std::io::Write as _;

use arcstead::documents::{SourceResult, Statement};
use arcstead::formats::Recorded;
use arcstead::site::{MAIN_STANCE, Site};
use arcstead::solver::Asset;
use arcstead::solver::nalgebra::{Matrix3, Vector3};
use arcstead::{ArrivalOptions, CaptureTimer, LocateOptions, TimedVisit, Unwatched, locate};
use arcstead_benches::demo_site;
use arcstead_sim::{RecorderSetting, SourceSetting, Visit, VisitSettings};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

const VISITS: u64 = 100;
const CAPTURES: usize = 20;

fn main() {
    let site = demo_site();
    let mut out = std::io::stdout().lock();
    // A closed pipe ends the table, not the bench.
    let mut row = |text: String| drop(writeln!(out, "{text}"));
    row(format!("{VISITS} visits of {CAPTURES} captures at each level; SNR of one capture at 10 m"));
    row("SNR dB | no source | captures used | one: right WRONG | one of: right WRONG | elsewhere: right WRONG | cannot tell | \
         in 95 % region box | mean d2 where stated (3)"
        .into());
    for snr_db in [16.0, 20.0, 25.0, 30.0] {
        let mut tally = Tally::default();
        for seed in 0..VISITS {
            tally.add(&site, &run(&site, snr_db, seed));
        }
        row(tally.row(snr_db));
    }
}

/// What one visit came to: its true place, the asset it is on, and what was told.
struct Outcome {
    truth_m: Vector3<f64>,
    asset: Option<usize>,
    told: Option<SourceResult>,
}

fn run(site: &Site, snr_db: f64, seed: u64) -> Outcome {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let geometry = &site.geometry;
    // Weights count as in the site file.
    let total: f64 = geometry.assets.iter().map(|asset| asset.weight).sum();
    let asset = (rng.random_range(0.0..1.0) >= geometry.priors.elsewhere).then(|| {
        let mut left = rng.random_range(0.0..total);
        geometry.assets.iter().position(|asset| {
            left -= asset.weight;
            left < 0.0
        })
    });
    let asset = asset.flatten();
    let search = geometry.search;
    loop {
        let truth_m = match asset {
            Some(index) => in_capsule(&geometry.assets[index], &mut rng),
            None => {
                search.min_m + (search.max_m - search.min_m).map(|side| side * rng.random_range(0.0..1.0))
            }
        };
        let settings = VisitSettings {
            sources: vec![SourceSetting { snr_at_10m_db: snr_db, ..SourceSetting::at(truth_m) }],
            captures: CAPTURES,
            seed,
            recorder: RecorderSetting { bits: 12, ..RecorderSetting::default() },
            nominal_delay_s: site.chains.iter().map(|chain| chain.delay_s).collect(),
            ..VisitSettings::default()
        };
        // A place inside an obstacle, or right on an antenna, cannot be simulated: another is drawn.
        if let Ok(visit) = Visit::new(geometry, settings) {
            return Outcome { truth_m, asset, told: told(site, &visit) };
        }
    }
}

fn told(site: &Site, visit: &Visit) -> Option<SourceResult> {
    let mut timer =
        CaptureTimer::new(site, MAIN_STANCE, ArrivalOptions::default()).expect("every site has it");
    let mut worker = visit.worker();
    let arrivals = (0..CAPTURES)
        .map(|index| {
            let capture = worker.capture(index);
            let recorded = Recorded { name: index.to_string(), time: None, capture, envelope_only: false };
            timer.time(&recorded).expect("the channels of the site")
        })
        .collect();
    let timed = TimedVisit { captures: CAPTURES, arrivals, ..TimedVisit::default() };
    let document = locate(site, &timed, &LocateOptions::default(), &Unwatched).expect("one stance");
    document.sources.into_iter().next()
}

fn in_capsule(asset: &Asset, rng: &mut ChaCha8Rng) -> Vector3<f64> {
    let (low, high) = (asset.from_m.inf(&asset.to_m), asset.from_m.sup(&asset.to_m));
    let along = asset.to_m - asset.from_m;
    loop {
        let at = Vector3::from_fn(|axis, _| {
            rng.random_range(low[axis] - asset.radius_m..high[axis] + asset.radius_m)
        });
        let share = if along.norm() > 0.0 {
            ((at - asset.from_m).dot(&along) / along.norm_squared()).clamp(0.0, 1.0)
        } else {
            0.0
        };
        if (at - asset.from_m - along * share).norm() <= asset.radius_m {
            return at;
        }
    }
}

#[derive(Default)]
struct Tally {
    visits: u32,
    no_source: u32,
    captures: usize,
    one: [u32; 2],
    one_of: [u32; 2],
    elsewhere: [u32; 2],
    cannot_tell: u32,
    in_region: u32,
    distance2: Vec<f64>,
}

impl Tally {
    fn add(&mut self, site: &Site, outcome: &Outcome) {
        self.visits += 1;
        let Some(source) = &outcome.told else {
            self.no_source += 1;
            return;
        };
        self.captures += source.captures;
        let true_name = outcome.asset.map(|index| site.geometry.assets[index].name.as_str());
        let named = source.verdict.assets.iter().any(|name| Some(name.as_str()) == true_name);
        match source.verdict.statement {
            Statement::One => self.one[usize::from(!named)] += 1,
            Statement::OneOf => self.one_of[usize::from(!named)] += 1,
            Statement::Elsewhere => self.elsewhere[usize::from(true_name.is_some())] += 1,
            _ => self.cannot_tell += 1,
        }
        let inside = (0..3).all(|axis| {
            (source.region.min_m[axis]..=source.region.max_m[axis]).contains(&outcome.truth_m[axis])
        });
        self.in_region += u32::from(inside);
        // A place that rests on late arrivals is not told as one to go to.
        let told = source.verdict.statement != Statement::CannotTell;
        if let Some(covariance) = source.covariance_m2.filter(|_| told) {
            let error = Vector3::from(source.position_m) - outcome.truth_m;
            let covariance = Matrix3::from_fn(|i, j| covariance[i][j]);
            if let Some(inverse) = covariance.try_inverse() {
                self.distance2.push((error.transpose() * inverse * error)[0]);
            }
        }
    }

    fn row(&self, snr_db: f64) -> String {
        let solved = f64::from(self.visits - self.no_source).max(1.0);
        let mean = self.distance2.iter().sum::<f64>() / self.distance2.len().max(1) as f64;
        format!(
            "{snr_db:6.0} | {:9} | {:13.1} | {:10} {:5} | {:13} {:5} | {:16} {:5} | {:11} | {:18.3} | {mean:.2}",
            self.no_source,
            self.captures as f64 / solved,
            self.one[0],
            self.one[1],
            self.one_of[0],
            self.one_of[1],
            self.elsewhere[0],
            self.elsewhere[1],
            self.cannot_tell,
            f64::from(self.in_region) / solved,
        )
    }
}
