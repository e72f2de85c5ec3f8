//! Compilers of this machine: finding one, trying it, building an emitted package with it.
//!
//! What goes wrong here is the environment's fault, never the model's: a [`ToolError`] with a hint. Where built programs are
//! kept is the business of `cache`.

use std::collections::BTreeMap;
use std::env;
use std::fmt;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use super::cache;

/// The environment cannot build or run.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum ToolError {
    /// None of these commands compiles a program of one line.
    NoCompiler { language: &'static str, tried: Vec<Refusal> },
    /// The compiler refused an emitted program; `output` is all it said.
    Compiler { command: String, output: String },
    /// A file or folder cannot be read or written.
    Folder { path: PathBuf, reason: String },
    /// A program cannot be started.
    Start { program: PathBuf, reason: String },
}

/// A command that does not serve, and why.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Refusal {
    pub command: String,
    pub reason: String,
}

impl ToolError {
    /// What the reader can do about it.
    pub fn hint(&self) -> &'static str {
        match self {
            ToolError::NoCompiler { language: "C", .. } => {
                "install a C compiler (gcc or clang), or name one with --cc or the variable CC"
            }
            ToolError::NoCompiler { .. } => "install Rust, or name its compiler with the variable RUSTC",
            ToolError::Compiler { .. } => {
                "the emitted program should compile everywhere; please report this with the model"
            }
            ToolError::Folder { .. } => {
                "check permissions and free space; the variable XDG_CACHE_HOME moves the folder of built programs"
            }
            ToolError::Start { .. } => {
                "check that programs may be executed where it lies; the variable XDG_CACHE_HOME moves it"
            }
        }
    }

    pub(super) fn folder(path: &Path, reason: &std::io::Error) -> ToolError {
        ToolError::Folder { path: path.to_owned(), reason: reason.to_string() }
    }
}

impl fmt::Display for ToolError {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            ToolError::NoCompiler { language, tried } => {
                write!(out, "no {language} compiler works here")?;
                tried
                    .iter()
                    .try_for_each(|refusal| write!(out, "\n  {}: {}", refusal.command, refusal.reason))
            }
            ToolError::Compiler { command, output } => {
                write!(out, "the compiler failed: {command}\n{output}")
            }
            ToolError::Folder { path, reason } => write!(out, "cannot use '{}': {reason}", path.display()),
            ToolError::Start { program, reason } => {
                write!(out, "cannot start '{}': {reason}", program.display())
            }
        }
    }
}

impl std::error::Error for ToolError {}

/// Flags for programs that run on the machine that builds them, without contraction: bits are the same from all targets.
const C_FLAGS: [&str; 4] = ["-std=c11", "-O3", "-ffp-contract=off", "-fno-math-errno"];
/// Flags that are left out where the compiler does not know them: for its own machine, with threads.
const C_WISHES: [&str; 2] = ["-march=native", "-fopenmp"];
const RUST_FLAGS: [&str; 5] =
    ["--edition=2021", "-Copt-level=3", "-Ctarget-cpu=native", "--cap-lints=allow", "-Cdebuginfo=0"];

/// Files of an emitted package: path with `/` → text.
pub type Files = BTreeMap<String, String>;

/// A compiler that compiles.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Compiler {
    /// The program and the arguments that always come first.
    command: Vec<String>,
    /// Where the program lies.
    path: PathBuf,
    /// All that `--version` says.
    version: String,
    flags: Vec<String>,
    language: &'static str,
}

/// A built program. A temporary one goes away with this value.
#[derive(Debug)]
pub struct Built {
    pub program: PathBuf,
    pub(super) _kept: Option<tempfile::TempDir>,
}

/// Finds a C compiler: the one named (a command split on spaces), else `$CC`, `cc`, `gcc`, `clang`.
///
/// # Errors
/// None of them compiles a program of one line. A named one that fails is not replaced by another.
pub fn find_c(named: Option<&str>) -> Result<Compiler, ToolError> {
    let from_environment = env::var("CC").ok().filter(|command| !command.trim().is_empty());
    let candidates: Vec<String> = match named.map(str::to_owned).or(from_environment) {
        Some(command) => vec![command],
        None => ["cc", "gcc", "clang"].map(str::to_owned).to_vec(),
    };
    first_that_works("C", &candidates, try_c)
}

/// Finds a Rust compiler: `$RUSTC`, else `rustc`.
///
/// # Errors
/// It does not compile a program of one line.
pub fn find_rust() -> Result<Compiler, ToolError> {
    let command = env::var("RUSTC").ok().filter(|command| !command.trim().is_empty());
    first_that_works("Rust", &[command.unwrap_or_else(|| "rustc".to_owned())], try_rust)
}

impl Compiler {
    /// Whether programs that it builds use more than one thread.
    pub fn has_threads(&self) -> bool {
        self.language == "Rust" || self.flags.iter().any(|flag| flag == "-fopenmp")
    }

    /// Its command and the first line of its version.
    pub fn name(&self) -> String {
        format!("{} ({})", self.command.join(" "), self.version.lines().next().unwrap_or_default())
    }

    /// Builds the program of a package, or finds it built: all `.c` files for C, `src/main.rs` for Rust.
    ///
    /// # Errors
    /// The compiler fails, or the files cannot be written.
    pub fn build(&self, files: &Files, name: &str) -> Result<Built, ToolError> {
        let parts =
            [&self.path.display().to_string(), &self.version, &self.command.join(" "), &self.flags.join(" ")];
        let name = format!("{name}{}", env::consts::EXE_SUFFIX);
        cache::built(&cache::key(files, &parts.map(String::as_str)), &name, |folder| {
            self.build_in(folder, files, &name)
        })
    }

    fn build_in(&self, folder: &Path, files: &Files, name: &str) -> Result<(), ToolError> {
        write_files(folder, files)?;
        let mut command = self.start();
        command.current_dir(folder).args(&self.flags).arg("-o").arg(name);
        if self.language == "C" {
            command.args(files.keys().filter(|path| path.ends_with(".c"))).arg("-lm");
        } else {
            command.arg("src/main.rs");
        }
        let output = output_of(&mut command)?;
        if output.status.success() {
            Ok(())
        } else {
            Err(ToolError::Compiler { command: shown(&command), output: said(&output) })
        }
    }

    fn start(&self) -> Command {
        let mut command = Command::new(&self.path);
        command.args(&self.command[1..]);
        command
    }

    /// Why it does not build a program of one line, if so.
    fn refusal(&self, file: &str, text: &str) -> Option<String> {
        let folder = match tempfile::tempdir() {
            Ok(folder) => folder,
            Err(reason) => return Some(reason.to_string()),
        };
        let files = Files::from([(file.to_owned(), text.to_owned())]);
        match self.build_in(folder.path(), &files, "trial") {
            Ok(()) => None,
            Err(ToolError::Compiler { output, .. }) => Some(output.trim_end().replace('\n', "\n    ")),
            Err(other) => Some(other.to_string()),
        }
    }
}

fn first_that_works(
    language: &'static str,
    candidates: &[String],
    attempt: impl Fn(&str) -> Result<Compiler, String>,
) -> Result<Compiler, ToolError> {
    let mut tried = Vec::new();
    for command in candidates {
        match attempt(command) {
            Ok(compiler) => return Ok(compiler),
            Err(reason) => tried.push(Refusal { command: command.clone(), reason }),
        }
    }
    Err(ToolError::NoCompiler { language, tried })
}

/// Takes as many of the wishes as the compiler grants.
fn try_c(command: &str) -> Result<Compiler, String> {
    let mut compiler = named(command, "C")?;
    let trial = "int main(void) { return 0; }\n";
    let base: Vec<String> = C_FLAGS.map(str::to_owned).to_vec();
    let [native, threads] = C_WISHES.map(str::to_owned);
    let offers = [vec![native.clone(), threads.clone()], vec![native], vec![threads], Vec::new()];
    let mut reason = String::new();
    for wishes in offers {
        compiler.flags = [base.clone(), wishes].concat();
        match compiler.refusal("trial.c", trial) {
            None => return Ok(compiler),
            Some(refused) => reason = refused,
        }
    }
    Err(reason)
}

fn try_rust(command: &str) -> Result<Compiler, String> {
    let mut compiler = named(command, "Rust")?;
    compiler.flags = RUST_FLAGS.map(str::to_owned).to_vec();
    match compiler.refusal("src/main.rs", "fn main() {}\n") {
        None => Ok(compiler),
        Some(reason) => Err(reason),
    }
}

/// A command that starts and knows its version.
fn named(command: &str, language: &'static str) -> Result<Compiler, String> {
    let command: Vec<String> = command.split_whitespace().map(str::to_owned).collect();
    let Some(program) = command.first() else { return Err("the command is empty".to_owned()) };
    let path = on_path(program).ok_or("not found")?;
    let mut compiler = Compiler { command, path, version: String::new(), flags: Vec::new(), language };
    let output = output_of(compiler.start().arg("--version")).map_err(|fault| fault.to_string())?;
    if !output.status.success() {
        return Err(said(&output));
    }
    compiler.version = String::from_utf8_lossy(&output.stdout).into_owned();
    Ok(compiler)
}

/// The file that a command names, as a shell finds it.
fn on_path(program: &str) -> Option<PathBuf> {
    if program.contains(std::path::is_separator) {
        return fs::canonicalize(program).ok();
    }
    let folders = env::var_os("PATH")?;
    let file = format!("{program}{}", env::consts::EXE_SUFFIX);
    env::split_paths(&folders).map(|folder| folder.join(&file)).find(|path| is_executable(path))
}

#[cfg(unix)]
fn is_executable(path: &Path) -> bool {
    use std::os::unix::fs::PermissionsExt;
    fs::metadata(path).is_ok_and(|entry| entry.is_file() && entry.permissions().mode() & 0o111 != 0)
}

#[cfg(not(unix))]
fn is_executable(path: &Path) -> bool {
    path.is_file()
}

/// Writes a package below a folder.
///
/// # Errors
/// The file system refuses.
pub fn write_files(folder: &Path, files: &Files) -> Result<(), ToolError> {
    for (name, text) in files {
        let path = folder.join(name);
        let parent = path.parent().unwrap_or(folder);
        fs::create_dir_all(parent).map_err(|reason| ToolError::folder(parent, &reason))?;
        fs::write(&path, text).map_err(|reason| ToolError::folder(&path, &reason))?;
    }
    Ok(())
}

fn output_of(command: &mut Command) -> Result<Output, ToolError> {
    // Messages in one language, whatever the reader's: they are kept and compared.
    command.env("LC_ALL", "C").output().map_err(|reason| ToolError::Start {
        program: PathBuf::from(command.get_program()),
        reason: reason.to_string(),
    })
}

/// All that a program said, as it said it.
fn said(output: &Output) -> String {
    format!("{}{}", String::from_utf8_lossy(&output.stdout), String::from_utf8_lossy(&output.stderr))
}

fn shown(command: &Command) -> String {
    let words = std::iter::once(command.get_program()).chain(command.get_args());
    words.map(|word| word.to_string_lossy().into_owned()).collect::<Vec<_>>().join(" ")
}

#[cfg(test)]
mod tests {
    use super::*;

    fn package(text: &str) -> Files {
        Files::from([("main.c".to_owned(), text.to_owned())])
    }

    #[test]
    fn what_compiles_is_built_once() {
        let compiler = find_c(None).expect("these tests need a C compiler");
        let files = package("int main(void) { return 7; } /* once */\n");
        let first = compiler.build(&files, "seven").expect("it compiles");
        let status = Command::new(&first.program).status().expect("it starts");
        assert_eq!(status.code(), Some(7));
        let made = |built: &Built| {
            fs::metadata(&built.program).and_then(|entry| entry.modified()).expect("it is there")
        };
        let second = compiler.build(&files, "seven").expect("it compiles");
        if first._kept.is_none() {
            assert_eq!((made(&first), &first.program), (made(&second), &second.program));
        }
        let other = compiler.build(&package("int main(void) { return 8; }\n"), "seven").expect("it compiles");
        assert_ne!(first.program, other.program);
    }

    #[test]
    fn a_failure_of_the_compiler_is_shown_as_it_is() {
        let compiler = find_c(None).expect("these tests need a C compiler");
        let fault = compiler
            .build(&package("int main(void) { return sandpiper; }\n"), "no")
            .expect_err("it does not compile");
        let ToolError::Compiler { command, output } = &fault else { panic!("{fault}") };
        assert!(command.contains("-ffp-contract=off") && command.contains("main.c"), "{command}");
        assert!(output.contains("sandpiper") && output.contains("main.c:1"), "{output}");
    }

    #[test]
    fn a_named_compiler_is_not_replaced() {
        let fault = find_c(Some("no-such-compiler-here -v")).expect_err("there is none");
        let ToolError::NoCompiler { tried, .. } = &fault else { panic!("{fault}") };
        assert_eq!(tried.len(), 1);
        assert!(
            fault.to_string().contains("no-such-compiler-here -v: not found")
                && fault.hint().contains("--cc")
        );
    }

    #[test]
    fn words_after_the_command_are_kept() {
        let compiler = find_c(Some("cc -DANSWER=42")).expect("these tests need a C compiler");
        let built =
            compiler.build(&package("int main(void) { return ANSWER; }\n"), "answer").expect("it compiles");
        assert_eq!(Command::new(&built.program).status().expect("it starts").code(), Some(42));
    }
}
