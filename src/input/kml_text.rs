//! Text of a KML element that knows on which line each part of it stands, and the positions written in it.

use super::InputText;
use crate::problem::{Problem, ProblemList};
use crate::units;

/// Text put together from pieces of a file.
#[derive(Debug, Default)]
pub(super) struct Located {
    text: String,
    /// Where a piece begins in `text`, and the line of the file on which it begins.
    pieces: Vec<(usize, u64)>,
}

impl Located {
    /// Adds a piece that begins on `line`.
    pub(super) fn push(&mut self, text: &str, line: u64) {
        self.pieces.push((self.text.len(), line));
        self.text.push_str(text);
    }

    /// The whole text without surrounding blanks; none when nothing is left.
    pub(super) fn words(&self) -> Option<String> {
        let text = self.text.trim();
        (!text.is_empty()).then(|| text.to_owned())
    }

    /// Line of the first piece.
    pub(super) fn line(&self) -> Option<u64> {
        self.pieces.first().map(|&(_, line)| line)
    }

    /// Adds all of `other` after a blank.
    pub(super) fn append(&mut self, other: &Self) {
        let start = self.text.len() + 1;
        self.text.push(' ');
        self.text.push_str(&other.text);
        self.pieces.extend(other.pieces.iter().map(|&(offset, line)| (start + offset, line)));
    }

    /// The text between blanks with the lines on which it stands. What is only divided by a blank beside a comma stays
    /// together: it was meant as one tuple.
    fn tokens(&self) -> Vec<(u64, String)> {
        let mut tokens: Vec<(u64, String)> = Vec::new();
        let mut pieces = self.pieces.iter().peekable();
        let (mut offset, mut line) = (0, 1);
        for part in self.text.split_inclusive(char::is_whitespace) {
            while let Some(&(_, start_line)) = pieces.next_if(|(start, _)| *start <= offset) {
                line = start_line;
            }
            let word = part.trim();
            match tokens.last_mut() {
                _ if word.is_empty() => {}
                Some((_, before)) if before.ends_with(',') || word.starts_with(',') => {
                    before.push(' ');
                    before.push_str(word);
                }
                _ => tokens.push((line, word.to_owned())),
            }
            offset += part.len();
            line += u64::from(part.ends_with('\n'));
        }
        tokens
    }
}

/// A position as a tuple of `coordinates` gives it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tuple {
    /// Line of the file.
    pub line: u64,
    /// First number: longitude, degrees.
    pub longitude_deg: f64,
    /// Second number: latitude, degrees.
    pub latitude_deg: f64,
}

/// What `coordinates` may hold.
const ACCEPTED: &str =
    "longitude,latitude or longitude,latitude,altitude with decimal points, and blanks between tuples only";

/// The positions of a `coordinates` element. Tuples that are none go to `problems`, named by `place`.
pub(super) fn tuples(
    input: &InputText,
    place: &str,
    coordinates: &Located,
    problems: &mut ProblemList,
) -> Vec<Tuple> {
    let mut found = Vec::new();
    for (line, token) in coordinates.tokens() {
        match tuple(line, &token) {
            Ok(tuple) => found.push(tuple),
            Err((what, advice)) => problems.push(
                Problem::new(&input.name, format!("\"{}\" {what}", shown(&token)))
                    .line(line)
                    .place(place)
                    .accepted(ACCEPTED)
                    .advice(advice),
            ),
        }
    }
    found
}

fn tuple(line: u64, token: &str) -> Result<Tuple, (String, &'static str)> {
    if token.contains(' ') {
        return Err(("has a blank beside a comma".into(), "remove the blanks inside the tuple"));
    }
    let parts: Vec<&str> = token.split(',').collect();
    if !matches!(parts.len(), 2 | 3) {
        let advice = if parts.len() == 1 {
            "join longitude and latitude by a comma"
        } else {
            "if commas are decimal signs, write points instead"
        };
        return Err((format!("has {}", units::count_words(parts.len(), "number")), advice));
    }
    // "3,0080" may be one number with a decimal comma; no survey places anything on a whole degree both ways.
    if parts.len() == 2 && !token.contains('.') && parts.iter().all(|part| !part.is_empty()) {
        return Err((
            "has no decimal point".into(),
            "if the comma is a decimal sign, write a point; write whole degrees as 3.0,55.0",
        ));
    }
    let mut numbers = [0.0; 3];
    for (number, part) in numbers.iter_mut().zip(&parts) {
        *number = units::parse_number(part, false).map_err(|fault| {
            let what = if part.is_empty() {
                "has an empty number".to_owned()
            } else {
                format!("is no position: \"{}\" {}", shown(part), fault.what)
            };
            (what, fault.advice)
        })?;
    }
    Ok(Tuple { line, longitude_deg: numbers[0], latitude_deg: numbers[1] })
}

/// At most 60 characters, visibly cut.
fn shown(text: &str) -> String {
    if text.chars().count() <= 60 {
        return text.to_owned();
    }
    text.chars().take(59).chain(['…']).collect()
}
