//! `rimstone format MODEL`: a model file in canonical layout.

use std::io::{ErrorKind, Write};
use std::path::{Path, PathBuf};
use std::process::ExitCode;

use crate::diagnostic::terminal::{Colour, render};
use crate::source::SourceFile;
use crate::syntax;

/// Lays a model file out: symbols for control words, spaces, columns; comments are kept.
#[derive(clap::Args, Debug)]
#[command(
    after_help = "Examples:\n  rimstone format wall.rim            print it\n  rimstone format --check *.rim       say which are not in layout\n  rimstone format --write wall.rim    lay it out in place"
)]
pub struct Arguments {
    /// Model files
    #[arg(required = true)]
    models: Vec<PathBuf>,
    /// Say which files are not in layout, and change nothing; status 1 if there is one
    #[arg(long, conflicts_with = "write")]
    check: bool,
    /// Replace the files
    #[arg(long)]
    write: bool,
}

/// How a file fared; the worst decides the exit status.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
enum Outcome {
    Done,
    /// The model has faults, or is not in layout.
    Fault,
    /// The file cannot be read or written.
    Environment,
}

/// Formats each file: 0 done, 1 a model has faults or is not in layout, 2 a file cannot be read or written.
pub fn run(arguments: Arguments) -> ExitCode {
    let outcomes = arguments.models.iter().map(|path| format_file(path, &arguments));
    match outcomes.max().unwrap_or(Outcome::Done) {
        Outcome::Done => ExitCode::SUCCESS,
        Outcome::Fault => ExitCode::from(1),
        Outcome::Environment => ExitCode::from(2),
    }
}

fn format_file(path: &Path, arguments: &Arguments) -> Outcome {
    let bytes = match std::fs::read(path) {
        Ok(bytes) => bytes,
        Err(error) => {
            eprintln!("error: cannot read {}: {error}", path.display());
            return Outcome::Environment;
        }
    };
    let source = SourceFile::from_bytes(path.display().to_string(), bytes);
    let formatted = match syntax::format(&source) {
        Ok(formatted) => formatted,
        Err(diagnostics) => {
            eprint!("{}", render(&diagnostics, &source, Colour::for_standard_error()));
            return Outcome::Fault;
        }
    };
    if arguments.check {
        if formatted == source.text() {
            return Outcome::Done;
        }
        println!("{}", path.display());
        return Outcome::Fault;
    }
    let written = if !arguments.write {
        std::io::stdout().write_all(formatted.as_bytes())
    } else if formatted == source.text() {
        Ok(())
    } else {
        replace(path, &formatted)
    };
    match written {
        Ok(()) => Outcome::Done,
        // A reader that has seen enough and left.
        Err(error) if !arguments.write && error.kind() == ErrorKind::BrokenPipe => Outcome::Done,
        Err(error) => {
            eprintln!("error: cannot write {}: {error}", path.display());
            Outcome::Environment
        }
    }
}

/// Replaces a file's text: all of it or none. The file keeps its permissions.
fn replace(path: &Path, text: &str) -> std::io::Result<()> {
    // A link is followed, so that the file it leads to is replaced and not the link.
    let path = path.canonicalize()?;
    let folder = path.parent().unwrap_or(Path::new("."));
    let mut file = tempfile::NamedTempFile::new_in(folder)?;
    file.write_all(text.as_bytes())?;
    file.as_file().set_permissions(std::fs::metadata(&path)?.permissions())?;
    file.as_file().sync_all()?;
    file.persist(&path).map_err(|error| error.error)?;
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_file_is_replaced_only_when_it_can_be_read() {
        let folder = tempfile::tempdir().expect("a folder for the test");
        let path = folder.path().join("wall.rim");
        let arguments = |write: bool| Arguments { models: vec![path.clone()], check: !write, write };
        std::fs::write(&path, "model wall\naxes\n x:0 to 1 ,  11 nodes\n").expect("a file for the test");
        assert_eq!(format_file(&path, &arguments(false)), Outcome::Fault);
        assert_eq!(format_file(&path, &arguments(true)), Outcome::Done);
        assert_eq!(
            std::fs::read_to_string(&path).expect("it is there"),
            "model wall\naxes\n  x: 0 to 1, 11 nodes\n"
        );
        assert_eq!(format_file(&path, &arguments(false)), Outcome::Done);
        std::fs::write(&path, "model wall\naxes\n x: (\n").expect("a file for the test");
        assert_eq!(format_file(&path, &arguments(true)), Outcome::Fault);
        assert_eq!(std::fs::read_to_string(&path).expect("it is there"), "model wall\naxes\n x: (\n");
        assert_eq!(std::fs::read_dir(folder.path()).expect("it is there").count(), 1);
        let absent = folder.path().join("absent.rim");
        assert_eq!(format_file(&absent, &arguments(true)), Outcome::Environment);
    }
}
