//! Expressions as people read them, for messages: names of the model, `·`, superscript powers where they are whole.
//!
//! Not the notation of emitted code, and not meant to be parsed again.

use super::expression::{Comparison, DerivativeKind, Expression, Function, Relation};
use super::{AxisId, FieldId, Model};
use crate::exact::{Rational, decimal};

/// The text of an expression.
pub fn formula(expression: &Expression, model: &Model) -> String {
    print(expression, model, Level::Sum)
}

/// The text of a comparison.
pub fn comparison(comparison: &Comparison, model: &Model) -> String {
    format!(
        "{} {} {}",
        formula(&comparison.left, model),
        symbol(comparison.relation),
        formula(&comparison.right, model)
    )
}

fn symbol(relation: Relation) -> &'static str {
    match relation {
        Relation::Less => "<",
        Relation::LessOrEqual => "<=",
        Relation::Greater => ">",
        Relation::GreaterOrEqual => ">=",
    }
}

/// How tightly the surroundings bind.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Level {
    Sum,
    Product,
    Atom,
}

fn print(expression: &Expression, model: &Model, around: Level) -> String {
    let (text, own) = match expression {
        Expression::Number(value) => number(value),
        Expression::Sum(items) => (sum(items, model), Level::Sum),
        Expression::Product(items) => (product(items, model), Level::Product),
        Expression::Quotient(above, below) => {
            let text =
                format!("{}/{}", print(above, model, Level::Product), print(below, model, Level::Atom));
            (text, Level::Product)
        }
        Expression::Power(base, exponent) => power(base, exponent, model),
        other => (atom(other, model), Level::Atom),
    };
    let negative = text.starts_with('−') && around > Level::Sum;
    if own < around || negative { format!("({text})") } else { text }
}

fn atom(expression: &Expression, model: &Model) -> String {
    let field = |id: &FieldId| model.fields.get(id.0).map_or("?", |field| field.name.as_str()).to_owned();
    match expression {
        Expression::Pi => "π".to_owned(),
        Expression::Constant(id) => {
            model.free_constants.get(id.0).map_or_else(|| "?".to_owned(), |constant| constant.name.clone())
        }
        Expression::Coefficient(id) => {
            model.coefficients.get(id.0).map_or_else(|| "?".to_owned(), |found| found.name.clone())
        }
        Expression::Coordinate(id) => axis(*id, model),
        Expression::Time => "t".to_owned(),
        Expression::Field(id) => field(id),
        Expression::Rate(id) => format!("∂{}/∂t", field(id)),
        Expression::Call(function, arguments) => {
            let inside: Vec<String> = arguments.iter().map(|item| formula(item, model)).collect();
            format!("{}({})", name(*function), inside.join(", "))
        }
        Expression::Cases(cases, otherwise) => {
            let mut parts: Vec<String> = cases
                .iter()
                .map(|(condition, value)| {
                    format!("{}: {}", comparison(condition, model), formula(value, model))
                })
                .collect();
            parts.push(format!("otherwise: {}", formula(otherwise, model)));
            format!("cases({})", parts.join(", "))
        }
        Expression::Noise(seed) => format!("noise(seed {seed})"),
        Expression::Normal(of) => match &**of {
            Expression::Field(id) => format!("∂{}/∂n", field(id)),
            other => format!("∂({})/∂n", formula(other, model)),
        },
        Expression::Derivative(derivative) => match &derivative.kind {
            DerivativeKind::First { axis: along, of } => {
                format!("∂/∂{}({})", axis(*along, model), formula(of, model))
            }
            DerivativeKind::Second { axis: along, coefficient, of } => {
                let along = axis(*along, model);
                format!("∂/∂{along}({} ∂/∂{along}({}))", formula(coefficient, model), formula(of, model))
            }
            DerivativeKind::Mixed { outer, inner, coefficient, of } => format!(
                "∂/∂{}({} ∂/∂{}({}))",
                axis(*outer, model),
                formula(coefficient, model),
                axis(*inner, model),
                formula(of, model)
            ),
            DerivativeKind::Higher { axis: along, degree, of } => {
                let above = superscript(&degree.to_string());
                format!("∂{above}/∂{}{above}({})", axis(*along, model), formula(of, model))
            }
        },
        Expression::Applied(index) => format!("operator {index}"),
        Expression::InverseSpacing(id) => format!("1/Δ{}", axis(*id, model)),
        compound => format!("({})", formula(compound, model)),
    }
}

fn axis(id: AxisId, model: &Model) -> String {
    model.axes.get(id.0).map_or_else(|| "?".to_owned(), |axis| axis.name.clone())
}

fn sum(items: &[Expression], model: &Model) -> String {
    let mut text = String::new();
    for item in items {
        let part = print(item, model, Level::Sum);
        if text.is_empty() {
            text = part;
        } else if let Some(rest) = part.strip_prefix('−') {
            text.push_str(" − ");
            text.push_str(rest);
        } else {
            text.push_str(" + ");
            text.push_str(&part);
        }
    }
    text
}

fn product(items: &[Expression], model: &Model) -> String {
    let minus_one = Expression::Number(Rational::from(-1));
    match items.split_first() {
        Some((first, rest)) if *first == minus_one && !rest.is_empty() => {
            format!("−{}", product(rest, model))
        }
        Some((Expression::Number(value), rest)) if value.is_negative() && !rest.is_empty() => {
            let positive = Expression::Number(value.abs());
            format!("−{}·{}", print(&positive, model, Level::Product), product(rest, model))
        }
        _ => items.iter().map(|item| print(item, model, Level::Product)).collect::<Vec<_>>().join("·"),
    }
}

fn power(base: &Expression, exponent: &Rational, model: &Model) -> (String, Level) {
    if *exponent == Rational::ratio(1, 2) {
        return (format!("√({})", formula(base, model)), Level::Atom);
    }
    let base = print(base, model, Level::Atom);
    let text = exponent.to_string();
    if text.contains('/') {
        (format!("{base}^({text})"), Level::Atom)
    } else {
        (format!("{base}{}", superscript(&text)), Level::Atom)
    }
}

/// Whole numbers as they are, others as decimals of at most six digits.
fn number(value: &Rational) -> (String, Level) {
    let magnitude = value.abs();
    let exact = magnitude.to_string();
    let text = if exact.len() <= 7 && !exact.contains('/') {
        exact
    } else {
        let text = decimal::significant(&magnitude, 6);
        let plain = text.contains('.') && !text.contains('e');
        if plain { text.trim_end_matches('0').trim_end_matches('.').to_owned() } else { text }
    };
    if value.is_negative() { (format!("−{text}"), Level::Atom) } else { (text, Level::Atom) }
}

fn superscript(text: &str) -> String {
    const DIGITS: [char; 10] = ['⁰', '¹', '²', '³', '⁴', '⁵', '⁶', '⁷', '⁸', '⁹'];
    text.chars()
        .map(|letter| match letter.to_digit(10) {
            Some(digit) => DIGITS[digit as usize],
            None => '⁻',
        })
        .collect()
}

/// The name in model files.
fn name(function: Function) -> &'static str {
    match function {
        Function::Sin => "sin",
        Function::Cos => "cos",
        Function::Tan => "tan",
        Function::Exp => "exp",
        Function::Log => "log",
        Function::Sqrt => "sqrt",
        Function::Abs => "abs",
        Function::Minimum => "min",
        Function::Maximum => "max",
        Function::Tanh => "tanh",
        Function::Sinh => "sinh",
        Function::Cosh => "cosh",
        Function::Erf => "erf",
        Function::Erfc => "erfc",
        Function::Sign => "sign",
    }
}
