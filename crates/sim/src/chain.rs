//! From the pulse at the source to the voltage at the recorder, as one transfer function per source and antenna.

use arcstead_solver::Site;
use realfft::RealFftPlanner;
use realfft::num_complex::Complex;

use crate::butterworth::BandPass;
use crate::pulse::PulseShape;
use crate::recorder;
use crate::reflection::{ground_way_is_clear, ground_way_m};
use crate::settings::VisitSettings;
use crate::travel::NEAREST_M;
use crate::truth::{TrueSource, Truth};

/// The distance at which the level of a source is stated, in metres.
const REFERENCE_M: f64 = 10.0;
/// Order of the band-pass that all antennas share.
const ANTENNA_ORDER: u32 = 3;
/// Order of the band-pass after which the level of a source is stated.
const TIMING_ORDER: u32 = 2;
/// Time constants until a tail is forgotten: 174 dB.
const FORGOTTEN: f64 = 20.0;
/// Greatest length of a tail, in samples, beyond four records.
const LONGEST_TAIL: usize = 1 << 16;
/// Samples left for the tail of the recorder's low-pass.
const RECORDER_TAIL: usize = 256;

/// Amplitude over that at the reference distance, on a clear line: one over the distance.
pub(crate) fn spreading(length_m: f64) -> f64 {
    REFERENCE_M / length_m.max(NEAREST_M)
}

/// The transfer functions of a visit.
///
/// Time 0 of each is the first arrival of its source at any antenna, so that one phase puts a shot where it belongs
/// in the record; delays are exact phases, whatever part of a sample they are. The transform is longer than the
/// record by what the latest tail needs, so nothing wraps into the record.
#[derive(Debug, Clone)]
pub(crate) struct Chain {
    length: usize,
    bin_hz: f64,
    /// For each source, for each antenna: length/2 + 1 values.
    transfer: Vec<Vec<Vec<Complex<f64>>>>,
}

/// One way from a source to an antenna: when after the first arrival, and how strong against the reference distance.
struct Echo {
    late_s: f64,
    amplitude: f64,
}

impl Chain {
    /// All transfer functions, for a truth whose sources, errors, gains and reflections are known.
    pub(crate) fn new(
        planner: &mut RealFftPlanner<f64>,
        site: &Site,
        settings: &VisitSettings,
        truth: &Truth,
    ) -> Self {
        let mut echoes: Vec<Vec<Vec<Echo>>> = truth
            .sources
            .iter()
            .map(|source| (0..site.antennas.len()).map(|a| echoes(site, truth, source, a)).collect())
            .collect();
        // What comes after the end of every record is never seen, and must not make the transforms longer.
        let record_s = settings.recorder.sample_count as f64 / settings.recorder.sample_rate_hz;
        for echoes in echoes.iter_mut().flatten() {
            echoes.retain(|echo| echo.late_s <= record_s);
        }
        let latest_s = echoes.iter().flatten().flatten().fold(0.0_f64, |latest, e| latest.max(e.late_s));

        let rate_hz = settings.recorder.sample_rate_hz;
        let band = BandPass::new(ANTENNA_ORDER, settings.band_hz);
        let ripple_s = truth.ripple.iter().map(|ripple| ripple.lasts_s()).fold(0.0, f64::max);
        // A low-pass answers for about half a period of its bandwidth.
        let shared_s = band.slowest_s().max(0.5 / settings.recorder.bandwidth_hz);
        let slowest_s =
            settings.sources.iter().map(|source| source.pulse.slowest_s()).fold(shared_s, f64::max);
        let first_s = crate::schedule::first_arrival_s(settings) + settings.trigger_jitter_s;
        let tail_s = first_s + latest_s + FORGOTTEN * slowest_s + ripple_s;
        // Bounded, so that a pulse that decays over milliseconds does not cost the memory: of such a decay the band
        // leaves next to nothing that could wrap.
        let most = 4 * settings.recorder.sample_count + LONGEST_TAIL;
        let tail = ((tail_s * rate_hz).ceil() as usize).min(most) + RECORDER_TAIL;
        let length = smooth_even_length(settings.recorder.sample_count.max(tail));
        let bin_hz = rate_hz / length as f64;

        let low_pass = recorder::low_pass(planner, length, rate_hz, settings.recorder.bandwidth_hz)
            .expect("the buffers have the lengths of the plan, and a real log-magnitude is a valid spectrum");
        let shared: Vec<Complex<f64>> = low_pass
            .iter()
            .enumerate()
            .map(|(k, low_pass)| {
                if k == 0 || k == length / 2 {
                    Complex::new(0.0, 0.0)
                } else {
                    low_pass * band.at(k as f64 * bin_hz) / length as f64
                }
            })
            .collect();
        let mut chain = Self { length, bin_hz, transfer: Vec::new() };
        chain.transfer = settings
            .sources
            .iter()
            .zip(&echoes)
            .map(|(source, echoes)| {
                let reference =
                    chain.reference_v(planner, &shared, settings, &source.pulse.nominal(), truth.noise_rms_v);
                let scale = 10_f64.powf(source.snr_at_10m_db / 20.0) * reference;
                (0..echoes.len())
                    .map(|a| {
                        let gain = scale * 10_f64.powf(truth.gain_db[a] / 20.0);
                        let of_bin = |(k, shared): (usize, &Complex<f64>)| {
                            let frequency_hz = k as f64 * bin_hz;
                            shared * truth.ripple[a].at(frequency_hz) * sum(&echoes[a], frequency_hz) * gain
                        };
                        shared.iter().enumerate().map(of_bin).collect()
                    })
                    .collect()
            })
            .collect();
        chain
    }

    /// Number of samples of a transform.
    pub(crate) fn length(&self) -> usize {
        self.length
    }

    /// The spectrum of a shot whose first arrival is `first_arrival_s` after the first sample, at this level (with its
    /// sign); shape: length/2 + 1.
    pub(crate) fn shot(
        &self,
        pulse: &PulseShape,
        level: f64,
        first_arrival_s: f64,
        spectrum: &mut [Complex<f64>],
    ) {
        let turns = -std::f64::consts::TAU * first_arrival_s;
        for (k, value) in spectrum.iter_mut().enumerate() {
            let frequency_hz = k as f64 * self.bin_hz;
            *value = pulse.at(frequency_hz) * Complex::from_polar(level, turns * frequency_hz);
        }
    }

    /// The spectrum of that shot at one antenna, scaled for an inverse transform that does not divide.
    pub(crate) fn receive(
        &self,
        source: usize,
        antenna: usize,
        shot: &[Complex<f64>],
        spectrum: &mut [Complex<f64>],
    ) {
        for ((value, shot), transfer) in spectrum.iter_mut().zip(shot).zip(&self.transfer[source][antenna]) {
            *value = shot * transfer;
        }
        // Zero times a phase may be minus zero, which is zero; the transform wants no imaginary part at the ends.
        let last = spectrum.len() - 1;
        spectrum[0] = Complex::new(0.0, 0.0);
        spectrum[last] = Complex::new(0.0, 0.0);
    }

    /// The scale that brings this pulse to 0 dB: noise rms over peak, both after the timing band-pass (causal,
    /// Butterworth), the peak that of the samples, in the mean over where they fall.
    fn reference_v(
        &self,
        planner: &mut RealFftPlanner<f64>,
        shared: &[Complex<f64>],
        settings: &VisitSettings,
        pulse: &PulseShape,
        noise_rms_v: f64,
    ) -> f64 {
        const PLACES: u32 = 4;
        let timing = BandPass::new(TIMING_ORDER, settings.band_hz);
        let timing: Vec<Complex<f64>> =
            (0..shared.len()).map(|k| timing.at(k as f64 * self.bin_hz)).collect();
        // White noise: the same power at every frequency, half of it at negative ones.
        let passed = timing.iter().map(Complex::norm_sqr).sum::<f64>() * 2.0 / self.length as f64;
        let to_time = planner.plan_fft_inverse(self.length);
        let mut spectrum = to_time.make_input_vec();
        let mut wave = to_time.make_output_vec();
        let first_s = crate::schedule::first_arrival_s(settings);
        let mut peaks = 0.0;
        for place in 0..PLACES {
            let part_s = f64::from(place) / f64::from(PLACES) / settings.recorder.sample_rate_hz;
            self.shot(pulse, 1.0, first_s + part_s, &mut spectrum);
            for ((value, shared), timing) in spectrum.iter_mut().zip(shared).zip(&timing) {
                *value *= shared * timing;
            }
            let last = spectrum.len() - 1;
            spectrum[0] = Complex::new(0.0, 0.0);
            spectrum[last] = Complex::new(0.0, 0.0);
            to_time.process(&mut spectrum, &mut wave).expect(
                "buffers were made by the plan, and nothing is left at zero and at the highest frequency",
            );
            peaks += wave.iter().fold(0.0_f64, |peak, v| peak.max(v.abs()));
        }
        noise_rms_v * passed.sqrt() * f64::from(PLACES) / peaks
    }
}

/// All ways of one source to one antenna: first the direct one, then ground and scatterers.
fn echoes(site: &Site, truth: &Truth, source: &TrueSource, antenna: usize) -> Vec<Echo> {
    let soonest_s = source.delay_s.iter().copied().fold(f64::INFINITY, f64::min);
    let direct_s = source.delay_s[antenna] - soonest_s;
    let direct_m = source.way_m[antenna];
    let late_s = |length_m: f64| direct_s + (length_m - direct_m) / site.air.speed_m_per_s;
    let (from_m, to_m) = (&source.position_m, &truth.antenna_position_m[antenna]);

    let weakened = 10_f64.powf(-source.loss_db[antenna] / 20.0);
    let mut echoes = vec![Echo { late_s: direct_s, amplitude: weakened * spreading(direct_m) }];
    if let Some(length_m) = ground_way_m(from_m, to_m)
        && ground_way_is_clear(&site.obstacles, from_m, to_m)
    {
        let amplitude = truth.ground_reflection * spreading(length_m);
        echoes.push(Echo { late_s: late_s(length_m), amplitude });
    }
    for scatterer in &truth.scatterers {
        if let Some((length_m, amplitude)) = scatterer.way(&site.obstacles, from_m, to_m) {
            echoes.push(Echo { late_s: late_s(length_m), amplitude: REFERENCE_M * amplitude });
        }
    }
    // Where the direct way leads over an edge, a way off the ground or a scatterer must not overtake it: the edge is
    // the first way there is in the vertical plane, and the arrival is defined by it.
    echoes.retain(|echo| echo.late_s >= direct_s);
    echoes
}

/// The echoes at one frequency.
fn sum(echoes: &[Echo], frequency_hz: f64) -> Complex<f64> {
    let turns = -std::f64::consts::TAU * frequency_hz;
    echoes.iter().map(|echo| Complex::from_polar(echo.amplitude, turns * echo.late_s)).sum()
}

/// The smallest even number of at least `least` that has no prime factor above five: such transforms are fast.
fn smooth_even_length(least: usize) -> usize {
    (least.max(2)..)
        .find(|&length| {
            let mut rest = length;
            for factor in [2, 3, 5] {
                while rest % factor == 0 {
                    rest /= factor;
                }
            }
            rest == 1 && length % 2 == 0
        })
        .expect("there is a power of two above every length that settings allow")
}
