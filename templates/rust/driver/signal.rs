//! Interruption: the first request stops the run in good order, the second falls through to the system.

use super::Observer;
use std::sync::atomic::{AtomicBool, Ordering};

static ASKED: AtomicBool = AtomicBool::new(false);

/// Goes on until SIGINT or SIGTERM came.
pub struct UntilAsked;

impl Observer for UntilAsked {
    fn goes_on(&mut self, _step: u64) -> bool {
        !ASKED.load(Ordering::Relaxed)
    }
}

#[cfg(unix)]
mod system {
    use super::{ASKED, Ordering};
    use std::ffi::c_int;

    unsafe extern "C" {
        fn signal(number: c_int, action: usize) -> usize;
    }

    const HANG_ON: [c_int; 2] = [2, 15];
    const DEFAULT: usize = 0;
    const IGNORE: usize = 1;
    /// A file that grows beyond a limit: the failed write is reported, the signal would end the run.
    #[cfg(target_os = "linux")]
    const TOO_LARGE: c_int = if cfg!(any(target_arch = "mips", target_arch = "mips64")) { 31 } else { 25 };
    #[cfg(not(target_os = "linux"))]
    const TOO_LARGE: c_int = 25;

    extern "C" fn ask_to_stop(number: c_int) {
        ASKED.store(true, Ordering::Relaxed);
        // SAFETY: `signal` may be called from a handler; the arguments are a signal of this system and SIG_DFL.
        unsafe { signal(number, DEFAULT) };
    }

    pub fn catch() {
        let handler = ask_to_stop as extern "C" fn(c_int) as usize;
        for number in HANG_ON {
            // SAFETY: the handler stores to an atomic and calls `signal`, both allowed in handlers.
            unsafe { signal(number, handler) };
        }
        // SAFETY: SIG_IGN needs no handler.
        unsafe { signal(TOO_LARGE, IGNORE) };
    }
}

#[cfg(not(unix))]
mod system {
    pub fn catch() {}
}

/// From here on SIGINT and SIGTERM only ask.
pub fn catch() {
    ASKED.store(false, Ordering::Relaxed);
    system::catch();
}
