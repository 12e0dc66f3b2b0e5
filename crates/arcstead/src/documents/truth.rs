//! `arcstead/truth/1`: what a simulated visit really was, written beside its captures.

use serde::{Deserialize, Serialize};

use super::head::Head;
use super::written::Document;

/// What a simulated visit really was.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct TruthDocument {
    /// What every document begins with.
    #[serde(flatten)]
    pub head: Head,
    /// The seed that gives the same visit again.
    pub seed: u64,
    /// The sources, in the order the captures refer to.
    pub sources: Vec<TrueSource>,
    /// What was drawn for each antenna, in the order of the site.
    pub antennas: Vec<TrueAntenna>,
    /// Which capture holds which source, in the order of the files.
    pub captures: Vec<TrueCapture>,
}

impl Document for TruthDocument {
    const SCHEMA: &'static str = "arcstead/truth/1";

    fn head(&self) -> &Head {
        &self.head
    }
}

/// One simulated source.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct TrueSource {
    /// Where it is, in metres.
    pub position_m: [f64; 3],
    /// The asset it was put on; none for a free place.
    pub asset: Option<String>,
    /// What its response errors added to the arrival at each antenna, in nanoseconds, in the order of the site.
    pub response_error_ns: Vec<f64>,
}

/// What was drawn for one antenna. True minus what the site file says, wherever an error is told.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct TrueAntenna {
    /// Name of the antenna.
    pub name: String,
    /// The stance these errors belong to; the positions of `[[antenna]]` are the stance `main`.
    pub stance: String,
    /// True delay of antenna, cable and recorder channel, in nanoseconds.
    pub delay_ns: f64,
    /// Error of the delay in nanoseconds.
    pub delay_error_ns: f64,
    /// True phase centre in metres.
    pub position_m: [f64; 3],
    /// Error of the phase centre in metres.
    pub position_error_m: [f64; 3],
    /// Gain over the mean of the antennas in dB.
    pub gain_db: f64,
}

/// Which source a capture holds.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct TrueCapture {
    /// Name of the capture.
    pub name: String,
    /// Index of its source, counted from 0; none for a capture of noise alone.
    pub source: Option<usize>,
    /// The stance it was taken from.
    pub stance: String,
    /// When the pulse left the source, in seconds after the first sample (negative when before it); none for noise.
    pub emission_s: Option<f64>,
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::documents::{Inputs, Program};

    #[test]
    fn what_is_written_reads_back_to_the_last_digit() {
        let document = TruthDocument {
            head: Head {
                schema: TruthDocument::SCHEMA.into(),
                program: Program::this(),
                site: Some("Marl Bank".into()),
                inputs: Inputs { files: vec![], count: 0, site_sha256: None },
                options: serde_json::Map::new(),
            },
            seed: u64::MAX,
            sources: vec![TrueSource {
                position_m: [12.0, 8.0, 1.779_601_217_024_221_4e-7],
                asset: None,
                response_error_ns: vec![-0.01],
            }],
            antennas: vec![TrueAntenna {
                name: "A1".into(),
                stance: "main".into(),
                delay_ns: 52.13,
                delay_error_ns: 0.03,
                position_m: [0.01, 0.0, 2.0],
                position_error_m: [0.01, 0.0, 0.0],
                gain_db: -0.9,
            }],
            captures: vec![TrueCapture {
                name: "visit#1".into(),
                source: Some(0),
                stance: "main".into(),
                emission_s: Some(1.5e-7),
            }],
        };
        assert_eq!(TruthDocument::from_json(&document.to_json().unwrap()).unwrap(), document);
    }
}
