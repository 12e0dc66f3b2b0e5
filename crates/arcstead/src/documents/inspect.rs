//! `arcstead/inspect/1`: what is in capture files.

use serde::{Deserialize, Serialize};

use super::head::Head;
use super::locate::{RejectedCapture, is_false};
use super::written::Document;
use crate::capture_time::CaptureTime;

/// What is in capture files.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct InspectDocument {
    /// What every document begins with.
    #[serde(flatten)]
    pub head: Head,
    /// Whether the run was stopped before all captures were read. Written only when it was.
    #[serde(default, skip_serializing_if = "is_false")]
    pub incomplete: bool,
    /// The captures that could be read, in the order of the files.
    pub captures: Vec<InspectedCapture>,
    /// The captures and files that could not be read, each with its reason.
    pub rejected: Vec<RejectedCapture>,
}

impl Document for InspectDocument {
    const SCHEMA: &'static str = "arcstead/inspect/1";

    fn head(&self) -> &Head {
        &self.head
    }
}

/// What is in one capture.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct InspectedCapture {
    /// Name of the capture.
    pub name: String,
    /// The file it is in, as it was named.
    pub file: String,
    /// When it was taken, where the file says so.
    pub time: Option<CaptureTime>,
    /// Samples per second.
    pub sample_rate_hz: f64,
    /// Number of samples of each channel.
    pub samples: usize,
    /// Its channels, in order.
    pub channels: Vec<InspectedChannel>,
}

/// What is on one channel. Levels are in the unit of the samples, which is not calibrated.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct InspectedChannel {
    /// The channel, counted from 1.
    pub channel: usize,
    /// Root mean square of the noise before the pulse; none where no quiet part was found.
    pub noise_rms: Option<f64>,
    /// Greatest distance of a sample from the offset.
    pub largest: f64,
    /// Whether samples stand at the end of the recorder's range.
    pub clipped: bool,
    /// Whether the channel carries nothing.
    pub dead: bool,
    /// Mean of the samples.
    pub offset: f64,
    /// Narrow lines in the spectrum, the strongest first.
    pub carriers: Vec<Carrier>,
    /// Whether the channel holds a pulse.
    pub pulse: bool,
    /// 20 log10 of the greatest magnitude over the noise rms in dB, both in the band looked at: that of the pulse where
    /// there is one, some 10 dB for noise alone; none on a dead channel.
    pub snr_db: Option<f64>,
}

/// A narrow line in the spectrum: a broadcast or radio transmitter.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Carrier {
    /// Its frequency in megahertz.
    pub frequency_mhz: f64,
    /// How far it stands above the spectrum around it, in dB.
    pub level_db: f64,
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::documents::{Inputs, Program};

    #[test]
    fn a_capture_is_told_channel_by_channel() {
        let document = InspectDocument {
            head: Head {
                schema: InspectDocument::SCHEMA.into(),
                program: Program::this(),
                site: None,
                inputs: Inputs { files: vec!["shot_1.csv".into()], count: 1, site_sha256: None },
                options: serde_json::Map::new(),
            },
            incomplete: false,
            captures: vec![InspectedCapture {
                name: "shot_1.csv".into(),
                file: "visit/shot_1.csv".into(),
                time: None,
                sample_rate_hz: 5e9,
                samples: 10_000,
                channels: vec![InspectedChannel {
                    channel: 1,
                    noise_rms: Some(0.001),
                    largest: 0.2,
                    clipped: false,
                    dead: false,
                    offset: 0.0,
                    carriers: vec![Carrier { frequency_mhz: 98.3, level_db: 31.0 }],
                    pulse: false,
                    snr_db: None,
                }],
            }],
            rejected: vec![],
        };
        let text = document.to_json().unwrap();
        assert_eq!(InspectDocument::from_json(&text).unwrap(), document);
        let json: serde_json::Value = serde_json::from_str(&text).unwrap();
        let keys: Vec<_> = json["captures"][0]["channels"][0].as_object().unwrap().keys().collect();
        assert_eq!(
            keys,
            ["channel", "noise_rms", "largest", "clipped", "dead", "offset", "carriers", "pulse", "snr_db"]
        );
    }
}
