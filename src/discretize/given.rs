//! Operators from weights that the user gives: nothing is derived, everything is checked.

use std::fmt;

use crate::exact::Rational;
use crate::scheme::{ClosedRow, DifferenceOperator, OperatorFault, Stencil, StencilFault};

use super::interior::LargestRequest;

/// A table of weights for unit spacing, with what it is said to be.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct GivenWeights {
    /// Which derivative.
    pub derivative: usize,
    /// The order of the interior.
    pub interior_order: usize,
    /// (offset from the point, weight), offsets ascending.
    pub interior: Vec<(i64, Rational)>,
    /// Rows at the left end, and their order; nothing for a periodic axis.
    pub ends: Option<GivenEnds>,
}

/// Rows 0, 1, … at the left end; the right end mirrors them.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct GivenEnds {
    /// The order of every row.
    pub order: usize,
    /// The rows.
    pub rows: Vec<ClosedRow>,
}

/// Why a table is not the operator that it is said to be.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum GivenFault {
    /// The interior weights fail.
    Interior(StencilFault),
    /// The ends fail, or do not fit the interior.
    Operator(OperatorFault),
    /// The derivative, an order, a number of rows or the distance of a node is beyond what is offered.
    TooLarge {
        /// What is too large, in words.
        what: &'static str,
        /// The most that is offered.
        most: usize,
    },
}

impl GivenWeights {
    /// The operator of the table, or why it is none.
    pub fn operator(&self) -> Result<DifferenceOperator, GivenFault> {
        self.check_bounds()?;
        let (nodes, weights) =
            self.interior.iter().map(|(offset, weight)| (Rational::from(*offset), weight.clone())).unzip();
        let stencil = Stencil::new(nodes, Rational::zero(), self.derivative, weights, self.interior_order)
            .map_err(GivenFault::Interior)?;
        let operator = match &self.ends {
            None => DifferenceOperator::periodic(stencil, self.interior_order),
            Some(GivenEnds { order, rows }) => {
                DifferenceOperator::bounded(stencil, self.interior_order, rows.clone(), *order)
            }
        };
        operator.map_err(GivenFault::Operator)
    }

    /// What anyone may type must not be able to fill the memory or overflow a sum.
    fn check_bounds(&self) -> Result<(), GivenFault> {
        let (orders, nodes) = (LargestRequest::ORDER, LargestRequest::NODES);
        let within = |what, found: usize, most: usize| {
            if found > most { Err(GivenFault::TooLarge { what, most }) } else { Ok(()) }
        };
        within("the derivative", self.derivative, LargestRequest::DERIVATIVE)?;
        within("the interior order", self.interior_order, orders)?;
        for (offset, _) in &self.interior {
            let distance = usize::try_from(offset.unsigned_abs()).unwrap_or(usize::MAX);
            within("the distance of an interior node", distance, nodes)?;
        }
        if let Some(ends) = &self.ends {
            within("the order of the ends", ends.order, orders)?;
            within("the number of rows at an end", ends.rows.len(), nodes)?;
            for row in &ends.rows {
                within("the first node of a row", row.first, nodes)?;
                within("the number of weights of a row", row.weights.len(), nodes)?;
            }
        }
        Ok(())
    }
}

impl fmt::Display for GivenFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            GivenFault::Interior(fault) => write!(formatter, "interior: {fault}"),
            GivenFault::Operator(fault) => fault.fmt(formatter),
            GivenFault::TooLarge { what, most } => write!(formatter, "{what} is more than {most}"),
        }
    }
}

impl std::error::Error for GivenFault {}
