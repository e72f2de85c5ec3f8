//! The program's entry: the exit status and nothing else.

fn main() -> std::process::ExitCode {
    rimstone::cli::main()
}
