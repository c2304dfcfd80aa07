//! `GET /v1/systems/{id}/equilibria` and `POST /v1/equilibria`: L1 to L5 with their energies and linear motion.

mod request;
mod response;
mod sweep;

use std::sync::Arc;
use std::time::Duration;

use axum::extract::State;
use axum::response::Response;
use http::HeaderMap;

use crate::answer::{Document, Effort, JSON, NDJSON, negotiation::negotiate};
use crate::config::Limits;
use crate::decode::Errors;
use crate::extract::{Query, Segment, Submission};
use crate::operation::{self, Operation, Work};
use crate::problem::Problem;
use crate::state::App;
use crate::wire::{Axes, Conventions, JacobiForm, LengthUnit, Origin, TimeUnit, VelocityUnit, XAxis};
use request::{EquilibriaOptions, EquilibriaRequest, Subject, Task};
use response::{EquilibriaLine, EquilibriaOfOne, EquilibriaOutput, Solution};
use sweep::Sweep;

/// Equilibria of a system of the catalogue
///
/// L1 to L5 with their Jacobi constants and the linear motion about them.
#[utoipa::path(get, path = "/v1/systems/{id}/equilibria", tag = "systems",
    params(
        ("id" = String, Path, description = "Catalogue id", example = "earth-moon"),
        ("length" = Option<LengthUnit>, Query, description = "Unit of lengths, with `time`; normalised if absent"),
        ("time" = Option<TimeUnit>, Query, description = "Unit of times, with `length`; normalised if absent"),
        ("velocity" = Option<VelocityUnit>, Query, description = "Unit of velocities; length over time if absent"),
        ("axes" = Option<Axes>, Query, description = "Rotating if absent; equilibria need rotating axes"),
        ("origin" = Option<Origin>, Query, description = "Where positions are counted from; the barycentre if absent"),
        ("x_axis" = Option<XAxis>, Query, description = "Direction of the x axis; toward the smaller if absent"),
        ("jacobi_form" = Option<JacobiForm>, Query, description = "Which Jacobi constant; plain if absent"),
    ),
    responses((status = 200, body = EquilibriaOfOne, description = "The five points")))]
pub(crate) async fn of_system(
    Segment(id): Segment,
    options: Result<Query<EquilibriaOptions>, Problem>,
    headers: HeaderMap,
) -> Result<Response, Problem> {
    let system = super::systems::find(&id)?.system();
    negotiate(&headers, &[JSON])?;
    let Query(EquilibriaOptions { units, frame, form }) = options?;
    let scale = units.scale(&system).map_err(|missing| Problem::internal(&missing))?;
    let conventions = Conventions { system, units, scale, frame };
    let solution = Solution::of(&conventions, form);
    Ok(Document::json(&EquilibriaOfOne::new(conventions, form, solution))?.respond(&headers))
}

/// Equilibria of any system, or of many
///
/// L1 to L5 with their Jacobi constants and the linear motion about them. With `systems` in place of `system`, for
/// sweeps over the mass parameter, those of each; as `application/x-ndjson` a line for each, sent once it is computed.
#[utoipa::path(post, path = "/v1/equilibria", tag = "systems", request_body = EquilibriaRequest,
    responses((status = 200, description = "The five points, of one system or of each", content(
        (EquilibriaOutput = "application/json"), (EquilibriaLine = "application/x-ndjson")))))]
pub(crate) async fn equilibria(State(app): State<App>, submission: Submission) -> Result<Response, Problem> {
    operation::answer::<EquilibriaRequest>(app, submission).await
}

impl Operation for EquilibriaRequest {
    type Task = Task;
    const OFFERED: &'static [&'static str] = &[JSON, NDJSON];

    fn check(self, limits: &Limits, errors: &mut Errors) -> Option<Task> {
        self.task(limits, errors)
    }

    fn cost(task: &Task) -> Duration {
        /// Measured, with writing the answer.
        const PER_SYSTEM: Duration = Duration::from_micros(5);
        PER_SYSTEM.saturating_mul(u32::try_from(task.subject.count()).unwrap_or(u32::MAX))
    }

    fn wall_time(task: &Task) -> Option<Duration> {
        Some(task.wall_time)
    }

    fn work(task: Task, streamed: bool) -> Work {
        let Task { subject, form, .. } = task;
        match subject {
            Subject::One(conventions) if !streamed => Work::whole(move |_| {
                let solution = Solution::of(&conventions, form);
                let output = EquilibriaOfOne::new(*conventions, form, solution);
                Ok((output, Effort { steps: 1, outcome: None }))
            }),
            Subject::One(conventions) => {
                let Conventions { units, frame, .. } = *conventions;
                Work::Lines(Arc::new(Sweep::new(vec![*conventions], units, frame, form)))
            }
            Subject::Many { each, units, frame } => {
                let sweep = Arc::new(Sweep::new(each, units, frame, form));
                if streamed { Work::Lines(sweep) } else { Work::Items(sweep) }
            }
        }
    }
}
