//! `GET /v1/systems` and `GET /v1/systems/{id}`: the catalogue.

mod response;

use std::sync::LazyLock;

use axum::response::Response;
use mechanics::system::catalogue;

use crate::answer::Document;
use crate::extract::{Plain, Segment};
use crate::problem::{Problem, Slug};
use crate::wire::SystemSpec;
use response::{Catalogue, CatalogueEntry};

static CATALOGUE: LazyLock<Result<Document, Problem>> = LazyLock::new(|| {
    let systems: Vec<_> = catalogue::entries().iter().map(catalogue::Entry::system).collect();
    let entries = catalogue::entries().iter().zip(&systems);
    Document::json(&Catalogue {
        systems: entries.map(|(entry, system)| CatalogueEntry::new(entry, system)).collect(),
    })
});

/// The catalogue of systems
///
/// Every constant is given with its published source. An entry can be sent wherever a request takes a `system`; its
/// `id` alone does as well.
#[utoipa::path(get, path = "/v1/systems", tag = "systems", responses((status = 200, body = Catalogue,
    description = "All systems, from the Sun outwards")))]
pub(crate) async fn systems(request: Plain) -> Result<Response, Problem> {
    CATALOGUE.as_ref().map(|document| document.respond(&request.0)).map_err(Clone::clone)
}

/// One system of the catalogue
#[utoipa::path(get, path = "/v1/systems/{id}", tag = "systems",
    params(("id" = String, Path, description = "Catalogue id", example = "earth-moon")),
    responses((status = 200, body = CatalogueEntry, description = "The system with the sources of its constants")))]
pub(crate) async fn system(Segment(id): Segment, request: Plain) -> Result<Response, Problem> {
    let entry = find(&id)?;
    Ok(Document::json(&CatalogueEntry::new(entry, &entry.system()))?.respond(&request.0))
}

/// The entry with that id.
///
/// # Errors
/// `not-found` with the nearest id.
pub(super) fn find(id: &str) -> Result<&'static catalogue::Entry, Problem> {
    catalogue::find(id).ok_or_else(|| Problem::new(Slug::NotFound, SystemSpec::unknown(id)))
}
