//! Arguments as typed.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand};
use clap_complete::Shell;

use crate::alias::LISTED_DEFAULT;
use crate::bounds;
use crate::dive::RankBy;
use crate::render::{ChartSize, Paper};

/// What `--help` teaches after the options.
const EXIT_CODES: &str = "\
Exit codes:
  0    done
  1    the requirement stated with --require is not met
  2    the command line is wrong
  3    an input is wrong, or a file could not be read or written
  4    the bounds contradict the data: no position explains the detections (trace)
  5    undecided: the solver ran out of its cell budget in some dives or runs
  130  interrupted

Planning aid, not for navigation. Results hold only while the stated error bounds hold and the map is as described; \
they are no statement that ground is clear of objects. The vehicle's safety case, local regulations and qualified \
personnel decide.";

/// Before the dive: how soon, on which line, can the vehicle find itself again from look-alike landmarks?
#[derive(Debug, Parser)]
#[command(name = "fixability", version, after_help = EXIT_CODES, arg_required_else_help = true)]
pub struct Arguments {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
    /// Options of every command.
    #[command(flatten)]
    pub common: Common,
}

/// Options of every command.
#[derive(Debug, Args)]
pub struct Common {
    /// Print nothing but results and errors: no notices, no progress bar
    #[arg(long, short, global = true)]
    pub quiet: bool,
    /// Print the result as JSON on standard output instead of a table
    #[arg(long, global = true)]
    pub json: bool,
    /// Replace output files that exist already
    #[arg(long, global = true)]
    pub force: bool,
    /// Seed of the simulated dives, in place of the dive file's
    #[arg(long, global = true, value_name = "NUMBER", value_parser = clap::value_parser!(u64).range(..=9_007_199_254_740_992))]
    pub seed: Option<u64>,
    /// Threads to use; results do not depend on it [default: all cores]
    #[arg(long, global = true, value_name = "NUMBER", value_parser = clap::value_parser!(u16).range(1..))]
    pub threads: Option<u16>,
    /// Paper of the charts, landscape
    #[arg(long, global = true, value_enum, value_name = "PAPER", default_value = "a4")]
    pub paper: Paper,
    /// Resolution of the charts, dots per inch
    #[arg(long, global = true, value_name = "NUMBER", default_value_t = 150, value_parser = clap::value_parser!(u32).range(150..=300))]
    pub dpi: u32,
}

impl Common {
    /// The size of every chart.
    pub(super) fn chart_size(&self) -> ChartSize {
        ChartSize::paper(self.paper, self.dpi)
    }
}

/// The commands.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Read everything the dive file names, say what was understood, and warn
    ///
    /// Prints in words where the first landmark and the first waypoint lie (so that swapped axes show), the bounds in
    /// force, each line with the number of landmarks expected in its swath, and every warning. Writes nothing.
    Check {
        /// The dive file (TOML)
        dive: PathBuf,
    },
    /// Score and rank the candidate lines; draw them coloured by fix distance
    ///
    /// For every line and every segment start the vehicle is taken as lost there. Simulated dives with bounded errors
    /// are solved from an unknown start, and the distance until the position is unambiguous is counted. With --out,
    /// writes lines.json, lines.csv, lines.png and profiles.png; and, where the map is tied to the Earth, lines.geojson and
    /// recommended.gpx (the first-ranked line as a route).
    Lines {
        /// The dive file (TOML)
        dive: PathBuf,
        /// Folder for the files (made if missing); without it nothing is written
        #[arg(long, value_name = "FOLDER")]
        out: Option<PathBuf>,
        /// Also mark the segments that run over remap regions (runs the analysis of `remap`, which takes longer)
        #[arg(long)]
        mark_remap: bool,
        /// What orders the ranking, in place of the dive file's
        #[arg(long, value_enum, value_name = "KEY")]
        rank_by: Option<RankBy>,
        /// Simulated dives per line, in place of the dive file's
        #[arg(long, value_name = "NUMBER", value_parser = clap::value_parser!(u32).range(1..=100_000))]
        draws: Option<u32>,
        /// Exit with code 1 unless this share of the first-ranked line has a guaranteed fix within the required distance
        #[arg(long, value_name = "SHARE", value_parser = share)]
        require: Option<f64>,
    },
    /// Follow one simulated dive of one line, detection by detection
    ///
    /// Shows after each detection how many places are left, how far apart they lie, and whether the true position is
    /// among them; then what is known of each detection in hindsight, once the whole dive has been seen: the places that
    /// were possible, and which landmark it must have been. With --out, writes trace.json and trace.png. The JSON also
    /// has the corridor: where the vehicle may have been at every instant.
    Trace {
        /// The dive file (TOML)
        dive: PathBuf,
        /// Name of the line [default: the first]
        #[arg(long, value_name = "NAME")]
        line: Option<String>,
        /// Distance along the line at which the vehicle is lost, metres
        #[arg(long, value_name = "METRES", default_value_t = 0.0, allow_negative_numbers = true)]
        from_m: f64,
        /// Number of the simulated dive, from 0
        #[arg(long, value_name = "NUMBER", default_value_t = 0)]
        draw: usize,
        /// Longest interval of the corridor in the JSON, metres of reported travel
        #[arg(long, value_name = "METRES", default_value_t = 10.0, value_parser = spacing)]
        corridor_m: f64,
        /// Folder for trace.json and trace.png (made if missing); without it nothing is written
        #[arg(long, value_name = "FOLDER")]
        out: Option<PathBuf>,
    },
    /// Find the ground that looks like other ground within the error bounds
    ///
    /// Lists the look-alikes, most dangerous first: how many landmarks agree, how far apart the two grounds lie, by how
    /// much all errors would have to shrink before they separate, which landmark tells them apart and how far it is, and
    /// which lines run over them. Rows and grids are summed up by their periods. With --out, writes lookalikes.json,
    /// lookalikes.csv, lookalikes.png, lookalikes-panels.png and, when the map is on the Earth, lookalikes.geojson.
    Lookalikes {
        /// The dive file (TOML)
        dive: PathBuf,
        /// Folder for the files (made if missing); without it nothing is written
        #[arg(long, value_name = "FOLDER")]
        out: Option<PathBuf>,
        /// Longest separation at which landmarks are compared, metres [default: twice the sonar's horizontal reach]
        #[arg(long, value_name = "METRES", value_parser = separation)]
        separation_m: Option<f64>,
        /// Most look-alikes to list; the others are counted
        #[arg(long, value_name = "NUMBER", default_value_t = LISTED_DEFAULT as u32, value_parser = clap::value_parser!(u32).range(1..=10_000))]
        listed: u32,
    },
    /// Map how far the vehicle must run, from every cell of the search area and on every heading, until a guaranteed fix
    ///
    /// From the centre of each start cell a straight run on each heading is solved, lost in the whole search area, and the
    /// guaranteed fix distance is reported: worst, best and median heading, share of the headings that fix within the
    /// required distance, and why the others do not. With --out, writes area.json, area.csv, area.tif
    /// (GeoTIFF), area-worst.png, area-best.png and area-share.png.
    Area {
        /// The dive file (TOML)
        dive: PathBuf,
        /// Folder for the files (made if missing); without it nothing is written
        #[arg(long, value_name = "FOLDER")]
        out: Option<PathBuf>,
        /// Side of a start cell, metres, in place of the dive file's
        #[arg(long, value_name = "METRES", value_parser = cell)]
        cell_m: Option<f64>,
        /// Headings from every cell, evenly spaced from grid north, in place of the dive file's
        #[arg(long, value_name = "NUMBER", value_parser = clap::value_parser!(u16).range(1..=360))]
        headings: Option<u16>,
        /// Longest straight run, metres, in place of the dive file's
        #[arg(long, value_name = "METRES", value_parser = longest_run)]
        longest_run_m: Option<f64>,
    },
    /// Find the seabed that deserves more mapping before the dive: where, why, and what it buys
    ///
    /// Runs the area map, joins the cells that fail the requirement into regions, and finds the cause of each by running
    /// the map again with one thing changed at a time: narrower landmark boxes, perfect dead reckoning, a perfect sonar.
    /// For each region it then looks for the re-survey quality that cures it, and runs the map with that quality to see
    /// what it buys. With --out, writes remap.json, remap.csv, remap.png and, when the map is on the Earth, remap.geojson.
    /// Keys: section [remap].
    Remap {
        /// The dive file (TOML)
        dive: PathBuf,
        /// Folder for the files (made if missing); without it nothing is written
        #[arg(long, value_name = "FOLDER")]
        out: Option<PathBuf>,
    },
    /// Suggest where to dive and which heading to run first
    ///
    /// The vehicle starts anywhere in the descent scatter about the dive point and does not know where. For every dive
    /// point of the search area and every heading the longest guaranteed fix distance over the scatter disc is found, and
    /// the best are listed, far enough apart to be real alternatives. With --out, writes suggest.json, suggest.csv,
    /// suggest.png, and the suggested lines S1, S2, ... as suggest-lines.csv and, when the map is on the Earth,
    /// suggest.geojson and suggest.gpx: name one of these in lines.files and `lines` scores them. Keys: section
    /// [suggest]; cells, headings and the longest run are those of [area].
    Suggest {
        /// The dive file (TOML)
        dive: PathBuf,
        /// Folder for the files (made if missing); without it nothing is written
        #[arg(long, value_name = "FOLDER")]
        out: Option<PathBuf>,
        /// Most suggestions to list, in place of the dive file's
        #[arg(long, value_name = "NUMBER", value_parser = clap::value_parser!(u16).range(1..=100))]
        listed: Option<u16>,
    },
    /// Find which error bound is worth improving first
    ///
    /// Every error bound is multiplied by a factor, one at a time and then all together, and the guaranteed fixes of every
    /// line are computed again: how much more of the lines has a guaranteed fix within the required distance, how many
    /// segments gain one, and how much sooner it comes. No simulated dive is involved. With --out, writes
    /// sensitivity.json, sensitivity.csv and sensitivity.png.
    Sensitivity {
        /// The dive file (TOML)
        dive: PathBuf,
        /// Folder for the three files (made if missing); without it nothing is written
        #[arg(long, value_name = "FOLDER")]
        out: Option<PathBuf>,
        /// Factor for each bound, in place of the dive file's: 0.5 halves it, 0 makes it perfect
        #[arg(long, value_name = "FACTOR", value_parser = factor)]
        factor: Option<f64>,
    },
    /// Print a completion script for a shell
    Completions {
        /// The shell
        shell: Shell,
    },
}

/// Parses the length of a corridor interval. Below a decimetre the file would only grow.
fn spacing(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(spacing) if (0.1..=10_000.0).contains(&spacing) => Ok(spacing),
        _ => Err("accepted: a distance from 0.1 to 10000 m, such as 10".to_owned()),
    }
}

/// Parses the longest separation of landmarks.
fn separation(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(separation) if (1.0..=10_000.0).contains(&separation) => Ok(separation),
        _ => Err("accepted: a distance from 1 to 10000 m, such as 150".to_owned()),
    }
}

/// Parses the side of a start cell.
fn cell(text: &str) -> Result<f64, String> {
    in_range_of("area", "cell_m", text)
}

/// Parses the longest straight run.
fn longest_run(text: &str) -> Result<f64, String> {
    in_range_of("area", "longest_run_m", text)
}

/// Parses the factor of an improvement.
fn factor(text: &str) -> Result<f64, String> {
    in_range_of("sensitivity", "factor", text)
}

/// Parses a number in the range of a key.
fn in_range_of(section: &str, key: &str, text: &str) -> Result<f64, String> {
    let key = bounds::find(section, key);
    match (text.parse::<f64>(), key.kind) {
        (Ok(number), bounds::Kind::Number(range)) if range.contains(number) => Ok(number),
        _ => Err(format!("accepted: {}", key.accepted())),
    }
}

/// Parses a share between 0 and 1.
fn share(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(share) if (0.0..=1.0).contains(&share) => Ok(share),
        _ => Err("accepted: a share from 0 to 1, such as 0.9".to_owned()),
    }
}
