//! Which order each axis gets, so that the solution converges at the order that was asked for.
//!
//! With energy-stable closures of interior order 2p the solution of a problem with first derivatives converges at p + 1, one with
//! second derivatives only at min(2p, p + 2) (Svärd & Nordström 2006, from memory; measured for every order offered).
//! All operators of an axis share one norm, because the energy estimate of a sum of terms needs one: the axis takes the
//! largest half order that any of its derivatives needs.

use super::{NotAvailable, centred, closure};
use crate::exact::Rational;
use crate::model::expression::DerivativeKind;
use crate::model::{AskedOrder, Axis, AxisId, Expression, Model};
use crate::scheme::{Norm, OperatorRule};

/// The decision for one axis.
#[derive(Clone, Debug)]
pub(super) struct AxisPlan {
    pub(super) half_order: usize,
    pub(super) periodic: bool,
    pub(super) norm: Option<&'static Norm>,
    pub(super) solution_order: usize,
    first: bool,
    second: bool,
}

/// Plans for all axes, or everything that cannot be had.
pub(super) fn plan_axes(model: &Model) -> Result<Vec<AxisPlan>, Vec<NotAvailable>> {
    let mut plans = Vec::new();
    let mut faults = Vec::new();
    for (index, axis) in model.axes.iter().enumerate() {
        match plan_axis(model, AxisId(index), axis) {
            Ok(plan) => plans.push(plan),
            Err(fault) => faults.push(fault),
        }
    }
    if faults.is_empty() { Ok(plans) } else { Err(faults) }
}

fn plan_axis(model: &Model, id: AxisId, axis: &Axis) -> Result<AxisPlan, NotAvailable> {
    let used = Used::along(model, id);
    let asked = model.accuracy.per_axis[id.0];
    let half_order = match (asked, axis.periodic) {
        (AskedOrder::Interior(order), _) | (AskedOrder::Solution(order), true) => order.div_ceil(2),
        (AskedOrder::Solution(order), false) => used.half_order(order),
    }
    .max(1)
    .max(used.asked.div_ceil(2));
    if axis.periodic {
        centred::operator(1, 2 * half_order)?;
        return Ok(AxisPlan {
            half_order,
            periodic: true,
            norm: None,
            solution_order: 2 * half_order,
            first: used.first,
            second: used.second,
        });
    }
    let norm = closure::first_derivative(2 * half_order)
        .map_err(|fault| NotAvailable::closure(axis, asked, used.reachable(), fault))?
        .norm();
    Ok(AxisPlan {
        half_order,
        periodic: false,
        norm: Some(norm),
        solution_order: used.solution_order(half_order),
        first: used.first,
        second: used.second,
    })
}

/// Which derivatives act along an axis.
#[derive(Clone, Copy, Debug, Default)]
struct Used {
    first: bool,
    second: bool,
    /// The largest interior order that an operator asked for.
    asked: usize,
}

impl Used {
    fn along(model: &Model, axis: AxisId) -> Used {
        let mut used = Used::default();
        for equation in &model.equations {
            used.visit(&equation.right, axis);
        }
        used
    }

    fn visit(&mut self, expression: &Expression, axis: AxisId) {
        if let Expression::Derivative(derivative) = expression {
            let here = match &derivative.kind {
                DerivativeKind::First { axis: along, .. } if *along == axis => {
                    self.first = true;
                    true
                }
                DerivativeKind::Second { axis: along, .. } if *along == axis => {
                    self.second = true;
                    true
                }
                DerivativeKind::Mixed { outer, inner, .. } if *outer == axis || *inner == axis => {
                    self.first = true;
                    true
                }
                DerivativeKind::Higher { axis: along, .. } => *along == axis,
                _ => false,
            };
            if here {
                self.asked = self.asked.max(derivative.order.unwrap_or(0));
            }
        }
        for child in expression.children() {
            self.visit(child, axis);
        }
    }

    /// The highest order of the solution that the offered closures reach.
    fn reachable(self) -> usize {
        closure::closed_orders().iter().map(|order| self.solution_order(order / 2)).max().unwrap_or(1)
    }

    /// The least p whose closures let the solution converge at `order`.
    fn half_order(self, order: usize) -> usize {
        (1..=order.max(1)).find(|p| self.solution_order(*p) >= order).unwrap_or(order)
    }

    fn solution_order(self, p: usize) -> usize {
        let first = p + 1;
        let second = (2 * p).min(p + 2);
        match (self.first, self.second) {
            (true, true) => first.min(second),
            (true, false) => first,
            _ => second,
        }
    }
}

impl AxisPlan {
    pub(super) fn interior_order(&self) -> usize {
        2 * self.half_order
    }

    pub(super) fn face_weight(&self) -> Rational {
        self.norm.as_ref().and_then(|norm| norm.left().first().cloned()).unwrap_or_else(|| Rational::from(1))
    }

    pub(super) fn first_derivative(&self) -> Result<OperatorRule, Vec<NotAvailable>> {
        if self.periodic {
            return Ok(OperatorRule::Centred(centred::operator(1, self.interior_order())?));
        }
        Ok(OperatorRule::First(closure::first_derivative(self.interior_order())?))
    }

    pub(super) fn second_derivative(&self) -> Result<OperatorRule, Vec<NotAvailable>> {
        if self.periodic {
            return Ok(OperatorRule::Centred(centred::operator(2, self.interior_order())?));
        }
        Ok(OperatorRule::Second(closure::constant_second_derivative(self.interior_order())?))
    }

    pub(super) fn varying_second_derivative(&self) -> Result<OperatorRule, Vec<NotAvailable>> {
        let form = if self.periodic {
            closure::periodic_second_derivative(self.interior_order())?
        } else {
            closure::second_derivative(self.interior_order())?
        };
        Ok(OperatorRule::VaryingSecond(form))
    }

    /// One sentence for people.
    pub(super) fn describe(&self, axis: &Axis) -> String {
        let name = &axis.name;
        let order = self.interior_order();
        let kinds = match (self.first, self.second) {
            (true, true) => "first and second derivatives",
            (true, false) => "first derivatives",
            (false, true) => "second derivatives",
            (false, false) => "no derivatives",
        };
        if self.periodic {
            format!("along {name} (periodic, {kinds}): centred stencils of order {order}")
        } else {
            format!(
                "along {name} ({kinds}): interior order {order}, energy-stable closures of order {}, solution of order {}",
                self.half_order, self.solution_order
            )
        }
    }
}
