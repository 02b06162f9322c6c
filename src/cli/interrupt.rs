//! Ctrl-C, and a wish of the system to end, as a flag that somebody looks at.

use std::sync::Arc;
use std::sync::atomic::AtomicBool;

/// A flag that is set when somebody presses Ctrl-C, ends the program, or closes its terminal. A second Ctrl-C ends it at
/// once. Where the system has no such signals, or they cannot be caught, Ctrl-C ends the program as always.
pub(super) fn flag() -> Arc<AtomicBool> {
    let flag = Arc::new(AtomicBool::new(false));
    #[cfg(unix)]
    {
        use signal_hook::consts::{SIGHUP, SIGINT, SIGTERM};
        // In this order: the first Ctrl-C finds the flag unset.
        let _ = signal_hook::flag::register_conditional_shutdown(SIGINT, 130, Arc::clone(&flag));
        for signal in [SIGINT, SIGTERM, SIGHUP] {
            let _ = signal_hook::flag::register(signal, Arc::clone(&flag));
        }
    }
    flag
}
