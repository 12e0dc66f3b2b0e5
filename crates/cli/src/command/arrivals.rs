//! `arcstead arrivals`: when each pulse reached each antenna.

use std::path::Path;

use arcstead::arrivals_table::{ArrivalsTableError, ArrivalsWriter};
use arcstead::site::Site;
use arcstead::{TimedVisit, arrivals_head};

use super::read_visit::read_visit;
use crate::arguments::{ArrivalsArguments, Format};
use crate::console::Console;
use crate::failure::Failure;
use crate::output::Output;
use crate::{status, table};

pub(crate) fn run(asked: &ArrivalsArguments, console: &mut Console<'_>) -> Result<u8, Failure> {
    let site = Site::read(&asked.site)?;
    let inputs = asked.captures.iter().map(Path::new).chain([asked.site.as_path()]);
    let output = Output::check(asked.output.output.as_deref(), inputs)?;
    console.talk.note_all(asked.output.doubt().as_slice());
    let timed = read_visit(
        &site,
        &asked.captures,
        &asked.timing.options(),
        asked.threads.map_or(0, usize::from),
        &console.talk,
        &output,
    )?;
    let text = match asked.output.format() {
        Format::Table => table::arrivals::text(&site, &timed, output.screen(console), console.talk.verbose),
        Format::Json => written(
            &timed,
            ArrivalsWriter::json(Vec::new(), "arrivals", &site, &arrivals_head(&site, &timed))?,
        )?,
        Format::Csv => written(&timed, ArrivalsWriter::csv(Vec::new(), "arrivals", &site)?)?,
    };
    output.write(&text, console)?;
    Ok(if timed.incomplete { status::INTERRUPTED } else { status::DONE })
}

fn written(timed: &TimedVisit, mut rows: ArrivalsWriter<'_, Vec<u8>>) -> Result<String, ArrivalsTableError> {
    for capture in &timed.arrivals {
        rows.write(capture)?;
    }
    let bytes = rows.finish()?;
    Ok(String::from_utf8(bytes).expect("CSV and JSON of names and numbers that are Unicode are Unicode"))
}
