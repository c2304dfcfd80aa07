//! Impulsive changes of velocity.

use nalgebra::{Matrix3, Matrix6, Vector3};

use crate::arithmetic::DoubleDouble;
use crate::frame::{Axes, Frame};
use crate::state::State;

/// An impulse at an instant.
#[derive(Clone, Debug, PartialEq)]
pub struct Manoeuvre {
    /// Instant on the absolute clock.
    pub time: f64,
    /// Change of velocity along `axes`.
    pub delta_v: Vector3<f64>,
    /// The axes of the change.
    pub axes: BurnAxes,
    /// The trajectories it applies to; `None` for all.
    pub trajectories: Option<Vec<usize>>,
}

/// The axes an impulse is given in.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub enum BurnAxes {
    /// The request's frame.
    #[default]
    Frame,
    /// Along v, r × v and v × (r × v) of the state before, in the request's frame.
    VelocityNormalBinormal,
}

impl Manoeuvre {
    /// The velocity of the default frame that is added to a state, `seen` in the request's frame, and d(state
    /// after)/d(state before) in the default one; none where the state leaves an axis of the burn undefined.
    pub(super) fn impulse(&self, frame: Frame, seen: &State) -> Option<(Vector3<f64>, Option<Matrix6<f64>>)> {
        match self.axes {
            BurnAxes::Frame => Some((frame.direction_to_default(seen.time, &self.delta_v), None)),
            BurnAxes::VelocityNormalBinormal => {
                let (change, slopes) = along_velocity(&seen.position, &seen.velocity, &self.delta_v)?;
                let mut jump = Matrix6::identity();
                jump.fixed_view_mut::<3, 3>(3, 0).copy_from(&slopes[0]);
                jump.fixed_view_mut::<3, 3>(3, 3).copy_from(&(Matrix3::identity() + slopes[1]));
                let to_frame = frame.jacobian(seen.time);
                let jump = frame.inverse_jacobian(seen.time) * jump * to_frame;
                Some((frame.direction_to_default(seen.time, &change), Some(jump)))
            }
        }
    }
}

type Precise = [DoubleDouble; 3];

impl Manoeuvre {
    /// The velocity that is added to a state, both of the default frame, in double-double arithmetic; none where the
    /// state leaves an axis of the burn undefined. `origin` is the x of the request's frame. A change along axes at rest
    /// is turned into rotating ones in double precision: these very components are what it means.
    pub(super) fn precise_impulse(
        &self,
        frame: Frame,
        origin: DoubleDouble,
        state: &[DoubleDouble; 6],
    ) -> Option<Precise> {
        if self.axes == BurnAxes::Frame {
            let change = frame.direction_to_default(self.time, &self.delta_v);
            return Some([change.x, change.y, change.z].map(DoubleDouble::from));
        }
        let [x, y, z, vx, vy, vz] = *state;
        let r = [x - origin, y, z];
        // Along the velocity as the request's frame sees it, in the rotating axes.
        let v = if frame.axes == Axes::Inertial { [vx - r[1], vy + r[0], vz] } else { [vx, vy, vz] };
        let normal = cross(&r, &v);
        let mut change = Precise::default();
        for (component, direction) in
            [(self.delta_v.x, v), (self.delta_v.y, normal), (self.delta_v.z, cross(&v, &normal))]
        {
            if component == 0.0 {
                continue;
            }
            let [a, b, c] = direction.map(DoubleDouble::squared);
            let length = (a + b + c).sqrt();
            if length == DoubleDouble::default() {
                return None;
            }
            let factor = DoubleDouble::from(component) / length;
            change = std::array::from_fn(|i| change[i] + direction[i] * factor);
        }
        Some(change)
    }
}

fn cross(a: &Precise, b: &Precise) -> Precise {
    [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]
}

/// The change of velocity with the components `along` v, r × v and v × (r × v), and its derivatives with respect
/// to r and v; none where it has a component along a direction that is not defined, v = 0 or r parallel to v.
fn along_velocity(
    r: &Vector3<f64>,
    v: &Vector3<f64>,
    along: &Vector3<f64>,
) -> Option<(Vector3<f64>, [Matrix3<f64>; 2])> {
    let normal = r.cross(v);
    let binormal = v.cross(&normal);
    // The unnormalised directions' derivatives with respect to r and v.
    let normal_by = [-v.cross_matrix(), r.cross_matrix()];
    let binormal_by =
        [v.cross_matrix() * normal_by[0], v.cross_matrix() * normal_by[1] - normal.cross_matrix()];
    let velocity_by = [Matrix3::zeros(), Matrix3::identity()];

    let mut change = Vector3::zeros();
    let mut slopes = [Matrix3::zeros(); 2];
    for (component, direction, by) in
        [(along.x, v, velocity_by), (along.y, &normal, normal_by), (along.z, &binormal, binormal_by)]
    {
        let length = direction.norm();
        if component == 0.0 {
            continue;
        }
        if length == 0.0 {
            return None;
        }
        let unit = direction / length;
        change += component * unit;
        let projector = (Matrix3::identity() - unit * unit.transpose()) * (component / length);
        slopes[0] += projector * by[0];
        slopes[1] += projector * by[1];
    }
    Some((change, slopes))
}
