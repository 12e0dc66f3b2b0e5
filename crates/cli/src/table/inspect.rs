//! What is in capture files: a summary for each channel, and with `--verbose` every capture.

use arcstead::documents::{InspectDocument, InspectedCapture, InspectedChannel};

use super::figures::{count, decimals, middle};
use super::layout::{self, Side};
use super::screen::Screen;
use crate::rejected;

/// Carriers that are told for a channel.
const MOST_CARRIERS: usize = 4;

/// The text of an inspection: a part for each shape of capture that was found.
pub(crate) fn text(document: &InspectDocument, screen: Screen, verbose: bool) -> String {
    let files = count(document.head.inputs.files.len(), "file");
    let all = document.head.inputs.count;
    let read = document.captures.len();
    let told = match read == all {
        true => count(read, "capture"),
        false => format!("{read} of {} read,", count(all, "capture")),
    };
    let mut text = layout::headline(&format!("{told} in {files}"), screen);
    if document.incomplete {
        text += &layout::paragraph("INCOMPLETE: stopped before the last capture.", screen);
    }
    for alike in by_shape(&document.captures) {
        text += "\n";
        text += &part(&alike, screen);
    }
    text += "\n";
    text += &layout::paragraph(
        "Pulses, clipped, dead: number of captures. SNR and noise (rms) are the middle ones of all captures; noise alone \
         reaches some 10 dB. Carriers that are not in every capture have the number of captures beside them. Levels are in \
         the unit of the samples, which is not calibrated.",
        screen,
    );
    if verbose {
        text += "\n";
        text += &every_capture(document, screen);
    }
    if !document.rejected.is_empty() {
        text += "\nNot read:\n";
        text += &layout::bullets(&rejected::lines(&document.rejected, verbose), screen);
    }
    text
}

/// Captures of the same number of channels and samples at the same rate, in order of the first of each.
fn by_shape(captures: &[InspectedCapture]) -> Vec<Vec<&InspectedCapture>> {
    let shape = |c: &InspectedCapture| (c.channels.len(), c.samples, c.sample_rate_hz.to_bits());
    let mut groups: Vec<Vec<&InspectedCapture>> = Vec::new();
    for capture in captures {
        match groups.iter_mut().find(|group| shape(group[0]) == shape(capture)) {
            Some(group) => group.push(capture),
            None => groups.push(vec![capture]),
        }
    }
    groups
}

fn part(alike: &[&InspectedCapture], screen: Screen) -> String {
    let shape = alike[0];
    let length_ns = shape.samples as f64 / shape.sample_rate_hz * 1e9;
    let mut text = layout::paragraph(
        &format!(
            "{}, each of {} and {} samples at {} GS/s ({length_ns:.1} ns).",
            count(alike.len(), "capture"),
            count(shape.channels.len(), "channel"),
            shape.samples,
            shape.sample_rate_hz / 1e9,
        ),
        screen,
    );
    let times = alike.iter().filter_map(|capture| capture.time);
    if let (Some(first), Some(last)) = (times.clone().min(), times.max()) {
        text += &layout::paragraph(&format!("Taken {first} to {last}."), screen);
    }
    text += "\n";
    let header = [
        ("Ch", Side::Right),
        ("Pulses", Side::Right),
        ("SNR dB", Side::Right),
        ("Noise", Side::Right),
        ("Largest", Side::Right),
        ("Clipped", Side::Right),
        ("Dead", Side::Right),
        ("Carriers MHz", Side::Left),
    ];
    let line_width_mhz = shape.sample_rate_hz / shape.samples as f64 / 1e6;
    let rows: Vec<Vec<String>> = (0..shape.channels.len())
        .map(|index| {
            let channels: Vec<&InspectedChannel> =
                alike.iter().map(|capture| &capture.channels[index]).collect();
            summary(&channels, line_width_mhz)
        })
        .collect();
    text += &layout::columns(&header, &rows, screen);
    text
}

/// One channel over captures of the same shape.
fn summary(channels: &[&InspectedChannel], line_width_mhz: f64) -> Vec<String> {
    let number = |has: fn(&InspectedChannel) -> bool| channels.iter().filter(|channel| has(channel)).count();
    let largest = channels.iter().map(|channel| channel.largest).fold(0.0, f64::max);
    vec![
        channels[0].channel.to_string(),
        number(|channel| channel.pulse).to_string(),
        decimals(middle(channels.iter().filter_map(|channel| channel.snr_db)), 0),
        middle(channels.iter().filter_map(|channel| channel.noise_rms)).map_or_else(|| "-".into(), level),
        level(largest),
        number(|channel| channel.clipped).to_string(),
        number(|channel| channel.dead).to_string(),
        carriers(channels, line_width_mhz),
    ]
}

/// A level of unknown unit, three digits of it.
fn level(value: f64) -> String {
    match value {
        1e2..1e6 => format!("{value:.0}"),
        10.0..1e2 => format!("{value:.1}"),
        1.0..10.0 => format!("{value:.2}"),
        1e-2..1.0 => format!("{value:.4}"),
        _ => format!("{value:.2e}"),
    }
}

/// Frequencies seen, those of most captures first. Lines nearer than the width of a spectral line are the same one.
fn carriers(channels: &[&InspectedChannel], line_width_mhz: f64) -> String {
    let mut found: Vec<f64> =
        channels.iter().flat_map(|channel| &channel.carriers).map(|carrier| carrier.frequency_mhz).collect();
    found.sort_by(f64::total_cmp);
    let mut lines: Vec<Vec<f64>> = Vec::new();
    for frequency_mhz in found {
        match lines
            .last_mut()
            .filter(|line| line.last().is_some_and(|at| frequency_mhz - at < line_width_mhz))
        {
            Some(line) => line.push(frequency_mhz),
            None => lines.push(vec![frequency_mhz]),
        }
    }
    lines.sort_by_key(|line| std::cmp::Reverse(line.len()));
    let told = lines.iter().take(MOST_CARRIERS).filter_map(|line| {
        // Two lines of one capture may lie in one: it is the captures that count.
        let captures = line.len().min(channels.len());
        let frequency_mhz = middle(line.iter().copied())?;
        // In every capture is what a carrier is; the exception is worth a number.
        Some(match captures == channels.len() {
            true => format!("{frequency_mhz:.0}"),
            false => format!("{frequency_mhz:.0} ({captures})"),
        })
    });
    let mut told: Vec<String> = told.collect();
    if lines.len() > MOST_CARRIERS {
        told.push(format!("{} more", lines.len() - MOST_CARRIERS));
    }
    told.join(", ")
}

fn every_capture(document: &InspectDocument, screen: Screen) -> String {
    let header = [
        ("Capture", Side::Whole),
        ("Channel", Side::Right),
        ("SNR dB", Side::Right),
        ("Noise rms", Side::Right),
        ("Largest", Side::Right),
        ("Remarks", Side::Left),
    ];
    let mut rows = Vec::new();
    for capture in &document.captures {
        for channel in &capture.channels {
            let remarks = [
                (channel.dead, "dead"),
                (channel.clipped, "clipped"),
                (!channel.dead && !channel.pulse, "no pulse"),
                (!channel.carriers.is_empty(), "carriers"),
            ];
            let remarks: Vec<&str> =
                remarks.into_iter().filter_map(|(is, name)| is.then_some(name)).collect();
            rows.push(vec![
                capture.name.clone(),
                channel.channel.to_string(),
                decimals(channel.snr_db, 0),
                channel.noise_rms.map_or_else(|| "-".into(), level),
                level(channel.largest),
                remarks.join(", "),
            ]);
        }
    }
    layout::columns(&header, &rows, screen)
}
