//! The captures of a visit read and timed, with progress and warnings.

use std::ffi::OsString;

use arcstead::formats::{SkipReason, Skipped};
use arcstead::site::Site;
use arcstead::{ArrivalOptions, TimedVisit, Visit};

use crate::console::Talk;
use crate::failure::Failure;
use crate::output::Output;
use crate::progress::Progress;
use crate::{rejected, stance_argument};

/// Reads and times the captures that `arguments` name, and warns of those that cannot be read.
///
/// # Errors
/// When the arguments name nothing that can be read, are of several stances, `output` would replace one of the files, or
/// no capture at all could be read.
pub(super) fn read_visit(
    site: &Site,
    arguments: &[OsString],
    options: &ArrivalOptions,
    threads: usize,
    talk: &Talk<'_>,
    output: &Output,
) -> Result<TimedVisit, Failure> {
    let (stance, paths) = stance_argument::split(site, arguments)?;
    let visit = Visit::open(site, &stance, &paths)?;
    output.spare(&visit.files())?;
    // The truth that `simulate` writes beside its captures is no capture, and nobody wonders.
    let wondered = |skipped: &&Skipped| !skipped.path.ends_with("truth.json");
    talk.note_all(&visit.skipped().iter().filter(wondered).map(skipped).collect::<Vec<_>>());
    let progress = Progress::begin(talk, Some(visit.capture_count()));
    let timed = visit.time(options, threads, &progress);
    progress.end();
    let timed = timed?;
    if timed.arrivals.is_empty() {
        return Err(if timed.incomplete {
            Failure::StoppedEarly
        } else {
            Failure::NothingRead(timed.unreadable)
        });
    }
    talk.warn_all(&rejected::lines(&timed.unreadable, talk.verbose));
    if timed.incomplete {
        let read = timed.arrivals.len() + timed.unreadable.len();
        talk.warn(&format!("stopped after {read} of {} captures; the result is of those", timed.captures));
    }
    Ok(timed)
}

fn skipped(skipped: &Skipped) -> String {
    let reason = match skipped.reason {
        SkipReason::Hidden => "its name begins with a full stop",
        SkipReason::Folder => "a folder in a folder; name it by itself if it holds captures",
        SkipReason::NotAFile => "no regular file",
        SkipReason::UnknownFormat => "no capture of a known format",
        SkipReason::Repeated => "named twice",
        _ => "no capture",
    };
    format!("passed over {}: {reason}", skipped.path.display())
}
