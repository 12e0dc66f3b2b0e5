//! Ctrl-C: the first asks the work to stop, the second ends the process.

use std::sync::Once;
use std::sync::atomic::{AtomicBool, Ordering};

use crate::status;

// A signal comes to the process, not to a run: this is the one state that the process shares.
static ASKED: AtomicBool = AtomicBool::new(false);
static CATCHING: Once = Once::new();

/// Catches Ctrl-C from now on. Where that is not possible Ctrl-C ends the process as if nothing were caught.
pub(crate) fn catch() {
    CATCHING.call_once(|| {
        // A handler that somebody else has set stays: then stopping is theirs.
        let _ = ctrlc::try_set_handler(|| {
            if ASKED.swap(true, Ordering::SeqCst) {
                std::process::exit(i32::from(status::INTERRUPTED));
            }
        });
    });
}

/// Whether Ctrl-C was pressed.
pub(crate) fn asked() -> bool {
    ASKED.load(Ordering::Relaxed)
}
