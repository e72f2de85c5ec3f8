//! Faults of the value graph, of tables and of values that must be fixed. Passes are checked elsewhere.

use super::{KernelFault, fits, known};
use crate::kernel::{
    Extent, Kernel, LineOperator, Operation, OutputKind, Source, Step, TableId, Value, ValueId,
};
use crate::model::Function;

/// Operands before users, extents as derived, operators that fit their axes.
pub fn values(kernel: &Kernel) -> Result<(), KernelFault> {
    for (index, value) in kernel.values.iter().enumerate() {
        let id = ValueId(index);
        for operand in value.operation.operands() {
            if operand.0 >= index {
                return Err(KernelFault::OperandOrder { value: id, operand });
            }
        }
        leaf(kernel, id, value)?;
        extent(kernel, id, value)?;
    }
    Ok(())
}

fn extent(kernel: &Kernel, id: ValueId, value: &Value) -> Result<(), KernelFault> {
    let own = value.operation.own_extent(((1u16 << kernel.axes.len()) - 1) as u8);
    let operands = value.operation.operands();
    let joined = operands.iter().map(|operand| kernel.values[operand.0].extent).fold(own, Extent::join);
    if joined != value.extent {
        return Err(KernelFault::WrongExtent { value: id, stated: value.extent, derived: joined });
    }
    if joined == Extent::Varying {
        for operand in operands {
            if matches!(kernel.values[operand.0].extent, Extent::Table(_)) {
                return Err(KernelFault::NotStored { value: id, operand });
            }
        }
    }
    Ok(())
}

fn leaf(kernel: &Kernel, id: ValueId, value: &Value) -> Result<(), KernelFault> {
    match &value.operation {
        Operation::Parameter(parameter) => known("parameter", parameter.0, kernel.parameters.len()),
        Operation::InverseSpacing(axis) | Operation::Coordinate(axis) => {
            known("axis", *axis, kernel.axes.len())
        }
        Operation::Load(buffer) => known("buffer", buffer.0, kernel.buffers.len()),
        Operation::Table(table) => known("table", table.0, kernel.tables.len()),
        Operation::Call(Function::Minimum | Function::Maximum, _) => Err(KernelFault::TwoOperandCall(id)),
        Operation::Apply { operator, axis, source, coefficient } => {
            known("axis", *axis, kernel.axes.len())?;
            known("operator", operator.0, kernel.operators.len())?;
            let line = &kernel.operators[operator.0].operator;
            if matches!(line, LineOperator::Varying(_)) != coefficient.is_some() {
                return Err(KernelFault::CoefficientMismatch(id));
            }
            for read in [Some(*source), *coefficient].into_iter().flatten() {
                readable(kernel, id, *axis, read)?;
            }
            fits(line, *operator, &kernel.axes[*axis], *axis)
        }
        _ => Ok(()),
    }
}

fn readable(kernel: &Kernel, value: ValueId, axis: usize, source: Source) -> Result<(), KernelFault> {
    match source {
        Source::Buffer(buffer) => known("buffer", buffer.0, kernel.buffers.len()),
        Source::Table(table) => {
            known("table", table.0, kernel.tables.len())?;
            if kernel.tables[table.0].axes >> axis & 1 == 0 {
                return Err(KernelFault::SourceLacksAxis { value, table });
            }
            Ok(())
        }
    }
}

/// Every table is over axes of the grid, and its value is of fixed or table extent within these axes.
pub fn tables(kernel: &Kernel) -> Result<(), KernelFault> {
    for (index, table) in kernel.tables.iter().enumerate() {
        if table.axes == 0 || u16::from(table.axes) >= 1u16 << kernel.axes.len() {
            return Err(KernelFault::TableAxes(TableId(index)));
        }
        known("value", table.value.0, kernel.values.len())?;
        match kernel.values[table.value.0].extent {
            Extent::Fixed => {}
            Extent::Table(axes) if axes & !table.axes == 0 => {}
            _ => return Err(KernelFault::TableValue(TableId(index))),
        }
    }
    Ok(())
}

/// Sizes, times, scales and defaults are one number for the run, defaults depend on earlier parameters only.
pub fn fixed_values(kernel: &Kernel) -> Result<(), KernelFault> {
    for axis in &kernel.axes {
        fixed(kernel, "axis", axis.low)?;
        fixed(kernel, "axis", axis.high)?;
        before_grid(kernel, axis.low, kernel.parameters.len(), kernel.parameters.len())?;
        before_grid(kernel, axis.high, kernel.parameters.len(), kernel.parameters.len())?;
    }
    for (index, parameter) in kernel.parameters.iter().enumerate() {
        fixed(kernel, "parameter", parameter.default)?;
        fixed(kernel, "parameter scale", parameter.scale)?;
        before_grid(kernel, parameter.default, index, index)?;
        for bound in parameter.bounds.iter().flat_map(|(low, high)| [*low, *high]) {
            fixed(kernel, "parameter bound", bound)?;
        }
    }
    for field in &kernel.fields {
        known("buffer", field.buffer.0, kernel.buffers.len())?;
        fixed(kernel, "field scale", field.scale)?;
        for bound in field.bounds.iter().flat_map(|(low, high)| [*low, *high]) {
            fixed(kernel, "field bound", bound)?;
        }
    }
    fixed(kernel, "start time", kernel.time.start)?;
    fixed(kernel, "end time", kernel.time.end)?;
    if let Step::Duration(duration) = kernel.time.step {
        fixed(kernel, "step", duration)?;
    }
    for output in &kernel.outputs {
        known("buffer", output.buffer.0, kernel.buffers.len())?;
        fixed(kernel, "output scale", output.scale)?;
        if let Some(every) = output.every {
            fixed(kernel, "output interval", every)?;
        }
        if let OutputKind::Gauge(place) = &output.kind {
            super::length("gauge place", kernel.axes.len(), place.len())?;
            for coordinate in place {
                fixed(kernel, "gauge place", *coordinate)?;
            }
        }
    }
    Ok(())
}

fn fixed(kernel: &Kernel, what: &'static str, value: ValueId) -> Result<(), KernelFault> {
    known("value", value.0, kernel.values.len())?;
    if kernel.values[value.0].extent == Extent::Fixed {
        Ok(())
    } else {
        Err(KernelFault::NotFixed { what, value })
    }
}

/// `value` needs neither the spacing nor a parameter from `limit` on.
fn before_grid(kernel: &Kernel, value: ValueId, limit: usize, blame: usize) -> Result<(), KernelFault> {
    for needed in kernel.needed([value]) {
        let late = match kernel.values[needed.0].operation {
            Operation::InverseSpacing(_) => true,
            Operation::Parameter(parameter) => parameter.0 >= limit,
            _ => false,
        };
        if late {
            return Err(KernelFault::ParameterOrder { parameter: blame });
        }
    }
    Ok(())
}
