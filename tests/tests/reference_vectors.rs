//! Filters, correlation, least squares and distributions against scipy.
//!
//! `tests/reference/vectors.toml` was made by `tests/reference/make_vectors.py` with the versions it names; the
//! tolerances beside each table are told in `tests/reference/README.md`.

#![allow(clippy::unwrap_used, reason = "a test that unwraps fails with the line it stands on")]

use approx::assert_relative_eq;
use arcstead_core::{ButterworthBandPass, GeneralisedCorrelation, Weighting};
use arcstead_solver::least_squares::refine;
use arcstead_solver::likelihood::{Evaluator, Likelihood};
use arcstead_solver::nalgebra::{DMatrix, DVector, Vector3};
use arcstead_solver::{Air, Arrivals, SearchBox, chi_square_exceedance, chi_square_quantile, covariance};
use arcstead_tests::bare_site;
use toml::{Table, Value};

fn vectors() -> Table {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/reference/vectors.toml");
    std::fs::read_to_string(path).unwrap().parse().unwrap()
}

fn number(value: &Value) -> f64 {
    value.as_float().or_else(|| value.as_integer().map(|whole| whole as f64)).unwrap()
}

fn numbers(value: &Value) -> Vec<f64> {
    value.as_array().unwrap().iter().map(number).collect()
}

fn rows(value: &Value) -> Vec<Vec<f64>> {
    value.as_array().unwrap().iter().map(numbers).collect()
}

fn greatest(values: &[f64]) -> f64 {
    values.iter().fold(0.0, |most: f64, value| most.max(value.abs()))
}

#[test]
fn butterworth_band_passes() {
    let vectors = vectors();
    let tables = vectors["butterworth"].as_array().unwrap();
    assert_eq!(tables.len(), 4);
    // The input that the script filtered, by its formula.
    let input: Vec<f64> = (0..64)
        .map(|n| {
            let n = f64::from(n);
            (-0.08 * n).exp() * (0.9 * n + 0.3).sin() + 0.25 * (2.1 * n).cos()
        })
        .collect();
    for table in tables {
        let filter = ButterworthBandPass::design(
            usize::try_from(table["order"].as_integer().unwrap()).unwrap(),
            number(&table["low_hz"]),
            number(&table["high_hz"]),
            number(&table["sample_rate_hz"]),
        )
        .unwrap();
        let expected = numbers(&table["magnitude"]);
        for (frequency_hz, magnitude) in numbers(&table["frequency_hz"]).iter().zip(&expected) {
            let found = filter.response(*frequency_hz).norm();
            assert_relative_eq!(found, magnitude, epsilon = 1e-10 * greatest(&expected));
        }
        let expected = numbers(&table["filtered"]);
        let mut found = Vec::new();
        filter.filter_forward(&input, &mut found);
        assert_eq!(found.len(), expected.len());
        for (found, expected_sample) in found.iter().zip(&expected) {
            assert_relative_eq!(found, expected_sample, epsilon = 1e-12 * greatest(&expected).max(1.0));
        }
    }
}

#[test]
fn correlation_with_its_lags() {
    let vectors = vectors();
    let table = &vectors["correlation"];
    let (a, b) = (numbers(&table["a"]), numbers(&table["b"]));
    let length = a.len().max(b.len());
    let padded = |samples: &[f64]| {
        let mut samples = samples.to_vec();
        samples.resize(length, 0.0);
        samples
    };
    let greatest_lag = length - 1;
    let found = GeneralisedCorrelation::plan(length, Weighting::Plain).process(
        &padded(&a),
        &padded(&b),
        greatest_lag,
    );
    let expected = numbers(&table["values"]);
    let size = greatest(&expected);
    let mut compared = 0;
    for (lag, value) in numbers(&table["lags"]).iter().zip(&expected) {
        let place = usize::try_from(*lag as isize - found.first_lag);
        if let Some(here) = place.ok().and_then(|place| found.values.get(place)) {
            assert_relative_eq!(*here, *value, epsilon = 1e-12 * size);
            compared += 1;
        }
    }
    assert!(compared >= 2 * a.len().min(b.len()) - 1, "{compared} lags compared");
    // Positive: b is later.
    assert_eq!(found.peak().unwrap().0 as i64, table["peak_lag"].as_integer().unwrap());
}

#[test]
fn least_squares_positions() {
    let vectors = vectors();
    let tables = vectors["least_squares"].as_array().unwrap();
    assert_eq!(tables.len(), 3);
    for table in tables {
        let places: Vec<Vector3<f64>> = rows(&table["antenna_m"])
            .iter()
            .map(|row| Vector3::new(row[0], row[1], row.get(2).copied().unwrap_or(0.0)))
            .collect();
        let n = places.len();
        let expected = numbers(&table["position_m"]);
        let unknowns = expected.len();
        let z = if unknowns == 3 { 100.0 } else { 0.0 };
        let search =
            SearchBox { min_m: Vector3::new(-100.0, -100.0, -z), max_m: Vector3::new(100.0, 100.0, z) };
        let site = bare_site(&places, Air::from_refractivity(315.0).speed_m_per_s, search);
        let covariance_ns2 = rows(&table["covariance_ns2"]);
        let arrivals = Arrivals {
            antennas: (0..n).collect(),
            times_s: DVector::from_vec(numbers(&table["time_ns"])) * 1e-9,
            random_covariance_s2: DMatrix::from_fn(n, n, |i, j| covariance_ns2[i][j] * 1e-18),
        };
        let likelihood = Likelihood::new(&site, &arrivals).unwrap();
        let mut evaluator = Evaluator::new(&likelihood);
        let start = places.iter().sum::<Vector3<f64>>() / n as f64;
        let found = refine(&mut evaluator, &site.search, &start).unwrap();
        for (axis, value) in expected.iter().enumerate() {
            // The stopping rule leaves 1e-6 of a sigma: some 3e-8 m here, in ten metres.
            assert_relative_eq!(found.position_m[axis], value, max_relative = 1e-7);
        }
        assert_relative_eq!(found.value.chi_square, number(&table["chi_square"]), max_relative = 1e-7);
        let told = covariance(&mut evaluator, &found.position_m, unknowns).unwrap().unwrap().total_m2();
        let expected = rows(&table["position_covariance_m2"]);
        for i in 0..unknowns {
            for j in 0..unknowns {
                let size = (expected[i][i] * expected[j][j]).sqrt();
                assert_relative_eq!(told[(i, j)], expected[i][j], epsilon = 1e-6 * size);
            }
        }
        let degrees = usize::try_from(table["degrees_of_freedom"].as_integer().unwrap()).unwrap();
        let p_value = chi_square_exceedance(degrees, found.value.chi_square).unwrap();
        assert_relative_eq!(p_value, number(&table["p_value"]), max_relative = 1e-6);
    }
}

#[test]
fn chi_square_distribution() {
    let vectors = vectors();
    let table = &vectors["chi_square"];
    let degrees = numbers(&table["degrees_of_freedom"]);
    let (quantiles, survival) = (rows(&table["quantiles"]), rows(&table["survival"]));
    for (row, degrees) in degrees.iter().enumerate() {
        let degrees = *degrees as usize;
        for (level, expected) in numbers(&table["levels"]).iter().zip(&quantiles[row]) {
            assert_relative_eq!(chi_square_quantile(degrees, *level), expected, max_relative = 1e-6);
        }
        for (value, expected) in numbers(&table["survival_at"]).iter().zip(&survival[row]) {
            let found = chi_square_exceedance(degrees, *value).unwrap();
            assert_relative_eq!(found, expected, max_relative = 1e-9, epsilon = 1e-15);
        }
    }
}

// NIST/SEMATECH e-Handbook of Statistical Methods, 1.3.6.7.4: upper critical values of chi-square.
#[test]
fn chi_square_table_of_the_handbook() {
    let degrees = [1, 2, 3, 4, 5, 6, 10];
    let at_95 = [3.841, 5.991, 7.815, 9.488, 11.070, 12.592, 18.307];
    let at_99 = [6.635, 9.210, 11.345, 13.277, 15.086, 16.812, 23.209];
    for (i, &degrees) in degrees.iter().enumerate() {
        assert_relative_eq!(chi_square_quantile(degrees, 0.95), at_95[i], epsilon = 5.1e-4);
        assert_relative_eq!(chi_square_quantile(degrees, 0.99), at_99[i], epsilon = 5.1e-4);
    }
    assert_relative_eq!(chi_square_quantile(2, 0.95).sqrt(), 2.447_747, epsilon = 1e-6);
    assert_relative_eq!(chi_square_quantile(3, 0.95).sqrt(), 2.795_483, epsilon = 1e-6);
    assert_relative_eq!(1.0 - chi_square_exceedance(2, 1.0).unwrap(), 0.393_47, epsilon = 1e-5);
}
