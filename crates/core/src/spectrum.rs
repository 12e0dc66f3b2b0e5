//! Real transforms of one length, with everything they need made once.

use realfft::num_complex::Complex64;
use realfft::{ComplexToReal, RealFftPlanner, RealToComplex};
use std::fmt;
use std::sync::Arc;

/// A forward and an inverse real transform of one length, with their scratch. Neither divides by the length.
pub(crate) struct Transform {
    length: usize,
    forward: Arc<dyn RealToComplex<f64>>,
    inverse: Arc<dyn ComplexToReal<f64>>,
    scratch: Vec<Complex64>,
    time: Vec<f64>,
}

impl fmt::Debug for Transform {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Transform").field("length", &self.length).finish_non_exhaustive()
    }
}

impl Transform {
    pub(crate) fn plan(length: usize) -> Self {
        let mut planner = RealFftPlanner::new();
        let (forward, inverse) = (planner.plan_fft_forward(length), planner.plan_fft_inverse(length));
        let scratch = vec![Complex64::ZERO; forward.get_scratch_len().max(inverse.get_scratch_len())];
        Self { length, forward, inverse, scratch, time: vec![0.0; length] }
    }

    pub(crate) fn length(&self) -> usize {
        self.length
    }

    pub(crate) fn bins(&self) -> usize {
        self.length / 2 + 1
    }

    /// Transforms `samples`, padded with zeros to the length.
    pub(crate) fn forward(&mut self, samples: &[f64], spectrum: &mut [Complex64]) {
        self.time[..samples.len()].copy_from_slice(samples);
        self.time[samples.len()..].fill(0.0);
        let scratch = &mut self.scratch[..self.forward.get_scratch_len()];
        self.forward
            .process_with_scratch(&mut self.time, spectrum, scratch)
            .expect("buffers were made for this length");
    }

    /// Transforms back; `spectrum` is spoilt. The samples stand in the slice given back until the next transform.
    pub(crate) fn inverse(&mut self, spectrum: &mut [Complex64]) -> &[f64] {
        // A real signal has a real first bin, and a real last one when the length is even.
        spectrum[0].im = 0.0;
        if self.length.is_multiple_of(2) {
            spectrum[self.length / 2].im = 0.0;
        }
        let scratch = &mut self.scratch[..self.inverse.get_scratch_len()];
        self.inverse
            .process_with_scratch(spectrum, &mut self.time, scratch)
            .expect("buffers were made for this length, and the ends of the spectrum are real");
        &self.time
    }
}

/// The least even number not below `least` with no prime factor but 2, 3 and 5: a length whose transform is fast.
pub(crate) fn fast_length(least: usize) -> usize {
    (least.max(2)..)
        .find(|&n| {
            let mut rest = n;
            for factor in [2, 3, 5] {
                while rest.is_multiple_of(factor) {
                    rest /= factor;
                }
            }
            rest == 1 && n.is_multiple_of(2)
        })
        .expect("a power of two follows every number")
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use std::f64::consts::TAU;

    #[test]
    fn equals_the_plain_sum_whatever_the_buffers_held() {
        for length in [2, 4, 6, 10, 30, 36] {
            let mut transform = Transform::plan(length);
            let samples: Vec<f64> = (0..length - 1).map(|n| ((n * n + 1) as f64).sin()).collect();
            let mut spectrum = vec![Complex64::new(9.0, 9.0); transform.bins()];
            transform.time.fill(5.0);
            transform.scratch.fill(Complex64::new(3.0, 1.0));
            transform.forward(&samples, &mut spectrum);
            for (k, bin) in spectrum.iter().enumerate() {
                let plain: Complex64 = (0..samples.len())
                    .map(|n| Complex64::from_polar(samples[n], -TAU * (k * n) as f64 / length as f64))
                    .sum();
                assert!((plain - bin).norm() < 1e-12);
            }
            let back = transform.inverse(&mut spectrum);
            for (n, sample) in samples.iter().enumerate() {
                assert_relative_eq!(back[n] / length as f64, *sample, epsilon = 1e-13);
            }
        }
    }

    #[test]
    fn fast_lengths_are_smooth_and_even() {
        assert_eq!([1, 3, 7, 11, 1501, 4099].map(fast_length), [2, 4, 8, 12, 1536, 4320]);
    }
}
