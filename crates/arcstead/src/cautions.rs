//! What the reader of a result must know beside it, in sentences.

use arcstead_solver::least_squares::Ended;
use arcstead_solver::{Combined, Fix, ImpossibleDelay, SLACK_SIGMAS};

use crate::arrivals_table::CaptureArrivals;
use crate::documents::{Flag, SourceResult};
use crate::site::Site;
use crate::timer::ArrivalOptions;

/// Holds for every result.
pub(crate) fn of_every_result() -> [String; 2] {
    [
        "A level on an antenna is not calibrated: nothing here tells how strong the discharge is.".into(),
        "Work near high voltage can kill. Before anyone approaches, climbs or switches, local codes, the site's own \
         clearances and licensed practice come first; this result replaces none of them."
            .into(),
    ]
}

/// What is particular to one source.
pub(crate) fn of_source(
    site: &Site,
    source: &SourceResult,
    fix: &Fix,
    whole: &Combined,
    captures: &[&CaptureArrivals],
) -> Vec<String> {
    let mut cautions = of_flags(source);
    cautions.extend(fix.set_aside.iter().map(|delay| of_impossible(site, delay)));
    let hidden: Vec<&str> = source
        .antennas
        .iter()
        .filter(|antenna| antenna.used && !antenna.line_of_sight)
        .map(|antenna| antenna.name.as_str())
        .collect();
    if !hidden.is_empty() {
        cautions.push(format!(
            "An obstacle stands between the position and {}: what arrived there came round it, late by an unknown \
             amount.",
            hidden.join(", ")
        ));
    }
    if whole.enlargement > 1.0 {
        cautions.push(format!(
            "The captures scatter {:.1} times as much as their stated sigmas; the scatter found was used.",
            whole.enlargement.sqrt()
        ));
    }
    cautions.extend(of_channels(site, captures));
    if fix.ended != Ended::Converged {
        cautions.push(
            "The least squares did not settle: the position is the best point seen, no minimum.".into(),
        );
    }
    if !fix.resolved {
        cautions.push(
            "The search was stopped before its cells were fine; region and probabilities are coarse.".into(),
        );
    }
    cautions
}

/// What the flags of a source mean for the reader.
fn of_flags(source: &SourceResult) -> Vec<String> {
    let used = source.antennas.iter().filter(|antenna| antenna.used).count();
    source
        .flags
        .iter()
        .map(|flag| match flag {
            Flag::FewAntennas => format!(
                "{used} antennas leave no arrival to check: a wrong cable delay, a wrong position or a hidden antenna would \
                 move the answer unseen. One more antenna would show it."
            ),
            Flag::RangeUndetermined => {
                "The direction is known, the distance is not: the bearing holds if delays and antenna positions are right, \
                 the point does not. A second place for the antennas, well to the side, would fix it."
                    .into()
            }
            Flag::Scattered => {
                "The captures scatter far more than their sigmas allow: more than one source may be discharging near this \
                 place, or the sigmas are too small. The place told may lie between two sources; no asset is named."
                    .into()
            }
            Flag::Hidden => {
                "The place told is one that obstacles hide from some of the antennas, and such a place explains almost \
                 anything: wrong delays, swapped channels, wrong positions too. Check those, or move the hidden antennas."
                    .into()
            }
            Flag::MirrorAmbiguity => {
                "The arrivals fit more than one separate place; see the other places before acting on the first.".into()
            }
            Flag::PoorFit => {
                "No place in the search box explains the arrivals within their sigmas: the source is outside the box, or a \
                 delay, a channel, an antenna position or a line of sight is not what the site file says. No asset is named."
                    .into()
            }
            Flag::AntennaLate => "An arrival later than any place can cause was left out.".into(),
            Flag::AntennaEarly => {
                "An arrival earlier than any place can cause was left out. Propagation makes arrivals late, never early: \
                 suspect a delay, a position, a swapped cable or a pick in the noise."
                    .into()
            }
            Flag::RegionTouchesSearchEdge => {
                "The region touches the edge of the search box: the source may lie outside it. Widen [search] and look \
                 again."
                    .into()
            }
        })
        .collect()
}

/// Which channels were not as they should be, in how many captures.
pub(crate) fn of_channels(site: &Site, captures: &[&CaptureArrivals]) -> Vec<String> {
    let told: [(&str, &str); 4] = [
        ("dead", "the channel carried nothing; look at cable, connector and power"),
        ("clipped", "the recorder's range cut the pulse; a smaller gain would keep its shape"),
        ("disagree", "onset and correlation disagree by more than their sigmas; a reflection may be in play"),
        ("weak", "the pulse hardly stands above the noise"),
    ];
    let mut cautions = Vec::new();
    for (flag, meaning) in told {
        let affected: Vec<String> = site
            .geometry
            .antennas
            .iter()
            .enumerate()
            .filter_map(|(index, antenna)| {
                let count = captures
                    .iter()
                    .flat_map(|capture| &capture.antennas)
                    .filter(|row| row.antenna == index && row.flags.names().any(|name| name == flag))
                    .count();
                // A tenth of the captures is worth a sentence; less shows in the arrivals table.
                (10 * count > captures.len()).then(|| format!("{} ({count})", antenna.name))
            })
            .collect();
        if !affected.is_empty() {
            cautions.push(format!(
                "Of {} captures, {flag} on {}: {meaning}.",
                captures.len(),
                affected.join(", ")
            ));
        }
    }
    cautions
}

/// An arrival that no place can cause.
pub(crate) fn of_impossible(site: &Site, delay: &ImpossibleDelay) -> String {
    let name = |index: usize| &site.geometry.antennas[index].name;
    let (direction, delay_ns) =
        if delay.delay_s >= 0.0 { ("later", delay.delay_s * 1e9) } else { ("earlier", -delay.delay_s * 1e9) };
    format!(
        "{} hears the pulse {delay_ns:.2} ns {direction} than {}, where at most {:.2} ns are possible ({SLACK_SIGMAS} \
         sigmas of {:.2} ns allowed): its arrival was set aside. Check its delay_ns, its channel and its position.",
        name(delay.antenna),
        name(delay.against),
        delay.limit_s * 1e9,
        delay.sigma_s * 1e9,
    )
}

/// Captures with a pulse that belong to no source.
pub(crate) fn of_strays(stray: usize, usable: usize) -> Option<String> {
    (stray > 0).then(|| {
        let more = if 5 * stray > usable {
            " That is many: another source may be discharging. `--each` solves every capture by itself."
        } else {
            ""
        };
        format!("{stray} of {usable} captures with a pulse do not agree with the source told and were left out.{more}")
    })
}

/// Which antennas missed the pulse in the captures that could not be solved for want of arrivals.
pub(crate) fn of_missed(site: &Site, captures: &[CaptureArrivals], used: usize) -> Option<String> {
    let partly: Vec<&CaptureArrivals> = captures
        .iter()
        .filter(|capture| {
            let needed = site.geometry.search.unknowns() + 1;
            (1..needed).contains(&capture.received())
        })
        .collect();
    // A few lost captures need no explanation.
    if 10 * partly.len() <= used {
        return None;
    }
    let missed: Vec<String> = site
        .geometry
        .antennas
        .iter()
        .enumerate()
        .filter_map(|(index, antenna)| {
            let count = partly
                .iter()
                .filter(|capture| {
                    capture.antennas.iter().any(|row| row.antenna == index && row.arrival_s.is_none())
                })
                .count();
            (count > 0).then(|| format!("{} ({count})", antenna.name))
        })
        .collect();
    Some(format!(
        "{} captures hold a pulse on too few antennas to be used; it was missed by {}. A stronger antenna, a nearer stand or \
         a lower trigger level there would use more of them.",
        partly.len(),
        missed.join(", ")
    ))
}

/// The band asked for against the bands of the antennas.
pub(crate) fn of_band(site: &Site, timing: &ArrivalOptions) -> Option<String> {
    let (low_hz, high_hz) = timing.band_hz?;
    let beyond: Vec<&str> = site
        .geometry
        .antennas
        .iter()
        .zip(&site.chains)
        .filter(|(_, chain)| {
            chain
                .band_hz
                .is_some_and(|(antenna_low, antenna_high)| low_hz < antenna_low || high_hz > antenna_high)
        })
        .map(|(antenna, _)| antenna.name.as_str())
        .collect();
    (!beyond.is_empty()).then(|| {
        format!(
            "The band asked for, {} to {} MHz, reaches beyond what the site file states for {}: what is timed there may be no \
             pulse.",
            low_hz / 1e6,
            high_hz / 1e6,
            beyond.join(", ")
        )
    })
}

/// No set of captures agrees.
pub(crate) fn of_no_agreement(usable: usize) -> Option<String> {
    (usable > 0).then(|| {
        format!(
            "{usable} captures hold pulses, but too few of them agree in their delays: several sources, passing radios, or \
             picks in the noise. `--each` solves every capture by itself."
        )
    })
}

/// For captures solved one by one.
pub(crate) fn of_each(sources: &[SourceResult]) -> Vec<String> {
    let few = sources.iter().filter(|source| source.flags.contains(&Flag::FewAntennas)).count();
    let mut cautions = vec![
        "Every capture was solved by itself: errors of delays and survey are the same in all of them.".into(),
    ];
    if few > 0 {
        cautions.push(format!("In {few} of {} captures no arrival can be checked.", sources.len()));
    }
    cautions
}
