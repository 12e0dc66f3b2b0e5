//! The peak of a correlation that is known as a sum of sinusoids, so at every lag and not only at whole samples.

use realfft::num_complex::Complex64;

/// A cross-spectrum at evenly spaced angular frequencies: `C(tau) = sum_k Re(c_k exp(i (first + k step) tau))`.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Sinusoids<'a> {
    pub(crate) cross: &'a [Complex64],
    /// First angular frequency and spacing, in radians per sample.
    pub(crate) first: f64,
    pub(crate) step: f64,
}

/// Newton steps: the error is squared each time, from a sixteenth of a period to rounding.
const NEWTON_STEPS: usize = 5;

impl Sinusoids<'_> {
    /// C at `tau`.
    pub(crate) fn value(&self, tau: f64) -> f64 {
        let step = Complex64::from_polar(1.0, self.step * tau);
        let mut turn = Complex64::from_polar(1.0, self.first * tau);
        let mut sum = 0.0;
        for bin in self.cross {
            sum += bin.re * turn.re - bin.im * turn.im;
            turn *= step;
        }
        sum
    }

    /// C and its first two derivatives at `tau`.
    fn derivatives(&self, tau: f64) -> (f64, f64, f64) {
        let step = Complex64::from_polar(1.0, self.step * tau);
        let mut turn = Complex64::from_polar(1.0, self.first * tau);
        let (mut value, mut slope, mut bend) = (0.0, 0.0, 0.0);
        for (k, bin) in self.cross.iter().enumerate() {
            let omega = self.first + k as f64 * self.step;
            let term = bin * turn;
            value += term.re;
            slope -= omega * term.im;
            bend -= omega * omega * term.re;
            turn *= step;
        }
        (value, slope, bend)
    }

    /// The extreme of C nearest to `tau`, no further than `reach` from it: its place and C there. Where C has no
    /// extreme of its own sign in reach, the best place seen.
    pub(crate) fn refine(&self, tau: f64, reach: f64) -> (f64, f64) {
        let mut at = tau;
        let sign = self.value(tau).signum();
        let mut best = (at, self.value(at));
        for _ in 0..NEWTON_STEPS {
            let (value, slope, bend) = self.derivatives(at);
            if value * sign > best.1 * sign {
                best = (at, value);
            }
            let newton =
                if bend * sign < 0.0 { -slope / bend } else { (slope * sign).signum() * 0.5 * reach };
            let next = (at + newton.clamp(-reach, reach)).clamp(tau - reach, tau + reach);
            if (next - at).abs() <= 1e-12 {
                break;
            }
            at = next;
        }
        let value = self.value(at);
        // At the top the values differ by rounding only, and the last place is the best one.
        if value * sign >= best.1 * sign - 1e-9 * best.1.abs() { (at, value) } else { best }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn finds_the_delay_between_the_samples() {
        let (first, step, delay) = (0.4, 0.11, 2.371);
        let cross: Vec<Complex64> =
            (0..14).map(|k| Complex64::from_polar(1.0, -(first + step * f64::from(k)) * delay)).collect();
        let sinusoids = Sinusoids { cross: &cross, first, step };
        for start in [2.1, 2.5, 2.371] {
            let (tau, value) = sinusoids.refine(start, 0.6);
            assert_relative_eq!(tau, delay, epsilon = 1e-9);
            assert_relative_eq!(value, 14.0, epsilon = 1e-9);
        }
    }

    #[test]
    fn stays_in_reach() {
        let cross = [Complex64::new(1.0, 0.0)];
        let (tau, _) = Sinusoids { cross: &cross, first: 0.1, step: 0.1 }.refine(9.0, 0.5);
        assert!((8.5..=9.5).contains(&tau));
    }
}
