//! The back ends agree to the last bit: every demo model, in C and in Rust, with one thread and with several, writes equal files.
//!
//! What makes that so: the order of operations is fixed in the kernel, and no product and sum are contracted into one operation.
//! Elementary functions are those of each back end's own library; here they are seen to agree on the machine of the tests only.
//! The in-process executor joins through [`engines`].

use std::collections::BTreeMap;
use std::ffi::OsString;
use std::fs;
use std::path::{Path, PathBuf};

use rimstone::emit::{Form, Language, Target};
use rimstone::pipeline::{self, Compiled};
use rimstone::source::SourceFile;
use rimstone::verify::run::{self, Ending};
use rimstone::verify::toolchain;

/// Runs of a built model: arguments and a folder for the results; what is wrong comes as text.
type Run = Box<dyn Fn(&[OsString]) -> Result<(), String>>;

/// A way to run a model.
struct Engine {
    name: &'static str,
    threads: &'static [usize],
    build: fn(&Compiled, &SourceFile) -> Run,
}

/// All of them; the first is what the others are compared with. The in-process executor belongs here as a third entry.
fn engines() -> Vec<Engine> {
    vec![
        Engine {
            name: "C",
            threads: &[1, 3],
            build: |compiled, source| program(compiled, source, Language::C),
        },
        Engine {
            name: "Rust",
            threads: &[1, 2],
            build: |compiled, source| program(compiled, source, Language::Rust),
        },
    ]
}

fn program(compiled: &Compiled, source: &SourceFile, language: Language) -> Run {
    let compiler = match language {
        Language::C => toolchain::find_c(None),
        Language::Rust => toolchain::find_rust(),
    }
    .expect("a compiler for the tests");
    let text = pipeline::emission::emit(compiled, source, Target { language, form: Form::Program });
    let built = compiler.build(&text.files, &text.prefix).expect("compiles");
    Box::new(move |arguments| {
        let folder = std::env::temp_dir();
        let ended =
            run::captured(&built.program, arguments, &folder).map_err(|fault| format!("{fault:?}"))?;
        if ended.ending == Ending::Status(0) { Ok(()) } else { Err(format!("{ended:?}")) }
    })
}

fn demos() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-models");
    let mut found: Vec<PathBuf> = fs::read_dir(folder)
        .expect("demo models")
        .map(|entry| entry.expect("readable").path())
        .filter(|path| path.extension().is_some_and(|extension| extension == "rim"))
        .collect();
    found.sort();
    found
}

/// Data files of a run by their names within its folder.
fn data(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    let mut found = BTreeMap::new();
    let mut open = vec![folder.to_path_buf()];
    while let Some(next) = open.pop() {
        for entry in fs::read_dir(&next).unwrap_or_else(|fault| panic!("{}: {fault}", next.display())) {
            let path = entry.expect("readable").path();
            if path.is_dir() {
                open.push(path);
            } else if path.extension().is_some_and(|extension| extension == "npy" || extension == "csv") {
                let name = path.strip_prefix(folder).expect("inside").display().to_string();
                found.insert(name, fs::read(&path).expect("readable"));
            }
        }
    }
    found
}

/// Node counts that are tried: those of the model made odd and uneven, and just above the least.
fn grids(compiled: &Compiled) -> Vec<Vec<usize>> {
    let axes = &compiled.model.axes;
    let least: Vec<usize> = compiled.scheme.axes.iter().map(|facts| facts.least_nodes).collect();
    let many = if axes.len() == 3 { 15 } else { 37 };
    let odd = (0..axes.len()).map(|axis| (many + 4 * axis).max(least[axis] + 1)).collect();
    let small = least.iter().map(|least| least + 1).collect();
    vec![odd, small]
}

fn first_difference(a: &[u8], b: &[u8]) -> String {
    let place = a.iter().zip(b).position(|(a, b)| a != b).unwrap_or(a.len().min(b.len()));
    format!("lengths {} and {}, first difference at byte {place}", a.len(), b.len())
}

/// Runs one model everywhere and compares all files of data.
fn compare(path: &Path) -> Vec<String> {
    let source = pipeline::read(path).expect("readable");
    let (compiled, _) = pipeline::compile(&source, &pipeline::Overrides::default())
        .unwrap_or_else(|faults| panic!("{}: {faults:?}", path.display()));
    let built: Vec<(Engine, Run)> = engines()
        .into_iter()
        .map(|engine| {
            let run = (engine.build)(&compiled, &source);
            (engine, run)
        })
        .collect();
    let scratch = tempfile::tempdir().expect("a folder");
    let mut wrong = Vec::new();
    for (which, nodes) in grids(&compiled).into_iter().enumerate() {
        let mut expected: Option<(String, BTreeMap<String, Vec<u8>>)> = None;
        for (engine, run) in &built {
            for threads in engine.threads {
                let name = format!("{} with {threads} threads, nodes {nodes:?}", engine.name);
                let out = scratch.path().join(format!("{which}_{}_{threads}", engine.name));
                let mut arguments: Vec<OsString> =
                    ["--steps", "7", "--quiet", "--threads"].map(OsString::from).to_vec();
                arguments.extend([threads.to_string().into(), "--out".into(), out.clone().into()]);
                for (axis, count) in compiled.model.axes.iter().zip(&nodes) {
                    arguments.extend(["--nodes".into(), format!("{}={count}", axis.name).into()]);
                }
                if let Err(fault) = run(&arguments) {
                    wrong.push(format!("{}: {name}: {fault}", path.display()));
                    continue;
                }
                let found = data(&out);
                assert!(
                    found.keys().any(|name| name.ends_with(".npy")),
                    "{}: {name}: no data",
                    path.display()
                );
                let Some((first, files)) = &expected else {
                    expected = Some((name, found));
                    continue;
                };
                let names = |files: &BTreeMap<String, Vec<u8>>| files.keys().cloned().collect::<Vec<_>>();
                if names(files) != names(&found) {
                    wrong.push(format!(
                        "{}: {name} writes {:?}, {first} {:?}",
                        path.display(),
                        names(&found),
                        names(files)
                    ));
                    continue;
                }
                for (file, bytes) in &found {
                    if files[file] != *bytes {
                        let difference = first_difference(&files[file], bytes);
                        wrong.push(format!(
                            "{}: {file} of {name} differs from {first}: {difference}",
                            path.display()
                        ));
                    }
                }
            }
        }
    }
    wrong
}

#[test]
fn all_back_ends_agree_to_the_last_bit_on_every_demo_model() {
    let demos = demos();
    assert!(demos.len() >= 11, "{}", demos.len());
    let wrong: Vec<String> = demos.iter().flat_map(|path| compare(path)).collect();
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// A comparison that cannot fail is none: one bit of one file is noticed.
#[test]
fn a_single_bit_is_noticed() {
    let folder = tempfile::tempdir().expect("a folder");
    fs::create_dir(folder.path().join("T")).expect("made");
    let file = folder.path().join("T/000000.npy");
    fs::write(&file, [0u8; 64]).expect("written");
    let before = data(folder.path());
    let mut bytes = fs::read(&file).expect("readable");
    bytes[63] ^= 1;
    fs::write(&file, &bytes).expect("written");
    let after = data(folder.path());
    assert_ne!(before, after);
    assert!(first_difference(&before["T/000000.npy"], &after["T/000000.npy"]).ends_with("byte 63"));
}
