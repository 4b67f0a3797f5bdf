//! What is wrong with a user's file: where, what, what is accepted, and what to do.

use std::fmt;
use std::path::{Path, PathBuf};

/// One thing wrong with an input file.
///
/// Printed as `reef.csv:17: column northing_m: "12.x" is not a number; accepted: …; …`.
#[derive(Clone, Debug, PartialEq)]
pub struct Problem {
    /// The file, as the user named it.
    pub file: PathBuf,
    /// Line number from 1, where there is one.
    pub line: Option<u64>,
    /// Where in the line or file: `column northing_m`, `key sonar.range_max_m`, `feature 3`.
    pub place: Option<String>,
    /// What is wrong, with the offending text in quotes.
    pub what: String,
    /// What would be accepted; empty when `what` says it already.
    pub accepted: String,
    /// What to do about it; empty when obvious.
    pub advice: String,
    /// Further problems of the same file that were counted after this one and not kept.
    pub more: usize,
}

/// Longest text of a message that is kept, characters. The longest list of names that the program prints by itself is shorter.
const TEXT_MAX: usize = 2000;

/// Text from a file as it may be printed: control characters and marks that turn the direction of writing are spelled out,
/// so that nothing in a file can steer a terminal or split a message, and what is longer than `TEXT_MAX` characters is cut
/// visibly.
pub fn printable(text: &str) -> String {
    let is_plain = |c: char| {
        !c.is_control()
            && !matches!(c, '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}')
    };
    let mut out = String::new();
    for (i, c) in text.chars().enumerate() {
        if i == TEXT_MAX {
            out.push('…');
            break;
        }
        if is_plain(c) {
            out.push(c);
        } else {
            out.extend(c.escape_default());
        }
    }
    out
}

impl fmt::Display for Problem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", printable(&self.file.display().to_string()))?;
        if let Some(line) = self.line {
            write!(f, ":{line}")?;
        }
        if let Some(place) = &self.place {
            write!(f, ": {place}")?;
        }
        write!(f, ": {}", self.what)?;
        if !self.accepted.is_empty() {
            write!(f, "; accepted: {}", self.accepted)?;
        }
        if !self.advice.is_empty() {
            write!(f, "; {}", self.advice)?;
        }
        Ok(())
    }
}

impl Problem {
    /// A problem of a file, without a place yet.
    pub fn new(file: impl Into<PathBuf>, what: impl Into<String>) -> Self {
        Self {
            file: file.into(),
            line: None,
            place: None,
            what: printable(&what.into()),
            accepted: String::new(),
            advice: String::new(),
            more: 0,
        }
    }

    /// With the line number, where there is one.
    #[must_use]
    pub fn line(mut self, line: impl Into<Option<u64>>) -> Self {
        self.line = line.into();
        self
    }

    /// With the place in the line or file.
    #[must_use]
    pub fn place(mut self, place: impl Into<String>) -> Self {
        self.place = Some(printable(&place.into()));
        self
    }

    /// With what would be accepted.
    #[must_use]
    pub fn accepted(mut self, accepted: impl Into<String>) -> Self {
        self.accepted = printable(&accepted.into());
        self
    }

    /// With what to do about it.
    #[must_use]
    pub fn advice(mut self, advice: impl Into<String>) -> Self {
        self.advice = printable(&advice.into());
        self
    }
}

/// Most problems of one file that are printed; the rest are counted.
pub const PRINTED_PER_FILE: usize = 50;

/// Most problems in a row of one file that are kept; the rest are counted in [`Problem::more`], so that a file that is wrong
/// throughout costs no more memory than a sound one.
pub const KEPT_PER_FILE: usize = 1000;

/// Problems in the order found.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct ProblemList {
    kept: Vec<Problem>,
    /// How many at the end of `kept` are of the same file.
    of_last_file: usize,
    count: usize,
}

impl ProblemList {
    /// Adds one.
    pub fn push(&mut self, problem: Problem) {
        self.count += 1 + problem.more;
        match self.kept.last_mut() {
            Some(last) if last.file == problem.file => {
                if self.of_last_file >= KEPT_PER_FILE {
                    last.more += 1 + problem.more;
                    return;
                }
                self.of_last_file += 1;
            }
            _ => self.of_last_file = 1,
        }
        self.kept.push(problem);
    }

    /// Adds one of `file` that is only made when it is kept.
    pub fn push_with(&mut self, file: &Path, make: impl FnOnce() -> Problem) {
        match self.kept.last_mut() {
            Some(last) if self.of_last_file >= KEPT_PER_FILE && last.file == file => {
                last.more += 1;
                self.count += 1;
            }
            _ => self.push(make()),
        }
    }

    /// Number of all problems, kept or not.
    pub fn len(&self) -> usize {
        self.count
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.count == 0
    }

    /// The first one.
    pub fn first(&self) -> Option<&Problem> {
        self.kept.first()
    }

    /// Those that were kept.
    pub fn iter(&self) -> std::slice::Iter<'_, Problem> {
        self.kept.iter()
    }
}

impl Extend<Problem> for ProblemList {
    fn extend<T: IntoIterator<Item = Problem>>(&mut self, problems: T) {
        problems.into_iter().for_each(|problem| self.push(problem));
    }
}

impl IntoIterator for ProblemList {
    type Item = Problem;
    type IntoIter = std::vec::IntoIter<Problem>;

    fn into_iter(self) -> Self::IntoIter {
        self.kept.into_iter()
    }
}

impl From<ProblemList> for Problems {
    fn from(list: ProblemList) -> Self {
        Self(list.kept)
    }
}

/// All problems found in the inputs of one dive, in file order. Never empty.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub struct Problems(pub Vec<Problem>);

impl fmt::Display for Problems {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let mut rest = self.0.as_slice();
        let mut first = true;
        while let Some(head) = rest.first() {
            let of_file = rest.iter().take_while(|p| p.file == head.file).count();
            let (here, others) = rest.split_at(of_file);
            for problem in here.iter().take(PRINTED_PER_FILE) {
                if !std::mem::take(&mut first) {
                    writeln!(f)?;
                }
                write!(f, "{problem}")?;
            }
            let all: usize = here.iter().map(|p| 1 + p.more).sum();
            if all > PRINTED_PER_FILE {
                let file = printable(&head.file.display().to_string());
                write!(f, "\n{file}: and {} more problems", all - PRINTED_PER_FILE)?;
            }
            rest = others;
        }
        Ok(())
    }
}

/// Something the user should know that does not stop the run.
#[derive(Clone, Debug, PartialEq, serde::Serialize)]
pub struct Notice {
    /// The file concerned, where there is one.
    pub file: Option<PathBuf>,
    /// The text, one sentence or two.
    pub text: String,
    /// Whether the notice is a warning (results may mislead) or only information.
    pub is_warning: bool,
}

/// What has been found so far while reading: problems and notices, in the order found.
#[derive(Clone, Debug, Default)]
pub struct Findings {
    /// What stops the run.
    pub problems: ProblemList,
    /// What does not.
    pub notices: Vec<Notice>,
}

impl Findings {
    /// Adds a problem.
    pub fn problem(&mut self, problem: Problem) {
        self.problems.push(problem);
    }

    /// Adds a warning.
    pub fn warn(&mut self, file: Option<&Path>, text: impl Into<String>) {
        self.notice(file, text.into(), true);
    }

    /// Adds information.
    pub fn inform(&mut self, file: Option<&Path>, text: impl Into<String>) {
        self.notice(file, text.into(), false);
    }

    fn notice(&mut self, file: Option<&Path>, text: String, is_warning: bool) {
        self.notices.push(Notice { file: file.map(Path::to_path_buf), text: printable(&text), is_warning });
    }
}
