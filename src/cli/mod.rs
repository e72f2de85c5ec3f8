//! The command line: one file a command; each reads its words, calls the pipeline and writes.
//!
//! Only this module knows clap, standard output and exit statuses.

mod check;
mod emit;
mod explain;
mod format;
mod model;
mod run;
mod weights;

use std::io::{ErrorKind, Write};
use std::panic::{self, PanicHookInfo};
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
    /// The computation blew up.
    BlewUp = 3,
    /// Stopped on request.
    Interrupted = 130,
}

impl Ending {
    /// The worse of two: the environment's failure hides faults, and these hide success.
    fn or(self, other: Ending) -> Ending {
        if other as u8 > self as u8 { other } else { self }
    }
}

const EXAMPLES: &str = "\
Examples:
  rimstone check vault_wall.rim                        is the model sound?
  rimstone run vault_wall.rim --out wall.run           build and run it
  rimstone emit vault_wall.rim --target c --out wall   the program's text
  rimstone weights --derivative 2 --order 4            finite-difference weights, no model needed
`rimstone COMMAND --help` has more.

Exit status: 0 done, 1 the model or the arguments have faults, 2 the environment failed,
3 the computation blew up, 130 interrupted.
Results go to standard output, everything else to standard error.";

/// From one page of model equation to a solver that can be trusted.
#[derive(Parser)]
#[command(name = "rimstone", version, max_term_width = 100, after_help = EXAMPLES)]
struct Program {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    /// Every fault and warning of models, each with its place and a remedy
    Check(check::Arguments),
    /// The text of a C or Rust program
    Emit(emit::Arguments),
    /// Builds a model's program and runs it, or runs in process
    Run(run::Arguments),
    /// Finite-difference weights for any nodes, exactly, with their order and error
    Weights(weights::Arguments),
    /// Model files in canonical layout
    Format(format::Arguments),
    /// A diagnostic in full; without a code, the list of all
    Explain(explain::Arguments),
}

impl From<Ending> for ExitCode {
    fn from(ending: Ending) -> ExitCode {
        ExitCode::from(ending as u8)
    }
}

/// Runs the program and returns its exit status.
pub fn main() -> ExitCode {
    panic::set_hook(Box::new(|information| complain(&confession(information))));
    // The hook has said everything.
    panic::catch_unwind(obey).unwrap_or_else(|_| Ending::Environment.into())
}

fn obey() -> ExitCode {
    match Program::try_parse() {
        Ok(program) => match program.command {
            Command::Check(arguments) => check::run(&arguments).into(),
            Command::Emit(arguments) => emit::run(&arguments).into(),
            Command::Run(arguments) => run::run(&arguments).into(),
            Command::Weights(arguments) => weights::run(&arguments).into(),
            Command::Format(arguments) => format::run(arguments),
            Command::Explain(arguments) => explain::run(arguments),
        },
        Err(answer) if answer.use_stderr() => {
            // Nothing is left to be done where even standard error is gone.
            let _ = answer.print();
            Ending::Faults.into()
        }
        Err(help) => print(&help.render().to_string()).into(),
    }
}

/// What is said about a fault of this program's own.
fn confession(information: &PanicHookInfo<'_>) -> String {
    let payload = information.payload();
    let reason = payload
        .downcast_ref::<&str>()
        .copied()
        .or_else(|| payload.downcast_ref::<String>().map(String::as_str));
    let place = information
        .location()
        .map_or_else(String::new, |place| format!(" ({}:{})", place.file(), place.line()));
    format!(
        "rimstone: internal error: {}{place}\n  This is a fault of rimstone {}, not of your model. Please report it with the model and the command.\n",
        reason.unwrap_or("no reason given"),
        env!("CARGO_PKG_VERSION"),
    )
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
