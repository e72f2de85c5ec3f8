//! The front end as a whole: files that must be read, slips that must be named, text that must not harm.

use rimstone::diagnostic::Diagnostics;
use rimstone::diagnostic::terminal::{Colour, render};
use rimstone::source::SourceFile;
use rimstone::syntax::tree::{
    AccuracyKind, AxisPropertyKind, ClosureFamily, CoefficientValue, End, Expression, ExpressionKind, Extent,
    ModelFile, OutputKind, PlaceKind, Section, TimeKind,
};
use rimstone::syntax::{self, print_expression};

mod hostile;
mod laws;
mod slips;

/// The example of the language's contract.
const VAULT_WALL: &str = r#"model vault_wall "Daily temperature wave through a vault's brick wall"

axes
  x: 0 m to 0.36 m, 145 nodes

constants
  k      = 0.72 W/(m·K)      "conductivity of the brick"
  ρ      = 1920 kg/m³
  c      = 835 J/(kg·K)
  h      = 8 W/(m²·K)        "film coefficient, room side"
  T_room = 291 K

fields
  T in K on x

equations
  ρ * c * ∂T/∂t = ∂/∂x(k * ∂T/∂x)

conditions
  at x = low:   T = 281 K + 7 K * (1 - cos(2*π*t / 86400 s))
  at x = high:  -k * ∂T/∂n = h * (T - T_room)
  at t = start: T = 281 K + 8 K * x / 0.36 m

accuracy
  order 4

time
  0 s to 3 d
  method rk4
  step 0.9 of limit

output
  T every 30 min
  gauge middle: T at x = 0.18 m
  integral heat: ρ * c * T over x every 30 min
"#;

fn parse(text: &str) -> (ModelFile, Diagnostics) {
    syntax::parse(&SourceFile::new("station.rim", text))
}

fn shown(text: &str) -> String {
    let source = SourceFile::new("station.rim", text);
    render(&syntax::parse(&source).1, &source, Colour::Plain)
}

/// The codes of a text's faults, in order.
fn codes(text: &str) -> Vec<&'static str> {
    parse(text).1.iter().map(|fault| fault.code.as_str()).collect()
}

/// A model with `formula` as the value of a coefficient; declares x, y, u, v, k, h, c and f(·).
fn with_formula(formula: &str) -> String {
    format!(
        "model flume \"A flume\"\naxes\n  x: 0 m to 1 m, 11 nodes\n  y: 0 m to 1 m, 11 nodes\nconstants\n  k = 1\n  h = 8\n  c = 2\n\
         fields\n  u on x, y\n  v on x, y\noperators\n  f(g) = ∂g/∂x\ncoefficients\n  q = {formula}\n"
    )
}

fn formula(text: &str) -> Expression {
    let model = with_formula(text);
    let (file, faults) = parse(&model);
    assert!(faults.is_empty(), "{text}:\n{}", shown(&model));
    match &file.coefficients[0].value {
        CoefficientValue::Formula(value) => value.clone(),
        other => panic!("no formula: {other:?}"),
    }
}

/// A tree as text, without the spans.
fn spanless(tree: &impl std::fmt::Debug) -> String {
    let text = format!("{tree:?}");
    let mut out = String::new();
    let mut rest = text.as_str();
    while let Some(at) = rest.find("Span {") {
        out.push_str(&rest[..at]);
        let end = rest[at..].find('}').expect("a span ends in a brace");
        rest = &rest[at + end + 1..];
    }
    out + rest
}

#[test]
fn the_example_is_read_completely() {
    let (file, faults) = parse(VAULT_WALL);
    assert!(faults.is_empty(), "{}", shown(VAULT_WALL));
    assert!(file.faulty.is_empty());
    let counts = [
        file.sections.len(),
        file.axes.len(),
        file.constants.len(),
        file.fields.len(),
        file.equations.len(),
        file.conditions.len(),
        file.accuracy.len(),
        file.time.len(),
        file.outputs.len(),
    ];
    assert_eq!(counts, [8, 1, 5, 1, 1, 3, 1, 3, 3]);
}

/// Every kind of statement, as the contract lists them.
const EVERYTHING: &str = r#"# all forms
model flume "Every form"

axes
  x: 0 m to 4 m, 121 nodes, periodic
  r: 0 m to 0.5 m, 20 cells, radial
  z: 0 to 1, 33 nodes, graded by (1 - cos(π*s)) / 2
constants
  a = 1/2
  b = 2 m/s, free "a speed"
  e = 0.1, free between 0 and 1
  g = 0.1, free, between 0 and 1   "another"
coefficients
  k(x, t) in W/(m·K) = cases(x < 0.2 m: 1 W/(m·K), x >= 3 m: 2 W/(m·K), otherwise: 3 W/(m·K))
  c in m/s on x, r from "c.npy" covering x: 0 m to 4 m, r: 0 m to 1 m, interpolated linear
  w(t) from "w.csv"
  source = δ(x - 1 m) * noise(seed 7)
fields
  T in K on x, r, between 200 K and 400 K
  p on x, staggered in x
  v in m/s on x, r, z
operators
  spread(f) = ∂/∂x(k * ∂f/∂x) with order 6, one-sided closures
  plain(f, q) = f * q
equations
  ∂T/∂t = spread(T)
    + source
  ∂²p/∂t² = Δ p + ∇²p + ∇·(k * ∇p) - ∇T·∇T
  ∂v/∂t = ∂(v^2/2)/∂x
    + ∂²v/∂x∂r +
      ∂⁴v/∂x⁴
conditions
  at every edge: ∂T/∂n = 0
  at x = low; at x = high: T = 281 K; p = 0
  at x = low and r < 0.3 m and r > 0.1 m: v = 0
  at r = 0.5 m: v = 1 m/s; at t = start: v = 0; ∂p/∂t = 0
accuracy
  order 4
  interior order 6 in x, r
  order 6 in x, closures mirrored
  energy-stable closures
  one-sided
  dissipation order 6, strength 0.1
time
  0 s to 3 d
  method crank-nicolson
  step 0.5 s
output
  T
  p every 30 min "pressure"
  speed = abs(v) every 1 s
  gauge m: T at x = 0.18 m, r = 0.1 m every 1 s
  gauges line: T at x = 0 m to 1 m by 0.1 m, r = 0.2 m
  integral heat: c * T over x, r every 30 min
  maximum top: abs(v) over time
verification
  exact T = 281 K
  manufactured p = sin(x / 1 m)
  grids 17, 33, 65
"#;

#[test]
fn every_form_of_statement_is_read() {
    let (file, faults) = parse(EVERYTHING);
    assert!(faults.is_empty(), "{}", shown(EVERYTHING));
    assert_eq!(file.sections.len(), Section::ALL.len());
    assert!(matches!(file.axes[0].properties[0].kind, AxisPropertyKind::Periodic));
    assert!(matches!(file.axes[2].properties[0].kind, AxisPropertyKind::Graded(_)));
    assert!(file.constants[1].free.is_some() && file.constants[0].free.is_none());
    assert!(file.constants[2].bounds.is_some() && file.constants[3].bounds.is_some());
    assert_eq!(file.constants[3].description.as_ref().map(|text| text.text.as_str()), Some("another"));
    let CoefficientValue::Data { file: data, covering, interpolated } = &file.coefficients[1].value else {
        panic!("not from data")
    };
    assert_eq!((data.text.as_str(), covering.len(), interpolated.is_some()), ("c.npy", 2, true));
    assert_eq!(file.coefficients[0].arguments.len(), 2);
    assert_eq!(file.fields[0].axes.len(), 2);
    assert!(file.fields[0].bounds.is_some());
    assert_eq!(file.fields[1].staggered.len(), 1);
    assert_eq!(file.operators[0].accuracy.len(), 2);
    assert!(matches!(file.operators[0].accuracy[1].kind, AccuracyKind::Closures(ClosureFamily::OneSided)));
    assert_eq!(file.equations.len(), 3);
    // Two places times two equalities, and the others.
    assert_eq!(file.conditions.len(), 1 + 4 + 1 + 1 + 2);
    assert!(matches!(file.conditions[0].place.kind, PlaceKind::EveryEdge));
    let PlaceKind::Face { end: End::Low(_), patch, .. } = &file.conditions[5].place.kind else {
        panic!("no patch")
    };
    assert_eq!(patch.len(), 2);
    assert!(matches!(&file.conditions[6].place.kind, PlaceKind::Face { end: End::At(_), .. }));
    assert!(matches!(file.conditions[8].place.kind, PlaceKind::Start));
    assert_eq!(file.accuracy.len(), 7);
    assert!(matches!(&file.accuracy[1].kind, AccuracyKind::Order { axes, .. } if axes.len() == 2));
    assert!(matches!(&file.time[1].kind, TimeKind::Method(name) if name.text == "crank-nicolson"));
    assert!(
        matches!(&file.outputs[4].kind, OutputKind::Gauges { place, .. } if place[0].to.is_some() && place[1].to.is_none())
    );
    assert_eq!(file.verification.len(), 3);
}

#[test]
fn listed_nodes_are_read() {
    let (file, faults) = parse("model a\naxes\n  x: nodes at 0, 0.1, 0.25, 1, periodic\n");
    assert!(faults.is_empty());
    assert!(matches!(&file.axes[0].extent, Extent::Listed(nodes) if nodes.len() == 4));
    assert_eq!(file.axes[0].properties.len(), 1);
}

#[test]
fn both_spellings_give_the_same_tree() {
    for (symbols, words) in [
        ("∂u/∂x", "\\partial u/\\partial x"),
        ("∂²u/∂x∂y", "\\partial^2 u / \\partial x \\partial y"),
        ("∂⁴u/∂x⁴", "\\partial^4u/\\partial x^4"),
        ("∇·(k * ∇u)", "\\nabla\\cdot(k * \\nabla u)"),
        ("Δ u + ∇²u", "\\Delta u + \\nabla^2u"),
        ("2·π·x²", "2\\cdot\\pi\\cdot x^2"),
        ("3 W/(m²·K)", "3 W/(m^2\\cdot K)"),
        ("cases(x ≤ 1: ρ₀, otherwise: ρ_0)", "cases(x \\le 1: \\rho_0, otherwise: \\rho_{0})"),
        ("x - 1", "x − 1"),
        ("x * 2", "x × 2"),
        ("∂u/∂x", "∂/∂x(u)"),
        ("∂(u*v)/∂x", "∂/∂x(u*v)"),
        ("x^-1", "x⁻¹"),
        ("sin(x)", "\\sin(x)"),
        ("5 μm", "5 \\mu m"),
    ] {
        let unspelled = |text: &str| spanless(&formula(text)).replace("m^2", "m²");
        assert_eq!(unspelled(symbols), unspelled(words), "{symbols} and {words}");
    }
}

#[test]
fn structure_and_precedence_are_those_of_the_contract() {
    for (written, canonical) in [
        ("∂u/∂x/2", "∂u/∂x / 2"),
        ("-x^2", "-x^2"),
        ("(-x)^2", "(-x)^2"),
        ("Δ u^2", "(Δ u)^2"),
        ("-k*u", "-k * u"),
        ("a - (b - c)", "a - (b - c)"),
        ("a/b/c", "a / b / c"),
        ("a/(b*c)", "a / (b * c)"),
        ("(a + b)*c", "(a + b) * c"),
        ("k*∇u·∇v", "k * ∇u·∇v"),
        ("2*-3", "2 * (-3)"),
        ("∂³u/∂x²∂y", "∂³u/∂x²∂y"),
        ("(∂u/∂x)^2", "(∂u/∂x)^2"),
        ("∂/∂x(k * ∂u/∂x)", "∂/∂x(k * ∂u/∂x)"),
        ("u^(1/2)", "u^(1 / 2)"),
        ("∂²u/∂x∂y/∂u/∂x", "∂²u/∂x∂y / ∂u/∂x"),
        (".5*x", "0.5 * x"),
    ] {
        assert_eq!(print_expression(&formula(written)), canonical, "{written}");
    }
    let ExpressionKind::Product(factors) = formula("∂u/∂x/2").kind else { panic!("no division by two") };
    assert!(matches!(factors[0].value.kind, ExpressionKind::Derivative(_)));
    assert!(matches!(formula("Δ u^2").kind, ExpressionKind::Power { .. }));
    assert!(matches!(formula("-x^2").kind, ExpressionKind::Negate(_)));
    assert!(matches!(formula("∇u·∇v").kind, ExpressionKind::Dot(..)));
    assert!(matches!(formula("k·u").kind, ExpressionKind::Product(_)));
}

#[test]
fn units_keep_their_factors() {
    let ExpressionKind::Quantity { unit, .. } = formula("3 ms").kind else { panic!("no quantity") };
    assert_eq!(unit.factors.len(), 1);
    let ExpressionKind::Quantity { unit, .. } = formula("3 W/(m²·K)").kind else { panic!("no quantity") };
    let exponents: Vec<String> =
        unit.factors.iter().map(|factor| format!("{}^{}", factor.symbol, factor.exponent)).collect();
    assert_eq!(exponents, ["W^1", "m^-2", "K^-1"]);
    let ExpressionKind::Quantity { unit, .. } = formula("0.8 1/d").kind else { panic!("no quantity") };
    assert_eq!(unit.factors[0].exponent, rimstone::exact::Rational::from(-1));
    assert!(matches!(formula("30 °").kind, ExpressionKind::Quantity { .. }));
    assert!(matches!(formula("8 K * B").kind, ExpressionKind::Product(_)));
    assert!(matches!(formula("8 K*x").kind, ExpressionKind::Product(_)));
}

#[test]
fn line_ends_and_marks_do_not_matter() {
    let (plain, _) = parse(VAULT_WALL);
    let windows = format!("\u{feff}{}", VAULT_WALL.replace('\n', "\r\n").replace("  ", "\t\u{a0}"));
    let (other, faults) = parse(&windows);
    assert!(faults.is_empty());
    assert_eq!(spanless(&plain), spanless(&other));
    let source = SourceFile::new("w.rim", windows);
    assert_eq!(source.slice(other.constants[0].name.span), "k");
    assert_eq!(source.slice(other.equations[0].left.span), "ρ * c * ∂T/∂t");
    assert_eq!(source.position(other.axes[0].span.start).line, 4);
}
