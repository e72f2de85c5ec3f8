//! Centred operators on periodic axes, kept once derived.

use super::{ClosureFault, NotAvailable, interior};
use crate::discretize::closure::Impossible;
use crate::scheme::DifferenceOperator;
use std::collections::HashMap;
use std::sync::{Arc, LazyLock, Mutex, PoisonError};

type Key = (usize, usize);

static KEPT: LazyLock<Mutex<HashMap<Key, Arc<DifferenceOperator>>>> = LazyLock::new(Mutex::default);

/// The centred operator of a derivative and an even order.
pub(super) fn operator(derivative: usize, order: usize) -> Result<Arc<DifferenceOperator>, NotAvailable> {
    let mut kept = KEPT.lock().unwrap_or_else(PoisonError::into_inner);
    if let Some(known) = kept.get(&(derivative, order)) {
        return Ok(known.clone());
    }
    let stencil = interior::centred(derivative, order).map_err(NotAvailable::weights)?;
    let operator = DifferenceOperator::periodic(stencil, order)
        .map_err(|fault| NotAvailable::from(ClosureFault::Derivation(Impossible::Operator(fault))))?;
    let operator = Arc::new(operator);
    kept.insert((derivative, order), operator.clone());
    Ok(operator)
}
