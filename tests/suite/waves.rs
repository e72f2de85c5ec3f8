//! Plans change no bit: steps in waves, on any number of threads, against pass after pass on one thread.

use rimstone::emit::{Form, Language, Program, Target};
use rimstone::pipeline;
use rimstone::source::SourceFile;
use std::path::{Path, PathBuf};
use std::process::Command;

/// Caches so small that bands and several steps in a wave fit the sizes of these tests, and none at all.
const WAVES: [&str; 2] = ["-DNEAR_CACHE=100000", "-DFAR_CACHE=400000"];
const SHORT: [&str; 2] = ["-DNEAR_CACHE=30000", "-DFAR_CACHE=60000"];
const PLAIN: [&str; 2] = ["-DNEAR_CACHE=1", "-DFAR_CACHE=1"];

fn package(model: &str) -> Program {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-models").join(model);
    let source: SourceFile = pipeline::read(&path).expect("a demo model");
    let (compiled, _) =
        pipeline::compile(&source, &pipeline::Overrides::default()).expect("a demo model compiles");
    pipeline::emission::emit(&compiled, &source, Target { language: Language::C, form: Form::Library })
}

fn build(program: &Program, folder: &Path, name: &str, flags: &[&str]) -> PathBuf {
    for (path, text) in &program.files {
        std::fs::write(folder.join(path), text).expect("a writable folder");
    }
    let main = include_str!("waves/main.c").replace("PREFIX", &program.prefix);
    std::fs::write(folder.join("main.c"), main).expect("a writable folder");
    let source = format!("{}.c", program.prefix);
    let output = Command::new("cc")
        .args(["-std=c11", "-O2", "-Wall", "-Wextra", "-Werror", "-ffp-contract=off", "-fno-math-errno"])
        .args(["-fopenmp", "-DLEAST_SHARED=0"])
        .args(flags)
        .args(["main.c", &source, "-o", name, "-lm"])
        .current_dir(folder)
        .output()
        .expect("a C compiler");
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    folder.join(name)
}

fn hashes(program: &Path, threads: usize, nodes: &[usize]) -> String {
    let output = Command::new(program)
        .args([threads.to_string(), "11".to_owned()])
        .args(nodes.iter().map(usize::to_string))
        .output()
        .expect("a built program");
    assert!(output.status.success(), "{program:?} with {nodes:?} failed");
    String::from_utf8(output.stdout).expect("hexadecimal digits")
}

fn agree(model: &str, sizes: &[&[usize]]) {
    let folder = tempfile::tempdir().expect("a folder");
    let program = package(model);
    let plain = build(&program, folder.path(), "plain", &PLAIN);
    let plans = [("waves", WAVES), ("short", SHORT)];
    let plans = plans.map(|(name, flags)| build(&program, folder.path(), name, &flags));
    for nodes in sizes {
        let expected = hashes(&plain, 1, nodes);
        assert!(expected.contains(" 1\n") && !expected.contains(" 0\n"), "{model} {nodes:?}: {expected}");
        for plan in &plans {
            for threads in 1..=4 {
                assert_eq!(hashes(plan, threads, nodes), expected, "{model} {plan:?} {threads} {nodes:?}");
            }
        }
    }
}

#[test]
fn stages_and_faces_of_a_plane() {
    agree("hot_plate.rim", &[&[17, 23], &[71, 19], &[401, 20]]);
}

#[test]
fn two_levels_in_time() {
    agree("drum.rim", &[&[19, 23], &[83, 17], &[400, 12]]);
}

#[test]
fn a_periodic_plane() {
    agree("pattern.rim", &[&[9, 23], &[71, 19], &[401, 20]]);
}

#[test]
fn a_block_of_three_axes() {
    agree("block.rim", &[&[23, 17, 19], &[131, 14, 13]]);
}

#[test]
fn blocks_of_a_line() {
    agree("vault_wall.rim", &[&[1025], &[50_001]]);
}
