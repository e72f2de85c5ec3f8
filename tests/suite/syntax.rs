//! The front end as a whole: files that must be read, slips that must be named, text that must not harm.

use rimstone::diagnostic::Diagnostics;
use rimstone::diagnostic::terminal::{Colour, render};
use rimstone::source::SourceFile;
use rimstone::syntax::tree::{Expression, ExpressionKind, ModelFile};
use rimstone::syntax::{self};

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
        syntax::tree::CoefficientValue::Formula(value) => value.clone(),
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
fn look() {
    let Ok(paths) = std::env::var("LOOK") else { return };
    for path in paths.split(':') {
        let source = SourceFile::from_bytes(path, std::fs::read(path).unwrap());
        let (file, faults) = syntax::parse(&source);
        println!("{}\n{}", render(&faults, &source, Colour::Plain), file.faulty.len());
        if std::env::var("TREE").is_ok() {
            println!("{file:#?}");
        }
    }
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
