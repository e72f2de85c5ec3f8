//! The front end as a whole: files that must be read, slips that must be named, text that must not harm.

use rimstone::diagnostic::terminal::{Colour, render};
use rimstone::source::SourceFile;
use rimstone::syntax;

#[test]
fn look() {
    for path in std::env::var("LOOK").unwrap().split(':') {
        let source = SourceFile::from_bytes(path, std::fs::read(path).unwrap());
        let (file, faults) = syntax::parse(&source);
        println!("{}\n{}", render(&faults, &source, Colour::Plain), file.faulty.len());
        if std::env::var("TREE").is_ok() { println!("{file:#?}"); }
    }
}
