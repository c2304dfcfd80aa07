use std::collections::BTreeMap;

use mechanics::equilibria::{Equilibria, Equilibrium, Point, ROUTH};
use mechanics::frame::Frame;
use mechanics::system::System;
use mechanics::units::Units;
use nalgebra::Complex;
use serde::Serialize;
use utoipa::ToSchema;

use crate::decode::choices;
use crate::problem::ProblemBody;
use crate::wire::{Conventions, FrameEcho, JacobiForm, SystemEcho, UnitsEcho};

choices! {
    /// An equilibrium by name, which goes with the bodies and not with the frame: L1 between the primaries, L2 beyond
    /// the smaller, L3 beyond the larger, L4 60 degrees ahead of the smaller, L5 behind it.
    pub(crate) enum PointName = Point { L1 = "L1", L2 = "L2", L3 = "L3", L4 = "L4", L5 = "L5" }
}

/// Equilibria of one system, or of each of many.
#[derive(ToSchema)]
#[serde(untagged)]
#[expect(dead_code, reason = "describes what is written")]
pub(crate) enum EquilibriaOutput<'a> {
    /// Where the request has `system`.
    One(Box<EquilibriaOfOne>),
    /// Where the request has `systems`.
    Many(EquilibriaSweep<'a>),
}

/// A line of the equilibria of many systems.
#[derive(ToSchema)]
#[serde(tag = "kind", rename_all = "snake_case")]
#[expect(dead_code, reason = "describes what is written")]
pub(crate) enum EquilibriaLine<'a> {
    /// The first.
    Header(SweepHeader),
    /// One for each system, in the request's order.
    Points(Box<EquilibriaOfSystem<'a>>),
    /// The last of a stream that ends well.
    Summary(SweepSummary),
    /// The last of a stream that does not.
    Problem(ProblemBody<'a>),
}

/// What the equilibria of all systems have in common.
#[derive(Serialize, ToSchema)]
#[schema(as = EquilibriaHeader)]
pub(crate) struct SweepHeader {
    /// The units of all numbers.
    units: UnitsEcho,
    /// The frame of all positions.
    frame: FrameEcho,
    /// Which Jacobi constant is meant.
    jacobi_form: JacobiForm,
}

/// How the computation for all systems ended.
#[derive(Serialize, ToSchema)]
#[schema(as = EquilibriaSummary)]
pub(crate) struct SweepSummary {
    /// `complete`.
    outcome: &'static str,
    /// How many systems ended in which way.
    outcomes: BTreeMap<&'static str, usize>,
    /// The worst of all systems.
    evidence: EquilibriaEvidence,
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
#[derive(Serialize, ToSchema)]
pub(crate) struct EquilibriaSweep<'a> {
    /// The units of all numbers.
    units: UnitsEcho,
    /// The frame of all positions.
    frame: FrameEcho,
    /// Which Jacobi constant is meant.
    jacobi_form: JacobiForm,
    /// The worst of all systems.
    evidence: EquilibriaEvidence,
    /// The systems in the request's order, each with its equilibria.
    systems: Vec<EquilibriaOfSystem<'a>>,
}

/// One system of many, with its equilibria.
#[derive(Serialize, ToSchema)]
pub(crate) struct EquilibriaOfSystem<'a> {
    /// Its index in the request.
    index: usize,
    /// The system.
    system: SystemEcho<'a>,
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

impl EquilibriaSweep<'_> {
    /// The answer without its systems.
    pub(super) fn new(units: Units, frame: Frame, jacobi_form: JacobiForm, largest_residual: f64) -> Self {
        let SweepHeader { units, frame, jacobi_form } = SweepHeader::new(units, frame, jacobi_form);
        let evidence = EquilibriaEvidence { largest_residual };
        Self { units, frame, jacobi_form, evidence, systems: Vec::new() }
    }
}

impl SweepHeader {
    pub(super) fn new(units: Units, frame: Frame, jacobi_form: JacobiForm) -> Self {
        Self { units: UnitsEcho(units), frame: frame.into(), jacobi_form }
    }
}

impl SweepSummary {
    pub(super) fn new(count: usize, largest_residual: f64) -> Self {
        const COMPLETE: &str = "complete";
        let evidence = EquilibriaEvidence { largest_residual };
        Self { outcome: COMPLETE, outcomes: BTreeMap::from([(COMPLETE, count)]), evidence }
    }
}

impl<'a> EquilibriaOfSystem<'a> {
    pub(super) fn new(index: usize, system: &'a System, solution: Solution) -> Self {
        Self { index, system: system.into(), solution }
    }
}

impl Solution {
    pub(super) fn of(conventions: &Conventions, form: JacobiForm) -> Self {
        let equilibria = Equilibria::of(conventions.system.mass_parameter());
        Self {
            critical_mass_parameter: ROUTH,
            evidence: EquilibriaEvidence { largest_residual: equilibria.largest_residual() },
            points: Point::ALL.map(|point| PointEcho::new(equilibria.get(point), conventions, form)),
        }
    }

    pub(super) fn largest_residual(&self) -> f64 {
        self.evidence.largest_residual
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
