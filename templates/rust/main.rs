//! {{ title }}
//!
//! Made by rimstone {{ version }}. Build with `cargo build --release`; for the instructions of this machine set
//! `RUSTFLAGS=-Ctarget-cpu=native`. Results do not depend on it.

#[allow(unused_imports, reason = "a program uses less of the driver than a library offers")]
mod driver;
mod kernel;

fn main() {
    let arguments: Vec<String> =
        std::env::args_os().skip(1).map(|argument| argument.to_string_lossy().into_owned()).collect();
    std::process::exit(driver::run(&mut kernel::Kernel::new(), &arguments));
}
