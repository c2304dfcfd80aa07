//! Effective potential, its derivatives, and the Jacobi constant in both of its forms.
//!
//! Everything follows from the identity
//! 2Ω + μ(1 − μ) = (1 − μ)(r₁² + 2/r₁) + μ(r₂² + 2/r₂) − z² (Szebehely 1967, *Theory of Orbits*, 1.4),
//! in which r² + 2/r is at least 3. What remains of it above 3 is a sum of terms that do not cancel in the
//! plane; Jacobi constants are kept as that remainder, in double-double.

use std::cmp::Ordering;

use nalgebra::{Matrix3, Vector3};
use thiserror::Error;

use crate::arithmetic::DoubleDouble;
use crate::frame::Origin;
use crate::quantity::{MassParameter, Quantity};
use crate::state::State;

/// Nearest distance to a primary's centre at which the potential is still evaluated: its square, the
/// smaller half of that in double-double, and its reciprocal are then all representable.
const NEAREST: f64 = 1e-100;

/// The remainder of the symmetric Jacobi constant is what it has above this: its value at rest in L4 and L5.
const TRIANGULAR: f64 = 3.0;

/// A position where the potential is infinite.
#[derive(Clone, Copy, Debug, Eq, Error, PartialEq)]
pub enum AtPrimary {
    /// In the centre of the larger primary.
    #[error("lies in the centre of the larger primary, where the potential is infinite")]
    Larger,
    /// In the centre of the smaller primary.
    #[error("lies in the centre of the smaller primary, where the potential is infinite")]
    Smaller,
}

/// Which Jacobi constant: the two differ by μ(1 − μ).
#[derive(Clone, Copy, Debug, Default, Eq, Hash, PartialEq)]
pub enum JacobiForm {
    /// C = x² + y² + 2(1 − μ)/r₁ + 2μ/r₂ − v².
    #[default]
    Plain,
    /// C + μ(1 − μ): exactly 3 at rest in L4 and L5.
    Symmetric,
}

/// Distances to the centres of both primaries, each to a relative 1.2e-16.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Distances {
    /// r₁, to the larger primary, in separations.
    pub larger: f64,
    /// r₂, to the smaller primary, in separations.
    pub smaller: f64,
}

/// Distances of a position (x, y, z), barycentric and rotating.
#[must_use]
pub fn distances(mass_parameter: MassParameter, position: &Vector3<f64>) -> Distances {
    distances_from(Origin::Barycenter, mass_parameter, position)
}

/// Distances of a rotating position (x, y, z) counted from `origin`; from a primary's centre they keep their digits
/// however near it is.
#[must_use]
pub fn distances_from(origin: Origin, mass_parameter: MassParameter, position: &Vector3<f64>) -> Distances {
    let place = Place::from(origin, mass_parameter, position);
    Distances { larger: place.larger.to_f64(), smaller: place.smaller.to_f64() }
}

/// Effective potential Ω in the given form, positive: (C + v²)/2, in squares of separation
/// times mean motion.
///
/// # Errors
/// [`AtPrimary`] in the centre of a primary.
pub fn effective_potential(
    mass_parameter: MassParameter,
    position: &Vector3<f64>,
    form: JacobiForm,
) -> Result<f64, AtPrimary> {
    Ok(0.5 * JacobiConstant::at_rest(mass_parameter, position)?.value(form))
}

/// Gradient ∂Ω/∂(x, y, z), in double precision. Not finite in the centre of a primary.
#[must_use]
pub fn gradient(mass_parameter: MassParameter, position: &Vector3<f64>) -> Vector3<f64> {
    let mu = mass_parameter.get();
    gradient_about_smaller(mu, &Vector3::new((position.x - 1.0) + mu, position.y, position.z))
}

/// The gradient at an offset from the smaller primary, where small distances to it are not yet rounded off.
///
/// Written as (1 − μ)(1 − 1/r₁³)d₁ + μ(1 − 1/r₂³)d₂ in the plane, so that nothing cancels where both distances
/// are near 1.
pub(crate) fn gradient_about_smaller(mu: f64, offset: &Vector3<f64>) -> Vector3<f64> {
    let from_larger = Vector3::new(offset.x + 1.0, offset.y, offset.z);
    let far = (1.0 - mu) * outward(from_larger.norm_squared());
    let near = mu * outward(offset.norm_squared());
    Vector3::new(
        far * from_larger.x + near * offset.x,
        (far + near) * offset.y,
        // The centrifugal force has no component along z.
        (far + near - 1.0) * offset.z,
    )
}

/// 1 − 1/r³ of a squared distance.
fn outward(squared: f64) -> f64 {
    let r = squared.sqrt();
    (squared - 1.0) / (r + 1.0) * (squared + r + 1.0) / (squared * r)
}

/// Hessian ∂²Ω/∂(x, y, z)², in double precision. Not finite in the centre of a primary.
#[must_use]
pub fn hessian(mass_parameter: MassParameter, position: &Vector3<f64>) -> Matrix3<f64> {
    let mu = mass_parameter.get();
    let from_smaller = Vector3::new((position.x - 1.0) + mu, position.y, position.z);
    let from_larger = Vector3::new(position.x + mu, position.y, position.z);
    let attraction = |share: f64, d: &Vector3<f64>| {
        let squared = d.norm_squared();
        let cubed = squared * squared.sqrt();
        d * d.transpose() * (3.0 * share / (cubed * squared)) - Matrix3::identity() * (share / cubed)
    };
    Matrix3::from_diagonal(&Vector3::new(1.0, 1.0, 0.0))
        + attraction(1.0 - mu, &from_larger)
        + attraction(mu, &from_smaller)
}

/// A Jacobi constant of one mass parameter, kept to about 30 digits, so that differences from those of the
/// equilibria lose nothing.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct JacobiConstant {
    mu: f64,
    /// Above that of rest in L4 and L5.
    remainder: DoubleDouble,
}

impl JacobiConstant {
    /// Of a barycentric rotating position (x, y, z) and velocity (vx, vy, vz).
    ///
    /// The error is below 4e-16 of the largest term of the plain form.
    ///
    /// # Errors
    /// [`AtPrimary`] in the centre of a primary.
    pub fn of(
        mass_parameter: MassParameter,
        position: &Vector3<f64>,
        velocity: &Vector3<f64>,
    ) -> Result<Self, AtPrimary> {
        Ok(Self::at_rest(mass_parameter, position)?.moving(velocity))
    }

    /// Of the velocity (vx, vy, vz) where this is the constant of rest.
    #[must_use]
    pub fn moving(self, velocity: &Vector3<f64>) -> Self {
        let [vx, vy, vz] = [velocity.x, velocity.y, velocity.z].map(DoubleDouble::square);
        Self { remainder: self.remainder - (vx + vy + vz), ..self }
    }

    /// Of a state in barycentric rotating axes.
    ///
    /// # Errors
    /// [`AtPrimary`] in the centre of a primary.
    pub fn of_state(mass_parameter: MassParameter, state: &State) -> Result<Self, AtPrimary> {
        Self::of(mass_parameter, &state.position, &state.velocity)
    }

    /// Of a position without velocity: 2Ω.
    ///
    /// # Errors
    /// [`AtPrimary`] in the centre of a primary.
    pub fn at_rest(mass_parameter: MassParameter, position: &Vector3<f64>) -> Result<Self, AtPrimary> {
        Self::at_rest_from(Origin::Barycenter, mass_parameter, position)
    }

    /// The same of a rotating position counted from `origin`; from a primary's centre it keeps its digits however near
    /// it is.
    ///
    /// # Errors
    /// [`AtPrimary`] in the centre of a primary.
    pub fn at_rest_from(
        origin: Origin,
        mass_parameter: MassParameter,
        position: &Vector3<f64>,
    ) -> Result<Self, AtPrimary> {
        let place = Place::from(origin, mass_parameter, position);
        if place.larger.to_f64() < NEAREST {
            return Err(AtPrimary::Larger);
        }
        if place.smaller.to_f64() < NEAREST {
            return Err(AtPrimary::Smaller);
        }
        Ok(Self::of_place(mass_parameter, &place))
    }

    /// 2Ω of a place that is not in a centre.
    pub(crate) fn of_place(mass_parameter: MassParameter, place: &Place) -> Self {
        let mu = mass_parameter.get();
        let above_minimum = |r: DoubleDouble| (r - 1.0).squared() * (r + 2.0) / r;
        let remainder = larger_share(mu) * above_minimum(place.larger) + above_minimum(place.smaller) * mu
            - place.height_squared;
        Self { mu, remainder }
    }

    /// The constant with the value `value` in `form`.
    #[must_use]
    pub fn new(mass_parameter: MassParameter, value: f64, form: JacobiForm) -> Self {
        let mu = mass_parameter.get();
        Self { mu, remainder: DoubleDouble::sum(value, -TRIANGULAR) + form.deficit(mu) }
    }

    /// The constant whose energy in `form` is `energy`.
    #[must_use]
    pub fn from_energy(mass_parameter: MassParameter, energy: f64, form: JacobiForm) -> Self {
        Self::new(mass_parameter, -2.0 * energy, form)
    }

    /// The value in `form`.
    #[must_use]
    pub fn value(&self, form: JacobiForm) -> f64 {
        (self.remainder - form.deficit(self.mu) + TRIANGULAR).to_f64()
    }

    /// −C/2 in `form`; in the plain form the Hamiltonian.
    #[must_use]
    pub fn energy(&self, form: JacobiForm) -> f64 {
        -0.5 * self.value(form)
    }

    /// How far the constant of the rotating `state`, its position counted from `origin`, is from
    /// C = x² + y² + 2(1 − μ)/r₁ + 2μ/r₂ − v² evaluated in double precision, relative to the largest of these terms.
    /// The rounding of the definition's own evaluation is most of it.
    #[must_use]
    pub fn departure_from_definition(&self, origin: Origin, state: &State) -> f64 {
        let (r, v, mu) = (&state.position, &state.velocity, self.mu);
        let (x, from_larger, from_smaller) = match origin {
            Origin::Barycenter => (r.x, r.x + mu, (r.x + mu) - 1.0),
            Origin::Larger => (r.x - mu, r.x, r.x - 1.0),
            Origin::Smaller => (r.x + (1.0 - mu), r.x + 1.0, r.x),
        };
        let across = r.y * r.y + r.z * r.z;
        let distance = |along: f64| (along * along + across).sqrt();
        let terms = [
            x * x + r.y * r.y,
            2.0 * (1.0 - mu) / distance(from_larger),
            2.0 * mu / distance(from_smaller),
            -v.norm_squared(),
        ];
        let largest = terms.iter().fold(0.0, |largest: f64, term| largest.max(term.abs()));
        (terms.iter().sum::<f64>() - self.value(JacobiForm::Plain)).abs() / largest
    }

    /// This constant minus `other`, rounded once. Both belong to the same mass parameter.
    #[must_use]
    pub fn above(&self, other: &Self) -> f64 {
        (self.remainder - other.remainder).to_f64()
    }

    /// This constant plus `offset`.
    #[must_use]
    pub fn plus(&self, offset: f64) -> Self {
        Self { remainder: self.remainder + offset, ..*self }
    }
}

impl PartialOrd for JacobiConstant {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        self.remainder.partial_cmp(&other.remainder)
    }
}

impl JacobiForm {
    /// The symmetric form minus this one.
    fn deficit(self, mu: f64) -> DoubleDouble {
        match self {
            Self::Plain => larger_share(mu) * mu,
            Self::Symmetric => DoubleDouble::default(),
        }
    }
}

/// 1 − μ, exactly.
pub(crate) fn larger_share(mu: f64) -> DoubleDouble {
    DoubleDouble::sum(1.0, -mu)
}

/// Where a position lies relative to both primaries, in double-double.
pub(crate) struct Place {
    pub(crate) larger: DoubleDouble,
    pub(crate) smaller: DoubleDouble,
    pub(crate) height_squared: DoubleDouble,
}

impl Place {
    pub(crate) fn of(mass_parameter: MassParameter, position: &Vector3<f64>) -> Self {
        Self::from(Origin::Barycenter, mass_parameter, position)
    }

    pub(crate) fn from(origin: Origin, mass_parameter: MassParameter, position: &Vector3<f64>) -> Self {
        let (from_larger, from_smaller) = match origin {
            Origin::Barycenter => {
                let from_larger = DoubleDouble::sum(position.x, mass_parameter.get());
                (from_larger, from_larger - 1.0)
            }
            Origin::Larger => (position.x.into(), DoubleDouble::sum(position.x, -1.0)),
            Origin::Smaller => (DoubleDouble::sum(position.x, 1.0), position.x.into()),
        };
        let height_squared = DoubleDouble::square(position.z);
        let across = DoubleDouble::square(position.y) + height_squared;
        let distance = |along: DoubleDouble| (along.squared() + across).sqrt();
        Self { larger: distance(from_larger), smaller: distance(from_smaller), height_squared }
    }
}
