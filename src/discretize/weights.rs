//! One stencil on request: which nodes, which derivative, where.
//!
//! Holds the request as plain data and its derivation. Reading it from text is the pipeline's task.

use crate::exact::Rational;
use crate::scheme::Stencil;

use super::WeightsFault;
use super::interior::{self, NodeFamily};

/// The nodes of a request.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum NodeChoice {
    /// These nodes, in any order.
    Listed(Vec<Rational>),
    /// As many nodes of a family as the order needs.
    Family {
        /// Which family.
        family: NodeFamily,
        /// The order to reach.
        order: usize,
    },
}

/// A request for one stencil.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct WeightsRequest {
    /// Which derivative; nought is interpolation.
    pub derivative: usize,
    /// The nodes.
    pub nodes: NodeChoice,
    /// The point at which the derivative is taken.
    pub at: Rational,
}

/// Derives the stencil of a request.
pub fn derive(request: &WeightsRequest) -> Result<Stencil, WeightsFault> {
    match &request.nodes {
        NodeChoice::Listed(nodes) => interior::weights(nodes, &request.at, request.derivative),
        NodeChoice::Family { family, order } => {
            interior::smallest(*family, &request.at, request.derivative, *order)
        }
    }
}
