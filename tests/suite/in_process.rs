//! Runs in this process: the Rust driver around the executor. What a run's folder holds, how runs end, go on, are refused.

use std::collections::BTreeMap;
use std::ffi::{CString, OsString};
use std::fs;
use std::path::{Path, PathBuf};

use rimstone::emit::{Form, Language, Provenance};
use rimstone::exact::Rational;
use rimstone::kernel::{Extent, Kernel, Operation, Step, ValueId, validate};
use rimstone::verify::driver::{
    self, Ended, Failure, Observer, Options, Outcome, Request, Solver, general, settle, simulate,
};
use rimstone::verify::in_process::InProcess;
use rimstone::verify::run::{Ending, captured};
use rimstone::verify::toolchain::find_c;
use serde_json::Value;

use crate::emission::build::{MODEL, package};
use crate::emission::kernels;

fn solver(kernel: &Kernel) -> InProcess {
    let valid = validate(kernel.clone()).expect("a kernel of the tests is valid");
    InProcess::new(valid, Provenance { model_text: MODEL, hash: "0123abcd", version: "0.0-test" })
}

/// A kernel of the hand-built ones, whose constants have no bounds: those are sketches.
fn sketch(name: &str) -> Kernel {
    let found = kernels::all().into_iter().map(|(kernel, _)| kernel).find(|kernel| kernel.name == name);
    let mut kernel = found.expect("a kernel of that name");
    kernel.parameters.iter_mut().for_each(|constant| constant.bounds = None);
    kernel
}

/// The same with a given step.
fn stepping(name: &str, step: Rational) -> Kernel {
    let mut kernel = sketch(name);
    kernel.time.step = Step::Duration(ValueId(kernel.values.len()));
    kernel.values.push(rimstone::kernel::Value {
        operation: Operation::Literal(step),
        extent: Extent::Fixed,
        hint: None,
    });
    kernel
}

fn options(solver: &InProcess, out: &Path) -> Options {
    Options { out: Some(out.to_owned()), threads: Some(1), ..Options::of(solver.description()) }
}

fn files(root: &Path) -> BTreeMap<PathBuf, Vec<u8>> {
    let mut found = BTreeMap::new();
    let mut open = vec![root.to_owned()];
    while let Some(folder) = open.pop() {
        for entry in fs::read_dir(folder).expect("a folder") {
            let path = entry.expect("an entry").path();
            if path.is_dir() {
                open.push(path);
            } else {
                let name = path.strip_prefix(root).expect("inside").to_owned();
                found.insert(name, fs::read(path).expect("a file"));
            }
        }
    }
    found
}

/// All files but the summary, which holds clocks.
fn data(root: &Path) -> BTreeMap<PathBuf, Vec<u8>> {
    let mut files = files(root);
    files.remove(Path::new("run.json")).expect("a summary");
    files
}

fn summary(root: &Path) -> Value {
    serde_json::from_slice(&fs::read(root.join("run.json")).expect("run.json")).expect("JSON")
}

fn run(kernel: &Kernel, out: &Path, change: impl FnOnce(&mut Options)) -> Result<Outcome, Failure> {
    let mut solver = solver(kernel);
    let mut options = options(&solver, out);
    change(&mut options);
    simulate(&mut solver, &options, &mut ())
}

fn refusals(result: Result<Outcome, Failure>) -> String {
    match result {
        Err(Failure::Refused(faults)) => faults.join("\n"),
        other => panic!("a refusal was expected, not {other:?}"),
    }
}

/// Stops before the step of that number, and remembers what it saw.
struct StopAt {
    step: u64,
    series: Vec<(String, u64, Vec<f64>)>,
    rows: usize,
}

impl StopAt {
    fn step(step: u64) -> StopAt {
        StopAt { step, series: Vec::new(), rows: 0 }
    }
}

impl Observer for StopAt {
    fn series(&mut self, name: &str, step: u64, _time: f64, values: &[f64]) {
        self.series.push((name.to_owned(), step, values.to_owned()));
    }

    fn row(&mut self, _step: u64, _time: f64, cells: &[Option<f64>]) {
        assert!(cells.iter().any(Option::is_some));
        self.rows += 1;
    }

    fn goes_on(&mut self, step: u64) -> bool {
        step < self.step
    }
}

/// Shape text and values of a .npy file, as its published layout says (version 1.0, from memory).
fn read_npy(bytes: &[u8]) -> (String, Vec<f64>) {
    assert_eq!(&bytes[..8], b"\x93NUMPY\x01\x00");
    assert_eq!(u16::from_le_bytes([bytes[8], bytes[9]]), 118, "data begin at byte 128");
    assert_eq!(bytes[127], b'\n');
    let header = String::from_utf8(bytes[10..127].to_vec()).expect("ASCII");
    let number = |bytes: &[u8]| f64::from_le_bytes(bytes.try_into().expect("eight bytes"));
    (header.trim_end().to_owned(), bytes[128..].chunks(8).map(number).collect())
}

#[test]
fn a_run_writes_what_the_contract_says() {
    let kernel = sketch("drum");
    let folder = tempfile::tempdir().expect("a folder");
    let out = folder.path().join("deep/drum.run");
    let mut solver = solver(&kernel);
    let given = options(&solver, &out);
    let outcome = simulate(&mut solver, &given, &mut ()).expect("it runs");
    assert_eq!((outcome.ended, outcome.folder.as_deref()), (Ended::Finished, Some(out.as_path())));
    let (files, said) = (files(&out), summary(&out));
    let keys: Vec<&String> = said.as_object().expect("an object").keys().collect();
    let wanted = "schema program version model hash constants grid method step limit limit_law steps start end \
                  wall_seconds stepping_seconds threads memory_bytes ended message step_above_limit outputs";
    assert_eq!(keys, wanted.split_whitespace().collect::<Vec<_>>());
    assert_eq!((&said["ended"], &said["steps"]), (&Value::from("finished"), &Value::from(outcome.steps)));
    assert_eq!(files[Path::new("model.rim")], MODEL.as_bytes());
    let outputs = said["outputs"].as_array().expect("a list");
    let index = String::from_utf8(files[Path::new("index.xmf")].clone()).expect("UTF-8");
    for output in outputs {
        let path = output["path"].as_str().expect("a path");
        assert!(files.contains_key(Path::new(path)), "{path}");
        assert!(index.contains(&format!(">{path}<")), "{path}");
    }
    assert_eq!(files.len(), outputs.len() + 4, "nothing else is left: {:?}", files.keys());
    let last = outputs.iter().rfind(|output| output["field"] == "u").expect("the last state");
    assert_eq!(last["step"], Value::from(outcome.steps));
    let (header, values) = read_npy(&files[Path::new(last["path"].as_str().expect("a path"))]);
    assert_eq!(header, "{'descr': '<f8', 'fortran_order': False, 'shape': (10, 10), }");
    assert_eq!(values, solver.field(0));
    let rows = String::from_utf8(files[Path::new("gauges.csv")].clone()).expect("UTF-8");
    assert_eq!(rows.lines().next(), Some("time [s],middle [m/s],mean [m/s]"));
    assert_eq!(rows.lines().count() as u64, outcome.steps + 2, "a head, the start, and a row a step");
}

#[test]
fn the_largest_values_and_integrals_are_right() {
    let kernel = sketch("drum");
    let mut solver = solver(&kernel);
    let mut seen = StopAt::step(u64::MAX);
    let every_step = Options { steps: Some(9), ..Options::of(solver.description()) };
    let outcome = simulate(&mut solver, &every_step, &mut seen).expect("it runs");
    assert_eq!((outcome.ended, outcome.steps, seen.rows), (Ended::Finished, 9, 2));
    let mut names: Vec<(&str, u64)> =
        seen.series.iter().map(|(name, step, _)| (name.as_str(), *step)).collect();
    names.sort_unstable();
    assert_eq!(names, [("highest", 0), ("highest", 9), ("speed", 0), ("speed", 9), ("u", 0), ("u", 9)]);
    let find = |name: &str, step: u64| {
        &seen.series.iter().find(|(other, at, _)| other == name && *at == step).expect("seen").2
    };
    let (first, last) = (find("u", 0), find("u", 9));
    for (index, highest) in find("highest", 9).iter().enumerate() {
        assert!(*highest >= first[index].abs() && *highest >= last[index].abs());
    }
}

#[test]
fn an_interrupted_run_goes_on_to_the_last_bit() {
    for name in ["drum", "duct", "hot plate"] {
        let kernel = stepping(name, Rational::ratio(1, 61));
        let folder = tempfile::tempdir().expect("a folder");
        let (whole, parts) = (folder.path().join("whole"), folder.path().join("parts"));
        let steps = (name == "hot plate").then_some(30u64);
        let straight = run(&kernel, &whole, |options| options.steps = steps).expect("it runs");
        assert!(straight.steps > 20, "{name}: {} steps", straight.steps);
        for (resume, stop) in [(false, 7), (true, 8), (true, 15), (true, u64::MAX)] {
            let mut solver = solver(&kernel);
            let steps = if resume { None } else { steps };
            let given = Options { resume, steps, ..options(&solver, &parts) };
            let outcome = simulate(&mut solver, &given, &mut StopAt::step(stop)).expect("it runs");
            let interrupted = stop < u64::MAX;
            assert_eq!(outcome.ended == Ended::Interrupted, interrupted, "{name}");
            assert_eq!(outcome.steps, stop.min(straight.steps), "{name}");
            assert_eq!(summary(&parts)["ended"], if interrupted { "interrupted" } else { "finished" });
            assert_eq!(parts.join("checkpoint.bin").exists(), interrupted);
        }
        assert!(data(&whole) == data(&parts), "{name}: every file is the same");
    }
}

#[test]
fn checkpoints_that_do_not_fit_are_refused() {
    let kernel = stepping("duct", Rational::ratio(1, 61));
    let folder = tempfile::tempdir().expect("a folder");
    let out = folder.path().join("run");
    let stop = |resume: bool, step: u64| {
        let mut solver = solver(&kernel);
        let given = Options { resume, ..options(&solver, &out) };
        simulate(&mut solver, &given, &mut StopAt::step(step)).expect("it runs")
    };
    stop(false, 3);
    stop(true, 5);
    let resumed = |change: fn(&mut Options)| {
        refusals(run(&kernel, &out, |options| {
            options.resume = true;
            change(options);
        }))
    };
    assert!(resumed(|options| options.nodes = vec![Some(20)]).contains("nodes along x differ: 12"));
    let several = resumed(|options| {
        options.nodes = vec![Some(20)];
        options.parameters = vec![Some(2.5)];
    });
    assert!(several.contains("nodes along x") && several.contains("constant c differs"), "{several}");
    assert!(resumed(|options| options.until = Some(7.0)).contains("last time differs"));
    assert!(resumed(|options| options.steps = Some(7)).contains("not started with --steps"));
    let other = InProcess::new(
        validate(kernel.clone()).expect("valid"),
        Provenance { model_text: "other", hash: "ffff", version: "0.0-test" },
    );
    let mut other = other;
    let given = Options { resume: true, ..options(&other, &out) };
    let refused = refusals(simulate(&mut other, &given, &mut ()));
    assert!(
        refused.contains("model (by its hash) differs: 0123abcd in the checkpoint, ffff here"),
        "{refused}"
    );
    // A damaged checkpoint: the one before serves.
    let path = out.join("checkpoint.bin");
    let mut bytes = fs::read(&path).expect("a checkpoint");
    let middle = bytes.len() / 2;
    bytes[middle] ^= 1;
    fs::write(&path, bytes).expect("written");
    assert_eq!(stop(true, 4).steps, 4, "from step 3");
    fs::write(&path, b"").expect("written");
    fs::write(out.join("checkpoint.old"), b"RIMSTONE").expect("written");
    assert!(resumed(|_| ()).contains("damaged"));
}

#[test]
fn folders_that_hold_something_are_refused() {
    let kernel = sketch("duct");
    let folder = tempfile::tempdir().expect("a folder");
    let out = folder.path().join("run");
    fs::create_dir(&out).expect("a folder");
    let begin = || refusals(run(&kernel, &out, |_| ()));
    fs::write(out.join("letters.txt"), "dear").expect("written");
    assert!(begin().contains("holds something that is not a run"));
    assert_eq!(files(&out).len(), 1, "nothing was added");
    fs::remove_file(out.join("letters.txt")).expect("removed");
    let resumed = refusals(run(&kernel, &out, |options| options.resume = true));
    assert!(resumed.contains("no run in"), "{resumed}");
    run(&kernel, &out, |_| ()).expect("an empty folder will do");
    assert!(begin().contains("holds a run already"));
    let resumed = refusals(run(&kernel, &out, |options| options.resume = true));
    assert!(resumed.contains("its run has ended"), "{resumed}");
    let file = folder.path().join("file");
    fs::write(&file, "").expect("written");
    assert!(refusals(run(&kernel, &file, |_| ())).contains("is a file, not a folder"));
    let below = run(&kernel, &file.join("run"), |_| ());
    assert!(matches!(below, Err(Failure::Environment(_) | Failure::Refused(_))), "{below:?}");
}

#[test]
fn a_blow_up_is_found_and_placed() {
    let kernel = stepping("vault rod", Rational::from(10));
    let folder = tempfile::tempdir().expect("a folder");
    let out = folder.path().join("run");
    let outcome = run(&kernel, &out, |options| options.steps = Some(100_000)).expect("it runs");
    assert_eq!(outcome.ended, Ended::BlewUp);
    assert!(outcome.step_above_limit);
    assert!(outcome.message.contains("u is not finite any more at x = "), "{}", outcome.message);
    assert!(outcome.message.contains("the last good output is u/000000.npy"), "{}", outcome.message);
    let said = summary(&out);
    assert_eq!((&said["ended"], &said["message"]), (&Value::from("blew up"), &Value::from(outcome.message)));
}

#[test]
fn all_faulty_arguments_are_told_at_once() {
    let (mut kernel, _) = kernels::all().swap_remove(3);
    assert_eq!(kernel.name, "duct");
    let bounds = kernel.parameters[0].bounds;
    kernel.parameters[0].bounds = bounds.map(|(one, third)| (third, one));
    let mut solver = solver(&kernel);
    let words = "--set c=7 --set d=1 --nodes x=2 --nodes y=9 --nodes x --until soon --threads 0 --steps -1 --loud --out=";
    let arguments: Vec<String> = words.split(' ').map(str::to_owned).collect();
    let (request, faults) = Request::read(solver.description(), &arguments);
    let Err(Failure::Refused(faults)) = settle(&mut solver, request, faults) else { panic!("faults") };
    let all = faults.join("\n");
    for part in [
        "--set d: no such constant; there are: c",
        "--nodes y: no such axis; there are: x",
        "--nodes wants AXIS=N, not 'x'",
        "--nodes x=2: too few nodes; the difference operators need at least 7 along x",
        "--until wants a time in seconds, not 'soon'",
        "--threads wants a whole number from 1 to 4096, not '0'",
        "--steps wants a whole number, not '-1'",
        "unknown argument '--loud'",
        "--out wants the name of a folder",
        "c = 7 1 is outside its bounds, 0.333333333333333 to 1 1",
    ] {
        assert!(all.contains(part), "{part}\nnot in\n{all}");
    }
    assert_eq!(faults.len(), 10, "{all}");
    let wanted = ["--set", "c=0.5", "--nodes", "x=30", "--quiet"].map(str::to_owned);
    let (request, faults) = Request::read(solver.description(), &wanted);
    let settled = settle(&mut solver, request, faults).expect("no faults");
    assert_eq!((settled.parameters, settled.nodes), (vec![Some(0.5)], vec![Some(30)]));
    assert_eq!(settled.out.as_deref(), Some(Path::new("duct.run")));
}

#[test]
fn the_program_ends_with_the_right_status() {
    let kernel = sketch("duct");
    let folder = tempfile::tempdir().expect("a folder");
    let out = folder.path().join("run").display().to_string();
    let status = |words: &[&str]| {
        let words: Vec<String> = words.iter().map(|word| (*word).to_owned()).collect();
        driver::run(&mut solver(&kernel), &words)
    };
    assert_eq!(status(&["--quiet", "--until", "0.1", "--out", &out]), driver::FINISHED);
    assert_eq!(status(&["--quiet", "--out", &out]), driver::BAD_ARGUMENTS);
    assert_eq!(status(&["--help"]), driver::FINISHED);
    assert_eq!(status(&["--out", "/dev/null/run"]), driver::BAD_ARGUMENTS);
    assert_eq!(status(&["--nodes", "x=1000000000000000", "--out", "never"]), driver::ENVIRONMENT_FAILED);
}

#[test]
fn in_process_and_in_c_the_same_files_are_written() {
    let c = find_c(None).expect("a C compiler");
    for (kernel, _) in kernels::all() {
        let kernel = sketch(&kernel.name);
        let steps = if kernel.outputs.is_empty() { vec!["--steps", "4"] } else { Vec::new() };
        let program = package(&kernel, Language::C, Form::Program);
        let built = c.build(&program.files, &program.prefix).unwrap_or_else(|fault| panic!("{fault}"));
        let folder = tempfile::tempdir().expect("a folder");
        let words: Vec<OsString> =
            steps.iter().chain(&["--out", "c", "--quiet"]).map(OsString::from).collect();
        let run_in_c = captured(&built.program, &words, folder.path()).expect("it starts");
        assert_eq!(run_in_c.ending, Ending::Status(0), "{}: {}", kernel.name, run_in_c.errors);
        run(&kernel, &folder.path().join("here"), |options| options.steps = (!steps.is_empty()).then_some(4))
            .unwrap_or_else(|failure| panic!("{}: {failure:?}", kernel.name));
        let (here, there) = (data(&folder.path().join("here")), data(&folder.path().join("c")));
        assert!(here.len() > 3, "{}", kernel.name);
        for (name, bytes) in &there {
            assert!(here.get(name) == Some(bytes), "{}: {}", kernel.name, name.display());
        }
        assert_eq!(here.len(), there.len());
    }
}

/// The C library's own text for a number.
fn printed(value: f64, digits: usize) -> String {
    let format = CString::new(format!("%.{digits}g")).expect("no zero inside");
    let mut text = [0u8; 64];
    // SAFETY: the buffer is as long as is said, and the format takes one double.
    let length = unsafe { libc::snprintf(text.as_mut_ptr().cast(), text.len(), format.as_ptr(), value) };
    String::from_utf8(text[..length as usize].to_vec()).expect("ASCII")
}

#[test]
fn numbers_are_printed_as_c_prints_them() {
    let mut values =
        vec![0.0, -0.0, 1.0, 0.1, 1e-4, 9.9999e-5, 1e5, 999_999.5, 123_456_789.0, f64::MAX, 5e-324];
    values.extend([f64::INFINITY, f64::NEG_INFINITY, 2.5, 3.5, 0.5f64.powi(17) + 1.0, 1e16, 1e17, 1e22, 0.3]);
    let mut bits: u64 = 0x1234_5678_9abc_def1;
    for _ in 0..3000 {
        bits = bits.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        values.push(f64::from_bits(bits));
        values.push((bits >> 11) as f64 / 1024.0);
    }
    for value in values.into_iter().filter(|value| !value.is_nan()) {
        for digits in [1, 3, 6, 9, 15, 17] {
            assert_eq!(general(value, digits), printed(value, digits), "{value:e} with {digits} digits");
        }
        let back: f64 = general(value, 17).parse().expect("a number");
        assert_eq!(back.to_bits(), value.to_bits());
    }
}
