//! Emitted packages built with the machine's compilers and run for their bits.

use rimstone::emit::{Form, Language, Program, Provenance, Target, emit};
use rimstone::kernel::{Kernel, validate};
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

/// Text of a model with everything that strings must survive.
pub const MODEL: &str = "model \"x\" # ??/ \\ \t*/ \u{202e} κ\nlast line without end";

pub fn package(kernel: &Kernel, language: Language, form: Form) -> Program {
    let valid = validate(kernel.clone()).expect("a kernel of the tests is valid");
    let provenance = Provenance { model_text: MODEL, hash: "0123abcd", version: "0.0-test" };
    emit(&valid, Target { language, form }, provenance)
}

/// Writes the files below `folder`.
pub fn unpack(program: &Program, folder: &Path) {
    for (path, text) in &program.files {
        let place = folder.join(path);
        std::fs::create_dir_all(place.parent().expect("inside the folder")).expect("a writable folder");
        std::fs::write(place, text).expect("a writable folder");
    }
}

fn succeed(command: &mut Command) -> Output {
    let output = command.output().unwrap_or_else(|fault| panic!("{command:?} does not start: {fault}"));
    assert!(
        output.status.success(),
        "{command:?} failed:\n{}\n{}",
        String::from_utf8_lossy(&output.stdout),
        String::from_utf8_lossy(&output.stderr)
    );
    output
}

/// Compiles the kernel with a program that dumps bits; `flags` go to the compiler.
pub fn compile_c(program: &Program, folder: &Path, flags: &[&str]) -> PathBuf {
    unpack(program, folder);
    let main = include_str!("dump.c").replace("PREFIX", &program.prefix);
    std::fs::write(folder.join("dump.c"), main).expect("a writable folder");
    let target = folder.join("dump");
    let strict = [
        "-std=c11",
        "-O2",
        "-Wall",
        "-Wextra",
        "-Wpedantic",
        "-Werror",
        "-ffp-contract=off",
        "-fno-math-errno",
    ];
    let source = format!("{}.c", program.prefix);
    succeed(
        Command::new("cc")
            .args(strict)
            .args(flags)
            .args(["dump.c", &source, "-o", "dump", "-lm"])
            .current_dir(folder),
    );
    target
}

/// One crate for all kernels; the program takes the kernel's place in the list as its first argument.
pub fn compile_rust(programs: &[Program], folder: &Path) -> PathBuf {
    let mut main = String::from("#![deny(warnings)]\n#[allow(unused_imports, dead_code)]\nmod driver;\n");
    for (place, program) in programs.iter().enumerate() {
        unpack(program, folder);
        let kernel = &program.files["src/kernel.rs"];
        std::fs::write(folder.join(format!("src/kernel_{place}.rs")), kernel).expect("a writable folder");
        main += &format!("mod kernel_{place};\n");
    }
    let arms: String = (0..programs.len())
        .map(|place| format!("        {place} => Box::new(kernel_{place}::Kernel::new()),\n"))
        .collect();
    main += &include_str!("dump.txt").replace("ARMS", &arms);
    std::fs::write(folder.join("src/dump.rs"), main).expect("a writable folder");
    let flags = ["--edition", "2024", "-Copt-level=2", "-Ctarget-cpu=native", "src/dump.rs", "-o", "dump"];
    succeed(Command::new("rustc").args(flags).current_dir(folder));
    folder.join("dump")
}

pub fn run(program: &Path, arguments: &[String]) -> String {
    let output = succeed(Command::new(program).args(arguments).env("ASAN_OPTIONS", "detect_leaks=1"));
    String::from_utf8(output.stdout).expect("hexadecimal digits")
}
