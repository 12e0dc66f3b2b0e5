//! The `[[asset]]` tables.

use arcstead_solver::Asset;

use super::quantity::{RADIUS_M, WEIGHT};
use super::section::{Section, Taken};

const KNOWN: &[&str] = &["name", "kind", "at_m", "from_m", "to_m", "radius_m", "weight"];

const RADIUS_M_DEFAULT: f64 = 0.3;
const WEIGHT_DEFAULT: f64 = 1.0;

/// Reads the tables, with the line and column of each; an asset with a mistake that leaves it without a value is left out.
pub(super) fn read(whole: &Section<'_>) -> (Vec<Asset>, Vec<(usize, usize)>) {
    let mut names = Taken::new("the asset name");
    let (mut assets, mut places) = (Vec::new(), Vec::new());
    for section in whole.tables("asset", KNOWN) {
        let name = section.needed_name("name");
        if let Some(name) = &name {
            names.take(&section, "name", name);
        }
        let kind = section.text("kind").unwrap_or_default().to_owned();
        if section.has("from_m") || section.has("to_m") {
            let end = if section.has("from_m") { "from_m" } else { "to_m" };
            section.exclude("at_m", end);
        } else {
            section.need("at_m", "the place [x, y, z] in metres, or a straight piece as `from_m` and `to_m`");
        }
        section.together("from_m", "to_m");
        let at_m = section.point("at_m");
        let (from_m, to_m) = (section.point("from_m"), section.point("to_m"));
        let radius_m = section.number_or("radius_m", &RADIUS_M, RADIUS_M_DEFAULT);
        let weight = section.number_or("weight", &WEIGHT, WEIGHT_DEFAULT);
        if let (Some(name), Some(from_m), Some(to_m)) = (name, from_m.or(at_m), to_m.or(at_m)) {
            assets.push(Asset { name, kind, from_m, to_m, radius_m, weight });
            places.push(section.place());
        }
    }
    (assets, places)
}
