//! `rimstone run`.

use std::ffi::OsString;
use std::path::PathBuf;

use clap::{Args, ValueEnum};

use crate::pipeline::emission::{self, Engine};
use crate::verify::run::Ending as Child;
use crate::verify::toolchain::{self, ToolError};

use super::{Ending, complain, model};

const EXAMPLES: &str = "\
Examples:
  rimstone run vault_wall.rim --out wall.run                   the model as written
  rimstone run vault_wall.rim --out fine --nodes x=257         a finer grid
  rimstone run vault_wall.rim --out warm --set h=12            another constant, in its unit
  rimstone run vault_wall.rim --out wall.run --resume          go on after Ctrl-C
  rimstone run vault_wall.rim --target rust --until 3600       an earlier end

Without --target the fastest is taken that this machine can build: C, else Rust, else in process.
All give the same bits. The folder's path is printed on standard output.
Exit status: 0 done, 1 faulty model or arguments, 2 the environment failed, 3 blew up,
130 interrupted.";

/// What a run may be built with.
#[derive(Clone, Copy, PartialEq, Eq, ValueEnum)]
enum Chosen {
    C,
    Rust,
    Builtin,
}

/// Words of the command. What the program itself reads is handed on as it is: it tells all its faults at once.
#[derive(Args)]
#[command(after_help = EXAMPLES)]
pub(super) struct Arguments {
    /// Model file
    #[arg(value_name = "MODEL")]
    model: PathBuf,
    /// What carries the run out [default: the fastest that this machine can build]
    #[arg(long)]
    target: Option<Chosen>,
    /// C compiler, with its first arguments [default: $CC, cc, gcc or clang]
    #[arg(long, value_name = "COMMAND")]
    cc: Option<String>,
    /// Folder of results, new or empty [default: NAME.run]
    #[arg(long, value_name = "DIR")]
    out: Option<OsString>,
    /// Sets a constant, in its unit in the model; may be repeated
    #[arg(long, value_name = "NAME=VALUE", allow_hyphen_values = true)]
    set: Vec<OsString>,
    /// Number of nodes along an axis; may be repeated
    #[arg(long, value_name = "AXIS=N", allow_hyphen_values = true)]
    nodes: Vec<OsString>,
    /// Last time, in seconds
    #[arg(long, value_name = "T", allow_hyphen_values = true)]
    until: Option<OsString>,
    /// Threads [default: as many as the machine has]
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    threads: Option<OsString>,
    /// Exactly N steps; only the first and the last state are written
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    steps: Option<OsString>,
    /// Goes on from the checkpoint in the folder, to the same last bit
    #[arg(long)]
    resume: bool,
    /// No progress on standard error
    #[arg(long)]
    quiet: bool,
}

impl Arguments {
    /// In the words of a runnable program.
    fn handed_on(&self) -> Vec<OsString> {
        let mut words = Vec::new();
        let single = [
            ("--out", &self.out),
            ("--until", &self.until),
            ("--threads", &self.threads),
            ("--steps", &self.steps),
        ];
        let repeated = [("--set", &self.set), ("--nodes", &self.nodes)];
        let given =
            single.into_iter().flat_map(|(option, value)| value.iter().map(move |value| (option, value)));
        let given = given.chain(
            repeated.into_iter().flat_map(|(option, values)| values.iter().map(move |value| (option, value))),
        );
        given.for_each(|(option, value)| words.extend([OsString::from(option), value.clone()]));
        let switches = [("--resume", self.resume), ("--quiet", self.quiet)];
        words.extend(switches.into_iter().filter(|(_, on)| *on).map(|(option, _)| OsString::from(option)));
        words
    }

    fn engine(&self) -> Result<Engine, ToolError> {
        match self.target {
            Some(Chosen::C) => toolchain::find_c(self.cc.as_deref()).map(Engine::C),
            Some(Chosen::Rust) => toolchain::find_rust().map(Engine::Rust),
            Some(Chosen::Builtin) => Ok(Engine::Builtin),
            // Who names a compiler wants that one, or a reason.
            None if self.cc.is_some() => toolchain::find_c(self.cc.as_deref()).map(Engine::C),
            None => Ok(Engine::fastest()),
        }
    }
}

pub(super) fn run(arguments: &Arguments) -> Ending {
    match attempt(arguments) {
        Ok(ending) | Err(ending) => ending,
    }
}

fn attempt(arguments: &Arguments) -> Result<Ending, Ending> {
    let source = model::read(&arguments.model)?;
    let compiled = model::compiled(&source)?;
    let engine = arguments.engine().map_err(environment)?;
    let child = emission::run(&compiled, &source, &engine, &arguments.handed_on()).map_err(environment)?;
    Ok(match child {
        Child::Status(status) => ending(status),
        Child::Signal(number @ (2 | 15)) => {
            complain(&format!("rimstone: the run was stopped by signal {number}\n"));
            Ending::Interrupted
        }
        Child::Signal(number) => {
            complain(&format!(
                "rimstone: the run was ended by signal {number}; 9 often means too little memory, others a fault of the emitted program: please report it with the model\n"
            ));
            Ending::Environment
        }
    })
}

/// A runnable program ends with the statuses of this one.
fn ending(status: i32) -> Ending {
    match status {
        0 => Ending::Done,
        1 => Ending::Faults,
        3 => Ending::BlewUp,
        130 => Ending::Interrupted,
        _ => Ending::Environment,
    }
}

fn environment(fault: ToolError) -> Ending {
    complain(&format!("rimstone: {fault}\n  {}\n", fault.hint()));
    Ending::Environment
}
