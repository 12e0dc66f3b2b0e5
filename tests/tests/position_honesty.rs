//! Sigmas, regions and verdicts mean what they say: measured from Gaussian times.
//!
//! Seeds are fixed. A bound is 4.9 standard errors, which a correct program misses less than once in 10^6; the
//! numbers of trials are such that sigmas wrong by 15 % are found out.

#![allow(clippy::unwrap_used, reason = "a test that unwraps fails with the line it stands on")]

use arcstead_solver::likelihood::{Evaluator, Likelihood};
use arcstead_solver::nalgebra::{Vector2, Vector3};
use arcstead_solver::{
    Air, Antenna, Arrivals, Asset, Obstacle, PositionSigma, Priors, SearchBox, Site, Statement, locate,
};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

const TIMING_SIGMA_S: f64 = 5e-11;

fn site(places: &[[f64; 3]], search: SearchBox) -> Site {
    Site {
        antennas: places
            .iter()
            .enumerate()
            .map(|(i, &position)| Antenna {
                name: format!("A{}", i + 1),
                position_m: position.into(),
                position_sigma: PositionSigma::Isotropic(0.03),
                delay_sigma_s: 1e-10,
                response_sigma_s: 5e-11,
            })
            .collect(),
        assets: vec![],
        obstacles: vec![],
        air: Air::default(),
        search,
        priors: Priors::default(),
    }
}

fn bay() -> Site {
    let search = SearchBox { min_m: Vector3::new(-5.0, -5.0, 0.0), max_m: Vector3::new(30.0, 20.0, 10.0) };
    let mut site = site(&[[0.0, 0.0, 2.0], [16.0, 1.0, 4.5], [15.0, 14.0, 1.5], [1.0, 13.0, 5.0]], search);
    site.assets = (0..9)
        .map(|k| {
            let at = Vector3::new(5.0 + 1.2 * f64::from(k % 3), 4.0 + 1.5 * f64::from(k / 3), 4.0);
            Asset {
                name: format!("post {k}"),
                kind: "post".into(),
                from_m: at,
                to_m: at + Vector3::new(0.0, 0.0, 2.0),
                radius_m: 0.3,
                weight: 1.0,
            }
        })
        .collect();
    site
}

/// Times as a visit would give them: delay, response and survey errors drawn anew.
fn draw(site: &Site, source: &Vector3<f64>, scale: f64, rng: &mut ChaCha8Rng) -> Arrivals {
    let speed = site.air.speed_m_per_s;
    let mut normal = || -> f64 { StandardNormal.sample(rng) };
    let times: Vec<f64> = site
        .antennas
        .iter()
        .map(|antenna| {
            let PositionSigma::Isotropic(survey_m) = antenna.position_sigma else { unreachable!() };
            let way = antenna.position_m - source;
            // The survey error along the way: what an error of the same sigma on each axis comes to.
            let surveyed_m = way.norm() + survey_m * normal();
            let errors = TIMING_SIGMA_S * normal()
                + antenna.delay_sigma_s * normal()
                + antenna.response_sigma_s * normal();
            surveyed_m / speed + scale * errors
        })
        .collect();
    Arrivals::independent(&times, &vec![TIMING_SIGMA_S; times.len()])
}

fn in_box(search: &SearchBox, rng: &mut ChaCha8Rng) -> Vector3<f64> {
    search.min_m + (search.max_m - search.min_m).map(|side| side * rng.random_range(0.0..1.0))
}

/// Share of regions at 0.95 that hold the truth, truths uniform in the search box.
fn coverage(site: &Site, trials: u32, seed: u64) -> f64 {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let held: u32 = (0..trials)
        .map(|_| {
            let source = in_box(&site.search, &mut rng);
            let arrivals = draw(site, &source, 1.0, &mut rng);
            let fix = locate(site, &arrivals, 0.95).unwrap();
            let likelihood = Likelihood::new(site, &arrivals).unwrap();
            let at_truth = Evaluator::new(&likelihood).at(&source).unwrap();
            u32::from(at_truth.minus_two_ln <= fix.region.level)
        })
        .sum();
    f64::from(held) / f64::from(trials)
}

fn bound(share: f64, trials: u32) -> f64 {
    4.9 * (share * (1.0 - share) / f64::from(trials)).sqrt()
}

#[test]
fn regions_hold_the_truth_as_often_as_they_say() {
    // 15 % smaller sigmas would hold it in some 88 %, far outside the bound.
    let mut nearby = bay();
    nearby.assets.clear();
    let mut hexagon = site(
        &[
            [0.0, 0.0, 2.0],
            [16.0, 1.0, 4.5],
            [15.0, 14.0, 1.5],
            [1.0, 13.0, 5.0],
            [8.0, -3.0, 3.0],
            [9.0, 18.0, 1.5],
        ],
        nearby.search,
    );
    hexagon.obstacles.clear();
    let small = site(
        &[[0.0, 0.0, 2.0], [4.0, 0.0, 3.0], [4.0, 4.0, 1.0], [0.0, 4.0, 2.5]],
        SearchBox { min_m: Vector3::new(-20.0, -5.0, 0.0), max_m: Vector3::new(15.0, 45.0, 20.0) },
    );
    for (name, site, trials) in [("bay", nearby, 1200), ("six", hexagon, 1200), ("small", small, 600)] {
        let found = coverage(&site, trials, 41);
        assert!((found - 0.95).abs() < bound(0.95, trials), "{name}: {found}");
    }
}

#[test]
fn verdicts_are_right_as_often_as_they_say() {
    let site = bay();
    let mut rng = ChaCha8Rng::seed_from_u64(42);
    let trials = 1500;
    // Sigmas three times as large as those of a good day, so that neighbours are really confused.
    let mut rough = site.clone();
    for antenna in &mut rough.antennas {
        antenna.delay_sigma_s *= 4.0;
        antenna.response_sigma_s *= 4.0;
    }
    let mut by_decile = [(0_u32, 0.0_f64, 0_u32); 10];
    let mut confident_and_wrong = 0;
    let mut named_alone = 0;
    for _ in 0..trials {
        // Truths drawn from the priors: elsewhere with its prior, else on a random asset, uniform in its capsule.
        let on = (rng.random_range(0.0..1.0) >= rough.priors.elsewhere)
            .then(|| rng.random_range(0..rough.assets.len()));
        let source = match on {
            Some(index) => in_capsule(&rough.assets[index], &mut rng),
            None => in_box(&rough.search, &mut rng),
        };
        let arrivals = draw(&rough, &source, 1.0, &mut rng);
        let verdict = locate(&rough, &arrivals, 0.95).unwrap().verdict;
        for &(asset, probability) in &verdict.assets {
            let decile = ((probability * 10.0) as usize).min(9);
            by_decile[decile].0 += 1;
            by_decile[decile].1 += probability;
            by_decile[decile].2 += u32::from(on == Some(asset));
        }
        if verdict.statement == Statement::One {
            named_alone += 1;
            confident_and_wrong += u32::from(on != Some(verdict.named[0]));
        }
    }
    for (count, stated, right) in by_decile {
        if count > 0 {
            let (count, right) = (f64::from(count), f64::from(right));
            let expected = stated / count;
            let error = (expected * (1.0 - expected) / count).sqrt();
            let found = right / count;
            assert!(
                (found - expected).abs() < (4.9 * error).max(0.02),
                "{expected} told, {found} found in {count}"
            );
        }
    }
    assert!(named_alone > 300, "too few were named for the test to mean anything: {named_alone}");
    assert!(
        f64::from(confident_and_wrong) < 0.2 * f64::from(named_alone),
        "{confident_and_wrong} of {named_alone}"
    );
}

fn in_capsule(asset: &Asset, rng: &mut ChaCha8Rng) -> Vector3<f64> {
    let (low, high) = (asset.from_m.inf(&asset.to_m), asset.from_m.sup(&asset.to_m));
    loop {
        let at = Vector3::from_fn(|axis, _| {
            rng.random_range(low[axis] - asset.radius_m..high[axis] + asset.radius_m)
        });
        let along = asset.to_m - asset.from_m;
        let share = ((at - asset.from_m).dot(&along) / along.norm_squared()).clamp(0.0, 1.0);
        if (at - asset.from_m - along * share).norm() <= asset.radius_m {
            return at;
        }
    }
}

#[test]
fn stated_covariances_are_those_found() {
    // Inside a distributed array the problem is nearly linear: the Mahalanobis distance of the truth is chi-square
    // with 3 degrees, mean 3, variance 6.
    let site = site(
        &[
            [0.0, 0.0, 2.0],
            [16.0, 1.0, 4.5],
            [15.0, 14.0, 1.5],
            [1.0, 13.0, 5.0],
            [8.0, 7.0, 9.5],
            [9.0, 18.0, 1.5],
        ],
        bay().search,
    );
    let mut rng = ChaCha8Rng::seed_from_u64(43);
    let trials = 1000;
    let mut sum = 0.0;
    for _ in 0..trials {
        let source = Vector3::new(7.0, 6.0, 5.0);
        let arrivals = draw(&site, &source, 1.0, &mut rng);
        let fix = locate(&site, &arrivals, 0.95).unwrap();
        let covariance = fix.covariance.unwrap().total_m2();
        let error = fix.position_m - source;
        sum += (error.transpose() * covariance.try_inverse().unwrap() * error)[0];
    }
    let mean = sum / f64::from(trials);
    assert!((mean - 3.0).abs() < 4.9 * (6.0 / f64::from(trials)).sqrt() + 0.05, "{mean}");
}

#[test]
fn a_place_in_shadow_gains_nothing_from_it() {
    // Two places explain the delays alike but for the shadow on one of them: the clear one must win, by about the ratio
    // of the densities, and by the same amount whatever the unit of time.
    let mut site = bay();
    let source = Vector3::new(10.0, 10.0, 5.0);
    let times: Vec<f64> =
        site.antennas.iter().map(|a| (a.position_m - source).norm() / site.air.speed_m_per_s).collect();
    let value = |site: &Site, unit: f64| {
        let times: Vec<f64> = times.iter().map(|time| time * unit).collect();
        let mut site = site.clone();
        site.air.speed_m_per_s /= unit;
        site.priors.late_scale_s *= unit;
        for antenna in &mut site.antennas {
            antenna.delay_sigma_s *= unit;
            antenna.response_sigma_s *= unit;
        }
        let arrivals = Arrivals::independent(&times, &[TIMING_SIGMA_S * unit; 4]);
        let likelihood = Likelihood::new(&site, &arrivals).unwrap();
        // Against a clear place that explains the times badly, so that only differences count.
        let mut evaluator = Evaluator::new(&likelihood);
        let here = evaluator.at(&source).unwrap().minus_two_ln;
        here - evaluator.at(&Vector3::new(10.0, 10.5, 5.0)).unwrap().minus_two_ln
    };
    let clear = value(&site, 1.0);
    // A wall that stands between the source and A1, and not between A1 and the other place.
    let toward = (site.antennas[0].position_m - source).xy().normalize();
    let middle = source.xy() + toward * 0.1;
    let across = Vector2::new(-toward.y, toward.x) * 0.04;
    let along = toward * 0.02;
    site.obstacles = vec![Obstacle {
        name: "post".into(),
        footprint_m: vec![
            middle + across + along,
            middle + across - along,
            middle - across - along,
            middle - across + along,
        ],
        base_m: 0.0,
        top_m: 9.0,
    }];
    let hidden = value(&site, 1.0);
    assert!(hidden > clear + 1.0, "shadow must cost evidence: {clear} clear, {hidden} hidden");
    for unit in [1e9, 1e12] {
        assert!((value(&site, unit) - hidden).abs() < 1e-6);
    }
}
