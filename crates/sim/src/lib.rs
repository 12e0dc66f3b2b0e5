//! A measuring visit that has not happened: pulses, travel, antennas, noise and recorder, all from one seed.
//!
//! [`Visit`] takes a [`Site`](arcstead_solver::Site) and [`VisitSettings`], draws what is wrong with the measuring
//! chain once, and makes the captures one by one, in any order. [`Truth`] tells what a measurement is not told.
//! [`draw_arrivals`] and [`SystematicErrors`] give times of arrival without samples, for statistics.
//!
//! The arrival of a pulse at a channel is the instant before which nothing of it is there:
//! `emission + L/v + delay`, L the [first way](first_way), delay the chain's own with its errors. It is the same
//! instant on every channel, so differences of arrivals are exact, and the causal responses of antenna and recorder,
//! alike on all channels but for small ripples, drop out of them.
//!
//! Conventions: SI units; coordinates in metres, x east, y north, z up, the ground at z = 0; voltages are of
//! arbitrary scale. This crate knows physics only: neither files, nor how an arrival or a position is found.
//!
//! | module | holds |
//! |---|---|
//! | `settings` | what is asked of a visit, and its defaults |
//! | `pulse` | the pulse of a discharge |
//! | `travel`, `knife_edge`, `reflection` | its ways to an antenna |
//! | `antenna`, `butterworth`, `recorder` | what antennas and recorder make of it |
//! | `carrier` | transmitters that disturb |
//! | `systematic`, `schedule`, `truth` | what is drawn once |
//! | `chain`, `visit` | all of it together |

mod antenna;
mod butterworth;
mod carrier;
mod chain;
mod error;
mod knife_edge;
mod pulse;
mod recorder;
mod reflection;
mod schedule;
mod settings;
mod systematic;
mod travel;
mod truth;
mod visit;

pub use antenna::Ripple;
pub use carrier::CarrierSetting;
pub use error::SimError;
pub use knife_edge::{knife_edge_loss_db, knife_edge_nu};
pub use pulse::PulseSetting;
pub use reflection::{Scatterer, ground_way_m};
pub use settings::{RecorderSetting, SourceSetting, VisitSettings};
pub use systematic::{SystematicErrors, draw_arrivals, with_timing_noise};
pub use travel::{Way, first_way};
pub use truth::{TrueCapture, TrueSource, Truth};
pub use visit::{Visit, VisitWorker};
