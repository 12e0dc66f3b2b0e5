//! How long the steps of the main job take: one capture timed by each method, and one source solved.
//!
//! `cargo bench --bench speed`. Compare figures within one run only.

use std::hint::black_box;

use arcstead::core::{Method, Timing, TimingOptions};
use arcstead::formats::Recorded;
use arcstead::solver::nalgebra::Vector3;
use arcstead::solver::{Arrivals, locate};
use arcstead::{ArrivalOptions, CaptureTimer, method_name};
use arcstead_benches::{captures, demo_site};
use criterion::{Criterion, Throughput, criterion_group, criterion_main};

fn timing(criterion: &mut Criterion) {
    let site = demo_site();
    let captures = captures(&site, 64);
    let mut group = criterion.benchmark_group("time 64 captures of 4 x 1500 samples");
    group.throughput(Throughput::Elements(64));
    for method in [Method::Gated, Method::Correlation, Method::Energy, Method::Akaike, Method::Threshold] {
        let options = TimingOptions { method, band_hz: Some((300e6, 1500e6)), ..TimingOptions::default() };
        let mut timing = Timing::plan(&options, 5e9, 1500, 4).expect("the shape of the captures above");
        group.bench_function(method_name(method), |bencher| {
            bencher.iter(|| {
                for capture in &captures {
                    black_box(timing.process(capture).expect("planned for this shape"));
                }
            });
        });
    }
    let mut timer = CaptureTimer::new(&site, "main", ArrivalOptions::default()).expect("every site has it");
    let recorded: Vec<Recorded> = captures
        .into_iter()
        .map(|capture| Recorded { name: String::new(), time: None, capture, envelope_only: false })
        .collect();
    group.bench_function("gated, as arrivals at antennas", |bencher| {
        bencher.iter(|| {
            for one in &recorded {
                black_box(timer.time(one).expect("the channels of the site"));
            }
        });
    });
    group.finish();
}

fn solving(criterion: &mut Criterion) {
    let site = demo_site();
    let source = Vector3::new(7.8, 14.6, 3.4);
    let times: Vec<f64> = site
        .geometry
        .antennas
        .iter()
        .map(|antenna| (antenna.position_m - source).norm() / site.geometry.air.speed_m_per_s)
        .collect();
    let arrivals = Arrivals::independent(&times, &[5e-11; 4]);
    let mut clear = site.geometry.clone();
    clear.obstacles.clear();
    let mut group = criterion.benchmark_group("solve one source on the demo site");
    for (name, geometry) in [("with the relay house", &site.geometry), ("nothing in the way", &clear)] {
        group.bench_function(name, |bencher| {
            bencher.iter(|| black_box(locate(geometry, &arrivals, 0.95).expect("four arrivals do")));
        });
    }
    group.finish();
}

criterion_group! {
    name = benches;
    config = Criterion::default().sample_size(20);
    targets = timing, solving
}
criterion_main!(benches);
