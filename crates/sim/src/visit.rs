//! A visit: what is drawn once for it, and its captures.

use std::sync::Arc;

use arcstead_core::Capture;
use arcstead_solver::Site;
use arcstead_solver::nalgebra::Vector3;
use rand::{Rng, RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};
use realfft::num_complex::Complex;
use realfft::{ComplexToReal, RealFftPlanner};

use crate::antenna::Ripple;
use crate::carrier::Carrier;
use crate::chain::Chain;
use crate::error::SimError;
use crate::recorder::Converter;
use crate::reflection::Scatterer;
use crate::schedule;
use crate::settings::VisitSettings;
use crate::systematic::SystematicErrors;
use crate::travel::{Way, first_way};
use crate::truth::{TrueSource, Truth};

/// Noise of every channel, in volts of arbitrary scale.
const NOISE_RMS_V: f64 = 1e-3;
/// Share of full scale that the typical peak of the loudest source reaches.
const TYPICAL_PEAK: f64 = 0.6;

/// A simulated visit: its truth is drawn, its captures can be had in any order and from any thread.
///
/// Capture `k` is made with a generator of its own (ChaCha8, stream k + 1 of the seed; stream 0 is what is
/// drawn once), so its bytes depend on the seed and on k alone.
///
/// ```
/// # use arcstead_solver::{Air, Antenna, PositionSigma, Priors, SearchBox, Site, nalgebra::Vector3};
/// # let antennas: Vec<Antenna> = [[0.0, 0.0, 2.0], [12.0, 0.0, 2.0], [12.0, 10.0, 3.0], [0.0, 10.0, 1.5]]
/// #     .into_iter()
/// #     .map(|at| Antenna {
/// #         name: format!("{at:?}"),
/// #         position_m: Vector3::from(at),
/// #         position_sigma: PositionSigma::Isotropic(0.03),
/// #         delay_sigma_s: 1e-10,
/// #         response_sigma_s: 5e-11,
/// #     })
/// #     .collect();
/// # let search = SearchBox::around(&antennas, &[]).unwrap();
/// # let site = Site { antennas, assets: vec![], obstacles: vec![], air: Air::default(), search, priors: Priors::default() };
/// use arcstead_sim::{SourceSetting, Visit, VisitSettings};
/// let settings = VisitSettings {
///     sources: vec![SourceSetting::at([8.0, 6.0, 5.0])],
///     captures: 10,
///     ..VisitSettings::default()
/// };
/// let visit = Visit::new(&site, settings)?;
/// let capture = visit.capture(3);
/// assert_eq!((capture.channel_count(), capture.sample_count()), (4, 1500));
/// let arrival_s = visit.truth().arrival_s(3, 0);
/// assert!(arrival_s > 0.0 && arrival_s < 300e-9);
/// # Ok::<(), arcstead_sim::SimError>(())
/// ```
pub struct Visit {
    settings: VisitSettings,
    truth: Truth,
    chain: Chain,
    carriers: Vec<Carrier>,
    converters: Vec<Converter>,
    to_time: Arc<dyn ComplexToReal<f64>>,
}

impl std::fmt::Debug for Visit {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Visit")
            .field("settings", &self.settings)
            .field("truth", &self.truth)
            .finish_non_exhaustive()
    }
}

impl Visit {
    /// Draws everything that is drawn once: errors, gains, ripples, reflections, and which source emits when.
    ///
    /// Costs about (sources x antennas x (2 + scatterers)) transfer functions and some transforms of the record's
    /// length; holds sources x antennas of them in memory.
    ///
    /// # Errors
    /// [`SimError`]: the first setting that is out of range or does not fit the site.
    pub fn new(site: &Site, settings: VisitSettings) -> Result<Self, SimError> {
        settings.check(site)?;
        let mut rng = stream(settings.seed, 0);
        let antennas = site.antennas.len();

        let drawn = SystematicErrors::draw(site, settings.sources.len(), &mut rng);
        let errors = if settings.draw_errors {
            drawn
        } else {
            SystematicErrors::none(settings.sources.len(), antennas)
        };
        let gain_db = draw_gains_db(settings.gain_spread_db, antennas, &mut rng);
        let ripple =
            (0..antennas).map(|_| Ripple::draw(settings.ripple_db, settings.band_hz, &mut rng)).collect();
        let drawn_reflection = rng.random_range(-0.5..=0.5);
        let antenna_position_m: Vec<Vector3<f64>> =
            site.antennas.iter().zip(&errors.survey_error_m).map(|(a, error)| a.position_m + error).collect();
        let mut points_m: Vec<_> = site.antennas.iter().map(|a| a.position_m).collect();
        points_m.extend(settings.sources.iter().map(|source| source.position_m));
        let scatterers = (0..settings.scatterers).map(|_| Scatterer::draw(&points_m, &mut rng)).collect();
        let nominal_delay_s = if settings.nominal_delay_s.is_empty() {
            vec![0.0; antennas]
        } else {
            settings.nominal_delay_s.clone()
        };
        let mut truth = Truth {
            sources: Vec::new(),
            errors,
            antenna_position_m,
            nominal_delay_s,
            gain_db,
            ripple,
            ground_reflection: settings.ground_reflection.unwrap_or(drawn_reflection),
            scatterers,
            noise_rms_v: NOISE_RMS_V,
            full_scale_v: Vec::new(),
            captures: Vec::new(),
        };
        for index in 0..settings.sources.len() {
            let source = true_source(site, &settings, &truth, index)?;
            check_record(&settings, index, &source)?;
            truth.sources.push(source);
        }

        let gain: Vec<f64> = truth.gain_db.iter().map(|db| 10_f64.powf(db / 20.0)).collect();
        let carriers: Vec<Carrier> = settings
            .carriers
            .iter()
            .map(|&setting| Carrier::draw(setting, &gain, NOISE_RMS_V, &mut rng))
            .collect();
        truth.captures = schedule::draw(&settings, &truth.sources, &mut rng);

        let mut planner = RealFftPlanner::new();
        let chain = Chain::new(&mut planner, site, &settings, &truth);
        let to_time = planner.plan_fft_inverse(chain.length());
        let mut visit = Self { settings, truth, chain, carriers, converters: Vec::new(), to_time };
        let full_scale_v = visit.full_scales_v();
        visit.converters =
            full_scale_v.iter().map(|&v| Converter::new(visit.settings.recorder.bits, v)).collect();
        visit.truth.full_scale_v = full_scale_v;
        Ok(visit)
    }

    /// What the visit knows and a measurement does not.
    #[must_use]
    pub fn truth(&self) -> &Truth {
        &self.truth
    }

    /// The settings it was made with.
    #[must_use]
    pub fn settings(&self) -> &VisitSettings {
        &self.settings
    }

    /// Number of captures.
    #[must_use]
    pub fn capture_count(&self) -> usize {
        self.truth.captures.len()
    }

    /// A worker with buffers of its own: who makes many captures keeps one for each thread.
    #[must_use]
    pub fn worker(&self) -> VisitWorker<'_> {
        VisitWorker {
            visit: self,
            shot: vec![Complex::new(0.0, 0.0); self.chain.length() / 2 + 1],
            spectrum: self.to_time.make_input_vec(),
            wave: self.to_time.make_output_vec(),
            scratch: self.to_time.make_scratch_vec(),
            sent: vec![
                vec![Complex::new(0.0, 0.0); self.settings.recorder.sample_count];
                self.carriers.len()
            ],
        }
    }

    /// The capture with this index, counted from 0; one worker made for it alone.
    ///
    /// # Panics
    /// When there is no such capture.
    #[must_use]
    pub fn capture(&self, index: usize) -> Capture {
        self.worker().capture(index)
    }

    /// Full scale of each channel in volts, as an operator sets it who has watched for a while: the typical peak of
    /// the loudest source at 60 %, and room for noise and carriers. Strong shots may clip.
    fn full_scales_v(&self) -> Vec<f64> {
        let mut worker = self.worker();
        (0..self.truth.gain_db.len())
            .map(|antenna| {
                let mut peak_v = 0.0_f64;
                for (source, setting) in self.settings.sources.iter().enumerate() {
                    if setting.share > 0.0 {
                        let pulse = setting.pulse.nominal();
                        self.chain.shot(
                            &pulse,
                            1.0,
                            schedule::first_arrival_s(&self.settings),
                            &mut worker.shot,
                        );
                        worker.receive(source, antenna);
                        peak_v = worker.wave.iter().fold(peak_v, |peak, v| peak.max(v.abs()));
                    }
                }
                let carriers_v: f64 = self.carriers.iter().map(|carrier| carrier.amplitude_v(antenna)).sum();
                (peak_v / TYPICAL_PEAK).max((peak_v + 4.0 * NOISE_RMS_V + carriers_v) / 0.95)
            })
            .collect()
    }
}

/// Makes captures of a visit one after the other, in buffers that are kept.
pub struct VisitWorker<'visit> {
    visit: &'visit Visit,
    shot: Vec<Complex<f64>>,
    spectrum: Vec<Complex<f64>>,
    wave: Vec<f64>,
    scratch: Vec<Complex<f64>>,
    sent: Vec<Vec<Complex<f64>>>,
}

impl std::fmt::Debug for VisitWorker<'_> {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("VisitWorker").field("visit", self.visit).finish_non_exhaustive()
    }
}

impl VisitWorker<'_> {
    /// The capture with this index, counted from 0: pulse, carriers and noise, as the recorder stores them. The
    /// samples are in volts of arbitrary scale, and the capture states its range.
    ///
    /// # Panics
    /// When there is no such capture.
    #[must_use]
    pub fn capture(&mut self, index: usize) -> Capture {
        let visit = self.visit;
        let recorder = &visit.settings.recorder;
        let count = recorder.sample_count;
        let channels = visit.converters.len();
        let mut rng = self.begin(index);
        for (carrier, sent) in visit.carriers.iter().zip(&mut self.sent) {
            carrier.send(sent, 1.0 / recorder.sample_rate_hz, &mut rng);
        }
        let mut samples = Vec::with_capacity(channels * count);
        for (antenna, converter) in visit.converters.iter().enumerate() {
            self.receive(visit.truth.captures[index].source, antenna);
            let wave = &mut self.wave[..count];
            for (carrier, sent) in visit.carriers.iter().zip(&self.sent) {
                carrier.receive(antenna, sent, wave);
            }
            samples.extend(wave.iter().map(|voltage_v| {
                let noise: f64 = StandardNormal.sample(&mut rng);
                converter.convert(voltage_v + NOISE_RMS_V * noise)
            }));
        }
        Capture::from_planar(recorder.sample_rate_hz, channels, samples)
            .and_then(|capture| capture.with_range(visit.converters.iter().map(Converter::range).collect()))
            .expect("settings were checked when the visit was made, and a converter gives finite samples in its range")
    }

    /// The same pulse as [`VisitWorker::capture`], in volts, before noise, carriers and converter; shape: channels x
    /// samples. For bounds and checks.
    ///
    /// # Panics
    /// When there is no such capture.
    #[must_use]
    pub fn noiseless(&mut self, index: usize) -> Vec<Vec<f64>> {
        self.begin(index);
        let count = self.visit.settings.recorder.sample_count;
        (0..self.visit.converters.len())
            .map(|antenna| {
                self.receive(self.visit.truth.captures[index].source, antenna);
                self.wave[..count].to_vec()
            })
            .collect()
    }

    /// Draws the shot of a capture into `shot`; gives the generator for what follows.
    fn begin(&mut self, index: usize) -> ChaCha8Rng {
        let visit = self.visit;
        let capture = &visit.truth.captures[index];
        let mut rng = stream(visit.settings.seed, index as u64 + 1);
        let pulse = visit.settings.sources[capture.source].pulse.draw(&mut rng);
        let level = 10_f64.powf(capture.level_db / 20.0) * if capture.positive { 1.0 } else { -1.0 };
        let delay_s = &visit.truth.sources[capture.source].delay_s;
        let soonest_s = delay_s.iter().copied().fold(f64::INFINITY, f64::min);
        visit.chain.shot(&pulse, level, capture.emission_in_record_s + soonest_s, &mut self.shot);
        rng
    }

    /// The shot as one antenna receives it, into `wave`.
    fn receive(&mut self, source: usize, antenna: usize) {
        self.visit.chain.receive(source, antenna, &self.shot, &mut self.spectrum);
        self.visit
            .to_time
            .process_with_scratch(&mut self.spectrum, &mut self.wave, &mut self.scratch)
            .expect("buffers were made by the plan, and the chain leaves nothing at zero and at the highest frequency");
    }
}

/// The generator of one stream of a seed.
fn stream(seed: u64, number: u64) -> ChaCha8Rng {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    rng.set_stream(number);
    rng
}

/// Normal gains whose mean over the antennas is zero dB: the level of the sources is stated for the mean antenna.
fn draw_gains_db(spread_db: f64, antennas: usize, rng: &mut (impl Rng + ?Sized)) -> Vec<f64> {
    let drawn: Vec<f64> = (0..antennas)
        .map(|_| {
            let deviation: f64 = StandardNormal.sample(rng);
            spread_db * deviation
        })
        .collect();
    let mean_db = drawn.iter().sum::<f64>() / antennas as f64;
    drawn.into_iter().map(|db| db - mean_db).collect()
}

fn true_source(
    site: &Site,
    settings: &VisitSettings,
    truth: &Truth,
    index: usize,
) -> Result<TrueSource, SimError> {
    let setting = &settings.sources[index];
    let speed_m_per_s = site.air.speed_m_per_s;
    let wavelength_m = 2.0 * speed_m_per_s / (settings.band_hz.0 + settings.band_hz.1);
    let ways: Vec<Way> = site
        .antennas
        .iter()
        .zip(&truth.antenna_position_m)
        .map(|(antenna, antenna_m)| {
            first_way(&site.obstacles, &setting.position_m, antenna_m, wavelength_m).ok_or_else(|| {
                SimError::NoWay { source_m: setting.position_m.into(), antenna: antenna.name.clone() }
            })
        })
        .collect::<Result<_, _>>()?;
    let response_error_s = &truth.errors.response_error_s[index];
    let delay_s = (0..ways.len())
        .map(|i| {
            let errors_s = truth.errors.delay_error_s[i] + response_error_s[i];
            ways[i].length_m / speed_m_per_s + truth.nominal_delay_s[i] + errors_s
        })
        .collect();
    let snr_db = ways
        .iter()
        .zip(&truth.gain_db)
        .map(|(way, gain_db)| {
            setting.snr_at_10m_db + gain_db - way.loss_db
                + 20.0 * crate::chain::spreading(way.length_m).log10()
        })
        .collect();
    Ok(TrueSource {
        position_m: setting.position_m,
        way_m: ways.iter().map(|way| way.length_m).collect(),
        clear: ways.iter().map(|way| way.clear).collect(),
        loss_db: ways.iter().map(|way| way.loss_db).collect(),
        snr_db,
        delay_s,
    })
}

/// Whether the record holds the pulse of a source on all channels, wherever the trigger puts it.
fn check_record(settings: &VisitSettings, source_index: usize, source: &TrueSource) -> Result<(), SimError> {
    let soonest_s = source.delay_s.iter().copied().fold(f64::INFINITY, f64::min);
    let latest_s = source.delay_s.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    // Room for the pulse itself: two periods of the lower band edge.
    let after_s = latest_s - soonest_s + 2.0 / settings.band_hz.0;
    let jitter_s = settings.trigger_jitter_s;
    let needed_s = (1.5 * (after_s + jitter_s)).max(3.0 * jitter_s);
    let found_s = settings.recorder.sample_count as f64 / settings.recorder.sample_rate_hz;
    if found_s < needed_s {
        return Err(SimError::RecordTooShort { source_index, found_s, needed_s });
    }
    Ok(())
}
