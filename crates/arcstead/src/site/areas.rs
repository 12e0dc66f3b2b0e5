//! The tables with a footprint: `[[obstacle]]`, `[[stand_area]]`, `[[keep_out]]`.

use arcstead_solver::Obstacle;

use super::contents::{KeepOut, StandArea};
use super::mistake::MistakeKind;
use super::quantity::COORDINATE_M;
use super::section::{Section, Taken};

/// Reads the obstacles; `base_m` is 0 where it is not given. One with a mistake is left out.
pub(super) fn obstacles(whole: &Section<'_>) -> Vec<Obstacle> {
    let mut names = Taken::new("the obstacle name");
    let mut obstacles = Vec::new();
    for section in whole.tables("obstacle", &["name", "footprint_m", "base_m", "top_m"]) {
        let name = section.needed_name("name");
        if let Some(name) = &name {
            names.take(&section, "name", name);
        }
        let footprint_m = section.needed_footprint();
        let base_m = section.number_or("base_m", &COORDINATE_M, 0.0);
        let top_m = section.needed_number("top_m", &COORDINATE_M);
        if let Some(top_m) = top_m.filter(|&top_m| base_m >= top_m) {
            let (table, expected) = (section.title.clone(), "`base_m` (0 where not given) below `top_m`");
            section.report(
                "top_m",
                MistakeKind::Order { table, key: "top_m", low: base_m, high: top_m, expected },
            );
        }
        if let (Some(name), Some(footprint_m), Some(top_m)) = (name, footprint_m, top_m) {
            obstacles.push(Obstacle { name, footprint_m, base_m, top_m });
        }
    }
    obstacles
}

/// Reads the stand areas; one with a mistake is left out.
pub(super) fn stand_areas(whole: &Section<'_>) -> Vec<StandArea> {
    let mut areas = Vec::new();
    for section in whole.tables("stand_area", &["footprint_m", "height_m"]) {
        const HEIGHTS: &str = "the lowest and highest antenna height [low, high] in metres";
        let footprint_m = section.needed_footprint();
        section.need("height_m", HEIGHTS);
        let height_m = section.interval("height_m", &COORDINATE_M, HEIGHTS);
        if let (Some(footprint_m), Some(height_m)) = (footprint_m, height_m) {
            areas.push(StandArea { footprint_m, height_m });
        }
    }
    areas
}

/// Reads the keep-outs; one with a mistake is left out.
pub(super) fn keep_outs(whole: &Section<'_>) -> Vec<KeepOut> {
    let mut names = Taken::new("the keep-out name");
    let mut keep_outs = Vec::new();
    for section in whole.tables("keep_out", &["name", "footprint_m"]) {
        let name = section.needed_name("name");
        if let Some(name) = &name {
            names.take(&section, "name", name);
        }
        let footprint_m = section.needed_footprint();
        if let (Some(name), Some(footprint_m)) = (name, footprint_m) {
            keep_outs.push(KeepOut { name, footprint_m });
        }
    }
    keep_outs
}
