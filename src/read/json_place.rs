//! Where a value stands in JSON text, for complaints about values that parse but make no sense.

/// One step from a JSON value into it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Step<'a> {
    /// The member of that name.
    Key(&'a str),
    /// The element of that number, from zero.
    Index(usize),
}

/// Byte offset of the value that `path` leads to in `text`; `None` when it leads nowhere. The text must be valid JSON (it
/// was parsed before); on other text the answer is meaningless, but no panic.
pub(super) fn offset_of(text: &str, path: &[Step<'_>]) -> Option<usize> {
    let bytes = text.as_bytes();
    let mut at = blank(bytes, 0);
    for step in path {
        at = match *step {
            Step::Key(key) => member(text, at, key)?,
            Step::Index(index) => element(bytes, at, index)?,
        };
    }
    (at < bytes.len()).then_some(at)
}

/// Line and column (in characters, both from one) of a byte offset, and the line's text.
pub(super) fn line_and_column(text: &str, offset: usize) -> (usize, usize, &str) {
    let offset = (0..=offset.min(text.len())).rev().find(|at| text.is_char_boundary(*at)).unwrap_or(0);
    let start = text[..offset].rfind('\n').map_or(0, |at| at + 1);
    let end = text[offset..].find('\n').map_or(text.len(), |at| offset + at);
    let line = 1 + text[..start].matches('\n').count();
    (line, 1 + text[start..offset].chars().count(), &text[start..end])
}

fn blank(bytes: &[u8], mut at: usize) -> usize {
    while bytes.get(at).is_some_and(u8::is_ascii_whitespace) {
        at += 1;
    }
    at
}

/// Behind the string that begins at `at`.
fn behind_string(bytes: &[u8], at: usize) -> usize {
    let mut at = at + 1;
    while let Some(byte) = bytes.get(at) {
        match byte {
            b'\\' => at += 2,
            b'"' => return at + 1,
            _ => at += 1,
        }
    }
    bytes.len()
}

/// Behind the value that begins at `at`; nesting is counted, not descended into.
fn behind_value(bytes: &[u8], mut at: usize) -> usize {
    let mut depth = 0_usize;
    while let Some(byte) = bytes.get(at) {
        match byte {
            b'"' => {
                at = behind_string(bytes, at);
                if depth == 0 {
                    return at;
                }
                continue;
            }
            b'[' | b'{' => depth += 1,
            b']' | b'}' if depth <= 1 => return if depth == 1 { at + 1 } else { at },
            b']' | b'}' => depth -= 1,
            b',' if depth == 0 => return at,
            _ => {}
        }
        at += 1;
    }
    bytes.len()
}

fn member(text: &str, object: usize, key: &str) -> Option<usize> {
    let bytes = text.as_bytes();
    if bytes.get(object) != Some(&b'{') {
        return None;
    }
    let mut at = blank(bytes, object + 1);
    let mut found = None;
    while bytes.get(at) == Some(&b'"') {
        let end = behind_string(bytes, at);
        let name = text.get(at + 1..end.saturating_sub(1))?;
        at = blank(bytes, blank(bytes, end) + 1);
        if name == key {
            // Of members with one name the last counts, as in the parser.
            found = Some(at);
        }
        at = blank(bytes, behind_value(bytes, at));
        if bytes.get(at) != Some(&b',') {
            break;
        }
        at = blank(bytes, at + 1);
    }
    found
}

fn element(bytes: &[u8], array: usize, index: usize) -> Option<usize> {
    if bytes.get(array) != Some(&b'[') {
        return None;
    }
    let mut at = blank(bytes, array + 1);
    for _ in 0..index {
        at = blank(bytes, behind_value(bytes, at));
        if bytes.get(at) != Some(&b',') {
            return None;
        }
        at = blank(bytes, at + 1);
    }
    Some(at)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_path_leads_to_its_value_past_strings_with_brackets() {
        let text = "{ \"a\": \"]}\\\"\",\n  \"b\": {\"c\": [1, [2, 3], {\"x\": 4}]}}";
        let at =
            offset_of(text, &[Step::Key("b"), Step::Key("c"), Step::Index(2), Step::Key("x")]).expect("it is there");
        assert_eq!(&text[at..=at], "4");
        let (line, column, _) = line_and_column(text, at);
        assert_eq!((line, column), (2, 32));
        assert_eq!(offset_of(text, &[Step::Key("z")]), None);
        assert_eq!(offset_of(text, &[Step::Key("b"), Step::Key("c"), Step::Index(9)]), None);
    }
}
