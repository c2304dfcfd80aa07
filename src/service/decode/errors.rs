//! Faults of a request, collected with their places.

use std::fmt::Write;

use crate::problem::{Fault, Place, Problem, Slug};

/// More faults than this are counted but not listed: a person reads the first few.
const LISTED: usize = 100;
/// Longer names and texts of the client are cut in messages.
const QUOTED: usize = 80;

/// A place in the request, a chain of borrowed steps that becomes a JSON pointer only when there is a fault.
#[derive(Clone, Copy, Debug)]
pub struct Path<'a> {
    up: Option<&'a Path<'a>>,
    step: Step<'a>,
}

#[derive(Clone, Copy, Debug)]
enum Step<'a> {
    Root,
    Member(&'a str),
    Index(usize),
}

impl<'a> Path<'a> {
    /// The whole body.
    pub const ROOT: Path<'static> = Path { up: None, step: Step::Root };

    /// A member of the object at this place.
    #[must_use]
    pub fn member(&'a self, name: &'a str) -> Self {
        Self { up: Some(self), step: Step::Member(name) }
    }

    /// An item of the array at this place.
    #[must_use]
    pub fn item(&'a self, index: usize) -> Self {
        Self { up: Some(self), step: Step::Index(index) }
    }

    /// The JSON pointer (RFC 6901).
    #[must_use]
    pub fn pointer(&self) -> String {
        let mut pointer = self.up.map_or_else(String::new, Path::pointer);
        match self.step {
            Step::Root => {}
            Step::Member(name) => {
                pointer.push('/');
                pointer.push_str(&shortened(name).replace('~', "~0").replace('/', "~1"));
            }
            Step::Index(index) => {
                let _ = write!(pointer, "/{index}");
            }
        }
        pointer
    }
}

/// A client's text cut to a length that a message can bear.
pub(super) fn shortened(text: &str) -> String {
    if text.len() <= QUOTED {
        return text.to_owned();
    }
    text.chars().take(QUOTED).chain(['…']).collect()
}

/// The faults found so far.
#[derive(Debug, Default)]
pub struct Errors {
    faults: Vec<Fault>,
    count: usize,
    in_query: bool,
}

impl Errors {
    /// Faults of a request whose members are query parameters.
    #[must_use]
    pub fn in_query() -> Self {
        Self { in_query: true, ..Self::default() }
    }

    /// Adds a fault; `detail` says what would be right.
    pub fn push(&mut self, at: Path<'_>, detail: impl Into<String>) {
        self.add(at, detail.into(), None);
    }

    /// Adds the fault of asking for `asked` of `what` where the server grants at most `limit`.
    pub fn beyond(&mut self, at: Path<'_>, what: &str, limit: u64, asked: u64) {
        self.add(at, format!("at most {limit} {what} are granted, got {asked}"), Some((limit, asked)));
    }

    /// Adds a fault at the place that the JSON pointer `rest` leads to from `at`.
    pub fn push_under(&mut self, at: Path<'_>, rest: &str, detail: impl Into<String>) {
        self.add_under(at, rest, detail.into(), None);
    }

    fn add(&mut self, at: Path<'_>, detail: String, beyond: Option<(u64, u64)>) {
        self.add_under(at, "", detail, beyond);
    }

    fn add_under(&mut self, at: Path<'_>, rest: &str, detail: String, beyond: Option<(u64, u64)>) {
        self.count += 1;
        if self.faults.len() < LISTED {
            let pointer = at.pointer() + rest;
            let place = if self.in_query {
                Place::Parameter(pointer.rsplit('/').next().unwrap_or_default().to_owned())
            } else {
                Place::Pointer(pointer)
            };
            self.faults.push(Fault { place, detail, beyond });
        }
    }

    /// What a member is called where this request has it.
    #[must_use]
    pub fn noun(&self) -> &'static str {
        if self.in_query { "parameter" } else { "member" }
    }

    /// How many faults there are so far.
    #[must_use]
    pub fn count(&self) -> usize {
        self.count
    }

    /// `value` if nothing was wrong.
    ///
    /// # Errors
    /// The problem that lists every fault: `work-limit` if all are requests for too much, else `invalid-request`.
    pub fn finish<T>(self, value: Option<T>) -> Result<T, Problem> {
        match value {
            Some(value) if self.count == 0 => Ok(value),
            None if self.count == 0 => Err(Problem::internal(&"a request was refused without a reason")),
            _ => Err(self.into()),
        }
    }
}

impl From<Errors> for Problem {
    fn from(errors: Errors) -> Self {
        let excessive = errors.faults.iter().all(|fault| fault.beyond.is_some());
        let slug = if excessive { Slug::WorkLimit } else { Slug::InvalidRequest };
        let what = errors.noun();
        let mut detail = match (errors.count, excessive) {
            (1, true) => format!("1 {what} asks for too much"),
            (n, true) => format!("{n} {what}s ask for too much"),
            (1, false) => format!("1 {what} is not valid"),
            (n, false) => format!("{n} {what}s are not valid"),
        };
        if errors.count > LISTED {
            let _ = write!(detail, "; the first {LISTED} are listed");
        }
        Problem::new(slug, detail).with_errors(errors.faults)
    }
}
