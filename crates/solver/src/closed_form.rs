//! The algebraic solution of the arrival-time equations: a start for least squares that needs no guess.
//!
//! With ranges `rho_i = v t_i` and `b = v t0`, the equations `|x - a_i| = rho_i - b` squared are linear in
//! x, b and `lambda = |x|^2 - b^2`:
//!
//! `2 a_i . x - 2 rho_i b - lambda = |a_i|^2 - rho_i^2`.
//!
//! The least determined combination of the unknowns is left free and fixed by the definition of lambda, a quadratic
//! with two roots (after S. Bancroft, *An algebraic solution of the GPS equations*, IEEE Trans. AES 21(1), 1985, where
//! the linear system is square). Leaving free what the singular values say, rather than lambda, serves four antennas, many
//! antennas and flat arrays alike. Squaring invents answers: a root must satisfy the unsquared equations.

use nalgebra::{DMatrix, DVector, Vector3};

/// An algebraic solution.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Root {
    /// Position in metres.
    pub position_m: Vector3<f64>,
    /// Emission time times the speed, in the offset of the ranges given, in metres.
    pub emission_range_m: f64,
}

/// Singular value decompositions are given up after this many sweeps; without a limit they do not end on NaN.
const SVD_SWEEPS: usize = 200;

/// The positions that explain the ranges algebraically: none, one or two.
///
/// `antennas_m` and `ranges_m` (arrival time times speed) belong together; `height_m` holds the height of the source where
/// it is known. Fewer antennas than unknowns + 1, antennas in one line, or values that are not finite give no
/// root, and so do roots that only the squared equations have. With more antennas than unknowns + 1 a root is a start
/// near an answer, to be weighed by its likelihood.
#[must_use]
pub fn roots(antennas_m: &[Vector3<f64>], ranges_m: &[f64], height_m: Option<f64>) -> Vec<Root> {
    let n = antennas_m.len();
    let unknowns = if height_m.is_some() { 2 } else { 3 };
    let finite = antennas_m.iter().flatten().chain(ranges_m).all(|value| value.is_finite());
    if n < unknowns + 1 || ranges_m.len() != n || !finite {
        return Vec::new();
    }
    // About the centre and in units of the array's size, so that no column dwarfs another.
    let centre_m = antennas_m.iter().sum::<Vector3<f64>>() / n as f64;
    let mean_m = ranges_m.iter().sum::<f64>() / n as f64;
    let size_m = antennas_m.iter().map(|antenna| (antenna - centre_m).norm()).fold(0.0, f64::max);
    if size_m <= 0.0 {
        return Vec::new();
    }
    let a: Vec<Vector3<f64>> = antennas_m.iter().map(|antenna| (antenna - centre_m) / size_m).collect();
    let rho: Vec<f64> = ranges_m.iter().map(|range| (range - mean_m) / size_m).collect();
    let height = height_m.map(|z| (z - centre_m.z) / size_m);

    // Columns: the unknown coordinates, b, lambda. Rows of zeros make the null space complete.
    let columns = unknowns + 2;
    let mut system = DMatrix::zeros(n.max(columns), columns);
    let mut right = DVector::zeros(n.max(columns));
    for i in 0..n {
        for axis in 0..unknowns {
            system[(i, axis)] = 2.0 * a[i][axis];
        }
        system[(i, unknowns)] = -2.0 * rho[i];
        system[(i, unknowns + 1)] = -1.0;
        right[i] = a[i].norm_squared() - rho[i] * rho[i] - height.map_or(0.0, |z| 2.0 * a[i].z * z);
    }
    let Some(svd) = system.try_svd(true, true, f64::EPSILON, SVD_SWEEPS) else { return Vec::new() };
    let (Some(u), Some(v_t)) = (svd.u.as_ref(), svd.v_t.as_ref()) else { return Vec::new() };
    let mut order: Vec<usize> = (0..columns).collect();
    order.sort_by(|&i, &j| svd.singular_values[j].total_cmp(&svd.singular_values[i]));
    let free = order[columns - 1];
    let determined = &order[..columns - 1];
    // Two free combinations: antennas in one line. A curve of answers, not a start.
    if svd.singular_values[determined[columns - 2]] < 1e-9 * svd.singular_values[order[0]] {
        return Vec::new();
    }
    let mut particular = DVector::zeros(columns);
    for &k in determined {
        let part = u.column(k).dot(&right) / svd.singular_values[k];
        particular += v_t.row(k).transpose() * part;
    }
    let direction = v_t.row(free).transpose();

    // |x|^2 - b^2 - lambda = 0 along particular + s direction.
    let split = |y: &DVector<f64>, z: f64| {
        let x = Vector3::new(y[0], y[1], if unknowns == 3 { y[2] } else { z });
        (x, y[unknowns], y[unknowns + 1])
    };
    let (x0, b0, lambda0) = split(&particular, height.unwrap_or(0.0));
    let (x1, b1, lambda1) = split(&direction, 0.0);
    let quadratic = x1.norm_squared() - b1 * b1;
    let linear = 2.0 * (x0.dot(&x1) - b0 * b1) - lambda1;
    let constant = x0.norm_squared() - b0 * b0 - lambda0;
    real_roots(quadratic, linear, constant)
        .into_iter()
        .filter_map(|s| {
            let x = x0 + x1 * s;
            let b = b0 + b1 * s;
            // |x - a_i| = rho_i - b has no answer where the right side is negative. A little slack: noise may put
            // a source that sits on an antenna on the wrong side of zero.
            let nearest = rho.iter().map(|r| r - b).fold(f64::INFINITY, f64::min);
            let greatest = rho.iter().map(|r| (r - b).abs()).fold(0.0, f64::max);
            let genuine = nearest >= -1e-3 * greatest && x.iter().all(|value| value.is_finite());
            genuine.then(|| Root { position_m: centre_m + x * size_m, emission_range_m: mean_m + b * size_m })
        })
        .collect()
}

/// Real roots of `a s^2 + b s + c`. Where noise has pushed a touching pair apart into the complex plane, the real part
/// of the pair: the nearest the data come to an answer.
fn real_roots(a: f64, b: f64, c: f64) -> Vec<f64> {
    let size = a.abs().max(b.abs()).max(c.abs());
    if a.abs() <= 1e-14 * size {
        return if b == 0.0 { Vec::new() } else { vec![-c / b] };
    }
    let discriminant = b * b - 4.0 * a * c;
    if discriminant <= 0.0 {
        return vec![-b / (2.0 * a)];
    }
    // The stable form: no difference of nearly equal numbers.
    let q = -0.5 * (b + b.signum() * discriminant.sqrt());
    if q == 0.0 { vec![0.0] } else { vec![q / a, c / q] }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use rand::{RngExt, SeedableRng};
    use rand_chacha::ChaCha8Rng;

    #[test]
    fn one_root_is_the_source_for_any_geometry() {
        let mut rng = ChaCha8Rng::seed_from_u64(3);
        for trial in 0..500 {
            let flat = trial % 3 == 0;
            let count = 4 + trial % 4;
            let mut point = |scale: f64| Vector3::from_fn(|_, _| rng.random_range(-scale..scale));
            let antennas: Vec<_> = (0..count)
                .map(|_| {
                    let mut p = point(10.0);
                    if flat {
                        p.z = 2.0;
                    }
                    p
                })
                .collect();
            let source = point(20.0);
            let ranges: Vec<_> = antennas.iter().map(|a| 1234.5 + (source - a).norm()).collect();
            let found = roots(&antennas, &ranges, None);
            let error = found.iter().map(|r| (r.position_m - source).norm()).fold(f64::INFINITY, f64::min);
            assert!(error < 1e-4, "trial {trial}: {error} m off, {found:?}");
            for root in &found {
                // With more antennas than unknowns + 1 the second root only lies where the data say least; with
                // that many, or in a flat array, both explain every range.
                if count > 4 && !flat {
                    continue;
                }
                for (antenna, range) in antennas.iter().zip(&ranges) {
                    let misfit = (root.position_m - antenna).norm() - (range - root.emission_range_m);
                    assert!(misfit.abs() < 1e-3, "trial {trial}: a root that explains nothing");
                }
            }
        }
    }

    #[test]
    fn a_flat_array_gives_both_mirror_answers() {
        let antennas =
            [(0.0, 0.0), (10.0, 1.0), (9.0, 11.0), (-1.0, 8.0)].map(|(x, y)| Vector3::new(x, y, 2.0));
        let source = Vector3::new(4.0, 15.0, 7.0);
        let ranges = antennas.map(|a| (source - a).norm());
        let mut heights: Vec<_> = roots(&antennas, &ranges, None).iter().map(|r| r.position_m.z).collect();
        heights.sort_by(f64::total_cmp);
        assert_relative_eq!(heights[0], -3.0, epsilon = 1e-6);
        assert_relative_eq!(heights[1], 7.0, epsilon = 1e-6);
    }

    #[test]
    fn on_a_plane_three_antennas_do() {
        let antennas =
            [(0.0, 0.0, 2.0), (10.0, 1.0, 3.0), (4.0, 11.0, 1.0)].map(|(x, y, z)| Vector3::new(x, y, z));
        let source = Vector3::new(3.0, 4.0, 6.0);
        let ranges = antennas.map(|a| (source - a).norm());
        let found = roots(&antennas, &ranges, Some(6.0));
        assert!(found.iter().any(|root| (root.position_m - source).norm() < 1e-9), "{found:?}");
    }

    #[test]
    fn what_gives_no_start_gives_no_root() {
        let line = [0.0, 1.0, 2.0, 3.0].map(|x| Vector3::new(x, 0.0, 0.0));
        assert!(roots(&line, &[4.0, 3.5, 3.2, 3.4], None).is_empty());
        assert!(roots(&line[..3], &[4.0, 3.5, 3.2], None).is_empty());
        assert!(roots(&line, &[f64::NAN, 0.0, 0.0, 0.0], None).is_empty());
        let one_place = [Vector3::new(1.0, 1.0, 1.0); 4];
        assert!(roots(&one_place, &[0.0; 4], None).is_empty());
    }
}
