//! Strict decoding of requests. The body becomes a light tree ([`Node`]), and the tree becomes the request's
//! type by way of [`Decode`], which collects every fault instead of stopping at the first: each member lands
//! in a [`Field`] of its own, so that checks across members run even when a sibling is wrong.
//!
//! The [`request!`] and [`choices!`] macros state a type once and derive its decoder and its published schema.

mod errors;
mod macros;
mod members;
mod node;
mod schema;
mod values;

pub use errors::{Errors, Path};
pub(crate) use macros::{choices, request};
pub use members::{Field, Members, choice, did_you_mean};
pub use node::{Malformed, Node, parse, parse_query};
pub use schema::{ClosedObject, Named, Schemas, by_name, nullable, one_of_names, plain, with_description};
pub use values::{Integer, MANY, Scalar, Text, quantity, refusal, written};

use utoipa::openapi::{RefOr, Schema};

/// A type that a request can hold.
pub trait Decode: Sized {
    /// Reads `node`, which lies `at` that place, and reports every fault in it.
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self>;

    /// Its schema as it stands where it is used; schemas with a name are added to `named` and referred to.
    fn describe(named: &mut Schemas) -> RefOr<Schema>;
}
