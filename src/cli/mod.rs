//! The command line: one file a command; each reads its words, calls the pipeline and writes.
//!
//! Only this module knows clap, standard output and exit statuses.

mod weights;

use std::io::{ErrorKind, Write};
use std::process::ExitCode;

use clap::{Parser, Subcommand};

/// How a command ended; the number is the exit status.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Ending {
    /// Done.
    Done = 0,
    /// The model or the arguments have faults.
    Faults = 1,
    /// The environment failed: no permission, disk full, no compiler.
    Environment = 2,
}

/// From one page of model equation to a solver that can be trusted.
#[derive(Parser)]
#[command(name = "rimstone", version, max_term_width = 100)]
struct Program {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    /// Finite-difference weights for any nodes, exactly, with their order and error
    Weights(weights::Arguments),
}

/// Runs the program and returns its exit status.
pub fn main() -> ExitCode {
    let ending = match Program::try_parse() {
        Ok(program) => match program.command {
            Command::Weights(arguments) => weights::run(&arguments),
        },
        Err(answer) if answer.use_stderr() => {
            // Nothing is left to be done where even standard error is gone.
            let _ = answer.print();
            Ending::Faults
        }
        Err(help) => print(&help.render().to_string()),
    };
    ExitCode::from(ending as u8)
}

/// Writes a result to standard output. A reader that has seen enough and left is no fault.
fn print(text: &str) -> Ending {
    let mut output = std::io::stdout().lock();
    match output.write_all(text.as_bytes()).and_then(|()| output.flush()) {
        Ok(()) => Ending::Done,
        Err(fault) if fault.kind() == ErrorKind::BrokenPipe => Ending::Done,
        Err(fault) => {
            complain(&format!("standard output cannot be written: {fault}\n"));
            Ending::Environment
        }
    }
}

/// Writes to standard error; there is no one to tell if that fails.
fn complain(text: &str) {
    let _ = std::io::stderr().lock().write_all(text.as_bytes());
}
