//! Ctrl-C: long work stops after the points in flight, and what is done is kept.

use std::sync::atomic::{AtomicBool, Ordering};

static ASKED: AtomicBool = AtomicBool::new(false);

/// From now on the first Ctrl-C (or request to terminate) asks the work to stop, and the second ends the process at once.
pub fn listen() {
    // Where no handler can be set, Ctrl-C ends the process as ever, and what is saved is saved.
    let _ = ctrlc::set_handler(|| {
        if ASKED.swap(true, Ordering::SeqCst) {
            std::process::exit(i32::from(crate::error::INTERRUPTED));
        }
    });
}

/// Whether the work was asked to stop.
pub fn asked() -> bool {
    ASKED.load(Ordering::SeqCst)
}
