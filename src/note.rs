//! An answer together with what to know about it.

use serde::Serialize;

/// Something doubtful but usable, or something the reader should know: one sentence, and a hint where there is one.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
pub struct Note(pub String);

impl Note {
    /// A note saying `text`.
    pub fn new(text: impl Into<String>) -> Self {
        Self(text.into())
    }
}

impl std::fmt::Display for Note {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(&self.0)
    }
}

/// A value and the notes that go with it.
#[derive(Clone, Debug, PartialEq)]
pub struct Noted<T> {
    /// The answer.
    pub value: T,
    /// What to know about it, in order of appearance.
    pub notes: Vec<Note>,
}

impl<T> Noted<T> {
    /// A value without notes.
    pub fn plain(value: T) -> Self {
        Self { value, notes: Vec::new() }
    }

    /// The same notes about another value.
    pub fn map<U>(self, f: impl FnOnce(T) -> U) -> Noted<U> {
        Noted { value: f(self.value), notes: self.notes }
    }
}
