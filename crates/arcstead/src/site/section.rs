//! A table being read: typed values out of it, mistakes on the side.

use std::cell::RefCell;
use std::collections::HashMap;
use std::collections::hash_map::Entry;
use std::ops::Range;

use nalgebra::{Vector2, Vector3};
use toml::Spanned;
use toml::de::{DeTable, DeValue};

use super::footprint;
use super::mistake::{Mistake, MistakeKind};
use super::nearest_name::nearest;
use super::quantity::{COORDINATE_M, Quantity};

/// The most characters of the file that a mistake quotes.
const MOST_QUOTED: usize = 40;
/// The most characters of a name.
const MOST_NAMED: usize = 100;

/// The text of a site file and the mistakes found in it so far.
pub(super) struct Ledger<'t> {
    text: &'t str,
    line_starts: Vec<usize>,
    mistakes: RefCell<Vec<Mistake>>,
}

impl<'t> Ledger<'t> {
    pub(super) fn new(text: &'t str) -> Self {
        let line_starts = std::iter::once(0).chain(text.match_indices('\n').map(|(at, _)| at + 1)).collect();
        Self { text, line_starts, mistakes: RefCell::default() }
    }

    /// Line and column, counted from 1, of a byte of the text.
    pub(super) fn place(&self, byte: usize) -> (usize, usize) {
        let line = self.line_starts.partition_point(|&start| start <= byte);
        let start = self.line_starts[line - 1];
        let column = self.text.get(start..byte).map_or(byte - start, |before| before.chars().count());
        (line, column + 1)
    }

    pub(super) fn report(&self, span: &Range<usize>, kind: MistakeKind) {
        let (line, column) = self.place(span.start);
        self.mistakes.borrow_mut().push(Mistake { line, column, kind });
    }

    /// The mistakes in the order of the file.
    pub(super) fn into_mistakes(self) -> Vec<Mistake> {
        let mut mistakes = self.mistakes.into_inner();
        mistakes.sort_by_key(|mistake| (mistake.line, mistake.column));
        mistakes
    }

    /// What stands in the file there, shortened and on one line.
    pub(super) fn quote(&self, span: &Range<usize>) -> String {
        let text = self.text.get(span.clone()).unwrap_or_default();
        shortened(&text.split_whitespace().collect::<Vec<_>>().join(" "))
    }
}

/// The text, cut where it is too long to quote: every mistake in a table carries its title.
fn shortened(text: &str) -> String {
    match text.char_indices().nth(MOST_QUOTED) {
        Some((end, _)) => format!("{}...", &text[..end]),
        None => text.to_owned(),
    }
}

/// Values that may occur once only, and where each stands.
pub(super) struct Taken {
    what: &'static str,
    lines: HashMap<String, usize>,
}

impl Taken {
    pub(super) fn new(what: &'static str) -> Self {
        Self { what, lines: HashMap::new() }
    }

    /// Takes the value of `key`; one that is taken already is a mistake.
    pub(super) fn take(&mut self, section: &Section<'_>, key: &str, value: impl ToString) {
        let span = section.span_of(key);
        let line = section.ledger.place(span.start).0;
        match self.lines.entry(value.to_string()) {
            Entry::Vacant(entry) => {
                entry.insert(line);
            }
            Entry::Occupied(entry) => section.ledger.report(
                &span,
                MistakeKind::Duplicate {
                    what: self.what,
                    value: format!("`{}`", entry.key()),
                    first_line: *entry.get(),
                },
            ),
        }
    }
}

/// One table of the file. Every getter gives none both where the key is not there and where its value is wrong; the
/// second is on the ledger. `needed_` getters put the first on it too.
pub(super) struct Section<'a> {
    pub(super) ledger: &'a Ledger<'a>,
    pub(super) title: String,
    table: &'a DeTable<'a>,
    span: Range<usize>,
}

impl<'a> Section<'a> {
    /// The table with this title in messages; keys that are not `known` are mistakes.
    pub(super) fn new(
        ledger: &'a Ledger<'a>,
        title: String,
        table: &'a DeTable<'a>,
        span: Range<usize>,
        known: &'static [&'static str],
    ) -> Self {
        let section = Self { ledger, title, table, span };
        for key in table.keys().filter(|key| !known.contains(&key.get_ref().as_ref())) {
            let name = key.get_ref().to_string();
            let metres = name.strip_suffix("_wgs84").map(|stem| format!("{stem}_m"));
            let kind = match metres.filter(|metres| known.contains(&metres.as_str())) {
                Some(instead) => MistakeKind::Degrees { table: section.title.clone(), key: name, instead },
                None => MistakeKind::UnknownKey {
                    table: section.title.clone(),
                    nearest: nearest(&name, known.iter().copied()),
                    key: name,
                    known,
                },
            };
            ledger.report(&key.span(), kind);
        }
        section
    }

    /// The table under this key, where there is one; `known` are its keys.
    pub(super) fn table(&self, key: &'static str, known: &'static [&'static str]) -> Option<Section<'a>> {
        let value = self.table.get(key)?;
        let title = if self.title == TOP { format!("[{key}]") } else { format!("`{key}` of {}", self.title) };
        match value.get_ref() {
            DeValue::Table(table) => Some(Section::new(self.ledger, title, table, value.span(), known)),
            _ => self.wrong_type(key, value, "a table"),
        }
    }

    /// The table under this key, whatever its keys are.
    pub(super) fn open_table(&self, key: &'static str) -> Option<Section<'a>> {
        let value = self.table.get(key)?;
        let title = format!("`{key}` of {}", self.title);
        match value.get_ref() {
            DeValue::Table(table) => Some(Self { ledger: self.ledger, title, table, span: value.span() }),
            _ => self.wrong_type(key, value, "a table of antennas: { A1 = [x, y, z], ... }"),
        }
    }

    /// The tables of the array under this key; none there is the same as an empty array. Each is called by its
    /// `name`, or by its number where it has none.
    pub(super) fn tables(&self, key: &'static str, known: &'static [&'static str]) -> Vec<Section<'a>> {
        let Some(value) = self.table.get(key) else { return Vec::new() };
        let DeValue::Array(array) = value.get_ref() else {
            self.wrong_type::<()>(key, value, &format!("[[{key}]] with two brackets: there can be several"));
            return Vec::new();
        };
        let section = |(index, element): (usize, &'a Spanned<DeValue<'a>>)| {
            let DeValue::Table(table) = element.get_ref() else {
                return self.wrong_type(key, element, "a table");
            };
            let title = match table.get("name").and_then(|name| name.get_ref().as_str()) {
                Some(name) => format!("[[{key}]] `{}`", shortened(name)),
                None => format!("[[{key}]] number {}", index + 1),
            };
            Some(Section::new(self.ledger, title, table, element.span(), known))
        };
        array.iter().enumerate().filter_map(section).collect()
    }

    pub(super) fn has(&self, key: &str) -> bool {
        self.table.contains_key(key)
    }

    /// The keys and values of the table, in the order of the alphabet.
    pub(super) fn entries(&self) -> impl Iterator<Item = (&'a str, Range<usize>)> {
        self.table.iter().map(|(key, _)| (key.get_ref().as_ref(), key.span()))
    }

    /// Where the value of the key stands; where the table does, when there is no such key.
    pub(super) fn span_of(&self, key: &str) -> Range<usize> {
        self.table.get(key).map_or(self.span.clone(), Spanned::span)
    }

    /// Line and column of the table.
    pub(super) fn place(&self) -> (usize, usize) {
        self.ledger.place(self.span.start)
    }

    pub(super) fn report(&self, key: &str, kind: MistakeKind) {
        self.ledger.report(&self.span_of(key), kind);
    }

    /// Reports the key as missing when it is.
    pub(super) fn need(&self, key: &'static str, expected: &'static str) {
        if !self.has(key) {
            self.ledger.report(&self.span, MistakeKind::Missing { table: self.title.clone(), key, expected });
        }
    }

    /// Reports it when both keys are there.
    pub(super) fn exclude(&self, first: &'static str, second: &'static str) {
        if self.has(first) && self.has(second) {
            self.report(second, MistakeKind::Both { table: self.title.clone(), first, second });
        }
    }

    /// Reports it when only one of the keys is there.
    pub(super) fn together(&self, first: &'static str, second: &'static str) {
        for (first, second) in [(first, second), (second, first)] {
            if self.has(first) && !self.has(second) {
                self.report(first, MistakeKind::Alone { table: self.title.clone(), first, second });
            }
        }
    }

    fn wrong_type<T>(&self, key: &str, value: &Spanned<DeValue<'_>>, expected: &str) -> Option<T> {
        self.ledger.report(
            &value.span(),
            MistakeKind::Type {
                table: self.title.clone(),
                key: key.to_owned(),
                found: self.ledger.quote(&value.span()),
                found_type: called(value.get_ref()),
                expected: expected.to_owned(),
            },
        );
        None
    }

    pub(super) fn text(&self, key: &str) -> Option<&'a str> {
        let value = self.table.get(key)?;
        match value.get_ref() {
            DeValue::String(text) => Some(text.as_ref()),
            _ => self.wrong_type(key, value, "a text in quotes"),
        }
    }

    /// Two texts in a list.
    pub(super) fn two_texts(&self, key: &str, shape: &'static str) -> Option<[&'a str; 2]> {
        let list = self.list(key, shape)?;
        let [first, second] = list[..] else {
            let (table, key) = (self.title.clone(), key.to_owned());
            self.report(&key.clone(), MistakeKind::Length { table, key, found: list.len(), expected: shape });
            return None;
        };
        let text = |element: &'a Spanned<DeValue<'a>>| {
            element.get_ref().as_str().or_else(|| self.wrong_type(key, element, shape))
        };
        let (first, second) = (text(first), text(second));
        Some([first?, second?])
    }

    /// A name that must be there: some letters on one line, no blanks around them.
    pub(super) fn needed_name(&self, key: &'static str) -> Option<String> {
        self.need(key, "a name in quotes");
        let name = self.text(key)?;
        let expected = if name.trim().is_empty() {
            "a name that is not empty"
        } else if name.trim() != name {
            "no blanks around the name"
        } else if name.chars().any(char::is_control) {
            "a name on one line, without control characters"
        } else if name.chars().count() > MOST_NAMED {
            "a name of at most 100 characters"
        } else {
            return Some(name.to_owned());
        };
        let found = self.ledger.quote(&self.span_of(key));
        self.report(key, MistakeKind::Name { table: self.title.clone(), key, found, expected });
        None
    }

    pub(super) fn number(&self, key: &str, quantity: &Quantity) -> Option<f64> {
        self.as_number(key, self.table.get(key)?, quantity)
    }

    pub(super) fn needed_number(&self, key: &'static str, quantity: &'static Quantity) -> Option<f64> {
        self.need(key, quantity.expected);
        self.number(key, quantity)
    }

    /// The number under the key; `otherwise` where there is none (and, with a mistake, where it is wrong).
    pub(super) fn number_or(&self, key: &str, quantity: &Quantity, otherwise: f64) -> f64 {
        self.number(key, quantity).unwrap_or(otherwise)
    }

    fn as_number(&self, key: &str, value: &Spanned<DeValue<'_>>, quantity: &Quantity) -> Option<f64> {
        let number = match value.get_ref() {
            // An integer too large for 128 bits is out of every range; infinity stands for it.
            DeValue::Integer(integer) => i128::from_str_radix(integer.as_str(), integer.radix())
                .map_or(f64::INFINITY, |integer| integer as f64),
            DeValue::Float(float) => float.as_str().parse().unwrap_or(f64::NAN),
            _ => return self.wrong_type(key, value, quantity.expected),
        };
        if quantity.allows(number) {
            return Some(number);
        }
        let (table, key, found) = (self.title.clone(), key.to_owned(), self.ledger.quote(&value.span()));
        let kind = if number.is_finite() {
            let space = if quantity.unit.is_empty() { "" } else { " " };
            let expected = format!("{}{space}{}", quantity.expected, quantity.unit);
            MistakeKind::OutOfRange { table, key, found, expected, slip: quantity.slip(number) }
        } else {
            MistakeKind::NotFinite { table, key, found }
        };
        self.ledger.report(&value.span(), kind);
        None
    }

    /// A whole number from `least` to `most`.
    pub(super) fn integer(&self, key: &str, least: u32, most: u32) -> Option<u32> {
        let value = self.table.get(key)?;
        let expected = format!("a whole number from {least} to {most}");
        let DeValue::Integer(integer) = value.get_ref() else {
            return self.wrong_type(key, value, &expected);
        };
        let number = u32::from_str_radix(integer.as_str(), integer.radix()).ok();
        number.filter(|number| (least..=most).contains(number)).or_else(|| {
            let (table, key, found) = (self.title.clone(), key.to_owned(), self.ledger.quote(&value.span()));
            self.ledger
                .report(&value.span(), MistakeKind::OutOfRange { table, key, found, expected, slip: None });
            None
        })
    }

    /// The elements of the list under the key, as long as a list stands there.
    pub(super) fn list(&self, key: &str, shape: &'static str) -> Option<Vec<&'a Spanned<DeValue<'a>>>> {
        self.as_list(key, self.table.get(key)?, shape)
    }

    fn as_list(
        &self,
        key: &str,
        value: &'a Spanned<DeValue<'a>>,
        shape: &'static str,
    ) -> Option<Vec<&'a Spanned<DeValue<'a>>>> {
        match value.get_ref() {
            DeValue::Array(array) => Some(array.iter().collect()),
            _ => self.wrong_type(key, value, shape),
        }
    }

    fn as_numbers<const N: usize>(
        &self,
        key: &str,
        value: &'a Spanned<DeValue<'a>>,
        quantity: &Quantity,
        shape: &'static str,
    ) -> Option<[f64; N]> {
        let list = self.as_list(key, value, shape)?;
        if list.len() != N {
            let (table, key) = (self.title.clone(), key.to_owned());
            let kind = MistakeKind::Length { table, key, found: list.len(), expected: shape };
            self.ledger.report(&value.span(), kind);
            return None;
        }
        // All of them are looked at before the first wrong one ends it.
        let numbers: Vec<_> = list.iter().map(|element| self.as_number(key, element, quantity)).collect();
        let numbers: Vec<f64> = numbers.into_iter().collect::<Option<_>>()?;
        numbers.try_into().ok()
    }

    /// Numbers under the key, as many as the type says; `shape` says so in words.
    pub(super) fn numbers<const N: usize>(
        &self,
        key: &str,
        quantity: &Quantity,
        shape: &'static str,
    ) -> Option<[f64; N]> {
        self.as_numbers(key, self.table.get(key)?, quantity, shape)
    }

    /// Whether a list stands under the key.
    pub(super) fn is_list(&self, key: &str) -> bool {
        self.table.get(key).is_some_and(|value| value.get_ref().is_array())
    }

    pub(super) fn point(&self, key: &str) -> Option<Vector3<f64>> {
        self.numbers(key, &COORDINATE_M, "a place [x, y, z] in metres").map(Vector3::from)
    }

    pub(super) fn needed_point(&self, key: &'static str) -> Option<Vector3<f64>> {
        self.need(key, "a place [x, y, z] in metres");
        self.point(key)
    }

    /// Two numbers, the first below the second.
    pub(super) fn interval(
        &self,
        key: &'static str,
        quantity: &Quantity,
        shape: &'static str,
    ) -> Option<(f64, f64)> {
        let [low, high] = self.numbers(key, quantity, shape)?;
        if low < high {
            return Some((low, high));
        }
        self.report(key, MistakeKind::Order { table: self.title.clone(), key, low, high, expected: shape });
        None
    }

    /// The outline under `footprint_m`: at least three corners, none repeated, no sides that cross.
    pub(super) fn needed_footprint(&self) -> Option<Vec<Vector2<f64>>> {
        const KEY: &str = "footprint_m";
        const SHAPE: &str = "a list of corners [x, y] in metres";
        self.need(KEY, SHAPE);
        let list = self.list(KEY, SHAPE)?;
        let table = self.title.clone();
        if !(3..=footprint::MOST_CORNERS).contains(&list.len()) {
            let kind =
                MistakeKind::Corners { table, found: list.len(), least: 3, most: footprint::MOST_CORNERS };
            self.report(KEY, kind);
            return None;
        }
        let corners: Vec<_> = list
            .iter()
            .map(|corner| self.as_numbers(KEY, corner, &COORDINATE_M, "a corner [x, y] in metres"))
            .collect();
        let corners: Vec<Vector2<f64>> =
            corners.into_iter().map(|corner| corner.map(Vector2::from)).collect::<Option<_>>()?;
        if let Some((first, second)) = footprint::repeated_corner(&corners) {
            let (first, second) = (first + 1, second + 1);
            self.ledger
                .report(&list[second - 1].span(), MistakeKind::CornerRepeated { table, first, second });
            return None;
        }
        if let Some((first, second)) = footprint::crossing_sides(&corners) {
            let (first, second) = (first + 1, second + 1);
            self.ledger
                .report(&list[second - 1].span(), MistakeKind::FootprintCrosses { table, first, second });
            return None;
        }
        Some(corners)
    }
}

/// Title of the file itself.
pub(super) const TOP: &str = "the file";

/// The type of a value in words.
fn called(value: &DeValue<'_>) -> &'static str {
    match value {
        DeValue::String(_) => "a text",
        DeValue::Integer(_) => "a whole number",
        DeValue::Float(_) => "a number",
        DeValue::Boolean(_) => "true or false",
        DeValue::Datetime(_) => "a date",
        DeValue::Array(_) => "a list",
        DeValue::Table(_) => "a table",
    }
}
