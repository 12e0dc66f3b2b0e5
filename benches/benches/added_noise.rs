//! White noise added to the captures of the demo visit until the verdict fails: at which signal to noise, and does it say
//! "cannot tell" before it says a wrong name?
//!
//! `cargo bench --bench added_noise`. The visit is the one made by the independent script, 40 captures; each level is
//! repeated with fresh noise. Prints one row a level.

use std::io::Write as _;

use arcstead::core::{Capture, TimingOptions, summarise};
use arcstead::documents::{LocateDocument, Statement};
use arcstead::formats::{ReadSettings, Recorded, find_captures, open_captures};
use arcstead::site::{MAIN_STANCE, Site};
use arcstead::{ArrivalOptions, CaptureTimer, LocateOptions, TimedVisit, Unwatched, locate};
use arcstead_benches::demo_site;
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

/// What `demo-sites/marl-bank/independent/truth.json` says.
const TRUE_ASSET: &str = "Voltage transformer phase A";
const TRUE_PLACE_M: [f64; 3] = [5.50, 16.92, 3.85];
const REPEATS: u64 = 20;

fn main() {
    let site = demo_site();
    let recorded = demo_captures();
    let noise_rms = recorded_noise(&recorded);
    let mut out = std::io::stdout().lock();
    // A closed pipe ends the table, not the bench.
    let mut row = |text: String| drop(writeln!(out, "{text}"));
    row(format!(
        "{:>10} {:>8} {:>7} | {:>5} {:>6} {:>6} {:>9} {:>6} {:>5} | {:>9}",
        "noise", "captures", "SNR", "right", "one of", "cannot", "elsewhere", "none", "WRONG", "median"
    ));
    row(format!(
        "{:>10} {:>8} {:>7} | {:>5} {:>6} {:>6} {:>9} {:>6} {:>5} | {:>9}",
        "added, dB", "used", "dB", "one", "", "tell", "", "found", "", "error, m"
    ));
    for added_db in [-20.0, 0.0, 3.0, 6.0, 8.0, 10.0, 12.0, 14.0, 16.0, 18.0, 20.0] {
        let outcomes: Vec<Outcome> = (0..REPEATS)
            .map(|repeat| {
                let noisy = with_noise(&recorded, &noise_rms, added_db, repeat);
                outcome(&located(&site, &noisy))
            })
            .collect();
        let count = |kind: Kind| outcomes.iter().filter(|outcome| outcome.kind == kind).count();
        row(format!(
            "{added_db:>10.0} {:>8.0} {:>7.1} | {:>5} {:>6} {:>6} {:>9} {:>6} {:>5} | {:>9.2}",
            median(outcomes.iter().map(|outcome| outcome.used)),
            median(outcomes.iter().filter_map(|outcome| outcome.snr_db)),
            count(Kind::RightOne),
            count(Kind::RightOneOf),
            count(Kind::CannotTell),
            count(Kind::Elsewhere),
            count(Kind::NoSource),
            count(Kind::WrongName),
            median(outcomes.iter().filter_map(|outcome| outcome.error_m)),
        ));
    }
}

/// The captures of the independent visit.
fn demo_captures() -> Vec<Recorded> {
    let folder = concat!(env!("CARGO_MANIFEST_DIR"), "/../demo-sites/marl-bank/independent");
    let found = find_captures(&[folder.into()]).expect("the demo visit belongs to the project");
    let file = open_captures(&found.files[0], &ReadSettings::default()).expect("the demo visit can be read");
    (0..file.capture_count()).map(|index| file.read(index).expect("no demo capture is damaged")).collect()
}

/// Median over the captures of each channel's noise rms, all bands, in the unit of the samples.
fn recorded_noise(recorded: &[Recorded]) -> Vec<f64> {
    let options = TimingOptions { band_hz: Some((300e6, 1500e6)), excise: false, ..TimingOptions::default() };
    let channels = recorded[0].capture.channel_count();
    let summaries: Vec<_> = recorded
        .iter()
        .map(|one| summarise(&one.capture, &options).expect("the band fits the captures"))
        .collect();
    // The band holds 1200 of the 2500 MHz up to half the sample rate: white noise has that much more outside.
    let whole_over_band = (2500.0_f64 / 1200.0).sqrt();
    (0..channels)
        .map(|channel| whole_over_band * median(summaries.iter().map(|summary| summary[channel].noise_rms)))
        .collect()
}

fn with_noise(recorded: &[Recorded], noise_rms: &[f64], added_db: f64, repeat: u64) -> Vec<Recorded> {
    let factor = 10.0_f64.powf(added_db / 20.0);
    let mut rng = ChaCha8Rng::seed_from_u64(repeat);
    recorded
        .iter()
        .map(|one| {
            let channels = one
                .capture
                .channels()
                .zip(noise_rms)
                .map(|(samples, rms)| {
                    samples
                        .iter()
                        .map(|sample| {
                            let noise: f64 = StandardNormal.sample(&mut rng);
                            sample + (factor * rms * noise) as f32
                        })
                        .collect()
                })
                .collect();
            let capture =
                Capture::new(one.capture.sample_rate_hz(), channels).expect("finite samples stay so");
            Recorded { capture, ..one.clone() }
        })
        .collect()
}

fn located(site: &Site, recorded: &[Recorded]) -> LocateDocument {
    let mut timer =
        CaptureTimer::new(site, MAIN_STANCE, ArrivalOptions::default()).expect("every site has it");
    let visit = TimedVisit {
        captures: recorded.len(),
        arrivals: recorded.iter().map(|one| timer.time(one).expect("the channels of the site")).collect(),
        ..TimedVisit::default()
    };
    locate(site, &visit, &LocateOptions::default(), &Unwatched).expect("one stance")
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Kind {
    RightOne,
    RightOneOf,
    CannotTell,
    Elsewhere,
    NoSource,
    WrongName,
}

struct Outcome {
    kind: Kind,
    used: f64,
    snr_db: Option<f64>,
    error_m: Option<f64>,
}

fn outcome(document: &LocateDocument) -> Outcome {
    let Some(source) = document.sources.first() else {
        return Outcome { kind: Kind::NoSource, used: 0.0, snr_db: None, error_m: None };
    };
    let named = source.verdict.assets.iter().any(|asset| asset == TRUE_ASSET);
    let kind = match source.verdict.statement {
        Statement::One if named => Kind::RightOne,
        Statement::OneOf if named => Kind::RightOneOf,
        Statement::One | Statement::OneOf => Kind::WrongName,
        Statement::Elsewhere => Kind::Elsewhere,
        _ => Kind::CannotTell,
    };
    let error2: f64 = source.position_m.iter().zip(TRUE_PLACE_M).map(|(a, b)| (a - b).powi(2)).sum();
    let snr = source.antennas.iter().filter_map(|antenna| antenna.snr_db);
    Outcome { kind, used: source.captures as f64, snr_db: Some(median(snr)), error_m: Some(error2.sqrt()) }
}

fn median(values: impl Iterator<Item = f64>) -> f64 {
    let mut values: Vec<f64> = values.collect();
    values.sort_by(f64::total_cmp);
    values.get(values.len() / 2).copied().unwrap_or(f64::NAN)
}
