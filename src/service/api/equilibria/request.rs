use std::time::Duration;

use mechanics::frame::Frame;
use mechanics::units::Units;
use utoipa::openapi::{RefOr, Schema};

use crate::config::Limits;
use crate::decode::{Decode, Errors, Field, Node, Path, Schemas, request};
use crate::wire::{
    Axes, Conventions, FrameSpec, JacobiForm, LengthUnit, LimitsSpec, Origin, SystemSpec, TimeUnit,
    UnitsSpec, VelocityUnit, XAxis, rotating,
};

/// Systems in a request.
const SYSTEMS: usize = 10_000;

/// What to call them in a refusal of inertial axes.
const WHAT: &str = "equilibria";

request! {
    /// Which system's equilibria, and in what to give them.
    #[example("example.json")]
    pub(crate) struct EquilibriaRequest {
        /// The primaries; either this or `systems`.
        optional system: SystemSpec,
        /// Up to 10,000 systems, for sweeps over the mass parameter; either this or `system`.
        optional systems: Vec<SystemSpec>,
        /// Units of the answer; normalised if absent.
        optional units: UnitsSpec,
        /// Frame of the positions; its axes must be rotating.
        optional frame: FrameSpec,
        /// Which Jacobi constant; plain if absent.
        optional jacobi_form: JacobiForm,
        /// How much the computation may take.
        optional limits: LimitsSpec,
    }
}

/// A checked request.
#[derive(Debug)]
pub(crate) struct Task {
    pub(super) subject: Subject,
    pub(super) form: JacobiForm,
    pub(super) wall_time: Duration,
}

/// Whose equilibria.
#[derive(Debug)]
pub(crate) enum Subject {
    /// One system's.
    One(Box<Conventions>),
    /// Those of each of many systems, in common units and frame.
    Many { each: Vec<Conventions>, units: Units, frame: Frame },
}

impl Subject {
    pub(super) fn count(&self) -> usize {
        match self {
            Self::One(_) => 1,
            Self::Many { each, .. } => each.len(),
        }
    }
}

impl EquilibriaRequest {
    pub(super) fn task(self, limits: &Limits, errors: &mut Errors) -> Option<Task> {
        let granted = LimitsSpec::check(self.limits, limits, errors);
        let axes = Path::ROOT.member("frame");
        let frame = rotating(self.frame, axes.member("axes"), WHAT, errors);
        let subject = match (self.system, self.systems) {
            (system, Field::Absent) if !system.is_absent() => {
                Conventions::check(system, self.units, frame, errors).map(Box::new).map(Subject::One)
            }
            (Field::Absent, systems) if !systems.is_absent() => many(systems, self.units, frame, errors),
            _ => {
                errors.push(Path::ROOT, "must have exactly one of `system` and `systems`");
                None
            }
        };
        Some(Task {
            subject: subject?,
            form: self.jacobi_form.or(JacobiForm::default())?,
            wall_time: granted?.wall_time,
        })
    }
}

fn many(
    systems: Field<Vec<SystemSpec>>,
    units: Field<UnitsSpec>,
    frame: Field<FrameSpec>,
    errors: &mut Errors,
) -> Option<Subject> {
    let (systems, UnitsSpec(units)) = (systems.given()?, units.or(UnitsSpec::default())?);
    let at = Path::ROOT.member("systems");
    let good = errors.count();
    if systems.is_empty() {
        errors.push(at, "must hold at least one system");
    }
    if systems.len() > SYSTEMS {
        let number = |count| u64::try_from(count).unwrap_or(u64::MAX);
        errors.beyond(at, "systems", number(SYSTEMS), number(systems.len()));
        return None;
    }
    let FrameSpec(frame) = frame.or(FrameSpec::default())?;
    let mut each = Vec::with_capacity(systems.len());
    for (index, SystemSpec(system)) in systems.into_iter().enumerate() {
        match units.scale(&system) {
            Ok(scale) => each.push(Conventions { system, units, scale, frame }),
            Err(missing) => errors.push(at.item(index), missing.to_string()),
        }
    }
    (errors.count() == good).then_some(Subject::Many { each, units, frame })
}

request! {
    /// The options as query parameters.
    struct EquilibriaQuery {
        /// Unit of lengths.
        optional length: LengthUnit,
        /// Unit of times.
        optional time: TimeUnit,
        /// Unit of velocities.
        optional velocity: VelocityUnit,
        /// Axes.
        optional axes: Axes,
        /// Origin.
        optional origin: Origin,
        /// Direction of the x axis.
        optional x_axis: XAxis,
        /// Which Jacobi constant.
        optional jacobi_form: JacobiForm,
    }
}

/// In what to give the equilibria of a system of the catalogue.
#[derive(Debug)]
pub(crate) struct EquilibriaOptions {
    pub(super) units: Units,
    pub(super) frame: Frame,
    pub(super) form: JacobiForm,
}

impl Decode for EquilibriaOptions {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        let query = EquilibriaQuery::decode(node, at, errors)?;
        let form = query.jacobi_form.or(JacobiForm::default());
        let units = units(query.length, query.time, query.velocity, at, errors);
        let default = Frame::default();
        let axes = query.axes.or(default.axes.into());
        let origin = query.origin.or(default.origin.into());
        let x_axis = query.x_axis.or(default.x_axis.into());
        let axes = axes.map_or(Field::Faulty, |axes| {
            let frame = Field::Given(FrameSpec(Frame { axes: axes.into(), ..default }));
            rotating(frame, at.member("axes"), WHAT, errors)
        });
        let FrameSpec(frame) = axes.given()?;
        let frame = Frame { origin: origin?.into(), x_axis: x_axis?.into(), ..frame };
        Some(Self { units: units?, frame, form: form? })
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        EquilibriaQuery::describe(named)
    }
}

fn units(
    length: Field<LengthUnit>,
    time: Field<TimeUnit>,
    velocity: Field<VelocityUnit>,
    at: Path<'_>,
    errors: &mut Errors,
) -> Option<Units> {
    if length.is_absent() && time.is_absent() && velocity.is_absent() {
        return Some(Units::Normalized);
    }
    for (name, absent) in [("length", length.is_absent()), ("time", time.is_absent())] {
        if absent {
            errors.push(at.member(name), "is required if units are not normalised");
        }
    }
    Some(Units::Physical {
        length: length.given()?.into(),
        time: time.given()?.into(),
        velocity: velocity.optional()?.map(Into::into),
    })
}
