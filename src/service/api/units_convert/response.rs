use mechanics::system::System;
use serde::Serialize;
use utoipa::ToSchema;

use super::request::{Converted, QuantityKind, Task};
use crate::wire::{SystemEcho, as_system_echo};

/// Converted values.
#[derive(Debug, Serialize, ToSchema)]
pub(crate) struct UnitsConvertAnswer {
    /// The system whose scales were used.
    #[serde(serialize_with = "as_system_echo")]
    #[schema(value_type = SystemEcho)]
    system: System,
    /// How good the results are.
    evidence: UnitsConvertEvidence,
    /// The values in the request's order.
    values: Vec<ConvertedValue>,
}

/// How good the results are, measured.
#[derive(Debug, Serialize, ToSchema)]
pub(crate) struct UnitsConvertEvidence {
    /// Largest relative difference between a value and its result converted back.
    largest_round_trip_error: f64,
}

/// A value and its result.
#[derive(Debug, Serialize, ToSchema)]
pub(crate) struct ConvertedValue {
    /// What the value is.
    quantity: QuantityKind,
    /// The value.
    value: f64,
    /// The unit it is in.
    from: String,
    /// The unit of the result.
    to: String,
    /// The value in that unit.
    result: f64,
}

impl UnitsConvertAnswer {
    pub(super) fn new(task: Task) -> Self {
        let error = |converted: &Converted| match converted.value {
            0.0 => 0.0,
            value => ((converted.back - value) / value).abs(),
        };
        let largest_round_trip_error = task.values.iter().map(error).fold(0.0, f64::max);
        let values =
            task.values.into_iter().map(|Converted { quantity, value, from, to, result, .. }| {
                ConvertedValue { quantity, value, from, to, result }
            });
        Self {
            system: task.system,
            evidence: UnitsConvertEvidence { largest_round_trip_error },
            values: values.collect(),
        }
    }
}
