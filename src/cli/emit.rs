//! `rimstone emit`.

use std::path::PathBuf;

use clap::{Args, ValueEnum};

use crate::emit::{Form, Language, Target};
use crate::pipeline::emission;
use crate::verify::package::{self, Refused};

use super::{Ending, complain, model, print};

const EXAMPLES: &str = "\
Examples:
  rimstone emit vault_wall.rim --target c --out wall             a C program; make -C wall
  rimstone emit vault_wall.rim --target rust --out wall          a Rust program
  rimstone emit vault_wall.rim --target c --library --out wall   the kernel alone, to call yourself

The folder must be new or empty, or hold an emitted package that nobody changed.
Same model, same bytes. The emitted text is yours. The files are listed on standard output.";

/// Languages that are emitted.
#[derive(Clone, Copy, PartialEq, Eq, ValueEnum)]
enum Written {
    C,
    Rust,
}

/// Words of the command.
#[derive(Args)]
#[command(after_help = EXAMPLES)]
pub(super) struct Arguments {
    /// Model file
    #[arg(value_name = "MODEL")]
    model: PathBuf,
    /// Language of the program
    #[arg(long)]
    target: Written,
    /// Folder for the files
    #[arg(long, value_name = "DIR")]
    out: PathBuf,
    /// The kernel and its interface, without a command-line program around it
    #[arg(long)]
    library: bool,
}

pub(super) fn run(arguments: &Arguments) -> Ending {
    match emit(arguments) {
        Ok(ending) | Err(ending) => ending,
    }
}

fn emit(arguments: &Arguments) -> Result<Ending, Ending> {
    let source = model::read(&arguments.model)?;
    let compiled = model::compiled(&source)?;
    let language = match arguments.target {
        Written::C => Language::C,
        Written::Rust => Language::Rust,
    };
    let form = if arguments.library { Form::Library } else { Form::Program };
    let program = emission::emit(&compiled, &source, Target { language, form });
    let written = package::place(&arguments.out, &program.files).map_err(|refused| {
        complain(&format!("rimstone: {refused}\n"));
        match refused {
            Refused::Environment(_) => Ending::Environment,
            Refused::Foreign { .. } | Refused::File(_) => Ending::Faults,
        }
    })?;
    Ok(print(&written.iter().map(|path| format!("{}\n", path.display())).collect::<String>()))
}
