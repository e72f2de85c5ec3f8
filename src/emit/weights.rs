//! One stencil as text: for people, as JSON, LaTeX, C and Rust.
//!
//! Lays numbers out; derives none. Doubles come through [`crate::exact::round`], decimals for people
//! through [`crate::exact::decimal`].

use std::fmt::Write;

use crate::exact::{Rational, decimal, round};

/// The numbers of one stencil.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct WeightsTable {
    /// Which derivative.
    pub derivative: usize,
    /// The point.
    pub at: Rational,
    /// The nodes, ascending.
    pub nodes: Vec<Rational>,
    /// The weights for unit spacing, one a node.
    pub weights: Vec<Rational>,
    /// The order of accuracy.
    pub order: usize,
    /// The leading error; nothing if there is none.
    pub error: Option<ErrorTerm>,
}

/// Approximation minus exact value: coefficient · f^(derivative) · h^power.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct ErrorTerm {
    /// The exact factor.
    pub coefficient: Rational,
    /// Which derivative it multiplies.
    pub derivative: usize,
    /// The power of the spacing.
    pub power: usize,
}

/// A number of the table that no double can hold.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct BeyondDoubles {
    /// The number.
    pub value: Rational,
}

/// Significant digits of decimals for people: enough to tell any two doubles apart.
const DIGITS: usize = 17;

/// For people: a table of fractions and decimals, the order and the leading error.
pub fn text(table: &WeightsTable) -> String {
    let rows: Vec<[String; 3]> = std::iter::once(["node".into(), "weight".into(), "decimal".into()])
        .chain(table.nodes.iter().zip(&table.weights).map(|(node, weight)| {
            [node.to_string(), weight.to_string(), decimal::significant(weight, DIGITS)]
        }))
        .collect();
    let width = |column: usize| rows.iter().map(|row| row[column].chars().count()).max().unwrap_or(0);
    let widths = [width(0), width(1)];
    let mut text = format!("{} at {}, {}\n\n", name(table.derivative), table.at, accuracy(table));
    for [node, weight, decimal] in &rows {
        // The sign of a decimal hangs to the left, so that the figures line up.
        let sign = if decimal.starts_with('-') { "" } else { " " };
        let _ = writeln!(text, "  {node:>0$}  {weight:>1$}  {sign}{decimal}", widths[0], widths[1]);
    }
    let _ = write!(text, "\n{} ≈ Σ weight f(node h){}\n", value(table), spacing_divisor(table.derivative));
    let _ = writeln!(text, "{}", error_line(table));
    text
}

fn accuracy(table: &WeightsTable) -> String {
    match &table.error {
        Some(_) => format!("order {}", table.order),
        None => "exact".into(),
    }
}

fn error_line(table: &WeightsTable) -> String {
    match &table.error {
        Some(error) => format!(
            "leading error: {} h^{} f^({})",
            bracketed(&error.coefficient),
            error.power,
            error.derivative
        ),
        None => "no error: the point is one of the nodes".into(),
    }
}

fn bracketed(value: &Rational) -> String {
    if value.is_integer() { value.to_string() } else { format!("({value})") }
}

fn name(derivative: usize) -> String {
    match derivative {
        0 => "interpolation".into(),
        1 => "first derivative".into(),
        2 => "second derivative".into(),
        3 => "third derivative".into(),
        4 => "fourth derivative".into(),
        other => format!("derivative {other}"),
    }
}

fn value(table: &WeightsTable) -> String {
    let point = if table.at.is_zero() { "0".into() } else { format!("{} h", bracketed(&table.at)) };
    match table.derivative {
        0 => format!("f({point})"),
        derivative => format!("f^({derivative})({point})"),
    }
}

fn spacing_divisor(derivative: usize) -> String {
    match derivative {
        0 => String::new(),
        1 => " / h".into(),
        other => format!(" / h^{other}"),
    }
}

/// One line of JSON; fractions are strings.
pub fn json(table: &WeightsTable) -> String {
    let list = |values: &[Rational]| {
        let quoted: Vec<String> = values.iter().map(|value| format!("\"{value}\"")).collect();
        format!("[{}]", quoted.join(", "))
    };
    let error = match &table.error {
        None => "null".into(),
        Some(error) => format!(
            "{{\"coefficient\": \"{}\", \"derivative\": {}, \"power\": {}}}",
            error.coefficient, error.derivative, error.power
        ),
    };
    format!(
        "{{\"derivative\": {}, \"at\": \"{}\", \"nodes\": {}, \"weights\": {}, \"order\": {}, \"error\": {error}}}\n",
        table.derivative,
        table.at,
        list(&table.nodes),
        list(&table.weights),
        table.order
    )
}

/// A displayed LaTeX formula with its leading error.
pub fn latex(table: &WeightsTable) -> String {
    let mut sum = String::new();
    for (node, weight) in table.nodes.iter().zip(&table.weights).filter(|(_, weight)| !weight.is_zero()) {
        let sign = match (sum.is_empty(), weight.is_negative()) {
            (true, false) => "",
            (false, false) => " + ",
            (true, true) => "-",
            (false, true) => " - ",
        };
        let size = weight.abs();
        let factor = if size.is_one() { String::new() } else { format!("{}\\,", latex_number(&size)) };
        let _ = write!(sum, "{sign}{factor}f({})", latex_multiple(node, "h"));
    }
    let point = latex_multiple(&table.at, "h");
    let function = match table.derivative {
        0 => format!("f({point})"),
        derivative => format!("f^{{({derivative})}}({point})"),
    };
    let scale = match table.derivative {
        0 => String::new(),
        1 => "\\frac{1}{h}".into(),
        derivative => format!("\\frac{{1}}{{h^{{{derivative}}}}}"),
    };
    let error = match &table.error {
        None => String::new(),
        Some(error) => format!(
            ",\n\\qquad \\text{{leading error }} {} f^{{({})}}({point})",
            latex_multiple(&error.coefficient, &format!("h^{{{}}}", error.power)),
            error.derivative,
        ),
    };
    format!("\\[\n{function} \\approx {scale}\\left( {sum} \\right){error}\n\\]\n")
}

fn latex_number(value: &Rational) -> String {
    let sign = if value.is_negative() { "-" } else { "" };
    if value.is_integer() {
        return value.to_string();
    }
    format!("{sign}\\frac{{{}}}{{{}}}", value.abs().numerator(), value.denominator())
}

/// `factor · unit`, without a factor one, and nought as it is.
fn latex_multiple(factor: &Rational, unit: &str) -> String {
    if factor.is_zero() {
        "0".into()
    } else if factor.is_one() {
        unit.into()
    } else if (-factor).is_one() {
        format!("-{unit}")
    } else {
        format!("{}\\,{unit}", latex_number(factor))
    }
}

/// C: two constant arrays, each double with its fraction in a comment.
pub fn c(table: &WeightsTable) -> Result<String, BeyondDoubles> {
    let array = |name: &str, values: &[Rational]| {
        listed(values, "/* ", " */")
            .map(|lines| format!("static const double {name}[{}] = {{\n{lines}}};\n", values.len()))
    };
    Ok(format!(
        "/* {} at {}, {}.\n   {}\n   {} = sum of weight[j] * f(node[j] * h){}. */\n{}{}",
        name(table.derivative),
        table.at,
        accuracy(table),
        error_line(table),
        value(table),
        spacing_divisor(table.derivative),
        array("node", &table.nodes)?,
        array("weight", &table.weights)?,
    ))
}

/// Rust: two constant arrays, each double with its fraction in a comment.
pub fn rust(table: &WeightsTable) -> Result<String, BeyondDoubles> {
    let array = |name: &str, values: &[Rational]| {
        listed(values, "// ", "")
            .map(|lines| format!("const {name}: [f64; {}] = [\n{lines}];\n", values.len()))
    };
    Ok(format!(
        "// {} at {}, {}.\n// {}\n// {} = sum of WEIGHTS[j] * f(NODES[j] * h){}.\n{}{}",
        name(table.derivative),
        table.at,
        accuracy(table),
        error_line(table),
        value(table),
        spacing_divisor(table.derivative),
        array("NODES", &table.nodes)?,
        array("WEIGHTS", &table.weights)?,
    ))
}

/// One value a line, each with its fraction between `open` and `close`.
fn listed(values: &[Rational], open: &str, close: &str) -> Result<String, BeyondDoubles> {
    let doubles: Vec<String> = values
        .iter()
        .map(|value| {
            let double = round::nearest(value);
            let held = double.is_finite() && (value.is_zero() || double.abs() >= f64::MIN_POSITIVE);
            // The shortest text that reads back as the same double.
            if held { Ok(format!("{double:?},")) } else { Err(BeyondDoubles { value: value.clone() }) }
        })
        .collect::<Result<_, _>>()?;
    let width = doubles.iter().map(String::len).max().unwrap_or(0);
    let mut lines = String::new();
    for (double, fraction) in doubles.iter().zip(values) {
        let _ = writeln!(lines, "    {double:<width$} {open}{fraction}{close}");
    }
    Ok(lines)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn second_difference() -> WeightsTable {
        let rationals = |values: &[i64]| values.iter().map(|&value| value.into()).collect();
        WeightsTable {
            derivative: 2,
            at: Rational::zero(),
            nodes: rationals(&[-1, 0, 1]),
            weights: rationals(&[1, -2, 1]),
            order: 2,
            error: Some(ErrorTerm { coefficient: Rational::ratio(1, 12), derivative: 4, power: 2 }),
        }
    }

    #[test]
    fn json_has_the_fixed_shape() {
        let expected = r#"{"derivative": 2, "at": "0", "nodes": ["-1", "0", "1"], "weights": ["1", "-2", "1"], "order": 2, "error": {"coefficient": "1/12", "derivative": 4, "power": 2}}"#;
        assert_eq!(json(&second_difference()), format!("{expected}\n"));
    }

    #[test]
    fn formulas_and_snippets() {
        let table = second_difference();
        assert_eq!(
            latex(&table),
            "\\[\nf^{(2)}(0) \\approx \\frac{1}{h^{2}}\\left( f(-h) - 2\\,f(0) + f(h) \\right),\n\\qquad \\text{leading error } \\frac{1}{12}\\,h^{2} f^{(4)}(0)\n\\]\n"
        );
        assert!(c(&table).expect("within doubles").contains("    -2.0, /* -2 */\n"));
        assert!(
            rust(&table).expect("within doubles").contains("const WEIGHTS: [f64; 3] = [\n    1.0,  // 1\n")
        );
    }

    #[test]
    fn what_no_double_holds_is_refused() {
        let mut table = second_difference();
        table.weights[0] = Rational::from(10).power(400);
        assert!(c(&table).is_err());
        table.weights[0] = Rational::from(10).power(400).recip().expect("not zero");
        assert!(rust(&table).is_err());
    }
}
