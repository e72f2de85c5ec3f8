//! Laws: printing and formatting keep the tree and the comments; damaged text harms nobody.

use proptest::prelude::*;
use rimstone::syntax::format;

use super::*;

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
    #![proptest_config(ProptestConfig { cases: 300, failure_persistence: None, ..ProptestConfig::default() })]

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
    fn no_damage_to_a_model_makes_it_stumble(from in 0usize..2000, length in 0usize..12, put in proptest::sample::select(vec![
        "", " ", "\n", "(", ")", "\"", "#", ":", ",", "=", "-", "∂", "Δ", "/", "·", "^2", "²", "5.", "\\rho", "'", "\taxes\n", "\naxes\n", "\u{301}",
    ])) {
        let letters: Vec<char> = EVERYTHING.chars().collect();
        let from = from.min(letters.len());
        let to = (from + length).min(letters.len());
        let text = letters[..from].iter().collect::<String>() + put + &letters[to..].iter().collect::<String>();
        let source = SourceFile::new("w.rim", text.as_str());
        let (file, faults) = syntax::parse(&source);
        for fault in &faults {
            for label in &fault.labels {
                prop_assert!(text.get(label.span.start as usize..label.span.end as usize).is_some());
            }
        }
        prop_assert_eq!(render(&faults, &source, Colour::Plain).is_empty(), faults.is_empty());
        if !faults.has_errors() {
            prop_assert!(file.faulty.is_empty());
            prop_assert_eq!(obeys_the_laws(&text), Ok(()));
        }
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
