//! Positions that others have published, solved again.

#![allow(clippy::unwrap_used, reason = "a test that unwraps fails with the line it stands on")]

use approx::assert_relative_eq;
use arcstead_solver::closed_form::roots;
use arcstead_solver::least_squares::{Ended, refine};
use arcstead_solver::likelihood::{Evaluator, Likelihood};
use arcstead_solver::nalgebra::{DMatrix, Vector3};
use arcstead_solver::{Arrivals, Ellipse, SearchBox, Site, covariance, locate};
use arcstead_tests::bare_site;

fn site(antennas: &[[f64; 3]], speed: f64, min: [f64; 3], max: [f64; 3]) -> Site {
    let places: Vec<Vector3<f64>> = antennas.iter().map(|&place| place.into()).collect();
    bare_site(&places, speed, SearchBox { min_m: min.into(), max_m: max.into() })
}

/// Least squares from a start, and the likelihood's own account of the answer.
fn solve(site: &Site, times: &[f64], sigma_s: f64, start: [f64; 3]) -> (Vector3<f64>, f64) {
    let likelihood =
        Likelihood::new(site, &Arrivals::independent(times, &vec![sigma_s; times.len()])).unwrap();
    let minimum = refine(&mut Evaluator::new(&likelihood), &site.search, &start.into()).unwrap();
    assert_eq!(minimum.ended, Ended::Converged);
    (minimum.position_m, minimum.value.chi_square)
}

/// Covariance of the position for independent arrivals of one sigma in metres.
fn covariance_m2(site: &Site, sigma_m: f64, at: [f64; 3]) -> arcstead_solver::nalgebra::Matrix3<f64> {
    let n = site.antennas.len();
    let arrivals = Arrivals::independent(&vec![0.0; n], &vec![sigma_m / site.air.speed_m_per_s; n]);
    let likelihood = Likelihood::new(site, &arrivals).unwrap();
    covariance(&mut Evaluator::new(&likelihood), &at.into(), site.search.unknowns())
        .unwrap()
        .expect("the geometry determines the place")
        .total_m2()
}

// T. Sauer, Numerical Analysis, "Reality Check 4: GPS, conditioning and nonlinear least squares". Lengths in km.
mod four_transmitters {
    use super::*;

    const LIGHT_KM_PER_S: f64 = 299_792.458;
    const TIMES_S: [f64; 4] = [0.07074, 0.07220, 0.07690, 0.07242];

    fn transmitters() -> Site {
        let places = [
            [15600.0, 7540.0, 20140.0],
            [18760.0, 2750.0, 18610.0],
            [17610.0, 14630.0, 13480.0],
            [19170.0, 610.0, 18390.0],
        ];
        site(&places, LIGHT_KM_PER_S, [-2e4; 3], [3e4; 3])
    }

    #[test]
    fn the_algebra_gives_the_answer_and_only_it() {
        let site = transmitters();
        let places: Vec<_> = site.antennas.iter().map(|a| a.position_m).collect();
        let ranges = TIMES_S.map(|time| LIGHT_KM_PER_S * time);
        let found = roots(&places, &ranges, None);
        // The second root of the squared equations, near (-39.7, -134.3, -9413.6) km, is none of the unsquared ones.
        assert_eq!(found.len(), 1, "{found:?}");
        let expected = Vector3::new(-41.772_709_570, -16.789_194_106, 6_370.059_559_223);
        assert_relative_eq!(found[0].position_m, expected, epsilon = 1e-6);
        assert_relative_eq!(found[0].emission_range_m / LIGHT_KM_PER_S, -3.201_565_830e-3, epsilon = 1e-12);
    }

    #[test]
    fn least_squares_and_the_search_agree_with_the_algebra() {
        let site = transmitters();
        let expected = Vector3::new(-41.772_709_570, -16.789_194_106, 6_370.059_559_223);
        let (found, _) = solve(&site, &TIMES_S, 1e-13, [0.0, 0.0, 6370.0]);
        assert_relative_eq!(found, expected, epsilon = 1e-6);
        let fix = locate(&site, &Arrivals::independent(&TIMES_S, &[1e-9; 4]), 0.95).unwrap();
        assert_eq!(fix.modes.len(), 1);
        assert_relative_eq!(fix.position_m, expected, epsilon = 1e-3);
    }

    /// Greatest error (largest coordinate, km) over all clock errors of -1, 0 and 1 times 1e-8 s.
    fn greatest_error_km(phi: [f64; 4], theta: [f64; 4]) -> f64 {
        let radius = 26_570.0;
        let places: Vec<[f64; 3]> = (0..4)
            .map(|i| {
                let (p, t): (f64, f64) = (phi[i], theta[i]);
                [radius * p.cos() * t.cos(), radius * p.cos() * t.sin(), radius * p.sin()]
            })
            .collect();
        let site = site(&places, LIGHT_KM_PER_S, [-3e4; 3], [3e4; 3]);
        let receiver = Vector3::new(0.0, 0.0, 6370.0);
        let exact: Vec<f64> =
            site.antennas.iter().map(|a| 1e-4 + (a.position_m - receiver).norm() / LIGHT_KM_PER_S).collect();
        let mut greatest: f64 = 0.0;
        for combination in 0..81 {
            let errors = [1, 3, 9, 27].map(|power| f64::from(combination / power % 3 - 1) * 1e-8);
            let times: Vec<f64> = exact.iter().zip(errors).map(|(time, error)| time + error).collect();
            let (found, _) = solve(&site, &times, 1e-11, [0.0, 0.0, 6370.0]);
            greatest = greatest.max((found - receiver).amax());
        }
        greatest
    }

    #[test]
    fn errors_are_magnified_as_published() {
        use std::f64::consts::PI;
        let spread = greatest_error_km([0.0, 0.4, 0.8, 1.2], [0.0, PI / 2.0, PI, 1.5 * PI]);
        assert_relative_eq!(spread, 0.013_175, max_relative = 1e-3);
        let bundled = greatest_error_km([0.5, 0.75, 1.0, 1.25], [1.5, 2.0, 2.5, 3.0]);
        assert_relative_eq!(bundled, 0.214_907, max_relative = 1e-3);
        // Nearly one direction: an error of 3 m in range becomes 860 km, which linear theory does not give (it says
        // 846 km).
        let one_direction = greatest_error_km([0.70, 0.71, 0.72, 0.73], [2.15, 2.10, 2.05, 2.00]);
        assert_relative_eq!(one_direction, 859.5457, max_relative = 1e-3);
    }
}

// D. Kalman, "An Underdetermined Linear System for GPS", College Math. J. 33(5), 2002; inputs from memory, consistent
// when recomputed. Lengths in earth radii, times in ms.
#[test]
fn a_true_double_answer_is_told_twice() {
    let places = [[1.0, 2.0, 0.0], [2.0, 0.0, 2.0], [1.0, 1.0, 1.0], [2.0, 1.0, 0.0]];
    let sent = [19.9, 2.4, 32.6, 19.9];
    // |x - S| = c (T - t): as arrivals at the stations of a source that "emits" at -T.
    let times = sent.map(|time| -time);
    let site = site(&places, 0.047, [0.0; 3], [2.5; 3]);
    let expected = [
        Vector3::new(0.666_452_64, 0.666_452_64, 0.332_483_01),
        Vector3::new(1.316_902_77, 1.316_902_77, 0.790_375_64),
    ];
    let positions: Vec<_> = site.antennas.iter().map(|a| a.position_m).collect();
    let found = roots(&positions, &times.map(|time| time * 0.047), None);
    assert_eq!(found.len(), 2);
    let emitted: Vec<f64> = found.iter().map(|root| -root.emission_range_m / 0.047).collect();
    for (position, moment) in expected.iter().zip([49.990_758_65, 43.127_015_94]) {
        let near = found.iter().zip(&emitted).find(|(root, _)| (root.position_m - position).norm() < 1e-6);
        let (_, found_moment) = near.unwrap_or_else(|| panic!("{position} is missing in {found:?}"));
        assert_relative_eq!(*found_moment, moment, epsilon = 1e-5);
    }
    let fix = locate(&site, &Arrivals::independent(&times, &[0.01; 4]), 0.95).unwrap();
    assert_eq!(fix.modes.len(), 2);
    for position in &expected {
        assert!(fix.modes.iter().any(|mode| (mode.minimum.position_m - position).norm() < 1e-5));
    }
    assert!(fix.flags.contains(&arcstead_solver::Flag::MirrorAmbiguity));
}

// P. Shearer, Introduction to Seismology, chapter 5, exercise: an earthquake heard at thirteen stations; plane, 6 km/s.
// The answers were recomputed with numpy.
mod thirteen_stations {
    use super::*;

    const TABLE: [[f64; 3]; 13] = [
        [9.0, 24.0, 14.189],
        [24.0, 13.2, 13.679],
        [33.0, 4.8, 13.491],
        [45.0, 10.8, 14.406],
        [39.0, 27.0, 13.075],
        [54.0, 30.0, 15.234],
        [15.0, 39.0, 13.270],
        [36.0, 42.0, 12.239],
        [27.0, 48.0, 12.835],
        [48.0, 48.0, 14.574],
        [15.0, 42.0, 12.624],
        [18.0, 15.0, 13.496],
        [30.0, 36.0, 10.578],
    ];

    fn stations() -> (Site, Vec<f64>) {
        let places: Vec<[f64; 3]> = TABLE.iter().map(|row| [row[0], row[1], 0.0]).collect();
        let times = TABLE.iter().map(|row| row[2]).collect();
        (site(&places, 6.0, [0.0, 0.0, 0.0], [100.0, 100.0, 0.0]), times)
    }

    #[test]
    fn least_squares() {
        let (site, times) = stations();
        let (found, sse) = solve(&site, &times, 1.0, [50.0, 50.0, 0.0]);
        assert_relative_eq!(found.x, 28.029_54, epsilon = 1e-5);
        assert_relative_eq!(found.y, 31.649_33, epsilon = 1e-5);
        assert_relative_eq!(sse, 4.007_453, epsilon = 1e-6);
    }

    #[test]
    fn spread_of_the_answer() {
        let (site, times) = stations();
        let (found, sse) = solve(&site, &times, 1.0, [50.0, 50.0, 0.0]);
        let sigma_s = (sse / 10.0).sqrt();
        let covariance = covariance_m2(&site, 6.0 * sigma_s, found.into());
        assert_relative_eq!(covariance[(0, 0)].sqrt(), 1.570, epsilon = 1e-3);
        assert_relative_eq!(covariance[(1, 1)].sqrt(), 1.433, epsilon = 1e-3);
        // A one-sigma ellipse holds 39.347 %.
        let ellipse = Ellipse::in_plan(&covariance, 0.393_469_34);
        assert_relative_eq!(ellipse.semi_major_m, 1.577, epsilon = 1e-3);
        assert_relative_eq!(ellipse.semi_minor_m, 1.426, epsilon = 1e-3);
    }

    #[test]
    fn best_node_of_a_grid_of_one_kilometre() {
        let (site, times) = stations();
        let likelihood = Likelihood::new(&site, &Arrivals::independent(&times, &[1.0; 13])).unwrap();
        let mut evaluator = Evaluator::new(&likelihood);
        let mut best = (f64::INFINITY, 0, 0);
        for x in 0..=100 {
            for y in 0..=100 {
                let value = evaluator.at(&Vector3::new(f64::from(x), f64::from(y), 0.0)).unwrap();
                if value.chi_square < best.0 {
                    best = (value.chi_square, x, y);
                }
            }
        }
        assert_eq!((best.1, best.2), (28, 32));
        assert_relative_eq!(best.0, 4.029_762, epsilon = 1e-6);
    }
}

// Y. T. Chan, K. C. Ho, "A simple and efficient estimator for hyperbolic location", IEEE Trans. Signal Processing 42(8),
// 1994: the array; traces of the Cramer-Rao bound recomputed with numpy.
#[test]
fn bound_of_the_ten_sensor_array() {
    let x = [0.0, -5.0, 4.0, -2.0, 7.0, -7.0, 2.0, -4.0, 3.0, 1.0];
    let y = [0.0, 8.0, 6.0, 4.0, 3.0, 5.0, 5.0, 2.0, 3.0, 8.0];
    let near = [1.979_372, 0.688_351, 0.145_079, 0.133_427, 0.114_272, 0.105_375, 0.103_218, 0.094_319];
    let far = [398.0885, 328.8220, 143.9386, 44.0635, 38.5352, 38.5304, 36.4695, 33.7309];
    for sensors in 3..=10 {
        let places: Vec<[f64; 3]> = (0..sensors).map(|i| [x[i], y[i], 0.0]).collect();
        let site = site(&places, 1.0, [-500.0, -500.0, 0.0], [500.0, 500.0, 0.0]);
        // Range differences with covariance s^2 (I + 11')/2 come from ranges of variance s^2/2 each.
        let trace = |s2: f64, at: [f64; 3]| covariance_m2(&site, (s2 / 2.0).sqrt(), at).trace();
        assert_relative_eq!(trace(1e-3, [8.0, 22.0, 0.0]), near[sensors - 3], max_relative = 1e-5);
        assert_relative_eq!(trace(1e-5, [-50.0, 250.0, 0.0]), far[sensors - 3], max_relative = 1e-5);
    }
}

mod dilution_of_precision {
    use super::*;

    /// Horizontal, vertical and whole dilution for antennas in these directions from the source.
    fn dilution(directions: &[[f64; 3]]) -> (f64, f64, f64) {
        let places: Vec<[f64; 3]> = directions.iter().map(|d| d.map(|c| 100.0 * c)).collect();
        let site = site(&places, 1.0, [-500.0; 3], [500.0; 3]);
        let c = covariance_m2(&site, 1.0, [0.0; 3]);
        ((c[(0, 0)] + c[(1, 1)]).sqrt(), c[(2, 2)].sqrt(), c.trace().sqrt())
    }

    // Common practice, no source: follows from symmetry.
    #[test]
    fn one_above_and_three_on_the_horizon() {
        let horizon = |degrees: f64| [degrees.to_radians().sin(), degrees.to_radians().cos(), 0.0];
        let (h, v, p) = dilution(&[[0.0, 0.0, 1.0], horizon(0.0), horizon(120.0), horizon(240.0)]);
        assert_relative_eq!(h, (4.0_f64 / 3.0).sqrt(), epsilon = 1e-9);
        assert_relative_eq!(v, (4.0_f64 / 3.0).sqrt(), epsilon = 1e-9);
        assert_relative_eq!(p, (8.0_f64 / 3.0).sqrt(), epsilon = 1e-9);
    }

    // Common practice, no source: follows from symmetry.
    #[test]
    fn tetrahedron_and_cube() {
        let tetrahedron = [[1.0, 1.0, 1.0], [1.0, -1.0, -1.0], [-1.0, 1.0, -1.0], [-1.0, -1.0, 1.0]];
        assert_relative_eq!(dilution(&tetrahedron).2, 1.5, epsilon = 1e-9);
        let cube: Vec<[f64; 3]> =
            (0..8).map(|corner| [1, 2, 4].map(|bit| if corner & bit == 0 { -1.0 } else { 1.0 })).collect();
        assert_relative_eq!(dilution(&cube).2, 3.0 / 8.0_f64.sqrt(), epsilon = 1e-9);
    }

    // N. Levanon, "Lowest GDOP in 2-D scenarios", IEE Proc. Radar Sonar Navig. 147(3), 2000: 2/sqrt N at the
    // middle of a regular polygon.
    #[test]
    fn regular_polygons_on_a_plane() {
        for corners in 3..=12 {
            let places: Vec<[f64; 3]> = (0..corners)
                .map(|k| {
                    let turn = std::f64::consts::TAU * f64::from(k) / f64::from(corners);
                    [10.0 * turn.cos(), 10.0 * turn.sin(), 0.0]
                })
                .collect();
            let site = site(&places, 1.0, [-50.0, -50.0, 0.0], [50.0, 50.0, 0.0]);
            let found = covariance_m2(&site, 1.0, [0.0; 3]).trace().sqrt();
            assert_relative_eq!(found, 2.0 / f64::from(corners).sqrt(), epsilon = 1e-9);
        }
    }
}

// Exact algebra of small square arrays (recomputed): plane, four corners, 0.1 ns an antenna, v = c.
#[test]
fn small_square_arrays() {
    let square = |side: f64| {
        let h = side / 2.0;
        site(
            &[[-h, -h, 0.0], [h, -h, 0.0], [h, h, 0.0], [-h, h, 0.0]],
            299_792_458.0,
            [-500.0, -500.0, 0.0],
            [500.0, 500.0, 0.0],
        )
    };
    let sigma_m = 0.1e-9 * 299_792_458.0;
    // Side, range, and the sigma of the range on the axis through a side's middle.
    for (side, range, middle) in
        [(4.0, 10.0, 1.8447), (4.0, 20.0, 14.919), (4.0, 40.0, 119.77), (10.0, 20.0, 0.9399)]
    {
        let along_x = covariance_m2(&square(side), sigma_m, [range, 0.0, 0.0]);
        assert_relative_eq!(along_x[(0, 0)].sqrt(), middle, max_relative = 1e-4);
    }
    // On the axis through a corner of the 4 m square.
    for (range, corner) in [(10.0, 0.7942), (20.0, 3.0428), (40.0, 12.037)] {
        let d = range / 2.0_f64.sqrt();
        let diagonal = covariance_m2(&square(4.0), sigma_m, [d, d, 0.0]);
        let variance = 0.5 * (diagonal[(0, 0)] + diagonal[(1, 1)] + 2.0 * diagonal[(0, 1)]);
        assert_relative_eq!(variance.sqrt(), corner, max_relative = 1e-4);
    }
    let near = covariance_m2(&square(4.0), sigma_m, [10.0, 0.0, 0.0]);
    assert_relative_eq!(near[(1, 1)].sqrt(), 0.0723, epsilon = 5e-5);
    assert_relative_eq!((near[(1, 1)].sqrt() / 10.0).to_degrees(), 0.4145, epsilon = 2e-4);
    let far = covariance_m2(&square(4.0), sigma_m, [400.0, 0.0, 0.0]);
    assert_relative_eq!((far[(1, 1)].sqrt() / 400.0).to_degrees(), 0.429_42, epsilon = 1e-4);
}

// Recomputed from geometry: two antennas 2 m apart, a source far away.
#[test]
fn delay_of_two_antennas_tells_the_angle() {
    let pair = site(&[[0.0; 3], [2.0, 0.0, 0.0]], 299_792_458.0, [-2e6, -2e6, 0.0], [2e6, 2e6, 0.0]);
    for (delay_ns, angle_deg) in [(3.335_641_0, 60.0), (5.0, 41.4545)] {
        let times = [0.0, -delay_ns * 1e-9];
        let likelihood = Likelihood::new(&pair, &Arrivals::independent(&times, &[1e-12; 2])).unwrap();
        let mut evaluator = Evaluator::new(&likelihood);
        let at = |angle_deg: f64| {
            let angle = angle_deg.to_radians();
            Vector3::new(1.0 + 1e6 * angle.cos(), 1e6 * angle.sin(), 0.0)
        };
        // A tenth of a degree is 10 ps here, seven sigmas.
        assert!(evaluator.at(&at(angle_deg)).unwrap().chi_square < 1.0);
        assert!(evaluator.at(&at(angle_deg + 0.1)).unwrap().chi_square > 20.0);
    }
    let impossible = Arrivals::independent(&[0.0, 6.68e-9], &[1e-12; 2]);
    assert_eq!(arcstead_solver::set_aside(&pair, &impossible).1.len(), 1);
    let just_possible = Arrivals::independent(&[0.0, 6.671e-9], &[1e-12; 2]);
    assert!(arcstead_solver::set_aside(&pair, &just_possible).1.is_empty());
}

/// A full covariance enters as it stands: correlated arrivals are not independent ones.
#[test]
fn correlated_arrivals_move_the_answer() {
    let places = [[0.0, 0.0, 1.0], [9.0, 0.0, 3.0], [9.0, 8.0, 1.5], [0.0, 8.0, 4.0], [4.0, 12.0, 2.0]];
    let site = site(&places, 3e8, [-20.0; 3], [30.0; 3]);
    let source = Vector3::new(5.0, 5.0, 6.0);
    let times: Vec<f64> = site
        .antennas
        .iter()
        .enumerate()
        .map(|(i, a)| (a.position_m - source).norm() / 3e8 + 1e-10 * (i as f64).sin())
        .collect();
    let independent = Arrivals::independent(&times, &[1e-10; 5]);
    let mut correlated = independent.clone();
    correlated.random_covariance_s2 = DMatrix::from_fn(5, 5, |i, j| {
        if i == j {
            1e-20
        } else if i + j == 1 {
            0.9e-20
        } else {
            0.0
        }
    });
    let best = |arrivals: &Arrivals| {
        let likelihood = Likelihood::new(&site, arrivals).unwrap();
        refine(&mut Evaluator::new(&likelihood), &site.search, &source).unwrap().position_m
    };
    assert!((best(&independent) - best(&correlated)).norm() > 1e-3);
}
