//! The arrivals table: arrival times per capture and antenna, as CSV or JSON, out and in.
//!
//! Columns: `capture,time,stance,antenna,arrival_s,sigma_s,snr_db,delay_ns,covariance_s2,flags`, one row per capture and
//! antenna, the rows of a capture one after the other. When read, columns may stand in any order, and only `capture`,
//! `antenna`, `arrival_s` and `sigma_s` are needed; other columns are passed over, unless one is so near to a known
//! name that it must be meant. JSON is a document (schema
//! `arcstead/arrivals/1`) whose `arrivals` are objects with the same names, `covariance_s2` a list of numbers and
//! `flags` a list of names.
//!
//! Numbers are written so that they read back exactly. `delay_ns` is what was subtracted, to twelve digits; on reading it
//! is exchanged for the site's, and where the two are the same the arrival is not touched at all.
//!
//! | file | holds |
//! |---|---|
//! | `capture_arrivals` | [`CaptureArrivals`], and what makes one sound |
//! | `row` | one row, and how it stands in CSV |
//! | `write` | [`ArrivalsWriter`] |
//! | `read` | [`ArrivalsReader`], [`read_json`] |
//! | `gather` | rows made into captures |
//! | `error` | what can be wrong, and its words |

mod capture_arrivals;
mod error;
mod gather;
mod read;
mod row;
mod write;

pub use capture_arrivals::{AntennaArrival, CaptureArrivals};
pub use error::{ArrivalsTableError, TableMistake, TablePlace};
pub use read::{ArrivalsReader, read_json, read_json_file};
pub use write::ArrivalsWriter;

#[cfg(test)]
mod tests;
