use mechanics::equilibria::{Equilibria, Equilibrium, Point, ROUTH};
use mechanics::frame::Frame;
use mechanics::system::System;
use mechanics::units::Units;
use nalgebra::Complex;
use serde::Serialize;
use utoipa::ToSchema;

use crate::decode::choices;
use crate::wire::{Conventions, FrameEcho, JacobiForm, SystemEcho, UnitsEcho, as_system_echo};

choices! {
    /// An equilibrium by name, which goes with the bodies and not with the frame: L1 between the primaries, L2 beyond
    /// the smaller, L3 beyond the larger, L4 60 degrees ahead of the smaller, L5 behind it.
    pub(crate) enum PointName = Point { L1 = "L1", L2 = "L2", L3 = "L3", L4 = "L4", L5 = "L5" }
}

/// Equilibria of one system, or of each of many.
#[derive(Debug, Serialize, ToSchema)]
#[serde(untagged)]
pub(crate) enum EquilibriaOutput {
    /// Where the request has `system`.
    One(Box<EquilibriaOfOne>),
    /// Where the request has `systems`.
    Many(EquilibriaSweep),
}

/// Equilibria of one system.
#[derive(Debug, Serialize, ToSchema)]
pub(crate) struct EquilibriaOfOne {
    #[serde(flatten)]
    conventions: Conventions,
    /// Which Jacobi constant is meant.
    jacobi_form: JacobiForm,
    #[serde(flatten)]
    solution: Solution,
}

/// Equilibria of each of many systems.
#[derive(Debug, Serialize, ToSchema)]
pub(crate) struct EquilibriaSweep {
    /// The units of all numbers.
    units: UnitsEcho,
    /// The frame of all positions.
    frame: FrameEcho,
    /// Which Jacobi constant is meant.
    jacobi_form: JacobiForm,
    /// The worst of all systems.
    evidence: EquilibriaEvidence,
    /// The systems in the request's order, each with its equilibria.
    systems: Vec<EquilibriaOfSystem>,
}

/// One system of many, with its equilibria.
#[derive(Debug, Serialize, ToSchema)]
pub(crate) struct EquilibriaOfSystem {
    /// The system.
    #[serde(serialize_with = "as_system_echo")]
    #[schema(value_type = SystemEcho)]
    system: System,
    #[serde(flatten)]
    solution: Solution,
}

/// The five points.
#[derive(Debug, Serialize, ToSchema)]
#[schema(as = EquilibriaSolution)]
pub(crate) struct Solution {
    /// Routh's critical mass parameter: L4 and L5 are linearly stable below it.
    critical_mass_parameter: f64,
    /// How good the points are.
    evidence: EquilibriaEvidence,
    /// L1 to L5.
    points: [PointEcho; 5],
}

/// How good the points are, measured.
#[derive(Clone, Copy, Debug, Serialize, ToSchema)]
pub(crate) struct EquilibriaEvidence {
    /// Largest acceleration left over at rest in a point, in separations times mean motion squared, whatever the units.
    largest_residual: f64,
}

/// An equilibrium.
#[derive(Debug, Serialize, ToSchema)]
#[schema(as = Equilibrium)]
pub(crate) struct PointEcho {
    /// Its name.
    name: PointName,
    /// Position [x, y, z].
    position: [f64; 3],
    /// Distance to the larger primary, solved for and not differenced.
    distance_to_larger: f64,
    /// Distance to the smaller primary, solved for and not differenced.
    distance_to_smaller: f64,
    /// Jacobi constant of rest in it, in the velocity unit squared.
    jacobi_constant: f64,
    /// Minus half of that.
    energy: f64,
    /// The motion linearised about it.
    linear: LinearEcho,
}

/// Motion linearised about an equilibrium.
#[derive(Debug, Serialize, ToSchema)]
#[schema(as = LinearMotion)]
pub(crate) struct LinearEcho {
    /// Six eigenvalues [re, im], per unit of time, by decreasing real part, then by decreasing imaginary part.
    eigenvalues: [[f64; 2]; 6],
    /// Whether small motions stay small: never at L1 to L3, below the critical mass parameter at L4 and L5.
    stable: bool,
    /// Largest real part, 0 if none.
    growth_rate: f64,
    /// Periods 2 pi/|im| of the oscillating in-plane pairs, longest first: one at L1 to L3, two at stable L4 and L5,
    /// one at unstable.
    in_plane_periods: Vec<f64>,
    /// Period of the oscillation along z.
    vertical_period: f64,
}

impl EquilibriaOfOne {
    pub(super) fn new(conventions: Conventions, jacobi_form: JacobiForm, solution: Solution) -> Self {
        Self { conventions, jacobi_form, solution }
    }
}

impl EquilibriaSweep {
    pub(super) fn new(
        units: Units,
        frame: Frame,
        jacobi_form: JacobiForm,
        systems: Vec<EquilibriaOfSystem>,
    ) -> Self {
        let residuals = systems.iter().map(|system| system.solution.evidence.largest_residual);
        let evidence = EquilibriaEvidence { largest_residual: residuals.fold(0.0, f64::max) };
        Self { units: UnitsEcho(units), frame: frame.into(), jacobi_form, evidence, systems }
    }
}

impl EquilibriaOfSystem {
    pub(super) fn new(system: System, solution: Solution) -> Self {
        Self { system, solution }
    }
}

impl Solution {
    pub(super) fn new(equilibria: &Equilibria, conventions: &Conventions, form: JacobiForm) -> Self {
        Self {
            critical_mass_parameter: ROUTH,
            evidence: EquilibriaEvidence { largest_residual: equilibria.largest_residual() },
            points: Point::ALL.map(|point| PointEcho::new(equilibria.get(point), conventions, form)),
        }
    }
}

impl PointEcho {
    fn new(equilibrium: &Equilibrium, conventions: &Conventions, form: JacobiForm) -> Self {
        let Conventions { frame, scale, .. } = conventions;
        let position = frame.direction_from_default(0.0, &equilibrium.position_from(frame.origin));
        let constant = equilibrium.jacobi_constant();
        let linear = equilibrium.linear_motion();
        Self {
            name: equilibrium.point().into(),
            // Adding 0 turns the negative zeros of a half turn into zeros.
            position: (scale.position_out(&position).add_scalar(0.0)).into(),
            distance_to_larger: equilibrium.distance_to_larger() * scale.length,
            distance_to_smaller: equilibrium.distance_to_smaller() * scale.length,
            jacobi_constant: constant.value(form.into()) * scale.energy(),
            energy: constant.energy(form.into()) * scale.energy(),
            linear: LinearEcho {
                eigenvalues: linear.eigenvalues.map(|Complex { re, im }| [re / scale.time, im / scale.time]),
                stable: linear.stable,
                growth_rate: linear.growth_rate / scale.time,
                in_plane_periods: linear.in_plane_periods().map(|period| period * scale.time).collect(),
                vertical_period: linear.vertical_period * scale.time,
            },
        }
    }
}
