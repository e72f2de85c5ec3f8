//! The two drivers, C and Rust, around the same kernels: the same files, byte for byte.

use std::collections::BTreeMap;
use std::ffi::OsString;
use std::fs;
use std::path::{Path, PathBuf};

use rimstone::emit::{Form, Language};
use rimstone::kernel::Kernel;
use rimstone::verify::run::{Ending, captured};
use rimstone::verify::toolchain::{Compiler, find_c, find_rust};
use serde_json::Value;

use crate::emission::build::package;
use crate::emission::kernels;

/// What may differ between two runs of one model: clocks and what the machine is asked for.
const OF_THE_MACHINE: [&str; 4] = ["wall_seconds", "stepping_seconds", "threads", "memory_bytes"];

/// Files of a finished run by their path below its folder; the summary apart.
fn results(
    compiler: &Compiler,
    kernel: &Kernel,
    language: Language,
    arguments: &[&str],
) -> (BTreeMap<PathBuf, Vec<u8>>, Value) {
    let program = package(kernel, language, Form::Program);
    let built = compiler.build(&program.files, &program.prefix).unwrap_or_else(|fault| panic!("{fault}"));
    let folder = tempfile::tempdir().expect("a folder for the test");
    let words: Vec<OsString> = arguments.iter().chain(&["--out", "run"]).map(OsString::from).collect();
    let run = captured(&built.program, &words, folder.path()).expect("it starts");
    assert_eq!(run.ending, Ending::Status(0), "{}: {}", kernel.name, run.errors);
    assert_eq!(run.output, "run\n");
    let mut files = BTreeMap::new();
    gather(&folder.path().join("run"), Path::new(""), &mut files);
    let summary = files.remove(Path::new("run.json")).expect("a summary");
    let mut summary: Value = serde_json::from_slice(&summary).expect("JSON");
    OF_THE_MACHINE
        .iter()
        .for_each(|key| assert!(summary.as_object_mut().expect("an object").remove(*key).is_some(), "{key}"));
    (files, summary)
}

fn gather(root: &Path, below: &Path, files: &mut BTreeMap<PathBuf, Vec<u8>>) {
    for entry in fs::read_dir(root.join(below)).expect("a folder") {
        let name = below.join(entry.expect("an entry").file_name());
        if root.join(&name).is_dir() {
            gather(root, &name, files);
        } else {
            files.insert(name.clone(), fs::read(root.join(&name)).expect("a file"));
        }
    }
}

#[test]
fn both_drivers_write_the_same_bytes() {
    let (c, rust) = (find_c(None).expect("a C compiler"), find_rust().expect("a Rust compiler"));
    for (mut kernel, _) in kernels::all() {
        // These kernels are sketches: the bounds of their constants only have to differ.
        kernel.parameters.iter_mut().for_each(|constant| constant.bounds = None);
        for arguments in [&["--quiet"][..], &["--steps", "5"], &["--threads", "2"]] {
            let (in_c, c_summary) = results(&c, &kernel, Language::C, arguments);
            let (in_rust, rust_summary) = results(&rust, &kernel, Language::Rust, arguments);
            assert_eq!(
                in_c.keys().collect::<Vec<_>>(),
                in_rust.keys().collect::<Vec<_>>(),
                "{}",
                kernel.name
            );
            assert!(in_c.len() > 3, "{}: {:?}", kernel.name, in_c.keys());
            for (path, bytes) in &in_c {
                assert!(in_rust[path] == *bytes, "{} {arguments:?}: {} differs", kernel.name, path.display());
            }
            assert_eq!(c_summary, rust_summary, "{}", kernel.name);
        }
    }
}
