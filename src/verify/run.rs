//! Running built programs as children: a fault in one cannot take this program along.
//!
//! While a child runs, requests to stop are the child's business: it writes its checkpoint, and this program waits for it.

use std::ffi::OsString;
use std::path::Path;
use std::process::{Command, ExitStatus, Stdio};

use super::toolchain::ToolError;

/// How a child ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ending {
    /// With an exit status, whose meaning is the child's.
    Status(i32),
    /// By a signal: it crashed, or somebody killed it.
    Signal(i32),
}

/// A child's ending and all that it wrote.
#[derive(Clone, Debug)]
pub struct Captured {
    pub ending: Ending,
    pub output: String,
    pub errors: String,
}

/// Runs a program with this program's input, output and errors, and hands requests to stop on to it.
///
/// # Errors
/// It cannot be started.
pub fn attached(program: &Path, arguments: &[OsString]) -> Result<Ending, ToolError> {
    let forwarding = stop::Forwarding::begin();
    let start =
        |reason: std::io::Error| ToolError::Start { program: program.to_owned(), reason: reason.to_string() };
    let mut child = Command::new(program).args(arguments).spawn().map_err(start)?;
    forwarding.to(child.id());
    let status = child.wait().map_err(start)?;
    drop(forwarding);
    Ok(ending(status))
}

/// Runs a program in a folder, without input, and keeps what it writes.
///
/// # Errors
/// It cannot be started.
pub fn captured(program: &Path, arguments: &[OsString], folder: &Path) -> Result<Captured, ToolError> {
    let mut command = Command::new(program);
    let output = command
        .args(arguments)
        .current_dir(folder)
        .stdin(Stdio::null())
        .output()
        .map_err(|reason| ToolError::Start { program: program.to_owned(), reason: reason.to_string() })?;
    Ok(Captured {
        ending: ending(output.status),
        output: String::from_utf8_lossy(&output.stdout).into_owned(),
        errors: String::from_utf8_lossy(&output.stderr).into_owned(),
    })
}

#[cfg(unix)]
fn ending(status: ExitStatus) -> Ending {
    use std::os::unix::process::ExitStatusExt;
    match (status.code(), status.signal()) {
        (Some(code), _) => Ending::Status(code),
        (None, signal) => Ending::Signal(signal.unwrap_or_default()),
    }
}

#[cfg(not(unix))]
fn ending(status: ExitStatus) -> Ending {
    Ending::Status(status.code().unwrap_or(1))
}

#[cfg(unix)]
mod stop {
    use std::sync::atomic::{AtomicI32, Ordering};

    /// The child that requests go to; 0: none yet.
    static CHILD: AtomicI32 = AtomicI32::new(0);
    /// A request that came before the child was there.
    static EARLY: AtomicI32 = AtomicI32::new(0);

    const REQUESTS: [libc::c_int; 2] = [libc::SIGINT, libc::SIGTERM];

    /// While it lives, SIGINT and SIGTERM do not end this program. The child gets them: from the terminal directly, as it is
    /// in the same group, else from here. A driver takes the same request twice for one.
    pub struct Forwarding {
        former: Vec<(libc::c_int, libc::sigaction)>,
    }

    extern "C" fn forward(number: libc::c_int) {
        let child = CHILD.load(Ordering::SeqCst);
        if child > 0 {
            // SAFETY: `kill` may be called from a handler; the child has not been waited for while its number stands here.
            unsafe { libc::kill(child, number) };
        } else {
            EARLY.store(number, Ordering::SeqCst);
        }
    }

    impl Forwarding {
        pub fn begin() -> Forwarding {
            EARLY.store(0, Ordering::SeqCst);
            let mut former = Vec::new();
            for number in REQUESTS {
                // SAFETY: a zeroed `sigaction` is a valid value; the handler only uses what handlers may use.
                unsafe {
                    let mut action: libc::sigaction = std::mem::zeroed();
                    let mut old: libc::sigaction = std::mem::zeroed();
                    action.sa_sigaction = forward as extern "C" fn(libc::c_int) as libc::sighandler_t;
                    action.sa_flags = libc::SA_RESTART;
                    libc::sigemptyset(&mut action.sa_mask);
                    if libc::sigaction(number, &action, &mut old) == 0 {
                        former.push((number, old));
                    }
                }
            }
            Forwarding { former }
        }

        /// Names the child, and hands on what came before it was there.
        pub fn to(&self, child: u32) {
            CHILD.store(i32::try_from(child).unwrap_or(0), Ordering::SeqCst);
            let early = EARLY.swap(0, Ordering::SeqCst);
            if early != 0 {
                forward(early);
            }
        }
    }

    impl Drop for Forwarding {
        fn drop(&mut self) {
            CHILD.store(0, Ordering::SeqCst);
            for (number, old) in &self.former {
                // SAFETY: `old` is what `sigaction` gave for that signal.
                unsafe { libc::sigaction(*number, old, std::ptr::null_mut()) };
            }
        }
    }
}

#[cfg(not(unix))]
mod stop {
    pub struct Forwarding;

    impl Forwarding {
        pub fn begin() -> Forwarding {
            Forwarding
        }

        pub fn to(&self, _child: u32) {}
    }
}

#[cfg(all(test, unix))]
mod tests {
    use super::*;

    fn shell(script: &str) -> Vec<OsString> {
        ["-c", script].map(OsString::from).to_vec()
    }

    #[test]
    fn endings_are_told_apart() {
        let sh = Path::new("/bin/sh");
        let run = |script: &str| captured(sh, &shell(script), Path::new("/")).expect("a shell");
        let three = run("echo out; echo err >&2; exit 3");
        assert_eq!(
            (three.ending, three.output.as_str(), three.errors.as_str()),
            (Ending::Status(3), "out\n", "err\n")
        );
        assert_eq!(run("kill -9 $$").ending, Ending::Signal(9));
        let missing =
            captured(Path::new("/no/such/program"), &[], Path::new("/")).expect_err("there is none");
        assert!(matches!(missing, ToolError::Start { .. }));
    }

    #[test]
    fn a_request_to_stop_reaches_the_child() {
        // The child asks its parent, this program, to stop, and ends as soon as that comes back.
        let script = "trap 'exit 42' TERM; kill -TERM $PPID; while :; do :; done";
        assert_eq!(attached(Path::new("/bin/sh"), &shell(script)).expect("a shell"), Ending::Status(42));
    }
}
