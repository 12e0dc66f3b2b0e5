//! One row per capture and channel.

use arcstead::documents::InspectDocument;

use super::rows::{Rows, number};

/// The columns; `--help` says what they hold.
const COLUMNS: [&str; 14] = [
    "capture",
    "file",
    "time",
    "sample_rate_hz",
    "samples",
    "channel",
    "offset",
    "noise_rms",
    "largest",
    "snr_db",
    "pulse",
    "clipped",
    "dead",
    "carriers_mhz",
];

/// The channels of the captures as CSV.
pub(crate) fn text(document: &InspectDocument) -> Result<String, csv::Error> {
    let mut rows = Rows::new(&COLUMNS)?;
    for capture in &document.captures {
        for channel in &capture.channels {
            let carriers = channel.carriers.iter().map(|carrier| number(Some(carrier.frequency_mhz)));
            rows.add(&[
                capture.name.clone(),
                capture.file.clone(),
                capture.time.map_or_else(String::new, |time| time.to_string()),
                number(Some(capture.sample_rate_hz)),
                capture.samples.to_string(),
                channel.channel.to_string(),
                number(Some(channel.offset)),
                number(channel.noise_rms),
                number(Some(channel.largest)),
                number(channel.snr_db),
                channel.pulse.to_string(),
                channel.clipped.to_string(),
                channel.dead.to_string(),
                carriers.collect::<Vec<_>>().join(";"),
            ])?;
        }
    }
    rows.into_text()
}
