//! Formulas → text: one spelling for each tree, which reads back as the same tree.
//!
//! For messages and for comments in emitted programs. Whole files are [`super::format`]'s business, which keeps
//! what the user wrote.

use super::names::raised;
use super::tree::{
    Comparison, Derivative, Expression, ExpressionKind, Factor, Operation, Relation, Sign, Term, Unit,
};
use crate::exact::Rational;

/// Most digits that a number has in plain notation; longer ones have an exponent of ten.
const MOST_DIGITS: usize = 20;

/// Where a formula stands, and so which formulas need a bracket there.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Place {
    Whole,
    Term,
    Factor,
    /// After `Δ` or `∇`.
    Operand,
    Base,
}

/// A formula in canonical spelling.
pub fn print_expression(expression: &Expression) -> String {
    let mut out = String::new();
    write(&mut out, expression, Place::Whole);
    out
}

/// A comparison in canonical spelling.
pub fn print_comparison(comparison: &Comparison) -> String {
    let mut out = String::new();
    write_comparison(&mut out, comparison);
    out
}

/// A unit as it was spelled; `1` if it has no factors.
pub fn print_unit(unit: &Unit) -> String {
    if unit.factors.is_empty() { "1".into() } else { unit.spelling.clone() }
}

/// A number as a literal of the language: exact, and a fraction only where no decimal is.
pub fn print_number(value: &Rational) -> String {
    decimal(value).unwrap_or_else(|| value.to_string())
}

fn write(out: &mut String, expression: &Expression, place: Place) {
    if needs_bracket(&expression.kind, place) {
        out.push('(');
        write_bare(out, expression);
        out.push(')');
    } else {
        write_bare(out, expression);
    }
}

fn needs_bracket(kind: &ExpressionKind, place: Place) -> bool {
    match kind {
        ExpressionKind::Sum(_) | ExpressionKind::Negate(_) => place > Place::Whole,
        ExpressionKind::Number(value) => {
            (value.is_negative() && place > Place::Whole) || (decimal(value).is_none() && place > Place::Term)
        }
        ExpressionKind::Product(_) => place > Place::Term,
        ExpressionKind::Dot(..) | ExpressionKind::Power { .. } => place > Place::Factor,
        ExpressionKind::Quantity { .. }
        | ExpressionKind::Derivative(_)
        | ExpressionKind::Laplacian(_)
        | ExpressionKind::Gradient(_)
        | ExpressionKind::Divergence(_) => place == Place::Base,
        _ => false,
    }
}

fn write_bare(out: &mut String, expression: &Expression) {
    match &expression.kind {
        ExpressionKind::Number(value) => out.push_str(&print_number(value)),
        ExpressionKind::Quantity { value, unit } => {
            out.push_str(&print_number(value));
            out.push(' ');
            out.push_str(&print_unit(unit));
        }
        ExpressionKind::Pi => out.push('π'),
        ExpressionKind::Name(name) => out.push_str(name),
        ExpressionKind::Sum(terms) => write_sum(out, terms),
        ExpressionKind::Product(factors) => write_product(out, factors),
        ExpressionKind::Negate(inner) => {
            out.push('-');
            write(out, inner, Place::Term);
        }
        ExpressionKind::Power { base, exponent } => {
            write(out, base, Place::Base);
            out.push('^');
            write_exponent(out, exponent);
        }
        ExpressionKind::Call { function, arguments } => write_call(out, function.name(), arguments),
        ExpressionKind::Apply { operator, arguments } => write_call(out, &operator.text, arguments),
        ExpressionKind::Cases { branches, otherwise } => {
            out.push_str("cases(");
            for branch in branches {
                write_comparison(out, &branch.condition);
                out.push_str(": ");
                write(out, &branch.value, Place::Whole);
                out.push_str(", ");
            }
            out.push_str("otherwise: ");
            write(out, otherwise, Place::Whole);
            out.push(')');
        }
        ExpressionKind::Noise(seed) => out.push_str(&format!("noise(seed {})", seed.value)),
        ExpressionKind::PointSource(inner) => write_call(out, "δ", std::slice::from_ref(inner)),
        ExpressionKind::Derivative(derivative) => write_derivative(out, derivative),
        ExpressionKind::Laplacian(inner) => write_after(out, "Δ ", inner),
        ExpressionKind::Gradient(inner) => write_after(out, "∇", inner),
        ExpressionKind::Divergence(inner) => write_after(out, "∇·", inner),
        ExpressionKind::Dot(left, right) => {
            // A gradient alone, or a bracket.
            let side = |inner: &Expression| match inner.kind {
                ExpressionKind::Gradient(_) => Place::Operand,
                _ => Place::Base,
            };
            write(out, left, side(left));
            out.push('·');
            write(out, right, side(right));
        }
    }
}

fn write_after(out: &mut String, sign: &str, inner: &Expression) {
    out.push_str(sign);
    write(out, inner, Place::Operand);
}

fn write_sum(out: &mut String, terms: &[Term]) {
    for (at, term) in terms.iter().enumerate() {
        out.push_str(match (at, term.sign) {
            (0, Sign::Plus) => "",
            (0, Sign::Minus) => "-",
            (_, Sign::Plus) => " + ",
            (_, Sign::Minus) => " - ",
        });
        write(out, &term.value, Place::Term);
    }
}

fn write_product(out: &mut String, factors: &[Factor]) {
    for (at, factor) in factors.iter().enumerate() {
        let over = factor.operation == Operation::Over;
        if at > 0 {
            out.push_str(if over { " / " } else { " * " });
        }
        // `1 / 400 m` would be refused, and `a / ∇T·∇T` be read from the left.
        let after_number = at > 0 && matches!(factors[at - 1].value.kind, ExpressionKind::Number(_));
        let place = match factor.value.kind {
            ExpressionKind::Quantity { .. } if over && after_number => Place::Base,
            ExpressionKind::Dot(..) if over => Place::Base,
            _ => Place::Factor,
        };
        write(out, &factor.value, place);
    }
}

/// An exponent: a number or a name, perhaps with a minus, or a bracket.
fn write_exponent(out: &mut String, exponent: &Expression) {
    let (sign, magnitude) = match &exponent.kind {
        ExpressionKind::Negate(inner) if is_plain(inner) => ("-", &**inner),
        _ => ("", exponent),
    };
    if is_plain(magnitude) {
        out.push_str(sign);
        write_bare(out, magnitude);
    } else {
        out.push('(');
        write_bare(out, exponent);
        out.push(')');
    }
}

fn is_plain(expression: &Expression) -> bool {
    match &expression.kind {
        ExpressionKind::Number(value) => !value.is_negative() && decimal(value).is_some(),
        ExpressionKind::Name(_) | ExpressionKind::Pi => true,
        _ => false,
    }
}

fn write_call<'a>(
    out: &mut String,
    name: &str,
    arguments: impl IntoIterator<Item = &'a (impl Borrowed + 'a)>,
) {
    out.push_str(name);
    out.push('(');
    for (at, argument) in arguments.into_iter().enumerate() {
        if at > 0 {
            out.push_str(", ");
        }
        write(out, argument.expression(), Place::Whole);
    }
    out.push(')');
}

/// An expression, boxed or not.
trait Borrowed {
    fn expression(&self) -> &Expression;
}

impl Borrowed for Expression {
    fn expression(&self) -> &Expression {
        self
    }
}

impl Borrowed for Box<Expression> {
    fn expression(&self) -> &Expression {
        self
    }
}

fn write_comparison(out: &mut String, comparison: &Comparison) {
    write(out, &comparison.left, Place::Whole);
    out.push_str(match comparison.relation {
        Relation::Less => " < ",
        Relation::LessOrEqual => " ≤ ",
        Relation::Greater => " > ",
        Relation::GreaterOrEqual => " ≥ ",
    });
    write(out, &comparison.right, Place::Whole);
}

fn write_derivative(out: &mut String, derivative: &Derivative) {
    out.push('∂');
    out.push_str(&raised(derivative.order as usize));
    let name = match &derivative.of.kind {
        ExpressionKind::Name(name) => Some(name),
        _ => None,
    };
    if let Some(name) = name {
        out.push_str(name);
    }
    out.push('/');
    for variable in &derivative.by {
        out.push_str(&format!("∂{}{}", variable.name.text, raised(variable.power as usize)));
    }
    if name.is_none() {
        out.push('(');
        write_bare(out, &derivative.of);
        out.push(')');
    }
}

/// A rational as a decimal, if it is one.
fn decimal(value: &Rational) -> Option<String> {
    // A denominator 2^a 5^b needs max(a, b) decimals.
    let ten = Rational::from(10);
    let mut places = 0i64;
    let mut scaled = value.clone();
    while !scaled.is_integer() {
        if places > crate::exact::rational::LARGEST_EXPONENT + crate::exact::rational::LONGEST_LITERAL as i64
            || (places == 0 && !is_decimal(value))
        {
            return None;
        }
        scaled = &scaled * &ten;
        places += 1;
    }
    let digits = scaled.abs().to_string();
    let sign = if value.is_negative() { "-" } else { "" };
    Some(format!("{sign}{}", placed(digits, places)))
}

/// Whether a denominator has no prime factor but 2 and 5.
fn is_decimal(value: &Rational) -> bool {
    let mut rest = value.denominator().clone();
    for prime in [2u32, 5] {
        while (&rest % prime) == num_bigint::BigInt::from(0) {
            rest /= prime;
        }
    }
    rest == num_bigint::BigInt::from(1)
}

/// Digits with the point before the last `places` of them.
fn placed(digits: String, places: i64) -> String {
    let stripped = digits.trim_end_matches('0');
    let zeros = (digits.len() - stripped.len()) as i64;
    if digits.len().max(places as usize) > MOST_DIGITS && !stripped.is_empty() {
        return format!("{stripped}e{}", zeros - places);
    }
    if places == 0 {
        return digits;
    }
    let places = places as usize;
    let padded = format!("{}{digits}", "0".repeat((places + 1).saturating_sub(digits.len())));
    let (whole, fraction) = padded.split_at(padded.len() - places);
    format!("{whole}.{fraction}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_literals_where_they_can_be() {
        for (text, printed) in [
            ("0.1", "0.1"),
            ("2e-5", "0.00002"),
            ("1e30", "1e30"),
            ("12e-40", "12e-40"),
            ("1/3", "1/3"),
            ("2.1e6", "2100000"),
            ("0", "0"),
            ("1.25", "1.25"),
            ("-1/8", "-0.125"),
        ] {
            assert_eq!(print_number(&text.parse().expect("a number")), printed);
        }
    }
}
