use mechanics::system::System;
use mechanics::units::{ConvertError, Dimension, Unit, convert};

use crate::config::Limits;
use crate::decode::{Errors, Path, Text, choices, request};
use crate::wire::{LimitsSpec, SystemSpec};

choices! {
    /// What a value is.
    pub(crate) enum QuantityKind = Dimension {
        Length = "length",
        Time = "time",
        Velocity = "velocity",
        Acceleration = "acceleration",
        Energy = "energy",
        JacobiConstant = "jacobi_constant",
        AngleRate = "angle_rate",
    }
}

request! {
    /// The values to convert.
    #[example("example.json")]
    pub(crate) struct UnitsConvertRequest {
        /// The primaries.
        required system: SystemSpec,
        /// The values, as many as a request may have states.
        required values: Vec<ValueSpec>,
        /// How much the computation may take.
        optional limits: LimitsSpec,
    }
}

request! {
    /// A value to convert. A unit is `normalized`, or of lengths `m`, `km`, `au`, of times `s`, `min`, `h`, `d`, `yr`, of
    /// velocities, accelerations, energies and Jacobi constants a combination such as `km/s`, `m/s^2`, `km^2/s^2`, of angle
    /// rates `rad`, `deg`, `arcsec` or `rev` over a unit of time.
    pub(crate) struct ValueSpec {
        /// What the value is.
        required quantity: QuantityKind,
        /// The value.
        required value: f64,
        /// The unit it is in.
        required from: Text,
        /// The unit wanted.
        required to: Text,
    }
}

/// A checked request.
#[derive(Debug)]
pub(crate) struct Task {
    pub(super) system: System,
    pub(super) values: Vec<Converted>,
}

/// A value and what it became.
#[derive(Debug)]
pub(crate) struct Converted {
    pub(super) quantity: QuantityKind,
    pub(super) value: f64,
    pub(super) from: String,
    pub(super) to: String,
    pub(super) result: f64,
    /// The result converted back.
    pub(super) back: f64,
}

impl UnitsConvertRequest {
    pub(super) fn task(self, limits: &Limits, errors: &mut Errors) -> Option<Task> {
        let granted = LimitsSpec::check(self.limits, limits, errors);
        let at = Path::ROOT.member("values");
        let values = self.values.given()?;
        let asked = u64::try_from(values.len()).unwrap_or(u64::MAX);
        if asked > limits.states {
            errors.beyond(at, "values", limits.states, asked);
            return None;
        }
        if values.is_empty() {
            errors.push(at, "must hold at least one value");
        }
        let SystemSpec(system) = self.system.given()?;
        let count = values.len();
        let values: Vec<Converted> = values
            .into_iter()
            .enumerate()
            .filter_map(|(index, value)| value.converted(&system, at.item(index), errors))
            .collect();
        granted?;
        (values.len() == count).then_some(Task { system, values })
    }
}

impl ValueSpec {
    fn converted(self, system: &System, at: Path<'_>, errors: &mut Errors) -> Option<Converted> {
        let (quantity, value) = (self.quantity.given()?, self.value.given()?);
        let (Text(from_symbol), Text(to_symbol)) = (self.from.given()?, self.to.given()?);
        let mut unit = |member: &'static str, symbol: &str| match Unit::parse(quantity.into(), symbol) {
            Ok(unit) => Some(unit),
            Err(unknown) => {
                errors.push(at.member(member), unknown.to_string());
                None
            }
        };
        let (from, to) = (unit("from", &from_symbol), unit("to", &to_symbol));
        let (from, to) = (from?, to?);
        let both = convert(value, from, to, system)
            .and_then(|result| convert(result, to, from, system).map(|back| (result, back)));
        match both {
            Ok((result, back)) => {
                Some(Converted { quantity, value, from: from_symbol, to: to_symbol, result, back })
            }
            Err(error) => {
                let member = match error {
                    ConvertError::MissingScale(_) if from.is_normalized() => "from",
                    ConvertError::MissingScale(_) | ConvertError::Incompatible => "to",
                    ConvertError::Range(_) => "value",
                };
                errors.push(at.member(member), error.to_string());
                None
            }
        }
    }
}
