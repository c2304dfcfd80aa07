//! Objects and choices.

use super::errors::shortened;
use super::{Decode, Errors, Node, Path};

/// A member of a request after decoding.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Field<T> {
    /// Not there, or `null` in an optional member.
    Absent,
    /// There but wrong, and reported; a missing required member too.
    Faulty,
    /// There and right.
    Given(T),
}

impl<T> Field<T> {
    /// The value, if there is a good one.
    #[must_use]
    pub fn given(self) -> Option<T> {
        match self {
            Self::Given(value) => Some(value),
            Self::Absent | Self::Faulty => None,
        }
    }

    /// The value by reference, if there is a good one.
    #[must_use]
    pub fn as_ref(&self) -> Field<&T> {
        match self {
            Self::Given(value) => Field::Given(value),
            Self::Absent => Field::Absent,
            Self::Faulty => Field::Faulty,
        }
    }

    /// The value, or `default` if the member is absent; none if it was wrong.
    #[must_use]
    pub fn or(self, default: T) -> Option<T> {
        self.or_else(|| default)
    }

    /// The value, or the default made by `default` if the member is absent; none if it was wrong.
    #[must_use]
    pub fn or_else(self, default: impl FnOnce() -> T) -> Option<T> {
        match self {
            Self::Given(value) => Some(value),
            Self::Absent => Some(default()),
            Self::Faulty => None,
        }
    }

    /// The value if given, `None` if absent; none at all if it was wrong.
    #[must_use]
    pub fn optional(self) -> Option<Option<T>> {
        match self {
            Self::Given(value) => Some(Some(value)),
            Self::Absent => Some(None),
            Self::Faulty => None,
        }
    }

    /// This member, or `other` if it is absent.
    #[must_use]
    pub fn before(self, other: Self) -> Self {
        match self {
            Self::Absent => other,
            Self::Faulty | Self::Given(_) => self,
        }
    }

    /// Whether the member is there and right.
    #[must_use]
    pub fn is_good(&self) -> bool {
        matches!(self, Self::Given(_))
    }

    /// Whether the member is not there.
    #[must_use]
    pub fn is_absent(&self) -> bool {
        matches!(self, Self::Absent)
    }
}

/// Reads the members of one object and, at the end, reports those it was not asked for.
pub struct Members<'n> {
    object: &'n [(std::borrow::Cow<'n, str>, Node<'n>)],
    at: Path<'n>,
    known: &'static [&'static str],
    not_offered: &'static [&'static str],
}

impl<'n> Members<'n> {
    /// Opens the object `node`; every member it may have is in `known`.
    pub fn open(
        node: &'n Node<'n>,
        at: Path<'n>,
        known: &'static [&'static str],
        errors: &mut Errors,
    ) -> Option<Self> {
        if let Node::Object(members) = node {
            Some(Self { object: members, at, known, not_offered: &[] })
        } else {
            errors.push(at, format!("must be an object, got {}", node.kind()));
            None
        }
    }

    /// Whether the member is there and not `null`.
    #[must_use]
    pub fn has(&self, name: &str) -> bool {
        self.find(name).is_some_and(|node| *node != Node::Null)
    }

    fn find(&self, name: &str) -> Option<&'n Node<'n>> {
        self.object.iter().find(|(known, _)| known == name).map(|(_, node)| node)
    }

    /// Names members that are understood but refused.
    pub fn not_offered(&mut self, names: &'static [&'static str]) {
        self.not_offered = names;
    }

    /// A member that must be there.
    pub fn required<T: Decode>(&mut self, name: &'static str, errors: &mut Errors) -> Field<T> {
        let at = self.at.member(name);
        if let Some(node) = self.find(name) {
            T::decode(node, at, errors).map_or(Field::Faulty, Field::Given)
        } else {
            errors.push(at, "is required");
            Field::Faulty
        }
    }

    /// A member that may be absent or `null`.
    pub fn optional<T: Decode>(&mut self, name: &'static str, errors: &mut Errors) -> Field<T> {
        match self.find(name) {
            None | Some(Node::Null) => Field::Absent,
            Some(node) => T::decode(node, self.at.member(name), errors).map_or(Field::Faulty, Field::Given),
        }
    }

    /// Reports every member that is not known.
    pub fn finish(self, errors: &mut Errors) {
        for (name, _) in self.object {
            if self.known.contains(&&**name) {
                continue;
            }
            let at = self.at.member(name);
            if self.not_offered.contains(&&**name) {
                errors.push(at, "is not offered by this server");
            } else {
                let noun = errors.noun();
                errors.push(at, format!("unknown {noun}; {}", did_you_mean(name, self.known)));
            }
        }
    }
}

/// Two words this similar (Jaro-Winkler) are taken for a slip of the pen.
const SIMILAR: f64 = 0.75;

/// "did you mean …?" with the nearest of `known`, or the list of them if none is near.
#[must_use]
pub fn did_you_mean(name: &str, known: &[&str]) -> String {
    let name = shortened(name);
    let similarity = |candidate: &&&str| strsim::jaro_winkler(&name, candidate);
    let nearest = known.iter().max_by(|a, b| similarity(a).total_cmp(&similarity(b)));
    match nearest {
        Some(nearest) if similarity(&nearest) >= SIMILAR => format!("did you mean `{nearest}`?"),
        Some(_) => format!("known are {}", listed(known)),
        None => "none is known here".to_owned(),
    }
}

/// "`a`, `b` and `c`".
pub(super) fn listed(names: &[&str]) -> String {
    let quoted: Vec<String> = names.iter().map(|name| format!("`{name}`")).collect();
    match quoted.as_slice() {
        [init @ .., last] if !init.is_empty() => format!("{} and {last}", init.join(", ")),
        _ => quoted.concat(),
    }
}

/// A choice, `"name"` or `{"name": value}`: the name, and the value where there is one. `bare` are the names
/// that stand alone, `keyed` those that take a value.
pub fn choice<'n>(
    node: &'n Node<'n>,
    at: Path<'_>,
    bare: &[&'static str],
    keyed: &[&'static str],
    errors: &mut Errors,
) -> Option<(&'static str, Option<&'n Node<'n>>)> {
    let known = |names: &[&'static str], name: &str| names.iter().find(|known| **known == name).copied();
    match node {
        Node::String(name) => {
            if let Some(name) = known(bare, name) {
                return Some((name, None));
            }
            if let Some(name) = known(keyed, name) {
                errors.push(at, format!("`{name}` needs a value: {{\"{name}\": …}}"));
            } else {
                let all: Vec<&str> = bare.iter().chain(keyed).copied().collect();
                let hint = did_you_mean(name, &all);
                errors.push(at, format!("unknown choice `{}`; {hint}", shortened(name)));
            }
        }
        Node::Object(members) if !keyed.is_empty() => match members.as_slice() {
            [(name, value)] => {
                if let Some(name) = known(keyed, name) {
                    return Some((name, Some(value)));
                }
                if let Some(name) = known(bare, name) {
                    errors.push(at, format!("`{name}` takes no value: give \"{name}\" alone"));
                } else {
                    errors.push(at.member(name), format!("unknown choice; {}", did_you_mean(name, keyed)));
                }
            }
            _ => errors.push(
                at,
                format!("must have exactly one member, one of {}, got {}", listed(keyed), members.len()),
            ),
        },
        _ => {
            let mut wanted = Vec::new();
            if !bare.is_empty() {
                wanted.push(format!("one of {}", listed(bare)));
            }
            if !keyed.is_empty() {
                wanted.push(format!("an object with one member of {}", listed(keyed)));
            }
            errors.push(at, format!("must be {}, got {}", wanted.join(" or "), node.kind()));
        }
    }
    None
}
