//! Value graphs as statements: what is used once is nested, what is used more often gets a name. Parentheses keep
//! exactly the graph's order of operations.

use super::language::{Language, relation};
use super::literal;
use super::namer::Namer;
use crate::kernel::{Kernel, Operation, ValueId};

/// Longest expression that is nested into another one.
const LONGEST_NESTED: usize = 90;

/// Statements and the texts of the values that were asked for.
#[derive(Clone, Debug, Default)]
pub struct Statements {
    pub lines: Vec<String>,
    pub roots: Vec<String>,
}

/// How a value is met: a literal as the operand of a library function must be read at run time, or compilers would
/// evaluate the call themselves, with another rounding than the library's.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Met {
    Plain,
    ByLibrary,
}

/// How tightly a text binds.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Binding {
    Sum,
    Product,
    Signed,
    Atom,
}

#[derive(Clone)]
struct Piece {
    text: String,
    binding: Binding,
}

impl Piece {
    fn atom(text: String) -> Piece {
        let binding = if text.starts_with('-') { Binding::Signed } else { Binding::Atom };
        Piece { text, binding }
    }

    /// The text as the left operand of something that binds like `outer`.
    fn left(&self, outer: Binding) -> String {
        if self.binding >= outer { self.text.clone() } else { format!("({})", self.text) }
    }

    /// The text as the right operand: only atoms stand without parentheses, so that the order stays the graph's. A
    /// product may stand right of a sum.
    fn right(&self, outer: Binding) -> String {
        let open =
            self.binding == Binding::Atom || (self.binding == Binding::Product && outer == Binding::Sum);
        if open && !self.text.starts_with('-') { self.text.clone() } else { format!("({})", self.text) }
    }
}

/// Prints values. `leaf` gives the text of what is already known at the place of the statements.
pub struct Printer<'a> {
    pub kernel: &'a Kernel,
    pub language: Language,
    pub leaf: &'a mut dyn FnMut(ValueId, Met) -> Option<String>,
    pub names: &'a mut Namer,
}

/// Values whose texts compilers could evaluate themselves.
type Foldable<'f> = Option<&'f [bool]>;

impl Printer<'_> {
    /// Statements that compute `roots`.
    pub fn statements(&mut self, roots: &[ValueId]) -> Statements {
        self.run(roots, None)
    }

    /// The same, with operands of library functions hidden from the compiler where it could evaluate the call itself.
    pub fn statements_with_opaque(&mut self, roots: &[ValueId], constant_only: &[bool]) -> Statements {
        self.run(roots, Some(constant_only))
    }

    fn run(&mut self, roots: &[ValueId], foldable: Foldable) -> Statements {
        let (needed, uses) = self.needed(roots);
        let mut pieces: Vec<Option<Piece>> = vec![None; self.kernel.values.len()];
        let mut result = Statements::default();
        for id in needed {
            let mut piece = match (self.leaf)(id, Met::Plain) {
                Some(text) => Piece::atom(text),
                None => self.piece(id, &pieces, foldable),
            };
            let simple =
                piece.binding == Binding::Atom && !piece.text.contains('(') || is_number(&piece.text);
            let long = piece.text.len() > LONGEST_NESTED && !roots.contains(&id);
            if !simple && (uses[id.0] > 1 || long) {
                let name = self.names.name(self.kernel.values[id.0].hint.as_deref().unwrap_or("term"));
                result.lines.push(self.language.double(&name, &piece.text));
                piece = Piece::atom(name);
            }
            pieces[id.0] = Some(piece);
        }
        let text = |root: &ValueId| pieces[root.0].as_ref().map_or(String::new(), |piece| piece.text.clone());
        result.roots = roots.iter().map(text).collect();
        result
    }

    /// The values below `roots` down to leaves, in graph order, and how often each is used.
    fn needed(&mut self, roots: &[ValueId]) -> (Vec<ValueId>, Vec<usize>) {
        let mut uses = vec![0usize; self.kernel.values.len()];
        for root in roots {
            uses[root.0] += 1;
        }
        let mut needed = Vec::new();
        let last = roots.iter().map(|root| root.0 + 1).max().unwrap_or(0);
        for index in (0..last).rev() {
            if uses[index] == 0 {
                continue;
            }
            needed.push(ValueId(index));
            if (self.leaf)(ValueId(index), Met::Plain).is_none() {
                let operation = &self.kernel.values[index].operation;
                for operand in operation.operands() {
                    uses[operand.0] += 1;
                }
            }
        }
        needed.reverse();
        (needed, uses)
    }

    fn piece(&mut self, id: ValueId, pieces: &[Option<Piece>], foldable: Foldable) -> Piece {
        let language = self.language;
        let of =
            |value: &ValueId| pieces[value.0].clone().unwrap_or_else(|| Piece::atom("unknown".to_owned()));
        let pair = |a: &ValueId, sign: &str, b: &ValueId, binding: Binding| Piece {
            text: format!("{} {sign} {}", of(a).left(binding), of(b).right(binding)),
            binding,
        };
        let operation = &self.kernel.values[id.0].operation;
        match operation {
            Operation::Literal(number) => Piece::atom(literal::rational(number, language)),
            Operation::Pi => Piece::atom(language.pi()),
            Operation::Add(a, b) => pair(a, "+", b, Binding::Sum),
            Operation::Subtract(a, b) => pair(a, "-", b, Binding::Sum),
            Operation::Multiply(a, b) => pair(a, "*", b, Binding::Product),
            Operation::Divide(a, b) => pair(a, "/", b, Binding::Product),
            Operation::Negate(a) => {
                Piece { text: format!("-{}", of(a).right(Binding::Signed)), binding: Binding::Signed }
            }
            Operation::Minimum(a, b) => Piece::atom(format!("minimum({}, {})", of(a).text, of(b).text)),
            Operation::Maximum(a, b) => Piece::atom(format!("maximum({}, {})", of(a).text, of(b).text)),
            Operation::Power(a, b) => {
                let base = self.by_library(a, of(a).text, foldable);
                let exponent = self.by_library(b, of(b).text, foldable);
                Piece::atom(language.power(&base, &exponent))
            }
            Operation::Call(function, a) => {
                let argument = self.by_library(a, of(a).text, foldable);
                Piece::atom(language.call(*function, &argument))
            }
            Operation::Select { left, relation: order, right, then, otherwise } => Piece::atom(format!(
                "select({} {} {}, {}, {})",
                of(left).left(Binding::Sum),
                relation(*order),
                of(right).left(Binding::Sum),
                of(then).text,
                of(otherwise).text
            )),
            // Everything else is a leaf of whoever prints it: validation keeps rates, loads and coordinates in their places.
            _ => Piece::atom(format!("leaf_{}", id.0)),
        }
    }

    fn by_library(&mut self, value: &ValueId, text: String, foldable: Foldable) -> String {
        match foldable {
            Some(constant_only) if constant_only[value.0] => format!("opaque({text})"),
            _ => (self.leaf)(*value, Met::ByLibrary).unwrap_or(text),
        }
    }
}

fn is_number(text: &str) -> bool {
    text.parse::<f64>().is_ok()
}

/// Whether each value is made of literals alone.
pub fn constant_only(kernel: &Kernel) -> Vec<bool> {
    let mut constant: Vec<bool> = Vec::with_capacity(kernel.values.len());
    for value in &kernel.values {
        let operands = value.operation.operands();
        let own = match value.operation {
            Operation::Literal(_) | Operation::Pi => true,
            _ => !operands.is_empty(),
        };
        let all = operands.iter().all(|operand| constant[operand.0]);
        constant.push(own && all);
    }
    constant
}
