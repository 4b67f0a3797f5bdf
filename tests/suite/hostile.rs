//! Files that are broken, or made to break the program: refused with a message, in bounded time and memory, without a panic.

mod bounds;
mod corpus;
mod dependencies;
mod files;
mod formats;
mod fuzz;
mod mutate;

use std::collections::BTreeMap;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};
use std::time::{Duration, Instant};

use fixability::dive::Dive;
use fixability::frame::Crs;
use fixability::input::{InputText, ReadFault};
use fixability::problem::{Findings, KEPT_PER_FILE, Problems};
use fixability::{map, track};

/// A format of input.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Format {
    Csv,
    GeoJson,
    Gpx,
    Kml,
    Toml,
}

pub const FORMATS: [Format; 5] = [Format::Csv, Format::GeoJson, Format::Gpx, Format::Kml, Format::Toml];

impl Format {
    pub fn ending(self) -> &'static str {
        match self {
            Self::Csv => "csv",
            Self::GeoJson => "geojson",
            Self::Gpx => "gpx",
            Self::Kml => "kml",
            Self::Toml => "toml",
        }
    }

    fn memory_multiple(self) -> usize {
        if self == Self::Toml { MEMORY_MULTIPLE_DIVE } else { MEMORY_MULTIPLE }
    }
}

/// Most memory that reading may take: this many times the size of the input, for landmarks, lines and areas …
const MEMORY_MULTIPLE: usize = 128;
/// … and for the dive file, which is small (`bounds::DIVE_SIZE_MAX`); …
const MEMORY_MULTIPLE_DIVE: usize = 512;
/// … and this many bytes besides, for tables and messages that do not depend on the input.
const MEMORY_BESIDES: usize = 2 << 20;
/// Longest time for one case, per megabyte of it or part of one.
const TIME_MAX: Duration = Duration::from_secs(1);

/// How an input is read.
#[derive(Clone, Copy, Debug)]
pub struct Way {
    /// Coordinate system stated for the input: geographic, grid or local.
    pub crs: usize,
    pub decimal_comma: bool,
    pub skip_bad_rows: bool,
    /// As part of a whole dive, as its landmarks, lines, search area or mapped area; otherwise by the readers alone.
    pub in_dive: Option<&'static str>,
}

/// Every text that came of it, one per message; whether it was accepted.
pub struct Reading {
    pub messages: Vec<String>,
    pub accepted: bool,
}

/// What one reading cost.
pub struct Cost {
    pub reading: Reading,
    pub time: Duration,
    pub peak_bytes: usize,
}

/// Reads an input, in memory.
pub fn read(format: Format, bytes: &[u8], way: Way) -> Reading {
    if format == Format::Toml {
        return read_dive(bytes.to_vec(), &[]);
    }
    let name = PathBuf::from(format!("case.{}", format.ending()));
    if let Some(role) = way.in_dive {
        let dive = corpus::dive_with(role, name.to_str().expect("plain"), way);
        return read_dive(dive.into_bytes(), &[(name, bytes)]);
    }
    let mut findings = Findings::default();
    let Some(input) = InputText::from_bytes(bytes, &name, &mut findings) else {
        return reading(findings, false);
    };
    let crs =
        [Crs::wgs84(), Crs::parse("EPSG:32631").expect("a known code"), Crs::Local][way.crs % 3].clone();
    let options =
        map::read::ReadOptions { decimal_comma: way.decimal_comma, skip_bad_rows: way.skip_bad_rows };
    let landmarks = map::read::read(&input, &crs, options, &mut findings).map(|file| file.rows.len());
    let options =
        track::read::ReadOptions { declared: None, of_map: Some(&crs), decimal_comma: way.decimal_comma };
    let before = findings.problems.len();
    let lines = track::read::read(&input, options, &mut findings);
    let accepted = lines.is_some() || (landmarks.is_some() && before == 0);
    reading(findings, accepted)
}

fn reading(findings: Findings, accepted: bool) -> Reading {
    assert!(accepted || !findings.problems.is_empty(), "refused without a word");
    let mut messages: Vec<String> = findings.notices.into_iter().map(|notice| notice.text).collect();
    let kept: Vec<_> = findings.problems.into_iter().collect();
    assert!(kept.len() <= 2 * KEPT_PER_FILE, "{} problems are kept", kept.len());
    messages.extend(Problems(kept).to_string().lines().map(str::to_owned));
    Reading { messages, accepted }
}

fn read_dive(dive: Vec<u8>, with: &[(PathBuf, &[u8])]) -> Reading {
    let mut files: BTreeMap<PathBuf, Vec<u8>> = corpus::files_of_the_dive();
    files.extend(with.iter().map(|(name, bytes)| (name.clone(), bytes.to_vec())));
    files.insert("dive.toml".into(), dive);
    let source = |path: &Path| files.get(path).cloned().ok_or(ReadFault::NotFound);
    match Dive::read_from(Path::new("dive.toml"), &source) {
        Ok(dive) => {
            Reading { messages: dive.notices.into_iter().map(|notice| notice.text).collect(), accepted: true }
        }
        Err(problems) => {
            Reading { messages: problems.to_string().lines().map(str::to_owned).collect(), accepted: false }
        }
    }
}

/// Reads an input and measures. A panic is caught, and the error says what it said.
pub fn measured(format: Format, bytes: &[u8], way: Way) -> Result<Cost, String> {
    let mut result = None;
    let start = Instant::now();
    let memory = allocation_counter::measure(|| {
        result = Some(catch_unwind(AssertUnwindSafe(|| read(format, bytes, way))));
    });
    let time = start.elapsed();
    match result.expect("it ran") {
        Ok(reading) => Ok(Cost { reading, time, peak_bytes: memory.bytes_max as usize }),
        Err(panic) => Err(panic
            .downcast_ref::<String>()
            .cloned()
            .or_else(|| panic.downcast_ref::<&str>().map(|s| (*s).to_owned()))
            .unwrap_or_else(|| "a panic without words".into())),
    }
}

/// Time that this thread has spent computing so far, where the system tells (Linux, `proc(5)`).
fn computed() -> Option<Duration> {
    let text = std::fs::read_to_string("/proc/thread-self/schedstat").ok()?;
    text.split(' ').next()?.parse().ok().map(Duration::from_nanos)
}

/// What is wrong with how an input was read, if anything.
pub fn fault(format: Format, bytes: &[u8], way: Way) -> Result<Cost, String> {
    let mut cost = measured(format, bytes, way).map_err(|panic| format!("panic: {panic}"))?;
    let time_max = TIME_MAX * (bytes.len() as u32).div_ceil(1 << 20).max(1);
    if cost.time > time_max {
        // The machine may have been busy with something else: once more, and only what this thread computed counts.
        let before = computed();
        let again = measured(format, bytes, way).map_err(|panic| format!("panic: {panic}"))?;
        cost.time = match (before, computed()) {
            (Some(before), Some(after)) => after - before,
            _ => again.time,
        };
    }
    if cost.time > time_max {
        return Err(format!("took {:?} for {} bytes", cost.time, bytes.len()));
    }
    if cost.peak_bytes > format.memory_multiple() * bytes.len() + MEMORY_BESIDES {
        return Err(format!("took {} bytes of memory for {}", cost.peak_bytes, bytes.len()));
    }
    for message in &cost.reading.messages {
        if message.chars().any(char::is_control) {
            return Err(format!("a control character in the message {message:?}"));
        }
        if message.len() > 40_000 {
            return Err(format!("a message of {} bytes", message.len()));
        }
    }
    Ok(cost)
}

/// The plainest way.
pub const PLAIN: Way = Way { crs: 0, decimal_comma: false, skip_bad_rows: false, in_dive: None };

/// The text of all messages about an input; fails when it is accepted, or read wrongly.
#[track_caller]
pub fn refused(format: Format, bytes: impl AsRef<[u8]>, way: Way) -> String {
    match fault(format, bytes.as_ref(), way) {
        Ok(cost) => {
            let text = cost.reading.messages.join("\n");
            assert!(!cost.reading.accepted, "accepted; messages:\n{text}");
            text
        }
        Err(what) => panic!("{what}"),
    }
}
