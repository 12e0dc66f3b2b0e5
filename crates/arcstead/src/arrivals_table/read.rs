//! Reading an arrivals table, capture by capture.

use std::fs::File;
use std::io::Read;
use std::path::{Path, PathBuf};

use csv::{ReaderBuilder, StringRecord};
use serde::Deserialize;

use super::capture_arrivals::CaptureArrivals;
use super::error::{ArrivalsTableError, TableMistake, TablePlace};
use super::gather::Gatherer;
use super::row::{Header, Row};
use crate::documents::ARRIVALS_SCHEMA;
use crate::site::Site;

/// Reads an arrivals table in CSV: an iterator of captures, which ends with the first mistake. Only the rows of one
/// capture are held at a time.
///
/// ```
/// use arcstead::arrivals_table::ArrivalsReader;
/// # let site = arcstead::site::Site::parse("schema = 1\n[site]\nname = \"S\"\n
/// # [[antenna]]\nname = \"A1\"\nchannel = 1\nposition_m = [0, 0, 2]\n
/// # [[antenna]]\nname = \"A2\"\nchannel = 2\nposition_m = [9, 0, 2]\n", "site.toml")?;
/// let table = "capture,antenna,arrival_s,sigma_s\nshot_1,A1,1.5e-7,5e-11\nshot_1,A2,,\n";
/// let captures: Vec<_> = ArrivalsReader::new(table.as_bytes(), "table.csv", &site)?.collect::<Result<_, _>>()?;
/// assert_eq!(captures[0].antennas[0].arrival_s, Some(1.5e-7));
/// assert_eq!(captures[0].antennas[1].arrival_s, None);
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
#[derive(Debug)]
pub struct ArrivalsReader<'s, R> {
    name: PathBuf,
    records: csv::Reader<R>,
    record: StringRecord,
    header: Header,
    gatherer: Gatherer<'s>,
    ended: bool,
}

impl<'s> ArrivalsReader<'s, File> {
    /// Opens a table in a file and reads its header.
    ///
    /// # Errors
    /// When the file cannot be read or its header is no arrivals table's.
    pub fn open(path: &Path, site: &'s Site) -> Result<Self, ArrivalsTableError> {
        regular(path)?;
        let file = File::open(path).map_err(|error| ArrivalsTableError {
            path: path.to_owned(),
            place: TablePlace::Whole,
            mistake: TableMistake::File(error),
        })?;
        Self::new(file, path, site)
    }
}

impl<'s, R: Read> ArrivalsReader<'s, R> {
    /// Reads the header of a table from `source`, which is buffered here; `name` stands for the table in errors.
    ///
    /// # Errors
    /// When `source` cannot be read or its header is no arrivals table's.
    pub fn new(source: R, name: impl Into<PathBuf>, site: &'s Site) -> Result<Self, ArrivalsTableError> {
        let name = name.into();
        let mut records = ReaderBuilder::new().from_reader(source);
        let header = records
            .headers()
            .map_err(|error| (TablePlace::Whole, TableMistake::Csv(error)))
            .and_then(|record| Header::read(record).map_err(|mistake| (TablePlace::Line(1), mistake)));
        match header {
            Ok(header) => Ok(Self {
                name,
                records,
                record: StringRecord::new(),
                header,
                gatherer: Gatherer::new(site),
                ended: false,
            }),
            Err((place, mistake)) => Err(ArrivalsTableError { path: name, place, mistake }),
        }
    }

    fn step(&mut self) -> Result<Option<CaptureArrivals>, (TablePlace, TableMistake)> {
        loop {
            let more = self.records.read_record(&mut self.record).map_err(|error| {
                let line = error.position().map_or(TablePlace::Whole, |at| TablePlace::Line(at.line()));
                (line, TableMistake::Csv(error))
            })?;
            if !more {
                self.ended = true;
                return self.gatherer.finish();
            }
            let line = TablePlace::Line(self.record.position().map_or(0, csv::Position::line));
            let row = self.header.row(&self.record).map_err(|mistake| (line, mistake))?;
            if let Some(done) = self.gatherer.take(line, row)? {
                return Ok(Some(done));
            }
        }
    }
}

impl<R: Read> Iterator for ArrivalsReader<'_, R> {
    type Item = Result<CaptureArrivals, ArrivalsTableError>;

    fn next(&mut self) -> Option<Self::Item> {
        if self.ended {
            return None;
        }
        self.step()
            .map_err(|(place, mistake)| {
                self.ended = true;
                ArrivalsTableError { path: self.name.clone(), place, mistake }
            })
            .transpose()
    }
}

/// The part of a JSON table that is read.
#[derive(Deserialize)]
struct JsonTable {
    schema: String,
    arrivals: Vec<Row>,
}

/// Reads an arrivals table in JSON, whole; `name` stands for the table in errors.
///
/// # Errors
/// [`ArrivalsTableError`] with the first mistake.
pub fn read_json(text: &str, name: &str, site: &Site) -> Result<Vec<CaptureArrivals>, ArrivalsTableError> {
    let wrong = |(place, mistake)| ArrivalsTableError { path: name.into(), place, mistake };
    let table: JsonTable =
        serde_json::from_str(text).map_err(|error| wrong((TablePlace::Whole, TableMistake::Json(error))))?;
    if table.schema != ARRIVALS_SCHEMA {
        return Err(wrong((TablePlace::Whole, TableMistake::Schema { found: table.schema })));
    }
    let mut gatherer = Gatherer::new(site);
    let mut captures = Vec::new();
    for (index, row) in table.arrivals.into_iter().enumerate() {
        captures.extend(gatherer.take(TablePlace::Row(index + 1), row).map_err(wrong)?);
    }
    captures.extend(gatherer.finish().map_err(wrong)?);
    Ok(captures)
}

/// Reads an arrivals table in JSON from a file, whole.
///
/// # Errors
/// [`ArrivalsTableError`] when the file cannot be read, and with the first mistake.
pub fn read_json_file(path: &Path, site: &Site) -> Result<Vec<CaptureArrivals>, ArrivalsTableError> {
    regular(path)?;
    let text = std::fs::read_to_string(path).map_err(|error| ArrivalsTableError {
        path: path.to_owned(),
        place: TablePlace::Whole,
        mistake: TableMistake::File(error),
    })?;
    read_json(&text, &path.display().to_string(), site)
}

/// Refuses what is no regular file. Asked before opening: opening a pipe would wait for its other end.
fn regular(path: &Path) -> Result<(), ArrivalsTableError> {
    let mistake = match std::fs::metadata(path) {
        Ok(metadata) if metadata.is_file() => return Ok(()),
        Ok(_) => TableMistake::NotAFile,
        Err(error) => TableMistake::File(error),
    };
    Err(ArrivalsTableError { path: path.to_owned(), place: TablePlace::Whole, mistake })
}
