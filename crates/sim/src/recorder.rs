//! The recorder: its bandwidth, and its converter.

use realfft::num_complex::Complex;
use realfft::{FftError, RealFftPlanner};

/// Attenuation wanted at half the sample rate, in dB: what passes there could not be delayed by a part of a
/// sample without ringing before its onset.
const STOP_DB: f64 = 110.0;
/// Greatest bandwidth as a share of half the sample rate.
const WIDEST: f64 = 0.75;

/// Delay of the low-pass beyond the least possible, in samples. A signal without frequencies above half the sample
/// rate cannot start at once: between the samples around its onset it swings a little, and this keeps those swings
/// after the onset.
const LATENCY: f64 = 4.0;

/// Response of a smooth minimum-phase low-pass at the frequencies of a transform of `length` (even) samples; shape:
/// length/2 + 1.
///
/// The loss is `3 dB (f/bandwidth)^p`, p chosen for [`STOP_DB`] at half the sample rate but at least 2. The phase
/// is the least one a causal response can have, from the folded cepstrum (A. V. Oppenheim, R. W. Schafer,
/// Discrete-Time Signal Processing; from memory), and a delay of [`LATENCY`] samples, the same on every channel.
pub(crate) fn low_pass(
    planner: &mut RealFftPlanner<f64>,
    length: usize,
    sample_rate_hz: f64,
    bandwidth_hz: f64,
) -> Result<Vec<Complex<f64>>, FftError> {
    let half = length / 2;
    let edge = (bandwidth_hz / (sample_rate_hz / 2.0)).min(WIDEST);
    let power = ((STOP_DB / 3.0).ln() / (1.0 / edge).ln()).max(2.0);
    let nepers_per_db = std::f64::consts::LN_10 / 20.0;
    let mut spectrum: Vec<Complex<f64>> = (0..=half)
        .map(|k| {
            let loss_db = 3.0 * (k as f64 / half as f64 / edge).powf(power);
            // A narrow low-pass would reach thousands of dB; beyond 300 nothing is left to shape.
            Complex::new(-loss_db.min(300.0) * nepers_per_db, 0.0)
        })
        .collect();
    let mut cepstrum = vec![0.0; length];
    planner.plan_fft_inverse(length).process(&mut spectrum, &mut cepstrum)?;
    for (k, value) in cepstrum.iter_mut().enumerate() {
        let folded = if k == 0 || k == half {
            1.0
        } else if k < half {
            2.0
        } else {
            0.0
        };
        *value *= folded / length as f64;
    }
    planner.plan_fft_forward(length).process(&mut cepstrum, &mut spectrum)?;
    for (k, value) in spectrum.iter_mut().enumerate() {
        let latency = -std::f64::consts::TAU * k as f64 * LATENCY / length as f64;
        *value = value.exp() * Complex::from_polar(1.0, latency);
    }
    Ok(spectrum)
}

/// A converter of some bits: rounds to its steps, and holds at its ends what is beyond them.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Converter {
    step_v: f64,
    lowest: f64,
    highest: f64,
}

impl Converter {
    /// One of 2^bits codes from -`full_scale_v` to a step below `full_scale_v`.
    pub(crate) fn new(bits: u8, full_scale_v: f64) -> Self {
        let codes = f64::from(1_u32 << (bits - 1));
        Self { step_v: full_scale_v / codes, lowest: -codes, highest: codes - 1.0 }
    }

    /// The value recorded for this voltage.
    pub(crate) fn convert(&self, voltage_v: f64) -> f32 {
        ((voltage_v / self.step_v).round().clamp(self.lowest, self.highest) * self.step_v) as f32
    }

    /// The lowest and highest value it records.
    pub(crate) fn range(&self) -> (f32, f32) {
        ((self.lowest * self.step_v) as f32, (self.highest * self.step_v) as f32)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::{assert_abs_diff_eq, assert_relative_eq};

    #[test]
    fn low_pass_has_its_bandwidth_and_comes_after_its_onset() {
        let (length, rate_hz) = (2048, 5e9);
        for bandwidth_hz in [100e6, 500e6, 1.5e9, 2.0e9, 9e9] {
            let mut planner = RealFftPlanner::new();
            let mut response = low_pass(&mut planner, length, rate_hz, bandwidth_hz).unwrap();
            let at = bandwidth_hz.min(WIDEST * rate_hz / 2.0) / rate_hz * length as f64;
            let (below, above) =
                (response[at.floor() as usize].norm(), response[at.floor() as usize + 1].norm());
            let half_power = 10_f64.powf(-3.0 / 20.0);
            assert!(above <= half_power && half_power <= below * (1.0 + 1e-9), "{bandwidth_hz}");
            assert_relative_eq!(response[0].re, 1.0, epsilon = 1e-9);

            // Response to a pulse half a sample into the record: nothing at negative times (the far end).
            let mut wave = vec![0.0; length];
            for (k, value) in response.iter_mut().enumerate() {
                *value *= Complex::from_polar(1.0, -std::f64::consts::TAU * k as f64 * 0.5 / length as f64);
            }
            response[0].im = 0.0;
            response[length / 2] = Complex::new(0.0, 0.0);
            planner.plan_fft_inverse(length).process(&mut response, &mut wave).unwrap();
            let energy = |part: &[f64]| part.iter().map(|v| v * v).sum::<f64>();
            let early_db = 10.0 * (energy(&wave[length / 2..]) / energy(&wave)).log10();
            assert!(early_db < -60.0, "{bandwidth_hz} Hz: {early_db} dB before the onset");
        }
    }

    #[test]
    fn converter_rounds_and_clips() {
        let converter = Converter::new(8, 1.28);
        assert_eq!(converter.range(), (-1.28, 1.27));
        for (voltage_v, found_v) in [(0.0, 0.0), (0.0051, 0.01), (-0.0149, -0.01), (3.0, 1.27), (-3.0, -1.28)]
        {
            assert_abs_diff_eq!(converter.convert(voltage_v), found_v, epsilon = 1e-6);
        }
        assert!(
            converter.convert(9.0) >= converter.range().1 && converter.convert(-9.0) <= converter.range().0
        );
        assert_relative_eq!(
            f64::from(Converter::new(16, 1.0).convert(2e-5)),
            3.0517578e-5,
            max_relative = 1e-6
        );
    }
}
