//! One condition as written, taken apart: which fields, rates and normal derivatives it names.
//!
//! Normal derivatives are read as fields beyond the model's own (field u has its normal derivative at index n + u), so that
//! the calculus of affine expressions serves them too. Classification is not here.

use super::RawCondition;
use crate::diagnostic::{Diagnostic, codes_conditions as codes};
use crate::model::calculus::{Dependence, Variable, dependence, partial};
use crate::model::characteristics::sign_at;
use crate::model::expression::DerivativeKind;
use crate::model::sign::Sign;
use crate::model::{Expression, Face, FieldId, Model, Side};
use std::collections::BTreeSet;

/// What a condition names, and its two sides with normal derivatives as further fields.
pub(super) struct Reading {
    left: Expression,
    right: Expression,
    pub(super) fields: BTreeSet<FieldId>,
    pub(super) rates: BTreeSet<FieldId>,
    pub(super) normals: BTreeSet<FieldId>,
}

/// The variable that stands for ∂field/∂n in a reading.
pub(super) fn normal(model: &Model, field: FieldId) -> FieldId {
    FieldId(model.fields.len() + field.0)
}

impl Reading {
    /// Takes a condition apart; a fault where it holds derivatives other than ∂u/∂n.
    pub(super) fn of(model: &Model, raw: &RawCondition) -> Result<Reading, Diagnostic> {
        let left = with_normals(model, &raw.left, raw.face);
        let right = with_normals(model, &raw.right, raw.face);
        let found = dependence(&left.clone().minus(right.clone()), &model.coefficients);
        if found.derivatives {
            return Err(Diagnostic::error(
                codes::DERIVATIVE_IN_CONDITION,
                raw.span,
                "a condition may hold the outward normal derivative of a field, and no other derivative",
            )
            .with_text("expected ∂u/∂n of a field u")
            .with_remedy(
                "write the condition with ∂u/∂n, the derivative of one field along the outward normal",
            ));
        }
        let count = model.fields.len();
        let (normals, fields): (BTreeSet<FieldId>, BTreeSet<FieldId>) =
            found.fields.iter().partition(|field| field.0 >= count);
        let normals = normals.into_iter().map(|field| FieldId(field.0 - count)).collect();
        Ok(Reading { left, right, fields, rates: found.rates, normals })
    }

    /// left − right.
    fn residual(&self) -> Expression {
        self.left.clone().minus(self.right.clone())
    }

    /// Factor of a variable in left − right; `None` where the condition is not affine in it.
    pub(super) fn factor(&self, model: &Model, variable: FieldId) -> Option<Expression> {
        let slope = partial(&self.residual(), Variable::Field(variable), &model.coefficients)?;
        (!on_state(&dependence(&slope, &model.coefficients))).then_some(slope)
    }

    /// right − left with the given variables set to zero: what the sum of factors times variables equals.
    pub(super) fn remainder(&self, variables: &[FieldId]) -> Expression {
        let without = |side: &Expression| {
            side.rewrite(&mut |node| match &node {
                Expression::Field(field) if variables.contains(field) => Expression::zero(),
                _ => node,
            })
        };
        without(&self.right).minus(without(&self.left))
    }

    /// The condition solved for one variable; a fault where its factor depends on the state or may vanish.
    pub(super) fn solved_for(
        &self,
        model: &Model,
        raw: &RawCondition,
        variable: FieldId,
        name: &str,
    ) -> Result<Expression, Diagnostic> {
        let refuse = |why: String| {
            Diagnostic::error(
                codes::NOT_SOLVABLE,
                raw.span,
                format!("the condition cannot be solved for {name}: {why}"),
            )
            .with_text(format!("expected {name} times a factor that is known and nowhere zero"))
            .with_remedy(format!(
                "write it as {name} = …, or bound what stands in the factor with `between A and B`"
            ))
        };
        let Some(factor) = self.factor(model, variable) else {
            return Err(refuse(format!("it is not linear in {name}, or the factor depends on an unknown")));
        };
        match sign_at(&factor, model, raw.face) {
            Sign::Positive | Sign::Negative => Ok(self.remainder(&[variable]).over(factor)),
            Sign::Zero => Err(refuse(format!("{name} drops out"))),
            _ => {
                let shown = crate::model::formula::formula(&factor, model);
                Err(refuse(format!("its factor {shown} may vanish on the face")))
            }
        }
    }
}

fn on_state(found: &Dependence) -> bool {
    !found.fields.is_empty() || !found.rates.is_empty() || found.derivatives
}

/// ∂u/∂n, and ∂u/∂x at a face of x, as the variable that stands for it.
fn with_normals(model: &Model, expression: &Expression, face: Face) -> Expression {
    expression.rewrite(&mut |node| match &node {
        Expression::Normal(of) => match &**of {
            Expression::Field(field) => Expression::Field(normal(model, *field)),
            _ => node,
        },
        Expression::Derivative(derivative) => match &derivative.kind {
            DerivativeKind::First { axis, of: Expression::Field(field) } if *axis == face.axis => {
                let along = Expression::Field(normal(model, *field));
                if face.side == Side::High { along } else { along.negative() }
            }
            _ => node,
        },
        _ => node,
    })
}
