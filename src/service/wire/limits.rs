//! How much a request may take.

use std::time::Duration;

use crate::config::Limits;
use crate::decode::{Errors, Field, Integer, MANY, Path, request};

request! {
    /// How much the computation may take. More than the server's own limits is refused, see /v1/limits.
    pub struct LimitsSpec {
        /// Integration steps per trajectory.
        optional steps: Integer<1, MANY>,
        /// Time for the computation, in milliseconds.
        optional wall_time_ms: Integer<1, MANY>,
    }
}

/// What a request is granted.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Granted {
    /// Integration steps per trajectory.
    pub steps: u64,
    /// Time for the computation.
    pub wall_time: Duration,
}

impl LimitsSpec {
    /// Checks the member `limits` of a request against the server's own.
    pub fn check(field: Field<Self>, limits: &Limits, errors: &mut Errors) -> Option<Granted> {
        let server = Granted { steps: limits.steps, wall_time: limits.wall_time };
        let Some(asked) = field.optional()? else { return Some(server) };
        let at = Path::ROOT.member("limits");
        let steps = asked.steps.or(Integer(server.steps))?.0;
        let wall_time = asked.wall_time_ms.optional()?;
        let wall_time = wall_time.map_or(server.wall_time, |Integer(ms)| Duration::from_millis(ms));
        let good = errors.count();
        if steps > limits.steps {
            errors.beyond(at.member("steps"), "steps", limits.steps, steps);
        }
        if wall_time > limits.max_wall_time {
            let ms = |time: Duration| u64::try_from(time.as_millis()).unwrap_or(u64::MAX);
            errors.beyond(at.member("wall_time_ms"), "milliseconds", ms(limits.max_wall_time), ms(wall_time));
        }
        (errors.count() == good).then_some(Granted { steps, wall_time })
    }
}
