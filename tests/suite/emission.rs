//! Emitted C and Rust against a slow reading of the same kernel, bit for bit; and that the text builds without warnings.

pub mod build;
pub mod kernels;
pub mod reference;
mod refused;

use build::{MODEL, compile_c, compile_rust, package, run, unpack};
use reference::Reference;
use rimstone::emit::{Form, Language, Program};
use rimstone::exact::Rational;
use rimstone::kernel::{Kernel, LineOperator};
use std::process::Command;

fn show(lines: &mut String, what: &str, values: &[f64]) {
    lines.push_str(what);
    for value in values {
        lines.push_str(&format!(" {:016x}", value.to_bits()));
    }
    lines.push('\n');
}

/// What the dumping programs print, from the slow reading.
fn expected(kernel: &Kernel, nodes: &[usize]) -> String {
    let mut lines = String::new();
    let mut slow = Reference::new(kernel, nodes, &[]);
    let step = 0.0009765625 * 1.1;
    let mut time = 0.3;
    slow.start(time);
    slow.first_step(time, step);
    (0..kernel.outputs.len()).for_each(|k| slow.begin_maximum(k, time));
    for _ in 0..3 {
        show(&mut lines, "rate", &[slow.largest_rate(time)]);
        slow.advance(time, step, time + step);
        time += step;
        for k in 0..kernel.outputs.len() {
            slow.accumulate_maximum(k, time);
            show(&mut lines, "output", slow.output(k, time));
        }
        for buffer in &kernel.state {
            show(&mut lines, "state", &slow.buffers[buffer.0]);
        }
    }
    for field in &kernel.fields {
        show(&mut lines, "field", &slow.buffers[field.buffer.0]);
    }
    for (axis, count) in kernel.axes.iter().zip(nodes) {
        let (low, high) = (slow.fixed(axis.low), slow.fixed(axis.high));
        let intervals = if axis.periodic { *count } else { count - 1 };
        show(&mut lines, "axis", &[low, high, (high - low) / intervals as f64]);
    }
    for parameter in &kernel.parameters {
        let high = parameter.bounds.map_or(0.0, |bounds| slow.fixed(bounds.1));
        show(&mut lines, "parameter", &[slow.fixed(parameter.default), high]);
    }
    lines += &MODEL.bytes().map(|byte| format!("{byte:02x}")).collect::<String>();
    lines + "\n"
}

/// The first word that differs, for a message that can be read.
fn same(what: &str, kernel: &Kernel, nodes: &[usize], found: &str, wanted: &str) {
    if found == wanted {
        return;
    }
    for (number, (left, right)) in found.lines().zip(wanted.lines()).enumerate() {
        let words = left.split(' ').zip(right.split(' ')).enumerate();
        if let Some((place, (one, other))) = words.into_iter().find(|(_, (one, other))| one != other) {
            let kind = left.split(' ').next().unwrap_or_default();
            panic!(
                "{what}, {} on {nodes:?}: line {number} ({kind}), value {place}: {one} for {other}",
                kernel.name
            );
        }
    }
    panic!(
        "{what}, {} on {nodes:?}: {} lines for {}",
        kernel.name,
        found.lines().count(),
        wanted.lines().count()
    );
}

fn arguments(threads: usize, nodes: &[usize]) -> Vec<String> {
    [threads].iter().chain(nodes).map(usize::to_string).collect()
}

#[test]
fn c_and_rust_compute_the_bits_of_the_kernel() {
    let folder = tempfile::tempdir().expect("a temporary folder");
    let all = kernels::all();
    let rust: Vec<Program> =
        all.iter().map(|(kernel, _)| package(kernel, Language::Rust, Form::Program)).collect();
    let rust = compile_rust(&rust, &folder.path().join("rust"));
    for (place, (kernel, sizes)) in all.iter().enumerate() {
        let c = package(kernel, Language::C, Form::Program);
        let fast =
            compile_c(&c, &folder.path().join(format!("fast{place}")), &["-O3", "-march=native", "-fopenmp"]);
        for nodes in sizes {
            let wanted = expected(kernel, nodes);
            for threads in [1, 3] {
                let given = arguments(threads, nodes);
                same("C", kernel, nodes, &run(&fast, &given), &wanted);
                let given: Vec<String> = std::iter::once(place.to_string()).chain(given).collect();
                same("Rust", kernel, nodes, &run(&rust, &given), &wanted);
            }
        }
    }
}

#[test]
fn c_is_clean_under_sanitizers() {
    let folder = tempfile::tempdir().expect("a temporary folder");
    for (place, (kernel, sizes)) in kernels::all().iter().enumerate() {
        let c = package(kernel, Language::C, Form::Program);
        let flags = ["-O1", "-g", "-fsanitize=address,undefined", "-fno-sanitize-recover=all"];
        let program = compile_c(&c, &folder.path().join(place.to_string()), &flags);
        for nodes in &sizes[..2] {
            same(
                "sanitized C",
                kernel,
                nodes,
                &run(&program, &arguments(1, nodes)),
                &expected(kernel, nodes),
            );
        }
    }
}

#[test]
fn the_packages_build_as_they_are() {
    let folder = tempfile::tempdir().expect("a temporary folder");
    let kernel = kernels::drum();
    let place = |name: &str| folder.path().join(name);
    unpack(&package(&kernel, Language::C, Form::Program), &place("c"));
    unpack(&package(&kernel, Language::C, Form::Library), &place("c_library"));
    unpack(&package(&kernel, Language::Rust, Form::Program), &place("rust"));
    unpack(&package(&kernel, Language::Rust, Form::Library), &place("rust_library"));
    for (name, command, arguments) in [
        ("c", "make", vec!["-s"]),
        ("c", "make", vec!["-s", "portable"]),
        ("c_library", "make", vec!["-s"]),
        ("rust", "cargo", vec!["check", "--offline", "-q"]),
        ("rust_library", "cargo", vec!["check", "--offline", "-q"]),
    ] {
        let output = Command::new(command)
            .args(&arguments)
            .current_dir(place(name))
            .env("RUSTFLAGS", "-Dwarnings")
            .env_remove("MAKEFLAGS")
            .env_remove("CARGO_TARGET_DIR")
            .output()
            .expect("make and cargo are there");
        assert!(output.status.success(), "{name}: {}", String::from_utf8_lossy(&output.stderr));
    }
    assert!(place("c/drum").is_file());
    assert!(place("c_library/libdrum.a").is_file() && place("c_library/libdrum.so").is_file());
}

/// Negative control: the comparison above would see one weight that is off by a part in a thousand million, and the
/// numbers that it compares are numbers.
#[test]
fn the_judge_sees_a_changed_weight() {
    for (mut kernel, sizes) in kernels::all() {
        let good = expected(&kernel, &sizes[1]);
        let not_numbers =
            good.split_whitespace().filter(|word| word.starts_with("7ff") || word.starts_with("fff"));
        assert!(not_numbers.count() * 10 < good.split_whitespace().count(), "{} is not finite", kernel.name);
        if let LineOperator::Constant(operator) = &mut kernel.operators[0].operator {
            let weight = &mut operator.interior[0];
            *weight =
                &*weight * &(Rational::from(1) + Rational::from(2).power(30).recip().expect("not zero"));
        }
        assert!(good != expected(&kernel, &sizes[1]), "{} hides the change", kernel.name);
    }
}

/// Both whole programs, with their drivers: all data files are equal byte for byte.
#[test]
fn both_programs_write_the_same_files() {
    let folder = tempfile::tempdir().expect("a temporary folder");
    let place = |name: &str| folder.path().join(name);
    let kernel = kernels::drum();
    for (language, name, build) in [
        (Language::C, "c", ["make", "-s", "portable"].as_slice()),
        (Language::Rust, "rust", ["cargo", "build", "--release", "--offline", "-q"].as_slice()),
    ] {
        unpack(&package(&kernel, language, Form::Program), &place(name));
        let mut command = Command::new(build[0]);
        command
            .args(&build[1..])
            .current_dir(place(name))
            .env_remove("MAKEFLAGS")
            .env_remove("CARGO_TARGET_DIR");
        assert!(command.status().expect("make and cargo are there").success(), "{name} does not build");
    }
    for (program, out) in [("c/drum", "from_c"), ("rust/target/release/drum", "from_rust")] {
        let mut command = Command::new(place(program));
        command.arg("--out").arg(place(out)).args(["--quiet", "--nodes", "x=17"]);
        assert!(command.output().expect("the program starts").status.success(), "{program} fails");
    }
    let mut compared = 0;
    for path in ["gauges.csv", "index.xmf", "model.rim", "u/000000.npy", "u/000001.npy", "speed/000003.npy"] {
        let read = |out: &str| {
            std::fs::read(place(out).join(path)).unwrap_or_else(|fault| panic!("{path}: {fault}"))
        };
        let (left, right) = (read("from_c"), read("from_rust"));
        assert!(left == right && !left.is_empty(), "{path} differs");
        compared += 1;
    }
    assert_eq!(compared, 6);
}

#[test]
fn the_same_kernel_gives_the_same_bytes() {
    for (kernel, _) in kernels::all() {
        for language in [Language::C, Language::Rust] {
            let program = package(&kernel, language, Form::Program);
            assert_eq!(program, package(&kernel, language, Form::Program));
            let kernel_text = program
                .files
                .iter()
                .find(|(path, _)| path.ends_with("kernel.rs") || **path == format!("{}.c", program.prefix));
            let (_, text) = kernel_text.expect("there is a kernel");
            assert!(!text.contains("leaf_") && !text.contains("unknown"));
        }
    }
}
