//! What can be wrong with an arrivals table, and its words.

use std::fmt;
use std::path::PathBuf;

use thiserror::Error;

use crate::documents::ARRIVALS_SCHEMA;

use super::row::COLUMNS;
use crate::capture_time::CaptureTimeError;

/// Why an arrivals table cannot be read or written.
#[derive(Debug, Error)]
#[error("{}{place}: {mistake}", path.display())]
pub struct ArrivalsTableError {
    /// The table, as it was named.
    pub path: PathBuf,
    /// Where in it.
    pub place: TablePlace,
    /// What is wrong.
    pub mistake: TableMistake,
}

/// A place in a table.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TablePlace {
    /// The table as a whole.
    Whole,
    /// A line of a CSV file, counted from 1.
    Line(u64),
    /// An element of a JSON array, counted from 1.
    Row(usize),
}

impl fmt::Display for TablePlace {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Whole => Ok(()),
            Self::Line(line) => write!(f, ":{line}"),
            Self::Row(row) => write!(f, ": row {row}"),
        }
    }
}

/// What can be wrong with an arrivals table. The fields are said in the text of each variant.
#[derive(Debug, Error)]
#[non_exhaustive]
#[allow(missing_docs, reason = "the fields are said in the text of each variant")]
pub enum TableMistake {
    /// The file cannot be read or written.
    #[error("it cannot be read or written: {0}")]
    File(std::io::Error),
    /// It is no file.
    #[error("it is no file; expected an arrivals table")]
    NotAFile,
    /// A row of another length, or bytes that are no text.
    #[error("not CSV as expected: {0}")]
    Csv(csv::Error),
    /// It is no JSON of the expected form.
    #[error("not JSON as expected: {0}")]
    Json(serde_json::Error),
    /// Another JSON document.
    #[error("it says schema `{found}`; expected `{ARRIVALS_SCHEMA}`")]
    Schema { found: String },
    /// A column that is needed is not there.
    #[error(
        "there is no column `{column}`{}; needed are capture,antenna,arrival_s,sigma_s, separated by commas",
        meant(nearest)
    )]
    MissingColumn { column: &'static str, nearest: Option<String> },
    /// A column with a name that is nearly a known one.
    #[error("unknown column `{found}`, did you mean `{nearest}`? columns are {}", COLUMNS.join(","))]
    UnknownColumn { found: String, nearest: &'static str },
    /// A column that is there twice.
    #[error("the column `{column}` is there twice; expected it once")]
    RepeatedColumn { column: &'static str },
    /// A value that must be there is not.
    #[error("`{column}` is empty; expected a name")]
    Empty { column: &'static str },
    /// A value that is no finite number.
    #[error("`{column}` is {found}; expected a finite number with a decimal point")]
    Number { column: &'static str, found: String },
    /// A value that is no time.
    #[error("`time`: {0}")]
    Time(CaptureTimeError),
    /// An antenna that the site has not.
    #[error("the site has no antenna `{found}`{}", meant(nearest))]
    UnknownAntenna { found: String, nearest: Option<String> },
    /// A stance that the site has not.
    #[error("the site has no stance `{found}`{}", meant(nearest))]
    UnknownStance { found: String, nearest: Option<String> },
    /// A flag there is not.
    #[error(
        "there is no flag `{found}`; expected clipped, dead, weak, carrier or disagree, separated by `;`"
    )]
    UnknownFlag { found: String },
    /// An antenna index beyond the site's, on writing.
    #[error("antenna index {index} is beyond the {antennas} antennas of the site")]
    NoSuchAntenna { index: usize, antennas: usize },
    /// Two rows for one antenna in one capture.
    #[error("capture `{capture}` has antenna `{antenna}` twice; expected one row for each antenna")]
    RepeatedAntenna { capture: String, antenna: String },
    /// The rows of a capture are not together.
    #[error("capture `{capture}` was told before; expected all rows of a capture one after the other")]
    Scattered { capture: String },
    /// Two times for one capture.
    #[error(
        "capture `{capture}` has another time here than in its first row; expected one time for a capture"
    )]
    TimeDiffers { capture: String },
    /// An arrival without its sigma.
    #[error("`arrival_s` is there but no `sigma_s`; expected both, or neither for a missed arrival")]
    NoSigma,
    /// A sigma without its arrival.
    #[error("`sigma_s` is there but no `arrival_s`; expected both, or neither for a missed arrival")]
    SigmaAlone,
    /// A sigma that is not above zero.
    #[error("`sigma_s` is {found_s}; expected a standard deviation above 0, in seconds")]
    Sigma { found_s: f64 },
    /// A covariance row of another length.
    #[error("`covariance_s2` has {found} values; expected {expected}, one for each row of the capture")]
    CovarianceLength { found: usize, expected: usize },
    /// A covariance for some of the arrivals only.
    #[error(
        "`covariance_s2` is given for some arrivals of the capture and not for this one; expected all or none"
    )]
    CovarianceMissing,
    /// A covariance whose diagonal is not sigma squared.
    #[error(
        "`sigma_s` is {sigma_s} but its variance in `covariance_s2` is {variance_s2}; expected its square, or no covariance_s2"
    )]
    CovarianceSigma { sigma_s: f64, variance_s2: f64 },
    /// A covariance that is not symmetric.
    #[error(
        "the covariance of `{first}` and `{second}` is {above} in the one row and {below} in the other; expected the same"
    )]
    CovarianceHalves { first: String, second: String, above: f64, below: f64 },
    /// A covariance that is larger than the two sigmas allow.
    #[error(
        "the covariance of `{first}` and `{second}` is {found_s2}; expected at most the product of their sigmas, {most_s2}"
    )]
    CovarianceSize { first: String, second: String, found_s2: f64, most_s2: f64 },
}

fn meant(nearest: &Option<String>) -> String {
    nearest.as_ref().map_or(String::new(), |nearest| format!(", did you mean `{nearest}`?"))
}
