//! The result documents: what the program writes as JSON, and what reports and figures are drawn from.
//!
//! One file a document. Every document begins with the same [`Head`]; its `schema` says which document it is and
//! which version. The fields stand in the order in which they are written. A number that is not known is an
//! `Option` and written as `null`; a number that is NaN or infinite is refused ([`Document::to_json`]) rather than
//! turned into `null` in silence. Fields may be added to a document, never renamed.

mod finite;
mod head;
mod inspect;
mod locate;
mod truth;
mod written;

pub use finite::NotFinite;
pub use head::{Head, Inputs, Program};
pub use inspect::{Carrier, InspectDocument, InspectedCapture, InspectedChannel};
pub use locate::{
    Alternative, AntennaResult, AssetProbability, Bearing, CaptureCounts, Ellipse, Fit, Flag, LocateDocument,
    Region, RejectedCapture, SourceResult, Statement, Verdict,
};
pub use truth::{TrueAntenna, TrueCapture, TrueSource, TruthDocument};
/// Schema of an arrivals table in JSON; its rows are written one by one by
/// [`ArrivalsWriter`](crate::arrivals_table::ArrivalsWriter).
pub const ARRIVALS_SCHEMA: &str = "arcstead/arrivals/1";

pub use written::{Document, DocumentError};
