//! What is computed once: parameters, sizes, other fixed values, and tables.

use super::context::{Context, is_literal};
use super::expression::{Met, Printer};
use super::language::Language;
use super::namer::Namer;
use super::text::Text;
use crate::kernel::{Extent, Operation, OutputKind, Step, TableId, ValueId};
use std::collections::BTreeMap;

/// Statements that fill every fixed member of the solver; `given` and `parameters` are known, nodes are set.
pub fn fixed_values(context: &Context) -> Text {
    let mut text = Text::indented(1);
    let mut names = Namer::default();
    parameters(context, &mut text, &mut names);
    axes(context, &mut text, &mut names);
    stored(context, &mut text, &mut names);
    described(context, &mut text, &mut names);
    text
}

/// Statements and texts of fixed values in `prepare`.
fn evaluate(
    context: &Context,
    text: &mut Text,
    names: &mut Namer,
    roots: &[ValueId],
    known: &[ValueId],
) -> Vec<String> {
    let language = context.language;
    let mut leaf = |value: ValueId, met: Met| {
        if met == Met::ByLibrary {
            return None;
        }
        match context.kernel.values[value.0].operation {
            Operation::Parameter(_) | Operation::InverseSpacing(_) => context.storage(value),
            _ if known.contains(&value) && !is_literal(context.kernel, value) => context.storage(value),
            _ => None,
        }
    };
    let mut printer = Printer { kernel: context.kernel, language, leaf: &mut leaf, names };
    let statements = printer.statements_with_opaque(roots, &context.constant_only);
    text.lines(&statements.lines);
    statements.roots
}

fn parameters(context: &Context, text: &mut Text, names: &mut Namer) {
    let language = context.language;
    for (index, parameter) in context.kernel.parameters.iter().enumerate() {
        text.comment(&format!("{} [{}]", parameter.name, parameter.unit));
        let default = evaluate(context, text, names, &[parameter.default], &[]).remove(0);
        match language {
            Language::C => {
                text.line(&format!(
                    "s->parameter[{index}] = given[{index}] ? parameters[{index}] : {default};"
                ));
            }
            Language::Rust => {
                text.open(&format!(
                    "s.parameter[{index}] = match parameters.get({index}).copied().flatten() {{"
                ));
                text.line("Some(value) => value,");
                text.line(&format!("None => {default},"));
                text.close("};");
            }
        }
    }
}

fn axes(context: &Context, text: &mut Text, names: &mut Namer) {
    let language = context.language;
    for (index, axis) in context.kernel.axes.iter().enumerate() {
        text.comment(&format!("{} [{}]", axis.name, axis.unit));
        let ends = evaluate(context, text, names, &[axis.low, axis.high], &[]);
        let member = |name: &str| language.member(&format!("{name}[{index}]"));
        text.line(&format!("{} = {};", member("low"), ends[0]));
        text.line(&format!("{} = {};", member("high"), ends[1]));
        let intervals = if axis.periodic { member("nodes") } else { format!("({} - 1)", member("nodes")) };
        let intervals = match language {
            Language::C => format!("(double){intervals}"),
            Language::Rust => format!("{intervals} as f64"),
        };
        text.line(&format!(
            "{} = ({} - {}) / ({intervals});",
            member("spacing"),
            member("high"),
            member("low")
        ));
        text.line(&format!("{} = 1.0 / {};", member("inverse_spacing"), member("spacing")));
    }
}

fn stored(context: &Context, text: &mut Text, names: &mut Namer) {
    let mut known = Vec::new();
    for (value, member) in &context.stored {
        let result = if is_literal(context.kernel, *value) {
            let plain = evaluate(context, text, names, &[*value], &[]).remove(0);
            format!("opaque({plain})")
        } else {
            evaluate(context, text, names, &[*value], &known).remove(0)
        };
        text.line(&format!("{} = {result};", context.language.member(member)));
        known.push(*value);
    }
}

/// Numbers that the description gives out: scales, bounds, times, places.
fn described(context: &Context, text: &mut Text, names: &mut Namer) {
    let kernel = context.kernel;
    let mut wanted: Vec<(String, ValueId)> = Vec::new();
    for (index, parameter) in kernel.parameters.iter().enumerate() {
        wanted.push((format!("parameter_scale[{index}]"), parameter.scale));
        if let Some((low, high)) = parameter.bounds {
            wanted.push((format!("parameter_low[{index}]"), low));
            wanted.push((format!("parameter_high[{index}]"), high));
        }
    }
    for (index, field) in kernel.fields.iter().enumerate() {
        wanted.push((format!("field_scale[{index}]"), field.scale));
    }
    wanted.push(("start_time".to_owned(), kernel.time.start));
    wanted.push(("end_time".to_owned(), kernel.time.end));
    if let Step::Duration(duration) = kernel.time.step {
        wanted.push(("step_duration".to_owned(), duration));
    }
    for (index, output) in kernel.outputs.iter().enumerate() {
        wanted.push((format!("scale[{index}]"), output.scale));
        if let Some(every) = output.every {
            wanted.push((format!("every[{index}]"), every));
        }
        if let OutputKind::Gauge(place) = &output.kind {
            for (axis, coordinate) in place.iter().enumerate() {
                wanted.push((format!("place[{}]", index * kernel.axes.len() + axis), *coordinate));
            }
        }
    }
    let known: Vec<ValueId> = context.stored.keys().copied().collect();
    let roots: Vec<ValueId> = wanted.iter().map(|(_, value)| *value).collect();
    let results = evaluate(context, text, names, &roots, &known);
    for ((member, _), result) in wanted.iter().zip(&results) {
        text.line(&format!("{} = {result};", context.language.member(member)));
    }
}

/// A function for each table that fills it.
pub fn tables(context: &Context) -> (Text, Vec<String>) {
    let mut text = Text::default();
    let mut functions = Vec::new();
    for id in (0..context.tables.len()).map(TableId) {
        let name = context.function_name(&format!("fill_{}", context.tables[id.0]), &[]);
        table(context, &mut text, id, &name);
        functions.push(name);
    }
    (text, functions)
}

fn table(context: &Context, text: &mut Text, id: TableId, name: &str) {
    let language = context.language;
    let table = &context.kernel.tables[id.0];
    let mine: Vec<usize> = (0..context.axes.len()).filter(|axis| table.axes >> axis & 1 == 1).collect();
    let mut names = context.local_names();
    for axis in &context.axes {
        names.name(&axis.count);
        names.name(&axis.index);
        names.name(&axis.place);
    }
    names.name(&context.tables[id.0]);
    let uniform = fixed_leaves(context, table.value, &mut names);

    let mut loops = Text::indented(1);
    let (statements, result) = element(context, id, &uniform, &mut names);
    for axis in &mine {
        let axis_names = &context.axes[*axis];
        loops.open(&language.count(&axis_names.index, "0", &axis_names.count));
        if super::text::mentions(&(statements.join("\n") + &result), &axis_names.place) {
            let place = format!("coordinate(s, {axis}, {})", axis_names.index);
            loops.line(&language.double(&axis_names.place, &place));
        }
    }
    loops.lines(&statements);
    let offset: Vec<String> = mine
        .iter()
        .map(|axis| {
            let stride = context.stride(table.axes, *axis);
            let index = &context.axes[*axis].index;
            if stride == "1" { index.clone() } else { format!("{index} * {stride}") }
        })
        .collect();
    loops.line(&language.store(&context.tables[id.0], &offset.join(" + "), &result));
    for _ in &mine {
        loops.close("}");
    }

    let kinds: Vec<&str> = mine.iter().map(|axis| context.kernel.axes[*axis].name.as_str()).collect();
    text.comment(&format!("{}, a table over {}", table.name, kinds.join(", ")));
    text.open(&context.pass_head(name, [false, false], false));
    let array = language.array(&context.tables[id.0]);
    let kind = language.pick("double *const", "let");
    text.line(&format!("{kind} {} = {array};", context.tables[id.0]));
    for (value, local) in &uniform {
        if let Some(storage) = context.storage(*value) {
            text.line(&language.double(local, &storage));
        }
    }
    for (axis, axis_names) in context.axes.iter().enumerate() {
        if loops.mentions(&axis_names.count) {
            text.line(&language.index(&axis_names.count, &language.member(&format!("nodes[{axis}]"))));
        }
    }
    text.append(&loops);
    text.close("}");
    text.blank();
}

/// Local names of the fixed values that a table's value reads.
fn fixed_leaves(context: &Context, value: ValueId, names: &mut Namer) -> BTreeMap<ValueId, String> {
    let kernel = context.kernel;
    let mut found = BTreeMap::new();
    let mut take = |fixed: ValueId| {
        if context.storage(fixed).is_some() && !found.contains_key(&fixed) {
            found.insert(fixed, names.name(&context.wish(fixed)));
        }
    };
    if kernel.values[value.0].extent == Extent::Fixed && !is_literal(kernel, value) {
        take(value);
        return found;
    }
    for needed in kernel.needed([value]) {
        let entry = &kernel.values[needed.0];
        if entry.extent == Extent::Fixed {
            continue;
        }
        let library = matches!(entry.operation, Operation::Call(..) | Operation::Power(..));
        for operand in entry.operation.operands() {
            if kernel.values[operand.0].extent == Extent::Fixed && (library || !is_literal(kernel, operand)) {
                take(operand);
            }
        }
    }
    found
}

/// Statements and text of one element.
fn element(
    context: &Context,
    id: TableId,
    uniform: &BTreeMap<ValueId, String>,
    names: &mut Namer,
) -> (Vec<String>, String) {
    let kernel = context.kernel;
    let all = (1u8 << kernel.axes.len()) - 1;
    let linear: Vec<String> = (0..kernel.axes.len())
        .map(|axis| {
            let stride = context.stride(all, axis);
            let index = &context.axes[axis].index;
            if stride == "1" { index.clone() } else { format!("{index} * {stride}") }
        })
        .collect();
    let mut leaf = |value: ValueId, met: Met| match kernel.values[value.0].operation {
        Operation::Coordinate(axis) => Some(context.axes[axis].place.clone()),
        Operation::Noise(seed) => Some(match context.language {
            Language::C => format!("noise(UINT64_C({seed}), {})", linear.join(" + ")),
            Language::Rust => format!("noise({seed}, {})", linear.join(" + ")),
        }),
        _ if met == Met::Plain && is_literal(kernel, value) => None,
        _ => uniform.get(&value).cloned(),
    };
    let value = kernel.tables[id.0].value;
    let statements =
        Printer { kernel, language: context.language, leaf: &mut leaf, names }.statements(&[value]);
    (statements.lines, statements.roots.into_iter().next().unwrap_or_default())
}
