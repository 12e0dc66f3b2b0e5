//! Reading a CSV file.

use std::path::{Path, PathBuf};

use arcstead_core::Capture;

use super::error::CsvError;
use super::layout::{FirstColumn, HEAD_BYTES, Layout, Place, is_blank};
use super::lines::{MAX_LINE_BYTES, cells, next_line, short_text};
use super::number::{is_mark, parse};
use super::time_axis::TimeColumn;
use crate::formats::capture_file::{
    CaptureFile, CaptureFormat, ReadSettings, Recorded, capture_name, has_ending,
};
use crate::formats::error::FormatError;
use crate::formats::limits::{MAX_CHANNELS, MAX_SAMPLES};
use crate::formats::regular_file::{RegularFile, file_name, io_error};
use crate::formats::sample_rate::agreed_rate_hz;

/// The format CSV.
#[derive(Debug, Clone, Copy)]
pub struct Csv;

impl CaptureFormat for Csv {
    fn name(&self) -> &'static str {
        "CSV (.csv, .tsv, .txt)"
    }

    fn recognises(&self, path: &Path, first_bytes: &[u8]) -> bool {
        [".csv", ".tsv"].iter().any(|ending| has_ending(path, ending))
            || (has_ending(path, ".txt") && Layout::detect(first_bytes, false).is_ok())
    }

    fn open(&self, path: &Path, settings: &ReadSettings) -> Result<Box<dyn CaptureFile>, FormatError> {
        let file = RegularFile::find(path)?;
        let head = file.first_bytes(HEAD_BYTES)?;
        let layout = Layout::detect(&head, file.len() <= head.len() as u64)
            .map_err(|(line, source)| FormatError::Csv { path: path.to_owned(), line, source })?;
        if layout.most_channels() > MAX_CHANNELS {
            let found = layout.most_channels() as u64;
            return Err(FormatError::Channels { path: path.to_owned(), found });
        }
        let mut table = Table { file, settings: *settings, segments: vec![layout.body], layout };
        if let Some((stated, rows)) = table.layout.segments {
            table.segments = table.find_segments(stated, rows)?;
        }
        Ok(Box::new(table))
    }
}

/// An opened CSV file.
#[derive(Debug)]
struct Table {
    file: RegularFile,
    settings: ReadSettings,
    layout: Layout,
    /// The first row of each capture.
    segments: Vec<Place>,
}

impl CaptureFile for Table {
    fn capture_count(&self) -> usize {
        self.segments.len()
    }

    fn capture_name(&self, index: usize) -> String {
        capture_name(&file_name(self.file.path()), index, self.segments.len())
    }

    fn read(&self, index: usize) -> Result<Recorded, FormatError> {
        let Some(&place) = self.segments.get(index) else {
            return Err(FormatError::NoSuchCapture { path: self.path(), index, count: self.segments.len() });
        };
        let name = self.capture_name(index);
        let (rate_hz, channels) = if self.layout.one_row {
            (None, self.read_one_row(&name, place)?)
        } else {
            self.read_rows(&name, place)?
        };
        let sample_rate_hz = agreed_rate_hz(self.file.path(), rate_hz, self.settings.sample_rate_hz)?;
        let capture = Capture::new(sample_rate_hz, channels)
            .map_err(|source| FormatError::Capture { name: name.clone(), source })?;
        // Of several times in the header it is certain only when there is one for each segment.
        let time = if self.segments.len() == self.layout.times.len() || self.segments.len() == 1 {
            self.layout.times.get(index).copied()
        } else {
            None
        };
        Ok(Recorded { name, time, capture, envelope_only: false })
    }
}

/// Samples of each channel, and the rate if the file gives one.
type Channels = (Option<f64>, Vec<Vec<f32>>);

impl Table {
    fn path(&self) -> PathBuf {
        self.file.path().to_owned()
    }

    fn wrong(&self, line: impl Into<Option<u64>>, source: CsvError) -> FormatError {
        FormatError::Csv { path: self.path(), line: line.into(), source }
    }

    /// Hands the lines from `place` on to `take`, with their places, until it says false or the file ends.
    fn each_line(
        &self,
        place: Place,
        mut take: impl FnMut(Place, &[u8]) -> Result<bool, FormatError>,
    ) -> Result<(), FormatError> {
        let mut reader = self.file.open_at(place.byte)?;
        let mut at = place;
        let mut line = Vec::new();
        loop {
            let taken = next_line(&mut reader.inner, &mut line)
                .map_err(|source| io_error(self.file.path(), source))?;
            if taken > MAX_LINE_BYTES {
                return Err(self.wrong(at.line, CsvError::LineTooLong { most: MAX_LINE_BYTES }));
            }
            if taken == 0 || !take(at, &line)? {
                return Ok(());
            }
            at = Place { byte: at.byte + taken, line: at.line + 1 };
        }
    }

    /// The first rows of the stated segments of `rows` rows each: those the file holds, and the first it
    /// lacks.
    fn find_segments(&self, stated: u64, rows: u64) -> Result<Vec<Place>, FormatError> {
        let mut places = Vec::new();
        let mut row = 0_u64;
        let mut end = self.layout.body;
        self.each_line(self.layout.body, |at, line| {
            end = Place { byte: at.byte + line.len() as u64, line: at.line };
            if is_blank(line, self.layout.dialect.separator) {
                return Ok(true);
            }
            if row.is_multiple_of(rows) {
                if places.len() as u64 == stated {
                    return Err(self.wrong(at.line, CsvError::SegmentsGoOn { stated, rows }));
                }
                places.push(at);
            }
            row += 1;
            Ok(true)
        })?;
        if row.is_multiple_of(rows) && (places.len() as u64) < stated {
            places.push(end);
        }
        Ok(places)
    }

    fn read_one_row(&self, name: &str, place: Place) -> Result<Vec<Vec<f32>>, FormatError> {
        let mut samples = Vec::new();
        self.each_line(place, |at, line| {
            let mut cells = cells(line, self.layout.dialect.separator).enumerate().peekable();
            while let Some((column, cell)) = cells.next() {
                if cell.is_empty() && cells.peek().is_none() {
                    break;
                }
                samples.push(self.number(at, column, cell)? as f32);
                if samples.len() > MAX_SAMPLES {
                    return Err(FormatError::Samples { name: name.to_owned(), found: samples.len() as u64 });
                }
            }
            Ok(false)
        })?;
        Ok(vec![samples])
    }

    fn number(&self, at: Place, column: usize, cell: &[u8]) -> Result<f64, FormatError> {
        parse(cell, self.layout.dialect.decimal).ok_or_else(|| {
            let source = if cell.is_empty() {
                CsvError::MissingCell { column: column + 1, expected: self.layout.columns.len() }
            } else {
                CsvError::Number {
                    found: short_text(cell),
                    column: column + 1,
                    decimal: self.layout.dialect.decimal.name(),
                    hint: if is_mark(cell) {
                        " (recorders mark so what went beyond their range, or is missing: record again with a \
                         greater range)"
                    } else {
                        ""
                    },
                }
            };
            self.wrong(at.line, source)
        })
    }

    /// Reads the rows of one capture in one pass.
    fn read_rows(&self, name: &str, place: Place) -> Result<Channels, FormatError> {
        let Layout { columns, scales, dialect, first_column, .. } = &self.layout;
        let rows = self.layout.segments.map_or(u64::MAX, |(_, rows)| rows);
        let most_rows = (MAX_SAMPLES / self.layout.most_channels().max(1)) as u64;
        let mut first = TimeColumn::new();
        let mut channels: Vec<Vec<f32>> = vec![Vec::new(); columns.len()];
        let (mut row, mut blank) = (0_u64, false);
        let mut first_line = None;
        self.each_line(place, |at, line| {
            if row == rows {
                return Ok(false);
            }
            if is_blank(line, dialect.separator) {
                blank = true;
                return Ok(true);
            }
            if blank && row > 0 {
                return Err(self.wrong(at.line, CsvError::Gap));
            }
            if row == most_rows {
                let found = (row + 1).saturating_mul(columns.len() as u64);
                return Err(FormatError::Samples { name: name.to_owned(), found });
            }
            let mut wanted = 0;
            for (column, cell) in cells(line, dialect.separator).enumerate() {
                if columns.get(wanted) == Some(&column) {
                    let number = self.number(at, column, cell)?;
                    if wanted == 0 && *first_column != FirstColumn::Channel {
                        first.push(number, cell);
                    } else {
                        channels[wanted].push(self.sample(at, column, number * scales[wanted], cell)?);
                    }
                    wanted += 1;
                } else if !cell.is_empty() && column > columns[0] && at != self.layout.body {
                    let source = CsvError::ExtraCell { found: short_text(cell), column: column + 1 };
                    return Err(self.wrong(at.line, source));
                }
            }
            if let Some(column) = columns.get(wanted) {
                let source = CsvError::MissingCell { column: column + 1, expected: columns.len() };
                return Err(self.wrong(at.line, source));
            }
            // Blank lines in the table are an error, so the lines of its rows follow one another.
            first_line = first_line.or(Some(at.line));
            row += 1;
            Ok(true)
        })?;
        if let Some((stated, rows)) = self.layout.segments
            && row < rows
        {
            return Err(self.wrong(place.line, CsvError::SegmentCut { stated, rows, found: row }));
        }
        self.with_meaning(first, channels, first_line.unwrap_or(place.line))
    }

    /// A sample as it is kept; one too great for that would be infinite.
    fn sample(&self, at: Place, column: usize, number: f64, cell: &[u8]) -> Result<f32, FormatError> {
        let sample = number as f32;
        if sample.is_finite() {
            return Ok(sample);
        }
        let decimal = self.layout.dialect.decimal.name();
        let hint = " below 3e38";
        Err(self
            .wrong(at.line, CsvError::Number { found: short_text(cell), column: column + 1, decimal, hint }))
    }

    /// Makes of the first column what it is, and gives the rate and the channels.
    fn with_meaning(
        &self,
        first: TimeColumn,
        mut channels: Vec<Vec<f32>>,
        first_line: u64,
    ) -> Result<Channels, FormatError> {
        let Layout { scales, first_column, rate_hz, .. } = &self.layout;
        let meaning = match *first_column {
            FirstColumn::Untold if first.counts() && first.values().len() > 1 => FirstColumn::Index,
            FirstColumn::Untold if first.only_rises() => FirstColumn::Time(1.0),
            FirstColumn::Untold => {
                let scale = scales[0];
                channels[0] = first.values().iter().map(|value| (value * scale) as f32).collect();
                FirstColumn::Channel
            }
            told => told,
        };
        let line_of = |row: usize| first_line + row as u64;
        let rate_hz = match meaning {
            FirstColumn::Time(unit_s) => {
                let header_s = rate_hz.map(|rate_hz| 1.0 / rate_hz);
                let site_s = self.settings.sample_rate_hz.map(|rate_hz| 1.0 / rate_hz);
                let interval_s = first
                    .interval_s(unit_s, header_s, site_s)
                    .map_err(|(row, source)| self.wrong(row.map(line_of), source))?;
                // The header's own number, not the reciprocal of its reciprocal.
                rate_hz.or(interval_s.map(|interval_s| 1.0 / interval_s))
            }
            FirstColumn::Index => {
                if let Some(row) = first.first_not_counting() {
                    let [before, found] = [row - 1, row].map(|row| first.values()[row]);
                    return Err(self.wrong(line_of(row), CsvError::Index { found, before }));
                }
                *rate_hz
            }
            FirstColumn::Channel | FirstColumn::Untold => *rate_hz,
        };
        if meaning != FirstColumn::Channel {
            channels.remove(0);
        }
        if channels.is_empty() {
            return Err(self.wrong(None, CsvError::NoChannel));
        }
        Ok((rate_hz, channels))
    }
}
