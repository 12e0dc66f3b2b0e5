//! Why a command ends without its result.

use std::path::PathBuf;

use arcstead::VisitError;
use arcstead::arrivals_table::ArrivalsTableError;
use arcstead::documents::{DocumentError, RejectedCapture};
use arcstead::formats::FormatError;
use arcstead::formats::sigmf::SigmfWriteError;
use arcstead::site::SiteError;
use arcstead_sim::SimError;
use thiserror::Error;

use crate::table::figures::count;
use crate::{rejected, status};

/// Reasons that are told when no capture could be read.
const MOST_REASONS: usize = 10;

#[derive(Debug, Error)]
pub(crate) enum Failure {
    #[error("{}", site_text(.0))]
    Site(#[source] SiteError),
    #[error("{0}")]
    Visit(#[source] VisitError),
    #[error("{0}")]
    Format(#[from] FormatError),
    #[error("{}", nothing_read(.0))]
    NothingRead(Vec<RejectedCapture>),
    #[error("stopped before the first capture was read; there is no result")]
    StoppedEarly,
    #[error("the result cannot be told")]
    Document(#[from] DocumentError),
    #[error("the arrivals table cannot be told")]
    Table(#[from] ArrivalsTableError),
    #[error("the rows of the result cannot be written")]
    Rows(#[from] csv::Error),
    #[error("{} cannot be written", path.display())]
    Write { path: PathBuf, source: std::io::Error },
    #[error("stdout cannot be written")]
    Stdout(#[source] std::io::Error),
    #[error("--output {} is one of the files to be read; name another file", path.display())]
    OutputIsInput { path: PathBuf },
    #[error("--output {} is a folder; name a file in it", path.display())]
    OutputIsFolder { path: PathBuf },
    #[error(transparent)]
    Simulation(#[from] SimError),
    #[error(
        "the site file gives no sample rate, and captures cannot be simulated without one; put `sample_rate_gsps` under \
         [recorder]"
    )]
    NoSampleRate,
    #[error("the site has no asset \"{name}\"; give X,Y,Z in metres or one of: {known}")]
    NoSuchAsset { name: String, known: String },
    #[error("{} is there already; --force replaces it", path.display())]
    Exists { path: PathBuf },
    #[error("{} is no folder; name a folder for the captures", path.display())]
    NotAFolder { path: PathBuf },
    #[error("the simulated captures cannot be written")]
    Recording(#[from] SigmfWriteError),
}

impl Failure {
    /// Whether its text has several lines; names in them hold no line feeds.
    pub(crate) fn is_list(&self) -> bool {
        matches!(self, Self::Site(_) | Self::NothingRead(_))
    }

    /// The exit status that goes with it.
    pub(crate) fn status(&self) -> u8 {
        match self {
            Self::Site(_)
            | Self::Visit(
                VisitError::Site(_) | VisitError::Stance { .. } | VisitError::SeveralStances { .. },
            )
            | Self::OutputIsInput { .. }
            | Self::OutputIsFolder { .. }
            | Self::Simulation(_)
            | Self::NoSampleRate
            | Self::NoSuchAsset { .. }
            | Self::NotAFolder { .. }
            | Self::Exists { .. } => status::USAGE,
            Self::StoppedEarly => status::INTERRUPTED,
            _ => status::FAILED,
        }
    }
}

impl From<SiteError> for Failure {
    fn from(error: SiteError) -> Self {
        Self::Site(error)
    }
}

impl From<VisitError> for Failure {
    fn from(error: VisitError) -> Self {
        match error {
            VisitError::Site(error) => Self::Site(error),
            error => Self::Visit(error),
        }
    }
}

/// All mistakes of a site file below one line that counts them.
fn site_text(error: &SiteError) -> String {
    match error {
        SiteError::Mistakes { mistakes, .. } if mistakes.len() > 1 => {
            format!("the site file has {} mistakes:\n{error}", mistakes.len())
        }
        error => error.to_string(),
    }
}

fn nothing_read(unreadable: &[RejectedCapture]) -> String {
    if unreadable.is_empty() {
        return "there are no captures in what was named".into();
    }
    let mut text = match unreadable.len() {
        1 => "the capture could not be read:".to_owned(),
        count => format!("none of {count} captures could be read:"),
    };
    let lines = rejected::lines(unreadable, false);
    for line in lines.iter().take(MOST_REASONS) {
        text = format!("{text}\n  {line}");
    }
    if lines.len() > MOST_REASONS {
        text = format!("{text}\n  and {}", count(lines.len() - MOST_REASONS, "more reason"));
    }
    text
}
