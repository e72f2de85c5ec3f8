//! [`StepRule`]: an explicit one-step method with its order of accuracy proved, or checked to the stated number of digits.
//!
//! Holds coefficients in the form in which a solver steps, the tableau that follows from it, and the order conditions up to the
//! fourth. Where a rule is stable is said in [`crate::analysis::stability`].

use std::fmt;

use crate::exact::Rational;
use crate::model::Method;

/// A 2N-storage Runge–Kutta method: k ← a k + dt·rate, u ← u + b k, at times c.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct LowStorage {
    pub a: Vec<Rational>,
    pub b: Vec<Rational>,
    pub c: Vec<Rational>,
}

/// Stages as combinations of earlier ones and forward steps from them: u_{i+1} = Σ_{k ≤ i} (kept_ik u_k + stepped_ik dt f(u_k)),
/// u_0 the old value and the last one the new.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ShuOsher {
    pub kept: Vec<Vec<Rational>>,
    pub stepped: Vec<Vec<Rational>>,
}

/// An explicit Butcher tableau; row i of `a` has i entries.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Tableau {
    pub a: Vec<Vec<Rational>>,
    pub b: Vec<Rational>,
    pub c: Vec<Rational>,
}

/// The form in which a method is carried out.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Form {
    Tableau(Tableau),
    ShuOsher(ShuOsher),
    LowStorage(LowStorage),
}

/// How well the order conditions hold.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Accuracy {
    /// As equations of rationals.
    Exact,
    /// The published rationals are rounded: every condition holds to this tolerance only.
    Published { tolerance: Rational },
}

/// Why coefficients are not a method of the claimed order.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum StepRuleFault {
    /// Lists of coefficients do not belong together.
    Shape,
    /// Conditions are known here for orders one to four.
    OrderNotCovered { order: usize },
    /// A stage is taken at another time than its weights say (their sum less the stated time).
    StageTime { stage: usize, excess: Box<Rational> },
    /// An order condition fails by this excess.
    Condition { condition: &'static str, excess: Box<Rational> },
}

/// An explicit one-step method whose order conditions have been checked.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct StepRule {
    form: Form,
    tableau: Tableau,
    order: usize,
    accuracy: Accuracy,
}

impl StepRule {
    /// Checks stage times and all order conditions up to `order`, exactly or to the stated tolerance.
    pub fn new(form: Form, order: usize, accuracy: Accuracy) -> Result<StepRule, StepRuleFault> {
        let tableau = form.tableau().ok_or(StepRuleFault::Shape)?;
        if !(1..=4).contains(&order) {
            return Err(StepRuleFault::OrderNotCovered { order });
        }
        let holds = |excess: &Rational| match &accuracy {
            Accuracy::Exact => excess.is_zero(),
            Accuracy::Published { tolerance } => excess.abs() <= *tolerance,
        };
        for (stage, (row, time)) in tableau.a.iter().zip(&tableau.c).enumerate() {
            let excess = row.iter().sum::<Rational>() - time;
            if !holds(&excess) {
                return Err(StepRuleFault::StageTime { stage, excess: Box::new(excess) });
            }
        }
        for (condition, excess) in tableau.conditions(order) {
            if !holds(&excess) {
                return Err(StepRuleFault::Condition { condition, excess: Box::new(excess) });
            }
        }
        Ok(StepRule { form, tableau, order, accuracy })
    }

    /// The rule of a method; nothing for leapfrog, which is of two steps.
    pub fn of(method: Method) -> Option<StepRule> {
        let (form, order, accuracy) = match method {
            Method::Euler => (Form::Tableau(euler()), 1, Accuracy::Exact),
            Method::Ssprk3 => (Form::ShuOsher(shu_osher()), 3, Accuracy::Exact),
            Method::Rk4 => (Form::Tableau(classical()), 4, Accuracy::Exact),
            Method::Lsrk4 => {
                let tolerance = published_tolerance();
                (Form::LowStorage(carpenter_kennedy()), 4, Accuracy::Published { tolerance })
            }
            Method::Leapfrog => return None,
        };
        Some(StepRule::new(form, order, accuracy).expect("the coefficients in this file meet their order"))
    }

    /// The form in which the method is carried out.
    pub fn form(&self) -> &Form {
        &self.form
    }

    /// The tableau that follows from the form.
    pub fn tableau(&self) -> &Tableau {
        &self.tableau
    }

    /// The order of accuracy in time.
    pub fn order(&self) -> usize {
        self.order
    }

    /// How well the order conditions hold.
    pub fn accuracy(&self) -> &Accuracy {
        &self.accuracy
    }

    /// How many evaluations of the rate a step takes.
    pub fn stages(&self) -> usize {
        self.tableau.b.len()
    }

    /// R(z) with u_{n+1} = R(dt λ) u_n for u' = λ u, by ascending powers: 1 + Σ_k (b A^{k−1} 1) z^k.
    pub fn stability_polynomial(&self) -> Vec<Rational> {
        let Tableau { a, b, .. } = &self.tableau;
        let mut polynomial = vec![Rational::one()];
        let mut powers = vec![Rational::one(); b.len()];
        for _ in 0..b.len() {
            polynomial.push(Rational::dot(b, &powers));
            powers = a.iter().map(|row| Rational::dot(row, &powers)).collect();
        }
        polynomial
    }
}

impl Form {
    /// The tableau; nothing where lists do not belong together.
    fn tableau(&self) -> Option<Tableau> {
        match self {
            Form::Tableau(tableau) => tableau.is_explicit().then(|| tableau.clone()),
            Form::ShuOsher(form) => form.tableau(),
            Form::LowStorage(form) => form.tableau(),
        }
    }
}

impl Tableau {
    fn is_explicit(&self) -> bool {
        let stages = self.b.len();
        let lower = self.a.iter().enumerate().all(|(stage, row)| row.len() == stage);
        stages > 0 && self.a.len() == stages && self.c.len() == stages && lower
    }

    /// Stages from rows of weights on the rates, the last row being b; times are the sums.
    fn from_rows(mut rows: Vec<Vec<Rational>>) -> Option<Tableau> {
        let b = rows.pop()?;
        for (stage, row) in rows.iter_mut().enumerate() {
            row.truncate(stage);
        }
        let c = rows.iter().map(|row| row.iter().sum()).collect();
        let tableau = Tableau { a: rows, b, c };
        tableau.is_explicit().then_some(tableau)
    }

    /// Left side less right side of each condition up to the order (one for each rooted tree; Butcher 1963, common practice).
    fn conditions(&self, order: usize) -> Vec<(&'static str, Rational)> {
        let Tableau { a, b, c } = self;
        let times = |left: &[Rational], right: &[Rational]| -> Vec<Rational> {
            left.iter().zip(right).map(|(left, right)| left * right).collect()
        };
        let apply = |vector: &[Rational]| -> Vec<Rational> {
            a.iter().map(|row| Rational::dot(row, vector)).collect()
        };
        let ones = vec![Rational::one(); b.len()];
        let squares = times(c, c);
        let inner = apply(c);
        let all = [
            (1, "Σ b = 1", ones, 1),
            (2, "Σ b c = 1/2", c.clone(), 2),
            (3, "Σ b c² = 1/3", squares.clone(), 3),
            (3, "Σ b A c = 1/6", inner.clone(), 6),
            (4, "Σ b c³ = 1/4", times(c, &squares), 4),
            (4, "Σ b c A c = 1/8", times(c, &inner), 8),
            (4, "Σ b A c² = 1/12", apply(&squares), 12),
            (4, "Σ b A A c = 1/24", apply(&inner), 24),
        ];
        all.into_iter()
            .filter(|(needed_from, ..)| *needed_from <= order)
            .map(|(_, name, vector, below)| (name, Rational::dot(b, &vector) - Rational::ratio(1, below)))
            .collect()
    }
}

impl ShuOsher {
    /// Unrolls the stages. The kept parts of each must sum to one.
    fn tableau(&self) -> Option<Tableau> {
        let stages = self.kept.len();
        let mut rows = vec![vec![Rational::zero(); stages]];
        for (stage, (kept, stepped)) in self.kept.iter().zip(&self.stepped).enumerate() {
            let fits = kept.len() == stage + 1 && stepped.len() == stage + 1;
            if !fits || !kept.iter().sum::<Rational>().is_one() {
                return None;
            }
            let mut row = stepped.clone();
            row.resize(stages, Rational::zero());
            for (weight, earlier) in kept.iter().zip(&rows) {
                for (total, part) in row.iter_mut().zip(earlier) {
                    *total += weight * part;
                }
            }
            rows.push(row);
        }
        (self.stepped.len() == stages).then(|| Tableau::from_rows(rows)).flatten()
    }
}

impl LowStorage {
    /// What u has received of each rate before each stage. The stated times are kept.
    fn tableau(&self) -> Option<Tableau> {
        let stages = self.b.len();
        if self.a.len() != stages || self.c.len() != stages {
            return None;
        }
        let mut residual = vec![Rational::zero(); stages];
        let mut rows = vec![vec![Rational::zero(); stages]];
        for (stage, (keep, weight)) in self.a.iter().zip(&self.b).enumerate() {
            residual.iter_mut().for_each(|value| *value *= keep);
            residual[stage] += Rational::one();
            let received: Vec<Rational> =
                rows[stage].iter().zip(&residual).map(|(old, part)| old + weight * part).collect();
            rows.push(received);
        }
        Some(Tableau { c: self.c.clone(), ..Tableau::from_rows(rows)? })
    }
}

fn euler() -> Tableau {
    Tableau { a: vec![Vec::new()], b: vec![Rational::one()], c: vec![Rational::zero()] }
}

/// The classical method of four stages (Kutta 1901, common practice).
fn classical() -> Tableau {
    let r = Rational::ratio;
    Tableau {
        a: vec![vec![], vec![r(1, 2)], vec![r(0, 1), r(1, 2)], vec![r(0, 1), r(0, 1), r(1, 1)]],
        b: vec![r(1, 6), r(1, 3), r(1, 3), r(1, 6)],
        c: vec![r(0, 1), r(1, 2), r(1, 2), r(1, 1)],
    }
}

/// Three stages, third order, convex combinations of forward steps (Shu & Osher 1988).
pub fn shu_osher() -> ShuOsher {
    let r = Rational::ratio;
    ShuOsher {
        kept: vec![vec![r(1, 1)], vec![r(3, 4), r(1, 4)], vec![r(1, 3), r(0, 1), r(2, 3)]],
        stepped: vec![vec![r(1, 1)], vec![r(0, 1), r(1, 4)], vec![r(0, 1), r(0, 1), r(2, 3)]],
    }
}

/// Five stages, fourth order (Carpenter & Kennedy 1994, NASA TM 109112).
pub fn carpenter_kennedy() -> LowStorage {
    let list =
        |pairs: [(i64, i64); 5]| pairs.iter().map(|(above, below)| Rational::ratio(*above, *below)).collect();
    LowStorage {
        a: list([
            (0, 1),
            (-567_301_805_773, 1_357_537_059_087),
            (-2_404_267_990_393, 2_016_746_695_238),
            (-3_550_918_686_646, 2_091_501_179_385),
            (-1_275_806_237_668, 842_570_457_699),
        ]),
        b: list([
            (1_432_997_174_477, 9_575_080_441_755),
            (5_161_836_677_717, 13_612_068_292_357),
            (1_720_146_321_549, 2_090_206_949_498),
            (3_134_564_353_537, 4_481_467_310_338),
            (2_277_821_191_437, 14_882_151_754_819),
        ]),
        c: list([
            (0, 1),
            (1_432_997_174_477, 9_575_080_441_755),
            (2_526_269_341_429, 6_820_363_962_896),
            (2_006_345_519_317, 3_224_310_063_776),
            (2_802_321_613_138, 2_924_317_926_251),
        ]),
    }
}

/// To what the thirteen-digit rationals of [`carpenter_kennedy`] meet times and order conditions: 10⁻²⁴.
fn published_tolerance() -> Rational {
    Rational::ratio(1, 1_000_000_000_000).power(2)
}

impl fmt::Display for StepRuleFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            StepRuleFault::Shape => write!(formatter, "the coefficients are not those of an explicit method"),
            StepRuleFault::OrderNotCovered { order } => {
                write!(formatter, "order {order} is not among those whose conditions are known here, 1 to 4")
            }
            StepRuleFault::StageTime { stage, excess } => {
                write!(formatter, "the weights of stage {stage} differ from its time by {excess}")
            }
            StepRuleFault::Condition { condition, excess } => {
                write!(formatter, "the order condition {condition} fails by {excess}")
            }
        }
    }
}

impl std::error::Error for StepRuleFault {}

#[cfg(test)]
mod tests;
