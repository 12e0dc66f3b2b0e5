//! Writing an arrivals table, capture by capture.

use std::io::Write;
use std::path::PathBuf;

use super::capture_arrivals::CaptureArrivals;
use super::error::{ArrivalsTableError, TableMistake, TablePlace};
use super::row::{COLUMNS, Row};
use crate::documents::Head;
use crate::site::{MAIN_STANCE, Site};

/// Writes an arrivals table, the rows of one capture at a time. Holds nothing back but a buffer.
#[derive(Debug)]
pub struct ArrivalsWriter<'s, W: Write> {
    site: &'s Site,
    name: PathBuf,
    form: Form<W>,
}

#[derive(Debug)]
enum Form<W: Write> {
    Csv(Box<csv::Writer<W>>),
    Json { out: W, rows: usize },
}

impl<'s, W: Write> ArrivalsWriter<'s, W> {
    /// A table in CSV; the header is written at once. `name` stands for the table in errors.
    ///
    /// # Errors
    /// When `out` cannot be written.
    pub fn csv(out: W, name: impl Into<PathBuf>, site: &'s Site) -> Result<Self, ArrivalsTableError> {
        let mut writer = csv::Writer::from_writer(out);
        let header = writer.write_record(COLUMNS);
        let table = Self { site, name: name.into(), form: Form::Csv(Box::new(writer)) };
        header.map_err(|error| table.failed(TableMistake::Csv(error)))?;
        Ok(table)
    }

    /// A table in JSON: a document that begins with `head` and holds the rows as `arrivals`. `name` stands for the table
    /// in errors.
    ///
    /// # Errors
    /// When `out` cannot be written.
    pub fn json(
        mut out: W,
        name: impl Into<PathBuf>,
        site: &'s Site,
        head: &Head,
    ) -> Result<Self, ArrivalsTableError> {
        let begun = serde_json::to_string(head).map_err(std::io::Error::from).and_then(|mut text| {
            // The head is an object; the rows go in before its closing brace.
            text.pop();
            write!(out, "{text},\"arrivals\":[")
        });
        let table = Self { site, name: name.into(), form: Form::Json { out, rows: 0 } };
        begun.map_err(|error| table.failed(TableMistake::File(error)))?;
        Ok(table)
    }

    fn failed(&self, mistake: TableMistake) -> ArrivalsTableError {
        ArrivalsTableError { path: self.name.clone(), place: TablePlace::Whole, mistake }
    }

    /// Writes the rows of one capture.
    ///
    /// # Errors
    /// When the parts of `arrivals` do not agree with each other or with the site (an unknown stance, an antenna twice,
    /// an arrival without sigma, a number that is not finite, a covariance of another size or that is not symmetric or
    /// whose diagonal is not `sigma_s` squared), then nothing of it is written; or when the table cannot be written.
    pub fn write(&mut self, arrivals: &CaptureArrivals) -> Result<(), ArrivalsTableError> {
        let known =
            arrivals.stance == MAIN_STANCE || self.site.stances.iter().any(|s| s.name == arrivals.stance);
        if !known {
            return Err(
                self.failed(TableMistake::UnknownStance { found: arrivals.stance.clone(), nearest: None })
            );
        }
        arrivals.check(self.site).map_err(|(_, mistake)| self.failed(mistake))?;
        for index in 0..arrivals.antennas.len() {
            let row = Row::of(arrivals, index, self.site);
            let written = match &mut self.form {
                Form::Csv(writer) => writer.write_record(row.fields()).map_err(TableMistake::Csv),
                Form::Json { out, rows } => {
                    *rows += 1;
                    json_row(out, *rows == 1, &row).map_err(TableMistake::File)
                }
            };
            written.map_err(|mistake| self.failed(mistake))?;
        }
        Ok(())
    }

    /// Ends the table and gives back what it was written to, flushed.
    ///
    /// # Errors
    /// When it cannot be written.
    pub fn finish(self) -> Result<W, ArrivalsTableError> {
        let path = self.name;
        let ended = match self.form {
            Form::Csv(writer) => writer.into_inner().map_err(csv::IntoInnerError::into_error),
            Form::Json { mut out, .. } => out.write_all(b"\n]}\n").map(|()| out),
        };
        ended.and_then(|mut out| out.flush().map(|()| out)).map_err(|error| ArrivalsTableError {
            path,
            place: TablePlace::Whole,
            mistake: TableMistake::File(error),
        })
    }
}

fn json_row(out: &mut impl Write, first: bool, row: &Row) -> std::io::Result<()> {
    out.write_all(if first { b"\n  " } else { b",\n  " })?;
    // The check before has refused every number that is not finite.
    serde_json::to_writer(out, row).map_err(std::io::Error::from)
}
