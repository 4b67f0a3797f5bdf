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
}

impl fmt::Display for Problem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", self.file.display())?;
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
            what: what.into(),
            accepted: String::new(),
            advice: String::new(),
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
        self.place = Some(place.into());
        self
    }

    /// With what would be accepted.
    #[must_use]
    pub fn accepted(mut self, accepted: impl Into<String>) -> Self {
        self.accepted = accepted.into();
        self
    }

    /// With what to do about it.
    #[must_use]
    pub fn advice(mut self, advice: impl Into<String>) -> Self {
        self.advice = advice.into();
        self
    }
}

/// Most problems of one file that are printed; the rest are counted. All of them stay in [`Problems`].
pub const PRINTED_PER_FILE: usize = 50;

/// All problems found in the inputs of one dive, in file order. Never empty.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub struct Problems(pub Vec<Problem>);

impl fmt::Display for Problems {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let mut rest = self.0.as_slice();
        let mut first = true;
        while let Some(head) = rest.first() {
            let of_file = rest.iter().take_while(|p| p.file == head.file).count();
            for problem in &rest[..of_file.clamp(0, PRINTED_PER_FILE)] {
                if !std::mem::take(&mut first) {
                    writeln!(f)?;
                }
                write!(f, "{problem}")?;
            }
            if of_file > PRINTED_PER_FILE {
                write!(f, "\n{}: and {} more problems", head.file.display(), of_file - PRINTED_PER_FILE)?;
            }
            rest = &rest[of_file..];
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
    pub problems: Vec<Problem>,
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
        self.notices.push(Notice { file: file.map(Path::to_path_buf), text: text.into(), is_warning: true });
    }

    /// Adds information.
    pub fn inform(&mut self, file: Option<&Path>, text: impl Into<String>) {
        self.notices.push(Notice { file: file.map(Path::to_path_buf), text: text.into(), is_warning: false });
    }
}
