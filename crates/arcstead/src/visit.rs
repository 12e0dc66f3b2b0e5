//! The captures of a visit: opened, read and timed in parallel.

use std::collections::HashMap;
use std::ffi::OsString;
use std::path::PathBuf;
use std::sync::Mutex;

use rayon::prelude::*;
use thiserror::Error;

use crate::arrivals_table::{ArrivalsReader, ArrivalsTableError, CaptureArrivals, read_json_file};
use crate::documents::RejectedCapture;
use crate::error_chain::told;
use crate::formats::{CaptureFile, FormatError, ReadSettings, Skipped, find_captures, open_captures};
use crate::site::{Site, SiteError};
use crate::timer::{ArrivalOptions, CaptureTimer};

/// What goes on while a visit is read; the default does nothing.
pub trait Watch: Sync {
    /// One more capture has been read, or given up.
    fn capture_done(&self) {}

    /// Whether to stop: captures not yet begun are then left out.
    fn stop(&self) -> bool {
        false
    }
}

/// Watches nothing and never stops.
#[derive(Debug, Clone, Copy, Default)]
pub struct Unwatched;

impl Watch for Unwatched {}

/// Why a visit cannot be read.
#[derive(Debug, Error)]
#[non_exhaustive]
pub enum VisitError {
    /// The site is not fit for locating a source.
    #[error(transparent)]
    Site(#[from] SiteError),
    /// What was named holds no captures that can be found.
    #[error(transparent)]
    Format(#[from] FormatError),
    /// An arrivals table cannot be read.
    #[error(transparent)]
    Table(#[from] ArrivalsTableError),
    /// The same capture stands in the tables twice.
    #[error("capture \"{capture}\" stands in the tables twice with the same arrivals; give each table once")]
    RepeatedCapture {
        /// Its name.
        capture: String,
    },
    /// The site has no stance of this name.
    #[error("the site has no stance \"{name}\"; it has: {known}")]
    Stance {
        /// The name given.
        name: String,
        /// The names there are.
        known: String,
    },
    /// Captures of several stances were given.
    #[error("captures of the stances \"{first}\" and \"{second}\" together; one stance is solved at a time")]
    SeveralStances {
        /// One of them.
        first: String,
        /// Another.
        second: String,
    },
    /// The threads cannot be started.
    #[error("the worker threads cannot be started: {0}")]
    Threads(String),
}

/// The capture files of a visit, opened but not read.
#[derive(Debug)]
pub struct Visit<'s> {
    site: &'s Site,
    stance: String,
    files: Vec<VisitFile>,
    unreadable: Vec<RejectedCapture>,
    skipped: Vec<Skipped>,
}

/// One file of a visit.
#[derive(Debug)]
struct VisitFile {
    path: PathBuf,
    opened: Box<dyn CaptureFile>,
    /// Whether another file of the visit has the same name, in another folder.
    ambiguous: bool,
}

impl VisitFile {
    /// Name of a capture, unique in the visit: results and tables tell captures apart by it.
    fn capture_name(&self, index: usize) -> String {
        let name = self.opened.capture_name(index);
        match self.path.file_name() {
            Some(file) if self.ambiguous => {
                let number = name.strip_prefix(&*file.to_string_lossy()).unwrap_or_default();
                format!("{}{number}", self.path.display())
            }
            _ => name,
        }
    }
}

/// What a visit told: the arrivals of each capture, in the order of the captures.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct TimedVisit {
    /// Files and tables it came from, as they were named.
    pub files: Vec<String>,
    /// How the arrivals were found; none when they were read from tables.
    pub timing: Option<ArrivalOptions>,
    /// Captures there are, read or not.
    pub captures: usize,
    /// Arrivals of every capture that could be read.
    pub arrivals: Vec<CaptureArrivals>,
    /// Captures and files that could not be read, each with its reason.
    pub unreadable: Vec<RejectedCapture>,
    /// Whether reading was stopped before the end.
    pub incomplete: bool,
}

impl<'s> Visit<'s> {
    /// Finds and opens the captures that `arguments` (files or folders) name, taken from `stance`. A file that
    /// cannot be opened costs itself only.
    ///
    /// # Errors
    /// [`VisitError`] when the site is not ready for a locating visit, has no such stance, or an argument names
    /// nothing.
    pub fn open(site: &'s Site, stance: &str, arguments: &[PathBuf]) -> Result<Self, VisitError> {
        site.ready_to_locate()?;
        if site.geometry_of_stance(stance).is_none() {
            return Err(no_such_stance(site, stance));
        }
        let settings = ReadSettings { sample_rate_hz: site.recorder.sample_rate_hz };
        let found = find_captures(arguments)?;
        let mut files: Vec<VisitFile> = Vec::new();
        let mut unreadable = Vec::new();
        for path in found.files {
            match open_captures(&path, &settings) {
                Ok(opened) => files.push(VisitFile { path, opened, ambiguous: false }),
                Err(error) => unreadable
                    .push(RejectedCapture { capture: path.display().to_string(), reason: told(&error) }),
            }
        }
        let mut named: HashMap<OsString, usize> = HashMap::new();
        for file in &files {
            *named.entry(file.path.file_name().unwrap_or_default().to_owned()).or_default() += 1;
        }
        for file in &mut files {
            file.ambiguous = named[file.path.file_name().unwrap_or_default()] > 1;
        }
        Ok(Self { site, stance: stance.to_owned(), files, unreadable, skipped: found.skipped })
    }

    /// Number of captures in the files that could be opened.
    #[must_use]
    pub fn capture_count(&self) -> usize {
        self.files.iter().map(|file| file.opened.capture_count()).sum()
    }

    /// The files that are read: those that were opened, and the samples beside a description of them.
    #[must_use]
    pub fn files(&self) -> Vec<PathBuf> {
        let described = |path: &PathBuf| [path.clone(), path.with_extension("sigmf-data")];
        self.files.iter().flat_map(|file| described(&file.path)).collect()
    }

    /// What the arguments named but was passed over.
    #[must_use]
    pub fn skipped(&self) -> &[Skipped] {
        &self.skipped
    }

    /// Reads and times every capture on `threads` threads (0: one for each processor). The result is the same for any
    /// number of threads.
    ///
    /// # Errors
    /// [`VisitError::Threads`] when the threads cannot be started.
    pub fn time(
        &self,
        options: &ArrivalOptions,
        threads: usize,
        watch: &impl Watch,
    ) -> Result<TimedVisit, VisitError> {
        let pool = pool(threads)?;
        let places: Vec<(usize, usize)> = self
            .files
            .iter()
            .enumerate()
            .flat_map(|(file, one)| (0..one.opened.capture_count()).map(move |index| (file, index)))
            .collect();
        let idle: Mutex<Vec<CaptureTimer<'_>>> = Mutex::new(Vec::new());
        let results: Vec<Option<Result<CaptureArrivals, RejectedCapture>>> = pool.install(|| {
            places
                .par_iter()
                .with_max_len(16)
                .map(|&(file, index)| {
                    if watch.stop() {
                        return None;
                    }
                    let kept = idle.lock().ok().and_then(|mut timers| timers.pop());
                    let mut timer = match kept {
                        Some(timer) => timer,
                        None => CaptureTimer::new(self.site, &self.stance, *options)?,
                    };
                    let result = self.time_one(file, index, &mut timer);
                    if let Ok(mut timers) = idle.lock() {
                        timers.push(timer);
                    }
                    watch.capture_done();
                    Some(result)
                })
                .collect()
        });
        let mut timed = TimedVisit {
            files: self.files.iter().map(|file| file.path.display().to_string()).collect(),
            timing: Some(*options),
            captures: places.len() + self.unreadable.len(),
            unreadable: self.unreadable.clone(),
            ..TimedVisit::default()
        };
        for result in results {
            match result {
                Some(Ok(arrivals)) => timed.arrivals.push(arrivals),
                Some(Err(rejected)) => timed.unreadable.push(rejected),
                None => timed.incomplete = true,
            }
        }
        Ok(timed)
    }

    fn time_one(
        &self,
        file: usize,
        index: usize,
        timer: &mut CaptureTimer<'_>,
    ) -> Result<CaptureArrivals, RejectedCapture> {
        let file = &self.files[file];
        let rejected = |reason: String| RejectedCapture { capture: file.capture_name(index), reason };
        let mut recorded = file.opened.read(index).map_err(|error| rejected(told(&error)))?;
        if file.ambiguous {
            recorded.name = file.capture_name(index);
        }
        timer.time(&recorded).map_err(|error| rejected(told(&error)))
    }
}

impl TimedVisit {
    /// Reads arrivals tables in place of captures: JSON where the name ends so, else CSV.
    ///
    /// # Errors
    /// [`VisitError`] when the site is not ready, a table cannot be read, or names a stance the site does not have.
    pub fn from_tables(site: &Site, tables: &[PathBuf]) -> Result<Self, VisitError> {
        site.ready_to_locate()?;
        let mut timed = Self::default();
        for path in tables {
            if path.extension().is_some_and(|ending| ending.eq_ignore_ascii_case("json")) {
                timed.arrivals.extend(read_json_file(path, site)?);
            } else {
                for capture in ArrivalsReader::open(path, site)? {
                    timed.arrivals.push(capture?);
                }
            }
            timed.files.push(path.display().to_string());
        }
        timed.captures = timed.arrivals.len();
        let mut seen: HashMap<(&str, &str), &CaptureArrivals> = HashMap::new();
        for capture in &timed.arrivals {
            // Of one name but other arrivals it is another folder's.
            if seen.insert((&capture.stance, &capture.capture), capture).is_some_and(|same| same == capture) {
                return Err(VisitError::RepeatedCapture { capture: capture.capture.clone() });
            }
        }
        for capture in &timed.arrivals {
            if site.geometry_of_stance(&capture.stance).is_none() {
                return Err(no_such_stance(site, &capture.stance));
            }
        }
        Ok(timed)
    }

    /// The one stance the captures were taken from; `main` when there are none.
    ///
    /// # Errors
    /// [`VisitError::SeveralStances`] when there are several.
    pub fn stance(&self) -> Result<&str, VisitError> {
        let mut stances = self.arrivals.iter().map(|capture| capture.stance.as_str());
        let first = stances.next().unwrap_or(crate::site::MAIN_STANCE);
        match stances.find(|&stance| stance != first) {
            None => Ok(first),
            Some(second) => {
                Err(VisitError::SeveralStances { first: first.to_owned(), second: second.to_owned() })
            }
        }
    }
}

/// A pool of this many threads (0: one for each processor).
pub(crate) fn pool(threads: usize) -> Result<rayon::ThreadPool, VisitError> {
    rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()
        .map_err(|error| VisitError::Threads(error.to_string()))
}

fn no_such_stance(site: &Site, name: &str) -> VisitError {
    let mut known = vec![crate::site::MAIN_STANCE];
    known.extend(site.stances.iter().map(|stance| stance.name.as_str()));
    VisitError::Stance { name: name.to_owned(), known: known.join(", ") }
}
