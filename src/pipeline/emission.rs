//! From a compiled model to program text, to a built program, to a run.

use std::ffi::OsString;

use crate::emit::{self, Form, Language, Program, Provenance, Target};
use crate::source::SourceFile;
use crate::verify::driver;
use crate::verify::in_process::InProcess;
use crate::verify::run::{self, Ending};
use crate::verify::toolchain::{self, Compiler, ToolError};

use super::compile::{Compiled, hash};

/// What carries out a run.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Engine {
    C(Compiler),
    Rust(Compiler),
    /// The kernel's executor in this process.
    Builtin,
}

impl Engine {
    /// The fastest that this machine can build.
    pub fn fastest() -> Engine {
        let rust = || toolchain::find_rust().map_or(Engine::Builtin, Engine::Rust);
        toolchain::find_c(None).map_or_else(|_| rust(), Engine::C)
    }

    /// For readers.
    pub fn name(&self) -> String {
        match self {
            Engine::C(compiler) | Engine::Rust(compiler) => compiler.name(),
            Engine::Builtin => "the built-in executor".to_owned(),
        }
    }
}

/// The text of a program or a library.
pub fn emit(compiled: &Compiled, source: &SourceFile, target: Target) -> Program {
    let hash = hash(source);
    let provenance =
        Provenance { model_text: source.text(), hash: &hash, version: env!("CARGO_PKG_VERSION") };
    emit::emit(&compiled.kernel, target, provenance)
}

/// Builds where there is something to build, and runs with the arguments of a runnable program.
///
/// # Errors
/// The environment's: a compiler that fails, a program that does not start.
pub fn run(
    compiled: &Compiled,
    source: &SourceFile,
    engine: &Engine,
    arguments: &[OsString],
) -> Result<Ending, ToolError> {
    let (compiler, language) = match engine {
        Engine::C(compiler) => (compiler, Language::C),
        Engine::Rust(compiler) => (compiler, Language::Rust),
        Engine::Builtin => return Ok(run_in_process(compiled, source, arguments)),
    };
    let program = emit(compiled, source, Target { language, form: Form::Program });
    let built = compiler.build(&program.files, &program.prefix)?;
    run::attached(&built.program, arguments)
}

/// The same driver as that of emitted Rust programs, around the executor.
fn run_in_process(compiled: &Compiled, source: &SourceFile, arguments: &[OsString]) -> Ending {
    let hash = hash(source);
    let provenance =
        Provenance { model_text: source.text(), hash: &hash, version: env!("CARGO_PKG_VERSION") };
    let mut solver = InProcess::new(compiled.kernel.clone(), provenance);
    let words: Vec<String> = arguments.iter().map(|word| word.to_string_lossy().into_owned()).collect();
    Ending::Status(driver::run(&mut solver, &words))
}
