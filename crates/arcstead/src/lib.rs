//! Finds which insulator, bushing or arrester is discharging, from the times at which its radio pulse reaches several
//! antennas.
//!
//! The way of the data, walked once, downhill:
//!
//! ```text
//! capture file -> Capture -> ChannelTimes -> CaptureArrivals -> Arrivals -> Fix -> LocateDocument
//!  (formats)      (core)       (core)           (timer)         (solver)  (solver)   (locate)
//! ```
//!
//! [`site::Site`] is what is known of the place, [`Visit`] the captures of it, [`TimedVisit`] their arrival times, and
//! [`locate()`] tells the source. Samples and positions never meet: this crate turns channels into antennas and
//! subtracts delays, and is the only one that knows both [`core`] and [`solver`].
//!
//! Units are SI inside and in names; times count from the first sample of a capture; site coordinates are local,
//! right-handed, in metres (x east, y north, z up).

pub mod arrivals_table;
mod capture_time;
mod cautions;
pub mod documents;
mod error_chain;
pub mod formats;
mod inspect;
mod locate;
mod provenance;
pub mod site;
mod timer;
mod visit;
pub mod whole_file;

pub use arcstead_core as core;
pub use arcstead_solver as solver;
pub use capture_time::{CaptureTime, CaptureTimeError};
pub use inspect::inspect;
pub use locate::{LocateOptions, locate};
pub use provenance::{arrivals_head, method_name};
pub use timer::{ArrivalOptions, CaptureTimer, TimerError};
pub use visit::{TimedVisit, Unwatched, Visit, VisitError, Watch};
