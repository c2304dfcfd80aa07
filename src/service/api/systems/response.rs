use mechanics::system::{System, catalogue};
use serde::Serialize;
use utoipa::ToSchema;

use crate::wire::SystemEcho;

/// The catalogue of systems.
#[derive(Serialize, ToSchema)]
pub(crate) struct Catalogue<'a> {
    /// All systems, from the Sun outwards.
    pub(super) systems: Vec<CatalogueEntry<'a>>,
}

/// A system of the catalogue with the sources of its constants.
#[derive(Serialize, ToSchema)]
pub(crate) struct CatalogueEntry<'a> {
    #[serde(flatten)]
    system: SystemEcho<'a>,
    /// Sidereal period as published, in days. The circular problem's own, 2 pi `time_s`, differs a little.
    published_period_d: f64,
    /// Every constant that the entry is made from.
    sources: Vec<PublishedConstant>,
}

/// A constant and where it was published.
#[derive(Serialize, ToSchema)]
pub(crate) struct PublishedConstant {
    /// Which constant, with its unit at the end of its name.
    constant: &'static str,
    /// Its value.
    value: f64,
    /// Where it was published.
    source: &'static str,
}

impl<'a> CatalogueEntry<'a> {
    pub(super) fn new(entry: &catalogue::Entry, system: &'a System) -> Self {
        let sources = entry.sources().map(|(constant, catalogue::Constant { value, source })| {
            PublishedConstant { constant, value, source }
        });
        Self {
            system: system.into(),
            published_period_d: entry.published_period_d(),
            sources: sources.into(),
        }
    }
}
