//! `order N` is kept: solvers of models with exact solutions, in C, in Rust and in process, converge at the order asked for.
//!
//! Each model under `tests/models/exact` is the twin of a demo model and names the source of its solution. The exact solution at the
//! nodes is computed by the kernel itself, as one more output.

use std::collections::BTreeMap;
use std::ffi::OsString;
use std::fs;
use std::path::{Path, PathBuf};

use rimstone::diagnostic::Diagnostics;
use rimstone::emit::{Form, Language, Provenance, Target, emit};
use rimstone::model::{Axis, Expression, FieldId, Model, Output, OutputKind};
use rimstone::pipeline;
use rimstone::source::Span;
use rimstone::verify::driver;
use rimstone::verify::in_process::InProcess;
use rimstone::verify::run::{self, Ending};
use rimstone::verify::toolchain;

fn models() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/models/exact");
    let mut found: Vec<PathBuf> = fs::read_dir(folder)
        .expect("models with exact solutions")
        .map(|entry| entry.expect("readable").path())
        .collect();
    found.sort();
    found
}

/// The checked model, with the exact solution of each field as an output.
fn model_with_solutions(path: &Path) -> Model {
    let source = pipeline::read(path).expect("readable");
    let checked = pipeline::check(&source);
    let mut model = checked.model.unwrap_or_else(|| {
        let messages: Vec<&str> = checked.diagnostics.iter().map(|one| one.message.as_str()).collect();
        panic!("{}: {}", path.display(), messages.join("; "))
    });
    let verification = model.verification.clone().expect("an exact solution");
    assert!(!verification.manufactured && verification.grids.len() >= 3, "{}", path.display());
    model.outputs.clear();
    for (field, value) in verification.solutions {
        let facts = &model.fields[field.0];
        model.outputs.push(Output {
            name: format!("exact {}", facts.name),
            dimension: facts.dimension.clone(),
            unit: facts.unit.clone(),
            scale: facts.scale.clone(),
            value,
            kind: OutputKind::Snapshot,
            every: None,
            span: Span::default(),
        });
    }
    model
}

fn asked_order(model: &Model) -> f64 {
    let orders = model.accuracy.per_axis.iter().map(|asked| match asked {
        rimstone::model::AskedOrder::Solution(order) | rimstone::model::AskedOrder::Interior(order) => *order,
    });
    orders.min().expect("an axis") as f64
}

/// The doubles of a `.npy` file (data start at byte 128).
fn read_npy(path: &Path) -> Vec<f64> {
    let bytes = fs::read(path).unwrap_or_else(|fault| panic!("{}: {fault}", path.display()));
    assert_eq!(&bytes[..6], b"\x93NUMPY", "{}", path.display());
    bytes[128..]
        .chunks_exact(8)
        .map(|part| f64::from_le_bytes(part.try_into().expect("eight bytes")))
        .collect()
}

/// Root mean square error over all fields, from a run's folder: the last state of each.
fn error_in(folder: &Path, model: &Model) -> f64 {
    let mut total = 0.0;
    let mut count = 0;
    for field in &model.fields {
        let last = |name: &str| {
            let mut files: Vec<PathBuf> = fs::read_dir(folder.join(name))
                .unwrap_or_else(|fault| panic!("{}/{name}: {fault}", folder.display()))
                .map(|entry| entry.expect("readable").path())
                .collect();
            files.sort();
            read_npy(files.last().expect("a state"))
        };
        let folder_of = |name: &str| -> String {
            name.chars()
                .map(|c| if c.is_ascii_alphanumeric() || c == '_' || c == '-' { c } else { '_' })
                .collect()
        };
        let found = last(&folder_of(&field.name));
        let exact = last(&folder_of(&format!("exact {}", field.name)));
        assert_eq!(found.len(), exact.len());
        total += found.iter().zip(&exact).map(|(a, b)| (a - b) * (a - b)).sum::<f64>();
        count += found.len();
    }
    (total / count as f64).sqrt()
}

/// Nodes of every axis when the first one has `count` (cells, when periodic): the ratios of the model are kept.
fn nodes(model: &Model, count: usize) -> Vec<usize> {
    let intervals = |axis: &Axis| if axis.periodic { axis.nodes } else { axis.nodes - 1 };
    let first = intervals(&model.axes[0]) as f64;
    let wanted = if model.axes[0].periodic { count } else { count - 1 } as f64;
    model
        .axes
        .iter()
        .map(|axis| {
            let scaled = (intervals(axis) as f64 * wanted / first).round() as usize;
            if axis.periodic { scaled } else { scaled + 1 }
        })
        .collect()
}

fn rates(path: &Path, model: &Model, run: &dyn Fn(&[usize]) -> f64) -> (Vec<f64>, Vec<f64>) {
    let grids = &model.verification.as_ref().expect("grids").grids;
    let errors: Vec<f64> = grids.iter().map(|count| run(&nodes(model, *count))).collect();
    let width = |count: usize| if model.axes[0].periodic { count } else { count - 1 } as f64;
    let rates = grids
        .windows(2)
        .zip(errors.windows(2))
        .map(|(grid, error)| (error[0] / error[1]).ln() / (width(grid[1]) / width(grid[0])).ln())
        .collect();
    assert!(errors.iter().all(|error| error.is_finite()), "{}: {errors:?}", path.display());
    (errors, rates)
}

fn check(path: &Path, model: &Model, target: &str, run: &dyn Fn(&[usize]) -> f64) {
    let (errors, rates) = rates(path, model, run);
    let order = asked_order(model);
    let last = rates.last().copied().unwrap_or(f64::NAN);
    println!("{} {target}: errors {errors:?}, rates {rates:.2?}", path.display());
    assert!(last > order - 0.2, "{} {target}: errors {errors:?}, rates {rates:?}", path.display());
}

fn compiled_targets(language: Language, name: &str) {
    let compiler = match language {
        Language::C => toolchain::find_c(None),
        Language::Rust => toolchain::find_rust(),
    }
    .expect("a compiler for the tests");
    for path in models() {
        let model = model_with_solutions(&path);
        let text = fs::read_to_string(&path).expect("readable");
        let compiled = pipeline::build(model.clone(), &mut Diagnostics::new()).expect("builds");
        let provenance = Provenance { model_text: &text, hash: "0", version: "test" };
        let program = emit(&compiled.kernel, Target { language, form: Form::Program }, provenance);
        let built = compiler.build(&program.files, &program.prefix).expect("compiles");
        let folder = tempfile::tempdir().expect("a temporary folder");
        check(&path, &model, name, &|nodes| {
            let out = folder.path().join(format!("{nodes:?}"));
            let mut arguments: Vec<OsString> = vec!["--out".into(), out.clone().into(), "--quiet".into()];
            for (axis, count) in model.axes.iter().zip(nodes) {
                arguments.extend(["--nodes".into(), format!("{}={count}", axis.name).into()]);
            }
            let ended = run::captured(&built.program, &arguments, folder.path()).expect("runs");
            assert!(ended.ending == Ending::Status(0), "{}: {:?}", path.display(), ended);
            error_in(&out, &model)
        });
    }
}

#[test]
fn solvers_in_c_keep_the_order() {
    compiled_targets(Language::C, "C");
}

#[test]
fn solvers_in_rust_keep_the_order() {
    compiled_targets(Language::Rust, "Rust");
}

#[test]
fn the_executor_keeps_the_order() {
    for path in models() {
        let model = model_with_solutions(&path);
        let compiled = pipeline::build(model.clone(), &mut Diagnostics::new()).expect("builds");
        let folder = tempfile::tempdir().expect("a temporary folder");
        check(&path, &model, "in process", &|nodes| {
            let out = folder.path().join(format!("{nodes:?}"));
            let mut arguments = vec!["--out".to_owned(), out.display().to_string(), "--quiet".to_owned()];
            for (axis, count) in model.axes.iter().zip(nodes) {
                arguments.extend(["--nodes".to_owned(), format!("{}={count}", axis.name)]);
            }
            let provenance = Provenance { model_text: "", hash: "0", version: "test" };
            let mut solver = InProcess::new(compiled.kernel.clone(), provenance);
            assert_eq!(driver::run(&mut solver, &arguments), 0, "{}", path.display());
            error_in(&out, &model)
        });
    }
}

/// A check that cannot fail is a defect: a wrong sign in an exact solution is noticed.
#[test]
fn a_wrong_solution_is_noticed() {
    let path = models().into_iter().find(|path| path.ends_with("slab.rim")).expect("the slab");
    let mut model = model_with_solutions(&path);
    for output in &mut model.outputs {
        output.value = output.value.clone().negative();
    }
    let text = fs::read_to_string(&path).expect("readable");
    let compiled = pipeline::build(model.clone(), &mut Diagnostics::new()).expect("builds");
    let provenance = Provenance { model_text: &text, hash: "0", version: "test" };
    let program = emit(&compiled.kernel, Target { language: Language::C, form: Form::Program }, provenance);
    let built = toolchain::find_c(None)
        .expect("a compiler")
        .build(&program.files, &program.prefix)
        .expect("compiles");
    let folder = tempfile::tempdir().expect("a temporary folder");
    let (_, found) = rates(&path, &model, &|nodes| {
        let out = folder.path().join(format!("{nodes:?}"));
        let arguments: Vec<OsString> = vec![
            "--out".into(),
            out.clone().into(),
            "--nodes".into(),
            format!("x={}", nodes[0]).into(),
            "--quiet".into(),
        ];
        run::captured(&built.program, &arguments, folder.path()).expect("runs");
        error_in(&out, &model)
    });
    assert!(found.iter().all(|rate| rate.abs() < 0.5), "{found:?}");
}

/// Keeps the imports honest: every field of a model with solutions has one.
#[test]
fn every_field_has_its_solution() {
    for path in models() {
        let model = model_with_solutions(&path);
        let named: BTreeMap<FieldId, &Expression> = model
            .verification
            .iter()
            .flat_map(|known| &known.solutions)
            .map(|(field, value)| (*field, value))
            .collect();
        assert_eq!(named.len(), model.fields.len(), "{}", path.display());
    }
}
