//! The run's folder: which one is accepted, which refused, and what to do then.

use super::Failure;
use super::file::cannot_write;
use std::fs;
use std::io::ErrorKind;
use std::path::Path;

/// Whether a run begins in the folder or goes on there.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Intent {
    Begin,
    GoOn,
}

/// Holds the folder to the intent, and makes it when it is not there.
pub fn accept(folder: &Path, intent: Intent) -> Result<(), Failure> {
    let shown = folder.display();
    let occupied = match fs::read_dir(folder) {
        Ok(mut entries) => entries.next().is_some(),
        Err(reason) if reason.kind() == ErrorKind::NotFound => false,
        Err(reason) if reason.kind() == ErrorKind::NotADirectory => {
            return Err(Failure::refused(format!("'{shown}' is a file, not a folder; choose another --out")));
        }
        Err(reason) => {
            return Err(Failure::Environment(format!(
                "cannot look into '{shown}': {reason}; choose another --out"
            )));
        }
    };
    let holds = |name: &str| folder.join(name).exists();
    Err(Failure::refused(match (intent, occupied) {
        (Intent::GoOn, false) => {
            format!("there is no run in '{shown}' to go on with; start one without --resume")
        }
        (Intent::Begin, false) => return make(folder),
        (Intent::GoOn, true) if holds("checkpoint.bin") || holds("checkpoint.old") => return Ok(()),
        (Intent::GoOn, true) => {
            let why = if holds("run.json") { ": its run has ended" } else { "" };
            format!("'{shown}' holds no checkpoint{why}; choose another --out for a new run")
        }
        (Intent::Begin, true) if holds("checkpoint.bin") => {
            format!("'{shown}' holds an unfinished run; go on with it by --resume, or choose another --out")
        }
        (Intent::Begin, true) if holds("run.json") => {
            format!("'{shown}' holds a run already; choose another --out, or remove that folder")
        }
        (Intent::Begin, true) => format!("'{shown}' holds something that is not a run; choose another --out"),
    }))
}

/// Makes a folder and the missing ones above it.
pub fn make(folder: &Path) -> Result<(), Failure> {
    fs::create_dir_all(folder).map_err(|reason| cannot_write(folder, &reason))
}

/// Letters, digits, `_` and `-` stay, any other character becomes `_`; a number makes it unique.
pub fn safe_name<'a>(name: &str, taken: impl Iterator<Item = &'a str> + Clone) -> String {
    let plain = |character: char| character.is_ascii_alphanumeric() || matches!(character, '_' | '-');
    let mut stem: String =
        name.chars().map(|character| if plain(character) { character } else { '_' }).collect();
    if stem.is_empty() {
        stem.push('_');
    }
    let mut unique = stem.clone();
    let mut number = 1;
    while taken.clone().any(|other| other == unique) {
        number += 1;
        unique = format!("{stem}_{number}");
    }
    unique
}
