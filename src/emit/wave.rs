//! The plan of a step in C: the wave over the row functions of its passes, or pass after pass.

use super::context::Context;
use super::render;
use super::routines::Routines;
use super::text::Text;
use crate::kernel::plan::{Wave, wave};

/// Nodes of a block where there is one axis: longer than any closure, short enough that many fit the nearest cache.
const BLOCK: usize = 1024;

/// The functions that take steps, with their swaps of buffers.
pub fn steps(context: &Context, routines: &Routines, swaps: &[String]) -> String {
    match wave(context.kernel) {
        Some(plan) => by_wave(context, routines, swaps, &plan),
        None => plain(context, routines, swaps),
    }
}

/// Whether steps run by a wave, so that no function that runs a whole pass is wanted.
pub fn has_wave(context: &Context) -> bool {
    wave(context.kernel).is_some()
}

fn by_wave(context: &Context, routines: &Routines, swaps: &[String], plan: &Wave) -> String {
    let line = context.axes.len() == 1;
    let mut cases = Text::indented(1);
    for (pass, call) in routines.step_parts.iter().enumerate() {
        cases.line(&format!("case {pass}:"));
        cases.line(&format!("    {call};"));
        cases.line("    break;");
    }
    let mut rotation = Text::indented(1);
    if swaps.is_empty() {
        rotation.line("(void)s;");
    }
    swaps.iter().for_each(|swap| rotation.line(&format!("{swap};")));
    let shifts: Vec<String> = plan.shift.iter().map(usize::to_string).collect();
    let note = if line { format!(" (here {BLOCK} nodes)") } else { String::new() };
    let number = |count: usize| count.to_string();
    render(
        include_str!("../../templates/c/wave.c"),
        &[
            ("prefix", context.prefix.clone()),
            ("block_note", note),
            ("passes", number(plan.shift.len())),
            ("step_shift", number(plan.step_shift)),
            ("ends", number(plan.ends)),
            ("period", number(plan.period)),
            ("arrays", number(plan.arrays.max(1))),
            ("periodic", number(usize::from(context.kernel.axes[0].periodic))),
            ("block", number(if line { BLOCK } else { 1 })),
            ("shifts", shifts.join(", ")),
            ("cases", cases.into_string()),
            ("swaps", rotation.into_string()),
            ("slab_rows", context.slab_rows().to_owned()),
        ],
    )
}

fn plain(context: &Context, routines: &Routines, swaps: &[String]) -> String {
    let prefix = &context.prefix;
    let mut text = Text::default();
    text.comment("The plan of a step: pass after pass.");
    text.open(&format!(
        "void {prefix}_advance({prefix}_solver *s, double time, double step, double next) {{"
    ));
    text.line("(void)time;");
    text.line("(void)next;");
    text.line("s->last_step = step;");
    routines.step.iter().chain(swaps).for_each(|call| text.line(&format!("{call};")));
    text.close("}");
    text.blank();
    text.open(&format!(
        "void {prefix}_advance_steps({prefix}_solver *s, size_t count, const double *times, double step) {{"
    ));
    text.open("for (size_t k = 0; k < count; k++) {");
    text.line(&format!("{prefix}_advance(s, times[k], step, times[k + 1]);"));
    text.close("}");
    text.close("}");
    text.blank();
    text.into_string()
}
