//! Functions that apply a line operator: at interior nodes, at any node of a line, and along a whole row of nodes.
//!
//! All three follow the kernel's order of operations, so that a node's bits do not depend on which one is used.

use super::context::{Context, Variant};
use super::language::{Language, Linkage, Type};
use super::literal;
use super::text::Text;
use crate::exact::Rational;
use crate::kernel::{
    ClosureRow, ConstantOperator, LineOperator, OperatorId, Parity, VaryingEntry, VaryingOperator,
};

/// Nodes of a row that are treated together where a coefficient's sum is kept beside the result.
const BLOCK: usize = 64;

/// Weight tables and functions of all operators in use.
pub fn operators(context: &Context) -> Text {
    let mut text = Text::default();
    let used = context.used.borrow().clone();
    for id in (0..context.operators.len()).map(OperatorId) {
        let variants: Vec<Variant> =
            used.iter().filter(|(other, _)| *other == id).map(|(_, kind)| *kind).collect();
        if !variants.is_empty() {
            Printer { context, id, name: &context.operators[id.0] }.all(&mut text, &variants);
        }
    }
    text
}

struct Printer<'a> {
    context: &'a Context<'a>,
    id: OperatorId,
    name: &'a str,
}

/// Where the value at an offset stands.
type Place<'p> = &'p dyn Fn(&str, i64) -> String;

impl Printer<'_> {
    fn language(&self) -> Language {
        self.context.language
    }

    fn operator(&self) -> &LineOperator {
        &self.context.kernel.operators[self.id.0].operator
    }

    fn array(&self, ending: &str) -> String {
        self.language().constant(&format!("{}_{ending}", self.name))
    }

    fn varying(&self) -> bool {
        matches!(self.operator(), LineOperator::Varying(_))
    }

    fn all(&self, text: &mut Text, variants: &[Variant]) {
        let edges = variants.iter().any(|variant| *variant != Variant::Inner);
        text.comment(&format!("{}: {}", self.context.kernel.operators[self.id.0].name, self.what()));
        self.interior_weights(text);
        let rows = self.operator().closure_rows();
        if edges && rows > 0 {
            match self.operator() {
                LineOperator::Constant(operator) => self.constant_tables(text, &operator.closure),
                LineOperator::Varying(operator) => self.varying_tables(text, &operator.closure),
            }
        }
        text.blank();
        self.inner(text);
        for variant in variants {
            match variant {
                Variant::Inner => {}
                Variant::At => self.at(text),
                Variant::Row { field_moves, coefficient_moves } => {
                    self.row(text, &[*field_moves, *coefficient_moves], variant.ending());
                }
            }
        }
    }

    fn what(&self) -> String {
        let rows = self.operator().closure_rows();
        let edge = if rows == 0 { String::new() } else { format!(", {rows} closure rows at each end") };
        let kind = match self.operator() {
            LineOperator::Constant(ConstantOperator { parity: Parity::Odd, .. }) => "odd weights",
            LineOperator::Constant(_) => "even weights",
            LineOperator::Varying(_) => "weights linear in a coefficient",
        };
        let reach = self.operator().interior_reach();
        format!("{kind}, {reach} neighbours to each side inside{edge}; in units of the spacing")
    }

    fn interior_weights(&self, text: &mut Text) {
        let mut entries = Vec::new();
        match self.operator() {
            LineOperator::Constant(operator) => {
                for (offset, weight) in interior(operator) {
                    let sign = match (operator.parity, offset) {
                        (_, 0) => "at 0".to_owned(),
                        (Parity::Odd, _) => format!("at +{offset}, negated at -{offset}"),
                        (Parity::Even, _) => format!("at +{offset} and -{offset}"),
                    };
                    entries.push((weight.clone(), sign));
                }
            }
            LineOperator::Varying(operator) => {
                for (form, shift) in operator.forms.iter().zip(1..) {
                    entries.extend(form.iter().map(|(offset, weight)| {
                        (weight.clone(), format!("coefficient at {offset:+}, for the difference to +{shift}"))
                    }));
                }
            }
        }
        self.doubles(text, "weights", &entries);
    }

    /// A constant array of doubles with the exact fractions beside them.
    fn doubles(&self, text: &mut Text, ending: &str, entries: &[(Rational, String)]) {
        let language = self.language();
        let name = self.array(ending);
        let count = entries.len();
        text.open(&match language {
            Language::C => format!("static const double {name}[{count}] = {{"),
            Language::Rust => format!("static {name}: [f64; {count}] = ["),
        });
        for (weight, what) in entries {
            let number = literal::rational(weight, language) + ",";
            text.line(&format!("{number:<25} /* {}, {what} */", literal::fraction(weight)));
        }
        text.close(language.pick("};", "];"));
    }

    fn indices(&self, text: &mut Text, ending: &str, entries: &[usize]) {
        let name = self.array(ending);
        let list = entries.iter().map(usize::to_string).collect::<Vec<_>>().join(", ");
        let count = entries.len();
        text.line(&match self.language() {
            Language::C => format!("static const ptrdiff_t {name}[{count}] = {{ {list} }};"),
            Language::Rust => format!("static {name}: [isize; {count}] = [{list}];"),
        });
    }

    fn constant_tables(&self, text: &mut Text, closure: &[ClosureRow]) {
        text.comment("Closure row r weighs the nodes first[r], first[r] + 1, ... by closure[start[r]] to closure[start[r + 1] - 1].");
        let firsts: Vec<usize> = closure.iter().map(|row| row.first).collect();
        self.indices(text, "first", &firsts);
        let mut starts = vec![0];
        let mut entries = Vec::new();
        for (number, row) in closure.iter().enumerate() {
            for (column, weight) in row.weights.iter().enumerate() {
                entries.push((weight.clone(), format!("row {number}, node {}", row.first + column)));
            }
            starts.push(entries.len());
        }
        self.indices(text, "start", &starts);
        self.doubles(text, "closure", &entries);
    }

    fn varying_tables(&self, text: &mut Text, closure: &[Vec<VaryingEntry>]) {
        text.comment("Closure row r has the entries entries[r] to entries[r + 1] - 1; entry e weighs the field at column[e] by the sum of");
        text.comment("closure[k] times the coefficient at node[k] for k from terms[e] to terms[e + 1] - 1.");
        let (mut entries, mut columns, mut terms, mut nodes) = (vec![0], Vec::new(), vec![0], Vec::new());
        let mut weights = Vec::new();
        for (number, row) in closure.iter().enumerate() {
            for entry in row {
                columns.push(entry.column);
                for (node, weight) in &entry.weights {
                    nodes.push(*node);
                    let what = format!("row {number}, field at {}, coefficient at {node}", entry.column);
                    weights.push((weight.clone(), what));
                }
                terms.push(nodes.len());
            }
            entries.push(columns.len());
        }
        self.indices(text, "entries", &entries);
        self.indices(text, "column", &columns);
        self.indices(text, "terms", &terms);
        self.indices(text, "node", &nodes);
        self.doubles(text, "closure", &weights);
    }

    /// Parameters that name the field, its stride and, for varying operators, the coefficient and its stride.
    fn sources(&self) -> Vec<(String, Type)> {
        let mut list = vec![("f".to_owned(), Type::In), ("stride".to_owned(), Type::Index)];
        if self.varying() {
            list.push(("b".to_owned(), Type::In));
            list.push(("b_stride".to_owned(), Type::Index));
        }
        list
    }

    /// The interior formula as statements and a result.
    fn formula(&self, field: Place, coefficient: Place) -> (Vec<String>, String) {
        match self.operator() {
            LineOperator::Constant(operator) => (Vec::new(), self.constant_formula(operator, field)),
            LineOperator::Varying(operator) => self.varying_formula(operator, field, coefficient),
        }
    }

    fn constant_formula(&self, operator: &ConstantOperator, field: Place) -> String {
        let weights = self.array("weights");
        let terms: Vec<String> = interior(operator)
            .enumerate()
            .map(|(place, (offset, _))| {
                let weight = self.language().entry(&weights, &place.to_string());
                let sign = match operator.parity {
                    Parity::Odd => "-",
                    Parity::Even => "+",
                };
                match offset {
                    0 => format!("{weight} * {}", field("f", 0)),
                    _ => format!("{weight} * ({} {sign} {})", field("f", offset), field("f", -offset)),
                }
            })
            .collect();
        terms.join(" + ")
    }

    fn varying_formula(
        &self,
        operator: &VaryingOperator,
        field: Place,
        coefficient: Place,
    ) -> (Vec<String>, String) {
        let weights = self.array("weights");
        let mut lines = Vec::new();
        let mut sum = Vec::new();
        let mut used = 0;
        for (form, shift) in operator.forms.iter().zip(1i64..) {
            for (side, moved) in [("ahead", 0), ("behind", -shift)] {
                let terms: Vec<String> = form
                    .iter()
                    .enumerate()
                    .map(|(place, (offset, _))| {
                        let weight = self.language().entry(&weights, &(used + place).to_string());
                        format!("{weight} * {}", coefficient("b", offset + moved))
                    })
                    .collect();
                let name = format!("{side}_{shift}");
                lines.push(self.language().double(&name, &terms.join(" + ")));
                let other = if side == "ahead" { shift } else { -shift };
                sum.push(format!("{name} * ({} - {})", field("f", other), field("f", 0)));
            }
            used += form.len();
        }
        (lines, sum.join(" + "))
    }

    fn inner(&self, text: &mut Text) {
        let language = self.language();
        inline_mark(text, language);
        text.open(&language.function(Linkage::Inlined, self.name, &self.sources(), &["result".to_owned()]));
        let place = |array: &str, offset: i64| {
            let stride = if array == "f" { "stride" } else { "b_stride" };
            language.at(array, &steps(offset, stride))
        };
        let (lines, result) = self.formula(&place, &place);
        text.lines(&lines);
        text.line(&language.result(&result));
        text.close("}");
        text.blank();
    }

    /// Result at any node: `f` and `b` point at the node itself, `index` is its place on a line of `nodes` nodes.
    fn at(&self, text: &mut Text) {
        let language = self.language();
        let mut parameters = self.sources();
        parameters.push(("index".to_owned(), Type::Index));
        parameters.push(("nodes".to_owned(), Type::Index));
        let name = format!("{}_at", self.name);
        text.open(&language.function(Linkage::Private, &name, &parameters, &["result".to_owned()]));
        let edge = self.operator().closure_rows();
        let reach = if edge == 0 { self.operator().interior_reach() } else { edge };
        text.open(&language.when(&format!("index >= {reach} && index < nodes - {reach}")));
        let coefficient = if self.varying() { ", b, b_stride" } else { "" };
        text.line(&format!("return {}(f, stride{coefficient});", self.name));
        text.close("}");
        match self.operator() {
            _ if edge == 0 => {
                let (lines, result) = self.formula(&self.wrapped(), &self.wrapped());
                text.lines(&lines);
                text.line(&language.result(&result));
            }
            LineOperator::Constant(operator) => self.constant_at(text, operator),
            LineOperator::Varying(_) => self.varying_at(text),
        }
        text.close("}");
        text.blank();
    }

    /// Places on a periodic line, without a position along the row.
    fn wrapped(&self) -> impl Fn(&str, i64) -> String {
        let language = self.language();
        move |array: &str, offset: i64| {
            let stride = if array == "f" { "stride" } else { "b_stride" };
            match offset {
                0 => language.at(array, "0"),
                _ => language.at(array, &format!("wrap(index, {offset}, nodes) * {stride}")),
            }
        }
    }

    /// `row`: the closure row; `high`: whether it is mirrored; `forward`: elements to the next node of the row.
    fn mirror(&self, text: &mut Text) {
        let language = self.language();
        let rows = self.operator().closure_rows();
        text.line(&language.truth("high", &format!("index >= {rows}")));
        text.line(&language.index("row", &language.choose("high", "nodes - 1 - index", "index")));
        text.line(&language.index("forward", &language.choose("high", "-stride", "stride")));
        if self.varying() {
            text.line(&language.index("b_forward", &language.choose("high", "-b_stride", "b_stride")));
        }
    }

    fn sign(&self, text: &mut Text, operator: &ConstantOperator) -> &'static str {
        if operator.parity == Parity::Even {
            return "";
        }
        let language = self.language();
        text.line(&language.double("turn", &language.choose("high", "-1.0", "1.0")));
        "turn * "
    }

    fn constant_at(&self, text: &mut Text, operator: &ConstantOperator) {
        let language = self.language();
        self.mirror(text);
        let sign = self.sign(text, operator);
        let (first, start) = (self.array("first"), self.array("start"));
        text.line(&language.index("from", &language.entry(&start, "row")));
        text.line(&language.index("columns", &format!("{} - from", language.entry(&start, "row + 1"))));
        let node = |column: &str| {
            language.at("f", &format!("({} - row{column}) * forward", language.entry(&first, "row")))
        };
        let weight = |place: &str| grouped(sign, &language.entry(&self.array("closure"), place));
        text.line(&language.variable("sum", &format!("{} * {}", weight("from"), node(""))));
        text.open(&language.count("column", "1", "columns"));
        text.line(&format!("sum = sum + {} * {};", weight("from + column"), node(" + column")));
        text.close("}");
        text.line(&language.result("sum"));
    }

    fn varying_at(&self, text: &mut Text) {
        let language = self.language();
        self.mirror(text);
        let (entries, terms) = (self.array("entries"), self.array("terms"));
        let field = language
            .at("f", &format!("({} - row) * forward", language.entry(&self.array("column"), "entry")));
        let coefficient = |k: &str| {
            language.at("b", &format!("({} - row) * b_forward", language.entry(&self.array("node"), k)))
        };
        let weight = |k: &str| language.entry(&self.array("closure"), k);
        text.line(&language.index("start", &language.entry(&entries, "row")));
        text.line(&language.variable("sum", "0.0"));
        text.open(&language.count("entry", "start", &language.entry(&entries, "row + 1")));
        text.line(&language.index("term", &language.entry(&terms, "entry")));
        text.line(&language.variable("factor", &format!("{} * {}", weight("term"), coefficient("term"))));
        text.open(&language.count("k", "term + 1", &language.entry(&terms, "entry + 1")));
        text.line(&format!("factor = factor + {} * {};", weight("k"), coefficient("k")));
        text.close("}");
        let product = format!("factor * {field}");
        let value = language.choose("entry == start", &product, &format!("sum + {product}"));
        text.line(&format!("sum = {value};"));
        text.close("}");
        text.line(&language.result("sum"));
    }

    /// Results along a row of `count` nodes, all at place `index` of lines of `nodes` nodes.
    fn row(&self, text: &mut Text, moves: &[bool; 2], ending: &str) {
        let language = self.language();
        let mut parameters = vec![("result".to_owned(), Type::Out)];
        parameters.extend(self.sources());
        for name in ["index", "nodes", "count"] {
            parameters.push((name.to_owned(), Type::Index));
        }
        let name = format!("{}{ending}", self.name);
        text.open(&language.function(Linkage::Private, &name, &parameters, &[]));
        if language == Language::Rust {
            text.line("let result = result.as_mut_ptr();");
        }
        let along = |array: &str| moves[usize::from(array == "b")];
        let edge = self.operator().closure_rows();
        let reach = if edge == 0 { self.operator().interior_reach() } else { edge };
        text.open(&language.when(&format!("index >= {reach} && index < nodes - {reach}")));
        open_row_loop(text, language, "i", "0", "count");
        let here = |array: &str| if along(array) { language.shifted(array, "i") } else { array.to_owned() };
        let coefficient = if self.varying() { format!(", {}, b_stride", here("b")) } else { String::new() };
        text.line(&language.store(
            "result",
            "i",
            &format!("{}({}, stride{coefficient})", self.name, here("f")),
        ));
        text.close("}");
        text.line("return;");
        text.close("}");
        match self.operator() {
            _ if edge == 0 => self.wrapped_row(text, &along),
            LineOperator::Constant(operator) => self.constant_row(text, operator, moves[0]),
            LineOperator::Varying(_) => self.varying_row(text, moves),
        }
        text.close("}");
        text.blank();
    }

    fn wrapped_row(&self, text: &mut Text, along: &dyn Fn(&str) -> bool) {
        let language = self.language();
        let reach = self.operator().interior_reach() as i64;
        let mut body = Text::indented(text.depth());
        open_row_loop(&mut body, language, "i", "0", "count");
        let place = |array: &str, offset: i64| {
            language.at(&wrapped_name(array, offset), if along(array) { "i" } else { "0" })
        };
        let (lines, result) = self.formula(&place, &place);
        body.lines(&lines);
        body.line(&language.store("result", "i", &result));
        body.close("}");
        for (array, stride) in [("f", "stride"), ("b", "b_stride")] {
            for offset in -reach..=reach {
                let name = wrapped_name(array, offset);
                if offset != 0 && body.mentions(&name) {
                    let value = language.shifted(array, &format!("wrap(index, {offset}, nodes) * {stride}"));
                    text.line(&language.pointer(&name, &value));
                }
            }
        }
        text.append(&body);
    }

    fn constant_row(&self, text: &mut Text, operator: &ConstantOperator, moves: bool) {
        let language = self.language();
        self.mirror(text);
        let sign = self.sign(text, operator);
        let (first, start) = (self.array("first"), self.array("start"));
        text.line(&language.index("from", &language.entry(&start, "row")));
        text.line(&language.index("columns", &format!("{} - from", language.entry(&start, "row + 1"))));
        text.open(&language.count("column", "0", "columns"));
        let node = format!("({} - row + column) * forward", language.entry(&first, "row"));
        text.line(&language.pointer("g", &language.shifted("f", &node)));
        let weight = language.entry(&self.array("closure"), "from + column");
        text.line(&language.double("weight", &format!("{sign}{weight}")));
        let product = format!("weight * {}", language.at("g", if moves { "i" } else { "0" }));
        self.accumulate(text, "column == 0", &product);
        text.close("}");
    }

    /// result ← product at the first time, result + product later.
    fn accumulate(&self, text: &mut Text, first: &str, product: &str) {
        let language = self.language();
        text.open(&language.when(first));
        open_row_loop(text, language, "i", "0", "count");
        text.line(&language.store("result", "i", product));
        text.close("}");
        text.close("} else {");
        text.open_only();
        open_row_loop(text, language, "i", "0", "count");
        text.line(&language.store("result", "i", &format!("{} + {product}", language.at("result", "i"))));
        text.close("}");
        text.close("}");
    }

    fn varying_row(&self, text: &mut Text, moves: &[bool; 2]) {
        let language = self.language();
        self.mirror(text);
        let (entries, terms) = (self.array("entries"), self.array("terms"));
        let index = |moves: bool| if moves { "block + i" } else { "0" };
        text.line(&language.index("start", &language.entry(&entries, "row")));
        text.line(&match language {
            Language::C => format!("double factor[{BLOCK}] = {{ 0.0 }};"),
            Language::Rust => format!("let mut factor = [0.0; {BLOCK}];"),
        });
        text.line(&language.index("blocks", &format!("(count + {}) / {BLOCK}", BLOCK - 1)));
        text.open(&language.count("number", "0", "blocks"));
        text.line(&language.index("block", &format!("number * {BLOCK}")));
        let rest = language.choose(&format!("count - block < {BLOCK}"), "count - block", &BLOCK.to_string());
        text.line(&language.index("width", &rest));
        text.open(&language.count("entry", "start", &language.entry(&entries, "row + 1")));
        text.line(&language.index("term", &language.entry(&terms, "entry")));
        text.open(&language.count("k", "term", &language.entry(&terms, "entry + 1")));
        let node = format!("({} - row) * b_forward", language.entry(&self.array("node"), "k"));
        text.line(&language.pointer("c", &language.shifted("b", &node)));
        text.line(&language.double("weight", &language.entry(&self.array("closure"), "k")));
        let product = format!("weight * {}", language.at("c", index(moves[1])));
        open_row_loop(text, language, "i", "0", "width");
        let kept = language.entry("factor", "i");
        text.line(&format!(
            "{kept} = {};",
            language.choose("k == term", &product, &format!("{kept} + {product}"))
        ));
        text.close("}");
        text.close("}");
        let node = format!("({} - row) * forward", language.entry(&self.array("column"), "entry"));
        text.line(&language.pointer("g", &language.shifted("f", &node)));
        let product = format!("{kept} * {}", language.at("g", index(moves[0])));
        open_row_loop(text, language, "i", "0", "width");
        let sum = format!("{} + {product}", language.at("result", "block + i"));
        let value = language.choose("entry == start", &product, &sum);
        text.line(&language.store("result", "block + i", &value));
        text.close("}");
        text.close("}");
        text.close("}");
    }
}

/// Weights that are not zero with their offsets.
fn interior(operator: &ConstantOperator) -> impl Iterator<Item = (i64, &Rational)> {
    let first = match operator.parity {
        Parity::Odd => 1,
        Parity::Even => 0,
    };
    (first..).zip(&operator.interior).filter(|(_, weight)| !weight.is_zero())
}

fn steps(offset: i64, stride: &str) -> String {
    match offset {
        0 => "0".to_owned(),
        1 => stride.to_owned(),
        -1 => format!("-{stride}"),
        _ => format!("{offset} * {stride}"),
    }
}

fn grouped(sign: &str, weight: &str) -> String {
    if sign.is_empty() { weight.to_owned() } else { format!("({sign}{weight})") }
}

fn wrapped_name(array: &str, offset: i64) -> String {
    match offset {
        0 => array.to_owned(),
        _ if offset > 0 => format!("{array}_plus_{offset}"),
        _ => format!("{array}_minus_{}", -offset),
    }
}

/// The head of a loop along a row without dependence between its nodes.
pub fn open_row_loop(text: &mut Text, language: Language, index: &str, low: &str, high: &str) {
    if language == Language::C {
        text.line("ALONG_THE_ROW");
    }
    text.open(&language.count(index, low, high));
}

/// Rust marks inlined functions on a line of their own.
pub fn inline_mark(text: &mut Text, language: Language) {
    if language == Language::Rust {
        text.line("#[inline(always)]");
    }
}
