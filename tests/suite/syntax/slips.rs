//! Slips in notation: each has its code, its place and its remedy, and hides no other.

use super::*;

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
        ("∂u/∂x ∂v/∂x", "E0120", "∂u/∂x * ∂v/∂x"),
        ("∂/∂x ∂/∂x(u)", "E0101", ""),
        ("3 W/m·K", "E0128", "W/(m·K)"),
        ("3 W/m·K", "E0128", "W·K/m"),
        ("3 W/(m*K)", "E0137", "3 W/(m·K)"),
        ("3 N*m", "E0137", "3 N·m"),
        ("3 m2", "E0120", "3 m^2"),
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

/// For each code of the syntax a text that has it.
fn text_with(code: &str) -> SourceFile {
    let formula = match code {
        "E0104" => "x[1]",
        "E0106" => "\\frac",
        "E0107" => "u'",
        "E0116" => "k)",
        "E0118" => "x**2",
        "E0120" => "k x",
        "E0121" => "∂u/∂x²",
        "E0122" => "∂u²/∂x",
        "E0123" => "∂u/∂x(k)",
        "E0124" => "∂/∂x u",
        "E0125" => "∂⁵u/∂x⁵",
        "E0126" => "x^2^3",
        "E0127" => "1/400 m",
        "E0128" => "3 W/m·K",
        "E0129" => "2 h",
        "E0130" => "20 °C",
        "E0131" => "u_xx",
        "E0132" => "Δx",
        "E0133" => "sin x",
        "E0134" => "h(x)",
        "E0135" => "min(x)",
        "E0136" => "4 m ^2",
        "E0137" => "3 N*m",
        "E0201" => "5.",
        "E0202" => "0,5",
        "E0203" => "1e9999",
        "E0204" => "2x",
        "E0206" => "_a",
        _ => "",
    };
    if !formula.is_empty() {
        return SourceFile::new("w.rim", with_formula(formula));
    }
    let text = match code {
        "E0101" => "model a\nconstants\n  k 3\n".to_string(),
        "E0102" => return SourceFile::from_bytes("w.rim", vec![0xff]),
        "E0103" => " ".repeat((1 << 20) + 1),
        "E0105" => "model a \"b\n".into(),
        "E0108" => with_formula(&"(".repeat(300)),
        "E0109" => with_formula(&"x + ".repeat(20_000)),
        "E0110" => std::format!("model a\nconstants\n{}", "  k 3\n".repeat(2_000)),
        "E0111" => "axes\n".into(),
        "E0112" => "model a\naxis\n".into(),
        "E0113" => "model a\naxes\naxes\n".into(),
        "E0114" => "model a\nk = 3\n".into(),
        "E0115" => "model a\nconstants\n  k = (3\n".into(),
        "E0117" => "model a\nequations\n  u = v = w\n".into(),
        "E0119" => "model a\nconditions\n  u = v\n".into(),
        "E0205" => "model a\nconstants\n  t = 3\n".into(),
        _ => String::new(),
    };
    SourceFile::new("w.rim", text)
}

#[test]
fn every_code_of_the_syntax_can_be_met() {
    for code in rimstone::diagnostic::codes::TABLE {
        let (_, faults) = syntax::parse(&text_with(code.as_str()));
        assert!(faults.has(*code), "{code} is met by no text");
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
