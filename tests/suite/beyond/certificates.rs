//! Certificates are read as text and done again by a small calculator that knows nothing of the operators.

use rimstone::discretize::closure;
use rimstone::exact::Rational;
use rimstone::scheme::{Certificate, Line};

use super::read;

/// Does the sums of a written line: "subject: a·b^c + … = value", "subject = value > 0" or "… ≥ 0".
fn true_as_written(line: &str) -> bool {
    if let Some((statement, _)) = line.split_once(" > 0") {
        return number(statement.rsplit_once(" = ").expect("an equation").1).is_positive();
    }
    if let Some((statement, _)) = line.split_once(" ≥ 0") {
        return !number(statement.rsplit_once(" = ").expect("an equation").1).is_negative();
    }
    let (_, equation) = line.split_once(": ").expect("a subject");
    let (sum, value) = equation.rsplit_once(" = ").expect("an equation");
    let total: Rational = sum.split(" + ").map(product).sum();
    total == number(value)
}

fn product(text: &str) -> Rational {
    text.split('·').fold(Rational::one(), |product, factor| {
        product
            * match factor.rsplit_once('^') {
                Some((base, exponent)) => number(base).power(exponent.parse().expect("an exponent")),
                None => number(factor),
            }
    })
}

fn number(text: &str) -> Rational {
    read(text.trim_start_matches('(').trim_end_matches(')'))
}

fn checked<'a>(fact: impl Into<Certificate<'a>>) -> Vec<String> {
    let certificate: Certificate<'a> = fact.into();
    let lines: Vec<Line> = certificate.lines().collect();
    let written: Vec<String> = lines.iter().map(Line::to_string).collect();
    for (line, text) in lines.iter().zip(&written) {
        assert!(line.holds(), "{}: {text}", certificate.title());
        assert!(true_as_written(text), "{}: {text}", certificate.title());
        assert!(line.latex().matches('{').count() == line.latex().matches('}').count());
    }
    written
}

#[test]
fn the_calculator_can_say_no() {
    assert!(true_as_written("row 0, degree 2: (-1/2)·3^2 + 2·(1/2)^2 = -4"));
    assert!(!true_as_written("row 0, degree 2: (-1/2)·3^2 + 2·(1/2)^2 = -3"));
    assert!(!true_as_written("h[0] = -1/2 > 0"));
    assert!(!true_as_written("factor of b[0] = -1/2 ≥ 0"));
}

#[test]
fn first_derivatives() {
    for order in [2, 4, 6, 8] {
        let written = checked(closure::first_derivative(order).expect("offered"));
        let rows = closure::first_derivative(order).expect("offered").operator().closure().len();
        let count = |word: &str| written.iter().filter(|line| line.contains(word)).count();
        assert_eq!(count("> 0"), rows);
        assert_eq!(count(", degree ") - count("interior, degree "), rows * (order / 2 + 1));
        assert!(count("Q + Qᵀ") >= rows);
    }
    let written = checked(closure::first_derivative(2).expect("offered"));
    let expected = [
        "h[0] = 1/2 > 0",
        "sum of h[0] … h[0]: 1/2 = 1/2",
        "row 0, degree 0: (-1) + 1 = 0",
        "row 0, degree 1: (-1)·0 + 1·1 = 1",
        "Q + Qᵀ, row 0, column 0: 1/2·(-1) + 1/2·(-1) = -1",
        "Q + Qᵀ, row 0, column 1: 1/2·1 + 1·(-1/2) = 0",
    ];
    for line in expected {
        assert!(written.iter().any(|found| found == line), "{line} is missing in {written:#?}");
    }
}

#[test]
fn second_derivatives() {
    for order in [2, 4, 6] {
        let form = closure::second_derivative(order).expect("offered");
        let written = checked(form);
        let factors: usize = form.squares().left().iter().map(|square| square.weight.len()).sum();
        let repeated: usize = form.squares().repeated().iter().map(|square| square.weight.len()).sum();
        let found = written.iter().filter(|line| line.contains("factor of b[")).count();
        assert_eq!(found, factors + repeated, "order {order}");
        let pairs = (order / 2 + 2) * (order / 2 + 3) / 2;
        let rows = written.iter().filter(|line| line.starts_with("row ")).count();
        assert_eq!(rows, pairs * form.closure_rows().len(), "order {order}");
    }
    checked(closure::periodic_second_derivative(6).expect("offered"));
}

#[test]
fn dissipations_and_pairs() {
    for order in [2, 4, 6, 8] {
        let damping = checked(closure::dissipation(order).expect("offered"));
        assert!(damping.iter().any(|line| line.starts_with("interior on the sawtooth")));
        let moments = damping.iter().filter(|line| line.contains(" on degree ")).count();
        assert_eq!(moments, order / 2 + 1, "order {order}");
        let pair = closure::staggered_pair(order).expect("offered");
        let staggered = checked(pair);
        let rows =
            staggered.iter().filter(|line| line.starts_with("node ") || line.starts_with("half point "));
        let closed = pair.node_rows().len() + pair.half_rows().len();
        assert_eq!(rows.count(), closed * (order / 2 + 1), "order {order}");
        assert!(staggered.iter().any(|line| line.starts_with("Q + (H_h D₋)ᵀ")));
    }
    for order in closure::biased_orders() {
        let biased = checked(closure::biased_pair(order).expect("offered"));
        assert!(biased.iter().any(|line| line.starts_with("H D₊ + (H D₋)ᵀ, row 0, column 0")));
        checked(closure::periodic_biased_pair(order).expect("offered"));
    }
    checked(closure::periodic_first_derivative(4).expect("offered"));
    checked(closure::periodic_dissipation(4).expect("offered"));
    checked(closure::periodic_staggered_pair(4).expect("offered"));
}
