//! The exit statuses of the program.

/// The work is done. That no source was found is a result, and ends so too.
pub const DONE: u8 = 0;
/// The work failed: no capture could be read, or the result could not be written.
pub const FAILED: u8 = 1;
/// The command line or the site file is wrong.
pub const USAGE: u8 = 2;
/// Stopped by Ctrl-C. What was read until then has been told, marked as incomplete.
pub const INTERRUPTED: u8 = 130;
