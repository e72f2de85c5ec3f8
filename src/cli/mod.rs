//! The command line.

pub mod explain;
pub mod format;

/// Runs the program and returns its exit status.
pub fn main() -> std::process::ExitCode {
    std::process::ExitCode::SUCCESS
}
