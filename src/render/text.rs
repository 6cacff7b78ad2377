//! Plain text tables for people: aligned columns, no box drawing, widths in characters.

/// Alignment of a column.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Align {
    /// To the left.
    Left,
    /// To the right.
    Right,
}

/// Rows under a header, aligned; trailing blanks are cut.
pub fn columns(header: &[(&str, Align)], rows: &[Vec<String>]) -> String {
    let width = |text: &str| text.chars().count();
    let mut widths: Vec<usize> = header.iter().map(|(name, _)| width(name)).collect();
    for row in rows {
        for (at, cell) in row.iter().enumerate() {
            if let Some(w) = widths.get_mut(at) {
                *w = (*w).max(width(cell));
            }
        }
    }
    let line = |cells: &mut dyn Iterator<Item = &str>| {
        let mut text = String::new();
        for ((cell, (_, align)), w) in cells.zip(header).zip(&widths) {
            let pad = " ".repeat(w.saturating_sub(width(cell)));
            match align {
                Align::Left => text.push_str(&format!("{cell}{pad}  ")),
                Align::Right => text.push_str(&format!("{pad}{cell}  ")),
            }
        }
        format!("{}\n", text.trim_end())
    };
    let mut text = line(&mut header.iter().map(|(name, _)| *name));
    for row in rows {
        text.push_str(&line(&mut row.iter().map(String::as_str)));
    }
    text
}

/// Text broken into lines of at most `width` characters at blanks, each line after the first indented by `indent`.
pub fn wrapped(text: &str, width: usize, indent: &str) -> String {
    let mut lines = vec![String::new()];
    for word in text.split_whitespace() {
        let current = lines.last().map_or(0, |l| l.chars().count());
        let lead = if lines.len() > 1 { indent.chars().count() } else { 0 };
        if current > 0 && lead + current + 1 + word.chars().count() > width {
            lines.push(String::new());
        }
        if let Some(last) = lines.last_mut() {
            if !last.is_empty() {
                last.push(' ');
            }
            last.push_str(word);
        }
    }
    lines.join(&format!("\n{indent}"))
}

/// A probability for people: `0.87`, `0.034`, `<0.001`.
pub fn probability(p: f64) -> String {
    match p {
        p if p >= 0.995 => "1.00".to_owned(),
        p if p >= 0.1 => format!("{p:.2}"),
        p if p >= 0.001 => format!("{p:.3}"),
        _ => "<0.001".to_owned(),
    }
}
