//! Spectra as JCAMP-DX 4.24 and 5.x.
//!
//! # Source
//! McDonald and Wilks, Appl. Spectrosc. 42, 151 (1988) (JCAMP-DX 4.24: records, AFFN, PAC, SQZ, DIF, DUP, ordinate checks,
//! compound files); Lampen et al., Appl. Spectrosc. 48, 1545 (1994) (5.00) and Pure Appl. Chem. 71, 1549 (1999) (5.01)
//! (titles of the last two from memory).
//!
//! Read are continuous spectra: `XYDATA=(X++(Y..Y))` and `XYPOINTS=(XY..XY)`. Peak tables, interferograms and n-tuples are
//! refused with a reason. A compound file with several spectra asks for the choice of one.

use itertools::Itertools;

use super::error::{Complaint, Complaints, shown};
use super::spectrum::{
    LIMITS, MOST_COMPLAINTS, MOST_POINTS, RawPoint, RawSpectrum, SpectrumOptions, about_line, assemble, numbered_lines,
};
use crate::band::Spectrum;
use crate::note::{Note, Noted};

/// One line of a record, with its number and the column of its first character, from zero.
#[derive(Clone, Copy, Debug)]
struct Line<'a> {
    text: &'a str,
    whole: &'a str,
    number: usize,
    column: usize,
}

impl Line<'_> {
    /// A complaint about the characters from byte `start` to byte `end` of this line.
    fn complain(&self, name: &str, start: usize, end: usize, expected: impl Into<String>) -> Complaint {
        let before = self.text.get(..start).map_or(0, |t| t.chars().count());
        let found = self.text.get(start..end).unwrap_or("");
        let (column, width) = (self.column + before + 1, found.chars().count());
        Complaint::at(name, self.number, column, width, self.whole, expected, shown(found))
    }
}

/// One labelled record: label in canonical form, and the lines of its value without comments.
#[derive(Debug)]
struct Record<'a> {
    label: String,
    lines: Vec<Line<'a>>,
}

impl Record<'_> {
    fn text(&self) -> String {
        self.lines.iter().map(|l| l.text.trim()).join(" ").trim().to_owned()
    }

    fn complain(&self, name: &str, expected: impl Into<String>) -> Complaint {
        match self.lines.first() {
            Some(line) => line.complain(name, 0, line.text.len(), expected),
            None => Complaint::about_file(name, expected, ""),
        }
    }
}

/// One block: the records between a title and its end.
#[derive(Debug, Default)]
struct Block<'a> {
    records: Vec<Record<'a>>,
}

impl<'a> Block<'a> {
    fn record(&self, label: &str) -> Option<&Record<'a>> {
        self.records.iter().find(|r| r.label == label)
    }

    fn text(&self, label: &str) -> String {
        self.record(label).map_or_else(String::new, Record::text)
    }

    /// The number in a record; `None` when the record is absent or empty.
    fn number(&self, name: &str, label: &str, complaints: &mut Complaints) -> Option<f64> {
        let record = self.record(label)?;
        let text = record.text();
        if text.is_empty() {
            return None;
        }
        let value = text.parse::<f64>().ok().filter(|v| v.is_finite());
        if value.is_none() {
            complaints.0.push(record.complain(name, "a number").hint("digits with a decimal point, like 4000.65"));
        }
        value
    }

    /// Records that hold ordinates.
    fn data(&self) -> Option<&Record<'a>> {
        self.records.iter().find(|r| matches!(r.label.as_str(), "XYDATA" | "XYPOINTS"))
    }

    /// Records that hold data of another kind.
    fn other_data(&self) -> Option<&Record<'a>> {
        let other = ["PEAKTABLE", "PEAKASSIGNMENTS", "NTUPLES", "RADATA", "DATATABLE", "ASSIGNMENTS"];
        self.records.iter().find(|r| other.contains(&r.label.as_str()))
    }
}

/// Reads a JCAMP-DX text.
///
/// # Errors
/// All complaints at once: records that are missing or no numbers, characters that are no number form, ordinate and abscissa
/// checks that fail, a number of points that is not the one stated, no spectrum, several spectra without a choice.
pub(super) fn read(name: &str, text: &str, options: &SpectrumOptions) -> Result<Noted<Spectrum>, Complaints> {
    let blocks = blocks_of(name, text)?;
    let spectra: Vec<&Block<'_>> = blocks.iter().filter(|b| b.data().is_some()).collect();
    let (number, block) = choose(name, &blocks, &spectra, options)?;
    let mut complaints = Complaints::default();
    let mut notes = Vec::new();
    let version = block.text("JCAMPDX");
    let known = |v: &str| v.starts_with('4') || v.starts_with('5');
    if !known(version.trim()) {
        let version = if version.is_empty() { "not stated".to_owned() } else { shown(&version) };
        notes.push(Note::new(format!("{name}: the JCAMP-DX version is {version}; it was read as 4.24 or 5.x")));
    }
    let Some(data) = block.data() else {
        return Err(Complaint::about_file(name, "a record XYDATA or XYPOINTS", "").into());
    };
    let x_factor = block.number(name, "XFACTOR", &mut complaints).filter(|f| *f != 0.0).unwrap_or(1.0);
    let y_factor = block.number(name, "YFACTOR", &mut complaints).filter(|f| *f != 0.0).unwrap_or(1.0);
    let resolution = block.text("RESOLUTION").split([' ', ',']).next().and_then(|t| t.parse().ok());
    let form = data.lines.first().map_or_else(String::new, |l| l.text.to_uppercase().replace(' ', ""));
    let points = if form.starts_with("(X++(Y..Y))") {
        equidistant(name, block, data, x_factor, y_factor, &mut notes, &mut complaints)
    } else if form.starts_with("(XY..XY)") {
        pairs(name, data, x_factor, y_factor, &mut complaints)
    } else {
        complaints.0.push(
            data.complain(name, "`(X++(Y..Y))` or `(XY..XY)`").hint("interferograms and other forms are no spectra"),
        );
        Vec::new()
    };
    if let Some(stated) = block.number(name, "NPOINTS", &mut complaints)
        && complaints.0.is_empty()
        && form.starts_with("(XY..XY)")
        && stated != points.len() as f64
    {
        notes.push(Note::new(format!("{name}: NPOINTS says {stated}, the block has {} points", points.len())));
    }
    complaints.or(())?;
    let raw = RawSpectrum {
        name: if spectra.len() > 1 { format!("{name} (block {number})") } else { name.to_owned() },
        title: block.text("TITLE"),
        points,
        axis_words: block.text("XUNITS"),
        ordinate_words: block.text("YUNITS"),
        medium_words: String::new(),
        resolution,
    };
    assemble(raw, options, notes)
}

/// The blocks of a file in the order of their titles.
fn blocks_of<'a>(name: &str, text: &'a str) -> Result<Vec<Block<'a>>, Complaints> {
    let mut blocks: Vec<Block<'a>> = Vec::new();
    // Blocks that are open: a compound block holds others.
    let mut open: Vec<usize> = Vec::new();
    let mut ended = 0;
    for (number, whole) in numbered_lines(text) {
        if whole.len() > LIMITS.line {
            let expected = format!("a line of at most {} characters", LIMITS.line);
            return Err(about_line(name, number, expected, format!("{} bytes", whole.len())).into());
        }
        let text = whole.split("$$").next().unwrap_or("");
        if let Some(rest) = text.trim_start().strip_prefix("##") {
            let Some((label, value)) = rest.split_once('=') else {
                return Err(Complaint::at(
                    name,
                    number,
                    1,
                    whole.chars().count(),
                    whole,
                    "a record `##LABEL= value`",
                    whole,
                )
                .hint("a record begins with ## and its label ends with an equals sign")
                .into());
            };
            // Labels are compared without blanks, hyphens, slashes and underlines, in any case.
            let label: String =
                label.chars().filter(|c| !matches!(c, ' ' | '-' | '/' | '_')).flat_map(char::to_uppercase).collect();
            let column = whole[..text.len() - value.len()].chars().count();
            let line = Line { text: value, whole, number, column };
            match label.as_str() {
                "TITLE" => {
                    blocks.push(Block::default());
                    open.push(blocks.len() - 1);
                }
                "END" => {
                    open.pop();
                    ended += 1;
                    continue;
                }
                _ => {}
            }
            let Some(block) = open.last().and_then(|at| blocks.get_mut(*at)) else {
                let expected = if ended == 0 { "##TITLE= as the first record" } else { "##TITLE= of another block" };
                return Err(Complaint::at(name, number, 1, whole.chars().count(), whole, expected, whole).into());
            };
            block.records.push(Record { label, lines: vec![line] });
        } else if let Some(record) = open.last().and_then(|at| blocks.get_mut(*at)).and_then(|b| b.records.last_mut())
            && !text.trim().is_empty()
        {
            record.lines.push(Line { text, whole, number, column: 0 });
        }
    }
    Ok(blocks)
}

/// The block that is wanted, with its number from one among the spectra.
fn choose<'b, 'a>(
    name: &str,
    blocks: &'b [Block<'a>],
    spectra: &[&'b Block<'a>],
    options: &SpectrumOptions,
) -> Result<(usize, &'b Block<'a>), Complaints> {
    let list = || {
        let titles = spectra.iter().enumerate().map(|(at, b)| format!("{}: {}", at + 1, shown(&b.text("TITLE"))));
        titles.take(20).join("; ")
    };
    if spectra.is_empty() {
        let expected = "a spectrum: a record XYDATA or XYPOINTS";
        let complaint = match blocks.iter().find_map(Block::other_data) {
            Some(record) => record.complain(name, expected).hint(match record.label.as_str() {
                "PEAKTABLE" | "PEAKASSIGNMENTS" | "ASSIGNMENTS" => "peaks are no spectrum: write them as a band list",
                "NTUPLES" | "DATATABLE" => "n-tuples are not read: export one spectrum as XYDATA",
                _ => "an interferogram is no spectrum: transform it first",
            }),
            None => Complaint::about_file(name, expected, "").hint("is the file complete?"),
        };
        return Err(complaint.into());
    }
    let Some(wanted) = options.block.as_deref().map(str::trim) else {
        if let [only] = spectra {
            return Ok((1, only));
        }
        let found = format!("{} spectra in one file", spectra.len());
        let complaint = Complaint::about_file(name, "a choice of one block", found);
        return Err(complaint.hint(format!("say --block with a number or a part of the title: {}", list())).into());
    };
    let by_number = wanted.parse::<usize>().ok().and_then(|n| spectra.get(n.checked_sub(1)?).map(|block| (n, *block)));
    let lower = wanted.to_lowercase();
    let mut by_title = spectra.iter().enumerate().filter(|(_, b)| b.text("TITLE").to_lowercase().contains(&lower));
    let first = by_title.next().map(|(at, b)| (at + 1, *b));
    match (by_number.or(first), by_number.is_none() && by_title.next().is_some()) {
        (Some(found), false) => Ok(found),
        (found, _) => {
            let what = if found.is_some() { "several blocks of that title" } else { "no such block" };
            let complaint = Complaint::about_file(name, format!("one block `{}`", shown(wanted)), what);
            Err(complaint.hint(format!("there are {}", list())).into())
        }
    }
}

/// What one number in a line of ordinates says.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Token {
    /// A value: AFFN, PAC or SQZ.
    Value(f64),
    /// A difference from the ordinate before: DIF.
    Difference(f64),
    /// The number before occurs so many times in all: DUP.
    Times(f64),
    /// An ordinate that is lost: `?`.
    Lost,
}

/// A token and the bytes it stands on.
type Placed = (Token, usize, usize);

/// What a pseudo-digit begins: its digit, whether it is negative, and the kind of token.
type PseudoDigit = (u8, bool, fn(f64) -> Token);

/// The leading pseudo-digit of SQZ, DIF and DUP forms: its digit, its sign and its kind.
fn pseudo_digit(byte: u8) -> Option<PseudoDigit> {
    Some(match byte {
        b'@' => (0, false, Token::Value),
        b'A'..=b'I' => (byte - b'A' + 1, false, Token::Value),
        b'a'..=b'i' => (byte - b'a' + 1, true, Token::Value),
        b'%' => (0, false, Token::Difference),
        b'J'..=b'R' => (byte - b'J' + 1, false, Token::Difference),
        b'j'..=b'r' => (byte - b'j' + 1, true, Token::Difference),
        b'S'..=b'Z' => (byte - b'S' + 1, false, Token::Times),
        b's' => (9, false, Token::Times),
        _ => return None,
    })
}

/// Cuts a line into numbers. `pairs` says that the line has the AFFN form only, where an exponent needs no sign.
///
/// An `E` inside an AFFN number is an exponent when a sign and digits follow (as the standard wants it), or, in pairs, when
/// digits follow; otherwise it is the SQZ form of 5.
fn tokens(text: &str, pairs: bool) -> Result<Vec<Placed>, (usize, usize)> {
    let bytes = text.as_bytes();
    let digits = |mut at: usize| {
        while bytes.get(at).is_some_and(|b| b.is_ascii_digit() || *b == b'.') {
            at += 1;
        }
        at
    };
    let mut list = Vec::new();
    let mut at = 0;
    while let Some(&byte) = bytes.get(at) {
        let start = at;
        match byte {
            b' ' | b'\t' | b',' | b';' | 0x0B | 0x0C => {
                at += 1;
                continue;
            }
            b'?' => {
                list.push((Token::Lost, at, at + 1));
                at += 1;
                continue;
            }
            b'0'..=b'9' | b'.' | b'+' | b'-' => {
                at = digits(at + usize::from(matches!(byte, b'+' | b'-')));
                if matches!(bytes.get(at), Some(b'E' | b'e')) {
                    let signed = matches!(bytes.get(at + 1), Some(b'+' | b'-'));
                    let from = at + 1 + usize::from(signed);
                    let to = digits(from);
                    if to > from && (signed || pairs) {
                        at = to;
                    }
                }
                match text.get(start..at).and_then(|t| t.parse::<f64>().ok()).filter(|v| v.is_finite()) {
                    Some(value) => list.push((Token::Value(value), start, at)),
                    None => return Err((start, at.max(start + 1))),
                }
            }
            _ => {
                let width = text[start..].chars().next().map_or(1, char::len_utf8);
                let (digit, negative, kind) = pseudo_digit(byte).filter(|_| !pairs).ok_or((start, start + width))?;
                at = digits(at + 1);
                let rest = text.get(start + 1..at).unwrap_or("");
                let value = format!("{digit}{rest}").parse::<f64>().map_err(|_| (start, at))?;
                if !value.is_finite() {
                    return Err((start, at));
                }
                list.push((kind(if negative { -value } else { value }), start, at));
            }
        }
    }
    Ok(list)
}

/// Ordinates of one line, and whether its last one came as a difference (then the next line repeats it as a check).
struct Decoded {
    ordinates: Vec<Option<f64>>,
    ends_in_difference: bool,
}

/// Decodes the ordinates of a line. At most `room` are allowed. The first is a value.
fn decode(placed: &[Placed], room: usize) -> Result<Decoded, (usize, &'static str)> {
    let mut ordinates: Vec<Option<f64>> = Vec::new();
    let mut before: Option<Token> = None;
    for (at, (token, _, _)) in placed.iter().enumerate() {
        let last = ordinates.last().copied().flatten();
        match *token {
            Token::Value(value) => ordinates.push(Some(value)),
            Token::Lost => ordinates.push(None),
            Token::Difference(step) => {
                let last = last.ok_or((at, "an ordinate before a difference"))?;
                ordinates.push(Some(last + step));
            }
            Token::Times(count) => {
                if count < 1.0 || count.fract() != 0.0 {
                    return Err((at, "a whole number of repetitions from one"));
                }
                if count > room as f64 {
                    return Err((at, "no more points than a spectrum may have"));
                }
                // The count includes the number itself, which is already there.
                let more = count as usize - 1;
                match before {
                    Some(Token::Value(value)) => ordinates.extend(std::iter::repeat_n(Some(value), more)),
                    Some(Token::Lost) => ordinates.extend(std::iter::repeat_n(None, more)),
                    Some(Token::Difference(step)) => {
                        let mut value = last.ok_or((at, "an ordinate before a difference"))?;
                        for _ in 0..more {
                            value += step;
                            ordinates.push(Some(value));
                        }
                    }
                    Some(Token::Times(_)) | None => return Err((at, "a number before its repetition")),
                }
            }
        }
        if ordinates.len() > room {
            return Err((at, "no more points than a spectrum may have"));
        }
        before = Some(match (token, before) {
            // A repeated difference stays a difference for what follows.
            (Token::Times(_), Some(Token::Difference(_))) => Token::Times(-1.0),
            _ => *token,
        });
    }
    let ends_in_difference = matches!(before, Some(Token::Difference(_))) || before == Some(Token::Times(-1.0));
    Ok(Decoded { ordinates, ends_in_difference })
}

/// Points of `(X++(Y..Y))`: positions follow from the first, the last and the number of points.
fn equidistant(
    name: &str,
    block: &Block<'_>,
    data: &Record<'_>,
    x_factor: f64,
    y_factor: f64,
    notes: &mut Vec<Note>,
    complaints: &mut Complaints,
) -> Vec<RawPoint> {
    let mut ordinates: Vec<(Option<f64>, usize)> = Vec::new();
    // Abscissa checks: the X of a line, the half of its last printed digit, the point it stands at, the line, X's end.
    let mut checks: Vec<(f64, f64, usize, Line<'_>, usize)> = Vec::new();
    let mut pending = false;
    for line in data.lines.iter().skip(1) {
        if complaints.0.len() >= MOST_COMPLAINTS {
            return Vec::new();
        }
        let placed = match tokens(line.text, false) {
            Ok(placed) => placed,
            Err((start, end)) => {
                complaints.0.push(line.complain(name, start, end, "a number in AFFN, PAC, SQZ, DIF or DUP form"));
                pending = false;
                continue;
            }
        };
        let [first, rest @ ..] = placed.as_slice() else { continue };
        let (Token::Value(x), start, x_end) = *first else {
            complaints.0.push(line.complain(
                name,
                first.1,
                first.2,
                "the position that begins a line, in plain digits",
            ));
            pending = false;
            continue;
        };
        let printed = line.text.get(start..x_end).unwrap_or("");
        let decimals = printed.split_once('.').map_or(0, |(_, d)| d.len().min(15));
        let half_digit = 0.5 * 10.0_f64.powi(-(decimals as i32));
        let decoded = match decode(rest, MOST_POINTS - ordinates.len() + 1) {
            Ok(decoded) => decoded,
            Err((at, expected)) => {
                let (_, start, end) = rest.get(at).copied().unwrap_or(*first);
                complaints.0.push(line.complain(name, start, end, expected));
                pending = false;
                continue;
            }
        };
        let mut values = decoded.ordinates.into_iter();
        let mut at = ordinates.len();
        if pending && let Some(check) = values.next() {
            let (expected, _) = ordinates.last().copied().unwrap_or((None, 0));
            if check != expected {
                let (_, start, end) = rest[0];
                let expected = expected.map_or("?".to_owned(), |v| v.to_string());
                complaints.0.push(
                    line.complain(name, start, end, format!("the ordinate check {expected}"))
                        .hint("the line before is damaged: its differences add up to another ordinate"),
                );
            }
            at = at.saturating_sub(1);
        }
        checks.push((x, half_digit, at, *line, x_end));
        ordinates.extend(values.map(|y| (y, line.number)));
        pending = decoded.ends_in_difference;
        if ordinates.len() > MOST_POINTS {
            complaints.0.push(line.complain(name, 0, line.text.len(), format!("at most {MOST_POINTS} points")));
            return Vec::new();
        }
    }
    if !complaints.0.is_empty() {
        return Vec::new();
    }
    let count = ordinates.len();
    let stated = block.number(name, "NPOINTS", complaints);
    let first_x = block.number(name, "FIRSTX", complaints);
    let last_x = block.number(name, "LASTX", complaints);
    let delta = block.number(name, "DELTAX", complaints);
    let first_y = block.number(name, "FIRSTY", complaints);
    for (label, value) in [("FIRSTX", first_x), ("LASTX", last_x)] {
        if value.is_none() && complaints.0.is_empty() {
            complaints.0.push(
                data.complain(name, format!("a record ##{label}= before the data"))
                    .hint("positions of (X++(Y..Y)) follow from FIRSTX, LASTX and NPOINTS"),
            );
        }
    }
    let (Some(first_x), Some(last_x)) = (first_x, last_x) else { return Vec::new() };
    let step = if count > 1 { (last_x - first_x) / (count - 1) as f64 } else { 0.0 };
    // The printed X of a line is rounded: half of its last digit (and half a step) is no contradiction.
    let stray = checks.iter().find(|(x, half_digit, at, ..)| {
        let tolerance = 0.5 * step.abs() + 1.02 * half_digit * x_factor.abs();
        (x * x_factor - (first_x + step * *at as f64)).abs() > tolerance
    });
    if let Some(stated) = stated
        && stated != count as f64
    {
        let record = block.record("NPOINTS").unwrap_or(data);
        let complaint = record.complain(name, format!("{count}, the number of ordinates in the block"));
        if stray.is_some() || checks.len() < 2 {
            complaints.0.push(complaint.hint("points are missing, or there are too many: is the file complete?"));
            return Vec::new();
        }
        notes.push(Note::new(format!(
            "{name}: NPOINTS says {stated}, the block has {count} ordinates, which fit its positions"
        )));
    } else if let Some((_, _, at, line, end)) = stray {
        let expected = format!("a line that begins near {} (point {})", first_x + step * *at as f64, at + 1);
        let complaint = line.complain(name, 0, *end, expected);
        complaints.0.push(complaint.hint("an abscissa check fails: a line is missing, doubled or damaged before it"));
        return Vec::new();
    }
    if let Some(delta) = delta
        && step != 0.0
        && (delta.abs() - step.abs()).abs() > 0.01 * step.abs()
    {
        notes.push(Note::new(format!(
            "{name}: DELTAX says {delta}, FIRSTX, LASTX and the number of points say {step}; the latter is used"
        )));
    }
    if let (Some(stated), Some((Some(found), _))) = (first_y, ordinates.first())
        && (stated - found * y_factor).abs() > 1.0e-3 * stated.abs() + y_factor.abs()
    {
        notes.push(Note::new(format!(
            "{name}: FIRSTY says {stated}, the first ordinate is {}; is YFACTOR right?",
            found * y_factor
        )));
    }
    ordinates
        .into_iter()
        .enumerate()
        .map(|(at, (y, line))| RawPoint { x: first_x + step * at as f64, y: y.map(|y| y * y_factor), line })
        .collect()
}

/// Points of `(XY..XY)`.
fn pairs(name: &str, data: &Record<'_>, x_factor: f64, y_factor: f64, complaints: &mut Complaints) -> Vec<RawPoint> {
    let mut points = Vec::new();
    let mut waiting: Option<f64> = None;
    for line in data.lines.iter().skip(1) {
        if complaints.0.len() >= MOST_COMPLAINTS {
            return Vec::new();
        }
        let placed = match tokens(line.text, true) {
            Ok(placed) => placed,
            Err((start, end)) => {
                complaints.0.push(
                    line.complain(name, start, end, "a number").hint("pairs like `4000.0, 0.512; 3998.0, 0.514`"),
                );
                continue;
            }
        };
        for (token, start, end) in placed {
            match (waiting.take(), token) {
                (None, Token::Value(x)) => waiting = Some(x),
                (Some(x), Token::Value(y)) => {
                    points.push(RawPoint { x: x * x_factor, y: Some(y * y_factor), line: line.number });
                }
                (Some(x), Token::Lost) => points.push(RawPoint { x: x * x_factor, y: None, line: line.number }),
                _ => complaints.0.push(line.complain(name, start, end, "a position")),
            }
            if points.len() > MOST_POINTS {
                complaints.0.push(line.complain(name, start, end, format!("at most {MOST_POINTS} points")));
                return Vec::new();
            }
        }
    }
    if let (Some(_), Some(line)) = (waiting, data.lines.last()) {
        complaints.0.push(line.complain(name, 0, line.text.len(), "an ordinate for every position"));
    }
    points
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ordinates(line: &str) -> Vec<f64> {
        let placed = tokens(line, false).unwrap();
        decode(&placed[1..], 1000).unwrap().ordinates.into_iter().map(Option::unwrap).collect()
    }

    #[test]
    fn the_forms_of_the_standard_give_its_ten_numbers() {
        // McDonald and Wilks, Appl. Spectrosc. 42, 151 (1988), table VII: one list in every form. Status: read in
        // quotations of that table in public sources, not in the paper itself.
        let expected = [1.0, 2.0, 3.0, 3.0, 2.0, 1.0, 0.0, -1.0, -2.0, -3.0];
        for (form, line) in [
            ("FIX", "1  2  3  3  2  1  0 -1 -2 -3"),
            ("AFFN", "1,2,3,3,2,1,0,-1,-2,-3"),
            ("PAC", "1+2+3+3+2+1+0-1-2-3"),
            ("SQZ", "1BCCBA@abc"),
            ("DIF", "1JJ%jjjjjj"),
            ("DIFDUP", "1JT%jX"),
        ] {
            assert_eq!(ordinates(&format!("0 {line}")), expected, "{form}");
        }
    }

    #[test]
    fn an_e_is_an_exponent_only_behind_plain_digits_and_before_a_sign() {
        assert_eq!(ordinates("1 1.5E+02 -2.0e-01"), [150.0, -0.2]);
        assert_eq!(ordinates("1 E3e"), [53.0, -5.0]);
        assert_eq!(ordinates("599.860E12J"), [512.0, 513.0]);
    }

    #[test]
    fn a_repetition_without_bounds_is_refused() {
        let placed = tokens("0 1Z99999999999999", false).unwrap();
        assert!(decode(&placed[1..], 1000).is_err());
        assert!(decode(&tokens("S2", false).unwrap(), 1000).is_err());
        assert!(decode(&tokens("J2", false).unwrap(), 1000).is_err());
    }
}
