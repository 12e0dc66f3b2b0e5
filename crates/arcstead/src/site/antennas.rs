//! The `[[antenna]]` tables.

use arcstead_solver::{Antenna, PositionSigma};
use nalgebra::Vector3;

use super::contents::Chain;
use super::quantity::{DELAY_NS, FREQUENCY_MHZ, SIGMA_M, SIGMA_NS};
use super::section::{Section, Taken};

const KNOWN: &[&str] = &[
    "name",
    "channel",
    "position_m",
    "position_sigma_m",
    "delay_ns",
    "delay_sigma_ns",
    "response_sigma_ns",
    "band_mhz",
];

/// The highest channel number a site can use.
const MOST_CHANNELS: u32 = 256;

const POSITION_SIGMA_M: f64 = 0.03;
const DELAY_NS_DEFAULT: f64 = 0.0;
const DELAY_SIGMA_NS: f64 = 0.1;
const RESPONSE_SIGMA_NS: f64 = 0.05;

/// What the tables say, in the order of the file.
pub(super) struct Antennas {
    pub(super) antennas: Vec<Antenna>,
    pub(super) chains: Vec<Chain>,
    /// Indices of those without a position.
    pub(super) free: Vec<usize>,
    /// The names of all tables that have one, also of those with mistakes, for the tables that refer to them.
    pub(super) names: Vec<String>,
    /// Line and column of each.
    pub(super) places: Vec<(usize, usize)>,
}

/// Reads the tables; an antenna with a mistake that leaves it without a value is left out. Where `free_allowed` an
/// antenna may have no position.
pub(super) fn read(whole: &Section<'_>, free_allowed: bool) -> Antennas {
    let mut read = Antennas { antennas: vec![], chains: vec![], free: vec![], names: vec![], places: vec![] };
    let (mut names, mut channels) = (Taken::new("the antenna name"), Taken::new("the channel"));
    // Beyond the channels there are, every antenna is a mistake already: none is kept, so that what refers to
    // them stays quick.
    for section in whole.tables("antenna", KNOWN) {
        let name = section.needed_name("name");
        if let Some(name) = &name {
            names.take(&section, "name", name);
            if read.names.len() < MOST_CHANNELS as usize {
                read.names.push(name.clone());
            }
        }
        section.need("channel", "the channel of the capture, counted from 1");
        let channel = section.integer("channel", 1, MOST_CHANNELS);
        if let Some(channel) = channel {
            channels.take(&section, "channel", channel);
        }
        let free = free_allowed && !section.has("position_m");
        let position_m = if free { Some(Vector3::zeros()) } else { section.needed_point("position_m") };
        let position_sigma = position_sigma(&section);
        let delay_s = section.number_or("delay_ns", &DELAY_NS, DELAY_NS_DEFAULT) * 1e-9;
        let delay_sigma_s = section.number_or("delay_sigma_ns", &SIGMA_NS, DELAY_SIGMA_NS) * 1e-9;
        let response_sigma_s = section.number_or("response_sigma_ns", &SIGMA_NS, RESPONSE_SIGMA_NS) * 1e-9;
        let band_hz = section
            .interval("band_mhz", &FREQUENCY_MHZ, "the band [lowest, highest] in MHz")
            .map(|(low, high)| (low * 1e6, high * 1e6));
        let (Some(name), Some(channel), Some(position_m)) = (name, channel, position_m) else { continue };
        if read.antennas.len() == MOST_CHANNELS as usize {
            continue;
        }
        if free {
            read.free.push(read.antennas.len());
        }
        read.places.push(section.place());
        read.antennas.push(Antenna { name, position_m, position_sigma, delay_sigma_s, response_sigma_s });
        // At least 1, so it fits.
        read.chains.push(Chain { channel: channel as usize - 1, delay_s, band_hz });
    }
    read
}

fn position_sigma(section: &Section<'_>) -> PositionSigma {
    const KEY: &str = "position_sigma_m";
    if section.is_list(KEY) {
        section
            .numbers(KEY, &SIGMA_M, "one number, or [x, y, z] in metres")
            .map_or(PositionSigma::Isotropic(POSITION_SIGMA_M), |sigma| PositionSigma::PerAxis(sigma.into()))
    } else {
        PositionSigma::Isotropic(section.number_or(KEY, &SIGMA_M, POSITION_SIGMA_M))
    }
}
