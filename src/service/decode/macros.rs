//! A request's types, stated once.

/// A JSON object of a request: the struct, all of its members [`Field`](super::Field)s; its decoder; and its
/// closed schema, with each member's documentation. Members are `required` or `optional`. An object that is a
/// whole request names the file with its example. Members of the contract that this server refuses are listed as
/// `not_offered`.
///
/// ```text
/// request! {
///     /// What the Jacobi constant is asked of.
///     #[example("example.json")]
///     pub struct JacobiRequest {
///         /// The primaries.
///         required system: SystemSpec,
///         /// Units of the request and of the answer; normalised if absent.
///         optional units: UnitsSpec,
///     }
/// }
/// ```
macro_rules! request {
    (
        $(#[doc = $doc:literal])* $(#[example($example:literal)])? $(#[not_offered($($refused:literal),*)])?
        $vis:vis struct $name:ident {
            $($(#[doc = $member_doc:literal])* $need:ident $member:ident: $type:ty),* $(,)?
        }
    ) => {
        $(#[doc = $doc])*
        #[derive(Clone, Debug, PartialEq)]
        $vis struct $name {
            $($(#[doc = $member_doc])* $vis $member: $crate::decode::Field<$type>,)*
        }

        impl $crate::decode::Named for $name {
            const NAME: &'static str = stringify!($name);
        }

        impl $crate::decode::Decode for $name {
            fn decode(
                node: &$crate::decode::Node<'_>,
                at: $crate::decode::Path<'_>,
                errors: &mut $crate::decode::Errors,
            ) -> Option<Self> {
                const KNOWN: &[&str] = &[$($crate::decode::plain(stringify!($member))),*];
                let mut members = $crate::decode::Members::open(node, at, KNOWN, errors)?;
                $(members.not_offered(&[$($refused),*]);)?
                let decoded = Self {
                    $($member: members.$need($crate::decode::plain(stringify!($member)), errors),)*
                };
                members.finish(errors);
                Some(decoded)
            }

            fn describe(
                named: &mut $crate::decode::Schemas,
            ) -> utoipa::openapi::RefOr<utoipa::openapi::Schema> {
                $crate::decode::by_name::<Self>(named)
            }
        }

        impl utoipa::PartialSchema for $name {
            fn schema() -> utoipa::openapi::RefOr<utoipa::openapi::Schema> {
                let mut object = $crate::decode::ClosedObject::new(concat!($($doc, "\n"),*));
                $(object.$need::<$type>(
                    $crate::decode::plain(stringify!($member)),
                    concat!($($member_doc, "\n"),*),
                );)*
                $(object.example(include_str!($example));)?
                object.build()
            }
        }

        impl utoipa::ToSchema for $name {
            fn name() -> std::borrow::Cow<'static, str> {
                std::borrow::Cow::Borrowed(stringify!($name))
            }

            fn schemas(schemas: &mut $crate::decode::Schemas) {
                $(<$type as $crate::decode::Decode>::describe(schemas);)*
            }
        }
    };
}

/// A choice among names: the enum, its decoder, its serialisation and its schema, and the way to and from the
/// computation's enum of the same variants where one is given.
///
/// ```text
/// choices! {
///     /// Whether the axes turn with the primaries.
///     pub enum Axes = mechanics::frame::Axes { Rotating = "rotating", Inertial = "inertial" }
/// }
/// ```
macro_rules! choices {
    (
        $(#[doc = $doc:literal])*
        $vis:vis enum $name:ident $(= $computed:path)? { $($variant:ident = $text:literal),* $(,)? }
    ) => {
        $(#[doc = $doc])*
        #[derive(Clone, Copy, Debug, Eq, PartialEq)]
        $vis enum $name {
            $(#[doc = concat!("`", $text, "`")] $variant,)*
        }

        impl $name {
            /// Every choice by name.
            $vis const NAMES: &'static [&'static str] = &[$($text),*];

            /// The name it goes by.
            #[must_use]
            $vis fn name(self) -> &'static str {
                match self { $(Self::$variant => $text,)* }
            }
        }

        $crate::decode::choices!(@computed $name { $($variant)* } $($computed)?);

        impl $crate::decode::Named for $name {
            const NAME: &'static str = stringify!($name);
        }

        impl $crate::decode::Decode for $name {
            fn decode(
                node: &$crate::decode::Node<'_>,
                at: $crate::decode::Path<'_>,
                errors: &mut $crate::decode::Errors,
            ) -> Option<Self> {
                match $crate::decode::choice(node, at, Self::NAMES, &[], errors)?.0 {
                    $($text => Some(Self::$variant),)*
                    _ => None,
                }
            }

            fn describe(
                named: &mut $crate::decode::Schemas,
            ) -> utoipa::openapi::RefOr<utoipa::openapi::Schema> {
                $crate::decode::by_name::<Self>(named)
            }
        }

        impl serde::Serialize for $name {
            fn serialize<S: serde::Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
                serializer.serialize_str(self.name())
            }
        }

        impl utoipa::PartialSchema for $name {
            fn schema() -> utoipa::openapi::RefOr<utoipa::openapi::Schema> {
                $crate::decode::one_of_names(Self::NAMES, concat!($($doc, "\n"),*))
            }
        }

        impl utoipa::ToSchema for $name {
            fn name() -> std::borrow::Cow<'static, str> {
                std::borrow::Cow::Borrowed(stringify!($name))
            }
        }
    };
    (@computed $name:ident { $($variant:ident)* }) => {};
    (@computed $name:ident { $($variant:ident)* } $computed:path) => {
        impl From<$name> for $computed {
            fn from(choice: $name) -> Self {
                match choice { $($name::$variant => <$computed>::$variant,)* }
            }
        }

        impl From<$computed> for $name {
            fn from(computed: $computed) -> Self {
                match computed { $(<$computed>::$variant => Self::$variant,)* }
            }
        }
    };
}

pub(crate) use {choices, request};
