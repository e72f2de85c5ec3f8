//! The C driver around a small hand-written kernel: what a run writes, how it ends, and that it goes on to the last bit.
//!
//! The kernel (`c_driver/bar.c`) is heat in a bar, explicit Euler; its start is a cubic, so that values at gauges and
//! integrals are known.

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};
use std::sync::Mutex;

use rimstone::emit::c_driver::main_text;
use serde_json::Value;
use tempfile::TempDir;

/// A built variant of the bar, and a folder to run it in.
struct Bar {
    program: PathBuf,
    folder: TempDir,
}

const STRICT: [&str; 5] = ["-std=c11", "-Wall", "-Wextra", "-Wpedantic", "-Werror"];
const SANITIZED: [&str; 3] = ["-g", "-O1", "-fsanitize=address,undefined"];

/// Variants built by this run of the tests, by their options.
static BUILT: Mutex<BTreeMap<String, PathBuf>> = Mutex::new(BTreeMap::new());

impl Bar {
    /// `options`: macros of the variant and flags of the compiler. Each variant is built once.
    fn build(options: &[&str]) -> Bar {
        let mut built = BUILT.lock().unwrap_or_else(std::sync::PoisonError::into_inner);
        let program = built.entry(options.join(" ")).or_insert_with_key(|key| compile(key, options)).clone();
        Bar { program, folder: tempfile::tempdir().expect("a folder for the test") }
    }

    fn sanitized(options: &[&str]) -> Bar {
        Bar::build(&[options, &SANITIZED].concat())
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn run(&self, arguments: &[&str]) -> Output {
        Command::new(&self.program)
            .current_dir(self.folder.path())
            .args(arguments)
            .output()
            .expect("the program starts")
    }

    /// Runs and holds the exit status to `status`; returns standard error.
    fn ends(&self, arguments: &[&str], status: i32) -> String {
        let output = self.run(arguments);
        let errors = String::from_utf8(output.stderr).expect("UTF-8");
        assert_eq!(output.status.code(), Some(status), "{arguments:?}: {errors}");
        errors
    }

    fn summary(&self, run: &str) -> Value {
        serde_json::from_slice(&fs::read(self.path(run).join("run.json")).expect("run.json")).expect("JSON")
    }

    fn rows(&self, run: &str) -> Vec<Vec<Option<f64>>> {
        let text = fs::read_to_string(self.path(run).join("gauges.csv")).expect("gauges.csv");
        let cell = |cell: &str| (!cell.is_empty()).then(|| cell.parse().expect("a number"));
        text.lines().skip(1).map(|line| line.split(',').map(cell).collect()).collect()
    }

    /// Every file of data, by its path.
    fn data(&self, run: &str) -> BTreeMap<PathBuf, Vec<u8>> {
        let mut files = BTreeMap::new();
        gather(&self.path(run), &mut files);
        let root = self.path(run);
        let is_data = |path: &Path| path.extension().is_some_and(|end| end != "json");
        files
            .into_iter()
            .filter(|(path, _)| is_data(path))
            .map(|(path, bytes)| (path.strip_prefix(&root).expect("inside").to_owned(), bytes))
            .collect()
    }
}

fn compile(key: &str, options: &[&str]) -> PathBuf {
    let name: String = key
        .chars()
        .map(|character| if character.is_ascii_alphanumeric() { character } else { '_' })
        .collect();
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("c_driver").join(name);
    fs::create_dir_all(&folder).expect("a folder to build in");
    fs::write(folder.join("bar.h"), include_str!("c_driver/bar.h")).expect("written");
    fs::write(folder.join("bar.c"), include_str!("c_driver/bar.c")).expect("written");
    fs::write(folder.join("main.c"), main_text("bar")).expect("written");
    let built = Command::new("cc")
        .current_dir(&folder)
        .args(STRICT)
        .args(options)
        .args(["-o", "bar", "main.c", "bar.c", "-lm"])
        .output()
        .expect("a C compiler");
    assert!(built.status.success(), "{}", String::from_utf8_lossy(&built.stderr));
    folder.join("bar")
}

fn gather(folder: &Path, files: &mut BTreeMap<PathBuf, Vec<u8>>) {
    for entry in fs::read_dir(folder).expect("a folder") {
        let path = entry.expect("an entry").path();
        if path.is_dir() {
            gather(&path, files);
        } else {
            files.insert(path.clone(), fs::read(&path).expect("a file"));
        }
    }
}

/// Shape text and values of a .npy file, as its published layout says (version 1.0, from memory).
fn read_npy(path: &Path) -> (String, Vec<f64>) {
    let bytes = fs::read(path).expect("a .npy file");
    assert_eq!(&bytes[..8], b"\x93NUMPY\x01\x00");
    assert_eq!(u16::from_le_bytes([bytes[8], bytes[9]]), 118, "data begin at byte 128");
    assert_eq!(bytes[127], b'\n');
    let header = String::from_utf8(bytes[10..127].to_vec()).expect("ASCII");
    let values = bytes[128..]
        .chunks_exact(8)
        .map(|eight| f64::from_le_bytes(eight.try_into().expect("eight bytes")))
        .collect();
    (header.trim_end().to_owned(), values)
}

fn times(summary: &Value, field: &str) -> Vec<f64> {
    let outputs = summary["outputs"].as_array().expect("a list");
    outputs
        .iter()
        .filter(|output| output["field"] == field)
        .map(|output| output["time"].as_f64().expect("a time"))
        .collect()
}

fn near(found: f64, wanted: f64) -> bool {
    (found - wanted).abs() <= 1e-12 * wanted.abs()
}

#[test]
fn a_run_writes_what_the_contract_says() {
    let bar = Bar::sanitized(&[]);
    let output = bar.run(&["--out", "wall.run"]);
    assert_eq!(output.status.code(), Some(0));
    assert_eq!(String::from_utf8_lossy(&output.stdout), "wall.run\n");
    let run = bar.path("wall.run");
    let summary = bar.summary("wall.run");
    assert_eq!(summary["ended"], "finished");
    assert_eq!(
        (&summary["model"], &summary["hash"], &summary["schema"]),
        (&Value::from("bar"), &Value::from("abc123"), &Value::from(1))
    );
    assert_eq!(summary["grid"]["x"]["nodes"], 21);
    assert!(near(summary["limit"].as_f64().expect("a limit"), 0.125));
    let keys: Vec<&String> = summary.as_object().expect("an object").keys().collect();
    let wanted = "schema program version model hash constants grid method step limit limit_law steps start end wall_seconds \
                  stepping_seconds threads memory_bytes ended message step_above_limit outputs";
    assert_eq!(keys, wanted.split_whitespace().collect::<Vec<_>>());

    // Every 0.25 s from 1 s to 2 s; T² every 0.4 s does not meet the end; a maximum is there first and last.
    assert_eq!(times(&summary, "T"), [1.0, 1.25, 1.5, 1.75, 2.0]);
    assert_eq!(times(&summary, "T²"), [1.0, 1.4, 1.8]);
    assert_eq!(times(&summary, "peak T"), [1.0, 2.0]);
    let (header, first) = read_npy(&run.join("T/000000.npy"));
    assert_eq!(header, "{'descr': '<f8', 'fortran_order': False, 'shape': (21,), }");
    assert_eq!((first.len(), first[0]), (21, 1.125));
    let (_, last) = read_npy(&run.join("T/000004.npy"));
    let (_, squares) = read_npy(&run.join("T_/000000.npy"));
    assert!(first.iter().zip(&squares).all(|(value, square)| value * value == *square));
    let (_, peak) = read_npy(&run.join("peak_T/000001.npy"));
    assert!(peak.iter().zip(&first).zip(&last).all(|((peak, first), last)| peak >= first && peak >= last));

    let text = fs::read_to_string(run.join("gauges.csv")).expect("gauges.csv");
    assert_eq!(text.lines().next(), Some("time [s],\"middle, \"\"T\"\" [mK]\",heat [K·m]"));
    assert_eq!(fs::read_to_string(run.join("model.rim")).expect("the model"), "model bar \"a bar\"\n");
    let index = fs::read_to_string(run.join("index.xmf")).expect("the index");
    assert_eq!(index.matches("Seek=\"128\"").count(), 10);
    assert!(
        index.contains("TopologyType=\"2DCORectMesh\" Dimensions=\"1 21\"")
            && index.contains("Attribute Name=\"peak T\"")
    );
    assert!(
        bar.data("wall.run")
            .keys()
            .all(|path| path.extension().is_some_and(|end| end != "tmp" && end != "bin"))
    );
}

#[test]
fn gauges_and_integrals_have_known_values() {
    let bar = Bar::sanitized(&[]);
    bar.ends(&["--out", "one"], 0);
    let rows = bar.rows("one");
    // A cubic through four nodes is exact: 1 + 0.96³, in millikelvin.
    assert!(near(rows[0][1].expect("a gauge"), 1000.0 * (1.0 + 0.96_f64.powi(3))), "{rows:?}");
    // The trapezium rule on ∫ 1 + x³ from 1/2 to 3/2 exceeds it by h²/12 (f'(b) − f'(a)) = h²/2, exactly for a cubic.
    let exact = 1.0 + (1.5_f64.powi(4) - 0.5_f64.powi(4)) / 4.0;
    assert!(near(rows[0][2].expect("an integral"), exact + 0.05_f64.powi(2) / 2.0), "{rows:?}");
    // The gauge has a cell after each step, the integral every 0.5 s.
    assert!(rows.iter().all(|row| row[1].is_some()));
    let heats: Vec<f64> =
        rows.iter().filter(|row| row[2].is_some()).map(|row| row[0].expect("a time")).collect();
    assert_eq!(heats, [1.0, 1.5, 2.0]);
}

#[test]
fn a_plate_integrates_and_interpolates_over_both_axes() {
    let bar = Bar::sanitized(&["-DAXES=2"]);
    bar.ends(&["--out", "plate", "--nodes", "y=12"], 0);
    let (header, values) = read_npy(&bar.path("plate/T/000000.npy"));
    assert_eq!(header, "{'descr': '<f8', 'fortran_order': False, 'shape': (21, 12), }");
    assert!(
        values.chunks(12).all(|row| row.iter().all(|value| value == &row[0])),
        "the first axis is the slowest"
    );
    let row = &bar.rows("plate")[0];
    assert!(near(row[1].expect("a gauge"), 1000.0 * (1.0 + 0.96_f64.powi(3))));
    let line = 1.0 + (1.5_f64.powi(4) - 0.5_f64.powi(4)) / 4.0 + 0.05_f64.powi(2) / 2.0;
    assert!(near(row[2].expect("an integral"), 0.9 * line));
    let index = fs::read_to_string(bar.path("plate/index.xmf")).expect("the index");
    assert!(index.contains("Dimensions=\"21 12\""));
}

#[test]
fn an_interrupted_run_goes_on_to_the_last_bit() {
    for variant in [vec![], vec!["-DSTATE_DEPENDENT=1"], vec!["-DCONSTANT_STEP=1"], vec!["-DDURATION=0.03"]] {
        let bar = Bar::sanitized(&variant);
        bar.ends(&["--out", "whole"], 0);
        bar.ends(&["--out", "parts", "--set", "stop=5"], 130);
        assert_eq!(bar.summary("parts")["ended"], "interrupted");
        let spent = bar.summary("parts")["stepping_seconds"].as_f64().expect("a time");
        assert!(
            spent > 0.0 && spent < bar.summary("parts")["wall_seconds"].as_f64().expect("a time"),
            "{spent}"
        );
        assert!(bar.path("parts/gauges.csv").exists());
        let mut rounds = 1;
        while bar.run(&["--out", "parts", "--resume", "--quiet"]).status.code() == Some(130) {
            assert!(bar.path("parts/checkpoint.old").exists(), "the one before is kept");
            rounds += 1;
            assert!(rounds < 100, "each round takes five steps");
        }
        assert!(rounds > 1, "interrupted more than once");
        let (whole, parts) = (bar.data("whole"), bar.data("parts"));
        assert_eq!(whole.keys().collect::<Vec<_>>(), parts.keys().collect::<Vec<_>>());
        for (path, bytes) in &whole {
            assert!(parts[path] == *bytes, "{variant:?}: {} differs", path.display());
        }
        let (whole, parts) = (bar.summary("whole"), bar.summary("parts"));
        assert_eq!(
            (&whole["steps"], &whole["outputs"], &whole["step"]),
            (&parts["steps"], &parts["outputs"], &parts["step"])
        );
    }
}

#[test]
fn a_checkpoint_that_does_not_fit_is_refused() {
    let bar = Bar::sanitized(&[]);
    bar.ends(&["--out", "r", "--set", "stop=5"], 130);
    let errors = bar.ends(&["--out", "r", "--resume", "--set", "k=50", "--nodes", "x=31", "--until", "3"], 1);
    assert!(errors.contains("constant k differs") && errors.contains("nodes along x differ"), "{errors}");
    let errors = bar.ends(&["--out", "r", "--resume", "--until", "3"], 1);
    assert!(errors.contains("last time differs"), "{errors}");
    let errors = bar.ends(&["--out", "r"], 1);
    assert!(errors.contains("--resume"), "{errors}");
    // One bit wrong, and no former checkpoint to fall back on.
    let mut bytes = fs::read(bar.path("r/checkpoint.bin")).expect("a checkpoint");
    let middle = bytes.len() / 2;
    bytes[middle] ^= 1;
    fs::write(bar.path("r/checkpoint.bin"), &bytes).expect("written");
    let errors = bar.ends(&["--out", "r", "--resume"], 1);
    assert!(errors.contains("damaged"), "{errors}");
    // With a former one the run goes on from there.
    bytes[middle] ^= 1;
    fs::write(bar.path("r/checkpoint.old"), &bytes).expect("written");
    let errors = bar.ends(&["--out", "r", "--resume"], 130);
    assert!(errors.contains("checkpoint.old"), "{errors}");
}

#[test]
fn rows_lost_after_a_checkpoint_are_noticed() {
    let bar = Bar::sanitized(&[]);
    bar.ends(&["--out", "r", "--set", "stop=5"], 130);
    let rows = fs::read(bar.path("r/gauges.csv")).expect("rows");
    fs::write(bar.path("r/gauges.csv"), &rows[..rows.len() - 3]).expect("written");
    assert!(bar.ends(&["--out", "r", "--resume"], 1).contains("gauges.csv"));
    // After a crash rows stand under the temporary name, with more than the checkpoint knows.
    fs::write(bar.path("r/gauges.csv.tmp"), [&rows[..], b"9,9,9\n"].concat()).expect("written");
    let _ = fs::remove_file(bar.path("r/gauges.csv"));
    bar.ends(&["--out", "r", "--resume"], 130);
    assert!(fs::read(bar.path("r/gauges.csv")).expect("rows").starts_with(&rows));
    assert!(!fs::read_to_string(bar.path("r/gauges.csv")).expect("rows").contains("9,9,9"));
}

#[test]
fn a_blow_up_is_found_and_placed() {
    let bar = Bar::sanitized(&[]);
    let errors = bar.ends(&["--out", "r", "--set", "stop=-4"], 3);
    assert!(errors.contains("T is not finite any more at x = 0.6 m (node 2), after step 4"), "{errors}");
    assert!(errors.contains("T/000001.npy"), "{errors}");
    let summary = bar.summary("r");
    assert_eq!((&summary["ended"], &summary["steps"]), (&Value::from("blew up"), &Value::from(4)));
    let finite = |(path, _): &(PathBuf, Vec<u8>)| read_npy(path).1.iter().all(|value| value.is_finite());
    let files = bar.data("r").into_iter().map(|(path, bytes)| (bar.path("r").join(path), bytes));
    assert!(
        files.filter(|(path, _)| path.extension().is_some_and(|end| end == "npy")).all(|file| finite(&file))
    );
}

#[test]
fn a_step_above_the_limit_is_said_and_recorded() {
    let bar = Bar::sanitized(&["-DDURATION=0.25"]);
    let errors = bar.ends(&["--out", "r"], 0);
    assert!(errors.contains("above the limit"), "{errors}");
    assert_eq!(bar.summary("r")["step_above_limit"], true);
    let bar = Bar::sanitized(&["-DDURATION=0.1"]);
    bar.ends(&["--out", "r"], 0);
    assert_eq!(bar.summary("r")["step_above_limit"], false);
}

#[test]
fn a_constant_step_meets_every_output() {
    let bar = Bar::sanitized(&["-DCONSTANT_STEP=1"]);
    bar.ends(&["--out", "r"], 0);
    let summary = bar.summary("r");
    // 0.25, 0.5 and 0.4 s share 0.05 s, which is below the limit's 0.1125 s.
    assert_eq!(summary["steps"], 20);
    assert!(near(summary["step"].as_f64().expect("a step"), 0.05));
    assert_eq!(times(&summary, "T"), [1.0, 1.25, 1.5, 1.75, 2.0]);
}

#[test]
fn counted_steps_are_exactly_those() {
    let bar = Bar::sanitized(&[]);
    bar.ends(&["--out", "r", "--steps", "7"], 0);
    let summary = bar.summary("r");
    assert_eq!(summary["steps"], 7);
    assert_eq!(times(&summary, "T").len(), 2);
    assert!(near(summary["end"].as_f64().expect("a time"), 1.0 + 7.0 * 0.9 * 0.125));
    bar.ends(&["--out", "none", "--steps", "0"], 0);
    assert_eq!(
        (&bar.summary("none")["steps"], times(&bar.summary("none"), "T")),
        (&Value::from(0), vec![1.0])
    );
}

#[test]
fn constants_sizes_and_times_come_from_the_arguments() {
    let bar = Bar::sanitized(&[]);
    bar.ends(&["--out", "r", "--set", "k=50", "--nodes=x=41", "--until", "1.3", "--threads", "2"], 0);
    let summary = bar.summary("r");
    assert!(near(summary["constants"]["k"].as_f64().expect("k"), 0.005), "50 cm²/s");
    assert_eq!(summary["grid"]["x"]["nodes"], 41);
    assert_eq!(summary["end"], 1.3);
    assert_eq!(read_npy(&bar.path("r/T/000000.npy")).1.len(), 41);
}

#[test]
fn all_faulty_arguments_are_told_at_once() {
    let bar = Bar::sanitized(&[]);
    let arguments = [
        "--set", "k=0", "--set", "q=1", "--set", "stop=1,5", "--nodes", "x=3", "--nodes", "z=9", "--frob",
        "--until",
    ];
    let errors = bar.ends(&arguments, 1);
    for wanted in [
        "k = 0",
        "bounds",
        "no such constant; there are: k, stop",
        "'1,5'",
        "at least 5",
        "no such axis",
        "'--frob'",
        "--until wants",
    ] {
        assert!(errors.contains(wanted), "{wanted}: {errors}");
    }
    assert!(!bar.path("bar.run").exists());
    assert!(bar.ends(&["--until", "0.5", "--frob"], 1).contains("starts at 1 s"));
    assert!(bar.ends(&["--until", "2", "--steps", "3"], 1).contains("exclude"));
    let help = bar.run(&["--help"]);
    let page = String::from_utf8_lossy(&help.stdout).into_owned();
    assert!(
        help.status.success()
            && page.contains("k = 100 cm²/s, between 10 and 1000")
            && page.contains("--resume"),
        "{page}"
    );
}

#[test]
fn folders_that_hold_something_are_refused() {
    let bar = Bar::sanitized(&[]);
    bar.ends(&["--quiet"], 0);
    assert!(bar.path("bar.run/run.json").exists(), "the default folder");
    assert!(bar.ends(&[], 1).contains("holds a run already"));
    assert!(bar.ends(&["--resume"], 1).contains("has ended"));
    fs::create_dir(bar.path("other")).expect("a folder");
    fs::write(bar.path("other/letter.txt"), "dear").expect("written");
    assert!(bar.ends(&["--out", "other"], 1).contains("not a run"));
    assert!(bar.ends(&["--out", "other/letter.txt"], 1).contains("a file"));
    assert!(bar.ends(&["--out", "nowhere", "--resume"], 1).contains("no run"));
    assert!(bar.ends(&["--out", "other/letter.txt/deeper"], 2).contains("choose another"));
    bar.ends(&["--out", "new/deep/folder", "--quiet"], 0);
}

#[test]
fn a_file_that_cannot_grow_ends_the_run_without_half_a_file() {
    let bar = Bar::build(&[]);
    // `ulimit -f` counts blocks of 512 bytes (POSIX): 100 kB are allowed, the field needs 160 kB.
    let script = "ulimit -f 200; exec \"$0\" --out r --nodes x=20001 --steps 3";
    let output = Command::new("sh")
        .current_dir(bar.folder.path())
        .args(["-c", script])
        .arg(&bar.program)
        .output()
        .expect("a shell");
    let errors = String::from_utf8_lossy(&output.stderr).into_owned();
    assert_eq!(output.status.code(), Some(2), "{errors}");
    assert!(errors.contains("cannot write 'r/T/000000.npy'"), "{errors}");
    assert!(bar.data("r").keys().all(|path| path.extension().is_some_and(|end| end == "rim")));
}

#[test]
fn quiet_is_quiet_and_a_log_has_few_lines() {
    let bar = Bar::build(&["-O2", "-fopenmp"]);
    assert_eq!(bar.ends(&["--out", "a", "--quiet"], 0), "");
    let errors = bar.ends(&["--out", "b"], 0);
    assert_eq!(errors.lines().count(), 2, "{errors}");
    assert!(!errors.contains('\r') && !errors.contains('\u{1b}'));
}
