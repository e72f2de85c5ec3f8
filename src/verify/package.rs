//! Placing an emitted package in a folder: whole or not at all, and never over somebody's work.
//!
//! A list of checksums goes with the files. A folder that holds what its list says, and nothing else, is one that this
//! program wrote: it may be replaced.

use std::collections::BTreeSet;
use std::fmt;
use std::fs;
use std::io::ErrorKind;
use std::path::{Path, PathBuf};

use sha2::{Digest, Sha256};

use super::toolchain::{Files, ToolError, write_files};

/// The list of checksums, in the layout of the usual command for checking them.
pub const LIST: &str = "SHA256SUMS";

/// Why a package is not placed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Refused {
    /// The place holds something else; these are the first names of it.
    Foreign { folder: PathBuf, names: Vec<String> },
    /// The place is a file.
    File(PathBuf),
    /// The file system refuses.
    Environment(ToolError),
}

impl fmt::Display for Refused {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Refused::Foreign { folder, names } => {
                let names = names.join(", ");
                write!(
                    out,
                    "'{}' holds what was not emitted or was changed since ({names}): choose another --out",
                    folder.display()
                )
            }
            Refused::File(path) => {
                write!(out, "'{}' is a file, not a folder: choose another --out", path.display())
            }
            Refused::Environment(fault) => write!(out, "{fault}\n  {}", fault.hint()),
        }
    }
}

impl From<ToolError> for Refused {
    fn from(fault: ToolError) -> Refused {
        Refused::Environment(fault)
    }
}

/// Writes the package beside its place and renames it. Returns the paths written, in order, the list of checksums last.
///
/// # Errors
/// The place holds something that is not an unchanged package, or the file system refuses.
pub fn place(folder: &Path, files: &Files) -> Result<Vec<PathBuf>, Refused> {
    let replaced = look_at(folder)?;
    let parent = match folder.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent,
        _ => Path::new("."),
    };
    let failed = |path: &Path| {
        let path = path.to_owned();
        move |reason: std::io::Error| Refused::Environment(ToolError::folder(&path, &reason))
    };
    fs::create_dir_all(parent).map_err(failed(parent))?;
    let beside = tempfile::Builder::new().prefix(".emit-").tempdir_in(parent).map_err(failed(parent))?;
    let (fresh, former) = (beside.path().join("fresh"), beside.path().join("former"));
    // A folder made by hand has the usual permissions; a temporary one has not.
    fs::create_dir(&fresh).map_err(failed(&fresh))?;
    let mut complete = files.clone();
    complete.insert(LIST.to_owned(), list(files));
    write_files(&fresh, &complete)?;
    if replaced {
        fs::rename(folder, &former).map_err(failed(folder))?;
    }
    fs::rename(&fresh, folder).map_err(failed(folder))?;
    Ok(files.keys().map(String::as_str).chain([LIST]).map(|name| folder.join(name)).collect())
}

fn list(files: &Files) -> String {
    files.iter().map(|(name, text)| format!("{}  {name}\n", sum(text.as_bytes()))).collect()
}

fn sum(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|byte| format!("{byte:02x}")).collect()
}

/// Whether there is an unchanged package (or an empty folder) to replace.
fn look_at(folder: &Path) -> Result<bool, Refused> {
    match fs::metadata(folder) {
        Err(reason) if reason.kind() == ErrorKind::NotFound => return Ok(false),
        Err(reason) => return Err(ToolError::folder(folder, &reason).into()),
        Ok(entry) if !entry.is_dir() => return Err(Refused::File(folder.to_owned())),
        Ok(_) => {}
    }
    let present = names_below(folder).map_err(|reason| ToolError::folder(folder, &reason))?;
    let listed = fs::read_to_string(folder.join(LIST)).unwrap_or_default();
    let known: BTreeSet<(&str, &str)> = listed.lines().filter_map(|line| line.split_once("  ")).collect();
    let unchanged = |name: &str| {
        let now = fs::read(folder.join(name)).map(|bytes| sum(&bytes)).unwrap_or_default();
        name == LIST || known.contains(&(now.as_str(), name))
    };
    let foreign: Vec<String> = present.into_iter().filter(|name| !unchanged(name)).take(5).collect();
    if foreign.is_empty() {
        Ok(true)
    } else {
        Err(Refused::Foreign { folder: folder.to_owned(), names: foreign })
    }
}

/// Files below a folder, with `/`, in order.
fn names_below(folder: &Path) -> std::io::Result<BTreeSet<String>> {
    let mut names = BTreeSet::new();
    let mut open = vec![String::new()];
    while let Some(prefix) = open.pop() {
        for entry in fs::read_dir(folder.join(&prefix))? {
            let entry = entry?;
            let name = format!("{prefix}{}", entry.file_name().to_string_lossy());
            if entry.file_type()?.is_dir() {
                open.push(format!("{name}/"));
            } else {
                names.insert(name);
            }
        }
    }
    Ok(names)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn package(text: &str) -> Files {
        Files::from([("main.c".to_owned(), text.to_owned()), ("src/kernel.c".to_owned(), "k".to_owned())])
    }

    #[test]
    fn an_unchanged_package_is_replaced_and_anything_else_is_not() {
        let home = tempfile::tempdir().expect("a folder");
        let out = home.path().join("deep/wall");
        let written = place(&out, &package("one")).expect("placed");
        assert_eq!(written, ["main.c", "src/kernel.c", LIST].map(|name| out.join(name)));
        place(&out, &package("two")).expect("replaced");
        assert_eq!(fs::read_to_string(out.join("main.c")).expect("there"), "two");
        assert_eq!(
            fs::read_dir(home.path().join("deep")).expect("a folder").count(),
            1,
            "nothing is left beside it"
        );

        fs::write(out.join("main.c"), "edited").expect("written");
        let refused = place(&out, &package("three")).expect_err("an edited file is somebody's work");
        assert!(matches!(&refused, Refused::Foreign { names, .. } if names == &["main.c"]), "{refused}");
        assert_eq!(fs::read_to_string(out.join("main.c")).expect("there"), "edited");

        let other = home.path().join("other");
        fs::create_dir(&other).expect("a folder");
        place(&other, &package("one")).expect("an empty folder is free");
        fs::write(other.join("letter.txt"), "dear").expect("written");
        assert!(place(&other, &package("two")).is_err());
        assert!(matches!(place(&other.join("letter.txt"), &package("two")), Err(Refused::File(_))));
    }
}
