//! Every mistake a site file can hold, and its words.

use std::fmt;
use std::path::PathBuf;

use thiserror::Error;

/// Why a site cannot be used.
#[derive(Debug, Error)]
#[non_exhaustive]
pub enum SiteError {
    /// The file cannot be read.
    #[error("the site file {} cannot be read", path.display())]
    Read {
        /// The file.
        path: PathBuf,
        /// What the system says.
        #[source]
        source: std::io::Error,
    },
    /// It is a folder or a device.
    #[error("{} is no file; expected a site file such as site.toml", path.display())]
    NotAFile {
        /// What was named.
        path: PathBuf,
    },
    /// The file is larger than any site file.
    #[error("the site file {} holds more than {limit_bytes} bytes; is it a capture?", path.display())]
    TooLarge {
        /// The file.
        path: PathBuf,
        /// The most that is read, in bytes.
        limit_bytes: u64,
    },
    /// What the file says is wrong; all mistakes, in the order of the file. Never empty.
    #[error("{}", listed(path, mistakes))]
    Mistakes {
        /// The file, or the name the text was given.
        path: PathBuf,
        /// The mistakes.
        mistakes: Vec<Mistake>,
    },
}

fn listed(path: &std::path::Path, mistakes: &[Mistake]) -> String {
    let lines: Vec<_> = mistakes.iter().map(|mistake| format!("{}:{mistake}", path.display())).collect();
    lines.join("\n")
}

/// One mistake and where it stands.
#[derive(Debug, Clone, PartialEq)]
pub struct Mistake {
    /// Line, counted from 1.
    pub line: usize,
    /// Column in characters, counted from 1.
    pub column: usize,
    /// What is wrong.
    pub kind: MistakeKind,
}

impl fmt::Display for Mistake {
    /// `LINE:COLUMN: what was read, what was expected`.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}:{}: {}", self.line, self.column, self.kind)
    }
}

/// What can be wrong with a site file. `table` is where: `[air]`, `[[antenna]] A1`, `[[asset]] number 3`. `found` is
/// what stands in the file.
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
#[allow(missing_docs, reason = "the fields are said in the text of each variant")]
pub enum MistakeKind {
    /// It is no TOML.
    #[error("not TOML{}: {message}", if found.is_empty() { String::new() } else { format!(" at `{found}`") })]
    Syntax { found: String, message: String },
    /// It is no text.
    #[error("not text: the byte 0x{byte:02x} is no UTF-8; save the file as UTF-8")]
    NotUtf8 { byte: u8 },
    /// The file is of a version this program does not know.
    #[error("schema is {found}; this program reads schema 1")]
    Schema { found: String },
    /// A key or table that must be there is not.
    #[error("{table} has no `{key}`; expected {expected}")]
    Missing { table: String, key: &'static str, expected: &'static str },
    /// A key that means nothing, with the nearest that does, or all of them where none is near.
    #[error("unknown key `{key}` in {table}{}", meant_or_known(nearest, known))]
    UnknownKey { table: String, key: String, nearest: Option<&'static str>, known: &'static [&'static str] },
    /// A position in degrees.
    #[error(
        "`{key}` in {table}: positions in degrees are not read yet; give `{instead}` in metres of the site"
    )]
    Degrees { table: String, key: String, instead: String },
    /// A value of another type.
    #[error("`{key}` in {table} is {found}, {found_type}; expected {expected}")]
    Type { table: String, key: String, found: String, found_type: &'static str, expected: String },
    /// A list of another length.
    #[error("`{key}` in {table} has {found} values; expected {expected}")]
    Length { table: String, key: String, found: usize, expected: &'static str },
    /// NaN or infinity.
    #[error("`{key}` in {table} is {found}; expected a finite number")]
    NotFinite { table: String, key: String, found: String },
    /// A number that cannot be.
    #[error("`{key}` in {table} is {found}; expected {expected}{}", slip.as_ref().map_or(String::new(), |slip| format!(": {found} {slip}")))]
    OutOfRange { table: String, key: String, found: String, expected: String, slip: Option<UnitSlip> },
    /// Two numbers in the wrong order.
    #[error("`{key}` in {table}: {low} is not below {high}; expected {expected}")]
    Order { table: String, key: &'static str, low: f64, high: f64, expected: &'static str },
    /// Two keys that exclude each other.
    #[error("{table} has both `{first}` and `{second}`; expected one of the two")]
    Both { table: String, first: &'static str, second: &'static str },
    /// Two keys of which one is of no use without the other.
    #[error("{table} has `{first}` but no `{second}`; expected both")]
    Alone { table: String, first: &'static str, second: &'static str },
    /// A name or channel that is taken.
    #[error("{what} {value} is taken: it stands in line {first_line} already; expected each once")]
    Duplicate { what: &'static str, value: String, first_line: usize },
    /// A name that cannot be one.
    #[error("`{key}` in {table} is {found}; expected {expected}")]
    Name { table: String, key: &'static str, found: String, expected: &'static str },
    /// A name that no table bears.
    #[error("`{key}` in {table}: there is no {what} `{name}`{}", meant(nearest))]
    UnknownName {
        table: String,
        key: &'static str,
        what: &'static str,
        name: String,
        nearest: Option<String>,
    },
    /// A stance that leaves out an antenna.
    #[error("{table} does not place antenna `{antenna}`; expected a position for every antenna")]
    StanceIncomplete { table: String, antenna: String },
    /// A tape between a thing and itself.
    #[error("{table} is between `{name}` and itself; expected two names")]
    TapeToItself { table: String, name: String },
    /// A footprint whose corners number too few or too many.
    #[error("the footprint of {table} has {found} corners; expected {least} to {most}")]
    Corners { table: String, found: usize, least: usize, most: usize },
    /// A corner that is the same as its neighbour.
    #[error(
        "corners {first} and {second} of the footprint of {table} are the same point; \
         leave one out (the last corner joins the first by itself)"
    )]
    CornerRepeated { table: String, first: usize, second: usize },
    /// Two sides of a footprint that cross or touch.
    #[error(
        "the footprint of {table} crosses itself: the side from corner {first} meets the side from corner {second}; \
         expected the corners in order round the outline"
    )]
    FootprintCrosses { table: String, first: usize, second: usize },
    /// A search plane outside the search box.
    #[error(
        "`height_m` in [search] is {height_m}, outside {low_m} to {high_m} of `min_m` and `max_m`; expected a \
         height between them, or `min_m` and `max_m` as [x, y]"
    )]
    PlaneOutsideBox { height_m: f64, low_m: f64, high_m: f64 },
    /// Nothing to search around.
    #[error(
        "there is nothing to search around; expected an [[antenna]] or [[asset]], or [search] with min_m and max_m"
    )]
    NothingToSearch,
    /// Too few antennas to find a place (asked by `locate`).
    #[error("{found} antennas; a place with {unknowns} unknown coordinates needs at least {needed}")]
    TooFewAntennas { found: usize, unknowns: usize, needed: usize },
    /// An asset where nothing is searched (asked by `locate`).
    #[error("asset `{asset}` reaches outside the search box; widen [search] so that it holds every asset")]
    AssetOutsideSearch { asset: String },
    /// An asset that no antenna could hear (asked by `locate`).
    #[error("asset `{asset}` lies inside the obstacle `{obstacle}`, from where no antenna can hear it")]
    AssetInsideObstacle { asset: String, obstacle: String },
    /// Two antennas at one place (asked by `locate`).
    #[error(
        "antennas `{first}` and `{second}` stand at the same place in stance `{stance}`; expected them apart"
    )]
    CoincidentAntennas { stance: String, first: String, second: String },
    /// An antenna inside an obstacle (asked by `locate`).
    #[error(
        "antenna `{antenna}` stands inside the obstacle `{obstacle}` in stance `{stance}`; expected it outside"
    )]
    InsideObstacle { stance: String, antenna: String, obstacle: String },
    /// An antenna inside a keep-out (asked by `locate`).
    #[error(
        "antenna `{antenna}` stands inside the keep-out `{keep_out}` in stance `{stance}`, where the site allows no \
         antenna and no person"
    )]
    InsideKeepOut { stance: String, antenna: String, keep_out: String },
}

fn meant(nearest: &Option<String>) -> String {
    nearest.as_ref().map_or(String::new(), |nearest| format!(", did you mean `{nearest}`?"))
}

fn meant_or_known(nearest: &Option<&str>, known: &[&str]) -> String {
    match nearest {
        Some(nearest) => format!(", did you mean `{nearest}`?"),
        None => format!("; expected one of {}", known.join(", ")),
    }
}

/// The unit that a number seems to be in.
#[derive(Debug, Clone, PartialEq)]
pub struct UnitSlip {
    /// The unit it seems to be in.
    pub looks_like: &'static str,
    /// The unit of the key.
    pub unit: &'static str,
    /// What it would be in the unit of the key.
    pub instead: f64,
}

impl fmt::Display for UnitSlip {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let space = if self.unit.is_empty() { "" } else { " " };
        write!(f, "{} is {}{space}{}", self.looks_like, self.instead, self.unit)
    }
}
