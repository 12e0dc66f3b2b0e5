//! Where the samples are in a file, told from its beginning.

use super::dialect::Dialect;
use super::error::CsvError;
use super::header::{HeaderRow, segments, stated_rate_hz, times};
use super::lines::{cells, text};
use super::number::{Decimal, parse, stands_for_number};
use super::quantity::{Key, is_unit, time_unit_s, voltage_unit_v};
use crate::CaptureTime;

/// How many bytes are looked at to find the table.
pub(super) const HEAD_BYTES: usize = 1 << 16;

/// From how many of the last lines the columns are told.
const TELLING_LINES: usize = 50;

/// How a file is to be read.
#[derive(Debug)]
pub(super) struct Layout {
    pub(super) dialect: Dialect,
    /// Columns that hold numbers, counted from 0.
    pub(super) columns: Vec<usize>,
    /// What the first of them holds.
    pub(super) first_column: FirstColumn,
    /// What a number of each column is multiplied by.
    pub(super) scales: Vec<f64>,
    /// The one line there is holds one channel.
    pub(super) one_row: bool,
    /// The first row of the table.
    pub(super) body: Place,
    pub(super) rate_hz: Option<f64>,
    /// Segments and rows of each.
    pub(super) segments: Option<(u64, u64)>,
    pub(super) times: Vec<CaptureTime>,
}

/// A line in the file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Place {
    /// Its first byte.
    pub(super) byte: u64,
    /// Its number, counted from 1.
    pub(super) line: u64,
}

/// What the first column of numbers holds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum FirstColumn {
    /// Time in this unit, in seconds.
    Time(f64),
    /// A number that counts the rows.
    Index,
    /// Samples.
    Channel,
    /// The header does not say: the numbers will.
    Untold,
}

/// A line of the head, its cells not yet cut.
struct HeadLine<'a> {
    place: Place,
    bytes: &'a [u8],
}

impl Layout {
    /// Finds the table in the first bytes of a file; `whole` when they are all of it. The error names the
    /// line.
    pub(super) fn detect(head: &[u8], whole: bool) -> Result<Self, (Option<u64>, CsvError)> {
        if head.starts_with(b"\xff\xfe") || head.starts_with(b"\xfe\xff") {
            return Err((None, CsvError::Utf16));
        }
        let lines = head_lines(head, whole);
        let bare = lines.iter().map(|line| line.bytes).collect::<Vec<_>>();
        let dialect = Dialect::detect(&bare).map_err(|(at, error)| (Some(lines[at].place.line), error))?;
        let filled = lines.iter().filter(|line| !is_blank(line.bytes, dialect.separator)).collect::<Vec<_>>();
        if filled.is_empty() {
            let empty = head.trim_ascii().is_empty() && whole;
            let none = CsvError::NoTable { searched: head.len() };
            return Err((None, if empty { CsvError::Empty } else { none }));
        }
        if let [line] = filled[..]
            && is_one_row(line.bytes, dialect, whole)
        {
            return Ok(Self {
                dialect,
                columns: Vec::new(),
                first_column: FirstColumn::Channel,
                scales: vec![1.0],
                one_row: true,
                body: line.place,
                rate_hz: None,
                segments: None,
                times: Vec::new(),
            });
        }
        let no_table = || (None, CsvError::NoTable { searched: head.len() });
        let columns = number_columns(&filled, dialect);
        let first = filled
            .iter()
            .position(|line| has_numbers(line.bytes, &columns, dialect))
            .filter(|_| !columns.is_empty())
            .ok_or_else(no_table)?;
        let rows = header_rows(&filled, first, &columns, dialect);
        let stated = stated_rate_hz(&rows, dialect.decimal).map_err(|(line, error)| (Some(line), error))?;
        let above = rows.iter().filter(|row| row.line < filled[first].place.line).collect::<Vec<_>>();
        let (first_column, scales) = meanings(&above, &columns);
        Ok(Self {
            dialect,
            columns,
            first_column,
            scales,
            one_row: false,
            body: filled[first].place,
            rate_hz: stated.map(|(rate_hz, _)| rate_hz),
            segments: segments(&rows),
            times: times(&rows),
        })
    }

    /// Channels, as far as they are known before the numbers are read.
    pub(super) fn most_channels(&self) -> usize {
        match self.first_column {
            FirstColumn::Time(_) | FirstColumn::Index => self.columns.len() - 1,
            FirstColumn::Channel | FirstColumn::Untold => self.columns.len().max(1),
        }
    }
}

/// The lines of the head, without a byte order mark; a last one that is cut only when it is the only one.
fn head_lines(head: &[u8], whole: bool) -> Vec<HeadLine<'_>> {
    let skipped = if head.starts_with(b"\xef\xbb\xbf") { 3 } else { 0 };
    let mut lines = Vec::new();
    let mut byte = skipped as u64;
    for (bytes, line) in head[skipped..].split(|&byte| byte == b'\n').zip(1..) {
        let after = byte + bytes.len() as u64 + 1;
        let end = bytes.iter().rposition(|&byte| byte != b'\r').map_or(0, |last| last + 1);
        lines.push(HeadLine { place: Place { byte, line }, bytes: &bytes[..end] });
        byte = after;
    }
    if !whole && lines.len() > 1 {
        lines.pop();
    }
    lines
}

/// Whether all cells of a line are empty.
pub(super) fn is_blank(line: &[u8], separator: u8) -> bool {
    line.iter().all(|&byte| byte == separator || byte.is_ascii_whitespace())
}

/// Whether the only line of a file is one channel: numbers and nothing else, two or more of them.
fn is_one_row(line: &[u8], dialect: Dialect, whole: bool) -> bool {
    let cells = cells(line, dialect.separator).collect::<Vec<_>>();
    // The last cell may be cut, or empty behind a last separator.
    let certain = if whole && cells.last().is_some_and(|cell| !cell.is_empty()) {
        &cells[..]
    } else {
        &cells[..cells.len().saturating_sub(1)]
    };
    certain.len() > 1 && certain.iter().all(|cell| stands_for_number(cell))
}

/// The columns of numbers: those filled in most of the last lines that have nothing but numbers.
fn number_columns(filled: &[&HeadLine<'_>], dialect: Dialect) -> Vec<usize> {
    let mut counts: Vec<usize> = Vec::new();
    let mut lines = 0;
    for line in filled.iter().rev().take(TELLING_LINES) {
        let row = cells(line.bytes, dialect.separator).collect::<Vec<_>>();
        if !row.iter().all(|cell| cell.is_empty() || stands_for_number(cell)) {
            break;
        }
        counts.resize(counts.len().max(row.len()), 0);
        for (count, cell) in counts.iter_mut().zip(&row) {
            *count += usize::from(!cell.is_empty());
        }
        lines += 1;
    }
    let most = |&(_, &count): &(usize, &usize)| 2 * count > lines;
    counts.iter().enumerate().filter(most).map(|(column, _)| column).collect()
}

/// Whether a line has a number, or a mark for one, in each of these columns, and a true number in one of
/// them.
fn has_numbers(line: &[u8], columns: &[usize], dialect: Dialect) -> bool {
    let row = cells(line, dialect.separator).collect::<Vec<_>>();
    let cell = |&column: &usize| row.get(column).copied().unwrap_or(b"");
    columns.iter().all(|column| stands_for_number(cell(column)))
        && columns.iter().any(|column| parse(cell(column), dialect.decimal).is_some())
}

/// The header: all lines above the table, and beside it the cells to the left of its first rows and to the
/// right of its very first one.
fn header_rows(
    filled: &[&HeadLine<'_>],
    first: usize,
    columns: &[usize],
    dialect: Dialect,
) -> Vec<HeaderRow> {
    // Longer headers than that are no headers.
    const BESIDE: usize = 200;
    let leftmost = columns.first().copied().unwrap_or(0);
    filled
        .iter()
        .enumerate()
        .take_while(|(at, _)| *at <= first || (leftmost > 0 && *at < first + BESIDE))
        .map(|(at, line)| HeaderRow {
            line: line.place.line,
            cells: cells(line.bytes, dialect.separator)
                .enumerate()
                .map(|(column, cell)| {
                    let is_header =
                        at < first || column < leftmost || (at == first && !columns.contains(&column));
                    if is_header { text(cell).into_owned() } else { String::new() }
                })
                .collect(),
        })
        .collect()
}

/// What the first column holds and what numbers are multiplied by, from the rows of names and units above the
/// table.
fn meanings(above: &[&HeaderRow], columns: &[usize]) -> (FirstColumn, Vec<f64>) {
    let cell = |row: Option<&&HeaderRow>, column: usize| -> String {
        row.and_then(|row| row.cells.get(column)).cloned().unwrap_or_default()
    };
    let labels = |row: &HeaderRow| {
        columns.iter().all(|&column| row.cells.get(column).is_some_and(|cell| !cell.is_empty()))
    };
    let mut nearest = above.iter().rev().take_while(|row| labels(row)).peekable();
    let units = nearest.next_if(|row| columns.iter().all(|&column| is_unit(&row.cells[column])));
    let names = nearest.next().filter(|row| {
        // A line `key,value` above two columns is no row of names.
        !columns.iter().skip(1).any(|&column| parse(row.cells[column].as_bytes(), Decimal::Point).is_some())
            || matches!(
                first_by_name(&Key::of(&row.cells[columns[0]])),
                FirstColumn::Time(_) | FirstColumn::Index
            )
    });
    let unit_of = |column: usize| -> String {
        let unit = cell(units, column);
        if unit.is_empty() { Key::of(&cell(names, column)).unit } else { unit }
    };
    let first = columns.first().copied().unwrap_or(0);
    let (key, unit) = (Key::of(&cell(names, first)), unit_of(first));
    let first_column = if unit.eq_ignore_ascii_case("sequence") {
        FirstColumn::Index
    } else if let Some(unit_s) = time_unit_s(&unit) {
        FirstColumn::Time(unit_s)
    } else if voltage_unit_v(&unit).is_some() {
        FirstColumn::Channel
    } else {
        match first_by_name(&key) {
            // A single column of `samples` is just that.
            FirstColumn::Untold | FirstColumn::Index if columns.len() == 1 => FirstColumn::Channel,
            told => told,
        }
    };
    let scales = columns.iter().map(|&column| voltage_unit_v(&unit_of(column)).unwrap_or(1.0)).collect();
    (first_column, scales)
}

/// What a first column of this name holds.
fn first_by_name(key: &Key) -> FirstColumn {
    let numbered = |start: &str| {
        key.name.strip_prefix(start).is_some_and(|rest| rest.chars().all(|letter| letter.is_ascii_digit()))
    };
    match key.name.as_str() {
        "time" | "times" | "t" | "timestamp" | "second" | "seconds" | "sec" | "s" => FirstColumn::Time(1.0),
        "index" | "sample" | "samples" | "point" | "points" | "n" | "no" | "number" | "sequence" => {
            FirstColumn::Index
        }
        _ if ["ch", "channel", "c", "y"].into_iter().any(numbered) => FirstColumn::Channel,
        _ => FirstColumn::Untold,
    }
}
