//! Numbers, strings and arrays.

use mechanics::quantity::{OutOfRange, Quantity, Range};
use utoipa::openapi::schema::{ArrayBuilder, ObjectBuilder, Type};
use utoipa::openapi::{RefOr, Schema};

use super::{Decode, Errors, Node, Path, Schemas};

/// A double as JSON writes it: the shortest digits that read back to the same bits.
#[must_use]
pub fn written(value: f64) -> String {
    let text = format!("{value:?}");
    text.strip_suffix(".0").map_or_else(|| text.clone(), ToOwned::to_owned)
}

/// What to say of a number outside its range.
#[must_use]
pub fn refusal(error: &OutOfRange) -> String {
    let Range { min, max, above } = error.range;
    let (min, max, value) = (written(min), written(max), written(error.value));
    if above {
        format!("must be a finite number above {min} and at most {max}, got {value}")
    } else {
        format!("must be a finite number from {min} to {max}, got {value}")
    }
}

/// The quantity of that value; outside its range a fault at that place.
pub fn quantity<Q: Quantity>(value: f64, at: Path<'_>, errors: &mut Errors) -> Option<Q> {
    match Q::new(value) {
        Ok(quantity) => Some(quantity),
        Err(error) => {
            errors.push(at, refusal(&error));
            None
        }
    }
}

impl Decode for f64 {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        if let Node::Number(value) = node {
            Some(*value)
        } else {
            errors.push(at, format!("must be a finite number, got {}", node.kind()));
            None
        }
    }

    fn describe(_: &mut Schemas) -> RefOr<Schema> {
        RefOr::T(ObjectBuilder::new().schema_type(Type::Number).build().into())
    }
}

/// A number checked against the range of its quantity.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Scalar<Q>(pub Q);

impl<Q: Quantity> Decode for Scalar<Q> {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        let value = f64::decode(node, at, errors)?;
        quantity(value, at, errors).map(Self)
    }

    fn describe(_: &mut Schemas) -> RefOr<Schema> {
        let Range { min, max, above } = Q::RANGE;
        let object =
            ObjectBuilder::new().schema_type(Type::Number).description(Some(Q::WHAT)).maximum(Some(max));
        let object = if above { object.exclusive_minimum(Some(min)) } else { object.minimum(Some(min)) };
        RefOr::T(object.build().into())
    }
}

/// Counts beyond this are beyond every limit; a double still tells them apart.
pub const MANY: u64 = 1 << 53;

/// An integer from `MIN` to `MAX`; `5.0` is one, `5.5` is not.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Integer<const MIN: u64, const MAX: u64>(pub u64);

/// Integers above this are not all doubles, so a JSON reader may have changed them.
const EXACT: f64 = 9_007_199_254_740_992.0;

impl<const MIN: u64, const MAX: u64> Decode for Integer<MIN, MAX> {
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "checked to be an exact integer"
    )]
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        let got = match node {
            Node::Number(value) if (0.0..=EXACT).contains(value) && value.fract() == 0.0 => {
                let integer = *value as u64;
                if (MIN..=MAX).contains(&integer) {
                    return Some(Self(integer));
                }
                written(*value)
            }
            Node::Number(value) => written(*value),
            _ => node.kind().to_owned(),
        };
        errors.push(at, format!("must be an integer from {MIN} to {MAX}, got {got}"));
        None
    }

    fn describe(_: &mut Schemas) -> RefOr<Schema> {
        #[expect(clippy::cast_precision_loss, reason = "bounds are small or round")]
        let (min, max) = (MIN as f64, MAX as f64);
        let object = ObjectBuilder::new().schema_type(Type::Integer).minimum(Some(min)).maximum(Some(max));
        RefOr::T(object.build().into())
    }
}

impl Decode for bool {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        if let Node::Bool(value) = node {
            Some(*value)
        } else {
            errors.push(at, format!("must be true or false, got {}", node.kind()));
            None
        }
    }

    fn describe(_: &mut Schemas) -> RefOr<Schema> {
        RefOr::T(ObjectBuilder::new().schema_type(Type::Boolean).build().into())
    }
}

/// A string of at most [`Text::MAX`] characters.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Text(pub String);

impl Text {
    /// Longest name that is worth repeating in an answer.
    pub const MAX: usize = 200;
}

impl Decode for Text {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        match node {
            Node::String(text) if text.chars().count() <= Self::MAX => Some(Self(text.clone().into_owned())),
            Node::String(_) => {
                errors.push(at, format!("must have at most {} characters", Self::MAX));
                None
            }
            _ => {
                errors.push(at, format!("must be a string, got {}", node.kind()));
                None
            }
        }
    }

    fn describe(_: &mut Schemas) -> RefOr<Schema> {
        let object = ObjectBuilder::new().schema_type(Type::String).max_length(Some(Self::MAX));
        RefOr::T(object.build().into())
    }
}

/// How many items an array has; anything else is a fault.
fn length(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<usize> {
    match node {
        Node::Numbers(numbers) => Some(numbers.len()),
        Node::Vectors(vectors) => Some(vectors.len()),
        Node::Array(nodes) => Some(nodes.len()),
        _ => {
            errors.push(at, format!("must be an array, got {}", node.kind()));
            None
        }
    }
}

/// Decodes an item of an array that has it.
fn item<T: Decode>(node: &Node<'_>, index: usize, at: Path<'_>, errors: &mut Errors) -> Option<T> {
    let at = at.item(index);
    match node {
        Node::Numbers(numbers) => T::decode(&Node::Number(*numbers.get(index)?), at, errors),
        Node::Vectors(vectors) => T::decode(&Node::Numbers(vectors.get(index)?.to_vec()), at, errors),
        Node::Array(nodes) => T::decode(nodes.get(index)?, at, errors),
        _ => None,
    }
}

impl<T: Decode> Decode for Vec<T> {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        // Every item is decoded, so that all faults are found, and the list is good only if all of them are.
        let length = length(node, at, errors)?;
        let mut list = Vec::with_capacity(length);
        list.extend((0..length).filter_map(|index| item(node, index, at, errors)));
        (list.len() == length).then_some(list)
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        RefOr::T(ArrayBuilder::new().items(T::describe(named)).build().into())
    }
}

impl<T: Decode, const N: usize> Decode for [T; N] {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        let length = length(node, at, errors)?;
        if length != N {
            errors.push(at, format!("must have exactly {N} items, got {length}"));
            return None;
        }
        let items: [Option<T>; N] = std::array::from_fn(|index| item(node, index, at, errors));
        let good = items.iter().all(Option::is_some);
        good.then(|| items.map(|item| item.expect("all of them are good")))
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        let array = ArrayBuilder::new().items(T::describe(named)).min_items(Some(N)).max_items(Some(N));
        RefOr::T(array.build().into())
    }
}
