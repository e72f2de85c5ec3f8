//! The Rust package: a crate without dependencies around the generated kernel.

use super::context::Context;
use super::escape::{comment, pieces, rust_string};
use super::fixed::{fixed_values, tables};
use super::language::Language;
use super::literal;
use super::operators::operators;
use super::routines::{Routines, routines};
use super::rust_driver;
use super::text::{Text, calls, mentions};
use super::{Form, Program, Provenance, render};
use crate::kernel::{OutputKind, Step, ValidKernel};
use std::collections::BTreeMap;

/// Longest string literal on a line.
const LONGEST_PIECE: usize = 4000;

/// Emits the package.
pub fn emit(kernel: &ValidKernel, form: Form, provenance: Provenance) -> Program {
    let context = Context::new(kernel, Language::Rust);
    let package = context.prefix.to_lowercase();
    let common = vec![
        ("package", package.clone()),
        ("title", comment(if kernel.title.is_empty() { &kernel.name } else { &kernel.title })),
        ("version", comment(provenance.version)),
        ("hash", comment(provenance.hash)),
    ];
    let mut files = BTreeMap::new();
    files.insert("Cargo.toml".to_owned(), render(include_str!("../../templates/rust/Cargo.toml"), &common));
    files.insert("src/kernel.rs".to_owned(), kernel_file(&context, provenance, &common));
    for (path, text) in rust_driver::FILES {
        files.insert(format!("src/{path}"), text.to_owned());
    }
    let (path, root) = match form {
        Form::Program => ("src/main.rs", include_str!("../../templates/rust/main.rs")),
        Form::Library => ("src/lib.rs", include_str!("../../templates/rust/lib.rs")),
    };
    files.insert(path.to_owned(), render(root, &common));
    Program { files, prefix: package }
}

fn kernel_file(context: &Context, provenance: Provenance, common: &[(&'static str, String)]) -> String {
    let routines = routines(context);
    let (table_text, fills) = tables(context);
    let kernel = context.kernel;
    let notes: String = kernel.notes.iter().map(|note| format!("//! {}\n", comment(note))).collect();
    let mut values = common.to_vec();
    values.push(("notes", notes));
    let arrays = context.buffers.iter().chain(&context.tables).map(|member| format!("&self.s.{member}"));
    let own = ["&self.s.scratch".to_owned(), "&self.s.row_maximum".to_owned()];
    values.push(("arrays", arrays.chain(own).collect::<Vec<_>>().join(", ")));
    values.push(("members", members(context, MemberText::Declaration)));
    values.push(("initial", members(context, MemberText::Initial)));
    values.push(("operators", operators(context).into_string()));
    values.push(("tables", table_text.into_string()));
    values.push(("routines", routines.text.clone()));
    values.push(("fixed", fixed_function(context)));
    values.push(("prepare", prepare(context, &routines, &fills)));
    values.push(("description", description(context, provenance)));
    values.push(("interface", interface(context, &routines)));
    let code =
        ["operators", "tables", "routines", "fixed", "lifetime", "prepare", "description", "interface"];
    let parts = values.iter().filter(|(name, _)| code.contains(name));
    let body: String = parts.map(|(_, value)| value.as_str()).collect::<Vec<_>>().join("\n");
    values.push(("imports", imports(&body)));
    values.push(("helpers", helpers(context, &body)));
    render(include_str!("../../templates/rust/kernel.rs"), &values)
}

/// Names from the driver that the description needs.
fn imports(body: &str) -> String {
    let names = ["AxisInfo", "Description", "FieldInfo", "Kind", "OutputInfo", "ParameterInfo", "Solver"];
    let always = ["Description", "Solver"];
    let wanted: Vec<&str> =
        names.into_iter().filter(|name| always.contains(name) || mentions(body, name)).collect();
    wanted.join(", ")
}

/// Small functions that the rest names.
fn helpers(context: &Context, body: &str) -> String {
    let mut text = Text::default();
    for (name, source) in HELPERS {
        if calls(body, name) {
            text.lines(&source.lines().map(str::to_owned).collect::<Vec<_>>());
            text.blank();
        }
    }
    if calls(body, "coordinate") {
        let axes = &context.kernel.axes;
        let periodic: Vec<String> = axes.iter().map(|axis| axis.periodic.to_string()).collect();
        text.line(
            "/// The place of node `index` on an axis; the last node of a bounded axis is exactly its end.",
        );
        text.open("fn coordinate(s: &Arrays, axis: usize, index: isize) -> f64 {");
        text.line(&format!("const PERIODIC: [bool; {}] = [{}];", axes.len(), periodic.join(", ")));
        text.open("if !PERIODIC[axis] && index == s.nodes[axis] - 1 {");
        text.line("return s.high[axis];");
        text.close("}");
        text.line("s.low[axis] + index as f64 * s.spacing[axis]");
        text.close("}");
        text.blank();
    }
    text.into_string()
}

/// Name and text.
const HELPERS: [(&str, &str); 10] = [
    ("minimum", "#[inline(always)]\nfn minimum(a: f64, b: f64) -> f64 {\n    if a < b { a } else { b }\n}"),
    ("maximum", "#[inline(always)]\nfn maximum(a: f64, b: f64) -> f64 {\n    if a > b { a } else { b }\n}"),
    (
        "sign",
        "#[inline(always)]\nfn sign(x: f64) -> f64 {\n    f64::from(i8::from(x > 0.0) - i8::from(x < 0.0))\n}",
    ),
    (
        "select",
        "#[inline(always)]\nfn select(holds: bool, a: f64, b: f64) -> f64 {\n    if holds { a } else { b }\n}",
    ),
    (
        "opaque",
        "/// Hides a number from the compiler, which would round a call with a known argument in its own way.\nfn opaque(x: f64) -> f64 {\n    std::hint::black_box(x)\n}",
    ),
    (
        "wrap",
        "/// The offset from `index` to its neighbour on a periodic line.\n#[inline(always)]\nfn wrap(index: isize, offset: isize, nodes: isize) -> isize {\n    let place = index + offset;\n    if place < 0 {\n        offset + nodes\n    } else if place >= nodes {\n        offset - nodes\n    } else {\n        offset\n    }\n}",
    ),
    (
        "largest",
        "/// The largest of `count` values; not a number if one of them is not.\nunsafe fn largest(values: *const f64, count: isize) -> f64 {\n    let mut most = f64::NEG_INFINITY;\n    for i in 0..count {\n        let value = at(values, i);\n        if value > most || value.is_nan() {\n            most = value;\n        }\n    }\n    most\n}",
    ),
    (
        "noise",
        "/// A number in [0, 1) from a seed and a node's place in memory.\nfn noise(seed: u64, place: isize) -> f64 {\n    const GOLDEN: u64 = 0x9E3779B97F4A7C15;\n    let mut z = seed.wrapping_mul(GOLDEN).wrapping_add(place as u64).wrapping_add(GOLDEN);\n    z = (z ^ (z >> 30)).wrapping_mul(0xBF58476D1CE4E5B9);\n    z = (z ^ (z >> 27)).wrapping_mul(0x94D049BB133111EB);\n    z ^= z >> 31;\n    (z >> 11) as f64 / 9007199254740992.0\n}",
    ),
    (
        "erf",
        "/// The error function of the C library.\nfn erf(x: f64) -> f64 {\n    unsafe extern \"C\" {\n        #[link_name = \"erf\"]\n        fn library_erf(x: f64) -> f64;\n    }\n    // SAFETY: a function of the C library without preconditions.\n    unsafe { library_erf(x) }\n}",
    ),
    (
        "erfc",
        "/// The complementary error function of the C library.\nfn erfc(x: f64) -> f64 {\n    unsafe extern \"C\" {\n        #[link_name = \"erfc\"]\n        fn library_erfc(x: f64) -> f64;\n    }\n    // SAFETY: a function of the C library without preconditions.\n    unsafe { library_erfc(x) }\n}",
    ),
];

/// Which text of a member is wanted.
#[derive(Clone, Copy, PartialEq, Eq)]
enum MemberText {
    Declaration,
    Initial,
}

fn members(context: &Context, wanted: MemberText) -> String {
    let kernel = context.kernel;
    let axes = kernel.axes.len();
    let (parameters, outputs) = (kernel.parameters.len(), kernel.outputs.len());
    let mut text = Text::indented(if wanted == MemberText::Declaration { 1 } else { 3 });
    let mut member = |name: &str, kind: &str, count: Option<usize>, initial: &str, what: &str| match wanted {
        MemberText::Declaration => {
            if !what.is_empty() {
                text.line(&format!("/// {}", comment(what)));
            }
            text.line(&match count {
                Some(count) => format!("{name}: [{kind}; {count}],"),
                None => format!("{name}: {kind},"),
            });
        }
        MemberText::Initial => text.line(&match count {
            Some(count) => format!("{name}: [{initial}; {count}],"),
            None => format!("{name}: {initial},"),
        }),
    };
    member("nodes", "isize", Some(axes), "0", "Of each axis.");
    member("points", "isize", None, "0", "All nodes.");
    member("rows", "isize", None, "0", "Lines along the last axis.");
    member("team", "isize", None, "1", "Threads that share the rows.");
    member("crew", "Option<Crew>", None, "None", "All but the caller's.");
    for name in ["low", "high", "spacing", "inverse_spacing"] {
        member(name, "f64", Some(axes), "0.0", "");
    }
    for name in ["parameter", "parameter_low", "parameter_high", "parameter_scale"] {
        member(name, "f64", Some(parameters), "0.0", "");
    }
    for name in ["start_time", "end_time", "step_duration", "last_step"] {
        member(name, "f64", None, "0.0", "");
    }
    member("field_scale", "f64", Some(kernel.fields.len()), "0.0", "");
    member("every", "f64", Some(outputs), "0.0", "");
    member("scale", "f64", Some(outputs), "0.0", "");
    member("place", "f64", Some(outputs * axes), "0.0", "For each output, a coordinate for each axis.");
    for name in context.stored.values() {
        member(name, "f64", None, "0.0", "");
    }
    for (buffer, name) in kernel.buffers.iter().zip(&context.buffers) {
        member(name, "Array", None, "Array::empty()", &buffer.name);
    }
    for (table, name) in kernel.tables.iter().zip(&context.tables) {
        member(name, "Array", None, "Array::empty()", &format!("Table: {}", table.name));
    }
    member("scratch", "Array", None, "Array::empty()", "`scratch_length` numbers for each thread.");
    member("scratch_length", "isize", None, "0", "");
    member("row_maximum", "Array", None, "Array::empty()", "");
    text.into_string()
}

fn fixed_function(context: &Context) -> String {
    let body = fixed_values(context);
    let mut text = Text::default();
    text.line("/// Fixed values, once parameters and numbers of nodes are known.");
    let parameters = if body.mentions("parameters") { "parameters" } else { "_parameters" };
    text.open(&format!("fn fixed_values(s: &mut Arrays, {parameters}: &[Option<f64>]) {{"));
    text.append(&body);
    text.close("}");
    text.into_string()
}

/// Statements of `prepare` from the sizes on.
fn prepare(context: &Context, routines: &Routines, fills: &[String]) -> String {
    let kernel = context.kernel;
    let fast = context.fast();
    let mut text = Text::indented(2);
    for member in &context.buffers {
        text.line(&format!("s.{member} = Array::zeros(s.points)?;"));
    }
    for (table, member) in kernel.tables.iter().zip(&context.tables) {
        let sizes: Vec<String> = (0..kernel.axes.len())
            .filter(|axis| table.axes >> axis & 1 == 1)
            .map(|axis| format!("s.nodes[{axis}]"))
            .collect();
        text.line(&format!("s.{member} = Array::zeros({})?;", sizes.join(" * ")));
    }
    let scratch = routines.scratch_rows.max(1);
    text.line(&format!("s.scratch_length = ({scratch} * s.nodes[{fast}] + 7) / 8 * 8;"));
    text.line("s.scratch = Array::zeros(s.team * s.scratch_length)?;");
    text.line("s.row_maximum = Array::zeros(s.rows)?;");
    text.line("fixed_values(&mut s, parameters);");
    if !fills.is_empty() {
        text.line("// SAFETY: tables have the sizes that the numbers of nodes give.");
        text.open("unsafe {");
        for fill in fills {
            text.line(&format!("{fill}(&s);"));
        }
        text.close("}");
    }
    text.into_string()
}

fn quoted(text: &str) -> String {
    format!("\"{}\"", rust_string(text))
}

fn owned(text: &str) -> String {
    format!("{}.to_owned()", quoted(text))
}

fn description(context: &Context, provenance: Provenance) -> String {
    let kernel = context.kernel;
    let fraction = match &kernel.time.step {
        Step::Duration(_) => "0.0".to_owned(),
        Step::OfLimit(fraction) => literal::rational(fraction, Language::Rust),
    };
    let mut text = Text::default();
    text.line("/// The model that this program was made from.");
    text.line("const MODEL_TEXT: &str = concat!(");
    let mut lines = Text::indented(1);
    for piece in pieces(provenance.model_text, LONGEST_PIECE) {
        lines.verbatim(&format!("{},", quoted(piece)));
    }
    text.append(&lines);
    text.line(");");
    text.blank();
    text.open("fn description() -> Description {");
    text.open("Description {");
    for (member, value) in [
        ("name", owned(&kernel.name)),
        ("title", owned(&kernel.title)),
        ("version", owned(provenance.version)),
        ("hash", owned(provenance.hash)),
        ("method", owned(&kernel.time.method)),
        ("limit_law", owned(&kernel.limit.law)),
        ("model_text", "MODEL_TEXT.to_owned()".to_owned()),
        ("constant_step", kernel.time.constant_step.to_string()),
        ("state_dependent", kernel.limit.state_dependent.to_string()),
        ("fraction", fraction),
        ("interpolation_nodes", kernel.interpolation_nodes.to_string()),
    ] {
        text.verbatim(&format!("{member}: {value},"));
    }
    lists(context, &mut text);
    text.close("}");
    text.close("}");
    text.into_string()
}

fn lists(context: &Context, text: &mut Text) {
    let kernel = context.kernel;
    let mut list = |name: &str, entries: Vec<String>| {
        text.open(&format!("{name}: vec!["));
        entries.iter().for_each(|entry| text.verbatim(&format!("{entry},")));
        text.close("],");
    };
    let axes = kernel.axes.iter().map(|axis| {
        format!(
            "AxisInfo {{ name: {}, unit: {}, nodes: {}, least_nodes: {}, periodic: {} }}",
            owned(&axis.name),
            owned(&axis.unit),
            axis.nodes,
            axis.least_nodes,
            axis.periodic
        )
    });
    list("axes", axes.collect());
    let parameters = kernel.parameters.iter().map(|parameter| {
        format!(
            "ParameterInfo {{ name: {}, description: {}, unit: {}, bounded: {} }}",
            owned(&parameter.name),
            owned(parameter.description.as_deref().unwrap_or("")),
            owned(&parameter.unit),
            parameter.bounds.is_some()
        )
    });
    list("parameters", parameters.collect());
    let fields = kernel
        .fields
        .iter()
        .map(|field| format!("FieldInfo {{ name: {}, unit: {} }}", owned(&field.name), owned(&field.unit)));
    list("fields", fields.collect());
    let outputs = kernel.outputs.iter().map(|output| {
        let kind = match output.kind {
            OutputKind::Snapshot => "Snapshot",
            OutputKind::Gauge(_) => "Gauge",
            OutputKind::Integral => "Integral",
            OutputKind::Maximum { .. } => "Maximum",
        };
        format!(
            "OutputInfo {{ name: {}, unit: {}, kind: Kind::{kind}, repeated: {} }}",
            owned(&output.name),
            owned(&output.unit),
            output.every.is_some()
        )
    });
    list("outputs", outputs.collect());
    let quadrature = kernel.quadrature.iter().map(|weights| {
        let numbers: Vec<String> =
            weights.iter().map(|weight| literal::rational(weight, Language::Rust)).collect();
        format!("vec![{}]", numbers.join(", "))
    });
    list("quadrature", quadrature.collect());
}

/// Methods of the trait that run passes or give arrays out.
fn interface(context: &Context, routines: &Routines) -> String {
    let kernel = context.kernel;
    let member = |buffer: crate::kernel::BufferId| &context.buffers[buffer.0];
    let mut text = Text::indented(1);
    let mut start = routines.start.clone();
    if start.iter().any(|call| mentions(call, "step")) {
        start.insert(0, "let step = 0.0".to_owned());
    }
    if start.iter().any(|call| mentions(call, "next")) {
        start.insert(0, "let next = time".to_owned());
    }
    method(&mut text, "start", &["time"], &start, &[]);
    let mut first = routines.first_step.clone();
    if first.iter().any(|call| mentions(call, "next")) {
        first.insert(0, "let next = time + step".to_owned());
    }
    method(&mut text, "first_step", &["time", "step"], &first, &[]);
    let swaps: Vec<String> = kernel
        .rotation
        .iter()
        .map(|(a, b)| format!("std::mem::swap(&mut self.s.{}, &mut self.s.{});", member(*a), member(*b)))
        .collect();
    method(&mut text, "advance", &["time", "step", "next"], &routines.step, &swaps);
    let time = if mentions(&routines.largest_rate, "time") { "time" } else { "_time" };
    text.open(&format!("fn largest_rate(&mut self, {time}: f64) -> f64 {{"));
    if mentions(&routines.largest_rate, "s") {
        text.line("let s = &self.s;");
        text.line("// SAFETY: see `Arrays`.");
        text.line(&format!("unsafe {{ {} }}", routines.largest_rate));
    } else {
        text.line(&routines.largest_rate);
    }
    text.close("}");
    text.blank();

    let fields: Vec<String> =
        kernel.fields.iter().map(|field| format!("self.s.{}.values()", member(field.buffer))).collect();
    choice(&mut text, "field(&self, field: usize) -> &[f64]", "field", &fields, "&[]");
    let state: Vec<String> =
        kernel.state.iter().map(|buffer| format!("self.s.{}.values()", member(*buffer))).collect();
    choice(&mut text, "state(&self, index: usize) -> &[f64]", "index", &state, "&[]");
    let state: Vec<String> =
        kernel.state.iter().map(|buffer| format!("self.s.{}.values_mut()", member(*buffer))).collect();
    choice(&mut text, "state_mut(&mut self, index: usize) -> &mut [f64]", "index", &state, "&mut []");
    text.open("fn state_count(&self) -> usize {");
    text.line(&kernel.state.len().to_string());
    text.close("}");
    text.blank();
    let buffers: Vec<String> = kernel
        .outputs
        .iter()
        .map(|output| format!("self.s.{}.values_mut()", member(output.buffer)))
        .collect();
    choice(&mut text, "maximum_mut(&mut self, output: usize) -> &mut [f64]", "output", &buffers, "&mut []");
    outputs(context, routines, &mut text);
    text.into_string()
}

/// `output`, `begin_maximum`, `accumulate_maximum`.
fn outputs(context: &Context, routines: &Routines, text: &mut Text) {
    let kernel = context.kernel;
    let maximum = |place: usize| matches!(kernel.outputs[place].kind, OutputKind::Maximum { .. });
    let places = 0..kernel.outputs.len();
    let calls = |lists: &[Vec<String>], of_maximum: bool| -> Vec<(usize, String)> {
        let wanted = lists
            .iter()
            .enumerate()
            .filter(|(place, list)| !list.is_empty() && maximum(*place) == of_maximum);
        wanted.map(|(place, list)| (place, list.join("; "))).collect()
    };
    let filling = calls(&routines.outputs, false);
    let keeping = calls(&routines.outputs, true);
    let begins = calls(&routines.begins, true);
    let buffers: Vec<String> = places
        .map(|place| format!("self.s.{}.values()", context.buffers[kernel.outputs[place].buffer.0]))
        .collect();
    for (name, calls) in [("output", &filling), ("begin_maximum", &begins), ("accumulate_maximum", &keeping)]
    {
        let result = name == "output";
        let time = if calls.iter().any(|(_, call)| mentions(call, "time")) { "time" } else { "_time" };
        let index = if calls.is_empty() && (!result || buffers.is_empty()) { "_output" } else { "output" };
        let kind = if result { " -> &[f64]" } else { "" };
        text.open(&format!("fn {name}(&mut self, {index}: usize, {time}: f64){kind} {{"));
        if !calls.is_empty() {
            text.line("let s = &self.s;");
            text.line("// SAFETY: see `Arrays`.");
            text.open("match output {");
            for (place, call) in calls {
                text.line(&format!("{place} => unsafe {{ {call} }},"));
            }
            text.line("_ => {}");
            text.close("}");
        }
        if result && buffers.is_empty() {
            text.line("&[]");
        } else if result {
            text.open("match output {");
            for (place, buffer) in buffers.iter().enumerate() {
                text.line(&format!("{place} => {buffer},"));
            }
            text.line("_ => &[],");
            text.close("}");
        }
        text.close("}");
        text.blank();
    }
}

/// A method that runs passes, then changes arrays.
fn method(text: &mut Text, name: &str, parameters: &[&str], calls: &[String], after: &[String]) {
    let all = calls.join(";\n");
    let defined = |parameter: &str| calls.iter().any(|call| call.starts_with(&format!("let {parameter} ")));
    let list: Vec<String> = parameters
        .iter()
        .map(|parameter| {
            let kept = *parameter == "step";
            let used = kept || mentions(&all, parameter) && !defined(parameter);
            format!("{}{parameter}: f64", if used { "" } else { "_" })
        })
        .collect();
    text.open(&format!("fn {name}(&mut self, {}) {{", list.join(", ")));
    if ["first_step", "advance"].contains(&name) {
        text.line("self.s.last_step = step;");
    }
    if !calls.is_empty() {
        text.line("let s = &self.s;");
        let (known, calls): (Vec<&String>, Vec<&String>) =
            calls.iter().partition(|call| call.starts_with("let "));
        known.iter().for_each(|statement| text.line(&format!("{statement};")));
        text.line("// SAFETY: see `Arrays`.");
        text.open("unsafe {");
        calls.iter().for_each(|call| text.line(&format!("{call};")));
        text.close("}");
    }
    text.lines(after);
    text.close("}");
    text.blank();
}

fn choice(text: &mut Text, head: &str, index: &str, entries: &[String], otherwise: &str) {
    let head = if entries.is_empty() {
        head.replace(&format!("{index}: usize"), &format!("_{index}: usize"))
    } else {
        head.to_owned()
    };
    text.open(&format!("fn {head} {{"));
    if entries.is_empty() {
        text.line(otherwise);
    } else {
        text.open(&format!("match {index} {{"));
        for (place, entry) in entries.iter().enumerate() {
            text.line(&format!("{place} => {entry},"));
        }
        text.line(&format!("_ => {otherwise},"));
        text.close("}");
    }
    text.close("}");
    text.blank();
}
