//! The checker on whole models: derivatives keep their structure, equations become explicit, hostile text is refused soon,
//! and several slips give as many diagnostics. Models with one fault each are in `rejects`.

use rimstone::model::expression::DerivativeKind;
use rimstone::model::{AxisId, Derivative, Expression, Model, OutputKind, TimeOrder};
use rimstone::pipeline;
use rimstone::source::SourceFile;

/// The sections of a model as they are written, for tests that change one of them.
#[derive(Clone)]
struct Written(Vec<(&'static str, String)>);

impl Written {
    /// A periodic square of one field without units.
    fn square() -> Written {
        Written(vec![
            ("axes", "  x: 0 to 1, 32 cells, periodic\n  y: 0 to 1, 32 cells, periodic".to_owned()),
            ("constants", "  k = 3/4\n  a = 2".to_owned()),
            ("fields", "  u on x, y".to_owned()),
            ("equations", "  ∂u/∂t = k * Δ u".to_owned()),
            ("conditions", "  at t = start: u = sin(2*π*x)".to_owned()),
            ("accuracy", "  order 2".to_owned()),
            ("time", "  0 to 0.01\n  method rk4\n  step 0.5 of limit".to_owned()),
        ])
    }

    /// A wall of brick with units and a boundary.
    fn wall() -> Written {
        Written(vec![
            ("axes", "  x: 0 m to 0.36 m, 25 nodes".to_owned()),
            ("constants", "  k = 0.72 W/(m·K)\n  C = 1.6e6 J/(m³·K)".to_owned()),
            ("fields", "  T in K on x".to_owned()),
            ("equations", "  C * ∂T/∂t = ∂/∂x(k * ∂T/∂x)".to_owned()),
            (
                "conditions",
                "  at x = low: T = 281 K\n  at x = high: ∂T/∂n = 0\n  at t = start: T = 281 K".to_owned(),
            ),
            ("accuracy", "  order 2".to_owned()),
            ("time", "  0 s to 3 h\n  method rk4\n  step 0.9 of limit".to_owned()),
        ])
    }

    fn with(mut self, section: &'static str, lines: impl Into<String>) -> Written {
        self.0.retain(|(word, _)| *word != section);
        self.0.push((section, lines.into()));
        self
    }

    /// More lines in a section.
    fn and(self, section: &'static str, lines: impl AsRef<str>) -> Written {
        let old = self.0.iter().find(|(word, _)| *word == section).map_or("", |(_, text)| text).to_owned();
        let new = format!("{old}\n{}", lines.as_ref());
        self.with(section, new)
    }

    fn source(&self) -> SourceFile {
        let sections: Vec<String> = self.0.iter().map(|(word, lines)| format!("{word}\n{lines}\n")).collect();
        SourceFile::new(
            "model.rim",
            format!("model vault \"A model of the vault\"\n\n{}", sections.join("\n")),
        )
    }

    fn codes(&self) -> Vec<String> {
        let checked = pipeline::check(&self.source());
        let errors = checked.diagnostics.iter().map(|one| one.code.as_str().to_owned());
        errors.filter(|code| code.starts_with('E')).collect()
    }

    fn model(&self) -> Model {
        let checked = pipeline::check(&self.source());
        let said: Vec<&String> = checked.diagnostics.iter().map(|one| &one.message).collect();
        checked.model.unwrap_or_else(|| panic!("refused: {said:?}"))
    }

    /// The terms of the right side of the first equation.
    fn right(&self) -> Vec<Expression> {
        rimstone::model::expression::terms(self.model().equations[0].right.clone())
    }
}

const X: AxisId = AxisId(0);
const Y: AxisId = AxisId(1);

fn of(equation: &str) -> Vec<Expression> {
    Written::square().with("equations", format!("  {equation}")).right()
}

/// The only derivative of a term, with its order.
fn derivative(term: &Expression) -> Derivative {
    match term {
        Expression::Derivative(inner) => (**inner).clone(),
        other => {
            let found: Vec<Derivative> = other
                .children()
                .into_iter()
                .filter(|child| matches!(child, Expression::Derivative(_)))
                .map(derivative)
                .collect();
            match found.as_slice() {
                [one] => one.clone(),
                _ => panic!("not one derivative: {term:?}"),
            }
        }
    }
}

fn kind(term: &Expression) -> DerivativeKind {
    derivative(term).kind
}

fn u() -> Expression {
    Expression::Field(rimstone::model::FieldId(0))
}

fn number(numerator: i64, denominator: i64) -> Expression {
    Expression::Number(rimstone::exact::Rational::ratio(numerator, denominator))
}

#[test]
fn a_conductivity_under_the_derivative_stays_there() {
    let terms = of("∂u/∂t = ∂/∂x((1 + x) * ∂u/∂x)");
    assert_eq!(terms.len(), 1);
    let DerivativeKind::Second { axis: X, coefficient, of } = kind(&terms[0]) else { panic!("{terms:?}") };
    assert_eq!(of, u());
    assert_eq!(coefficient, Expression::sum([Expression::one(), Expression::Coordinate(X)]));
}

#[test]
fn a_factor_before_the_derivative_stays_before_it() {
    let terms = of("∂u/∂t = k * ∂²u/∂x²");
    let Expression::Product(factors) = &terms[0] else { panic!("{terms:?}") };
    assert_eq!(factors[0], number(3, 4));
    let second = DerivativeKind::Second { axis: X, coefficient: Expression::one(), of: u() };
    assert_eq!(kind(&factors[1]), second);
}

#[test]
fn a_flux_is_not_expanded() {
    let terms = of("∂u/∂t = -∂/∂x(u^2/2)");
    assert_eq!(terms.len(), 1);
    let DerivativeKind::First { axis: X, of } = kind(&terms[0]) else { panic!("{terms:?}") };
    assert!(of.any(&|node| matches!(node, Expression::Power(..))), "{of:?}");
}

#[test]
fn a_derivative_of_a_sum_goes_term_by_term() {
    let terms = of("∂u/∂t = ∂/∂x(u + (1 + y) * ∂u/∂x)");
    assert_eq!(terms.len(), 2);
    let kinds: Vec<DerivativeKind> = terms.iter().map(kind).collect();
    assert!(kinds.iter().any(|one| matches!(one, DerivativeKind::First { axis: X, .. })), "{kinds:?}");
    assert!(kinds.iter().any(|one| matches!(one, DerivativeKind::Second { axis: X, .. })), "{kinds:?}");
}

#[test]
fn mixed_derivatives_keep_their_order() {
    let terms = of("∂u/∂t = ∂²u/∂x∂y");
    let mixed = DerivativeKind::Mixed { outer: X, inner: Y, coefficient: Expression::one(), of: u() };
    assert_eq!(kind(&terms[0]), mixed);
    let terms = of("∂u/∂t = ∂/∂y((1 + x) * ∂u/∂x)");
    assert!(matches!(kind(&terms[0]), DerivativeKind::Mixed { outer: Y, inner: X, .. }), "{terms:?}");
}

#[test]
fn the_laplacian_and_the_divergence_of_a_gradient_agree() {
    assert_eq!(of("∂u/∂t = Δ u"), of("∂u/∂t = ∇·(∇u)"));
    assert_eq!(of("∂u/∂t = ∇² u"), of("∂u/∂t = ∂²u/∂x² + ∂²u/∂y²"));
    assert_eq!(of("∂u/∂t = ∇·((1 + x) * ∇u)"), of("∂u/∂t = ∂/∂x((1 + x) * ∂u/∂x) + ∂/∂y((1 + x) * ∂u/∂y)"));
}

#[test]
fn a_scalar_product_of_gradients_is_a_sum_of_products() {
    let terms = of("∂u/∂t = ∇u·∇u");
    assert_eq!(terms.len(), 2);
    for term in &terms {
        let first = |node: &&Expression| matches!(node, Expression::Derivative(one) if matches!(one.kind, DerivativeKind::First { .. }));
        assert_eq!(term.children().iter().filter(|node| first(node)).count(), 2, "{term:?}");
    }
}

#[test]
fn high_derivatives_are_one_operator() {
    let terms = of("∂u/∂t = -∂⁴u/∂x⁴");
    assert!(matches!(kind(&terms[0]), DerivativeKind::Higher { axis: X, degree: 4, .. }), "{terms:?}");
    assert_eq!(of("∂u/∂t = ∂/∂x(∂²u/∂x²)"), of("∂u/∂t = ∂³u/∂x³"));
}

#[test]
fn a_named_operator_is_what_it_says_with_its_own_order() {
    let model = Written::square()
        .with("operators", "  spread(f) = ∂/∂x((1 + x) * ∂f/∂x) with order 6\n  twice(f) = 2 * f")
        .with("equations", "  ∂u/∂t = spread(twice(twice(u)))");
    let terms = model.right();
    let only = derivative(&terms[0]);
    assert_eq!(only.order, Some(6));
    let DerivativeKind::Second { of, .. } = only.kind else { panic!("{terms:?}") };
    assert_eq!(of, number(4, 1).times(u()));
}

#[test]
fn what_multiplies_the_rate_divides_the_rest() {
    let plain = Written::wall().right();
    let divided = Written::wall().with("equations", "  ∂T/∂t = ∂/∂x(k * ∂T/∂x) / C").right();
    let moved = Written::wall().with("equations", "  ∂/∂x(k * ∂T/∂x) - C * ∂T/∂t = 0").right();
    let inside = Written::wall().with("equations", "  ∂(C * T)/∂t = ∂/∂x(k * ∂T/∂x)").right();
    assert_eq!(plain, divided);
    assert_eq!(plain, inside);
    assert_eq!(derivative(&plain[0]), derivative(&moved[0]));
}

#[test]
fn second_order_in_time_may_hold_its_rate() {
    let model = Written::square()
        .with("equations", "  ∂²u/∂t² + a * ∂u/∂t = k * Δ u")
        .with("conditions", "  at t = start: u = 0; ∂u/∂t = sin(2*π*x)")
        .model();
    assert_eq!(model.equations[0].order, TimeOrder::Second);
    assert!(model.equations[0].right.any(&|node| matches!(node, Expression::Rate(_))));
    assert_eq!(model.initial.iter().map(|one| one.derivative).collect::<Vec<_>>(), [0, 1]);
}

#[test]
fn constants_may_stand_in_any_order() {
    let model = Written::square().with("constants", "  k = 3 * b\n  b = c / 4\n  c = 1\n  a = 2").model();
    let k = model.folded_constants.iter().find(|one| one.name == "k").expect("k");
    assert_eq!(k.value, number(3, 4));
}

#[test]
fn free_constants_keep_their_unit_and_their_name() {
    let model = Written::wall()
        .with("constants", "  k = 72 cW/(m·K), free between 10 cW/(m·K) and 1 kW/(m·K)\n  C = 1.6e6 J/(m³·K)")
        .model();
    let k = &model.free_constants[0];
    assert_eq!((k.name.as_str(), k.unit.as_str()), ("k", "cW/(m·K)"));
    assert_eq!((&k.value, &k.scale), (&number(72, 100), &number(1, 100)));
    assert!(model.equations[0].right.any(&|node| matches!(node, Expression::Constant(_))));
}

#[test]
fn a_range_of_gauges_is_one_gauge_for_each_place() {
    let model = Written::wall().with("output", "  gauges inside: T at x = 0.1 m to 0.3 m by 0.1 m").model();
    let names: Vec<&str> = model.outputs.iter().map(|output| output.name.as_str()).collect();
    assert_eq!(names, ["inside_1", "inside_2", "inside_3"]);
    let OutputKind::Gauge { place } = &model.outputs[2].kind else { panic!("no gauge") };
    assert_eq!(place, &[number(3, 10)]);
}

#[test]
fn degrees_are_exact() {
    let model = Written::square().with("constants", "  k = 3/4\n  a = 180 °").model();
    let a = model.folded_constants.iter().find(|one| one.name == "a").expect("a");
    assert_eq!(a.value, Expression::Pi);
}

#[test]
fn what_can_stand_in_conditions_can_stand_in_their_operators() {
    let model = Written::wall().with("operators", "  flux(f) = -k * ∂f/∂n").with(
        "conditions",
        "  at x = low: T = 281 K\n  at x = high: flux(T) = 8 W/(m²·K) * (T - 291 K)\n  at t = start: T = 281 K",
    );
    assert_eq!(model.codes(), Vec::<String>::new());
}

#[test]
fn a_factor_that_varies_along_the_face_only_stays() {
    let plate = |factor: &str| {
        Written::square()
            .with("axes", "  x: 0 to 1, 17 nodes\n  y: 0 to 1, 16 cells, periodic")
            .with(
                "conditions",
                format!("  at x = low: ∂({factor} * u)/∂n = 0\n  at x = high: u = 0\n  at t = start: u = 0"),
            )
            .codes()
    };
    assert_eq!(plate("(2 + sin(2*π*y))"), Vec::<String>::new());
    assert_eq!(plate("(2 + x)"), ["E0407"]);
}

#[test]
fn all_faults_come_at_once() {
    let model = Written::wall()
        .with("constants", "  k = 0.72 W/(m·Q)\n  C = 1.6e6 J/(m³·K)")
        .with("equations", "  C * ∂T/∂t = ∂/∂x(k * ∂T/∂x) + κ")
        .with("conditions", "  at x = low: T = 281 m\n  at x = high: ∂T/∂n = 0\n  at t = start: T = 281 K")
        .with("time", "  0 s to 3 h\n  method rk5\n  step 0.9 of limit")
        .with("output", "  gauge a: T at x = 0.5 m");
    let mut codes = model.codes();
    codes.sort();
    assert_eq!(codes, ["E0210", "E0301", "E0302", "E0701", "E0801"]);
}

/// Names that each use the one before twice: written out they would have 2ⁿ parts.
fn doubling(count: usize, first: &str, next: impl Fn(usize) -> String) -> String {
    (1..=count).map(next).fold(format!("  {first}"), |text, line| format!("{text}\n  {line}"))
}

#[test]
fn formulas_that_double_are_refused() {
    let constants = doubling(60, "a_0 = sin(1)", |n| {
        format!("a_{n} = sin(a_{before}) + cos(a_{before})", before = n - 1)
    });
    assert_eq!(Written::wall().and("constants", constants).codes(), ["E0219"]);
    let free = doubling(60, "a_0 = 1, free", |n| {
        format!("a_{n} = a_{before} + sin(a_{before}), free", before = n - 1)
    });
    assert_eq!(Written::wall().and("constants", free).codes(), ["E0219"]);
    let coefficients = doubling(60, "a_0(x) = sin(x / 1 m)", |n| {
        format!("a_{n}(x) = sin(a_{before}) + cos(a_{before})", before = n - 1)
    });
    assert_eq!(Written::wall().with("coefficients", coefficients).codes(), ["E0219"]);
    let operators = doubling(60, "f_0(v) = ∂²v/∂x²", |n| {
        format!("f_{n}(v) = f_{before}(sin(v)) + f_{before}(cos(v))", before = n - 1)
    });
    let codes = Written::square().with("operators", operators).codes();
    assert!(!codes.is_empty() && codes.iter().all(|code| code == "E0219"), "{codes:?}");
}

#[test]
fn numbers_that_grow_are_refused() {
    let squares =
        doubling(40, "a_0 = 1.000000001", |n| format!("a_{n} = a_{before} * a_{before}", before = n - 1));
    assert_eq!(Written::wall().and("constants", squares).codes(), ["E0203"]);
    let powers = doubling(9, "a_0 = 1.1", |n| format!("a_{n} = a_{}^64", n - 1));
    assert_eq!(Written::wall().and("constants", powers).codes(), ["E0203"]);
    let fractions: Vec<String> = (3..6000).step_by(2).map(|below| format!("1/{below}")).collect();
    assert_eq!(
        Written::wall().and("constants", format!("  a = {}", fractions.join(" + "))).codes(),
        ["E0203"]
    );
}

#[test]
fn long_chains_of_names_are_refused_whichever_way_they_run() {
    let link = |n: usize| format!("  a_{n} = sin(a_{})", n - 1);
    let up: Vec<String> = (1..5000).map(link).collect();
    let down: Vec<String> = (1..5000).rev().map(link).collect();
    let free: Vec<String> = (1..5000).map(|n| format!("{}, free", link(n))).collect();
    for (lines, first) in [(up, "  a_0 = 1"), (down, "  a_0 = 1"), (free, "  a_0 = 1, free")] {
        let text = format!("{first}\n{}", lines.join("\n"));
        let codes = Written::wall().and("constants", text).codes();
        assert!(!codes.is_empty() && codes.iter().all(|code| code == "E0219"), "{codes:?}");
    }
}

#[test]
fn derivatives_of_derivatives_of_derivatives_are_bounded() {
    let equation = format!("  ∂u/∂t = {}u{}", "Δ(sin(".repeat(20), "))".repeat(20));
    assert_eq!(Written::square().with("equations", equation).codes(), ["E0219"]);
}

#[test]
fn one_faulty_name_is_one_fault_however_often_it_is_used() {
    let lines =
        doubling(40, "a_0 = 1 furlong", |n| format!("a_{n} = a_{before} + a_{before}", before = n - 1));
    assert_eq!(Written::wall().and("constants", lines).codes(), ["E0301"]);
    let circle = "  a = 2 * b\n  b = 3 * c\n  c = a + b\n  d = a + c";
    assert_eq!(Written::wall().and("constants", circle).codes(), ["E0212"]);
    let operators = "  f(v) = 2 * g(v)\n  g(v) = 3 * f(v)\n  e(v) = f(v) + g(v)";
    let model = Written::wall()
        .with("operators", operators)
        .with("equations", "  C * ∂T/∂t = k / 1 m² * (f(T) + e(T))");
    assert_eq!(model.codes(), ["E0212"]);
}
