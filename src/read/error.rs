//! What is wrong with a file, where, what was expected, what was found, and what to do about it.

use std::fmt;

use itertools::Itertools;

/// A place in a file. Lines and columns count from one, columns in characters; zero means the whole file or line.
#[derive(Clone, Debug, Default, PartialEq, Eq, PartialOrd, Ord)]
pub struct Location {
    /// File name as the user wrote it.
    pub file: String,
    /// Line, from one; zero for the whole file.
    pub line: usize,
    /// Column in characters, from one; zero for the whole line.
    pub column: usize,
}

impl fmt::Display for Location {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match (self.line, self.column) {
            (0, _) => write!(f, "{}", self.file),
            (line, 0) => write!(f, "{}:{line}", self.file),
            (line, column) => write!(f, "{}:{line}:{column}", self.file),
        }
    }
}

/// One thing that is wrong with an input.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Complaint {
    /// Where.
    pub at: Location,
    /// What was expected, without the word: `a wavenumber in cm⁻¹`.
    pub expected: String,
    /// What is there: `34O2`; empty when nothing is.
    pub found: String,
    /// What to do about it; empty when there is nothing to say.
    pub hint: String,
    /// The offending line, shortened; empty when there is none.
    pub excerpt: String,
    /// How many characters the caret underlines; zero hides the excerpt.
    pub width: usize,
}

impl Complaint {
    /// A complaint about a whole file.
    pub fn about_file(file: &str, expected: impl Into<String>, found: impl Into<String>) -> Self {
        Self {
            at: Location { file: file.to_owned(), line: 0, column: 0 },
            expected: expected.into(),
            found: found.into(),
            hint: String::new(),
            excerpt: String::new(),
            width: 0,
        }
    }

    /// A complaint about a place in `line_text`.
    pub fn at(
        file: &str,
        line: usize,
        column: usize,
        width: usize,
        line_text: &str,
        expected: impl Into<String>,
        found: impl Into<String>,
    ) -> Self {
        Self {
            at: Location { file: file.to_owned(), line, column },
            expected: expected.into(),
            found: found.into(),
            hint: String::new(),
            excerpt: line_text.to_owned(),
            width: width.max(1),
        }
    }

    /// The same complaint with a hint.
    #[must_use]
    pub fn hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = hint.into();
        self
    }
}

/// Longest value shown in a message, in characters; more is cut and marked.
const SHOWN: usize = 60;

/// Longest excerpt shown, in characters.
const EXCERPT: usize = 110;

/// A value for a message: control characters escaped, long ones cut.
pub fn shown(value: &str) -> String {
    let mut text: String = value.chars().take(SHOWN).flat_map(char::escape_debug).collect();
    if value.chars().nth(SHOWN).is_some() {
        text.push('…');
    }
    // `escape_debug` also escapes quotes, which read badly between backticks.
    text.replace("\\'", "'").replace("\\\"", "\"")
}

impl fmt::Display for Complaint {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "error: {}: expected {}", self.at, self.expected)?;
        if self.found.is_empty() {
            write!(f, ", found nothing")?
        } else {
            write!(f, ", found `{}`", shown(&self.found))?
        }
        if self.width > 0 && self.at.line > 0 {
            // A window round the place keeps long lines readable.
            let column = self.at.column.max(1);
            let start = column.saturating_sub(EXCERPT / 2 + 1);
            let clean = |c: char| if c.is_control() { ' ' } else { c };
            let excerpt: String = self.excerpt.chars().skip(start).take(EXCERPT).map(clean).collect();
            let number = self.at.line.to_string();
            let margin = " ".repeat(number.len());
            let lead = " ".repeat(column - 1 - start);
            let carets = "^".repeat(self.width.min(EXCERPT.saturating_sub(lead.len()).max(1)));
            write!(f, "\n  {number} | {}\n  {margin} | {lead}{carets}", excerpt.trim_end())?;
            if !self.hint.is_empty() {
                write!(f, "  hint: {}", self.hint)?;
            }
        } else if !self.hint.is_empty() {
            write!(f, "\n  hint: {}", self.hint)?;
        }
        Ok(())
    }
}

/// All complaints about an input; never empty when it is an error.
#[derive(Clone, Debug, Default, PartialEq, Eq, thiserror::Error)]
pub struct Complaints(pub Vec<Complaint>);

/// How many complaints are printed in full; the rest are counted.
const PRINTED: usize = 50;

impl fmt::Display for Complaints {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", self.0.iter().take(PRINTED).join("\n"))?;
        if self.0.len() > PRINTED {
            write!(f, "\n… and {} more of the kind", self.0.len() - PRINTED)?;
        }
        Ok(())
    }
}

impl From<Complaint> for Complaints {
    fn from(one: Complaint) -> Self {
        Self(vec![one])
    }
}

impl Complaints {
    /// `value` when there is nothing to complain about.
    ///
    /// # Errors
    /// These complaints, when there are any.
    pub fn or<T>(self, value: T) -> Result<T, Complaints> {
        if self.0.is_empty() { Ok(value) } else { Err(self) }
    }
}
