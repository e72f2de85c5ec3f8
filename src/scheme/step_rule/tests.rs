//! Order conditions: what holds exactly, what holds to published digits, what is refused.

use super::*;
use crate::exact::{factorial, round};

fn rule(method: Method) -> StepRule {
    StepRule::of(method).expect("one step")
}

#[test]
fn methods_have_their_orders() {
    let found: Vec<(usize, usize)> = [Method::Euler, Method::Ssprk3, Method::Rk4, Method::Lsrk4]
        .into_iter()
        .map(|method| (rule(method).order(), rule(method).stages()))
        .collect();
    assert_eq!(found, [(1, 1), (3, 3), (4, 4), (4, 5)]);
    assert!(StepRule::of(Method::Leapfrog).is_none());
    for method in [Method::Euler, Method::Ssprk3, Method::Rk4] {
        assert_eq!(*rule(method).accuracy(), Accuracy::Exact);
    }
}

/// The tableau of the three-stage method (Gottlieb, Shu & Tadmor 2001, from memory): b = (1, 1, 4)/6, c = (0, 1, 1/2).
#[test]
fn convex_form_unrolls_to_its_tableau() {
    let r = Rational::ratio;
    let three = rule(Method::Ssprk3);
    assert_eq!(three.tableau().a, [vec![], vec![r(1, 1)], vec![r(1, 4), r(1, 4)]]);
    assert_eq!(three.tableau().b, [r(1, 6), r(1, 6), r(2, 3)]);
    assert_eq!(three.tableau().c, [r(0, 1), r(1, 1), r(1, 2)]);
}

/// No order higher than the one claimed, so that a claim too modest would be seen.
#[test]
fn claims_are_sharp() {
    for (form, order) in [(rule(Method::Euler).form, 1), (rule(Method::Ssprk3).form, 3)] {
        let above = StepRule::new(form, order + 1, Accuracy::Exact);
        assert!(matches!(above, Err(StepRuleFault::Condition { .. })), "{above:?}");
    }
    let fifth = StepRule::new(rule(Method::Rk4).form, 5, Accuracy::Exact);
    assert_eq!(fifth, Err(StepRuleFault::OrderNotCovered { order: 5 }));
}

/// The rationals as published are rounded: they are of fourth order to 10⁻²⁴, and not exactly.
#[test]
fn published_rationals_are_rounded() {
    let exactly = StepRule::new(Form::LowStorage(carpenter_kennedy()), 4, Accuracy::Exact);
    assert!(exactly.is_err());
    let low = rule(Method::Lsrk4);
    assert!(matches!(low.accuracy(), Accuracy::Published { .. }));
    let worst = low
        .tableau()
        .conditions(4)
        .iter()
        .map(|(_, excess)| round::nearest(&excess.abs()))
        .fold(0.0_f64, f64::max);
    assert!(worst > 0.0 && worst < 1e-25, "{worst:e}");
}

/// One digit of one coefficient changed is caught by the tolerance.
#[test]
fn a_wrong_digit_is_caught() {
    let mut wrong = carpenter_kennedy();
    wrong.b[2] = Rational::ratio(1_720_146_321_548, 2_090_206_949_498);
    let tolerance = published_tolerance();
    assert!(StepRule::new(Form::LowStorage(wrong), 4, Accuracy::Published { tolerance }).is_err());
    let mut late = classical();
    late.c[1] = Rational::ratio(1, 3);
    let found = StepRule::new(Form::Tableau(late), 4, Accuracy::Exact);
    assert!(matches!(found, Err(StepRuleFault::StageTime { stage: 1, .. })), "{found:?}");
    let mut short = classical();
    short.b.pop();
    assert_eq!(StepRule::new(Form::Tableau(short), 4, Accuracy::Exact), Err(StepRuleFault::Shape));
    let mut leaking = shu_osher();
    leaking.kept[1][0] = Rational::ratio(1, 2);
    assert_eq!(StepRule::new(Form::ShuOsher(leaking), 3, Accuracy::Exact), Err(StepRuleFault::Shape));
}

/// The three-stage low-storage method (Williamson 1980) is exactly of third order.
#[test]
fn another_low_storage_method_is_exact() {
    let r = Rational::ratio;
    let williamson = LowStorage {
        a: vec![r(0, 1), r(-5, 9), r(-153, 128)],
        b: vec![r(1, 3), r(15, 16), r(8, 15)],
        c: vec![r(0, 1), r(1, 3), r(3, 4)],
    };
    let rule = StepRule::new(Form::LowStorage(williamson), 3, Accuracy::Exact).expect("of third order");
    assert_eq!(rule.stability_polynomial(), [r(1, 1), r(1, 1), r(1, 2), r(1, 6)]);
}

/// With as many stages as its order, R is the Taylor polynomial; the fifth coefficient of the low-storage method is 1/200.
#[test]
fn stability_polynomials() {
    for (method, degree) in [(Method::Euler, 1), (Method::Ssprk3, 3), (Method::Rk4, 4)] {
        let taylor: Vec<Rational> =
            (0..=degree).map(|power| factorial(power).recip().expect("not nought")).collect();
        assert_eq!(rule(method).stability_polynomial(), taylor);
    }
    let low = rule(Method::Lsrk4).stability_polynomial();
    assert_eq!(low.len(), 6);
    for (power, coefficient) in low.iter().enumerate().take(5) {
        let excess = coefficient * &factorial(power) - Rational::one();
        assert!(round::nearest(&excess).abs() < 1e-23, "{power}");
    }
    assert!((round::nearest(&low[5]) - 0.005).abs() < 1e-14);
}
