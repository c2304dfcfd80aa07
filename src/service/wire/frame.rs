//! The frame of states, positions and velocities.

use mechanics::frame::Frame;
use serde::Serialize;
use utoipa::ToSchema;
use utoipa::openapi::{RefOr, Schema};

use crate::decode::{Decode, Errors, Field, Node, Path, Schemas, choices, request};

choices! {
    /// Axes that turn with the primaries, or fixed ones that coincide with them at time 0.
    pub enum Axes = mechanics::frame::Axes { Rotating = "rotating", Inertial = "inertial" }
}

choices! {
    /// Where coordinates are counted from. Velocities are relative to the origin.
    pub enum Origin = mechanics::frame::Origin { Barycenter = "barycenter", Larger = "larger", Smaller = "smaller" }
}

choices! {
    /// Which way the x axis points, at time 0 if the axes are inertial.
    pub enum XAxis = mechanics::frame::XAxis { TowardSmaller = "toward_smaller", TowardLarger = "toward_larger" }
}

request! {
    /// The frame of every state, position and velocity of the request and of its answer.
    pub(crate) struct FrameObject {
        /// Rotating if absent.
        optional axes: Axes,
        /// The barycentre if absent.
        optional origin: Origin,
        /// Toward the smaller primary if absent.
        optional x_axis: XAxis,
    }
}

/// A frame.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct FrameSpec(pub Frame);

impl Decode for FrameSpec {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        let object = FrameObject::decode(node, at, errors)?;
        let default = Frame::default();
        Some(Self(Frame {
            axes: object.axes.or(default.axes.into())?.into(),
            origin: object.origin.or(default.origin.into())?.into(),
            x_axis: object.x_axis.or(default.x_axis.into())?.into(),
        }))
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        FrameObject::describe(named)
    }
}

/// Refuses inertial axes, in which `what` do not rest; the fault is placed at `axes`.
pub fn rotating(
    frame: Field<FrameSpec>,
    axes: Path<'_>,
    what: &str,
    errors: &mut Errors,
) -> Field<FrameSpec> {
    match frame {
        Field::Given(FrameSpec(frame)) if !frame.is_rotating() => {
            errors.push(axes, format!("must be `rotating`: {what} need rotating axes"));
            Field::Faulty
        }
        other => other,
    }
}

/// The frame that states, positions and velocities are in.
#[derive(Clone, Copy, Debug, Serialize, ToSchema)]
#[schema(as = Frame)]
pub struct FrameEcho {
    /// Axes.
    axes: Axes,
    /// Origin.
    origin: Origin,
    /// Direction of the x axis.
    x_axis: XAxis,
}

impl From<Frame> for FrameEcho {
    fn from(frame: Frame) -> Self {
        Self { axes: frame.axes.into(), origin: frame.origin.into(), x_axis: frame.x_axis.into() }
    }
}
