//! `rimstone check`.

use std::path::PathBuf;

use clap::Args;

use crate::diagnostic::json;
use crate::pipeline;

use super::{Ending, model, print};

const EXAMPLES: &str = "\
Examples:
  rimstone check vault_wall.rim                 every fault, its place and a remedy
  rimstone check demo-models/*.rim              several models at once
  rimstone check vault_wall.rim --json          one JSON object a line, for editors and scripts
  rimstone check vault_wall.rim --warnings-as-errors

Exit status: 0 no faults, 1 faults, 2 a file cannot be read.
`rimstone explain CODE` tells more about a diagnostic.";

/// Words of the command.
#[derive(Args)]
#[command(after_help = EXAMPLES)]
pub(super) struct Arguments {
    /// Model files
    #[arg(value_name = "MODEL", required = true)]
    models: Vec<PathBuf>,
    /// One JSON object a line on standard output
    #[arg(long)]
    json: bool,
    /// Ends with status 1 where there are only warnings, too
    #[arg(long)]
    warnings_as_errors: bool,
}

pub(super) fn run(arguments: &Arguments) -> Ending {
    arguments.models.iter().fold(Ending::Done, |worst, path| worst.or(check(path, arguments)))
}

fn check(path: &std::path::Path, arguments: &Arguments) -> Ending {
    let source = match model::read(path) {
        Ok(source) => source,
        Err(ending) => return ending,
    };
    let diagnostics = pipeline::check(&source).diagnostics;
    let warnings = model::warnings(&diagnostics);
    let printed = if arguments.json {
        print(&json::render(&diagnostics, &source))
    } else {
        model::show(&diagnostics, &source);
        match (diagnostics.has_errors(), warnings) {
            (true, _) => Ending::Done,
            (false, 0) => print(&format!("{}: no faults\n", path.display())),
            (false, 1) => print(&format!("{}: no faults, 1 warning\n", path.display())),
            (false, many) => print(&format!("{}: no faults, {many} warnings\n", path.display())),
        }
    };
    let faulty = diagnostics.has_errors() || (arguments.warnings_as_errors && warnings > 0);
    printed.or(if faulty { Ending::Faults } else { Ending::Done })
}
