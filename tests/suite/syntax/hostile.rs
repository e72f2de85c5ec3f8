//! Text made to harm: it is refused in bounded time, with a diagnostic.

use super::*;

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
