//! Between normalised numbers and physical units.
//!
//! Computations are normalised; [`Units::scale`] gives the factors that turn their results into what was asked
//! for. [`Unit`] and [`convert`] serve single values of any dimension.

mod unit;

use nalgebra::{Matrix6, Vector3};
use thiserror::Error;

use crate::state::State;
use crate::system::{Member, System};

pub use unit::{ConvertError, Dimension, LengthUnit, TimeUnit, Unit, UnknownUnit, VelocityUnit, convert};

/// The units that lengths, times and velocities are written in. Jacobi constants and energies go with the square
/// of the velocity unit, matrices with the mixed units that follow.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub enum Units {
    /// Separation, inverse mean motion and their quotient.
    #[default]
    Normalized,
    /// Physical units.
    Physical {
        /// Unit of length.
        length: LengthUnit,
        /// Unit of time.
        time: TimeUnit,
        /// Unit of velocity; the quotient of the other two if absent.
        velocity: Option<VelocityUnit>,
    },
}

impl Units {
    /// The factors from normalised numbers to these units.
    ///
    /// # Errors
    /// [`MissingScale`] if the units are physical and the system lacks a scale.
    pub fn scale(&self, system: &System) -> Result<Scale, MissingScale> {
        match *self {
            Self::Normalized => Ok(Scale::IDENTITY),
            Self::Physical { length, time, velocity } => {
                let (Some(km), Some(s), Some(km_s)) =
                    (system.length_km(), system.time_s(), system.velocity_km_s())
                else {
                    return Err(MissingScale::of(system));
                };
                let velocity = velocity.map_or_else(|| length.size().per(time.size()), VelocityUnit::size);
                Ok(Scale {
                    length: length.size().count_in(km),
                    time: time.size().count_in(s),
                    velocity: velocity.count_in(km_s),
                })
            }
        }
    }
}

/// A physical unit was asked for that the system has no scale for.
#[derive(Clone, Copy, Debug, Eq, Error, PartialEq)]
pub struct MissingScale {
    /// The unit of length is not known.
    pub length: bool,
    /// The unit of time is not known.
    pub time: bool,
}

impl MissingScale {
    /// What `system` lacks.
    fn of(system: &System) -> Self {
        Self { length: system.length_km().is_none(), time: system.time_s().is_none() }
    }

    /// The members that the system should have given.
    pub fn members(&self) -> impl Iterator<Item = Member> {
        let length = self.length.then_some(Member::LengthKm);
        length.into_iter().chain(self.time.then_some(Member::TimeS))
    }
}

impl std::fmt::Display for MissingScale {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str("needs a scale that the system lacks: ")?;
        for (i, member) in self.members().enumerate() {
            write!(f, "{}`{member}`", if i == 0 { "" } else { " and " })?;
        }
        Ok(())
    }
}

/// How many of the units asked for make one normalised unit. Multiply on the way out, divide on the way in.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Scale {
    /// Length units per separation.
    pub length: f64,
    /// Time units per inverse mean motion.
    pub time: f64,
    /// Velocity units per separation times mean motion.
    pub velocity: f64,
}

impl Scale {
    /// Normalised units; every number keeps its bits.
    pub const IDENTITY: Self = Self { length: 1.0, time: 1.0, velocity: 1.0 };

    /// Units of Jacobi constants and energies per normalised one.
    #[must_use]
    pub fn energy(&self) -> f64 {
        self.velocity * self.velocity
    }

    /// A normalised state in these units.
    #[must_use]
    pub fn state_out(&self, state: &State) -> State {
        State {
            time: state.time * self.time,
            position: self.position_out(&state.position),
            velocity: self.velocity_out(&state.velocity),
        }
    }

    /// A state in these units, normalised.
    #[must_use]
    pub fn state_in(&self, state: &State) -> State {
        State {
            time: state.time / self.time,
            position: self.position_in(&state.position),
            velocity: self.velocity_in(&state.velocity),
        }
    }

    /// A normalised position or displacement in these units.
    #[must_use]
    pub fn position_out(&self, position: &Vector3<f64>) -> Vector3<f64> {
        position * self.length
    }

    /// A position or displacement in these units, normalised.
    #[must_use]
    pub fn position_in(&self, position: &Vector3<f64>) -> Vector3<f64> {
        position / self.length
    }

    /// A normalised velocity, Δv or momentum in these units.
    #[must_use]
    pub fn velocity_out(&self, velocity: &Vector3<f64>) -> Vector3<f64> {
        velocity * self.velocity
    }

    /// A velocity, Δv or momentum in these units, normalised.
    #[must_use]
    pub fn velocity_in(&self, velocity: &Vector3<f64>) -> Vector3<f64> {
        velocity / self.velocity
    }

    /// A normalised derivative of one state by another, 6×6 in the order x y z vx vy vz, in these units.
    #[must_use]
    pub fn matrix_out(&self, matrix: &Matrix6<f64>) -> Matrix6<f64> {
        let (position_by_velocity, velocity_by_position) =
            (self.length / self.velocity, self.velocity / self.length);
        Matrix6::from_fn(|row, column| {
            matrix[(row, column)]
                * match (row < 3, column < 3) {
                    (true, false) => position_by_velocity,
                    (false, true) => velocity_by_position,
                    _ => 1.0,
                }
        })
    }
}
