//! From a checked model to its spatial scheme: which operator stands for which derivative, and what each face does.
//!
//! The three moves at a face are those of the summation-by-parts identity: a given flux replaces the boundary flux, the
//! flux of the upwind state replaces that of the inside, a given value is set. Deriving weights is not done here.

use super::NotAvailable;
use super::choose::{AxisPlan, plan_axes};
use super::face;
use super::split::split_first;
use crate::exact::Rational;
use crate::model::calculus::{DerivativeTerm, dependence, derivative_terms};
use crate::model::expression::{Derivative, DerivativeKind};
use crate::model::{AxisId, Equation, Expression, FieldId, Model};
use crate::scheme::{Application, OperatorRule, Scheme, SchemeAxis, SchemeOperator};

/// Discretizes a model in space.
pub fn assemble(model: &Model) -> Result<Scheme, Vec<NotAvailable>> {
    let plans = plan_axes(model)?;
    let mut assembly = Assembly {
        model,
        plans: &plans,
        operators: Vec::new(),
        applications: Vec::new(),
        choices: Vec::new(),
    };
    assembly.choices.extend(plans.iter().zip(&model.axes).map(|(plan, axis)| plan.describe(axis)));
    let mut rates = Vec::new();
    for equation in &model.equations {
        rates.push(assembly.rate(equation)?);
    }
    let mut outputs = Vec::new();
    for output in &model.outputs {
        outputs.push(assembly.replace(&observed(&output.value))?);
    }
    let corrections = face::corrections(model, &plans);
    let injections = face::injections(model);
    let interpolation = plans.iter().map(|plan| interpolation_nodes(plan.solution_order)).max().unwrap_or(2);
    let least: Vec<usize> =
        (0..model.axes.len()).map(|axis| assembly.least_nodes(AxisId(axis)).max(interpolation)).collect();
    let Assembly { operators, applications, choices, .. } = assembly;
    let axes = plans
        .into_iter()
        .zip(least)
        .map(|(plan, least_nodes)| SchemeAxis {
            half_order: plan.half_order,
            norm: plan.norm,
            least_nodes,
            solution_order: plan.solution_order,
        })
        .collect();
    Ok(Scheme {
        axes,
        interpolation_nodes: interpolation,
        operators,
        applications,
        rates,
        outputs,
        corrections,
        injections,
        choices,
    })
}

/// Operators and applications found so far.
pub(super) struct Assembly<'a> {
    pub(super) model: &'a Model,
    plans: &'a [AxisPlan],
    operators: Vec<SchemeOperator>,
    applications: Vec<Application>,
    pub(super) choices: Vec<String>,
}

impl Assembly<'_> {
    /// The right side with `Applied` for derivatives. Where it is linear in them, terms are taken one by one, so that
    /// transport by a varying speed can be split; otherwise each derivative is replaced where it stands.
    fn rate(&mut self, equation: &Equation) -> Result<Expression, Vec<NotAvailable>> {
        let Some((terms, rest)) = derivative_terms(&equation.right) else {
            return self.replace(&equation.right);
        };
        let mut parts = Vec::new();
        for term in terms {
            parts.push(self.term(equation.field, term)?);
        }
        parts.push(rest);
        Ok(Expression::sum(parts))
    }

    fn term(&mut self, field: FieldId, term: DerivativeTerm) -> Result<Expression, Vec<NotAvailable>> {
        if let DerivativeKind::First { axis, of } = &term.derivative.kind
            && let Some(split) = split_first(self.model, field, *axis, &term.factor, of)
        {
            self.choices.push(split.reason);
            let mut parts = vec![split.rest];
            for (factor, argument) in split.terms {
                let applied = self.first(*axis, argument)?;
                parts.push(factor.times(applied));
            }
            return Ok(Expression::sum(parts));
        }
        let applied = self.derivative(&term.derivative.kind)?;
        Ok(term.factor.times(applied))
    }

    /// Every derivative inside replaced by its application.
    fn replace(&mut self, expression: &Expression) -> Result<Expression, Vec<NotAvailable>> {
        let mut faults = Vec::new();
        let replaced = expression.rewrite(&mut |node| match &node {
            Expression::Derivative(derivative) => match self.derivative(&derivative.kind) {
                Ok(applied) => applied,
                Err(more) => {
                    faults.extend(more);
                    node
                }
            },
            _ => node,
        });
        if faults.is_empty() { Ok(replaced) } else { Err(faults) }
    }

    fn derivative(&mut self, kind: &DerivativeKind) -> Result<Expression, Vec<NotAvailable>> {
        match kind {
            DerivativeKind::First { axis, of } => {
                let of = self.replace(of)?;
                self.first(*axis, of)
            }
            DerivativeKind::Second { axis, coefficient, of } => {
                let of = self.replace(of)?;
                let coefficient = self.replace(coefficient)?;
                self.second(*axis, coefficient, of)
            }
            DerivativeKind::Mixed { outer, inner, coefficient, of } => {
                let of = self.replace(of)?;
                let coefficient = self.replace(coefficient)?;
                let inner = self.first(*inner, of)?;
                self.first(*outer, coefficient.times(inner))
            }
            DerivativeKind::Higher { axis, degree, of } => {
                let of = self.replace(of)?;
                let plan = &self.plans[axis.0];
                let operator = super::centred::operator(*degree, plan.interior_order())?;
                let name = format!(
                    "derivative_{degree}_{}_order_{}",
                    self.model.axes[axis.0].name,
                    plan.interior_order()
                );
                let applied = self.applied(name, OperatorRule::Centred(operator), *axis, of, None);
                Ok(applied.times(scale(*axis, *degree)))
            }
        }
    }

    /// D1 of a pointwise expression; factors that are the same along the axis at all times stay outside.
    fn first(&mut self, axis: AxisId, of: Expression) -> Result<Expression, Vec<NotAvailable>> {
        let (outside, of) = self.constant_factors(of);
        let plan = &self.plans[axis.0];
        let rule = plan.first_derivative()?;
        let name = format!("first_{}_order_{}", self.model.axes[axis.0].name, plan.interior_order());
        let applied = self.applied(name, rule, axis, of, None);
        Ok(Expression::product([outside, applied, scale(axis, 1)]))
    }

    fn second(
        &mut self,
        axis: AxisId,
        coefficient: Expression,
        of: Expression,
    ) -> Result<Expression, Vec<NotAvailable>> {
        let plan = &self.plans[axis.0];
        let (outside, of) = self.constant_factors(of);
        let found = dependence(&coefficient, &self.model.coefficients);
        let name = &self.model.axes[axis.0].name;
        let order = plan.interior_order();
        if !found.coordinates.contains(&axis) && !found.on_state() && !found.noise {
            let rule = plan.second_derivative()?;
            let applied = self.applied(format!("second_{name}_order_{order}"), rule, axis, of, None);
            return Ok(Expression::product([outside, coefficient, applied, scale(axis, 2)]));
        }
        let rule = plan.varying_second_derivative()?;
        let (factor, coefficient) = self.constant_factors(coefficient);
        let applied =
            self.applied(format!("varying_second_{name}_order_{order}"), rule, axis, of, Some(coefficient));
        Ok(Expression::product([outside, factor, applied, scale(axis, 2)]))
    }

    /// Splits off factors that are one number for the whole grid at all times.
    fn constant_factors(&self, expression: Expression) -> (Expression, Expression) {
        let (outside, inside): (Vec<_>, Vec<_>) = crate::model::expression::factors(expression)
            .into_iter()
            .partition(|factor| dependence(factor, &self.model.coefficients).is_constant());
        if inside.is_empty() {
            // The derivative of a constant: keep the constant inside, the operator gives zero.
            return (Expression::one(), Expression::product(outside));
        }
        (Expression::product(outside), Expression::product(inside))
    }

    fn applied(
        &mut self,
        name: String,
        rule: OperatorRule,
        axis: AxisId,
        of: Expression,
        coefficient: Option<Expression>,
    ) -> Expression {
        let operator = match self.operators.iter().position(|known| known.name == name) {
            Some(known) => known,
            None => {
                self.operators.push(SchemeOperator { name, rule });
                self.operators.len() - 1
            }
        };
        let application = Application { operator, axis, of, coefficient };
        let index = match self.applications.iter().position(|known| *known == application) {
            Some(known) => known,
            None => {
                self.applications.push(application);
                self.applications.len() - 1
            }
        };
        Expression::Applied(index)
    }

    fn least_nodes(&self, axis: AxisId) -> usize {
        let used = self.applications.iter().filter(|application| application.axis == axis);
        let norm = self.plans[axis.0].norm.map_or(0, |norm| 2 * norm.left().len());
        used.map(|application| self.operators[application.operator].rule.least_nodes())
            .max()
            .unwrap_or(2)
            .max(norm)
    }
}

/// Second derivatives as two first derivatives: what is observed has no condition to replace its boundary flux with, and the
/// first derivative is consistent at every node.
fn observed(value: &Expression) -> Expression {
    value.rewrite(&mut |node| {
        let Expression::Derivative(derivative) = &node else { return node };
        let DerivativeKind::Second { axis, coefficient, of } = &derivative.kind else { return node };
        let first = |of: Expression| {
            Expression::Derivative(Box::new(Derivative {
                kind: DerivativeKind::First { axis: *axis, of },
                order: derivative.order,
            }))
        };
        first(coefficient.clone().times(first(of.clone())))
    })
}

/// An even number of nodes, two more than the order of the solution: the error of a gauge between nodes stays below the solution's.
fn interpolation_nodes(solution_order: usize) -> usize {
    solution_order.div_ceil(2) * 2 + 2
}

/// 1/spacingᵈ.
fn scale(axis: AxisId, degree: usize) -> Expression {
    Expression::InverseSpacing(axis).power(Rational::from(degree as i64))
}
