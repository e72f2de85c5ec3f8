//! The door between a kernel and everything that runs or prints one.
//!
//! [`validate`] proves, for every admissible number of nodes, that all loads are in bounds, that operands stand before
//! their users, that extents are what the graph says, and that no node is written twice or read after it was written in
//! one sweep. It proves nothing about mathematics: weights are taken as they are.

mod graph;
mod passes;

use super::{Axis, BufferId, Extent, Kernel, LineOperator, OperatorId, TableId, ValueId};
use std::fmt;
use std::ops::Deref;

/// A kernel that passed [`validate`].
#[derive(Clone, Debug)]
pub struct ValidKernel(Kernel);

impl ValidKernel {
    /// The kernel itself, for changes that must pass the door again.
    pub fn into_inner(self) -> Kernel {
        self.0
    }
}

impl Deref for ValidKernel {
    type Target = Kernel;
    fn deref(&self) -> &Kernel {
        &self.0
    }
}

/// Why a kernel is refused: always a mistake of the compiler, never of a model.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum KernelFault {
    /// A grid has one to three axes.
    AxisCount(usize),
    /// An index points at nothing.
    Unknown { what: &'static str, index: usize },
    /// A value is made of one that does not stand before it.
    OperandOrder { value: ValueId, operand: ValueId },
    /// The stated extent is not the one that the operation gives.
    WrongExtent { value: ValueId, stated: Extent, derived: Extent },
    /// A varying value is made of a value of table extent that was not put into a table.
    NotStored { value: ValueId, operand: ValueId },
    /// `Minimum` and `Maximum` are operations of two operands.
    TwoOperandCall(ValueId),
    /// A constant operator with a coefficient, or a varying one without.
    CoefficientMismatch(ValueId),
    /// The table that an operator reads does not hold the operator's axis.
    SourceLacksAxis { value: ValueId, table: TableId },
    /// A table over no axis, or over one that the grid does not have.
    TableAxes(TableId),
    /// The value of a table reaches beyond the table's axes, or is not fixed in time.
    TableValue(TableId),
    /// An operator with closure rows on a periodic axis.
    ClosureOnPeriodicAxis { operator: OperatorId, axis: usize },
    /// Interior rows of the operator would read beyond the end of a bounded axis.
    BeyondEdge { operator: OperatorId, axis: usize },
    /// A closure row without weights, or an operator without any.
    EmptyRow(OperatorId),
    /// The axis admits fewer nodes than the operator needs.
    TooFewNodes { operator: OperatorId, axis: usize, needs: usize },
    /// An axis with fewer nodes than its own least number, or with less than two.
    AxisNodes(usize),
    /// A value must be one number for the run.
    NotFixed { what: &'static str, value: ValueId },
    /// A default that depends on its own or a later parameter, or on the grid.
    ParameterOrder { parameter: usize },
    /// A value of table extent stands where one for each node is needed.
    TableExtent { place: String, value: ValueId },
    /// `Rate` outside the writes of its sweep, or a rate that the sweep does not have.
    Rate { place: String, value: ValueId },
    /// An applied operator in a face value or a patch.
    AppliedAtFace { place: String, value: ValueId },
    /// A face of a periodic axis.
    FaceOfPeriodicAxis { place: String, axis: usize },
    /// One pass writes a buffer twice.
    WrittenTwice { place: String, buffer: BufferId },
    /// A sweep writes a buffer to which it applies an operator.
    WritesSource { place: String, buffer: BufferId },
    /// A rotation that swaps a buffer with itself.
    Rotation(BufferId),
    /// A list has the wrong length.
    Length { what: &'static str, needs: usize, has: usize },
    /// A maximum over time without the sweep that keeps it, or one that fills another buffer.
    Maximum(usize),
    /// An output's sweep does not write the output's buffer.
    OutputSweep(usize),
}

impl fmt::Display for KernelFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(formatter, "the kernel is inconsistent: {self:?}")
    }
}

impl std::error::Error for KernelFault {}

/// Checks everything that a kernel promises.
///
/// # Errors
/// The first fault found, in the order: axes, operators, graph, tables, fixed values, passes, outputs.
pub fn validate(kernel: Kernel) -> Result<ValidKernel, KernelFault> {
    axes(&kernel)?;
    graph::values(&kernel)?;
    graph::tables(&kernel)?;
    graph::fixed_values(&kernel)?;
    passes::all(&kernel)?;
    Ok(ValidKernel(kernel))
}

fn axes(kernel: &Kernel) -> Result<(), KernelFault> {
    if kernel.axes.is_empty() || kernel.axes.len() > 3 {
        return Err(KernelFault::AxisCount(kernel.axes.len()));
    }
    length("quadrature", kernel.axes.len(), kernel.quadrature.len())?;
    for (index, axis) in kernel.axes.iter().enumerate() {
        let quadrature = 2 * kernel.quadrature[index].len();
        let least = [2, quadrature, kernel.interpolation_nodes].into_iter().max().unwrap_or(2);
        if axis.nodes < axis.least_nodes || axis.least_nodes < least || kernel.interpolation_nodes == 0 {
            return Err(KernelFault::AxisNodes(index));
        }
    }
    Ok(())
}

/// Whether an operator fits an axis for every admissible number of nodes.
fn fits(operator: &LineOperator, id: OperatorId, axis: &Axis, index: usize) -> Result<(), KernelFault> {
    not_empty(operator, id)?;
    let rows = operator.closure_rows();
    if axis.periodic && rows > 0 {
        return Err(KernelFault::ClosureOnPeriodicAxis { operator: id, axis: index });
    }
    let reach = operator.interior_reach();
    if !axis.periodic && rows < reach {
        return Err(KernelFault::BeyondEdge { operator: id, axis: index });
    }
    let needs = if axis.periodic {
        2 * reach + 1
    } else {
        (2 * rows).max(operator.closure_width()).max(rows + reach)
    };
    if axis.least_nodes < needs {
        return Err(KernelFault::TooFewNodes { operator: id, axis: index, needs });
    }
    Ok(())
}

fn not_empty(operator: &LineOperator, id: OperatorId) -> Result<(), KernelFault> {
    let empty = match operator {
        LineOperator::Constant(constant) => {
            constant.interior.iter().all(|weight| weight.is_zero())
                || constant.closure.iter().any(|row| row.weights.is_empty())
        }
        LineOperator::Varying(varying) => {
            varying.forms.is_empty()
                || varying.forms.iter().any(Vec::is_empty)
                || varying
                    .closure
                    .iter()
                    .any(|row| row.is_empty() || row.iter().any(|entry| entry.weights.is_empty()))
        }
    };
    if empty { Err(KernelFault::EmptyRow(id)) } else { Ok(()) }
}

fn length(what: &'static str, needs: usize, has: usize) -> Result<(), KernelFault> {
    if needs == has { Ok(()) } else { Err(KernelFault::Length { what, needs, has }) }
}

fn known(what: &'static str, index: usize, count: usize) -> Result<(), KernelFault> {
    if index < count { Ok(()) } else { Err(KernelFault::Unknown { what, index }) }
}
