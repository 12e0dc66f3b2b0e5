//! What a simulated visit knows and a measurement does not.

use arcstead_solver::nalgebra::Vector3;

use crate::antenna::Ripple;
use crate::reflection::Scatterer;
use crate::systematic::SystematicErrors;

/// The truth behind the captures of a visit.
#[derive(Debug, Clone, PartialEq)]
pub struct Truth {
    /// The sources, in the order of the settings.
    pub sources: Vec<TrueSource>,
    /// Delay, survey and response errors.
    pub errors: SystematicErrors,
    /// Where the antennas really are, in metres.
    pub antenna_position_m: Vec<Vector3<f64>>,
    /// The stated delay of each antenna's chain in seconds, errors not included.
    pub nominal_delay_s: Vec<f64>,
    /// Gain of each antenna over their mean, in dB.
    pub gain_db: Vec<f64>,
    /// Each antenna's own ripple.
    pub ripple: Vec<Ripple>,
    /// Reflection coefficient of the ground.
    pub ground_reflection: f64,
    /// What scatters.
    pub scatterers: Vec<Scatterer>,
    /// Root mean square of the recorder's white noise in volts (of arbitrary scale), on every channel.
    pub noise_rms_v: f64,
    /// Full scale of each channel in volts.
    pub full_scale_v: Vec<f64>,
    /// The captures, in order of emission.
    pub captures: Vec<TrueCapture>,
}

/// One source, and how it reaches the antennas.
#[derive(Debug, Clone, PartialEq)]
pub struct TrueSource {
    /// Position in metres.
    pub position_m: Vector3<f64>,
    /// Length of the first way to each antenna, in metres.
    pub way_m: Vec<f64>,
    /// Whether the straight line to each antenna is clear.
    pub clear: Vec<bool>,
    /// Loss behind the edges on the way to each antenna, in dB; 0 where the line is clear.
    pub loss_db: Vec<f64>,
    /// 20 log10 of pulse peak over noise rms, both after the timing band-pass, that a shot of median level and nominal
    /// shape has at each antenna by its direct way alone, in dB.
    pub snr_db: Vec<f64>,
    /// From emission to arrival in the record of each antenna, in seconds: way over speed, stated delay, delay error
    /// and response error.
    pub delay_s: Vec<f64>,
}

/// One capture: which source, when, and how strong.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TrueCapture {
    /// Index of the source.
    pub source: usize,
    /// Emission in seconds after the start of the visit.
    pub emission_s: f64,
    /// Emission in seconds after the first sample of the record; may lie before it.
    pub emission_in_record_s: f64,
    /// Level of the shot over the median in dB.
    pub level_db: f64,
    /// Whether the pulse is positive.
    pub positive: bool,
}

impl Truth {
    /// True arrival of the direct pulse of a capture at an antenna, in seconds after the first sample of the
    /// record: emission + way/v + stated delay + delay error + response error. It is the instant before which
    /// nothing of the pulse is there, the same instant on all channels; the causal response of antenna and recorder
    /// rises after it.
    ///
    /// # Panics
    /// When there is no such capture or antenna.
    #[must_use]
    pub fn arrival_s(&self, capture: usize, antenna: usize) -> f64 {
        let capture = &self.captures[capture];
        capture.emission_in_record_s + self.sources[capture.source].delay_s[antenna]
    }
}
