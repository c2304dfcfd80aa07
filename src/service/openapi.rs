//! The `OpenAPI` document: generated from the code, completed here with what all operations have in common.

use utoipa::OpenApi;
use utoipa::openapi::path::Operation;
use utoipa::openapi::response::ResponseBuilder;
use utoipa::openapi::schema::{ObjectBuilder, Schema, Type};
use utoipa::openapi::{Components, ContentBuilder, HeaderBuilder, OpenApi as Document, Ref, RefOr};

use crate::problem;

/// What the document says of the whole service.
#[derive(OpenApi)]
#[openapi(
    info(title = "Synodia", description = ABOUT),
    components(schemas(problem::ProblemBody)),
    tags(
        (name = "systems", description = "The catalogue of primaries and their equilibrium points"),
        (name = "states", description = "Energies and conversions of states"),
        (name = "motion", description = "Propagation of states"),
        (name = "server", description = "The server itself: limits, version, health, documentation"),
    )
)]
pub struct Api;

const ABOUT: &str = "\
Computations in the circular restricted three-body problem: equilibrium points, Jacobi constants, conversions and \
trajectories, for any pair of primaries.

**Mind the idealisation.** Both primaries are point masses on circular orbits about their barycentre, and no other \
force acts. Answers are for analysis and for first designs, not for operating a spacecraft: whatever flies is \
verified by a qualified flight-dynamics team with a full force model.

Units are normalised unless a request asks for others: the distance of the primaries, the sum of their masses and \
their mean motion are 1. The larger primary lies at x = -mu, the smaller at x = 1 - mu, and both turn \
counter-clockwise. Requests are strict: an unknown member is an error. Every failure is a problem (RFC 9457) of one \
of the kinds explained at `/problems/{slug}`.";

/// The name under which the failures' schema is referred to.
const PROBLEM_SCHEMA: &str = "Problem";

/// Adds to every operation what the framework around it does: its problems, its headers, its example.
pub fn complete(document: &mut Document) {
    let components = document.components.take().unwrap_or_default();
    for item in document.paths.paths.values_mut() {
        for operation in [&mut item.get, &mut item.post].into_iter().flatten() {
            describe(operation, &components);
        }
    }
    document.components = Some(components);
}

fn describe(operation: &mut Operation, components: &Components) {
    let request_id = HeaderBuilder::new()
        .schema(Some(ObjectBuilder::new().schema_type(Type::String)))
        .description(Some("Id of the request: the client's if it sent a sane one"))
        .build();
    for response in operation.responses.responses.values_mut() {
        if let RefOr::T(response) = response {
            response.headers.insert("x-request-id".to_owned(), request_id.clone().into());
        }
    }
    for (status, description) in
        [("4XX", "The request cannot be answered: a problem"), ("5XX", "The server cannot answer: a problem")]
    {
        let content = ContentBuilder::new().schema(Some(Ref::from_schema_name(PROBLEM_SCHEMA))).build();
        let response = ResponseBuilder::new()
            .description(description)
            .content(problem::MEDIA_TYPE, content)
            .header("x-request-id", request_id.clone())
            .build();
        operation.responses.responses.entry(status.to_owned()).or_insert(response.into());
    }
    let Some(RefOr::T(body)) = operation.request_body.as_mut() else { return };
    for content in body.content.values_mut() {
        let RefOr::T(content) = content else { continue };
        if content.example.is_none() {
            content.example = content.schema.as_ref().and_then(|schema| example(schema, components));
        }
    }
}

/// The example of a schema, which its request's type has.
fn example(schema: &RefOr<Schema>, components: &Components) -> Option<serde_json::Value> {
    match schema {
        RefOr::Ref(reference) => {
            let name = reference.ref_location.rsplit('/').next()?;
            example(components.schemas.get(name)?, components)
        }
        RefOr::T(Schema::Object(object)) => object.examples.first().cloned(),
        RefOr::T(_) => None,
    }
}
