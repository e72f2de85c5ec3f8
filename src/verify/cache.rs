//! Built programs, kept from one run to the next and found by what went into them.
//!
//! A program is built in a temporary folder and appears under its key by one rename: a key that is there is whole. Where no
//! folder can be kept, programs live as long as their [`Built`].

use std::env;
use std::fs;
use std::path::{Path, PathBuf};
use std::time::SystemTime;

use sha2::{Digest, Sha256};

use super::toolchain::{Built, Files, ToolError};

/// So many programs are kept; the oldest go first.
const MOST_KEPT: usize = 64;

/// SHA-256 of the sources, of what describes the compiler, of this machine's processor and of this program's version. Each
/// part is preceded by its length, so that no two lists of parts run together.
pub fn key(files: &Files, compiler: &[&str]) -> String {
    let mut digest = Sha256::new();
    let mut add = |part: &str| {
        digest.update((part.len() as u64).to_le_bytes());
        digest.update(part.as_bytes());
    };
    files.iter().for_each(|(path, text)| [path, text].into_iter().for_each(|part| add(part)));
    compiler.iter().for_each(|part| add(part));
    add(&processor());
    add(env!("CARGO_PKG_VERSION"));
    digest.finalize().iter().map(|byte| format!("{byte:02x}")).collect()
}

/// Programs for the native processor are not for another one.
fn processor() -> String {
    let wanted = ["model name", "flags", "Features", "CPU part"];
    let described = fs::read_to_string("/proc/cpuinfo").unwrap_or_default();
    let mut lines: Vec<&str> =
        described.lines().filter(|line| wanted.iter().any(|start| line.starts_with(start))).collect();
    lines.sort_unstable();
    lines.dedup();
    format!("{} {}", env::consts::ARCH, lines.join("\n"))
}

/// The program under the key; `build` fills a folder with it where it is not there yet.
///
/// # Errors
/// Those of `build`, and a file system that refuses.
pub fn built(
    key: &str,
    name: &str,
    build: impl Fn(&Path) -> Result<(), ToolError>,
) -> Result<Built, ToolError> {
    match home().and_then(|home| writable(&home)) {
        Some(home) => kept(&home, key, name, build),
        None => {
            let folder =
                tempfile::tempdir().map_err(|reason| ToolError::folder(&env::temp_dir(), &reason))?;
            build(folder.path())?;
            Ok(Built { program: folder.path().join(name), _kept: Some(folder) })
        }
    }
}

fn kept(
    home: &Path,
    key: &str,
    name: &str,
    build: impl Fn(&Path) -> Result<(), ToolError>,
) -> Result<Built, ToolError> {
    let place = home.join(key);
    let built = Built { program: place.join(name), _kept: None };
    if built.program.is_file() {
        return Ok(built);
    }
    let folder = tempfile::tempdir_in(home).map_err(|reason| ToolError::folder(home, &reason))?;
    build(folder.path())?;
    match fs::rename(folder.path(), &place) {
        // The guard has nothing left to remove.
        Ok(()) => drop(folder.keep()),
        // Somebody else was faster; both built the same.
        Err(_) if built.program.is_file() => {}
        Err(reason) => return Err(ToolError::folder(&place, &reason)),
    }
    forget_oldest(home, &place);
    Ok(built)
}

/// `$XDG_CACHE_HOME/rimstone/programs`, else below `~/.cache`.
fn home() -> Option<PathBuf> {
    let absolute = |name: &str| env::var_os(name).map(PathBuf::from).filter(|path| path.is_absolute());
    let cache = absolute("XDG_CACHE_HOME").or_else(|| absolute("HOME").map(|home| home.join(".cache")))?;
    Some(cache.join("rimstone").join("programs"))
}

fn writable(home: &Path) -> Option<PathBuf> {
    fs::create_dir_all(home).ok()?;
    tempfile::tempfile_in(home).ok()?;
    Some(home.to_owned())
}

/// Removes what is beyond the number kept. What cannot be removed stays: it is only space.
fn forget_oldest(home: &Path, newest: &Path) {
    let Ok(entries) = fs::read_dir(home) else { return };
    let age =
        |path: &Path| fs::metadata(path).and_then(|entry| entry.modified()).unwrap_or(SystemTime::UNIX_EPOCH);
    let mut kept: Vec<(SystemTime, PathBuf)> = entries
        .filter_map(|entry| entry.ok().map(|entry| entry.path()))
        .filter(|path| is_key(path) && path != newest)
        .map(|path| (age(&path), path))
        .collect();
    kept.sort();
    let beyond = (kept.len() + 1).saturating_sub(MOST_KEPT);
    for (_, path) in &kept[..beyond] {
        let _ = fs::remove_dir_all(path);
    }
}

/// Folders of builds that are still going on are not touched.
fn is_key(path: &Path) -> bool {
    let name = path.file_name().and_then(|name| name.to_str()).unwrap_or_default();
    name.len() == 64 && name.bytes().all(|byte| byte.is_ascii_hexdigit())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_part_counts() {
        let files = |text: &str| Files::from([("a".to_owned(), text.to_owned())]);
        let keys = [
            key(&files("x"), &["cc", "12"]),
            key(&files("y"), &["cc", "12"]),
            key(&files("x"), &["cc1", "2"]),
            key(&files("x"), &["cc", "13"]),
        ];
        for (index, one) in keys.iter().enumerate() {
            assert!(keys.iter().skip(index + 1).all(|other| other != one));
            assert_eq!(one.len(), 64);
        }
        assert_eq!(keys[0], key(&files("x"), &["cc", "12"]));
    }

    #[test]
    fn only_so_many_are_kept() {
        let home = tempfile::tempdir().expect("a folder");
        let fill = |folder: &Path| {
            fs::write(folder.join("p"), "").map_err(|reason| ToolError::folder(folder, &reason))
        };
        let mut last = PathBuf::new();
        for number in 0..MOST_KEPT + 3 {
            last = kept(home.path(), &format!("{number:064x}"), "p", fill).expect("built").program;
        }
        assert_eq!(fs::read_dir(home.path()).expect("a folder").count(), MOST_KEPT);
        assert!(last.is_file());
    }
}
