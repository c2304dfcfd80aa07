//! The tree of a JSON body, and what can be wrong with one.

use std::borrow::Cow;
use std::cell::{Cell, RefCell};
use std::collections::HashSet;
use std::fmt;

use serde::Deserializer;
use serde::de::{DeserializeSeed, Error, MapAccess, SeqAccess, Visitor};

use super::errors::{Errors, shortened};
use crate::problem::{Fault, Place, Problem, Slug};

/// A JSON value. Members keep their order; arrays of numbers and of vectors, which are what bodies mostly consist of, are
/// held compactly.
#[derive(Clone, Debug, PartialEq)]
pub enum Node<'a> {
    /// `null`.
    Null,
    /// `true` or `false`.
    Bool(bool),
    /// A finite number.
    Number(f64),
    /// A string.
    String(Cow<'a, str>),
    /// An array of numbers, or an empty one.
    Numbers(Vec<f64>),
    /// An array of arrays of three numbers.
    Vectors(Vec<[f64; 3]>),
    /// Any other array.
    Array(Vec<Node<'a>>),
    /// An object.
    Object(Vec<(Cow<'a, str>, Node<'a>)>),
}

impl Node<'_> {
    /// What it is, with its article.
    #[must_use]
    pub fn kind(&self) -> &'static str {
        match self {
            Self::Null => "null",
            Self::Bool(_) => "a boolean",
            Self::Number(_) => "a number",
            Self::String(_) => "a string",
            Self::Numbers(_) | Self::Vectors(_) | Self::Array(_) => "an array",
            Self::Object(_) => "an object",
        }
    }
}

/// Objects up to this size are searched for duplicates without a hash set.
const SCANNED: usize = 16;

/// Why a body is no request.
#[derive(Debug, PartialEq)]
pub enum Malformed {
    /// Not JSON.
    Syntax {
        /// Counted from 1.
        line: usize,
        /// In bytes, counted from 1.
        column: usize,
        /// JSON pointer of the value where reading stopped.
        pointer: String,
        /// What is wrong.
        detail: String,
    },
    /// A number that no double can hold.
    Number {
        /// JSON pointer of the number.
        pointer: String,
    },
    /// More values than the server keeps.
    TooLarge {
        /// Bytes of memory granted to the tree.
        limit: usize,
    },
}

impl From<Malformed> for Problem {
    fn from(malformed: Malformed) -> Self {
        match malformed {
            Malformed::Syntax { line, column, pointer, detail } => {
                let message = format!("line {line}, column {column}: {detail}");
                let fault = Fault { place: Place::Pointer(pointer), detail, beyond: None };
                Problem::new(Slug::MalformedJson, message)
                    .with("line", line)
                    .with("column", column)
                    .with_errors(vec![fault])
            }
            Malformed::Number { pointer } => {
                let detail = "must be a finite number that a double can hold".to_owned();
                Problem::new(Slug::InvalidRequest, "1 member is not valid").with_errors(vec![Fault {
                    place: Place::Pointer(pointer),
                    detail,
                    beyond: None,
                }])
            }
            Malformed::TooLarge { limit } => Problem::new(
                Slug::ContentTooLarge,
                format!("The body's values would take more than the {limit} bytes of memory that a request is granted"),
            )
            .with("limit", limit),
        }
    }
}

/// Reads `body` as one JSON value whose tree takes about `budget` bytes at most.
///
/// # Errors
/// [`Malformed`] with the place: no UTF-8, a byte order mark, no value or more than one, a member given twice,
/// too deep a nesting, a number beyond the range of doubles, more values than the budget allows.
pub fn parse(body: &[u8], budget: usize) -> Result<Node<'_>, Malformed> {
    let text = match std::str::from_utf8(body) {
        Ok(text) => text,
        Err(error) => {
            let good = &body[..error.valid_up_to()];
            let line = good.split(|&byte| byte == b'\n').count();
            let column = good.iter().rev().take_while(|&&byte| byte != b'\n').count() + 1;
            return Err(syntax(line, column, "the body must be UTF-8, and is not from here on"));
        }
    };
    if text.starts_with('\u{feff}') {
        return Err(syntax(1, 1, "the body must not begin with a byte order mark"));
    }
    if text.trim_ascii().is_empty() {
        return Err(syntax(1, 1, "the body is empty, a JSON object is expected"));
    }
    let growth =
        Growth { limit: budget, left: Cell::new(budget), trail: RefCell::default(), fault: Cell::new(None) };
    let mut deserializer = serde_json::Deserializer::from_str(text);
    let tree =
        Seed(&growth).deserialize(&mut deserializer).and_then(|node| deserializer.end().map(|()| node));
    tree.map_err(|error| growth.explain(text, &error))
}

fn syntax(line: usize, column: usize, detail: &str) -> Malformed {
    Malformed::Syntax { line, column, pointer: String::new(), detail: detail.to_owned() }
}

enum Flaw {
    Duplicate(String),
    TooLarge,
}

/// What is shared by all levels while a tree grows.
struct Growth {
    limit: usize,
    left: Cell<usize>,
    /// Steps of the pointer to the value where reading stopped, innermost first.
    trail: RefCell<Vec<String>>,
    fault: Cell<Option<Flaw>>,
}

impl Growth {
    fn take<E: Error>(&self, bytes: usize) -> Result<(), E> {
        match self.left.get().checked_sub(bytes) {
            Some(left) => {
                self.left.set(left);
                Ok(())
            }
            None => Err(self.fail(Flaw::TooLarge)),
        }
    }

    fn fail<E: Error>(&self, flaw: Flaw) -> E {
        self.fault.set(Some(flaw));
        E::custom("refused")
    }

    fn stopped_in(&self, step: &str) {
        self.trail.borrow_mut().push(shortened(step).replace('~', "~0").replace('/', "~1"));
    }

    fn explain(&self, text: &str, error: &serde_json::Error) -> Malformed {
        let pointer: String = self.trail.borrow().iter().rev().flat_map(|step| ["/", step]).collect();
        let (line, column) = (error.line(), error.column());
        let detail = match self.fault.take() {
            Some(Flaw::TooLarge) => return Malformed::TooLarge { limit: self.limit },
            Some(Flaw::Duplicate(name)) => format!("the member `{}` is given twice", shortened(&name)),
            None => {
                let message = error.to_string();
                let message = message.rsplit_once(" at line ").map_or(message.as_str(), |(what, _)| what);
                match message {
                    "number out of range" => return Malformed::Number { pointer },
                    "recursion limit exceeded" => "the nesting is deeper than 127 levels".to_owned(),
                    "trailing characters" => "there is text after the JSON value".to_owned(),
                    _ => match word_at(text, line, column) {
                        word @ ("NaN" | "Infinity" | "-Infinity" | "inf" | "-inf" | "nan") => {
                            format!("`{word}` is no JSON number; numbers are finite")
                        }
                        _ => message.to_owned(),
                    },
                }
            }
        };
        Malformed::Syntax { line, column, pointer, detail }
    }
}

/// The word around a position, to tell what was meant.
fn word_at(text: &str, line: usize, column: usize) -> &str {
    let line = text.split('\n').nth(line.saturating_sub(1)).unwrap_or_default();
    let at = column.saturating_sub(1).min(line.len());
    let part = |byte: &u8| byte.is_ascii_alphabetic() || *byte == b'-';
    let before = line.as_bytes()[..at].iter().rev().take_while(|byte| part(byte)).count();
    let after = line.as_bytes()[at..].iter().take_while(|byte| part(byte)).count();
    line.get(at - before..at + after).unwrap_or_default()
}

#[derive(Clone, Copy)]
struct Seed<'g>(&'g Growth);

impl<'de> DeserializeSeed<'de> for Seed<'_> {
    type Value = Node<'de>;

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<Node<'de>, D::Error> {
        deserializer.deserialize_any(self)
    }
}

impl<'de> Visitor<'de> for Seed<'_> {
    type Value = Node<'de>;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a JSON value")
    }

    fn visit_unit<E: Error>(self) -> Result<Node<'de>, E> {
        Ok(Node::Null)
    }

    fn visit_bool<E: Error>(self, value: bool) -> Result<Node<'de>, E> {
        Ok(Node::Bool(value))
    }

    fn visit_f64<E: Error>(self, value: f64) -> Result<Node<'de>, E> {
        Ok(Node::Number(value))
    }

    #[expect(clippy::cast_precision_loss, reason = "JSON numbers are read as doubles, rounded to nearest")]
    fn visit_u64<E: Error>(self, value: u64) -> Result<Node<'de>, E> {
        Ok(Node::Number(value as f64))
    }

    #[expect(clippy::cast_precision_loss, reason = "JSON numbers are read as doubles, rounded to nearest")]
    fn visit_i64<E: Error>(self, value: i64) -> Result<Node<'de>, E> {
        Ok(Node::Number(value as f64))
    }

    fn visit_borrowed_str<E: Error>(self, value: &'de str) -> Result<Node<'de>, E> {
        Ok(Node::String(Cow::Borrowed(value)))
    }

    fn visit_str<E: Error>(self, value: &str) -> Result<Node<'de>, E> {
        Ok(Node::String(Cow::Owned(value.to_owned())))
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut seq: A) -> Result<Node<'de>, A::Error> {
        let mut items = Array::default();
        let mut index = 0_usize;
        loop {
            match seq.next_element_seed(self) {
                Ok(Some(item)) => items.push(item, self.0)?,
                Ok(None) => return Ok(items.into()),
                Err(error) => {
                    self.0.stopped_in(&index.to_string());
                    return Err(error);
                }
            }
            index += 1;
        }
    }

    fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<Node<'de>, A::Error> {
        let mut members: Vec<(Cow<'de, str>, Node<'de>)> = Vec::new();
        let mut seen: HashSet<Cow<'de, str>> = HashSet::new();
        while let Some(name) = map.next_key_seed(Name)? {
            let twice = if members.len() < SCANNED {
                members.iter().any(|(known, _)| *known == name)
            } else {
                if seen.is_empty() {
                    seen.extend(members.iter().map(|(known, _)| known.clone()));
                }
                !seen.insert(name.clone())
            };
            if twice {
                return Err(self.0.fail(Flaw::Duplicate(name.into_owned())));
            }
            self.0.take(size_of::<(Cow<'_, str>, Node<'_>)>())?;
            match map.next_value_seed(self) {
                Ok(value) => members.push((name, value)),
                Err(error) => {
                    self.0.stopped_in(&name);
                    return Err(error);
                }
            }
        }
        Ok(Node::Object(members))
    }
}

/// An array while it grows; at most one of the three has items.
#[derive(Default)]
struct Array<'a> {
    numbers: Vec<f64>,
    vectors: Vec<[f64; 3]>,
    others: Vec<Node<'a>>,
}

impl<'a> Array<'a> {
    fn push<E: Error>(&mut self, item: Node<'a>, growth: &Growth) -> Result<(), E> {
        match item {
            Node::Number(number) if self.vectors.is_empty() && self.others.is_empty() => {
                growth.take(size_of::<f64>())?;
                self.numbers.push(number);
            }
            // Its numbers are accounted for already.
            Node::Numbers(numbers) if self.numbers.is_empty() && self.others.is_empty() => {
                match <[f64; 3]>::try_from(numbers) {
                    Ok(vector) => self.vectors.push(vector),
                    Err(numbers) => self.push_other(Node::Numbers(numbers), growth)?,
                }
            }
            item => self.push_other(item, growth)?,
        }
        Ok(())
    }

    fn push_other<E: Error>(&mut self, item: Node<'a>, growth: &Growth) -> Result<(), E> {
        growth.take((self.numbers.len() + self.vectors.len() + 1) * size_of::<Node<'_>>())?;
        self.others.extend(self.numbers.drain(..).map(Node::Number));
        self.others.extend(self.vectors.drain(..).map(|vector| Node::Numbers(vector.to_vec())));
        self.others.push(item);
        Ok(())
    }
}

impl<'a> From<Array<'a>> for Node<'a> {
    fn from(array: Array<'a>) -> Self {
        if !array.others.is_empty() {
            Node::Array(array.others)
        } else if !array.vectors.is_empty() {
            Node::Vectors(array.vectors)
        } else {
            Node::Numbers(array.numbers)
        }
    }
}

/// Reads a member's name, borrowed where it has no escapes.
struct Name;

impl<'de> DeserializeSeed<'de> for Name {
    type Value = Cow<'de, str>;

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<Cow<'de, str>, D::Error> {
        deserializer.deserialize_str(self)
    }
}

impl<'de> Visitor<'de> for Name {
    type Value = Cow<'de, str>;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a member's name")
    }

    fn visit_borrowed_str<E: Error>(self, value: &'de str) -> Result<Cow<'de, str>, E> {
        Ok(Cow::Borrowed(value))
    }

    fn visit_str<E: Error>(self, value: &str) -> Result<Cow<'de, str>, E> {
        Ok(Cow::Owned(value.to_owned()))
    }
}

/// Reads a query string as an object of strings; a parameter given twice is a fault.
pub fn parse_query<'a>(pairs: &'a [(String, String)], errors: &mut Errors) -> Node<'a> {
    let mut members: Vec<(Cow<'a, str>, Node<'a>)> = Vec::with_capacity(pairs.len());
    for (name, value) in pairs {
        if members.iter().any(|(known, _)| known == name) {
            errors.push(super::Path::ROOT.member(name), "is given twice");
        } else {
            members.push((Cow::Borrowed(name), Node::String(Cow::Borrowed(value))));
        }
    }
    Node::Object(members)
}
