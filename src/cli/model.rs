//! What every command that takes a model has in common: reading it, compiling it, showing what was said about it.

use std::io::ErrorKind;
use std::path::Path;

use crate::diagnostic::terminal::{Colour, render};
use crate::diagnostic::{Diagnostics, Severity};
use crate::pipeline::{self, Compiled, Overrides};
use crate::source::SourceFile;

use super::{Ending, complain};

/// The file, or a message and how the command ends: a wrong name is a fault of the arguments, the rest is the environment's.
pub(super) fn read(path: &Path) -> Result<SourceFile, Ending> {
    pipeline::read(path).map_err(|reason| {
        complain(&format!("rimstone: cannot read '{}': {reason}\n", path.display()));
        match reason.kind() {
            ErrorKind::NotFound | ErrorKind::IsADirectory => Ending::Faults,
            _ => Ending::Environment,
        }
    })
}

/// Shows faults and warnings on standard error.
pub(super) fn show(diagnostics: &Diagnostics, source: &SourceFile) {
    complain(&render(diagnostics, source, Colour::for_standard_error()));
}

/// The compiled model, with its warnings shown; or its faults shown.
pub(super) fn compiled(source: &SourceFile) -> Result<Compiled, Ending> {
    match pipeline::compile(source, &Overrides::default()) {
        Ok((compiled, warnings)) => {
            show(&warnings, source);
            Ok(compiled)
        }
        Err(faults) => {
            show(&faults, source);
            Err(Ending::Faults)
        }
    }
}

/// How many are warnings.
pub(super) fn warnings(diagnostics: &Diagnostics) -> usize {
    diagnostics.iter().filter(|diagnostic| diagnostic.severity == Severity::Warning).count()
}
