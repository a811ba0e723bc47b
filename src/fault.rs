//! Faults as users meet them: a code, one sentence, the place, and the way out.
//!
//! Each module keeps its own error enum, with data in its variants; [`Explain`] says how such an error reads.
//! [`Fault`] is what a session hands on, made from anything that explains itself. This file knows no module.

use std::fmt;
use std::sync::Arc;

/// What every module's error can say of itself.
pub trait Explain: fmt::Display {
    /// A kebab-case phrase that names the fault; never reused for another one.
    fn code(&self) -> &'static str;
    /// The way out, in one sentence. Never empty.
    fn hint(&self) -> String;
}

/// A place in a notebook or script: cell, line and column, both counted from 1 in characters.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Place {
    pub cell: Arc<str>,
    pub line: u32,
    pub column: u32,
}

impl fmt::Display for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match (self.line, self.column) {
            (0, _) => write!(f, "{}", self.cell),
            (line, 0) => write!(f, "{}, line {line}", self.cell),
            (line, column) => write!(f, "{}, line {line}, column {column}", self.cell),
        }
    }
}

/// The form of an error that users see.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Fault {
    code: &'static str,
    message: String,
    hint: String,
    place: Option<Place>,
    /// Functions that were being called, innermost first, each with the place of the call.
    calls: Vec<(String, Option<Place>)>,
}

impl Fault {
    pub fn new(code: &'static str, message: impl Into<String>, hint: impl Into<String>) -> Self {
        Fault { code, message: message.into(), hint: hint.into(), place: None, calls: Vec::new() }
    }

    pub fn code(&self) -> &'static str {
        self.code
    }

    pub fn message(&self) -> &str {
        &self.message
    }

    pub fn hint(&self) -> &str {
        &self.hint
    }

    pub fn place(&self) -> Option<&Place> {
        self.place.as_ref()
    }

    pub fn calls(&self) -> &[(String, Option<Place>)] {
        &self.calls
    }

    /// The same fault with a place, unless it already has a more exact one.
    #[must_use]
    pub fn at(mut self, place: Option<Place>) -> Self {
        if self.place.is_none() {
            self.place = place;
        }
        self
    }

    /// The same fault with more said about the way out.
    #[must_use]
    pub fn adding(mut self, more: &str) -> Self {
        self.hint.push_str("; ");
        self.hint.push_str(more);
        self
    }

    /// The same fault, raised while `function` was being called.
    #[must_use]
    pub fn within(mut self, function: impl Into<String>, place: Option<Place>) -> Self {
        self.calls.push((function.into(), place));
        self
    }
}

impl<E: Explain> From<E> for Fault {
    fn from(error: E) -> Self {
        Fault::new(error.code(), error.to_string(), error.hint())
    }
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", self.message)?;
        if let Some(place) = &self.place {
            write!(f, "\n  at: {place}")?;
        }
        for (function, place) in &self.calls {
            match place {
                Some(place) => write!(f, "\n  in: {function}, called at {place}")?,
                None => write!(f, "\n  in: {function}")?,
            }
        }
        write!(f, "\n  try: {}", self.hint)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_first_place_is_kept_since_it_is_the_innermost() {
        let place = |line| Some(Place { cell: "cell-1".into(), line, column: 2 });
        let fault = Fault::new("some-code", "no", "go on").at(place(3)).at(place(9));
        assert_eq!(fault.place().unwrap().line, 3);
        assert_eq!(fault.to_string(), "no\n  at: cell-1, line 3, column 2\n  try: go on");
    }
}
