//! The Rust program around a kernel: files that go into every emitted package as they are.

/// Path below `src/` and text. The same files are compiled into this crate for runs in process.
pub const FILES: [(&str, &str); 16] = [
    ("driver.rs", include_str!("../../templates/rust/driver.rs")),
    ("driver/checkpoint.rs", include_str!("../../templates/rust/driver/checkpoint.rs")),
    ("driver/checkpoint_read.rs", include_str!("../../templates/rust/driver/checkpoint_read.rs")),
    ("driver/file.rs", include_str!("../../templates/rust/driver/file.rs")),
    ("driver/folder.rs", include_str!("../../templates/rust/driver/folder.rs")),
    ("driver/index.rs", include_str!("../../templates/rust/driver/index.rs")),
    ("driver/march.rs", include_str!("../../templates/rust/driver/march.rs")),
    ("driver/measure.rs", include_str!("../../templates/rust/driver/measure.rs")),
    ("driver/number.rs", include_str!("../../templates/rust/driver/number.rs")),
    ("driver/options.rs", include_str!("../../templates/rust/driver/options.rs")),
    ("driver/output.rs", include_str!("../../templates/rust/driver/output.rs")),
    ("driver/progress.rs", include_str!("../../templates/rust/driver/progress.rs")),
    ("driver/signal.rs", include_str!("../../templates/rust/driver/signal.rs")),
    ("driver/state.rs", include_str!("../../templates/rust/driver/state.rs")),
    ("driver/steps.rs", include_str!("../../templates/rust/driver/steps.rs")),
    ("driver/usage.rs", include_str!("../../templates/rust/driver/usage.rs")),
];
