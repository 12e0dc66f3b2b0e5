//! The settings that the benches share: one site, one kind of visit, fixed seeds.

use arcstead::core::Capture;
use arcstead::site::Site;
use arcstead_sim::{RecorderSetting, SourceSetting, Visit, VisitSettings};

/// The demo site, read from its file.
///
/// # Panics
/// When the demo site cannot be read: a bench without its site measures nothing.
#[must_use]
pub fn demo_site() -> Site {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/../demo-sites/marl-bank/site.toml");
    Site::read(path.as_ref()).expect("the demo site belongs to the project")
}

/// A simulated visit of the demo site: a source on the disconnector post of phase B, 4 x 1500 samples at 5 GS/s.
///
/// # Panics
/// When the simulation refuses its settings, which are fixed here.
#[must_use]
pub fn captures(site: &Site, count: usize) -> Vec<Capture> {
    let settings = VisitSettings {
        sources: vec![SourceSetting::at([7.8, 14.6, 3.4])],
        captures: count,
        seed: 1,
        recorder: RecorderSetting { bits: 12, ..RecorderSetting::default() },
        nominal_delay_s: site.chains.iter().map(|chain| chain.delay_s).collect(),
        ..VisitSettings::default()
    };
    let visit = Visit::new(&site.geometry, settings).expect("the settings are fixed and fit the demo site");
    (0..count).map(|index| visit.capture(index)).collect()
}
