//! Weakening behind a single knife edge (Recommendation ITU-R P.526).

/// Dimensionless height of an edge over the straight line between two ends:
/// `nu = h sqrt(2/lambda (1/d1 + 1/d2))` (Recommendation ITU-R P.526, single knife-edge obstacle).
///
/// `height_m` is the height h of the edge over the line (negative when the line clears it), `distances_m` the
/// distances d1 and d2 of the two ends from the edge, `wavelength_m` lambda; all in metres, distances and
/// wavelength above zero. An edge at one of the ends (distance 0) gives infinity.
#[must_use]
pub fn knife_edge_nu(height_m: f64, distances_m: (f64, f64), wavelength_m: f64) -> f64 {
    height_m * (2.0 / wavelength_m * (1.0 / distances_m.0 + 1.0 / distances_m.1)).sqrt()
}

/// Loss behind a single knife edge in dB, zero or more:
/// `J(nu) = 6.9 + 20 log10(sqrt((nu - 0.1)^2 + 1) + nu - 0.1)` for nu > -0.78, else 0
/// (Recommendation ITU-R P.526). Within 0.13 dB of the exact Fresnel integral from nu = -0.5 to 5.
#[must_use]
pub fn knife_edge_loss_db(nu: f64) -> f64 {
    if nu > -0.78 {
        let shifted = nu - 0.1;
        // The approximation dips to some -0.01 dB just above its limit.
        (6.9 + 20.0 * (shifted.hypot(1.0) + shifted).log10()).max(0.0)
    } else {
        0.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_abs_diff_eq;
    use arcstead_solver::SPEED_OF_LIGHT_M_PER_S;

    #[test]
    fn loss_of_the_recommendation() {
        // Recommendation ITU-R P.526: values of its formula; in the third column the exact Fresnel integral.
        for (nu, formula_db, exact_db) in [
            (-0.5, 1.9592, 1.8586),
            (0.0, 6.0329, 6.0206),
            (1.0, 13.9257, 13.8641),
            (2.4, 20.5393, 20.6182),
            (5.0, 26.8136, 26.9362),
        ] {
            assert_abs_diff_eq!(knife_edge_loss_db(nu), formula_db, epsilon = 1e-4);
            assert_abs_diff_eq!(knife_edge_loss_db(nu), exact_db, epsilon = 0.13);
        }
        assert_abs_diff_eq!(knife_edge_loss_db(-0.78), 0.0);
        assert_abs_diff_eq!(knife_edge_loss_db(-9.0), 0.0);
    }

    #[test]
    fn nu_of_worked_geometries() {
        // Recommendation ITU-R P.526, formula worked for two geometries.
        for (height_m, distances_m, frequency_hz, nu, loss_db) in
            [(1.0, (10.0, 20.0), 500e6, 0.707351, 11.8954), (2.0, (5.0, 15.0), 300e6, 1.461099, 16.5862)]
        {
            let found = knife_edge_nu(height_m, distances_m, SPEED_OF_LIGHT_M_PER_S / frequency_hz);
            assert_abs_diff_eq!(found, nu, epsilon = 1e-6);
            assert_abs_diff_eq!(knife_edge_loss_db(found), loss_db, epsilon = 1e-4);
        }
    }
}
