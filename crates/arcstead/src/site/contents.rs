//! What a site file says.

use std::path::PathBuf;

use nalgebra::{Vector2, Vector3};

use super::footprint;

/// Name of the stance that the positions of the `[[antenna]]` tables are.
pub const MAIN_STANCE: &str = "main";

/// What a site file says, in SI units.
///
/// Made by [`Site::read`] or [`Site::parse`]. Coordinates are local, right-handed, in metres: x east, y north, z up.
#[derive(Debug, Clone, PartialEq)]
pub struct Site {
    /// Name of the site, in free text.
    pub name: String,
    /// Frequency of the mains in hertz, where it is given.
    pub mains_frequency_hz: Option<f64>,
    /// Where the point (0, 0, 0) is on the earth, where it is given.
    pub origin: Option<Origin>,
    /// What the solver must know: antennas (in the stance `main`), assets, obstacles, air, search box, priors.
    pub geometry: arcstead_solver::Site,
    /// The measuring chain behind each antenna, in the order of the antennas.
    pub chains: Vec<Chain>,
    /// What is known of the recorder.
    pub recorder: Recorder,
    /// What the planner is told.
    pub planning: Planning,
    /// Where an antenna may be put.
    pub stand_areas: Vec<StandArea>,
    /// Where no antenna and no person may be.
    pub keep_outs: Vec<KeepOut>,
    /// The same antennas moved; the stance `main` is not among them.
    pub stances: Vec<Stance>,
    /// Named fixed points.
    pub marks: Vec<Mark>,
    /// Taped distances.
    pub tapes: Vec<Tape>,
    /// Indices of the antennas without a position, which only `tape` can use; their position in `geometry` is
    /// (0, 0, 0). Empty unless the site was read with [`Site::read_for_tape`].
    pub free_antennas: Vec<usize>,
    /// SHA-256 of the file in hexadecimal.
    pub sha256: String,
    /// The file it was read from; for a text, the name it was given.
    pub path: PathBuf,
    /// Line and column of each antenna's table, and of each stance's.
    pub(super) places: Places,
}

/// Where the tables stand that later checks speak about: (line, column) counted from 1.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Places {
    pub(super) antennas: Vec<(usize, usize)>,
    pub(super) assets: Vec<(usize, usize)>,
    pub(super) stances: Vec<(usize, usize)>,
}

/// A place on the earth, on the WGS 84 ellipsoid.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Origin {
    /// Geodetic latitude in degrees, north positive, -90 to 90.
    pub latitude_deg: f64,
    /// Longitude in degrees, east positive, -180 to 180.
    pub longitude_deg: f64,
    /// Height above the ellipsoid in metres.
    pub height_m: f64,
}

/// The measuring chain behind one antenna.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Chain {
    /// Channel of the capture, counted from 0 (from 1 in the file).
    pub channel: usize,
    /// Delay of antenna, cable and recorder channel together, in seconds; it is subtracted from the arrival.
    pub delay_s: f64,
    /// Lowest and highest frequency the antenna is made for, in hertz, where it is given.
    pub band_hz: Option<(f64, f64)>,
}

/// What is known of the recorder.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Recorder {
    /// Samples per second, where it is given.
    pub sample_rate_hz: Option<f64>,
    /// Analogue bandwidth in hertz, where it is given.
    pub bandwidth_hz: Option<f64>,
    /// Bits of one sample, 1 to 64, where it is given.
    pub bits: Option<u32>,
}

/// What the planner is told.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Planning {
    /// What it expects of one capture at 10 m with a clear line: pulse peak over noise rms in dB, where it is given.
    pub snr_at_10m_db: Option<f64>,
}

/// Where an antenna may be put.
#[derive(Debug, Clone, PartialEq)]
pub struct StandArea {
    /// Corners of the footprint in metres, in order; the last joins the first. It does not cross itself.
    pub footprint_m: Vec<Vector2<f64>>,
    /// Lowest and highest antenna height in metres.
    pub height_m: (f64, f64),
}

impl StandArea {
    /// Whether an antenna may stand there: inside or on the edge of the footprint, at a height within the limits.
    #[must_use]
    pub fn contains(&self, point_m: &Vector3<f64>) -> bool {
        let (low, high) = self.height_m;
        (low..=high).contains(&point_m.z) && footprint::holds(&self.footprint_m, &point_m.xy(), true)
    }
}

/// Where no antenna and no person may be, at any height: the site's own safety clearances.
#[derive(Debug, Clone, PartialEq)]
pub struct KeepOut {
    /// Name, unique among the keep-outs.
    pub name: String,
    /// Corners of the footprint in metres, in order; the last joins the first. It does not cross itself.
    pub footprint_m: Vec<Vector2<f64>>,
}

impl KeepOut {
    /// Whether the point lies inside or on the edge of the footprint, whatever its height.
    #[must_use]
    pub fn contains(&self, point_m: &Vector3<f64>) -> bool {
        footprint::holds(&self.footprint_m, &point_m.xy(), true)
    }
}

/// The same antennas, moved.
#[derive(Debug, Clone, PartialEq)]
pub struct Stance {
    /// Name, unique among the stances, never `main`.
    pub name: String,
    /// Positions in metres, one per antenna, in the order of the antennas.
    pub positions_m: Vec<Vector3<f64>>,
}

/// A named fixed point.
#[derive(Debug, Clone, PartialEq)]
pub struct Mark {
    /// Name, unique among antennas and marks.
    pub name: String,
    /// Where it is, in metres.
    pub position_m: Vector3<f64>,
}

/// A taped distance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tape {
    /// What it was taped between.
    pub between: (TapeEnd, TapeEnd),
    /// The distance in metres.
    pub distance_m: f64,
    /// Its standard deviation in metres.
    pub sigma_m: f64,
}

/// One end of a tape, as an index into the antennas or the marks.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TapeEnd {
    /// An antenna.
    Antenna(usize),
    /// A mark.
    Mark(usize),
}

impl Site {
    /// Index of the antenna of this name.
    #[must_use]
    pub fn antenna_named(&self, name: &str) -> Option<usize> {
        self.geometry.antennas.iter().position(|antenna| antenna.name == name)
    }

    /// The geometry with the antennas where they stand in the stance of this name; none when there is no such stance.
    /// `main` gives [`Site::geometry`] as it is.
    #[must_use]
    pub fn geometry_of_stance(&self, name: &str) -> Option<arcstead_solver::Site> {
        let mut geometry = self.geometry.clone();
        if name != MAIN_STANCE {
            let stance = self.stances.iter().find(|stance| stance.name == name)?;
            for (antenna, position_m) in geometry.antennas.iter_mut().zip(&stance.positions_m) {
                antenna.position_m = *position_m;
            }
        }
        Some(geometry)
    }
}
