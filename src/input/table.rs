//! Separated-value tables: separator, header with aliases, rows with their line numbers.
//!
//! The `csv` crate splits the text; this module adds what it leaves to the caller: which separator, which column means
//! what, how many fields a row must have, and the true line of a row after blank lines.

use std::path::{Path, PathBuf};

use super::{BadRows, InputText};
use crate::problem::{Findings, Problem};

/// A column the reader knows, with the names it goes by.
#[derive(Clone, Copy, Debug)]
pub struct Column {
    /// What the reader calls it.
    pub key: &'static str,
    /// Names accepted in the header, lower case; earlier ones win where `one_only` is not set.
    pub names: &'static [&'static str],
    /// Whether two columns with names from the list are a mistake (true) or the first name wins (false).
    pub one_only: bool,
}

/// A table read from a file.
#[derive(Debug)]
pub struct Table {
    /// Name of the file.
    pub file: PathBuf,
    /// The header as written.
    pub header: Vec<String>,
    /// Rows that have not as many fields as the header.
    pub misfits: BadRows,
    found: Vec<(&'static str, usize)>,
    /// Lines of the rows that have.
    lines: Vec<u64>,
    /// Their fields, one after the other: a file of many short fields is to cost little more than its size.
    cells: String,
    /// Where each field ends in `cells`.
    ends: Vec<usize>,
}

/// One row.
#[derive(Clone, Copy, Debug)]
pub struct Row<'a> {
    /// Line on which it starts, from 1.
    pub line: u64,
    /// Number of its first field among those of the table.
    first: usize,
    table: &'a Table,
}

impl<'a> Row<'a> {
    /// Text of a field, without surrounding blanks.
    pub fn text(&self, column: usize) -> &'a str {
        let end = |field: usize| self.table.ends.get(field).copied().unwrap_or(self.table.cells.len());
        let field = self.first + column;
        let start = if field == 0 { 0 } else { end(field - 1) };
        self.table.cells.get(start..end(field)).unwrap_or("").trim()
    }
}

/// Longest name of a column in messages, characters. They name the column of every bad row.
const NAME_SHOWN: usize = 80;

const SEPARATORS: [u8; 3] = [b',', b';', b'\t'];

impl Table {
    /// Splits a text into header and rows. None, with findings, when there is no header to work with.
    pub fn read(input: &InputText, columns: &[Column], findings: &mut Findings) -> Option<Self> {
        let file = input.name.as_path();
        let separator = sniff(input, columns, findings)?;
        let mut reader = csv::ReaderBuilder::new()
            .delimiter(separator)
            .has_headers(false)
            .flexible(true)
            .from_reader(input.text.as_bytes());
        let mut header = None;
        let (mut lines, mut cells, mut ends) = (Vec::new(), String::new(), Vec::new());
        let mut misfits = BadRows::default();
        let mut blank = 0usize;
        let mut counter = LineCounter::new(&input.text);
        let mut record = csv::StringRecord::new();
        loop {
            match reader.read_record(&mut record) {
                Ok(true) => {}
                Ok(false) => break,
                Err(e) => {
                    findings.problem(Problem::new(file, format!("cannot be split into fields: {e}")));
                    break;
                }
            }
            let line = counter.line_of(record.position().map_or(0, csv::Position::byte) as usize);
            let Some(width) = header.as_ref().map(Vec::len) else {
                header = Some(record.iter().map(|f| f.trim().to_owned()).collect());
                continue;
            };
            if record.iter().all(|f| f.trim().is_empty()) {
                blank += 1;
            } else if record.iter().any(|f| f.contains('\n')) {
                // An unclosed quotation mark would swallow every row up to the next one without a trace.
                misfits.add([Problem::new(file, "a field runs over more than one line")
                    .line(line)
                    .accepted("fields that end on their line")
                    .advice("close the quotation mark, or double it inside a field")]);
            } else if record.len() != width {
                misfits.add([Problem::new(
                    file,
                    format!("the row has {} fields, the header {width}", record.len()),
                )
                .line(line)
                .accepted(format!("{width} fields"))
                .advice(
                    "quote fields that contain the separator; with decimal commas, separate by semicolons",
                )]);
            } else {
                lines.push(line);
                for field in &record {
                    cells.push_str(field);
                    ends.push(cells.len());
                }
            }
        }
        if blank > 0 {
            let n = crate::units::count_words(blank, "row");
            findings.inform(Some(file), format!("{n} without any text skipped"));
        }
        let header: Vec<String> = header?;
        let found = find_columns(file, &header, columns, findings)?;
        Some(Self { file: file.to_path_buf(), header, misfits, found, lines, cells, ends })
    }

    /// Rows that have as many fields as the header.
    pub fn rows(&self) -> impl ExactSizeIterator<Item = Row<'_>> {
        let width = self.header.len();
        self.lines.iter().enumerate().map(move |(i, &line)| Row { line, first: i * width, table: self })
    }

    /// Position of a column, if the file has it.
    pub fn column(&self, key: &str) -> Option<usize> {
        self.found.iter().find(|(k, _)| *k == key).map(|(_, i)| *i)
    }

    /// `column northing_m`, with the name as the file writes it.
    pub fn place(&self, column: usize) -> String {
        format!("column {}", shortened(&self.header[column]))
    }

    /// The header in messages: its first names.
    pub fn header_words(&self) -> String {
        listed(&self.header.iter().map(String::as_str).collect::<Vec<_>>())
    }

    /// Tells which columns were not used, `used` being those that were.
    pub fn report_unused(&self, used: &[usize], findings: &mut Findings) {
        let names: Vec<&str> = (0..self.header.len())
            .filter(|i| !used.contains(i))
            .map(|i| self.header[i].as_str())
            .filter(|n| !n.is_empty())
            .collect();
        if !names.is_empty() {
            findings.inform(Some(&self.file), format!("columns not used: {}", listed(&names)));
        }
    }
}

/// Most names of columns in one message.
const NAMES_SHOWN: usize = 40;

/// The first names, and how many more there are.
pub fn listed(names: &[&str]) -> String {
    let shown: Vec<String> = names.iter().take(NAMES_SHOWN).map(|name| shortened(name)).collect();
    let more = names.len() - shown.len();
    let list = shown.join(", ");
    if more > 0 { format!("{list} and {more} more") } else { list }
}

fn shortened(name: &str) -> String {
    match name.char_indices().nth(NAME_SHOWN) {
        Some((end, _)) => format!("{}…", &name[..end]),
        None => name.to_owned(),
    }
}

/// Lower case, blanks and hyphens to underscores, so that `Easting (m)`-like spellings stay readable in the alias list.
pub(crate) fn normal(name: &str) -> String {
    name.trim().to_lowercase().replace([' ', '-'], "_")
}

/// The separator under which the header makes most sense; refused when two make equal sense.
fn sniff(input: &InputText, columns: &[Column], findings: &mut Findings) -> Option<u8> {
    let file = input.name.as_path();
    let Some((at, first)) = input.text.lines().enumerate().find(|(_, l)| !l.trim().is_empty()) else {
        findings.problem(
            Problem::new(file, "is empty")
                .accepted("a header line with column names, then one row per entry"),
        );
        return None;
    };
    let known = |separator: u8| {
        first
            .split(char::from(separator))
            .filter(|f| {
                let name = normal(f.trim().trim_matches('"'));
                columns.iter().any(|c| c.names.contains(&name.as_str()))
            })
            .count()
    };
    let scores = SEPARATORS.map(known);
    let best = scores.iter().copied().fold(0, Ord::max);
    let winners: Vec<u8> =
        SEPARATORS.iter().zip(scores).filter(|(_, s)| *s == best).map(|(b, _)| *b).collect();
    if best == 0 {
        let names: Vec<&str> = columns.iter().map(|c| c.names[0]).collect();
        let shown: String = first.chars().take(80).collect();
        findings.problem(
            Problem::new(file, format!("the header \"{shown}\" names no known column"))
                .line(at as u64 + 1)
                .accepted(format!(
                    "columns separated by comma, semicolon or tab, such as {}",
                    names.join(", ")
                ))
                .advice("put a header line with column names at the top"),
        );
        return None;
    }
    // With a single known column every separator finds it: take the one that occurs, else the comma.
    let occurring: Vec<u8> = winners.iter().copied().filter(|b| first.as_bytes().contains(b)).collect();
    match (winners.as_slice(), occurring.as_slice()) {
        ([one], _) | (_, [one]) => Some(*one),
        (_, []) => Some(b','),
        _ => {
            findings.problem(
                Problem::new(file, "the header mixes separators, so the columns cannot be told apart")
                    .line(at as u64 + 1)
                    .accepted("one of comma, semicolon or tab between all columns"),
            );
            None
        }
    }
}

fn find_columns(
    file: &Path,
    header: &[String],
    columns: &[Column],
    findings: &mut Findings,
) -> Option<Vec<(&'static str, usize)>> {
    let names: Vec<String> = header.iter().map(|h| normal(h)).collect();
    let mut found = Vec::new();
    let mut sound = true;
    for column in columns {
        let mut hits: Vec<usize> = column
            .names
            .iter()
            .flat_map(|n| names.iter().enumerate().filter(move |(_, h)| h == n).map(|(i, _)| i))
            .collect();
        let first_name = hits.first().map(|i| names[*i].clone());
        if !column.one_only {
            hits.retain(|i| Some(&names[*i]) == first_name.as_ref());
        }
        if hits.len() > 1 {
            hits.sort_unstable();
            let twice = hits
                .iter()
                .take(NAMES_SHOWN)
                .map(|i| shortened(&header[*i]))
                .collect::<Vec<_>>()
                .join("\" and \"");
            findings.problem(
                Problem::new(file, format!("the columns \"{twice}\" mean the same"))
                    .line(1)
                    .accepted("one of them")
                    .advice("rename or remove the other"),
            );
            sound = false;
        }
        if let Some(i) = hits.first() {
            found.push((column.key, *i));
        }
    }
    sound.then_some(found)
}

/// Turns growing byte offsets into line numbers, skipping the line ends that precede a record.
struct LineCounter<'a> {
    bytes: &'a [u8],
    at: usize,
    line: u64,
}

impl<'a> LineCounter<'a> {
    fn new(text: &'a str) -> Self {
        Self { bytes: text.as_bytes(), at: 0, line: 1 }
    }

    fn line_of(&mut self, offset: usize) -> u64 {
        while self.at < self.bytes.len() && (self.at < offset || matches!(self.bytes[self.at], b'\r' | b'\n'))
        {
            if self.bytes[self.at] == b'\n' {
                self.line += 1;
            }
            self.at += 1;
        }
        self.line
    }
}
