//! `arcstead inspect`: what is in capture files.

use arcstead::documents::Document;
use arcstead::inspect;

use crate::arguments::{Format, InspectArguments};
use crate::console::Console;
use crate::failure::Failure;
use crate::output::Output;
use crate::progress::Progress;
use crate::{rejected, sheet, status, table};

pub(crate) fn run(asked: &InspectArguments, console: &mut Console<'_>) -> Result<u8, Failure> {
    let output = Output::check(asked.output.output.as_deref(), asked.captures.iter().map(AsRef::as_ref))?;
    console.talk.note_all(asked.output.doubt().as_slice());
    output.spare(&arcstead::formats::find_captures(&asked.captures)?.files)?;
    let band_hz = asked.band.map(|band| (band.low_hz, band.high_hz));
    let sample_rate_hz = asked.sample_rate.map(|rate_gsps| rate_gsps * 1e9);
    let progress = Progress::begin(&console.talk, None);
    let document = inspect(&asked.captures, band_hz, sample_rate_hz, &progress);
    progress.end();
    let document = document?;
    if document.captures.is_empty() {
        return Err(if document.incomplete {
            Failure::StoppedEarly
        } else {
            Failure::NothingRead(document.rejected)
        });
    }
    console.talk.warn_all(&rejected::lines(&document.rejected, console.talk.verbose));
    let text = match asked.output.format() {
        Format::Table => table::inspect::text(&document, output.screen(console), console.talk.verbose),
        Format::Json => document.to_json()?,
        Format::Csv => sheet::inspect::text(&document)?,
    };
    output.write(&text, console)?;
    Ok(if document.incomplete { status::INTERRUPTED } else { status::DONE })
}
