//! Complex baseband samples as a real signal of the same envelope at twice the rate.

use std::sync::Arc;

use rustfft::num_complex::Complex64;
use rustfft::{Fft, FftPlanner};

/// Turns captures of one length from complex to real: x[n] = Re(z_up[n] i^n), where z_up is z interpolated by
/// two.
///
/// Interpolation is by transform: the spectrum of z amid zeros (an even number of samples keeps its
/// coefficient at the edge of the band as the lowest one), and exact at the samples of z. i^n = exp(i pi fs n
/// / (2 fs)) is the move up by fs/2. What is kept by it and what is not stands in [`super`]. Cost: transforms
/// of N and of 2N per channel.
pub(super) struct RealEquivalent {
    forward: Arc<dyn Fft<f64>>,
    inverse: Arc<dyn Fft<f64>>,
    spectrum: Vec<Complex64>,
    doubled: Vec<Complex64>,
    scratch: Vec<Complex64>,
}

impl RealEquivalent {
    /// Plans for captures of `sample_count` complex samples (1 or more).
    pub(super) fn new(planner: &mut FftPlanner<f64>, sample_count: usize) -> Self {
        let forward = planner.plan_fft_forward(sample_count);
        let inverse = planner.plan_fft_inverse(2 * sample_count);
        let scratch = forward.get_inplace_scratch_len().max(inverse.get_inplace_scratch_len());
        Self {
            forward,
            inverse,
            spectrum: vec![Complex64::default(); sample_count],
            doubled: vec![Complex64::default(); 2 * sample_count],
            scratch: vec![Complex64::default(); scratch],
        }
    }

    /// Where the samples of one channel are put before [`Self::process`]; afterwards it holds their spectrum.
    pub(super) fn input(&mut self) -> &mut [Complex64] {
        &mut self.spectrum
    }

    /// Writes the real equivalent of the input to `output`, which is twice as long.
    pub(super) fn process(&mut self, output: &mut [f32]) {
        let n = self.spectrum.len();
        let below = n / 2;
        self.forward.process_with_scratch(&mut self.spectrum, &mut self.scratch);
        self.doubled.fill(Complex64::default());
        self.doubled[..n - below].copy_from_slice(&self.spectrum[..n - below]);
        self.doubled[2 * n - below..].copy_from_slice(&self.spectrum[n - below..]);
        self.inverse.process_with_scratch(&mut self.doubled, &mut self.scratch);
        let scale = 1.0 / n as f64;
        for (at, (sample, z)) in output.iter_mut().zip(&self.doubled).enumerate() {
            // Re(z i^n), with i^n exact.
            let turned = match at % 4 {
                0 => z.re,
                1 => -z.im,
                2 => -z.re,
                _ => z.im,
            };
            *sample = (turned * scale) as f32;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    fn real_equivalent(z: &[Complex64]) -> Vec<f32> {
        let mut plan = RealEquivalent::new(&mut FftPlanner::new(), z.len());
        plan.input().copy_from_slice(z);
        let mut output = vec![f32::NAN; 2 * z.len()];
        plan.process(&mut output);
        output
    }

    /// The analytic signal of a real one: its positive frequencies, doubled.
    fn analytic(x: &[f32]) -> Vec<Complex64> {
        let n = x.len();
        let mut spectrum = x.iter().map(|&x| Complex64::new(f64::from(x), 0.0)).collect::<Vec<_>>();
        let mut planner = FftPlanner::new();
        planner.plan_fft_forward(n).process(&mut spectrum);
        for (k, value) in spectrum.iter_mut().enumerate() {
            *value *= if k == 0 || 2 * k == n {
                1.0
            } else if 2 * k < n {
                2.0
            } else {
                0.0
            } / n as f64;
        }
        planner.plan_fft_inverse(n).process(&mut spectrum);
        spectrum
    }

    /// A pulse centred at `centre` (samples), with `cycles` oscillations per sample and its phase.
    fn pulse(n: usize, centre: f64, cycles: f64, phase: f64) -> Vec<Complex64> {
        (0..n)
            .map(|k| {
                let t = k as f64 - centre;
                Complex64::from_polar((-(t / 6.0).powi(2)).exp(), 2.0 * PI * cycles * t + phase)
            })
            .collect()
    }

    #[test]
    fn the_envelope_stays() {
        for n in [200, 201, 256] {
            let z = pulse(n, 90.3, 0.11, 0.7);
            let envelope = analytic(&real_equivalent(&z));
            for (k, z) in z.iter().enumerate() {
                assert!((envelope[2 * k].norm() - z.norm()).abs() < 1e-6, "{n} {k}");
            }
            // Between the samples too: the envelope of this pulse is known everywhere.
            for k in 0..n {
                let t = k as f64 + 0.5 - 90.3;
                assert!((envelope[2 * k + 1].norm() - (-(t / 6.0).powi(2)).exp()).abs() < 1e-6, "{n} {k}");
            }
        }
    }

    #[test]
    fn a_tone_goes_half_the_rate_up() {
        // 3 turns in 16 samples become 3 + 8 turns in 32.
        let z = (0..16)
            .map(|k| Complex64::from_polar(1.0, 2.0 * PI * 3.0 * f64::from(k) / 16.0))
            .collect::<Vec<_>>();
        for (k, x) in real_equivalent(&z).iter().enumerate() {
            let expected = (2.0 * PI * 11.0 * k as f64 / 32.0).cos();
            assert!((f64::from(*x) - expected).abs() < 1e-6);
        }
    }

    /// Lag at which `one` leads `other` most likely, by the greatest correlation, in samples of x, to a
    /// parabola.
    fn lag(one: &[f64], other: &[f64]) -> f64 {
        let correlation = |lag: isize| -> f64 {
            one.iter()
                .enumerate()
                .filter_map(|(k, a)| other.get(k.checked_add_signed(lag)?).map(|b| a * b))
                .sum()
        };
        let best = (-40..=40).max_by(|&a, &b| correlation(a).total_cmp(&correlation(b))).unwrap();
        let (a, b, c) = (correlation(best - 1), correlation(best), correlation(best + 1));
        best as f64 + 0.5 * (a - c) / (a - 2.0 * b + c)
    }

    #[test]
    fn envelopes_keep_a_delay_and_waveforms_keep_it_only_at_the_right_carrier() {
        // A wave of frequency fc that comes tau later is turned by -2 pi fc tau in the baseband. In units of
        // the sample: fs = 1, tau = 3.37, and x has two samples in one.
        let (n, tau) = (256, 3.37);
        let waveform_error = |carrier: f64| {
            let one = real_equivalent(&pulse(n, 100.0, 0.0, 0.0));
            let other = real_equivalent(&pulse(n, 100.0 + tau, 0.0, -2.0 * PI * carrier * tau));
            let envelope = |x: &[f32]| analytic(x).iter().map(|z| z.norm()).collect::<Vec<_>>();
            let of_envelopes = lag(&envelope(&one), &envelope(&other)) / 2.0;
            assert!((of_envelopes - tau).abs() < 0.01, "carrier {carrier}: {of_envelopes}");
            let waveform = |x: &[f32]| x.iter().map(|&x| f64::from(x)).collect::<Vec<_>>();
            (lag(&waveform(&one), &waveform(&other)) / 2.0 - tau).abs()
        };
        // At fs/2 the phase is right; the bound is what a parabola through samples a quarter of an oscillation apart
        // can do. At 10.63 fs it is (10.63 - 0.5) * 3.37 = 34.14 turns off, and 0.14 turns of x are 0.28 samples.
        assert!(waveform_error(0.5) < 0.1);
        assert!(waveform_error(10.63) > 0.2);
    }
}
