//! Captures, and the arrival time of a radio pulse on every channel.

mod capture;
mod channel_times;

pub use capture::{Capture, CaptureError};
pub use channel_times::{ChannelFlags, ChannelTime, ChannelTimes};
