//! The `[[stance]]` tables.

use nalgebra::Vector3;

use super::contents::{MAIN_STANCE, Stance};
use super::mistake::MistakeKind;
use super::nearest_name::nearest;
use super::section::{Section, Taken};

/// Reads the tables, and line and column of each; a stance with a mistake is left out.
pub(super) fn read(whole: &Section<'_>, antennas: &[String]) -> (Vec<Stance>, Vec<(usize, usize)>) {
    let mut names = Taken::new("the stance name");
    let (mut stances, mut places) = (Vec::new(), Vec::new());
    for section in whole.tables("stance", &["name", "position_m"]) {
        let name = section.needed_name("name");
        if let Some(name) = &name {
            names.take(&section, "name", name);
            let expected = if name == MAIN_STANCE {
                Some("another name: `main` is where the [[antenna]] tables stand")
            } else if name.contains('=') {
                Some("a name without `=`, which parts stance and capture on the command line")
            } else {
                None
            };
            if let Some(expected) = expected {
                let (table, found) = (section.title.clone(), section.ledger.quote(&section.span_of("name")));
                section.report("name", MistakeKind::Name { table, key: "name", found, expected });
            }
        }
        section.need("position_m", "a place for every antenna: { A1 = [x, y, z], ... }");
        let Some(positions) = section.open_table("position_m") else { continue };
        for (antenna, span) in positions.entries() {
            if !antennas.iter().any(|known| known == antenna) {
                let kind = MistakeKind::UnknownName {
                    table: section.title.clone(),
                    key: "position_m",
                    what: "antenna",
                    name: antenna.to_owned(),
                    nearest: nearest(antenna, antennas.iter().map(String::as_str)).map(str::to_owned),
                };
                section.ledger.report(&span, kind);
            }
        }
        let place = |antenna: &String| {
            if !positions.has(antenna) {
                let (table, antenna) = (section.title.clone(), antenna.clone());
                section.report("position_m", MistakeKind::StanceIncomplete { table, antenna });
            }
            positions.point(antenna)
        };
        let positions_m: Vec<Option<Vector3<f64>>> = antennas.iter().map(place).collect();
        let positions_m: Option<Vec<_>> = positions_m.into_iter().collect();
        if let (Some(name), Some(positions_m)) = (name, positions_m) {
            stances.push(Stance { name, positions_m });
            places.push(section.place());
        }
    }
    (stances, places)
}
