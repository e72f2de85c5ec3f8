//! The C package: header, kernel, build files; the driver when a program is wanted.

use super::context::Context;
use super::escape::{c_string, comment, pieces};
use super::fixed::{fixed_values, tables};
use super::language::Language;
use super::literal;
use super::operators::operators;
use super::routines::{Routines, routines};
use super::text::{Text, calls, mentions};
use super::{Form, Program, Provenance, render};
use crate::kernel::{Kernel, Output, OutputKind, Step, ValidKernel};
use std::collections::BTreeMap;

/// Longest string literal that C11 promises, with room for escapes.
const LONGEST_PIECE: usize = 900;

/// Emits the package.
pub fn emit(kernel: &ValidKernel, form: Form, provenance: Provenance) -> Program {
    let context = Context::new(kernel, Language::C);
    let prefix = context.prefix.clone();
    let common = vec![
        ("prefix", prefix.clone()),
        ("PREFIX", prefix.to_uppercase()),
        ("title", comment(if kernel.title.is_empty() { &kernel.name } else { &kernel.title })),
        ("version", comment(provenance.version)),
        ("hash", comment(provenance.hash)),
    ];
    let mut files = BTreeMap::new();
    files.insert(format!("{prefix}.h"), render(include_str!("../../templates/c/kernel.h"), &common));
    files.insert(format!("{prefix}.c"), kernel_file(&context, provenance, &common));
    let build = match form {
        Form::Program => {
            files.insert("main.c".to_owned(), super::c_driver::main_text(&prefix));
            include_str!("../../templates/c/Makefile")
        }
        Form::Library => {
            let description = render(include_str!("../../templates/c/library.pc"), &common);
            files.insert(format!("{prefix}.pc.in"), description);
            include_str!("../../templates/c/library.Makefile")
        }
    };
    files.insert("Makefile".to_owned(), render(build, &common));
    Program { files, prefix }
}

fn kernel_file(context: &Context, provenance: Provenance, common: &[(&'static str, String)]) -> String {
    let routines = routines(context);
    let (table_text, fills) = tables(context);
    let mut values = common.to_vec();
    values.push(("notes", notes(context.kernel)));
    values.push(("members", members(context)));
    values.push(("operators", operators(context).into_string()));
    values.push(("tables", table_text.into_string()));
    values.push(("routines", routines.text.clone()));
    values.push(("fixed", fixed_function(context)));
    values.push(("lifetime", lifetime(context, &routines, &fills)));
    values.push(("description", description(context, provenance)));
    values.push(("interface", interface(context, &routines)));
    let code =
        ["operators", "tables", "routines", "fixed", "lifetime", "prepare", "description", "interface"];
    let parts = values.iter().filter(|(name, _)| code.contains(name));
    let body: String = parts.map(|(_, value)| value.as_str()).collect::<Vec<_>>().join("\n");
    values.push(("helpers", helpers(context, &body)));
    render(include_str!("../../templates/c/kernel.c"), &values)
}

fn notes(kernel: &Kernel) -> String {
    kernel.notes.iter().map(|note| format!(" * {}\n", comment(note))).collect()
}

/// Small functions that the rest names.
fn helpers(context: &Context, body: &str) -> String {
    let mut text = Text::default();
    let mut add = |name: &str, lines: &[&str]| {
        if calls(body, name) {
            text.lines(&lines.iter().map(|line| (*line).to_owned()).collect::<Vec<_>>());
            text.blank();
        }
    };
    add("minimum", &["INLINE double minimum(double a, double b) { return a < b ? a : b; }"]);
    add("maximum", &["INLINE double maximum(double a, double b) { return a > b ? a : b; }"]);
    add("sign", &["INLINE double sign(double x) { return (double)((x > 0.0) - (x < 0.0)); }"]);
    add("select", &["INLINE double select(int holds, double a, double b) { return holds ? a : b; }"]);
    add(
        "opaque",
        &[
            "/* Hides a number from the compiler, which would round a call with a known argument in its own way. */",
            "static double opaque(double x) {",
            "    volatile double kept = x;",
            "    return kept;",
            "}",
        ],
    );
    add(
        "wrap",
        &[
            "/* The offset from index to its neighbour on a periodic line. */",
            "INLINE ptrdiff_t wrap(ptrdiff_t index, ptrdiff_t offset, ptrdiff_t nodes) {",
            "    const ptrdiff_t place = index + offset;",
            "    return place < 0 ? offset + nodes : place >= nodes ? offset - nodes : offset;",
            "}",
        ],
    );
    add(
        "largest",
        &[
            "/* The largest of count values; not a number if one of them is not. */",
            "static double largest(const double *values, ptrdiff_t count) {",
            "    double most = -INFINITY;",
            "    for (ptrdiff_t i = 0; i < count; i++) {",
            "        if (values[i] > most || values[i] != values[i]) {",
            "            most = values[i];",
            "        }",
            "    }",
            "    return most;",
            "}",
        ],
    );
    add(
        "noise",
        &[
            "/* A number in [0, 1) from a seed and a node's place in memory. */",
            "static double noise(uint64_t seed, ptrdiff_t place) {",
            "    uint64_t z = seed * UINT64_C(0x9E3779B97F4A7C15) + (uint64_t)place + UINT64_C(0x9E3779B97F4A7C15);",
            "    z = (z ^ (z >> 30)) * UINT64_C(0xBF58476D1CE4E5B9);",
            "    z = (z ^ (z >> 27)) * UINT64_C(0x94D049BB133111EB);",
            "    z = z ^ (z >> 31);",
            "    return (double)(z >> 11) * 0x1p-53;",
            "}",
        ],
    );
    add(
        "swap",
        &[
            "static void swap(double **a, double **b) {",
            "    double *const kept = *a;",
            "    *a = *b;",
            "    *b = kept;",
            "}",
        ],
    );
    if calls(body, "coordinate") {
        text.lines(&coordinate(context));
        text.blank();
    }
    if calls(body, "thread_number") {
        let lines = [
            "static ptrdiff_t thread_number(void) {",
            "#ifdef _OPENMP",
            "    return omp_get_thread_num();",
            "#else",
            "    return 0;",
            "#endif",
            "}",
            "",
        ];
        text.lines(&lines.map(str::to_owned));
    }
    text.into_string()
}

fn coordinate(context: &Context) -> Vec<String> {
    let axes = &context.kernel.axes;
    let periodic: Vec<&str> = axes.iter().map(|axis| if axis.periodic { "1" } else { "0" }).collect();
    vec![
        "/* The place of node index on an axis; the last node of a bounded axis is exactly its end. */"
            .to_owned(),
        format!("static double coordinate(const {}_solver *s, int axis, ptrdiff_t index) {{", context.prefix),
        format!("    static const int periodic[{}] = {{ {} }};", axes.len(), periodic.join(", ")),
        "    if (!periodic[axis] && index == s->nodes[axis] - 1) {".to_owned(),
        "        return s->high[axis];".to_owned(),
        "    }".to_owned(),
        "    return s->low[axis] + (double)index * s->spacing[axis];".to_owned(),
        "}".to_owned(),
    ]
}

fn members(context: &Context) -> String {
    let kernel = context.kernel;
    let mut text = Text::indented(1);
    let axes = kernel.axes.len();
    let parameters = kernel.parameters.len().max(1);
    let outputs = kernel.outputs.len().max(1);
    text.line(&format!("ptrdiff_t nodes[{axes}];"));
    text.line("ptrdiff_t points, rows, team; /* team: threads that share the rows */");
    text.line(&format!("double low[{axes}], high[{axes}], spacing[{axes}], inverse_spacing[{axes}];"));
    text.line(&format!(
        "double parameter[{parameters}], parameter_low[{parameters}], parameter_high[{parameters}], parameter_scale[{parameters}];"
    ));
    text.line("double start_time, end_time, step_duration, last_step;");
    text.line(&format!("double field_scale[{}];", kernel.fields.len().max(1)));
    text.line(&format!("double every[{outputs}], scale[{outputs}], place[{}];", outputs * axes));
    for member in context.stored.values() {
        text.line(&format!("double {member};"));
    }
    for (buffer, member) in kernel.buffers.iter().zip(&context.buffers) {
        text.line(&format!("double *{member}; /* {} */", comment(&buffer.name)));
    }
    for (table, member) in kernel.tables.iter().zip(&context.tables) {
        text.line(&format!("double *{member}; /* table: {} */", comment(&table.name)));
    }
    text.line("double *scratch; /* scratch_length numbers for each thread */");
    text.line("double *row_maximum;");
    text.line("ptrdiff_t scratch_length;");
    text.line("size_t memory;");
    text.into_string()
}

fn fixed_function(context: &Context) -> String {
    let body = fixed_values(context);
    let mut text = Text::default();
    text.comment("Fixed values, once parameters and numbers of nodes are known.");
    let solver = format!("{}_solver *s", context.prefix);
    text.open(&format!(
        "static void fixed_values({solver}, const double *parameters, const unsigned char *given) {{"
    ));
    for name in ["parameters", "given"] {
        if !body.mentions(name) {
            text.line(&format!("(void){name};"));
        }
    }
    text.append(&body);
    text.close("}");
    text.into_string()
}

/// Creation and destruction.
fn lifetime(context: &Context, routines: &Routines, fills: &[String]) -> String {
    let kernel = context.kernel;
    let prefix = &context.prefix;
    let axes = kernel.axes.len();
    let fast = context.fast();
    let mut text = Text::default();
    text.open(&format!("void {prefix}_destroy({prefix}_solver *s) {{"));
    text.open("if (s == NULL) {");
    text.line("return;");
    text.close("}");
    for member in context.buffers.iter().chain(&context.tables) {
        text.line(&format!("free(s->{member});"));
    }
    text.line("free(s->scratch);");
    text.line("free(s->row_maximum);");
    text.line("free(s);");
    text.close("}");
    text.blank();
    text.comment(
        "Returns NULL when there is not enough memory, or an axis has fewer nodes than the operators need.",
    );
    text.open(&format!(
        "{prefix}_solver *{prefix}_create(const size_t *nodes, const double *parameters, const unsigned char *given, int threads) {{"
    ));
    text.line(&format!("{prefix}_solver *s = calloc(1, sizeof *s);"));
    text.open("if (s == NULL) {");
    text.line("return NULL;");
    text.close("}");
    let least: Vec<String> = kernel.axes.iter().map(|axis| axis.least_nodes.to_string()).collect();
    text.line(&format!("static const size_t least[{axes}] = {{ {} }};", least.join(", ")));
    text.line("size_t points = 1;");
    text.open(&format!("for (int axis = 0; axis < {axes}; axis++) {{"));
    text.open("if (nodes[axis] < least[axis] || nodes[axis] > LARGEST_ARRAY / points) {");
    text.line("free(s);");
    text.line("return NULL;");
    text.close("}");
    text.line("points *= nodes[axis];");
    text.line("s->nodes[axis] = (ptrdiff_t)nodes[axis];");
    text.close("}");
    text.line("s->points = (ptrdiff_t)points;");
    text.line(&format!("s->rows = s->points / s->nodes[{fast}];"));
    text.comment("A parallel region costs more than it brings on small grids.");
    text.line("s->team = s->points <= LEAST_SHARED || threads < 1 ? 1 : threads > 4096 ? 4096 : threads;");
    text.line("s->memory = sizeof *s;");
    text.line("int complete = 1;");
    for member in &context.buffers {
        text.line(&format!("complete = complete && (s->{member} = array(s, s->points)) != NULL;"));
    }
    for (table, member) in kernel.tables.iter().zip(&context.tables) {
        let sizes: Vec<String> = (0..axes)
            .filter(|axis| table.axes >> axis & 1 == 1)
            .map(|axis| format!("s->nodes[{axis}]"))
            .collect();
        text.line(&format!(
            "complete = complete && (s->{member} = array(s, {})) != NULL;",
            sizes.join(" * ")
        ));
    }
    let scratch = routines.scratch_rows.max(1);
    text.line(&format!("s->scratch_length = ({scratch} * s->nodes[{fast}] + 7) / 8 * 8;"));
    text.line("complete = complete && (s->scratch = array(s, s->team * s->scratch_length)) != NULL;");
    text.line("complete = complete && (s->row_maximum = array(s, s->rows)) != NULL;");
    text.open("if (!complete) {");
    text.line(&format!("{prefix}_destroy(s);"));
    text.line("return NULL;");
    text.close("}");
    text.line("fixed_values(s, parameters, given);");
    for fill in fills {
        text.line(&format!("{fill}(s);"));
    }
    text.line("return s;");
    text.close("}");
    text.into_string()
}

fn quoted(text: &str) -> String {
    format!("\"{}\"", c_string(text))
}

fn description(context: &Context, provenance: Provenance) -> String {
    let kernel = context.kernel;
    let prefix = &context.prefix;
    let mut text = Text::default();
    let list = |kind: &str, name: &str, entries: Vec<String>, empty: &str, text: &mut Text| {
        let count = entries.len().max(1);
        text.open(&format!("static const {prefix}_{kind}_info {name}[{count}] = {{"));
        if entries.is_empty() {
            text.line(empty);
        }
        entries.iter().for_each(|entry| text.line(entry));
        text.close("};");
    };
    let axes = kernel.axes.iter().map(|axis| {
        let periodic = i32::from(axis.periodic);
        format!(
            "{{ {}, {}, {}, {}, {periodic} }},",
            quoted(&axis.name),
            quoted(&axis.unit),
            axis.nodes,
            axis.least_nodes
        )
    });
    list("axis", "axis_list", axes.collect(), "", &mut text);
    let parameters = kernel.parameters.iter().map(|parameter| {
        let what = parameter.description.as_deref().unwrap_or("");
        let bounded = i32::from(parameter.bounds.is_some());
        format!(
            "{{ {}, {}, {}, {bounded} }},",
            quoted(&parameter.name),
            quoted(what),
            quoted(&parameter.unit)
        )
    });
    list("parameter", "parameter_list", parameters.collect(), "{ \"\", \"\", \"\", 0 },", &mut text);
    let fields =
        kernel.fields.iter().map(|field| format!("{{ {}, {} }},", quoted(&field.name), quoted(&field.unit)));
    list("field", "field_list", fields.collect(), "{ \"\", \"\" },", &mut text);
    let outputs = kernel.outputs.iter().map(|output| {
        let repeated = i32::from(output.every.is_some());
        format!(
            "{{ {}, {}, {}, {repeated} }},",
            quoted(&output.name),
            quoted(&output.unit),
            output_kind(output)
        )
    });
    list("output", "output_list", outputs.collect(), "{ \"\", \"\", 0, 0 },", &mut text);
    quadrature(kernel, &mut text);
    model_text(provenance, &mut text);
    describe(context, provenance, &mut text);
    text.into_string()
}

fn output_kind(output: &Output) -> usize {
    match output.kind {
        OutputKind::Snapshot => 0,
        OutputKind::Gauge(_) => 1,
        OutputKind::Integral => 2,
        OutputKind::Maximum { .. } => 3,
    }
}

fn quadrature(kernel: &Kernel, text: &mut Text) {
    let axes = kernel.quadrature.len();
    text.comment("Quadrature weights at the ends of each axis, in units of the spacing; one inside.");
    let mut names = Vec::new();
    for (axis, weights) in kernel.quadrature.iter().enumerate() {
        let numbers: Vec<String> =
            weights.iter().map(|weight| literal::rational(weight, Language::C)).collect();
        let (count, list) = (numbers.len().max(1), numbers.join(", "));
        let list = if list.is_empty() { "1.0".to_owned() } else { list };
        text.line(&format!("static const double quadrature_{axis}[{count}] = {{ {list} }};"));
        names.push(format!("quadrature_{axis}"));
    }
    let counts: Vec<String> = kernel.quadrature.iter().map(|weights| weights.len().to_string()).collect();
    text.line(&format!("static const double *const quadrature_list[{axes}] = {{ {} }};", names.join(", ")));
    text.line(&format!("static const size_t quadrature_counts[{axes}] = {{ {} }};", counts.join(", ")));
}

/// The model as an array of lines: compilers need not take long string literals.
fn model_text(provenance: Provenance, text: &mut Text) {
    text.blank();
    text.comment("The model that this program was made from.");
    let lines = pieces(provenance.model_text, LONGEST_PIECE);
    text.open(&format!("static const char *const model_lines[{}] = {{", lines.len().max(1)));
    if lines.is_empty() {
        text.line("\"\",");
    }
    let mut depth = Text::indented(1);
    for line in lines {
        depth.verbatim(&format!("{},", quoted(line)));
    }
    text.append(&depth);
    text.close("};");
    text.line(&format!("static char model_text[{}];", provenance.model_text.len() + 1));
    text.blank();
}

fn describe(context: &Context, provenance: Provenance, text: &mut Text) {
    let kernel = context.kernel;
    let prefix = &context.prefix;
    let fraction = match &kernel.time.step {
        Step::Duration(_) => "0.0".to_owned(),
        Step::OfLimit(fraction) => literal::rational(fraction, Language::C),
    };
    text.open(&format!("const {prefix}_description *{prefix}_describe(void) {{"));
    text.open(&format!("static const {prefix}_description description = {{"));
    for (member, value) in [
        ("name", quoted(&kernel.name)),
        ("title", quoted(&kernel.title)),
        ("version", quoted(provenance.version)),
        ("hash", quoted(provenance.hash)),
        ("method", quoted(&kernel.time.method)),
        ("limit_law", quoted(&kernel.limit.law)),
        ("model_text", "model_text".to_owned()),
        ("axes", kernel.axes.len().to_string()),
        ("parameters", kernel.parameters.len().to_string()),
        ("fields", kernel.fields.len().to_string()),
        ("outputs", kernel.outputs.len().to_string()),
        ("axis", "axis_list".to_owned()),
        ("parameter", "parameter_list".to_owned()),
        ("field", "field_list".to_owned()),
        ("output", "output_list".to_owned()),
        ("constant_step", i32::from(kernel.time.constant_step).to_string()),
        ("state_dependent", i32::from(kernel.limit.state_dependent).to_string()),
        ("fraction", fraction),
        ("interpolation_nodes", kernel.interpolation_nodes.to_string()),
        ("quadrature", "quadrature_list".to_owned()),
        ("quadrature_count", "quadrature_counts".to_owned()),
    ] {
        text.verbatim(&format!(".{member} = {value},"));
    }
    text.close("};");
    text.line("size_t place = 0;");
    text.open("for (size_t line = 0; line < sizeof model_lines / sizeof model_lines[0]; line++) {");
    text.line("const size_t length = strlen(model_lines[line]);");
    text.line("memcpy(model_text + place, model_lines[line], length);");
    text.line("place += length;");
    text.close("}");
    text.line("return &description;");
    text.close("}");
}

/// Public functions that run passes or give buffers out.
fn interface(context: &Context, routines: &Routines) -> String {
    let kernel = context.kernel;
    let p = &context.prefix;
    let mut text = Text::default();
    let swaps: Vec<String> = kernel
        .rotation
        .iter()
        .map(|(a, b)| format!("swap(&s->{}, &s->{})", context.buffers[a.0], context.buffers[b.0]))
        .collect();
    let start: Vec<String> = if routines.start.iter().any(|call| mentions(call, "step")) {
        std::iter::once("const double step = 0.0".to_owned()).chain(routines.start.clone()).collect()
    } else {
        routines.start.clone()
    };
    let start: Vec<String> = if start.iter().any(|call| mentions(call, "next")) {
        std::iter::once("const double next = time".to_owned()).chain(start).collect()
    } else {
        start
    };
    function(&mut text, &format!("void {p}_start({p}_solver *s, double time)"), &["s", "time"], &start);
    let first: Vec<String> = if routines.first_step.iter().any(|call| mentions(call, "next")) {
        std::iter::once("const double next = time + step".to_owned())
            .chain(routines.first_step.clone())
            .collect()
    } else {
        routines.first_step.clone()
    };
    let head = format!("void {p}_first_step({p}_solver *s, double time, double step)");
    let first: Vec<String> = std::iter::once("s->last_step = step".to_owned()).chain(first).collect();
    function(&mut text, &head, &["s", "time", "step"], &first);
    let head = format!("double {p}_largest_rate({p}_solver *s, double time)");
    function(&mut text, &head, &["s", "time"], &[format!("return {}", routines.largest_rate)]);
    super::wave::steps(context, routines, &swaps).lines().for_each(|line| text.verbatim(line));

    let fields: Vec<String> =
        kernel.fields.iter().map(|field| format!("return s->{}", context.buffers[field.buffer.0])).collect();
    cases(
        &mut text,
        &format!("const double *{p}_field(const {p}_solver *s, size_t field)"),
        "field",
        &["s"],
        &fields,
    );
    let outputs: Vec<String> = kernel
        .outputs
        .iter()
        .zip(&routines.outputs)
        .map(|(output, fill)| {
            let maximum = matches!(output.kind, OutputKind::Maximum { .. });
            let mut lines = if maximum { Vec::new() } else { fill.clone() };
            lines.push(format!("return s->{}", context.buffers[output.buffer.0]));
            lines.join("\n")
        })
        .collect();
    let head = format!("const double *{p}_output({p}_solver *s, size_t output, double time)");
    cases(&mut text, &head, "output", &["s", "time"], &outputs);
    for (name, calls) in [("begin", &routines.begins), ("accumulate", &routines.outputs)] {
        let entries: Vec<(usize, String)> = kernel
            .outputs
            .iter()
            .enumerate()
            .filter(|(_, output)| matches!(output.kind, OutputKind::Maximum { .. }))
            .map(|(place, _)| (place, calls[place].join("\n")))
            .collect();
        let head = format!("void {p}_{name}_maximum({p}_solver *s, size_t output, double time)");
        numbered_cases(&mut text, &head, "output", &["s", "time"], &entries);
    }
    let state: Vec<String> =
        kernel.state.iter().map(|buffer| format!("return s->{}", context.buffers[buffer.0])).collect();
    text.line(&format!("size_t {p}_state_count(void) {{ return {}; }}", state.len()));
    text.blank();
    cases(&mut text, &format!("double *{p}_state({p}_solver *s, size_t k)"), "k", &["s"], &state);
    text.into_string()
}

fn function(text: &mut Text, head: &str, parameters: &[&str], statements: &[String]) {
    let mut body = Text::indented(1);
    for statement in statements {
        body.line(&format!("{statement};"));
    }
    text.open(&format!("{head} {{"));
    for parameter in parameters {
        if !body.mentions(parameter) {
            text.line(&format!("(void){parameter};"));
        }
    }
    text.append(&body);
    text.close("}");
    text.blank();
}

/// A function that chooses by an index; nothing, or no array, for an index beyond the list.
fn cases(text: &mut Text, head: &str, index: &str, parameters: &[&str], entries: &[String]) {
    let entries: Vec<(usize, String)> = entries.iter().cloned().enumerate().collect();
    numbered_cases(text, head, index, parameters, &entries);
}

fn numbered_cases(
    text: &mut Text,
    head: &str,
    index: &str,
    parameters: &[&str],
    entries: &[(usize, String)],
) {
    let mut body = Text::indented(1);
    for (place, entry) in entries {
        body.open(&format!("if ({index} == {place}) {{"));
        entry.lines().for_each(|line| body.line(&format!("{};", line.trim_end_matches(';'))));
        body.close("}");
    }
    if head.contains("double *") && !head.starts_with("void") {
        body.line("return NULL;");
    }
    text.open(&format!("{head} {{"));
    for parameter in parameters.iter().chain([&index]) {
        if !body.mentions(parameter) {
            text.line(&format!("(void){parameter};"));
        }
    }
    text.append(&body);
    text.close("}");
    text.blank();
}
