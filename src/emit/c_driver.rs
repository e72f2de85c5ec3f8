//! The C program around a kernel, `main.c`: its parts and their order.
//!
//! The text stands in `templates/c/driver/`; only the prefix of the kernel's names is put in. What the kernel itself looks
//! like is no concern of this file.

/// The parts in the order of the program: each uses only what stands before it.
const PARTS: [&str; 9] = [
    include_str!("../../templates/c/driver/1_base.c"),
    include_str!("../../templates/c/driver/2_options.c"),
    include_str!("../../templates/c/driver/3_files.c"),
    include_str!("../../templates/c/driver/4_state.c"),
    include_str!("../../templates/c/driver/5_output.c"),
    include_str!("../../templates/c/driver/6_index.c"),
    include_str!("../../templates/c/driver/7_checkpoint.c"),
    include_str!("../../templates/c/driver/8_steps.c"),
    include_str!("../../templates/c/driver/9_main.c"),
];

/// `main.c` for a kernel whose names begin with `prefix`, a legal C identifier, declared in `PREFIX.h`.
pub fn main_text(prefix: &str) -> String {
    PARTS.concat().replace("{{ prefix }}", prefix)
}

#[cfg(test)]
mod tests {
    use super::main_text;

    /// Ends of the names that a kernel's header declares after `PREFIX_`. The driver has no names of its own that end so:
    /// whatever the prefix, the two do not clash.
    const KERNEL_NAMES: [&str; 35] = [
        "solver",
        "axis_info",
        "parameter_info",
        "field_info",
        "output_info",
        "description",
        "describe",
        "create",
        "destroy",
        "parameter",
        "parameter_low",
        "parameter_high",
        "parameter_scale",
        "low",
        "high",
        "spacing",
        "start_time",
        "end_time",
        "step_duration",
        "every",
        "place",
        "scale",
        "field_scale",
        "start",
        "first_step",
        "largest_rate",
        "advance",
        "field",
        "output",
        "begin_maximum",
        "accumulate_maximum",
        "state_count",
        "state",
        "points",
        "memory",
    ];

    #[test]
    fn only_the_prefix_is_put_in() {
        let text = main_text("wall");
        assert!(!text.contains("{{") && !text.contains("{%") && !text.contains("{#"));
        assert!(text.contains("#include \"wall.h\""));
    }

    #[test]
    fn no_name_of_the_driver_can_be_a_kernels() {
        let text = main_text("0");
        let words = text.split(|character: char| !character.is_ascii_alphanumeric() && character != '_');
        let clashing: Vec<&str> = words
            .filter(|word| !word.starts_with('0') && *word != "va_start")
            .filter(|word| {
                KERNEL_NAMES.iter().any(|end| word.strip_suffix(end).is_some_and(|stem| stem.ends_with('_')))
            })
            .collect();
        assert!(clashing.is_empty(), "{clashing:?}");
    }
}
