//! Transmitters that disturb: broadcast and mobile telephony.

use rand::{Rng, RngExt};
use rand_distr::{Distribution, StandardNormal};
use realfft::num_complex::Complex;

/// Depth of the slow amplitude modulation of a narrow carrier.
const MODULATION_DEPTH: f64 = 0.3;
/// Frequency of it in hertz: slow against a record of some hundred nanoseconds.
const MODULATION_HZ: f64 = 100e3;
/// Lines that stand for the noise-like signal of a wide carrier.
const WIDE_LINES: usize = 12;

/// One transmitter.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CarrierSetting {
    /// Centre frequency in hertz.
    pub frequency_hz: f64,
    /// 20 log10 of its amplitude over the recorder's noise rms, as recorded from an antenna of mean gain, in dB;
    /// the amplitude of a wide one is that of a steady line of the same power.
    pub level_db: f64,
    /// Occupied width in hertz; 0 for a line with slow amplitude modulation.
    pub width_hz: f64,
}

impl CarrierSetting {
    /// A usual set within reach of towns: two lines of frequency-modulated broadcast, television of 8 MHz width,
    /// mobile telephony of 10 and 20 MHz width at three frequencies; the strongest has `level_db`.
    ///
    /// Bands and widths: common practice, no source.
    #[must_use]
    pub fn usual(level_db: f64) -> Vec<Self> {
        [
            (93.7e6, 0.0, 0.0),
            (101.3e6, -6.0, 0.0),
            (562e6, -4.0, 8e6),
            (796e6, -2.0, 10e6),
            (947e6, -5.0, 10e6),
            (1840e6, -8.0, 20e6),
        ]
        .map(|(frequency_hz, below_db, width_hz)| Self {
            frequency_hz,
            level_db: level_db + below_db,
            width_hz,
        })
        .to_vec()
    }
}

/// A carrier as it reaches the antennas of one visit.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Carrier {
    setting: CarrierSetting,
    /// Amplitude and phase at each antenna.
    at_antenna: Vec<Complex<f64>>,
}

impl Carrier {
    /// Phases at random: where the transmitter stands is not told. `gain` holds the antennas' amplitude gains.
    pub(crate) fn draw(
        setting: CarrierSetting,
        gain: &[f64],
        noise_rms_v: f64,
        rng: &mut (impl Rng + ?Sized),
    ) -> Self {
        let amplitude_v = noise_rms_v * 10_f64.powf(setting.level_db / 20.0);
        let at_antenna = gain
            .iter()
            .map(|gain| Complex::from_polar(gain * amplitude_v, rng.random_range(0.0..std::f64::consts::TAU)))
            .collect();
        Self { setting, at_antenna }
    }

    /// Amplitude at one antenna, in volts.
    pub(crate) fn amplitude_v(&self, antenna: usize) -> f64 {
        self.at_antenna[antenna].norm()
    }

    /// Writes what is sent during one record into `wave`, of amplitude one: the same for all antennas.
    pub(crate) fn send(
        &self,
        wave: &mut [Complex<f64>],
        sample_interval_s: f64,
        rng: &mut (impl Rng + ?Sized),
    ) {
        wave.fill(Complex::new(0.0, 0.0));
        let carrier_hz = self.setting.frequency_hz;
        let phase = rng.random_range(0.0..std::f64::consts::TAU);
        if self.setting.width_hz > 0.0 {
            // Independent normal lines: the mean power is that of a steady line, the level fluctuates as noise does.
            let sigma = (1.0 / (2.0 * WIDE_LINES as f64)).sqrt();
            for _ in 0..WIDE_LINES {
                let offset_hz = self.setting.width_hz * rng.random_range(-0.5..0.5);
                let (re, im): (f64, f64) = (StandardNormal.sample(rng), StandardNormal.sample(rng));
                add_line(
                    wave,
                    carrier_hz + offset_hz,
                    Complex::new(sigma * re, sigma * im),
                    sample_interval_s,
                );
            }
        } else {
            add_line(wave, carrier_hz, Complex::from_polar(1.0, phase), sample_interval_s);
            let modulation = rng.random_range(0.0..std::f64::consts::TAU);
            for side in [-1.0, 1.0] {
                let line = Complex::from_polar(MODULATION_DEPTH / 2.0, phase + side * modulation);
                add_line(wave, carrier_hz + side * MODULATION_HZ, line, sample_interval_s);
            }
        }
    }

    /// Adds what one antenna receives of it.
    pub(crate) fn receive(&self, antenna: usize, sent: &[Complex<f64>], wave: &mut [f64]) {
        let factor = self.at_antenna[antenna];
        for (value, sent) in wave.iter_mut().zip(sent) {
            *value += factor.re * sent.re - factor.im * sent.im;
        }
    }
}

fn add_line(wave: &mut [Complex<f64>], frequency_hz: f64, start: Complex<f64>, sample_interval_s: f64) {
    let turn = std::f64::consts::TAU * frequency_hz * sample_interval_s;
    let rotation = Complex::from_polar(1.0, turn);
    // Started anew every so often, so that the rounding of a long product of rotations stays out of it.
    for (block, values) in wave.chunks_mut(256).enumerate() {
        let mut line = start * Complex::from_polar(1.0, turn * (block * 256) as f64);
        for value in values {
            *value += line;
            line *= rotation;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use rand::SeedableRng;
    use rand_chacha::ChaCha8Rng;

    #[test]
    fn mean_power_is_that_of_the_stated_amplitude() {
        let mut rng = ChaCha8Rng::seed_from_u64(4);
        for width_hz in [0.0, 10e6] {
            let setting = CarrierSetting { frequency_hz: 796e6, level_db: 20.0, width_hz };
            let carrier = Carrier::draw(setting, &[1.0, 0.5], 1e-3, &mut rng);
            assert_relative_eq!(carrier.amplitude_v(1), 5e-3, max_relative = 1e-12);
            let records = 4000;
            let mut sent = vec![Complex::new(0.0, 0.0); 300];
            let mut power_v2 = 0.0;
            for _ in 0..records {
                carrier.send(&mut sent, 2e-10, &mut rng);
                let mut wave = vec![0.0; 300];
                carrier.receive(0, &sent, &mut wave);
                power_v2 += wave.iter().map(|v| v * v).sum::<f64>() / 300.0 / f64::from(records);
            }
            // The power of a record fluctuates by less than its mean; 4.9 standard errors of 4000 records.
            let modulated =
                if width_hz > 0.0 { 1.0 } else { 1.0 + MODULATION_DEPTH * MODULATION_DEPTH / 2.0 };
            assert_relative_eq!(power_v2, modulated * 0.5e-4, max_relative = 4.9 / f64::from(records).sqrt());
        }
    }

    #[test]
    fn a_line_started_anew_goes_on_in_phase() {
        let mut wave = vec![Complex::new(0.0, 0.0); 1000];
        add_line(&mut wave, 123.4e6, Complex::new(0.3, -0.4), 2e-10);
        for (k, value) in wave.iter().enumerate() {
            let angle = std::f64::consts::TAU * 123.4e6 * 2e-10 * k as f64;
            let expected = Complex::new(0.3, -0.4) * Complex::from_polar(1.0, angle);
            assert!((value - expected).norm() < 1e-10);
        }
    }
}
