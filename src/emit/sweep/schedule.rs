//! The loops of a sweep: along the inside of a row, over its ends, and over all rows.

use super::{Faces, NodeFunctions, RESULT_ROW, Signature, SweepPrinter, Target};
use crate::emit::context::Variant;
use crate::emit::language::{Language, Linkage, Type};
use crate::emit::leaves::{Applied, outer_indices};
use crate::emit::operators::open_row_loop;
use crate::emit::text::{Text, mentions};
use crate::kernel::Source;

impl SweepPrinter<'_> {
    /// Width of the ends of an axis that are treated apart.
    fn edge(&self, axis: usize) -> usize {
        let faces = self.job.face_terms.iter().any(|term| term.on.axis == axis);
        let operators = self.leaves.applied.values().filter(|applied| applied.axis == axis);
        operators
            .map(|applied| self.context.edge(applied.operator, axis))
            .chain([usize::from(faces)])
            .max()
            .unwrap_or(0)
    }

    /// The operator at an interior node, inlined.
    fn inlined(&self, applied: &Applied, index: &str) -> String {
        let mut arguments = self.sources(applied, index);
        let name = self.context.operator(applied.operator, Variant::Inner);
        arguments.insert(0, self.leaves.here(applied.source, index));
        format!("{name}({})", arguments.join(", "))
    }

    /// Stride, coefficient and its stride, in the order of operator functions.
    fn sources(&self, applied: &Applied, index: &str) -> Vec<String> {
        let stride = |source: Source| self.context.stride(self.context.axes_of(source), applied.axis);
        let mut list = vec![stride(applied.source)];
        if let Some(coefficient) = applied.coefficient {
            list.push(self.leaves.here(coefficient, index));
            list.push(stride(coefficient));
        }
        list
    }

    /// The operator along the row at any of its nodes.
    fn at_any(&self, applied: &Applied, index: &str) -> String {
        let name = self.context.operator(applied.operator, Variant::At);
        let mut arguments = vec![self.leaves.here(applied.source, index)];
        arguments.extend(self.sources(applied, index));
        arguments.push(index.to_owned());
        arguments.push(self.context.axes[applied.axis].count.clone());
        format!("{name}({})", arguments.join(", "))
    }

    pub(super) fn inside(&self, text: &mut Text, node: &NodeFunctions) -> Signature {
        let language = self.language();
        let mut body = Text::indented(1);
        open_row_loop(&mut body, language, "i", "0", "count");
        for applied in self.leaves.applied.values() {
            body.line(&language.double(&applied.name, &self.inlined(applied, "i")));
        }
        self.node(&mut body, node, "i", Faces::None);
        body.close("}");
        let targets = self.targets();
        let mut parameters = vec![("count".to_owned(), Type::Index)];
        parameters.extend(targets.iter().map(|target| (target.clone(), Type::Out)));
        let arrays = self.leaves.arrays.values().filter(|name| !targets.contains(name));
        parameters.extend(arrays.map(|name| (name.clone(), Type::In)));
        parameters.extend(self.context.axes.iter().map(|axis| (axis.count.clone(), Type::Index)));
        parameters.extend(self.leaves.uniform.values().map(|name| (name.clone(), Type::Double)));
        parameters.retain(|(name, _)| body.mentions(name));
        text.open(&language.function(Linkage::Private, &format!("{}_inside", self.name), &parameters, &[]));
        if language == Language::Rust {
            for target in &targets {
                text.line(&format!("let {target} = {target}.as_mut_ptr();"));
            }
        }
        text.append(&body);
        text.close("}");
        text.blank();
        Signature { parameters }
    }

    /// A call of `NAME_inside` from node `first` of the row on.
    fn inside_call(&self, signature: &Signature, first: &str, count: &str) -> String {
        let language = self.language();
        let targets = self.targets();
        let argument = |name: &String, kind: Type| match (language, kind) {
            _ if name == "count" => count.to_owned(),
            (Language::Rust, Type::Out) => format!("line({}, {count})", language.shifted(name, first)),
            (_, Type::Out) => language.shifted(name, first),
            (_, Type::In) => {
                let source = self.leaves.arrays.iter().find(|(_, other)| *other == name);
                source.map_or(name.clone(), |(source, _)| self.leaves.here(*source, first))
            }
            _ => name.clone(),
        };
        debug_assert!(
            signature.parameters.iter().filter(|(_, kind)| *kind == Type::Out).count() == targets.len()
        );
        let arguments: Vec<String> =
            signature.parameters.iter().map(|(name, kind)| argument(name, *kind)).collect();
        format!("{}_inside({});", self.name, arguments.join(", "))
    }

    /// Whether there is a function that goes over some of the rows, so that a plan can choose which and when.
    fn by_parts(&self) -> bool {
        self.language() == Language::C && !matches!(self.job.target, Target::Largest)
    }

    /// The function that goes over rows. Returns whether it needs time and step, and its scratch rows.
    pub(super) fn schedule(
        &self,
        text: &mut Text,
        node: &NodeFunctions,
        inside: &Signature,
    ) -> (bool, bool, usize) {
        let language = self.language();
        let largest = matches!(self.job.target, Target::Largest);
        let single_part = self.by_parts() && self.context.axes.len() == 1;
        let depth = if single_part { 1 } else { 2 };
        let mut row = Text::indented(depth);
        let several = self.context.axes.len() > 1;
        let slots = if several {
            self.row_of_grid(&mut row, node, inside)
        } else {
            self.row_of_line(&mut row, node, inside)
        };
        let scratch_rows = slots + usize::from(largest);
        if largest {
            let count = &self.context.axes[self.context.fast()].count;
            let store = match language {
                Language::C => format!("s->row_maximum[row] = largest({RESULT_ROW}, {count});"),
                Language::Rust => {
                    format!("*s.row_maximum.first().offset(row) = largest({RESULT_ROW}, {count});")
                }
            };
            row.line(&store);
        }
        let inner = row.as_str().to_owned();
        let mut head = Text::indented(depth);
        self.scratch_declarations(&mut head, &inner, slots, largest);
        let pointers = self.leaves.row_declarations(&(inner.clone() + head.as_str()), &self.written);
        let mut body = Text::indented(depth);
        let known = pointers.join("\n") + &inner;
        outer_indices(self.context, &mut body, "row", &known);
        body.lines(&pointers);
        body.append(&head);
        body.append(&row);

        let mut function = Text::indented(1);
        let whole = body.as_str().to_owned();
        let uniform = self.leaves.uniform_declarations(&whole);
        function.lines(&uniform);
        if self.by_parts() {
            function.lines(&self.leaves.count_declarations(&whole));
            if several {
                function.open("for (ptrdiff_t row = low; row < high; row++) {");
            }
            function.append(&body);
            if several {
                function.close("}");
            }
            let (uses_time, uses_step) = (function.mentions("t"), function.mentions("dt"));
            text.open(&self.context.part_head(&self.name, [uses_time, uses_step]));
            text.append(&function);
            text.close("}");
            return (uses_time, uses_step, scratch_rows);
        }
        let rows = if several {
            "s->rows"
        } else if largest {
            "1"
        } else {
            "s->team"
        };
        let rows = if language == Language::C { rows.to_owned() } else { rows.replace("->", ".") };
        function.lines(&self.leaves.count_declarations(&whole));
        let parts = if several { "rows" } else { "parts" };
        function.line(&language.index(parts, &rows));
        self.open_rows(&mut function, parts, &whole);
        function.append(&body);
        function.close(language.pick("}", "});"));
        if largest {
            function.line(&language.result(&format!("largest({}, {parts})", language.array("row_maximum"))));
        }
        let uses_time = function.mentions("t");
        let uses_step = function.mentions("dt");
        text.open(&self.context.pass_head(&self.name, [uses_time, uses_step], largest));
        text.append(&function);
        text.close("}");
        (uses_time, uses_step, scratch_rows)
    }

    fn open_rows(&self, text: &mut Text, parts: &str, body: &str) {
        match self.language() {
            Language::C => {
                text.line("ROWS_IN_PARALLEL");
                text.open(&format!("for (ptrdiff_t row = 0; row < {parts}; row++) {{"));
            }
            Language::Rust => {
                let thread = if mentions(body, "thread") { "thread" } else { "_" };
                let row = if mentions(body, "row") { "row" } else { "_" };
                text.open(&format!("share(s, {parts}, &|{thread}, {row}| {{"));
            }
        }
    }

    /// Scratch rows of the present thread.
    fn scratch_declarations(&self, text: &mut Text, body: &str, slots: usize, largest: bool) {
        let language = self.language();
        let count = &self.context.axes[self.context.fast()].count;
        let mut names: Vec<&str> = Vec::new();
        if slots > 0 {
            names = self.scratch.iter().map(String::as_str).filter(|name| mentions(body, name)).collect();
        }
        if largest {
            names.push(RESULT_ROW);
        }
        if names.is_empty() {
            return;
        }
        text.line(&match language {
            Language::C => {
                "double *const scratch = s->scratch + thread_number() * s->scratch_length;".to_owned()
            }
            Language::Rust => "let scratch = s.scratch.first().offset(thread * s.scratch_length);".to_owned(),
        });
        for (slot, name) in names.into_iter().enumerate() {
            let offset = match slot {
                0 => "0".to_owned(),
                1 => count.clone(),
                _ => format!("{slot} * {count}"),
            };
            let kind = language.pick("double *const", "let");
            text.line(&format!("{kind} {name} = {};", language.shifted("scratch", &offset)));
        }
    }

    /// One row of a grid of two or three axes. Returns the number of scratch rows.
    fn row_of_grid(&self, text: &mut Text, node: &NodeFunctions, inside: &Signature) -> usize {
        let language = self.language();
        let fast = self.context.fast();
        let (count, index) = (&self.context.axes[fast].count, &self.context.axes[fast].index);
        let edge = self.edge(fast);
        let conditions: Vec<String> = (0..fast)
            .filter(|axis| self.edge(*axis) > 0)
            .map(|axis| {
                let (width, names) = (self.edge(axis), &self.context.axes[axis]);
                format!("{0} < {width} || {0} >= {1} - {width}", names.index, names.count)
            })
            .collect();
        let mut slots = 0;
        if !conditions.is_empty() {
            text.line(&language.truth("edge_row", &conditions.join(" || ")));
            slots = self.fill_scratch(text);
        }
        if edge > 0 {
            self.ends(text, node, edge, !conditions.is_empty());
        }
        let inside_call = self.inside_call(
            inside,
            &edge.to_string(),
            &if edge > 0 { format!("{count} - {}", 2 * edge) } else { count.clone() },
        );
        if conditions.is_empty() {
            text.line(&inside_call);
            return slots;
        }
        text.open(&language.when("!edge_row"));
        text.line(&inside_call);
        text.close("} else {");
        text.open_only();
        let high = if edge > 0 { format!("{count} - {edge}") } else { count.clone() };
        open_row_loop(text, language, index, &edge.to_string(), &high);
        for (place, applied) in self.leaves.applied.values().enumerate() {
            let value = if self.scratch_axis(applied) {
                language.at(&self.scratch[place], index)
            } else {
                self.inlined(applied, index)
            };
            text.line(&language.double(&applied.name, &value));
        }
        self.node(text, node, index, Faces::Outer);
        text.close("}");
        text.close("}");
        slots
    }

    /// Whether the operator is read from a scratch row near outer faces.
    fn scratch_axis(&self, applied: &Applied) -> bool {
        applied.axis != self.context.fast() && self.edge(applied.axis) > 0
    }

    fn fill_scratch(&self, text: &mut Text) -> usize {
        let language = self.language();
        let count = &self.context.axes[self.context.fast()].count;
        let outer: Vec<(usize, &Applied)> = self
            .leaves
            .applied
            .values()
            .enumerate()
            .filter(|(_, applied)| self.scratch_axis(applied))
            .collect();
        if outer.is_empty() {
            return 0;
        }
        text.open(&language.when("edge_row"));
        for (place, applied) in &outer {
            let moves = |source: Source| self.context.moves(self.context.axes_of(source));
            let variant = Variant::Row {
                field_moves: moves(applied.source),
                coefficient_moves: applied.coefficient.is_none_or(moves),
            };
            let name = self.context.operator(applied.operator, variant);
            let names = &self.context.axes[applied.axis];
            let row = &self.scratch[*place];
            let mut arguments = match language {
                Language::C => vec![row.clone()],
                Language::Rust => vec![format!("line({row}, {count})")],
            };
            arguments.push(self.leaves.here(applied.source, "0"));
            arguments.extend(self.sources(applied, "0"));
            arguments.extend([names.index.clone(), names.count.clone(), count.clone()]);
            text.line(&format!("{name}({});", arguments.join(", ")));
        }
        text.close("}");
        outer.len()
    }

    /// The nodes at both ends of a row, one by one.
    fn ends(&self, text: &mut Text, node: &NodeFunctions, edge: usize, edge_rows: bool) {
        let language = self.language();
        let fast = self.context.fast();
        let (count, index) = (&self.context.axes[fast].count, &self.context.axes[fast].index);
        text.open(&language.count("end", "0", &(2 * edge).to_string()));
        let place =
            language.choose(&format!("end < {edge}"), "end", &format!("{count} - {} + end", 2 * edge));
        text.line(&language.index(index, &place));
        let guarded = self.by_parts() && self.context.axes.len() == 1;
        if guarded {
            text.open(&format!("if ({index} >= low && {index} < high) {{"));
        }
        for (slot, applied) in self.leaves.applied.values().enumerate() {
            let value = if applied.axis == fast {
                self.at_any(applied, index)
            } else if edge_rows && self.scratch_axis(applied) {
                language.choose(
                    "edge_row",
                    &language.at(&self.scratch[slot], index),
                    &self.inlined(applied, index),
                )
            } else {
                self.inlined(applied, index)
            };
            text.line(&language.double(&applied.name, &value));
        }
        self.node(text, node, index, Faces::All);
        if guarded {
            text.close("}");
        }
        text.close("}");
    }

    /// The nodes of a grid of one axis that fall to part `row`. Returns the number of scratch rows.
    fn row_of_line(&self, text: &mut Text, node: &NodeFunctions, inside: &Signature) -> usize {
        let language = self.language();
        let count = &self.context.axes[0].count;
        let edge = self.edge(0);
        if self.by_parts() {
            return self.part_of_line(text, node, inside, edge);
        }
        if edge > 0 {
            text.open(&language.when("row == 0"));
            self.ends(text, node, edge, false);
            text.close("}");
        }
        let (width, low) = if edge > 0 {
            (format!("({count} - {})", 2 * edge), format!("{edge} + "))
        } else {
            (count.clone(), String::new())
        };
        text.line(&language.index("first", &format!("{low}{width} * row / parts")));
        text.line(&language.index("last", &format!("{low}{width} * (row + 1) / parts")));
        text.line(&self.inside_call(inside, "first", "last - first"));
        0
    }

    /// The nodes of a grid of one axis from `low` to `high`.
    fn part_of_line(&self, text: &mut Text, node: &NodeFunctions, inside: &Signature, edge: usize) -> usize {
        let count = &self.context.axes[0].count;
        if edge == 0 {
            text.line(&self.inside_call(inside, "low", "high - low"));
            return 0;
        }
        text.open(&format!("if (low < {edge} || high > {count} - {edge}) {{"));
        self.ends(text, node, edge, false);
        text.close("}");
        text.line(&format!("const ptrdiff_t first = low < {edge} ? {edge} : low;"));
        text.line(&format!("const ptrdiff_t last = high > {count} - {edge} ? {count} - {edge} : high;"));
        text.open("if (first < last) {");
        text.line(&self.inside_call(inside, "first", "last - first"));
        text.close("}");
        0
    }
}
