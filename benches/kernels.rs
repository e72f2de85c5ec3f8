//! Emitted C against plain OpenMP loops written by hand, in one run of one program for each workload, as ratios.
//!
//! `cargo bench --bench kernels [-- small] [-- w2 w5 …]`. No figure is asserted: they depend on the machine and on what
//! else it does. Here is no judgement of results either; bits are compared in the tests.

use rimstone::emit::{Form, Language, Target};
use rimstone::pipeline;
use rimstone::source::SourceFile;
use rimstone::verify::toolchain;
use std::process::{Command, ExitCode};

/// A workload: its model, its plain loops, steps in a round, rounds, nodes.
struct Workload {
    name: &'static str,
    model: &'static str,
    hand: &'static str,
    steps: usize,
    rounds: usize,
    nodes: &'static [usize],
}

macro_rules! workload {
    ($name:literal, $steps:literal, $rounds:literal, $nodes:expr) => {
        Workload {
            name: $name,
            model: include_str!(concat!("kernels/", $name, ".rim")),
            hand: include_str!(concat!("kernels/", $name, ".c")),
            steps: $steps,
            rounds: $rounds,
            nodes: &$nodes,
        }
    };
}

const WORKLOADS: [Workload; 7] = [
    workload!("w1", 64, 7, [1_000_000]),
    workload!("w2", 32, 7, [2048, 2048]),
    workload!("w3", 3, 4, [2048, 2048]),
    workload!("w4", 12, 5, [256, 256, 256]),
    workload!("w5", 6, 4, [256, 256, 256]),
    workload!("w7", 32, 7, [1024, 1024]),
    workload!("w8", 6, 5, [1024, 1024]),
];

fn main() -> ExitCode {
    let words: Vec<String> = std::env::args().skip(1).filter(|word| !word.starts_with('-')).collect();
    let small = words.iter().any(|word| word == "small");
    let wanted =
        |name: &str| words.iter().all(|word| word == "small") || words.iter().any(|word| word == name);
    println!("workload   Mpt/s: waves  single   plain   ratio: waves  single   copy GB/s");
    let mut failed = false;
    for workload in WORKLOADS.iter().filter(|workload| wanted(workload.name)) {
        match measure(workload, small) {
            Ok([waves, single, plain, copy]) => println!(
                "{:8} {:15.0} {:7.0} {:7.0} {:14.2} {:7.2} {:11.1}",
                workload.name,
                1e-6 / waves,
                1e-6 / single,
                1e-6 / plain,
                plain / waves,
                plain / single,
                1e-9 * copy
            ),
            Err(fault) => {
                failed = true;
                println!("{:8} {fault}", workload.name);
            }
        }
    }
    if failed { ExitCode::FAILURE } else { ExitCode::SUCCESS }
}

/// Seconds for each node and step of waves, single steps and plain loops, and bytes copied in a second.
fn measure(workload: &Workload, small: bool) -> Result<[f64; 4], String> {
    let source = SourceFile::from_bytes(workload.name.to_owned(), workload.model.as_bytes().to_vec());
    let (compiled, _) = pipeline::compile(&source, &pipeline::Overrides::default())
        .map_err(|_| "the model does not compile".to_owned())?;
    let target = Target { language: Language::C, form: Form::Library };
    let program = pipeline::emission::emit(&compiled, &source, target);
    let mut files = program.files;
    files.insert("shared.h".to_owned(), include_str!("kernels/shared.h").to_owned());
    files.insert("hand.c".to_owned(), workload.hand.to_owned());
    let main = include_str!("kernels/main.c").replace("PREFIX", &program.prefix);
    files.insert("main.c".to_owned(), main);
    let compiler = toolchain::find_c(None).map_err(|fault| fault.to_string())?;
    let built = compiler.build(&files, "bench").map_err(|fault| fault.to_string())?;
    let nodes = workload.nodes.iter().map(|count| if small { count / 2 } else { *count });
    let output = Command::new(&built.program)
        .args([workload.steps.to_string(), workload.rounds.to_string()])
        .args(nodes.map(|count| count.to_string()))
        .env("OMP_PROC_BIND", "true")
        .output()
        .map_err(|fault| fault.to_string())?;
    let text = String::from_utf8_lossy(&output.stdout).into_owned();
    let numbers: Vec<f64> = text.split_whitespace().filter_map(|word| word.parse().ok()).collect();
    numbers.try_into().map_err(|_| format!("the program failed: {text}"))
}
