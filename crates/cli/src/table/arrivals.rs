//! Arrival times: a summary for each antenna, and with `--verbose` every arrival.

use arcstead::TimedVisit;
use arcstead::arrivals_table::AntennaArrival;
use arcstead::site::Site;

use super::figures::{count, decimals, middle};
use super::layout::{self, Side};
use super::screen::Screen;

/// The text of a timed visit.
pub(crate) fn text(site: &Site, timed: &TimedVisit, screen: Screen, verbose: bool) -> String {
    let with_pulse = timed.arrivals.iter().filter(|capture| capture.received() > 0).count();
    let all = count(timed.captures, "capture");
    let mut text = layout::headline(&format!("{}: a pulse in {with_pulse} of {all}", site.name), screen);
    if timed.incomplete {
        text += &layout::paragraph("INCOMPLETE: stopped before the last capture.", screen);
    }
    text += "\n";
    let header = [
        ("Antenna", Side::Left),
        ("Arrivals", Side::Right),
        ("SNR dB", Side::Right),
        ("Sigma ns", Side::Right),
        ("Delay ns", Side::Right),
        ("Flags (captures)", Side::Left),
    ];
    let rows: Vec<Vec<String>> =
        (0..site.geometry.antennas.len()).map(|antenna| summary(site, timed, antenna)).collect();
    text += &layout::columns(&header, &rows, screen);
    text += "\n";
    text += &layout::paragraph(
        "SNR and sigma are the middle ones of all captures; sigma is the random part of the arrival's error. --format csv \
         gives the times themselves.",
        screen,
    );
    if verbose {
        text += "\n";
        text += &every_arrival(site, timed, screen);
    }
    text
}

fn rows_of(timed: &TimedVisit, antenna: usize) -> impl Iterator<Item = &AntennaArrival> {
    timed.arrivals.iter().flat_map(|capture| &capture.antennas).filter(move |row| row.antenna == antenna)
}

fn summary(site: &Site, timed: &TimedVisit, antenna: usize) -> Vec<String> {
    let mut flags: Vec<(&str, usize)> = Vec::new();
    for name in rows_of(timed, antenna).flat_map(|row| row.flags.names()) {
        match flags.iter_mut().find(|(known, _)| *known == name) {
            Some((_, number)) => *number += 1,
            None => flags.push((name, 1)),
        }
    }
    let flags: Vec<String> = flags.into_iter().map(|(name, number)| format!("{name} ({number})")).collect();
    let received = rows_of(timed, antenna).filter(|row| row.arrival_s.is_some()).count();
    let sigma_s = middle(rows_of(timed, antenna).filter_map(|row| row.sigma_s));
    vec![
        site.geometry.antennas[antenna].name.clone(),
        received.to_string(),
        decimals(middle(rows_of(timed, antenna).filter_map(|row| row.snr_db)), 0),
        decimals(sigma_s.map(|sigma_s| sigma_s * 1e9), 3),
        format!("{:.2}", site.chains[antenna].delay_s * 1e9),
        flags.join(", "),
    ]
}

fn every_arrival(site: &Site, timed: &TimedVisit, screen: Screen) -> String {
    let header = [
        ("Capture", Side::Whole),
        ("Antenna", Side::Left),
        ("Arrival ns", Side::Right),
        ("Sigma ns", Side::Right),
        ("SNR dB", Side::Right),
        ("Flags", Side::Left),
    ];
    let mut rows = Vec::new();
    for capture in &timed.arrivals {
        for row in &capture.antennas {
            rows.push(vec![
                capture.capture.clone(),
                site.geometry.antennas[row.antenna].name.clone(),
                decimals(row.arrival_s.map(|arrival_s| arrival_s * 1e9), 3),
                decimals(row.sigma_s.map(|sigma_s| sigma_s * 1e9), 3),
                decimals(row.snr_db, 0),
                row.flags.names().collect::<Vec<_>>().join(", "),
            ]);
        }
    }
    layout::columns(&header, &rows, screen)
}
