//! The front end as a whole: files that must be read, slips that must be named, text that must not harm.

use proptest::prelude::*;
use rimstone::diagnostic::Diagnostics;
use rimstone::diagnostic::terminal::{Colour, render};
use rimstone::source::SourceFile;
use rimstone::syntax::tree::{
    AccuracyKind, AxisPropertyKind, ClosureFamily, CoefficientValue, End, Expression, ExpressionKind, Extent,
    ModelFile, OutputKind, PlaceKind, Section, TimeKind,
};
use rimstone::syntax::{self, format, print_expression};

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

#[test]
fn every_slip_in_a_formula_is_named() {
    let mut wrong = Vec::new();
    for (slip, code, remedy) in [
        ("∂u/∂x^2", "E0121", "∂²u/∂x²"),
        ("∂u/∂x²", "E0121", "(∂u/∂x)^2"),
        ("∂²u/∂x", "E0121", "∂²u/∂x²"),
        ("∂²u/∂x∂y²", "E0121", "∂³u"),
        ("∂u²/∂x", "E0122", "∂(u²)/∂x"),
        ("∂u^2/∂x", "E0122", "∂²u/∂x²"),
        ("∂u/∂x(k)", "E0123", "∂u/∂x * (k)"),
        ("∂/∂x u", "E0124", "∂/∂x(u)"),
        ("∂/∂x ∂u/∂x", "E0124", "∂/∂x(∂u/∂x)"),
        ("∂⁵u/∂x⁵", "E0125", "further field"),
        ("∂u/∂x⁰", "E0125", "1 to 4"),
        ("x^2^3", "E0126", "(x^2)^3"),
        ("x²^3", "E0126", "(x²)^3"),
        ("1/400 m", "E0127", "1 m / 400"),
        ("2*π m", "E0120", "π * 1 m"),
        ("2 h", "E0129", "2 * h"),
        ("2 x", "E0129", "2 * x"),
        ("k x", "E0120", "k * x"),
        ("3 W/m·K", "E0128", "W/(m·K)"),
        ("3 W/m·K", "E0128", "W·K/m"),
        ("3 W/(m*K)", "E0137", "3 W/(m·K)"),
        ("3 N*m", "E0137", "3 N·m"),
        ("3 W/m/K", "E0128", "W/(m·K)"),
        ("3 kg m/s²", "E0120", "3 kg·m"),
        ("Δt", "E0132", "dt"),
        ("k * Δx", "E0132", "dx"),
        ("xⁿ", "E0104", "x^n"),
        ("u_xx", "E0131", "∂²u/∂x²"),
        ("u_t", "E0131", "∂u/∂t"),
        ("du/dx", "E0131", "∂u/∂x"),
        ("u'", "E0107", "∂u/∂x"),
        ("u′", "E0107", "∂u/∂x"),
        ("\\partialu/\\partial x", "E0106", "\\partial u"),
        ("\\frac{1}{2}", "E0106", "(a) / (b)"),
        ("max(0,5)", "E0202", "0, 5"),
        ("0,5", "E0202", "0.5"),
        ("5.", "E0201", "5.0"),
        ("1e", "E0201", "1.5e-3"),
        ("1.2.3", "E0201", "one point"),
        ("1_000", "E0204", "1000"),
        ("2x", "E0204", "2 * x"),
        ("3m", "E0204", "3 m"),
        ("1e5000", "E0203", "units"),
        ("20 °C", "E0130", "kelvin"),
        ("sin x", "E0133", "sin(x)"),
        ("sin²(x)", "E0133", "sin(x)^2"),
        ("h(u - 1)", "E0134", "h * "),
        ("sqrt(x, y)", "E0135", "sqrt(a)"),
        ("min(x)", "E0135", "min(a, b)"),
        ("4 m ^2", "E0136", "(4 m)^2"),
        ("x ** 2", "E0118", "x^2"),
        ("x[1]", "E0104", "round brackets"),
        ("x — 1", "E0104", "`-`"),
        ("_a", "E0206", "letter"),
        ("∂_x u", "E0101", "∂u/∂x"),
        ("∂k*u/∂x", "E0101", "∂(k …)/∂x"),
        ("k(x", "E0115", "close"),
        ("k)", "E0116", "remove"),
        ("k = 2", "E0117", "one"),
    ] {
        let model = with_formula(slip);
        let (_, faults) = parse(&model);
        let shown = shown(&model);
        let Some(first) = faults.iter().next() else {
            wrong.push(format!("`{slip}` was accepted"));
            continue;
        };
        let help = first.remedy.as_deref().unwrap_or("");
        let line = model[..first.span().start as usize].lines().count();
        let alone = faults.len() == 1 || ["E0104", "E0106", "E0107"].contains(&code);
        if first.code.as_str() != code || !help.contains(remedy) || line < 15 || !alone {
            wrong.push(format!("`{slip}` should have {code} with `{remedy}`, alone, in its line:\n{shown}"));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
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
fn slips_outside_formulas_are_named() {
    for (text, code) in [
        ("axes\n  x: 0 to 1, 11 nodes", "E0111"),
        ("model a\nmodel b\n", "E0111"),
        ("model a\nx = 1\n", "E0114"),
        ("model a\nconstnats\n  x = 1\n", "E0112"),
        ("model a\nConstants:\n  x = 1\n", "E0112"),
        ("model a\nconstants\n  x = 1\nconstants\n  y = 1\n", "E0113"),
        ("model a\nconstants\n  Δt = 1 s\n", "E0132"),
        ("model a\nconstants\n  t = 1 s\n", "E0205"),
        ("model a\nconstants\n  axes = 1\n", "E0205"),
        ("model a\nconstants\n  sin = 1\n", "E0205"),
        ("model a\nconstants\n  π = 3\n", "E0205"),
        ("model a\nconstants\n  k 3\n", "E0101"),
        ("model a \"open\nconstants\n  k = 3\n", "E0105"),
        ("model a\nconditions\n  T = 3\n", "E0119"),
        ("model a\nconditions\n  at x = low\n", "E0101"),
        ("model a\nequations\n  u = v\n  -w = z\n", "E0117"),
        ("model a\naxes\n  x: 0 to 1 11 nodes\n", "E0101"),
        ("model a\naxes\n  x: 0 to (1, 11 nodes\nfields\n  u on x\n", "E0115"),
    ] {
        assert_eq!(codes(text), [code], "{}", shown(text));
    }
}

#[test]
fn what_often_goes_wrong_has_a_remedy() {
    for (text, remedy) in [
        ("axes\n  x: 0 to 1 11 nodes\n", "a comma before"),
        ("conditions\n  at low: u = 0\n", "`at x = low"),
        ("conditions\n  at start: u = 0\n", "`at t = start"),
        ("conditions\n  x = low: u = 0\n", "begins with `at`"),
        ("equations\n  u\n", "an equality"),
        ("equations\n  u = v\n  -w = z\n", "begin it with its operand"),
    ] {
        let model = std::format!("model a\n{text}");
        let (_, faults) = parse(&model);
        let remedies: Vec<_> = faults.iter().filter_map(|fault| fault.remedy.as_deref()).collect();
        assert!(remedies.len() == 1 && remedies[0].contains(remedy), "{}", shown(&model));
    }
}

#[test]
fn one_fault_hides_no_other() {
    let text = "model a\naxes\n  x: 0 to (1, 11 nodes\n  y: 0 to 5., 11 nodes\nconstants\n  k = 2 +\nfields\n  u on x\n  v in\nequations\n  ∂u/∂t = ∂u/∂x^2 + ∂/∂x u\n";
    let (file, faults) = parse(text);
    let found: Vec<_> = faults.iter().map(|fault| fault.code.as_str()).collect();
    assert_eq!(found, ["E0115", "E0201", "E0101", "E0101", "E0121", "E0124"], "{}", shown(text));
    assert_eq!(file.fields.len(), 1);
    assert_eq!(file.faulty.len(), 5);
    let declared: Vec<_> =
        file.faulty.iter().filter_map(|one| one.declares.as_ref()).map(|name| name.text.as_str()).collect();
    assert_eq!(declared, ["x", "y", "k", "v"]);
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

#[test]
fn bytes_that_are_no_text_are_a_diagnostic() {
    let (_, faults) = syntax::parse(&SourceFile::from_bytes("w.rim", vec![0x6d, 0xff]));
    assert_eq!(faults.iter().next().map(|fault| fault.code.as_str()), Some("E0102"));
    let (_, faults) = syntax::parse(&SourceFile::from_bytes("w.rim", vec![b'x'; (1 << 20) + 1]));
    assert_eq!(faults.iter().next().map(|fault| fault.code.as_str()), Some("E0103"));
}

#[test]
fn hostile_formulas_are_refused_without_harm() {
    for (formula, code) in [
        ("(".repeat(100_000), "E0108"),
        ("(".repeat(200), "E0115"),
        ("f(".repeat(10_000), "E0108"),
        (format!("{}x{}", "(".repeat(100_000), ")".repeat(100_000)), "E0108"),
        (format!("{}x{}", "f(".repeat(10_000), ")".repeat(10_000)), "E0108"),
        (format!("{}x", "-".repeat(100_000)), "E0108"),
        (format!("{}x", "Δ ".repeat(50_000)), "E0108"),
        (format!("x{}", "^x".repeat(100_000)), "E0109"),
        (format!("x{}", "+x".repeat(100_000)), "E0109"),
        (format!("x{}", "^x".repeat(5_000)), "E0126"),
        (")".repeat(100_000), "E0116"),
        ("9".repeat(100_000), "E0203"),
        ("∂".repeat(10_000), "E0101"),
        ("∂/∂x".repeat(4_000), "E0101"),
        ("\\".repeat(10_000), "E0106"),
    ] {
        let model = with_formula(&formula);
        let first = codes(&model).first().copied();
        assert_eq!(first, Some(code), "{}…", &formula.chars().take(20).collect::<String>());
        assert!(shown(&model).len() < 200_000);
    }
}

#[test]
fn long_and_deep_formulas_within_the_bounds_are_read() {
    let long = format!("x{}", " + x".repeat(9_000));
    assert!(matches!(formula(&long).kind, ExpressionKind::Sum(terms) if terms.len() == 9_001));
    let deep = format!("{}x{}", "sin(1 + 2 * -".repeat(120), ")^2".repeat(120));
    drop(formula(&deep).clone());
    let deep = format!("{}x{}", "(1 + 2 * ".repeat(250), ")^2".repeat(250));
    let tree = formula(&deep);
    assert_eq!(spanless(&tree.clone()), spanless(&formula(&print_expression(&tree))));
    let nested = (0..60).fold("1".to_string(), |inner, _| format!("cases(x < 1: {inner}, otherwise: 2)"));
    assert!(matches!(formula(&nested).kind, ExpressionKind::Cases { .. }));
    let nested = (0..60).fold("1".to_string(), |inner, _| format!("cases({inner} < 1: 2, otherwise: 2)"));
    assert!(matches!(formula(&nested).kind, ExpressionKind::Cases { .. }));
    // The same with a fault at the innermost place must not try every combination.
    let faulty = (0..60).fold("1 +* 2".to_string(), |inner, _| {
        format!("cases({inner} < 1: 2, otherwise: {inner})").chars().take(4000).collect()
    });
    assert!(!codes(&with_formula(&faulty)).is_empty());
}

#[test]
fn a_file_of_faults_ends() {
    let text = format!("model a\nconstants\n{}", "  = (\n".repeat(100_000));
    assert!(codes(&text).len() <= 502);
    let text = format!("model a\nconstants\n{}", "  a $ b\n".repeat(100_000));
    assert_eq!(codes(&text).last(), Some(&"E0110"));
    for (part, count) in [
        ("_{", 400_000),
        ("e\u{301}\u{301}", 200_000),
        ("\"", 900_000),
        ("a_x = b_x\n", 90_000),
        ("(\n", 400_000),
        ("$", 900_000),
    ] {
        let text = format!("model a\nfields\n{}", part.repeat(count));
        let found = codes(&text);
        assert!(!found.is_empty() && found.len() < 2_000, "{part:?}: {}", found.len());
    }
    let marks = format!("model a\nconstants\n  e{} = 1", "\u{301}\u{302}".repeat(200_000));
    codes(&marks);
}

#[test]
fn the_formatter_lays_out_and_keeps_every_comment() {
    let untidy = "\u{feff}model  wall   \"A – wall\"\r\n\r\n\r\n# top\r\naxes # first\r\n x:0 m to 1 m,11 nodes\r\nconstants\r\n\trho0=\\rho_{0}  *2   \"a\" # one\r\n   k = 3 W/(m·K)   #two\r\n   # three\r\nequations\r\n  \\partial u/\\partial t=-k*\\Delta u+ # four\r\n  # five\r\n  2^ -1\r\n  -x";
    let tidy = "model wall \"A – wall\"\n\n# top\naxes  # first\n  x: 0 m to 1 m, 11 nodes\nconstants\n  rho0 = ρ_0 * 2   \"a\"  # one\n  k    = 3 W/(m·K)      #two\n  # three\nequations\n  ∂u/∂t = -k*Δ u +  # four\n  # five\n      2^-1\n      - x\n";
    let formatted = format(&SourceFile::new("w.rim", untidy)).unwrap_or_else(|_| panic!("{}", shown(untidy)));
    assert_eq!(formatted, tidy);
}

/// The three laws: formatting twice is formatting once, the tree stays the same, and so do the comments.
fn obeys_the_laws(text: &str) -> Result<(), String> {
    let Ok(once) = format(&SourceFile::new("w.rim", text)) else {
        return Err(format!("{}\nin\n{text}", shown(text)));
    };
    let Ok(twice) = format(&SourceFile::new("w.rim", once.as_str())) else {
        return Err(format!("{}\nin\n{once}", shown(&once)));
    };
    if once != twice {
        return Err(format!("formatted twice:\n{once}\n---\n{twice}"));
    }
    let comments = |text: &str| -> Vec<String> {
        text.lines()
            .filter_map(|line| line.split_once('#'))
            .map(|(_, comment)| comment.trim_end().to_string())
            .collect()
    };
    if comments(text) != comments(&once) {
        return Err(format!("comments differ:\n{text}\n---\n{once}"));
    }
    if spanless(&parse(text).0) != spanless(&parse(&once).0) {
        return Err(format!("another tree:\n{text}\n---\n{once}"));
    }
    Ok(())
}

#[test]
fn whole_files_obey_the_laws_of_the_formatter() {
    for text in [VAULT_WALL, EVERYTHING, &VAULT_WALL.replace('\n', "\r\n"), &EVERYTHING.replace("  ", " ")] {
        assert_eq!(obeys_the_laws(text), Ok(()));
    }
}

/// Formulas with their spaces left to chance.
fn any_formula() -> impl Strategy<Value = String> {
    let leaf = prop_oneof![
        Just("x".to_string()),
        Just("u".to_string()),
        Just("ρ_0".to_string()),
        Just("π".to_string()),
        Just("2".to_string()),
        Just("0.5".to_string()),
        Just("3e-4".to_string()),
        Just("3 W/(m²·K)".to_string()),
        Just("(1.5 m^-2)".to_string()),
        Just("∂u/∂x".to_string()),
        Just("∂²u/∂x∂y".to_string()),
        Just("\\partial^2 u / \\partial x^2".to_string()),
        Just("noise(seed 3)".to_string()),
    ];
    leaf.prop_recursive(5, 60, 4, |inner| {
        let space = || prop_oneof![Just(""), Just(" "), Just("  ")];
        prop_oneof![
            (
                inner.clone(),
                space(),
                prop_oneof![Just("+"), Just("-"), Just("*"), Just("·"), Just("/")],
                space(),
                inner.clone()
            )
                .prop_map(|(a, left, sign, right, b)| format!("{a}{left}{sign}{right}{b}")),
            inner.clone().prop_map(|a| format!("({a})")),
            inner.clone().prop_map(|a| format!("-({a})")),
            inner.clone().prop_map(|a| format!("({a})^2")),
            inner.clone().prop_map(|a| format!("({a})^ -x")),
            inner.clone().prop_map(|a| format!("sin( {a})")),
            (inner.clone(), inner.clone()).prop_map(|(a, b)| format!("max({a}, {b})")),
            (inner.clone(), inner.clone()).prop_map(|(a, b)| format!("cases({a}<{b}: {a} ,otherwise:{b})")),
            inner.clone().prop_map(|a| format!("∂/∂x ({a})")),
            inner.clone().prop_map(|a| format!("∇·({a}*∇u)")),
            inner.clone().prop_map(|a| format!("∇u·∇({a})")),
            inner.prop_map(|a| format!("Δ({a})")),
        ]
    })
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 300, ..ProptestConfig::default() })]

    #[test]
    fn generated_formulas_obey_the_laws(text in any_formula()) {
        let model = with_formula(&text);
        // Some are refused (a number over a quantity, a power of a quantity): those are not formatted.
        let (file, faults) = parse(&model);
        if !faults.is_empty() {
            prop_assert!(format(&SourceFile::new("w.rim", model.as_str())).is_err());
            return Ok(());
        }
        prop_assert_eq!(obeys_the_laws(&model), Ok(()));
        let CoefficientValue::Formula(value) = &file.coefficients[0].value else { panic!("no formula") };
        let printed = print_expression(value);
        prop_assert_eq!(spanless(&formula(&printed)), spanless(value), "{} printed as {}", text, printed);
        prop_assert_eq!(print_expression(&formula(&printed)), printed);
    }

    #[test]
    fn no_text_makes_the_front_end_stumble(bytes in proptest::collection::vec(any::<u8>(), 0..400)) {
        let source = SourceFile::from_bytes("w.rim", bytes);
        let (_, faults) = syntax::parse(&source);
        prop_assert!(!faults.is_empty());
        prop_assert!(!render(&faults, &source, Colour::Plain).is_empty());
    }

    #[test]
    fn no_text_of_the_language_does_either(parts in proptest::collection::vec(proptest::sample::select(vec![
        "model a", "\n", "axes\n", "constants\n", "fields\n", "equations\n", "conditions\n", "output\n", "time\n", "at ", "x", "=",
        ":", ",", "(", ")", "∂", "Δ", "∇", "·", "/", "^", "²", " ", "1", "0.5", " m", "\"", "#", "\\rho", "\\", "to", " cases(", "otherwise",
        "u on x", "é", "e\u{301}", "−", "\t", ";", "low", "nodes", "\r\n", "₀", "°C", "'",
    ]), 0..60)) {
        let text = format!("model a\n{}", parts.concat());
        let source = SourceFile::new("w.rim", text.as_str());
        let (_, faults) = syntax::parse(&source);
        let shown = render(&faults, &source, Colour::Plain);
        prop_assert_eq!(shown.is_empty(), faults.is_empty());
        for fault in &faults {
            let span = fault.span();
            prop_assert!(span.end as usize <= text.len());
            prop_assert!(text.is_char_boundary(span.start as usize) && text.is_char_boundary(span.end as usize));
        }
        if !faults.has_errors() {
            prop_assert_eq!(obeys_the_laws(&text), Ok(()));
        }
    }
}
