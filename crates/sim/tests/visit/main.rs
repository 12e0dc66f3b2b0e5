//! Checks of whole simulated visits.

mod bay;
mod draws;
mod mistakes;
mod physics;
mod recording;
