//! The report: ratios within pairs, their median and range, and what they were measured on.

use std::fmt::Write as _;
use std::process::Command;

/// Median, least and greatest of a list.
#[derive(Clone, Copy, Default)]
pub struct Spread {
    median: f64,
    least: f64,
    most: f64,
}

impl Spread {
    pub fn of(mut list: Vec<f64>) -> Self {
        if list.is_empty() {
            return Self { median: f64::NAN, least: f64::NAN, most: f64::NAN };
        }
        list.sort_by(f64::total_cmp);
        let middle = list.len() / 2;
        let median = if list.len() % 2 == 1 { list[middle] } else { 0.5 * (list[middle - 1] + list[middle]) };
        Self { median, least: list[0], most: list[list.len() - 1] }
    }

    fn show(&self, unit: impl Fn(f64) -> String) -> String {
        if self.median.is_nan() {
            return "–".into();
        }
        format!("{} ({} … {})", unit(self.median), unit(self.least), unit(self.most))
    }
}

/// Three digits.
fn number(x: f64) -> String {
    let digits = if x >= 100.0 {
        0
    } else if x >= 10.0 {
        1
    } else {
        2
    };
    let text = format!("{x:.digits$}");
    let (whole, rest) = text.split_at(text.find('.').unwrap_or(text.len()));
    let mut grouped = String::new();
    for (place, digit) in whole.chars().enumerate() {
        if place > 0 && (whole.len() - place).is_multiple_of(3) {
            grouped.push(' ');
        }
        grouped.push(digit);
    }
    grouped + rest
}

fn time(seconds: f64) -> String {
    if seconds < 1e-3 {
        format!("{} µs", number(seconds * 1e6))
    } else if seconds < 1.0 {
        format!("{} ms", number(seconds * 1e3))
    } else {
        format!("{} s", number(seconds))
    }
}

/// Another way to the same answer.
pub struct VariantRow {
    name: String,
    landmarks: usize,
    seconds: Vec<f64>,
    ratios: Vec<f64>,
}

impl VariantRow {
    pub fn new(name: &str, landmarks: usize) -> Self {
        Self { name: name.into(), landmarks, seconds: Vec::new(), ratios: Vec::new() }
    }

    pub fn add(&mut self, own_s: f64, other_s: f64) {
        self.seconds.push(other_s);
        self.ratios.push(other_s / own_s);
    }
}

/// The program's solver.
#[derive(Default)]
pub struct SolverRow {
    pub landmarks: usize,
    pub dives: usize,
    pub fixes: usize,
    pub undecided: usize,
    pub wrong: usize,
    pub seconds: Spread,
    pub run_m: Spread,
}

/// What a cloud of particles says at one instant.
#[derive(Clone, Copy)]
pub enum Verdict {
    /// The estimate is within the fix size of the truth.
    Right,
    /// It is not, but some particle is; the flag tells whether 95 % of the particles are in one wrong place.
    Wrong(bool),
    /// No particle is within the fix size of the truth; the flag as above.
    Lost(bool),
    /// No particle explained a detection.
    Died,
}

impl Verdict {
    pub fn of(is_right: bool, has_truth: bool, is_sure: bool) -> Self {
        match (is_right, has_truth) {
            (true, _) => Self::Right,
            (false, true) => Self::Wrong(is_sure),
            (false, false) => Self::Lost(is_sure),
        }
    }
}

/// Verdicts, counted.
#[derive(Default)]
pub struct Verdicts {
    right: usize,
    wrong: usize,
    lost: usize,
    sure: usize,
    died: usize,
}

impl Verdicts {
    pub fn add(&mut self, verdict: Verdict) {
        match verdict {
            Verdict::Right => self.right += 1,
            Verdict::Wrong(is_sure) => {
                self.wrong += 1;
                self.sure += usize::from(is_sure);
            }
            Verdict::Lost(is_sure) => {
                self.lost += 1;
                self.sure += usize::from(is_sure);
            }
            Verdict::Died => self.died += 1,
        }
    }

    fn show(&self) -> String {
        format!("{} | {} | {} | {} | {}", self.right, self.wrong, self.lost, self.died, self.sure)
    }
}

/// The particle filter.
pub struct FilterRow {
    landmarks: usize,
    particles: usize,
    edge: usize,
    to_the_end: bool,
    seconds: Vec<f64>,
    ratios: Vec<f64>,
    pub at_fix: Verdicts,
    pub at_end: Verdicts,
}

impl FilterRow {
    pub fn new(landmarks: usize, [particles, edge]: [usize; 2], to_the_end: bool) -> Self {
        Self {
            landmarks,
            particles,
            edge,
            to_the_end,
            seconds: Vec::new(),
            ratios: Vec::new(),
            at_fix: Verdicts::default(),
            at_end: Verdicts::default(),
        }
    }

    pub fn add_pair(&mut self, own_s: f64, other_s: f64) {
        self.seconds.push(other_s);
        self.ratios.push(other_s / own_s);
    }
}

/// Everything that was measured.
pub struct Report {
    dives: usize,
    rounds: usize,
    pub solver: Vec<SolverRow>,
    pub variants: Vec<VariantRow>,
    pub filters: Vec<FilterRow>,
    pub numpy: String,
}

impl Report {
    pub fn new(dives: usize, rounds: usize) -> Self {
        let numpy = "left out".into();
        Self { dives, rounds, solver: Vec::new(), variants: Vec::new(), filters: Vec::new(), numpy }
    }

    pub fn to_markdown(&self, took_s: f64) -> String {
        let mut text = String::new();
        let cores = std::thread::available_parallelism().map_or(0, usize::from);
        let count = |n: usize| number(n as f64);
        writeln!(
            text,
            "# The solver beside others\n\n\
             Written by `FIXABILITY_WRITE_REPORTS=1 cargo bench --bench peers` (`tests/bench/peers`), in {:.0} minutes.\n\n\
             - Machine: {cores} cores ({}), every contestant on one thread. {}.\n\
             - Python side: {}.\n\
             - The question: an unknown start anywhere on the map, detections without identity, 1 heading slice, until the \
             position is known to the fix size of 25 m. Random maps at 100 landmarks per km²; {} dives for each, along \
             straight lines of 1 km anywhere and in any direction; errors at random, at their bounds and steady in turn.\n\
             - Ratios are the other's time over the program's, measured right beside each other; given are the median \
             and, in brackets, the least and the greatest of all pairs ({} rounds of each dive for the variants in \
             Rust, fewer dives for NumPy). Times are for orientation.\n",
            took_s / 60.0,
            processor(),
            rustc(),
            self.numpy,
            self.dives,
            self.rounds,
        )
        .expect("a string takes everything");
        text.push_str(
            "## This program\n\n\
             *Wrong*: at some event the true position is outside the reported set.\n\n\
             | landmarks | dives | fix | undecided | wrong | run to the fix, m | time to the fix |\n\
             |--:|--:|--:|--:|--:|--:|--:|\n",
        );
        for row in &self.solver {
            writeln!(
                text,
                "| {} | {} | {} | {} | {} | {} | {} |",
                count(row.landmarks),
                row.dives,
                row.fixes,
                row.undecided,
                row.wrong,
                row.run_m.show(number),
                row.seconds.show(time),
            )
            .expect("a string takes everything");
        }
        text.push_str(
            "\n## The same answer by other means\n\n\
             The same recursion with the same 32 directions. The Rust variants agree with the program to the last digit; NumPy \
             in cells and places, and in the spread to 10⁻⁶ m (checked in every run). All pairs of cells and landmarks \
             at 10⁵ landmarks would take minutes per solve: not run.\n\n\
             | landmarks | by | pairs | time to the fix | times slower than the program |\n\
             |--:|---|--:|--:|--:|\n",
        );
        for row in &self.variants {
            writeln!(
                text,
                "| {} | {} | {} | {} | {} |",
                count(row.landmarks),
                row.name,
                row.ratios.len(),
                Spread::of(row.seconds.clone()).show(time),
                Spread::of(row.ratios.clone()).show(number),
            )
            .expect("a string takes everything");
        }
        text.push_str(
            "\n## A particle filter\n\n\
             A bootstrap particle filter (Gordon, Salmond, Smith 1993) in Rust, with systematic resampling and roughening; \
             settings and likelihood are stated in `tests/bench/peers/particles.rs`. It is asked at the program's fix, and again \
             at the end of the line.\n\n\
             - *Edge*: how softly the likelihood ends at the error bounds, in bounds.\n\
             - *Right*: its estimate (the mean of the most crowded spot) lies within the fix size of the truth.\n\
             - *Wrong place*: it does not, though some particle is within the fix size of the truth.\n\
             - *Truth lost*: no particle is. *Died*: no particle explains a detection.\n\
             - *Sure*: of wrong and lost, those with 95 % of the particles in one wrong place.\n\n\
             | landmarks | particles | edge | asked | right | wrong place | truth lost | died | sure | time to the fix | times slower |\n\
             |--:|--:|--:|---|--:|--:|--:|--:|--:|--:|--:|\n",
        );
        for row in &self.filters {
            writeln!(
                text,
                "| {} | {} | {} | at the fix | {} | {} | {} |",
                count(row.landmarks),
                count(row.particles),
                row.edge,
                row.at_fix.show(),
                Spread::of(row.seconds.clone()).show(time),
                Spread::of(row.ratios.clone()).show(number),
            )
            .expect("a string takes everything");
            if row.to_the_end {
                writeln!(
                    text,
                    "| {} | {} | {} | at the end | {} | | |",
                    count(row.landmarks),
                    count(row.particles),
                    row.edge,
                    row.at_end.show(),
                )
                .expect("a string takes everything");
            }
        }
        text
    }
}

fn rustc() -> String {
    let version = Command::new("rustc").arg("--version").output().ok();
    version
        .and_then(|output| String::from_utf8(output.stdout).ok())
        .map_or("rustc ?".into(), |text| text.split('(').next().unwrap_or_default().trim().to_owned())
}

/// The processor's name, where the system tells.
fn processor() -> String {
    let info = std::fs::read_to_string("/proc/cpuinfo").unwrap_or_default();
    let name = info.lines().find_map(|line| line.strip_prefix("model name"));
    name.map_or("unknown processor".into(), |name| name.trim_start_matches([' ', '\t', ':']).to_owned())
}
