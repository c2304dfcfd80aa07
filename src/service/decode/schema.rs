//! Helpers of the published schema.

use utoipa::ToSchema;
use utoipa::openapi::schema::{AdditionalProperties, AnyOfBuilder, ObjectBuilder, SchemaType, Type};
use utoipa::openapi::{Ref, RefOr, Schema};

use super::Decode;

/// Schemas that go by a name.
pub type Schemas = Vec<(String, RefOr<Schema>)>;

/// A type whose schema goes by a name.
pub trait Named {
    /// Its name among the document's schemas.
    const NAME: &'static str;
}

/// The schema with a description, which a reference may bear as well.
#[must_use]
pub fn with_description(schema: RefOr<Schema>, description: &str) -> RefOr<Schema> {
    if description.is_empty() {
        return schema;
    }
    let description = description.trim().to_owned();
    match schema {
        RefOr::Ref(mut reference) => {
            reference.description = description;
            RefOr::Ref(reference)
        }
        RefOr::T(mut schema) => {
            match &mut schema {
                Schema::Object(object) => {
                    object.description = Some(joined(description, object.description.take()));
                }
                Schema::Array(array) => array.description = Some(description),
                Schema::OneOf(one) => one.description = Some(description),
                Schema::AllOf(all) => all.description = Some(description),
                Schema::AnyOf(any) => any.description = Some(description),
                _ => {}
            }
            RefOr::T(schema)
        }
    }
}

/// What a member is, and then what its quantity and unit are.
fn joined(member: String, quantity: Option<String>) -> String {
    match quantity {
        Some(quantity) => format!("{member} ({quantity})"),
        None => member,
    }
}

/// The schema that takes `null` as well.
#[must_use]
pub fn nullable(schema: RefOr<Schema>) -> RefOr<Schema> {
    let add = |kind: &mut SchemaType| {
        if let SchemaType::Type(one) = kind {
            *kind = SchemaType::Array(vec![one.clone(), Type::Null]);
        }
    };
    match schema {
        RefOr::T(Schema::Object(mut object)) if object.enum_values.is_none() => {
            add(&mut object.schema_type);
            RefOr::T(Schema::Object(object))
        }
        RefOr::T(Schema::Array(mut array)) => {
            add(&mut array.schema_type);
            RefOr::T(Schema::Array(array))
        }
        other => {
            let null = ObjectBuilder::new().schema_type(Type::Null);
            RefOr::T(AnyOfBuilder::new().item(other).item(null).build().into())
        }
    }
}

/// Adds the schema of `T` to `named`, once, with those it refers to, and refers to it.
#[must_use]
pub fn by_name<T: ToSchema + Named>(named: &mut Schemas) -> RefOr<Schema> {
    if named.iter().all(|(name, _)| name != T::NAME) {
        named.push((T::NAME.to_owned(), T::schema()));
        T::schemas(named);
    }
    RefOr::Ref(Ref::from_schema_name(T::NAME))
}

/// The schema of a choice among names.
#[must_use]
pub fn one_of_names(names: &'static [&'static str], description: &str) -> RefOr<Schema> {
    let object = ObjectBuilder::new().schema_type(Type::String).enum_values(Some(names.iter().copied()));
    with_description(RefOr::T(object.build().into()), description)
}

/// A member's name without the `r#` that the language asks for where it is a keyword.
#[must_use]
pub const fn plain(name: &'static str) -> &'static str {
    match name.as_bytes() {
        [b'r', b'#', ..] => name.split_at(2).1,
        _ => name,
    }
}

/// Builds the schema of an object that has no members but its own.
pub struct ClosedObject(ObjectBuilder);

impl ClosedObject {
    /// An object without members.
    #[must_use]
    pub fn new(description: &str) -> Self {
        let object = ObjectBuilder::new().schema_type(Type::Object).description(Some(description.trim()));
        Self(object.additional_properties(Some(AdditionalProperties::FreeForm(false))))
    }

    /// Adds a member that must be there.
    pub fn required<T: Decode>(&mut self, name: &str, description: &str) {
        let schema = with_description(T::describe(&mut Vec::new()), description);
        self.0 = std::mem::take(&mut self.0).property(name, schema).required(name);
    }

    /// Adds a member that may be absent or `null`.
    pub fn optional<T: Decode>(&mut self, name: &str, description: &str) {
        let schema = with_description(nullable(T::describe(&mut Vec::new())), description);
        self.0 = std::mem::take(&mut self.0).property(name, schema);
    }

    /// Adds an example, a JSON text.
    pub fn example(&mut self, text: &str) {
        let example: serde_json::Value = serde_json::from_str(text).unwrap_or_default();
        self.0 = std::mem::take(&mut self.0).examples([example]);
    }

    /// The schema.
    #[must_use]
    pub fn build(self) -> RefOr<Schema> {
        RefOr::T(self.0.build().into())
    }
}
