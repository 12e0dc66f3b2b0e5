//! The `[[mark]]` and `[[tape]]` tables.

use std::collections::HashMap;

use super::contents::{Mark, Tape, TapeEnd};
use super::mistake::MistakeKind;
use super::nearest_name::nearest;
use super::quantity::{DISTANCE_M, SIGMA_M};
use super::section::{Section, Taken};

/// The marks that could be read, and the names of all of them with their number.
pub(super) struct Marks {
    pub(super) marks: Vec<Mark>,
    names: Vec<String>,
    numbers: HashMap<String, usize>,
}

/// Reads the marks. A mark may not bear the name of an antenna: tapes refer to both.
pub(super) fn marks(whole: &Section<'_>, antennas: &[String]) -> Marks {
    let mut taken = Taken::new("the mark name");
    let mut read = Marks { marks: vec![], names: vec![], numbers: HashMap::new() };
    for section in whole.tables("mark", &["name", "position_m"]) {
        let name = section.needed_name("name");
        if let Some(name) = &name {
            taken.take(&section, "name", name);
            read.numbers.entry(name.clone()).or_insert(read.names.len());
            read.names.push(name.clone());
            if antennas.contains(name) {
                let (table, found) = (section.title.clone(), section.ledger.quote(&section.span_of("name")));
                let expected = "another name: an antenna is called so";
                section.report("name", MistakeKind::Name { table, key: "name", found, expected });
            }
        }
        let position_m = section.needed_point("position_m");
        if let (Some(name), Some(position_m)) = (name, position_m) {
            read.marks.push(Mark { name, position_m });
        }
    }
    read
}

/// Reads the tapes; one with a mistake is left out.
pub(super) fn tapes(whole: &Section<'_>, antennas: &[String], marks: &Marks) -> Vec<Tape> {
    let mut tapes = Vec::new();
    for section in whole.tables("tape", &["between", "distance_m", "sigma_m"]) {
        let between = ends(&section, antennas, marks);
        let distance_m = section.needed_number("distance_m", &DISTANCE_M);
        let sigma_m = section.needed_number("sigma_m", &SIGMA_M);
        if let (Some(between), Some(distance_m), Some(sigma_m)) = (between, distance_m, sigma_m) {
            tapes.push(Tape { between, distance_m, sigma_m });
        }
    }
    tapes
}

fn ends(section: &Section<'_>, antennas: &[String], marks: &Marks) -> Option<(TapeEnd, TapeEnd)> {
    const KEY: &str = "between";
    section.need(KEY, "two names of antennas or marks");
    let [first, second] = section.two_texts(KEY, "two names of antennas or marks")?;
    let end = |name: &str| {
        let antenna = antennas.iter().position(|known| known == name).map(TapeEnd::Antenna);
        let found = antenna.or_else(|| marks.numbers.get(name).copied().map(TapeEnd::Mark));
        if found.is_none() {
            let known = antennas.iter().chain(&marks.names).map(String::as_str);
            let kind = MistakeKind::UnknownName {
                table: section.title.clone(),
                key: KEY,
                what: "antenna or mark",
                name: name.to_owned(),
                nearest: nearest(name, known).map(str::to_owned),
            };
            section.report(KEY, kind);
        }
        found
    };
    let ends = (end(first), end(second));
    if first == second {
        let (table, name) = (section.title.clone(), first.to_owned());
        section.report(KEY, MistakeKind::TapeToItself { table, name });
    }
    ends.0.zip(ends.1)
}
