//! Spectra as columns of text: comma, semicolon, tab or blanks; decimal point or comma; headers of any kind or none.
//!
//! The separator and the decimal sign are the pair that makes numbers of the most lines. What stands before the first line
//! of numbers is searched for units and metadata; what cannot be read after it is complained about with its place.

use super::error::{Complaint, Complaints};
use super::spectrum::{
    LIMITS, MOST_COMPLAINTS, MOST_POINTS, RawPoint, RawSpectrum, SpectrumOptions, about_line, assemble, axis_of,
    numbered_lines, ordinate_of,
};
use crate::band::Spectrum;
use crate::note::{Note, Noted};

/// How the cells of a line are cut.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
struct Layout {
    /// `None` stands for runs of blanks.
    separator: Option<char>,
    decimal_comma: bool,
}

/// Layouts in the order of preference when they read equally many lines.
const LAYOUTS: [Layout; 7] = [
    Layout { separator: Some('\t'), decimal_comma: false },
    Layout { separator: Some(';'), decimal_comma: false },
    Layout { separator: Some(','), decimal_comma: false },
    Layout { separator: None, decimal_comma: false },
    Layout { separator: Some('\t'), decimal_comma: true },
    Layout { separator: Some(';'), decimal_comma: true },
    Layout { separator: None, decimal_comma: true },
];

/// Lines on which the layout is judged.
const JUDGED: usize = 5_000;

/// Cells looked at in one line; more are data of another kind.
const MOST_CELLS: usize = 4_096;

/// One cell: its text without blanks and quotes, and where it begins in its line, in bytes.
struct Piece<'a> {
    text: &'a str,
    offset: usize,
}

impl Layout {
    fn cut(self, line: &str) -> Vec<Piece<'_>> {
        let mut pieces = Vec::new();
        let mut push = |start: usize, end: usize| {
            let raw = &line[start..end];
            let offset = start + raw.len() - raw.trim_start().len();
            pieces.push(Piece { text: raw.trim().trim_matches('"'), offset });
        };
        match self.separator {
            Some(separator) => {
                let mut start = 0;
                for (at, _) in line.match_indices(separator).take(MOST_CELLS) {
                    push(start, at);
                    start = at + separator.len_utf8();
                }
                push(start, line.len());
            }
            None => {
                for word in line.split_whitespace().take(MOST_CELLS) {
                    let start = word.as_ptr() as usize - line.as_ptr() as usize;
                    push(start, start + word.len());
                }
            }
        }
        while pieces.len() > 2 && pieces.last().is_some_and(|p| p.text.is_empty()) {
            pieces.pop();
        }
        pieces
    }

    /// The number in a cell. The decimal sign has a digit beside it, so that `12,` is no number.
    fn number(self, text: &str) -> Option<f64> {
        let starts = text.starts_with(|c: char| c.is_ascii_digit() || "+-.,\u{2212}".contains(c));
        if !starts || text.ends_with(',') {
            return None;
        }
        let plain = text.replace('\u{2212}', "-");
        let plain = match (self.decimal_comma, plain.contains(',')) {
            (true, _) if plain.contains('.') => return None,
            (true, true) => plain.replacen(',', ".", 1),
            (false, true) => return None,
            _ => plain,
        };
        // Fortran writes the exponent of a double with D.
        plain.replace(['D', 'd'], "e").parse::<f64>().ok().filter(|v| v.is_finite())
    }

    /// The ordinate in a cell: a number, or a mark for a deleted channel.
    fn ordinate(self, text: &str) -> Option<Option<f64>> {
        if let Some(value) = self.number(text) {
            return Some(Some(value).filter(|v| !MARKS.contains(v)));
        }
        let lower = text.to_lowercase();
        ["", "nan", "-nan", "na", "n/a", "null", "-", "--", "---", "inf", "-inf", "?", "*"]
            .contains(&lower.as_str())
            .then_some(None)
    }
}

/// Numbers that mark a deleted channel in some exports (common practice, no source).
const MARKS: [f64; 4] = [-999.0, -9999.0, -99999.0, -99.0];

fn is_comment(line: &str) -> bool {
    let line = line.trim_start();
    line.is_empty() || ["#", "%", "!", "//", "*", "$"].iter().any(|mark| line.starts_with(mark))
}

/// Reads columns of text.
///
/// # Errors
/// All complaints at once, up to a limit: lines that are no numbers with their place, too long or too many lines, and those
/// of assembling a spectrum.
pub(super) fn read(name: &str, text: &str, options: &SpectrumOptions) -> Result<Noted<Spectrum>, Complaints> {
    for (number, line) in numbered_lines(text) {
        if line.len() > LIMITS.line {
            let expected = format!("a line of at most {} characters", LIMITS.line);
            let found = format!("{} bytes", line.len());
            return Err(about_line(name, number, expected, found)
                .hint("a spectrum has one point a line; is this the right file?")
                .into());
        }
    }
    let layout = layout_of(text);
    let readable = |line: &str| {
        let pieces = layout.cut(line);
        // A spectrum may begin with deleted channels.
        let marked = |p: &Piece<'_>| !p.text.is_empty() && layout.ordinate(p.text).is_some();
        pieces.len() >= 2 && layout.number(pieces[0].text).is_some() && marked(&pieces[1])
    };
    let Some(first) = numbered_lines(text).find(|(_, line)| !is_comment(line) && readable(line)).map(|(n, _)| n) else {
        let complaint = Complaint::about_file(name, "lines with two numbers: position and ordinate", "none");
        return Err(complaint.hint("columns may be separated by comma, semicolon, tab or blanks").into());
    };
    let mut raw = RawSpectrum { name: name.to_owned(), ..RawSpectrum::default() };
    let mut notes = Vec::new();
    let header = read_head(text, first, layout, &mut raw);
    let width = numbered_lines(text).find(|(n, _)| *n == first).map_or(2, |(_, line)| layout.cut(line).len());
    let (x_at, y_at) = choose_columns(name, &header, width, options, &mut notes)?;
    // Blanks inside the names of columns make more names than columns: then the whole line describes both.
    let described = |at: usize| match header.len() == width {
        true => header[at].clone(),
        false => header.join(" "),
    };
    // A stated unit goes before the name of a column.
    raw.axis_words = if raw.axis_words.is_empty() { described(x_at) } else { raw.axis_words };
    raw.ordinate_words = if raw.ordinate_words.is_empty() { described(y_at) } else { raw.ordinate_words };
    raw.medium_words = if raw.medium_words.is_empty() { described(x_at) } else { raw.medium_words };
    let mut complaints = Complaints::default();
    for (number, line) in numbered_lines(text).skip(first - 1) {
        if is_comment(line) || line.chars().all(|c| matches!(c, ',' | ';' | '\t' | ' ')) {
            continue;
        }
        if raw.points.len() == MOST_POINTS {
            let complaint = about_line(name, number, format!("at most {MOST_POINTS} points"), "more");
            return Err(complaint.hint("cut the file to the part that matters").into());
        }
        if complaints.0.len() >= MOST_COMPLAINTS {
            break;
        }
        let pieces = layout.cut(line);
        let complain = |piece: Option<&Piece<'_>>, expected: &str| {
            let offset = piece.map_or(line.len(), |p| p.offset);
            let column = 1 + line.get(..offset).map_or(0, |t| t.chars().count());
            let found = piece.map_or("", |p| p.text);
            let complaint = Complaint::at(name, number, column, found.chars().count().max(1), line, expected, found);
            match found.contains(',') && layout.separator == Some(',') {
                true => complaint.hint("decimal commas need another separator than the comma"),
                false if layout.decimal_comma => complaint.hint("the other lines have decimal commas"),
                false => complaint.hint("digits with a decimal point, like 0.5612; a comment begins with #"),
            }
        };
        let x = match pieces.get(x_at).map(|p| layout.number(p.text)) {
            Some(Some(x)) => x,
            _ => {
                complaints.0.push(complain(pieces.get(x_at), "a position"));
                continue;
            }
        };
        match pieces.get(y_at).map(|p| layout.ordinate(p.text)) {
            Some(Some(y)) => raw.points.push(RawPoint { x, y, line: number }),
            _ => complaints.0.push(complain(pieces.get(y_at), "an ordinate")),
        }
    }
    complaints.or(())?;
    assemble(raw, options, notes)
}

/// The layout that makes numbers of the first two cells of the most lines; when a few lines have a header each, the
/// numbers win.
fn layout_of(text: &str) -> Layout {
    let mut scores = [0_usize; LAYOUTS.len()];
    for (_, line) in numbered_lines(text).filter(|(_, line)| !is_comment(line)).take(JUDGED) {
        for (score, layout) in scores.iter_mut().zip(LAYOUTS) {
            let pieces = layout.cut(line);
            *score += usize::from(pieces.len() >= 2 && pieces[..2].iter().all(|p| layout.number(p.text).is_some()));
        }
    }
    let best = scores.iter().copied().max().unwrap_or(0);
    LAYOUTS.into_iter().zip(scores).find(|(_, score)| *score == best).map_or(LAYOUTS[2], |(layout, _)| layout)
}

/// What stands before the numbers: metadata `key: value`, and the names of the columns.
fn read_head(text: &str, first: usize, layout: Layout, raw: &mut RawSpectrum) -> Vec<String> {
    let mut header = Vec::new();
    let mut title_line = None;
    for (_, line) in numbered_lines(text).take(first - 1).take(1_000) {
        let plain = line.trim().trim_start_matches(['#', '%', '!', '/', '*', '$']).trim();
        if plain.is_empty() {
            continue;
        }
        let pair = plain.split_once([':', '=']).map(|(key, value)| {
            let value = value.trim().trim_matches(['"', ',', ';', '\t', ' ']);
            (key.trim().to_lowercase().replace([' ', '_'], "-"), value.to_owned())
        });
        match pair {
            Some((key, value)) => match key.as_str() {
                "medium" => raw.medium_words = value,
                "axis" | "unit" | "x-unit" | "x-units" | "xunits" | "x" => raw.axis_words = value,
                "ordinate" | "y-unit" | "y-units" | "yunits" | "y" => raw.ordinate_words = value,
                "sample" | "title" | "name" => raw.title = value,
                "resolution" => {
                    let number: String =
                        value.chars().take_while(|c| c.is_ascii_digit() || matches!(c, '.' | 'e' | '-')).collect();
                    raw.resolution = number.parse().ok();
                }
                _ => {}
            },
            None if !line.trim_start().starts_with(['#', '%', '!', '/', '*', '$']) || axis_of(plain).is_some() => {
                let names = std::mem::take(&mut header);
                header = layout.cut(plain).into_iter().map(|p| p.text.to_owned()).collect();
                // A row of units below the row of names: both describe the columns.
                if names.len() == header.len()
                    && names.iter().any(|n| ordinate_of(n).is_some())
                    && !header.iter().any(|n| ordinate_of(n).is_some())
                {
                    header = names.iter().zip(&header).map(|(name, unit)| format!("{name} {unit}")).collect();
                }
                // A header may be separated otherwise than the numbers below it.
                if header.len() < 2 {
                    header = LAYOUTS
                        .into_iter()
                        .map(|other| other.cut(plain).into_iter().map(|p| p.text.to_owned()).collect::<Vec<_>>())
                        .find(|cells| cells.len() == 2)
                        .unwrap_or(header);
                }
                title_line.get_or_insert_with(|| plain.to_owned());
            }
            None => {
                title_line.get_or_insert_with(|| plain.to_owned());
            }
        }
    }
    if raw.title.is_empty()
        && let Some(line) = title_line.filter(|line| *line != header.join(",") && axis_of(line).is_none())
    {
        raw.title = line;
    }
    header
}

/// Columns of the axis and of the ordinate, from zero: as asked, else by their names, else the first two.
fn choose_columns(
    name: &str,
    header: &[String],
    width: usize,
    options: &SpectrumOptions,
    notes: &mut Vec<Note>,
) -> Result<(usize, usize), Complaints> {
    // A header of another width than the data does not name the columns.
    let names: &[String] = if header.len() == width { header } else { &[] };
    let is_axis = |text: &String| {
        let lower = text.to_lowercase();
        axis_of(text).is_some() || lower.starts_with("wavel") || lower.starts_with("lambda") || lower == "λ"
    };
    let x_at = names.iter().position(is_axis).unwrap_or(0);
    let y_at = match &options.column {
        Some(wanted) => {
            let by_number = wanted.trim().parse::<usize>().ok().filter(|n| (1..=width).contains(n)).map(|n| n - 1);
            let by_name = names.iter().position(|n| n.eq_ignore_ascii_case(wanted.trim()));
            by_name.or(by_number).filter(|at| *at != x_at).ok_or_else(|| {
                Complaint::about_file(name, format!("a column `{wanted}` of ordinates"), "none of that name or number")
                    .hint(format!(
                        "there are {width} columns: {}",
                        if names.is_empty() { "unnamed".to_owned() } else { names.join(", ") }
                    ))
            })?
        }
        None => {
            names.iter().position(|n| !is_axis(n) && ordinate_of(n).is_some()).unwrap_or(if x_at == 0 { 1 } else { 0 })
        }
    };
    if width > 2 && options.column.is_none() {
        let what = names.get(y_at).map_or_else(|| format!("column {}", y_at + 1), |n| format!("column `{n}`"));
        notes
            .push(Note::new(format!("{name}: of {width} columns, {what} is taken as the ordinate (--column chooses)")));
    }
    Ok((x_at, y_at))
}
