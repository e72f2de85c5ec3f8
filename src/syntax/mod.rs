//! The front end of the model language: text → tree with spans.
//!
//! In order: `fold` (one spelling), `cut` (statements), `scan` (bounds and slips in tokens), `parse` (the grammar;
//! statements → [`tree`]). [`print`] writes formulas, [`format`] whole files. Which names exist and which units fit
//! is `check`'s business.

pub mod control;
mod cut;
mod fold;
pub mod format;
pub mod names;
mod parse;
pub mod print;
mod scan;
pub mod tree;

use crate::diagnostic::{Diagnostic, Diagnostics, codes};
use crate::source::{SourceFault, SourceFile, Span};
pub use format::format;
pub use print::print_expression;
use tree::ModelFile;

/// Stack on which text is read and trees are walked; ample for the bounds on nesting even without optimisation.
const STACK: usize = 64 << 20;

/// Reads a model file.
///
/// All faults of the text come at once. The tree holds every statement that could be read; the others are in
/// [`ModelFile::faulty`], so that a checker can go on and report what else is wrong.
pub fn parse(source: &SourceFile) -> (ModelFile, Diagnostics) {
    on_ample_stack(|| parse_here(source))
}

/// Runs a function on a thread with a stack that is ample for any tree the parser makes; on this thread if no
/// other can be had.
pub fn on_ample_stack<T: Send>(work: impl Fn() -> T + Send + Sync) -> T {
    let elsewhere = std::thread::scope(|scope| {
        let thread = std::thread::Builder::new().stack_size(STACK).spawn_scoped(scope, &work).ok()?;
        match thread.join() {
            Ok(result) => Some(result),
            Err(panic) => std::panic::resume_unwind(panic),
        }
    });
    elsewhere.unwrap_or_else(work)
}

fn parse_here(source: &SourceFile) -> (ModelFile, Diagnostics) {
    let mut diagnostics = Diagnostics::new();
    if let Some(fault) = source.fault() {
        diagnostics.push(unreadable(fault));
        return (ModelFile::default(), diagnostics);
    }
    let folded = fold::fold(source.text(), &mut diagnostics);
    let cut = cut::cut(&folded, &mut diagnostics);
    let file = parse::read(source, &folded, cut, &mut diagnostics);
    (file, diagnostics)
}

fn unreadable(fault: &SourceFault) -> Diagnostic {
    let (code, remedy) = match fault {
        SourceFault::NotUtf8 { .. } => (codes::NOT_UTF8, "save the file as UTF-8"),
        SourceFault::TooLarge(_) => {
            (codes::TOO_LARGE, "put data into files of their own and read them with `from`")
        }
    };
    Diagnostic::error(code, Span::default(), fault.to_string()).with_remedy(remedy)
}
