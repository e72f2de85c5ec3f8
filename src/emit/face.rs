//! Face passes as functions: buffers set at the nodes of one face.

use super::context::Context;
use super::language::Language;
use super::leaves::Leaves;
use super::sweep::Routine;
use super::text::Text;
use crate::kernel::{BufferId, FaceWrite, Source, ValueId};

/// Prints a face pass.
pub fn face(context: &Context, pass: &FaceWrite, wish: &str) -> Routine {
    let name = context.function_name(wish, &["_part"]);
    let written: Vec<BufferId> = pass.writes.iter().map(|write| write.buffer).collect();
    let values: Vec<ValueId> = pass.writes.iter().map(|write| write.value).collect();
    let mut roots = values.clone();
    roots.extend(pass.on.patch.iter().flat_map(|(left, _, right)| [*left, *right]));
    let leaves = Leaves::new(context, &roots, &written);
    let axis = &context.kernel.axes[pass.on.axis];
    let side = if pass.on.high { "high" } else { "low" };

    let mut body = Text::indented(1);
    let opened = open_outer(context, &mut body, pass);
    let nodes = nodes(context, &leaves, pass, &values, body.depth());
    body.lines(&leaves.row_declarations(nodes.as_str(), &written));
    body.append(&nodes);
    for _ in 0..opened {
        body.close("}");
    }

    let whole = body.as_str().to_owned();
    let mut function = Text::indented(1);
    function.lines(&leaves.uniform_declarations(&whole));
    function.lines(&leaves.count_declarations(&whole));
    function.append(&body);
    let uses = [function.mentions("t"), function.mentions("dt")];
    let mut text = Text::default();
    text.comment(&format!("Sets what is given at the {side} face of {}.", axis.name));
    text.open(&match context.language {
        Language::C => context.part_head(&name, uses),
        Language::Rust => context.pass_head(&name, uses, false),
    });
    text.append(&function);
    text.close("}");
    Routine {
        text: text.into_string(),
        whole: (context.language == Language::C).then(|| context.whole_pass(&name, uses)),
        name,
        uses_time: uses[0],
        uses_step: uses[1],
        scratch_rows: 0,
    }
}

/// Opens loops over the outer axes of the face and fixes the index of an outer face. Returns the number of open loops.
fn open_outer(context: &Context, text: &mut Text, pass: &FaceWrite) -> usize {
    let mut opened = 0;
    for (axis, names) in context.axes[..context.fast()].iter().enumerate() {
        if axis == pass.on.axis {
            text.line(&context.language.index(&names.index, &on_face(context, pass)));
            if axis == 0 && context.language == Language::C {
                text.open(&format!("if ({0} >= low{1} && {0} < high{1}) {{", names.index, slab(context)));
                opened += 1;
            }
        } else if axis == 0 && context.language == Language::C {
            let (low, high) = (format!("low{}", slab(context)), format!("high{}", slab(context)));
            text.open(&context.language.count(&names.index, &low, &high));
            opened += 1;
        } else {
            text.open(&context.language.count(&names.index, "0", &names.count));
            opened += 1;
        }
    }
    opened
}

/// What turns a row's number into the index of the slowest axis.
fn slab(context: &Context) -> String {
    if context.axes.len() == 3 { format!(" / {}", context.axes[1].count) } else { String::new() }
}

fn on_face(context: &Context, pass: &FaceWrite) -> String {
    if pass.on.high { format!("{} - 1", context.axes[pass.on.axis].count) } else { "0".to_owned() }
}

/// The nodes of the face on one row.
fn nodes(context: &Context, leaves: &Leaves, pass: &FaceWrite, values: &[ValueId], depth: usize) -> Text {
    let language = context.language;
    let fast = context.fast();
    let names = &context.axes[fast];
    let along = pass.on.axis != fast;
    let mut text = Text::indented(depth);
    if along {
        text.open(&language.count(&names.index, "0", &names.count));
    }
    let (_, before, patch) = leaves.face(&pass.on, &names.index);
    text.lines(&before);
    if let Some(patch) = &patch {
        text.open(&language.when(patch));
    }
    let (lines, results) = leaves.values(values, &names.index);
    text.lines(&lines);
    let mut local = leaves.names.borrow().clone();
    let updated: Vec<String> = results.iter().map(|_| local.name("updated")).collect();
    for (name, value) in updated.iter().zip(&results) {
        text.line(&language.double(name, value));
    }
    for (name, write) in updated.iter().zip(&pass.writes) {
        let target = &leaves.arrays[&Source::Buffer(write.buffer)];
        text.line(&language.store(target, &names.index, name));
    }
    if patch.is_some() {
        text.close("}");
    }
    if along {
        text.close("}");
        return text;
    }
    let mut whole = Text::indented(depth);
    whole.line(&language.index(&names.index, &on_face(context, pass)));
    let guarded = fast == 0 && language == Language::C;
    if guarded {
        whole.open(&format!("if ({0} >= low && {0} < high) {{", names.index));
    }
    whole.append(&text);
    if guarded {
        whole.close("}");
    }
    whole
}
