//! How well a delay can be measured at best (Cramér-Rao bounds).
//!
//! Local bounds: below a threshold of signal to noise a correlation slips by whole cycles, and no bound of this kind
//! tells so.

use std::f64::consts::PI;

/// Least variance in s^2 of the arrival time of a pulse of known shape in white noise, `1 / (beta^2 2 E / N0)`.
///
/// `bandwidth_rad_per_s` is beta, the root mean square angular frequency of the pulse's energy spectrum; `energy_to_noise` is
/// E / N0 with N0 the one-sided noise density. Infinite when either is zero.
///
/// Source: C. W. Helstrom, *Statistical Theory of Signal Detection*, 1968 (formula from memory).
///
/// ```
/// let sigma_s = arcstead_core::known_pulse_variance_s2(std::f64::consts::TAU * 1e9, 50.0).sqrt();
/// assert!((sigma_s - 1.5915e-11).abs() < 1e-15);
/// ```
#[must_use]
pub fn known_pulse_variance_s2(bandwidth_rad_per_s: f64, energy_to_noise: f64) -> f64 {
    1.0 / (bandwidth_rad_per_s.powi(2) * 2.0 * energy_to_noise)
}

/// Least variance in s^2 of the delay between two channels that hear the same random signal in independent noise, flat
/// from `low_hz` to `high_hz`, observed for `duration_s`, with power ratio `signal_to_noise` (not in dB) on both:
/// `[8 pi^2 T (s^2 / (1 + 2 s)) (f2^3 - f1^3) / 3]^-1`.
///
/// Source: C. H. Knapp, G. C. Carter, IEEE Trans. ASSP 24(4), 1976; A. H. Quazi, IEEE Trans. ASSP 29(3), 1981
/// (formula from memory).
///
/// ```
/// let sigma_s = arcstead_core::flat_band_delay_variance_s2(100.0, 100e-9, 0.3e9, 1e9).sqrt();
/// assert!((sigma_s - 2.8016e-12).abs() < 1e-16);
/// ```
#[must_use]
pub fn flat_band_delay_variance_s2(signal_to_noise: f64, duration_s: f64, low_hz: f64, high_hz: f64) -> f64 {
    let coherent = signal_to_noise.powi(2) / (1.0 + 2.0 * signal_to_noise);
    3.0 / (8.0 * PI.powi(2) * duration_s * coherent * (high_hz.powi(3) - low_hz.powi(3)))
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn two_noisy_channels() {
        // Knapp, Carter 1976; Quazi 1981 (formula from memory).
        for (db, duration_s, low_hz, high_hz, sigma_s) in [
            (20.0, 100e-9, 0.3e9, 1e9, 2.8016e-12),
            (10.0, 100e-9, 50e6, 500e6, 25.278e-12),
            (0.0, 1e-6, 0.3e9, 1.5e9, 5.8349e-12),
            (-10.0, 100e-9, 0.3e9, 1e9, 216.47e-12),
        ] {
            let ratio = 10_f64.powf(db / 10.0);
            let found = flat_band_delay_variance_s2(ratio, duration_s, low_hz, high_hz).sqrt();
            assert_relative_eq!(found, sigma_s, max_relative = 3e-5);
        }
    }

    #[test]
    fn a_known_pulse_is_timed_worse_with_less_energy() {
        let strong = known_pulse_variance_s2(1e9, 100.0);
        assert_relative_eq!(known_pulse_variance_s2(1e9, 25.0), 4.0 * strong);
        assert!(known_pulse_variance_s2(1e9, 0.0).is_infinite());
    }
}
