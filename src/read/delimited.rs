//! Delimited text as it is met in real life: byte-order mark, CRLF, comma, semicolon or tab, decimal comma, `#` metadata
//! before the header, blank lines anywhere. Cells keep their place, so that a complaint can point at them.

use std::io::Read;
use std::path::Path;

use super::error::{Complaint, Complaints};
use crate::note::Note;

/// Limits against files that are something else.
#[derive(Clone, Copy, Debug)]
pub struct Limits {
    /// Largest file, bytes.
    pub bytes: u64,
    /// Most data rows.
    pub rows: usize,
    /// Longest line, characters.
    pub line: usize,
}

impl Default for Limits {
    /// Generous for tables typed by people or written by programs: 16 MiB, 100 000 rows, 100 000 characters a line.
    fn default() -> Self {
        Self { bytes: 16 << 20, rows: 100_000, line: 100_000 }
    }
}

/// The text of a file, refused when larger than `limits.bytes`.
///
/// # Errors
/// A complaint about the file: not there, not readable, too large, not UTF-8 (with the place of the first bad byte).
pub fn text_of(path: &Path, limits: Limits) -> Result<String, Complaints> {
    let name = path.display().to_string();
    let refuse = |expected: &str, found: String| Complaints::from(Complaint::about_file(&name, expected, found));
    let file = std::fs::File::open(path).map_err(|e| refuse("a file that can be read", e.to_string()))?;
    if file.metadata().is_ok_and(|m| m.is_dir()) {
        return Err(refuse("a file", "a folder".to_owned()));
    }
    let mut bytes = Vec::new();
    file.take(limits.bytes + 1)
        .read_to_end(&mut bytes)
        .map_err(|e| refuse("a file that can be read", e.to_string()))?;
    utf8(&name, bytes, limits)
}

/// The text of `bytes`, refused when too large or not UTF-8. UTF-16 with a byte-order mark is read, since spreadsheets
/// write it.
///
/// # Errors
/// As for [`text_of`].
pub fn utf8(name: &str, bytes: Vec<u8>, limits: Limits) -> Result<String, Complaints> {
    if bytes.len() as u64 > limits.bytes {
        let complaint = Complaint::about_file(
            name,
            format!("at most {} MiB", limits.bytes >> 20),
            format!("more than {} bytes", limits.bytes),
        );
        return Err(complaint.hint("is this the right file? Cut it to the part that matters").into());
    }
    let utf16 = |order: fn([u8; 2]) -> u16| {
        let units: Vec<u16> = bytes[2..].chunks_exact(2).map(|pair| order([pair[0], pair[1]])).collect();
        String::from_utf16(&units).map_err(|_| {
            Complaints::from(Complaint::about_file(name, "text", "broken UTF-16").hint("save the file as UTF-8"))
        })
    };
    if bytes.starts_with(&[0xFF, 0xFE]) {
        return utf16(u16::from_le_bytes);
    }
    if bytes.starts_with(&[0xFE, 0xFF]) {
        return utf16(u16::from_be_bytes);
    }
    String::from_utf8(bytes).map_err(|error| {
        let good = error.utf8_error().valid_up_to();
        let bytes = error.into_bytes();
        let line = 1 + bytes[..good].iter().filter(|&&b| b == b'\n').count();
        let start = bytes[..good].iter().rposition(|&b| b == b'\n').map_or(0, |at| at + 1);
        let text = String::from_utf8_lossy(&bytes[start..(good + 40).min(bytes.len())]).into_owned();
        let column = 1 + String::from_utf8_lossy(&bytes[start..good]).chars().count();
        let first = text.lines().next().unwrap_or("").to_owned();
        Complaint::at(name, line, column, 1, &first, "UTF-8 text", format!("byte 0x{:02X}", bytes[good]))
            .hint("save the file as UTF-8; an old spreadsheet writes another encoding")
            .into()
    })
}

/// One cell with its place.
#[derive(Clone, Debug, PartialEq)]
pub struct Cell<'a> {
    /// The text without surrounding blanks and quotes.
    pub text: String,
    /// Line from one.
    pub line: usize,
    /// Column in characters, from one.
    pub column: usize,
    /// Width in characters as written.
    pub width: usize,
    line_text: &'a str,
    file: &'a str,
    decimal_comma: bool,
}

impl Cell<'_> {
    /// A complaint that points at this cell.
    pub fn complain(&self, expected: impl Into<String>) -> Complaint {
        Complaint::at(self.file, self.line, self.column, self.width, self.line_text, expected, self.text.clone())
    }

    /// The finite number in this cell.
    ///
    /// # Errors
    /// A complaint with a hint for letters that look like digits, decimal commas, units, and values that are not finite.
    pub fn number(&self, what: &str) -> Result<f64, Complaint> {
        let text = self.text.replace('\u{2212}', "-");
        let plain = if self.decimal_comma { text.replace(',', ".") } else { text.clone() };
        match plain.parse::<f64>() {
            Ok(value) if value.is_finite() => Ok(value),
            Ok(_) => Err(self.complain(what).hint("the value is not finite")),
            Err(_) => {
                let complaint = self.complain(what);
                let odd = plain.chars().enumerate().find(|(_, c)| !"0123456789+-.eE".contains(*c));
                let hint = match odd {
                    _ if text.is_empty() => "the cell is empty".to_owned(),
                    Some((at, c @ ('O' | 'o' | 'l' | 'I' | 'S' | 'B'))) => {
                        format!("character {} is the letter {c}, not a digit", at + 1)
                    }
                    Some((_, ',')) => "write the decimal point as `.`, or separate columns with `;`".to_owned(),
                    Some((_, '±')) => "put the uncertainty in its own column".to_owned(),
                    Some((_, c)) if c.is_alphabetic() => "a number only; units belong into the header".to_owned(),
                    _ => "digits with a decimal point, like 3407.5".to_owned(),
                };
                Err(complaint.hint(hint))
            }
        }
    }

    /// [`Self::number`], `None` for an empty cell.
    ///
    /// # Errors
    /// As for [`Self::number`].
    pub fn optional_number(&self, what: &str) -> Result<Option<f64>, Complaint> {
        if self.text.is_empty() { Ok(None) } else { self.number(what).map(Some) }
    }
}

/// One `# key: value` line.
#[derive(Clone, Debug, PartialEq)]
pub struct Metadatum<'a> {
    /// The key, lower case, blanks as `_`.
    pub key: String,
    /// The value with its place.
    pub value: Cell<'a>,
}

/// A table of cells under a header.
#[derive(Clone, Debug)]
pub struct Delimited<'a> {
    /// File name to show.
    pub file: &'a str,
    /// Metadata lines in order.
    pub metadata: Vec<Metadatum<'a>>,
    /// Column names: lower case, trimmed, blanks as `_`.
    pub header: Vec<Cell<'a>>,
    /// Data rows: as many cells as the header has.
    pub rows: Vec<Vec<Cell<'a>>>,
    /// The separator.
    pub separator: char,
    /// What to know.
    pub notes: Vec<Note>,
}

/// Cuts one line at `separator`, respecting double quotes.
fn cells<'a>(file: &'a str, line_text: &'a str, line: usize, separator: char, decimal_comma: bool) -> Vec<Cell<'a>> {
    let mut list = Vec::new();
    let (mut text, mut start, mut quoted) = (String::new(), 0usize, false);
    let push = |text: &mut String, start: usize, end: usize, list: &mut Vec<Cell<'a>>| {
        let lead = text.chars().take_while(|c| c.is_whitespace()).count();
        let trimmed = text.trim();
        let mut clean = trimmed.to_owned();
        if trimmed.len() >= 2 && trimmed.starts_with('"') && trimmed.ends_with('"') {
            clean = trimmed[1..trimmed.len() - 1].replace("\"\"", "\"").trim().to_owned();
        }
        let width = if trimmed.is_empty() { 1 } else { trimmed.chars().count() };
        let column = if trimmed.is_empty() { start.min(end) + 1 } else { start + lead + 1 };
        list.push(Cell { text: clean, line, column, width, line_text, file, decimal_comma });
        text.clear();
    };
    for (at, c) in line_text.chars().enumerate() {
        if c == '"' {
            quoted = !quoted;
        }
        if c == separator && !quoted {
            push(&mut text, start, at, &mut list);
            start = at + 1;
        } else {
            text.push(c);
        }
    }
    push(&mut text, start, line_text.chars().count(), &mut list);
    list
}

/// Whether a quoted field is still open at the end of the line.
fn unbalanced(line: &str) -> bool {
    line.matches('"').count() % 2 == 1
}

impl<'a> Delimited<'a> {
    /// Reads `text` as a table with a header; `columns` are the known column names, used to find the header and to
    /// propose one for a misspelt column.
    ///
    /// # Errors
    /// All complaints of layout: empty file, no header, missing `required` columns, duplicate columns, rows of the
    /// wrong length, open quotes, too many rows, too long lines. A file that is refused for its size gives one complaint.
    pub fn parse(
        file: &'a str,
        text: &'a str,
        columns: &[&str],
        required: &[&str],
        limits: Limits,
    ) -> Result<Self, Complaints> {
        let text = text.strip_prefix('\u{feff}').unwrap_or(text);
        let mut complaints = Complaints::default();
        let mut raw_metadata: Vec<(usize, &'a str)> = Vec::new();
        let mut header_line: Option<(usize, &'a str)> = None;
        let mut body: Vec<(usize, &'a str)> = Vec::new();
        for (index, raw) in text.split('\n').enumerate() {
            let (number, line) = (index + 1, raw.trim_end_matches('\r'));
            if line.len() > limits.line {
                let found = format!("{} characters", line.chars().count());
                let cut: &str = &line[..line.char_indices().nth(40).map_or(line.len(), |(at, _)| at)];
                let expected = format!("a line of at most {} characters", limits.line);
                return Err(Complaint::at(file, number, 1, 1, cut, expected, found)
                    .hint("is this a table? A spectrum or a binary file has no place here")
                    .into());
            }
            if line.trim().is_empty() || line.chars().all(|c| matches!(c, ',' | ';' | '\t' | ' ')) {
                continue;
            }
            if line.trim_start().starts_with('#') {
                if header_line.is_none() {
                    raw_metadata.push((number, line));
                }
                continue;
            }
            if header_line.is_none() {
                header_line = Some((number, line));
            } else if body.len() == limits.rows {
                let expected = format!("at most {} rows", limits.rows);
                return Err(Complaint::at(file, number, 1, 1, line, expected, "more")
                    .hint("is this the right file? A mode table or band list is short")
                    .into());
            } else {
                body.push((number, line));
            }
        }
        let Some((header_number, header_text)) = header_line else {
            return Err(Complaint::about_file(file, format!("a header with {}", required.join(", ")), "")
                .hint("the first line that is not a `# key: value` comment names the columns")
                .into());
        };
        let separator = [',', ';', '\t']
            .into_iter()
            .max_by_key(|s| (header_text.matches(*s).count(), *s == ','))
            .filter(|s| header_text.contains(*s))
            .unwrap_or(',');
        let decimal_comma = separator == ';' || (separator == '\t' && !text.contains('.'));
        let mut header = cells(file, header_text, header_number, separator, false);
        for cell in &mut header {
            cell.text = cell.text.to_lowercase().replace(' ', "_");
        }
        while header.len() > 1 && header.last().is_some_and(|cell| cell.text.is_empty()) {
            header.pop();
        }
        let metadata = raw_metadata
            .into_iter()
            .filter_map(|(line, text)| {
                let hash = text.find('#')?;
                let inner = &text[hash + 1..];
                let colon = inner.find(':')?;
                let key = inner[..colon].trim().to_lowercase().replace(' ', "_");
                let raw = &inner[colon + 1..];
                // A spreadsheet that rewrites the file pads metadata lines with separators.
                let value = raw.trim().trim_end_matches([';', ',', '\t']).trim();
                let start = hash + 1 + colon + 1 + (raw.len() - raw.trim_start().len());
                let column = 1 + text[..start].chars().count();
                let width = value.chars().count().max(1);
                let value =
                    Cell { text: value.to_owned(), line, column, width, line_text: text, file, decimal_comma: false };
                Some(Metadatum { key, value })
            })
            .collect();
        let mut notes = Vec::new();
        for (index, cell) in header.iter().enumerate() {
            if header[..index].iter().any(|earlier| earlier.text == cell.text) {
                complaints.0.push(cell.complain("each column once").hint("remove or rename the second one"));
            } else if !columns.contains(&cell.text.as_str()) {
                notes.push(Note::new(format!("{file}: column `{}` is not used", super::error::shown(&cell.text))));
            }
        }
        for name in required {
            if !header.iter().any(|cell| cell.text == *name) {
                let near = header.iter().find(|cell| {
                    !columns.contains(&cell.text.as_str()) && (cell.text.contains(name) || close(&cell.text, name))
                });
                let complaint = Complaint::at(
                    file,
                    header_number,
                    near.map_or(1, |cell| cell.column),
                    near.map_or(header_text.chars().count(), |cell| cell.width),
                    header_text,
                    format!("a column `{name}`"),
                    near.map_or(header_text, |cell| cell.text.as_str()),
                );
                complaints.0.push(complaint.hint(match near {
                    Some(_) => format!("rename it to `{name}`"),
                    None => format!("the columns {} are required", required.join(", ")),
                }));
            }
        }
        let mut rows = Vec::with_capacity(body.len());
        for (number, line) in body {
            if unbalanced(line) {
                let column = 1 + line.chars().position(|c| c == '"').unwrap_or(0);
                complaints.0.push(
                    Complaint::at(file, number, column, 1, line, "a closing double quote on the same line", "")
                        .hint("a quoted cell may not run over several lines here"),
                );
                continue;
            }
            let mut row = cells(file, line, number, separator, decimal_comma);
            while row.len() > header.len() && row.last().is_some_and(|cell| cell.text.is_empty()) {
                row.pop();
            }
            if row.len() > header.len() {
                let extra = &row[header.len()];
                complaints.0.push(
                    Complaint::at(
                        file,
                        number,
                        extra.column,
                        extra.width,
                        line,
                        format!("{} cells as in the header", header.len()),
                        format!("{} cells", row.len()),
                    )
                    .hint("quote a cell that contains the separator, and write decimals with a point"),
                );
                continue;
            }
            // A short row is a row whose last cells are empty: spreadsheets and people drop them.
            while row.len() < header.len() {
                row.push(Cell {
                    text: String::new(),
                    line: number,
                    column: line.chars().count() + 1,
                    width: 1,
                    line_text: line,
                    file,
                    decimal_comma,
                });
            }
            rows.push(row);
        }
        complaints.or(Self { file, metadata, header, rows, separator, notes })
    }

    /// The number of the column called `name`.
    pub fn column(&self, name: &str) -> Option<usize> {
        self.header.iter().position(|cell| cell.text == name)
    }

    /// The cell of `row` in the column called `name`, when there is one and it is not empty.
    pub fn filled(&self, row: &[Cell<'a>], name: &str) -> Option<Cell<'a>> {
        self.column(name).and_then(|at| row.get(at)).filter(|cell| !cell.text.is_empty()).cloned()
    }

    /// The metadatum called `key`; the last one when it is given twice.
    pub fn metadatum(&self, key: &str) -> Option<&Cell<'a>> {
        self.metadata.iter().rev().find(|m| m.key == key).map(|m| &m.value)
    }
}

/// Whether two short names differ by at most two edits.
pub fn close(a: &str, b: &str) -> bool {
    distance(a, b) <= 2.min(a.chars().count().min(b.chars().count()) / 2)
}

/// Levenshtein distance.
fn distance(a: &str, b: &str) -> usize {
    let b: Vec<char> = b.chars().collect();
    let mut row: Vec<usize> = (0..=b.len()).collect();
    for (i, ca) in a.chars().enumerate() {
        let mut diagonal = row[0];
        row[0] = i + 1;
        for (j, cb) in b.iter().enumerate() {
            let next = (diagonal + usize::from(ca != *cb)).min(row[j] + 1).min(row[j + 1] + 1);
            diagonal = row[j + 1];
            row[j + 1] = next;
        }
    }
    row[b.len()]
}

/// The closest of `known` names to a misspelt one.
pub fn closest<'k>(name: &str, known: impl IntoIterator<Item = &'k str>) -> Option<&'k str> {
    known.into_iter().map(|k| (distance(name, k), k)).filter(|(_, k)| close(name, k)).min().map(|(_, k)| k)
}
