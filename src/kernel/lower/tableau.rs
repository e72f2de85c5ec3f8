//! Butcher rows of the explicit methods, and data of flux conditions taken at stages as the method would advance them.
//!
//! A flux taken from data at the bare stage times lowers the order of a Runge–Kutta method to about 2.5 (Carpenter, Gottlieb,
//! Abarbanel & Don 1995). Advancing the data themselves, g_i = g(t) + dt Σ_j a_ij g′(t + c_j dt), keeps it.

use super::stage::Lowering;
use super::translate::Binding;
use crate::exact::Rational;
use crate::kernel::{Operation, ValueId};
use crate::model::calculus::{Variable, affine, dependence, partial};
use crate::model::{Expression, Method};
use crate::scheme::step_rule;

/// Row i of a tableau.
#[derive(Clone, Debug)]
pub(super) struct StageRow {
    /// c_i.
    pub(super) fraction: Rational,
    /// (a_ij, c_j) for the earlier stages, zero weights left out.
    pub(super) earlier: Vec<(Rational, Rational)>,
}

/// All rows of a method; leapfrog has none.
pub(super) fn rows(method: Method) -> Vec<StageRow> {
    let r = Rational::ratio;
    let from = |weights: &[&[Rational]], fractions: &[Rational]| -> Vec<StageRow> {
        weights
            .iter()
            .zip(fractions)
            .map(|(row, fraction)| StageRow {
                fraction: fraction.clone(),
                earlier: row
                    .iter()
                    .cloned()
                    .zip(fractions.iter().cloned())
                    .filter(|(weight, _)| !weight.is_zero())
                    .collect(),
            })
            .collect()
    };
    match method {
        Method::Euler => from(&[&[]], &[r(0, 1)]),
        Method::Ssprk3 => from(&[&[], &[r(1, 1)], &[r(1, 4), r(1, 4)]], &[r(0, 1), r(1, 1), r(1, 2)]),
        Method::Rk4 => from(
            &[&[], &[r(1, 2)], &[r(0, 1), r(1, 2)], &[r(0, 1), r(0, 1), r(1, 1)]],
            &[r(0, 1), r(1, 2), r(1, 2), r(1, 1)],
        ),
        Method::Lsrk4 => {
            let rule = step_rule::carpenter_kennedy();
            let weights = low_storage_weights(&rule.a, &rule.b);
            let rows: Vec<&[Rational]> = weights.iter().map(Vec::as_slice).collect();
            from(&rows, &rule.c)
        }
        Method::Leapfrog => Vec::new(),
    }
}

/// a_ij of k ← a k + dt·f, u ← u + b k: what stage i has received of f_j.
fn low_storage_weights(a: &[Rational], b: &[Rational]) -> Vec<Vec<Rational>> {
    let stages = a.len();
    let mut residual = vec![Rational::zero(); stages];
    let mut state = vec![Rational::zero(); stages];
    let mut rows = Vec::new();
    for stage in 0..stages {
        rows.push(state[..stage].to_vec());
        for value in &mut residual {
            *value = &*value * &a[stage];
        }
        residual[stage] = Rational::one();
        for (total, part) in state.iter_mut().zip(&residual) {
            *total = &*total + &(part * &b[stage]);
        }
    }
    rows
}

impl Lowering<'_> {
    /// A correction at a stage: affine parts in the unknowns as they are, data as the method advances them. Corrections that are not
    /// affine, and data with no derivative in time, are taken at the stage's time.
    pub(super) fn correction_value(
        &mut self,
        value: &Expression,
        binding: &Binding,
        row: Option<&StageRow>,
    ) -> ValueId {
        match row.filter(|row| !row.fraction.is_zero()) {
            Some(row) => self.advanced(value, binding, row).unwrap_or_else(|| self.stored(value, binding)),
            None => self.stored(value, binding),
        }
    }

    fn advanced(&mut self, value: &Expression, binding: &Binding, row: &StageRow) -> Option<ValueId> {
        let coefficients = &self.model.coefficients;
        let split = affine(value, coefficients)?;
        if !dependence(&split.rest, coefficients).time {
            return None;
        }
        let slope = partial(&split.rest, Variable::Time, coefficients)?;
        let unknowns = Expression::sum(
            split
                .coefficients
                .into_iter()
                .map(|(variable, weight)| match variable {
                    Variable::Rate(field) => weight.times(Expression::Rate(field)),
                    Variable::Field(field) => weight.times(Expression::Field(field)),
                    Variable::Coordinate(_) | Variable::Time => Expression::zero(),
                })
                .collect::<Vec<_>>(),
        );
        let shifted = |shift: Rational| Binding { shift, ..binding.clone() };
        let mut data = self.value(&split.rest, &shifted(-&row.fraction));
        for (weight, fraction) in &row.earlier {
            let rate = self.value(&slope, &shifted(fraction - &row.fraction));
            let weight = self.builder.literal(weight.clone());
            let step = self.builder.value(Operation::Step);
            let length = self.builder.multiply(weight, step);
            let change = self.builder.multiply(length, rate);
            data = self.builder.add(data, change);
        }
        let unknowns = self.value(&unknowns, binding);
        let total = self.builder.add(unknowns, data);
        Some(self.builder.stored(total))
    }
}
