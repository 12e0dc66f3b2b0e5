//! The way from text to [`Site`].

use std::fs::File;
use std::io::Read as _;
use std::path::Path;

use sha2::{Digest, Sha256};
use toml::de::DeTable;

use super::contents::{Places, Site};
use super::mistake::{Mistake, MistakeKind, SiteError};
use super::section::{Ledger, Section, TOP};
use super::{antennas, areas, assets, chapters, stances, tapes};

/// The most that is read of a site file, in bytes.
const MOST_BYTES: u64 = 4 << 20;
/// The version of site files that is read.
const SCHEMA: &str = "1";

const KNOWN: &[&str] = &[
    "schema",
    "site",
    "air",
    "search",
    "verdict",
    "recorder",
    "planning",
    "antenna",
    "asset",
    "obstacle",
    "stand_area",
    "keep_out",
    "stance",
    "mark",
    "tape",
];

/// Whether antennas may be without a position.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Positions {
    Needed,
    /// For `tape`, which finds them.
    Free,
}

impl Site {
    /// Reads a site file of at most 4 MiB.
    ///
    /// # Errors
    /// [`SiteError`] when the file cannot be read, or with all the mistakes in it.
    pub fn read(path: &Path) -> Result<Self, SiteError> {
        parse(&text_of(path)?, path, Positions::Needed)
    }

    /// Reads a site file in which antennas may have no position: those are [`Site::free_antennas`].
    ///
    /// # Errors
    /// As [`Site::read`].
    pub fn read_for_tape(path: &Path) -> Result<Self, SiteError> {
        parse(&text_of(path)?, path, Positions::Free)
    }

    /// Reads the text of a site file; `name` stands for the file in mistakes and in [`Site::path`].
    ///
    /// ```
    /// let text = "
    ///     schema = 1
    ///     [site]
    ///     name = \"Marl Bank\"
    ///     [[antenna]]
    ///     name = \"A1\"
    ///     channel = 1
    ///     posiiton_m = [0.0, 0.0, 2.0]
    /// ";
    /// let told = arcstead::site::Site::parse(text, "site.toml").unwrap_err().to_string();
    /// assert!(told.contains("site.toml:8:5: unknown key `posiiton_m` in [[antenna]] `A1`, did you mean `position_m`?"));
    /// ```
    ///
    /// # Errors
    /// [`SiteError::Mistakes`] with all the mistakes in the text.
    pub fn parse(text: &str, name: &str) -> Result<Self, SiteError> {
        parse(text, Path::new(name), Positions::Needed)
    }
}

fn text_of(path: &Path) -> Result<String, SiteError> {
    let failed = |source| SiteError::Read { path: path.to_owned(), source };
    // Asked before opening: opening a pipe would wait for its other end.
    if !std::fs::metadata(path).map_err(failed)?.is_file() {
        return Err(SiteError::NotAFile { path: path.to_owned() });
    }
    let mut bytes = Vec::new();
    // One byte more than allowed tells a file that is too large from one that just fits.
    File::open(path).map_err(failed)?.take(MOST_BYTES + 1).read_to_end(&mut bytes).map_err(failed)?;
    if bytes.len() as u64 > MOST_BYTES {
        return Err(SiteError::TooLarge { path: path.to_owned(), limit_bytes: MOST_BYTES });
    }
    String::from_utf8(bytes).map_err(|error| {
        let at = error.utf8_error().valid_up_to();
        let bytes = error.into_bytes();
        let before = String::from_utf8_lossy(&bytes[..at]);
        let (line, column) = Ledger::new(&before).place(at);
        let kind = MistakeKind::NotUtf8 { byte: bytes[at] };
        SiteError::Mistakes { path: path.to_owned(), mistakes: vec![Mistake { line, column, kind }] }
    })
}

fn parse(text: &str, path: &Path, positions: Positions) -> Result<Site, SiteError> {
    let wrong = |mistakes| SiteError::Mistakes { path: path.to_owned(), mistakes };
    let ledger = Ledger::new(text);
    let (document, errors) = DeTable::parse_recoverable(text);
    if !errors.is_empty() {
        for error in errors {
            let message = error.message().to_owned();
            let span = error.span().unwrap_or(0..0);
            ledger.report(&span, MistakeKind::Syntax { found: ledger.quote(&span), message });
        }
        let mut mistakes = ledger.into_mistakes();
        // What is wrong once often sends the parser astray for the rest of the line.
        mistakes.dedup_by_key(|mistake| mistake.line);
        return Err(wrong(mistakes));
    }
    let site = match document.get_ref().get("schema") {
        // A file of another version would be read wrongly from here on: that is the only mistake told.
        Some(schema) if schema.get_ref().as_integer().is_none_or(|found| found.to_string() != SCHEMA) => {
            ledger.report(&schema.span(), MistakeKind::Schema { found: ledger.quote(&schema.span()) });
            None
        }
        _ => walk(&Section::new(&ledger, TOP.to_owned(), document.get_ref(), 0..0, KNOWN), positions, path),
    };
    let mistakes = ledger.into_mistakes();
    match site {
        Some(mut site) if mistakes.is_empty() => {
            site.sha256 = Sha256::digest(text.as_bytes()).iter().map(|byte| format!("{byte:02x}")).collect();
            Ok(site)
        }
        _ => Err(wrong(mistakes)),
    }
}

/// Reads every table, whatever is wrong with the others; none where a mistake leaves something without a value.
fn walk(whole: &Section<'_>, positions: Positions, path: &Path) -> Option<Site> {
    whole.need("schema", "schema = 1");
    let head = chapters::site(whole);
    let air = chapters::air(whole);
    let priors = chapters::verdict(whole);
    let antennas = antennas::read(whole, positions == Positions::Free);
    let (assets, asset_places) = assets::read(whole);
    let obstacles = areas::obstacles(whole);
    let stand_areas = areas::stand_areas(whole);
    let keep_outs = areas::keep_outs(whole);
    let (stances, stance_places) = stances::read(whole, &antennas.names);
    let marks = tapes::marks(whole, &antennas.names);
    let tapes = tapes::tapes(whole, &antennas.names, &marks);
    let search = chapters::search(whole, &antennas, &assets);
    let recorder = chapters::recorder(whole);
    let planning = chapters::planning(whole);
    let head = head?;
    Some(Site {
        name: head.name,
        mains_frequency_hz: head.mains_frequency_hz,
        origin: head.origin,
        geometry: arcstead_solver::Site {
            antennas: antennas.antennas,
            assets,
            obstacles,
            air,
            search: search?,
            priors,
        },
        chains: antennas.chains,
        recorder,
        planning,
        stand_areas,
        keep_outs,
        stances,
        marks: marks.marks,
        tapes,
        free_antennas: antennas.free,
        sha256: String::new(),
        path: path.to_owned(),
        places: Places { antennas: antennas.places, assets: asset_places, stances: stance_places },
    })
}
