//! The dive file as a tree of keys with line numbers, checked against the table of keys.
//!
//! The tree is walked by hand instead of through `serde`, which stops at the first fault: a user with five mistakes is to
//! see five messages.

use std::path::{Path, PathBuf};

use time::Date;
use toml::Spanned;
use toml::de::{DeTable, DeValue};

use crate::bounds::{self, KEYS, Key, Kind, Need};
use crate::frame::Crs;
use crate::problem::{Findings, Problem};
use crate::units;

/// The parsed dive file.
pub(super) struct Document<'a> {
    file: &'a Path,
    text: &'a str,
    /// Offsets of the line feeds.
    line_ends: Vec<usize>,
    root: DeTable<'a>,
}

/// Longest part of a line that is quoted, characters.
const LINE_SHOWN: usize = 120;

type Value<'a> = Spanned<DeValue<'a>>;

impl<'a> Document<'a> {
    /// Parses the text; syntax errors and unknown keys become findings. None when nothing can be made of it.
    pub(super) fn parse(file: &'a Path, text: &'a str, findings: &mut Findings) -> Option<Self> {
        let (root, errors) = DeTable::parse_recoverable(text);
        let line_ends = text.match_indices('\n').map(|(at, _)| at).collect();
        let document = Self { file, text, line_ends, root: root.into_inner() };
        for e in &errors {
            findings.problems.push_with(file, || {
                let line = document.line_at(e.span().map_or(0, |s| s.start));
                let start = (line as usize).checked_sub(2).map_or(0, |before| document.line_ends[before] + 1);
                let shown: String =
                    text[start..].chars().take_while(|c| *c != '\n').take(LINE_SHOWN).collect();
                let what = format!("\"{}\": {}", shown.trim(), e.message().replace('\n', ", "));
                Problem::new(file, what).line(line).accepted("TOML: [table] headers and key = value lines")
            });
        }
        if !errors.is_empty() {
            // What recovery made of a broken file may lack keys that are there: no further messages.
            return None;
        }
        document.check_names(findings);
        Some(document)
    }

    /// Line number, from 1, of a byte offset.
    fn line_at(&self, offset: usize) -> u64 {
        1 + self.line_ends.partition_point(|end| *end < offset) as u64
    }

    /// Refuses keys and tables that are not in the table of keys, with the nearest one that is.
    fn check_names(&self, findings: &mut Findings) {
        let sections: Vec<&str> = {
            let mut all: Vec<&str> = KEYS.iter().map(|k| k.section).filter(|s| !s.is_empty()).collect();
            all.dedup();
            all
        };
        for (key, value) in &self.root {
            let name: &str = key.get_ref();
            let at = key.span().start;
            match value.get_ref() {
                DeValue::Table(table) if sections.contains(&name) => {
                    for inner in table.keys() {
                        let inner_name: &str = inner.get_ref();
                        if !KEYS.iter().any(|k| k.section == name && k.name == inner_name) {
                            let at = inner.span().start;
                            findings.problems.push_with(self.file, || self.unknown(name, inner_name, at));
                        }
                    }
                }
                DeValue::Table(_) => findings.problems.push_with(self.file, || {
                    let nearest = nearest(name, &sections);
                    Problem::new(self.file, format!("the table [{name}] is not known"))
                        .line(self.line_at(at))
                        .accepted(format!("[{}]", sections.join("], [")))
                        .advice(nearest.map_or_else(String::new, |n| format!("did you mean [{n}]?")))
                }),
                _ if sections.contains(&name) => findings.problem(
                    Problem::new(self.file, "is a value where a table is needed")
                        .line(self.line_at(at))
                        .place(format!("key {name}"))
                        .accepted(format!("a table header [{name}] with keys below it")),
                ),
                _ if !KEYS.iter().any(|k| k.section.is_empty() && k.name == name) => {
                    findings.problems.push_with(self.file, || self.unknown("", name, at));
                }
                _ => {}
            }
        }
    }

    fn unknown(&self, section: &str, name: &str, at: usize) -> Problem {
        let full = if section.is_empty() { name.to_owned() } else { format!("{section}.{name}") };
        let problem = Problem::new(self.file, "is not known and would have no effect")
            .line(self.line_at(at))
            .place(format!("key {full}"));
        if let Some(elsewhere) = KEYS.iter().find(|k| k.name == name && k.section != section) {
            let home = if elsewhere.section.is_empty() {
                "at the top of the file".to_owned()
            } else {
                format!("in [{}]", elsewhere.section)
            };
            return problem.advice(format!("{name} belongs {home}"));
        }
        let here: Vec<&str> = KEYS.iter().filter(|k| k.section == section).map(|k| k.name).collect();
        match nearest(name, &here) {
            Some(n) => problem.advice(format!("did you mean {n}?")),
            None => problem.accepted(here.join(", ")),
        }
    }

    fn value(&self, section: &str, name: &str) -> Option<&Value<'a>> {
        if section.is_empty() {
            return self.root.get(name);
        }
        match self.root.get(section)?.get_ref() {
            DeValue::Table(table) => table.get(name),
            _ => None,
        }
    }

    /// Whether the file has the key.
    pub(super) fn has(&self, section: &str, name: &str) -> bool {
        self.value(section, name).is_some()
    }

    /// A problem at the value of a key, or at the key's table, or at the file when neither is there.
    pub(super) fn problem(&self, section: &str, name: &str, what: impl Into<String>) -> Problem {
        let key = bounds::find(section, name);
        let at = self.value(section, name).or_else(|| self.root.get(section)).map(Spanned::span);
        Problem::new(self.file, what)
            .line(at.map(|s| self.line_at(s.start)))
            .place(format!("key {}", key.full_name()))
    }

    fn source(&self, value: &Value<'_>) -> &str {
        self.text.get(value.span()).unwrap_or("")
    }

    /// The value of a key when it is there; a finding when it is required and is not.
    fn lookup(&self, key: &Key, findings: &mut Findings) -> Option<&Value<'a>> {
        let value = self.value(key.section, key.name);
        if value.is_none() && key.need == Need::Required {
            let mut problem = self.problem(key.section, key.name, "is missing").accepted(key.accepted());
            if key.full_name() == "map.crs" {
                problem = problem.advice(
                    "without it the numbers have no meaning; write one of: crs = \"EPSG:4326\" for latitude and \
                     longitude, crs = \"EPSG:32631\" (the code of your grid) for eastings and northings, crs = \
                     \"local\" for plain metres",
                );
            } else {
                problem = problem.advice(format!("{} Add it", key.meaning));
            }
            findings.problem(problem);
        }
        value
    }

    fn wrong(&self, key: &Key, value: &Value<'_>, why: &str, findings: &mut Findings) {
        findings.problem(
            self.problem(key.section, key.name, format!("{} {why}", self.source(value)))
                .accepted(key.accepted()),
        );
    }

    /// A number, its default, or none.
    pub(super) fn number(&self, section: &str, name: &str, findings: &mut Findings) -> Option<f64> {
        let key = bounds::find(section, name);
        let (Kind::Number(range) | Kind::Whole(range)) = key.kind else {
            panic!("{} is not a number in the table of keys", key.full_name())
        };
        let Some(value) = self.lookup(key, findings) else {
            return match key.need {
                Need::Default(text) => text.parse().ok(),
                _ => None,
            };
        };
        let whole = matches!(key.kind, Kind::Whole(_));
        let x = match value.get_ref() {
            DeValue::Integer(i) => {
                i64::from_str_radix(i.as_str(), i.radix()).ok().map_or(f64::INFINITY, |i| i as f64)
            }
            DeValue::Float(f) if !whole => f.as_str().parse().unwrap_or(f64::NAN),
            DeValue::Float(_) => {
                self.wrong(key, value, "is not a whole number", findings);
                return None;
            }
            _ => {
                self.wrong(key, value, "is not a number", findings);
                return None;
            }
        };
        if range.contains(x) {
            return Some(x);
        }
        let why = if x.is_finite() { "is out of range" } else { "is not a finite number in range" };
        self.wrong(key, value, why, findings);
        None
    }

    /// A text, or none.
    pub(super) fn text(&self, section: &str, name: &str, findings: &mut Findings) -> Option<String> {
        let key = bounds::find(section, name);
        let Some(value) = self.lookup(key, findings) else {
            return match key.need {
                Need::Default(text) => Some(text.trim_matches('"').to_owned()),
                _ => None,
            };
        };
        let DeValue::String(text) = value.get_ref() else {
            self.wrong(key, value, "is not text", findings);
            return None;
        };
        if text.trim().is_empty() {
            self.wrong(key, value, "is empty", findings);
            return None;
        }
        if text.trim().contains(char::is_control) {
            self.wrong(key, value, "holds a line end or another control character", findings);
            return None;
        }
        if let Kind::Choice(words) = key.kind
            && !words.contains(&text.as_ref())
        {
            self.wrong(key, value, "is not one of the choices", findings);
            return None;
        }
        Some(text.trim().to_owned())
    }

    /// `true` or `false`.
    pub(super) fn flag(&self, section: &str, name: &str, findings: &mut Findings) -> bool {
        let key = bounds::find(section, name);
        match self.lookup(key, findings).map(|v| (v, v.get_ref())) {
            None => key.need == Need::Default("true"),
            Some((_, DeValue::Boolean(b))) => *b,
            Some((value, _)) => {
                self.wrong(key, value, "is neither true nor false", findings);
                false
            }
        }
    }

    /// A list of texts; one text alone counts as a list of one.
    pub(super) fn list(&self, section: &str, name: &str, findings: &mut Findings) -> Option<Vec<String>> {
        let key = bounds::find(section, name);
        let value = self.lookup(key, findings)?;
        let items: Vec<&Value<'_>> = match value.get_ref() {
            DeValue::String(_) => vec![value],
            DeValue::Array(items) => items.iter().collect(),
            _ => {
                self.wrong(key, value, "is not a list", findings);
                return None;
            }
        };
        let mut out = Vec::new();
        for item in &items {
            match item.get_ref() {
                DeValue::String(text) if !matches!(key.kind, Kind::Choices(words) if !words.contains(&text.as_ref())) =>
                {
                    out.push(text.trim().to_owned());
                }
                DeValue::String(_) => self.wrong(key, item, "is not one of the choices", findings),
                _ => self.wrong(key, item, "is not text", findings),
            }
        }
        if items.is_empty() {
            self.wrong(key, value, "is empty", findings);
        }
        (out.len() == items.len() && !out.is_empty()).then_some(out)
    }

    /// A coordinate system, or none.
    pub(super) fn crs(&self, section: &str, name: &str, findings: &mut Findings) -> Option<Crs> {
        let text = self.text(section, name, findings)?;
        match Crs::parse(&text) {
            Ok(crs) => Some(crs),
            Err(e) => {
                let key = bounds::find(section, name);
                findings.problem(
                    self.problem(section, name, format!("\"{text}\" cannot be used: {e}"))
                        .accepted(key.accepted()),
                );
                None
            }
        }
    }

    /// A date, or none. Dates are dates of the calendar in quotes or as TOML has them, without time of day.
    pub(super) fn date(&self, section: &str, name: &str, findings: &mut Findings) -> Option<Date> {
        let key = bounds::find(section, name);
        let value = self.lookup(key, findings)?;
        let text = match value.get_ref() {
            DeValue::String(text) => text.trim().to_owned(),
            DeValue::Datetime(date) => date.to_string(),
            _ => String::new(),
        };
        let date = units::parse_date(&text);
        if date.is_none() {
            self.wrong(key, value, "is not a date", findings);
        }
        date
    }

    /// A file name, or none.
    pub(super) fn file(&self, section: &str, name: &str, findings: &mut Findings) -> Option<PathBuf> {
        self.text(section, name, findings).map(PathBuf::from)
    }
}

/// The nearest of some words by edit distance with swaps, if it is near at all.
fn nearest<'w>(word: &str, words: &[&'w str]) -> Option<&'w str> {
    /// Share of letters that must agree for a suggestion to help rather than puzzle.
    const NEAR: f64 = 0.4;
    /// Longest word that is compared, bytes: the work and memory grow with the length, and no key has half as many.
    const LONGEST: usize = 64;
    if word.len() > LONGEST {
        return None;
    }
    words
        .iter()
        .map(|w| (strsim::normalized_damerau_levenshtein(word, w), *w))
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .filter(|(score, _)| *score >= NEAR)
        .map(|(_, w)| w)
}
