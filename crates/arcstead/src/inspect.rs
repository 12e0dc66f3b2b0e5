//! What is in capture files, before anything is known of the site.

use std::path::PathBuf;

use arcstead_core::{TimingOptions, summarise};

use crate::documents::{
    Carrier, Document, Head, Inputs, InspectDocument, InspectedCapture, InspectedChannel, Program,
    RejectedCapture,
};
use crate::error_chain::told;
use crate::formats::{CaptureFile, FormatError, ReadSettings, find_captures, open_captures};
use crate::visit::Watch;

/// Looks into the captures that `arguments` (files or folders) name. `band_hz` is where noise and pulse are measured; none
/// takes most of the spectrum. `sample_rate_hz` serves files that carry no rate.
///
/// A capture that cannot be read is told among the rejected ones.
///
/// # Errors
/// [`FormatError`] when an argument names nothing.
pub fn inspect(
    arguments: &[PathBuf],
    band_hz: Option<(f64, f64)>,
    sample_rate_hz: Option<f64>,
    watch: &impl Watch,
) -> Result<InspectDocument, FormatError> {
    let found = find_captures(arguments)?;
    let mut document = InspectDocument {
        head: Head {
            schema: InspectDocument::SCHEMA.into(),
            program: Program::this(),
            site: None,
            inputs: Inputs {
                files: found.files.iter().map(|path| path.display().to_string()).collect(),
                count: 0,
                site_sha256: None,
            },
            options: serde_json::Map::from_iter([(
                "band".to_owned(),
                band_hz.map(|(low, high)| vec![low / 1e6, high / 1e6]).into(),
            )]),
        },
        incomplete: false,
        captures: Vec::new(),
        rejected: Vec::new(),
    };
    let options = TimingOptions { band_hz, ..TimingOptions::default() };
    for path in &found.files {
        let named = path.display().to_string();
        let file = match open_captures(path, &ReadSettings { sample_rate_hz }) {
            Ok(file) => file,
            Err(error) => {
                document.head.inputs.count += 1;
                document.rejected.push(RejectedCapture { capture: named, reason: told(&error) });
                continue;
            }
        };
        document.head.inputs.count += file.capture_count();
        for index in 0..file.capture_count() {
            if watch.stop() {
                document.incomplete = true;
                continue;
            }
            match inspect_one(file.as_ref(), index, &named, &options) {
                Ok(inspected) => document.captures.push(inspected),
                Err(reason) => {
                    document.rejected.push(RejectedCapture { capture: file.capture_name(index), reason });
                }
            }
            watch.capture_done();
        }
    }
    Ok(document)
}

fn inspect_one(
    file: &dyn CaptureFile,
    index: usize,
    named: &str,
    options: &TimingOptions,
) -> Result<InspectedCapture, String> {
    let recorded = file.read(index).map_err(|error| told(&error))?;
    let summaries = summarise(&recorded.capture, options).map_err(|error| told(&error))?;
    Ok(InspectedCapture {
        name: recorded.name,
        file: named.to_owned(),
        time: recorded.time,
        sample_rate_hz: recorded.capture.sample_rate_hz(),
        samples: recorded.capture.sample_count(),
        channels: summaries
            .into_iter()
            .enumerate()
            .map(|(channel, summary)| InspectedChannel {
                channel: channel + 1,
                noise_rms: (!summary.dead).then_some(summary.noise_rms),
                largest: summary.largest,
                clipped: summary.clipped,
                dead: summary.dead,
                offset: summary.offset,
                carriers: summary
                    .carriers
                    .iter()
                    .map(|carrier| Carrier {
                        frequency_mhz: carrier.frequency_hz / 1e6,
                        level_db: carrier.level_db,
                    })
                    .collect(),
                pulse: summary.pulse,
                snr_db: summary.snr_db,
            })
            .collect(),
    })
}
