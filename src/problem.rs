//! What is wrong with a user's file: where, what, what is accepted, and what to do.

use std::fmt;
use std::path::PathBuf;

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

/// All problems found in the inputs of one dive, in file order. Never empty.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[error("{}", .0.iter().map(Problem::to_string).collect::<Vec<_>>().join("\n"))]
pub struct Problems(pub Vec<Problem>);

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
