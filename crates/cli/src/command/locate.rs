//! `arcstead locate`: from captures, or arrivals tables, to the source.

use std::path::Path;

use arcstead::documents::Document;
use arcstead::site::Site;
use arcstead::{LocateOptions, TimedVisit, locate};

use super::read_visit::read_visit;
use crate::arguments::{Format, LocateArguments};
use crate::console::Console;
use crate::failure::Failure;
use crate::output::Output;
use crate::progress::Progress;
use crate::{sheet, status, table};

pub(crate) fn run(asked: &LocateArguments, console: &mut Console<'_>) -> Result<u8, Failure> {
    let site = Site::read(&asked.site)?;
    let inputs = asked.captures.iter().map(Path::new).chain(asked.arrivals.iter().map(AsRef::as_ref));
    let output = Output::check(asked.output.output.as_deref(), inputs.chain([asked.site.as_path()]))?;
    console.talk.note_all(asked.output.doubt().as_slice());
    let threads = asked.threads.map_or(0, usize::from);
    let options = LocateOptions { confidence: asked.confidence, each: asked.each, threads };
    let timed = if asked.arrivals.is_empty() {
        read_visit(&site, &asked.captures, &asked.timing.options(), threads, &console.talk, &output)?
    } else {
        TimedVisit::from_tables(&site, &asked.arrivals)?
    };
    if timed.arrivals.is_empty() {
        return Err(Failure::NothingRead(timed.unreadable));
    }
    let progress = Progress::begin(&console.talk, asked.each.then_some(timed.arrivals.len()));
    let document = locate(&site, &timed, &options, &progress);
    progress.end();
    let document = document?;
    let text = match asked.output.format() {
        Format::Table => table::locate::text(&document, output.screen(console), console.talk.verbose),
        Format::Json => document.to_json()?,
        Format::Csv => sheet::locate::text(&document)?,
    };
    output.write(&text, console)?;
    Ok(if document.incomplete { status::INTERRUPTED } else { status::DONE })
}
