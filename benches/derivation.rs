//! Seconds from a model to its kernel and from the kernel to C text, for every demo model. Nothing is asserted.

use rimstone::emit::{Form, Language, Target};
use rimstone::pipeline;
use std::path::Path;
use std::process::ExitCode;
use std::time::Instant;

/// Best of so many rounds.
const ROUNDS: usize = 5;

fn main() -> ExitCode {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-models");
    let Ok(entries) = std::fs::read_dir(&folder) else { return ExitCode::FAILURE };
    let mut paths: Vec<_> = entries.filter_map(|entry| Some(entry.ok()?.path())).collect();
    paths.sort();
    println!("model              derivation ms   emission ms   lines of C");
    for path in paths.iter().filter(|path| path.extension().is_some_and(|ending| ending == "rim")) {
        let Ok(source) = pipeline::read(path) else { return ExitCode::FAILURE };
        let (mut derivation, mut emission, mut lines) = (f64::INFINITY, f64::INFINITY, 0);
        for _ in 0..ROUNDS {
            let begin = Instant::now();
            let Ok((compiled, _)) = pipeline::compile(&source, &pipeline::Overrides::default()) else {
                println!("{} does not compile", path.display());
                return ExitCode::FAILURE;
            };
            derivation = derivation.min(begin.elapsed().as_secs_f64());
            let begin = Instant::now();
            let target = Target { language: Language::C, form: Form::Library };
            let program = pipeline::emission::emit(&compiled, &source, target);
            emission = emission.min(begin.elapsed().as_secs_f64());
            lines = program.files[&format!("{}.c", program.prefix)].lines().count();
        }
        let name = path.file_stem().unwrap_or_default().to_string_lossy();
        println!("{name:18} {:13.1} {:13.1} {lines:12}", 1e3 * derivation, 1e3 * emission);
    }
    ExitCode::SUCCESS
}
