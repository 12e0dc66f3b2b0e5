//! Our least squares against the `levenberg-marquardt` crate (a port of MINPACK), which solves for the emission time where
//! ours marginalises it.

#![allow(clippy::unwrap_used, reason = "a test that unwraps fails with the line it stands on")]

use arcstead_solver::least_squares::{Ended, refine};
use arcstead_solver::likelihood::{Evaluator, Likelihood};
use arcstead_solver::nalgebra::storage::Owned;
use arcstead_solver::nalgebra::{DVector, Dyn, Matrix, OMatrix, U4, Vector3, Vector4};
use arcstead_solver::{Arrivals, SearchBox};
use arcstead_tests::bare_site;
use levenberg_marquardt::{LeastSquaresProblem, LevenbergMarquardt};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

const SPEED: f64 = 3e8;

/// Unknowns: x, y, z and the emission time times the speed, in metres.
struct Peer {
    antennas: Vec<Vector3<f64>>,
    ranges_m: Vec<f64>,
    sigma_m: Vec<f64>,
    at: Vector4<f64>,
}

impl LeastSquaresProblem<f64, Dyn, U4> for Peer {
    type ParameterStorage = Owned<f64, U4>;
    type ResidualStorage = Owned<f64, Dyn>;
    type JacobianStorage = Owned<f64, Dyn, U4>;

    fn set_params(&mut self, at: &Vector4<f64>) {
        self.at = *at;
    }

    fn params(&self) -> Vector4<f64> {
        self.at
    }

    fn residuals(&self) -> Option<Matrix<f64, Dyn, arcstead_solver::nalgebra::U1, Owned<f64, Dyn>>> {
        let place = self.at.xyz();
        Some(DVector::from_fn(self.antennas.len(), |i, _| {
            (self.ranges_m[i] - self.at.w - (place - self.antennas[i]).norm()) / self.sigma_m[i]
        }))
    }

    fn jacobian(&self) -> Option<OMatrix<f64, Dyn, U4>> {
        let place = self.at.xyz();
        Some(OMatrix::<f64, Dyn, U4>::from_fn(self.antennas.len(), |i, axis| {
            let slope = if axis == 3 { 1.0 } else { (place - self.antennas[i]).normalize()[axis] };
            -slope / self.sigma_m[i]
        }))
    }
}

#[test]
fn both_end_at_the_same_place() {
    let mut rng = ChaCha8Rng::seed_from_u64(51);
    let mut compared = 0;
    for _ in 0..300 {
        let count = rng.random_range(6..9);
        let antennas: Vec<Vector3<f64>> = (0..count)
            .map(|_| {
                Vector3::new(
                    rng.random_range(0.0..16.0),
                    rng.random_range(0.0..14.0),
                    rng.random_range(1.0..9.0),
                )
            })
            .collect();
        let source = Vector3::new(
            rng.random_range(2.0..14.0),
            rng.random_range(2.0..12.0),
            rng.random_range(2.0..9.0),
        );
        let sigma_s: Vec<f64> = (0..count).map(|_| rng.random_range(0.03e-9..0.3e-9)).collect();
        let times: Vec<f64> = antennas
            .iter()
            .zip(&sigma_s)
            .map(|(antenna, sigma_s)| {
                let error: f64 = StandardNormal.sample(&mut rng);
                (source - antenna).norm() / SPEED + sigma_s * error
            })
            .collect();
        let search = SearchBox { min_m: Vector3::repeat(-50.0), max_m: Vector3::repeat(50.0) };
        let site = bare_site(&antennas, SPEED, search);
        let likelihood = Likelihood::new(&site, &Arrivals::independent(&times, &sigma_s)).unwrap();
        let start = source + Vector3::new(1.0, -1.0, 0.5);
        let ours = refine(&mut Evaluator::new(&likelihood), &site.search, &start).unwrap();
        assert_eq!(ours.ended, Ended::Converged);

        let peer = Peer {
            ranges_m: times.iter().map(|time| time * SPEED).collect(),
            sigma_m: sigma_s.iter().map(|sigma| sigma * SPEED).collect(),
            at: start.push(0.0),
            antennas,
        };
        let (peer, report) = LevenbergMarquardt::new().minimize(peer);
        // Where two minima are near, two methods may take one each; that is no difference between the methods.
        if report.termination.was_successful() && (ours.position_m - peer.at.xyz()).norm() < 1.0 {
            let away = (ours.position_m - peer.at.xyz()).norm();
            assert!(away < 1e-5, "{away} m apart");
            assert!((ours.value.chi_square - 2.0 * report.objective_function).abs() < 1e-6);
            compared += 1;
        }
    }
    assert!(compared > 280, "{compared} compared");
}
