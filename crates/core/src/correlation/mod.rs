//! Delays by correlation.
//!
//! One convention everywhere: a lag, and a delay between two channels A and B, is *arrival at B minus arrival at A*.

mod generalised;
pub(crate) mod peak;
mod weighting;

pub use generalised::{CrossCorrelation, GeneralisedCorrelation};
pub use weighting::Weighting;
pub(crate) use weighting::apply as apply_weighting;
