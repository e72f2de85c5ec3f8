//! From what is wanted to weights: derivations. Every result passes through the checking constructor of a
//! fact in [`crate::scheme`], so nothing wrong leaves this module unnoticed.

mod assemble;
mod centred;
mod choose;
pub mod closure;
mod face;
pub mod given;
pub mod interior;
pub mod one_sided;
mod split;

pub use assemble::assemble;
pub mod weights;

pub use closure::{ClosureFault, Impossible};
pub use interior::{LargestRequest, NodeFamily, WeightsFault};

use crate::model::{AskedOrder, Axis};

/// What cannot be had, in words for the user.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct NotAvailable {
    pub what: String,
    pub remedy: String,
}

impl NotAvailable {
    /// An order that no closure on a bounded axis reaches.
    fn closure(axis: &Axis, asked: AskedOrder, reachable: usize, fault: ClosureFault) -> NotAvailable {
        let order = match asked {
            AskedOrder::Solution(order) => format!("order {order}"),
            AskedOrder::Interior(order) => format!("interior order {order}"),
        };
        match fault {
            ClosureFault::NotAvailable { available, .. } => NotAvailable {
                what: format!("{order} cannot be reached along {} with boundaries", axis.name),
                remedy: format!(
                    "ask for at most order {reachable} of the solution (interior orders offered: {}), or make the axis periodic",
                    available.iter().map(ToString::to_string).collect::<Vec<_>>().join(", ")
                ),
            },
            other => NotAvailable::from(other),
        }
    }

    /// An interior stencil that is not offered.
    fn weights(fault: WeightsFault) -> NotAvailable {
        NotAvailable {
            what: format!("no such centred stencil: {fault}"),
            remedy: format!("centred stencils go up to order {}", LargestRequest::CENTRED_ORDER),
        }
    }
}

impl From<ClosureFault> for NotAvailable {
    fn from(fault: ClosureFault) -> NotAvailable {
        NotAvailable { what: fault.to_string(), remedy: "ask for another order".to_owned() }
    }
}

impl From<ClosureFault> for Vec<NotAvailable> {
    fn from(fault: ClosureFault) -> Vec<NotAvailable> {
        vec![NotAvailable::from(fault)]
    }
}

impl From<NotAvailable> for Vec<NotAvailable> {
    fn from(fault: NotAvailable) -> Vec<NotAvailable> {
        vec![fault]
    }
}
