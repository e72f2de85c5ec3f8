//! Lowered kernels, run by the reference evaluator: models built by hand, against exact solutions.

use crate::reference::Reference;
use rimstone::analysis::{limit, stability};
use rimstone::discretize::assemble;
use rimstone::exact::{Rational, round};
use rimstone::kernel::lower::lower;
use rimstone::kernel::validate::validate;
use rimstone::model::expression::{Derivative, DerivativeKind, Expression, Function};
use rimstone::model::*;
use rimstone::source::Span;

fn number(value: i64) -> Expression {
    Expression::Number(Rational::from(value))
}

fn x() -> Expression {
    Expression::Coordinate(AxisId(0))
}

fn u() -> Expression {
    Expression::Field(FieldId(0))
}

fn call(function: Function, argument: Expression) -> Expression {
    Expression::Call(function, vec![argument])
}

fn derivative(kind: DerivativeKind) -> Expression {
    Expression::Derivative(Box::new(Derivative { kind, order: None }))
}

fn second(coefficient: Expression, of: Expression) -> Expression {
    derivative(DerivativeKind::Second { axis: AxisId(0), coefficient, of })
}

fn first(of: Expression) -> Expression {
    derivative(DerivativeKind::First { axis: AxisId(0), of })
}

fn unit_interval(nodes: usize) -> Axis {
    Axis {
        name: "x".into(),
        dimension: Dimension::one(),
        low: number(0),
        high: number(1),
        nodes,
        periodic: false,
        span: Span::default(),
    }
}

fn at(side: Side, treatment: Treatment) -> Condition {
    let face = Face { axis: AxisId(0), side };
    Condition { face, patch: Vec::new(), treatment, text: String::new(), span: Span::default() }
}

fn given(value: Expression) -> Treatment {
    let slope = |of: &Expression| calculus::partial(of, calculus::Variable::Time, &[]);
    let rate = slope(&value);
    let second_rate = rate.as_ref().and_then(slope);
    Treatment::Value { field: FieldId(0), value, rate, second_rate }
}

struct Case {
    right: Expression,
    order: TimeOrder,
    conditions: Vec<Condition>,
    exact: Expression,
    method: Method,
    end: Rational,
    step: Rational,
}

fn model(case: &Case, nodes: usize) -> Model {
    let rewind =
        |of: &Expression| of.rewrite(&mut |node| if node == Expression::Time { number(0) } else { node });
    let velocity = calculus::partial(&case.exact, calculus::Variable::Time, &[]).expect("smooth");
    let initial = |derivative: usize, value: Expression| InitialCondition {
        field: FieldId(0),
        derivative,
        value,
        span: Span::default(),
    };
    Model {
        name: "case".into(),
        title: String::new(),
        axes: vec![unit_interval(nodes)],
        free_constants: Vec::new(),
        folded_constants: Vec::new(),
        coefficients: Vec::new(),
        fields: vec![Field {
            name: "u".into(),
            dimension: Dimension::one(),
            unit: "1".into(),
            scale: number(1),
            bounds: None,
            span: Span::default(),
        }],
        equations: vec![Equation {
            field: FieldId(0),
            order: case.order,
            right: case.right.clone(),
            span: Span::default(),
        }],
        conditions: case.conditions.clone(),
        initial: vec![initial(0, rewind(&case.exact)), initial(1, rewind(&velocity))],
        accuracy: Accuracy { span: Span::default(), per_axis: vec![AskedOrder::Solution(4)] },
        time: TimePlan {
            start: number(0),
            end: Expression::Number(case.end.clone()),
            method: case.method,
            step: Step::OfLimit(case.step.clone()),
            span: Span::default(),
        },
        outputs: vec![Output {
            name: "exact".into(),
            dimension: Dimension::one(),
            unit: "1".into(),
            scale: number(1),
            value: case.exact.clone(),
            kind: OutputKind::Snapshot,
            every: None,
            span: Span::default(),
        }],
        verification: None,
    }
}

/// Root mean square error at the end.
fn error(case: &Case, nodes: usize) -> f64 {
    let model = model(case, nodes);
    let scheme = assemble(&model).expect("order 4 is offered");
    let law = limit::law(&model, &scheme, &stability::extents(case.method));
    let kernel = validate(lower(&model, &scheme, &law, Vec::new())).expect("a lowered kernel is valid");
    let mut reference = Reference::new(&kernel, &[nodes]);
    reference.start(0.0);
    let end = round::nearest(&case.end);
    let largest = round::nearest(&case.step) / reference.largest_rate(0.0);
    let steps = (end / largest).ceil();
    let step = end / steps;
    reference.first_step(0.0, step);
    for index in 0..steps as usize {
        let next = if index + 1 == steps as usize { end } else { (index + 1) as f64 * step };
        reference.advance(index as f64 * step, step, next);
    }
    let exact = reference.output(0, end);
    let found = reference.buffer(kernel.fields[0].buffer);
    let total: f64 = found.iter().zip(&exact).map(|(a, b)| (a - b) * (a - b)).sum();
    (total / nodes as f64).sqrt()
}

fn check_order(name: &str, case: &Case, grids: [usize; 3], wanted: f64) {
    let errors = grids.map(|nodes| error(case, nodes));
    let rate = |a: usize, b: usize| {
        (errors[a] / errors[b]).ln() / (((grids[b] - 1) as f64) / ((grids[a] - 1) as f64)).ln()
    };
    let (coarse, fine) = (rate(0, 1), rate(1, 2));
    assert!(fine > wanted - 0.2, "{name}: errors {errors:?}, rates {coarse:.2} {fine:.2}");
    assert!(errors[2] < 1e-3, "{name}: errors {errors:?}");
}

/// Decaying mode of a slab with given value and film (separation of variables, common practice).
#[test]
fn slab_with_film() {
    let phase = Expression::sum([number(2).times(x()), Expression::Number(Rational::ratio(3, 10))]);
    let exact =
        call(Function::Exp, number(-4).times(Expression::Time)).times(call(Function::Sin, phase.clone()));
    let at_low = exact.rewrite(&mut |node| if node == x() { number(0) } else { node });
    let end = phase.rewrite(&mut |node| if node == x() { number(1) } else { node });
    let film = number(-2).times(call(Function::Cos, end.clone())).over(call(Function::Sin, end));
    let case = Case {
        right: second(number(1), u()),
        order: TimeOrder::First,
        conditions: vec![
            at(Side::Low, given(at_low)),
            at(
                Side::High,
                Treatment::Flux { field: FieldId(0), normal_derivative: film.times(u()).negative() },
            ),
        ],
        exact,
        method: Method::Rk4,
        end: Rational::ratio(1, 10),
        step: Rational::ratio(9, 10),
    };
    check_order("slab", &case, [21, 31, 41], 4.0);
}

/// A travelling profile with a given inflow value (method of characteristics, common practice).
#[test]
fn transport_with_inflow() {
    let phase = number(6).times(x().minus(Expression::Time));
    let exact = call(Function::Sin, phase);
    let at_low = exact.rewrite(&mut |node| if node == x() { number(0) } else { node });
    let relation = FaceRelation { coefficients: vec![(FieldId(0), number(1))], data: at_low };
    for method in [Method::Rk4, Method::Lsrk4] {
        let case = Case {
            right: first(u()).negative(),
            order: TimeOrder::First,
            conditions: vec![at(Side::Low, Treatment::Upwind { relations: vec![relation.clone()] })],
            exact: exact.clone(),
            method,
            end: Rational::ratio(1, 2),
            step: Rational::ratio(8, 10),
        };
        check_order("transport", &case, [31, 61, 121], 4.0);
    }
}

/// A wave driven at one end and absorbed at the other (d'Alembert, common practice).
#[test]
fn wave_with_absorbing_end() {
    let exact = call(Function::Sin, number(5).times(x().minus(Expression::Time)));
    let at_low = exact.rewrite(&mut |node| if node == x() { number(0) } else { node });
    let absorbing =
        Treatment::Flux { field: FieldId(0), normal_derivative: Expression::Rate(FieldId(0)).negative() };
    for (method, wanted) in [(Method::Rk4, 4.0), (Method::Leapfrog, 2.0)] {
        let case = Case {
            right: second(number(1), u()),
            order: TimeOrder::Second,
            conditions: vec![at(Side::Low, given(at_low.clone())), at(Side::High, absorbing.clone())],
            exact: exact.clone(),
            method,
            end: Rational::ratio(1, 2),
            step: Rational::ratio(8, 10),
        };
        check_order("wave", &case, [25, 49, 97], wanted);
    }
}
