//! What to map again before the dive, why, and what that buys.
//!
//! *Pass.* The area map ([`super::area()`]) is run over start cells of `remap.cell_m`. A cell passes when at least
//! `remap.pass_share` of the headings has a guaranteed fix within the required distance. (The vehicle does not know in
//! which cell it is, so it cannot pick the best heading of its cell: the share of all headings counts. At 0.5 the median
//! heading passes.) Runs end at the required distance, or at `area.longest_run_m` where that is shorter: what comes later
//! does not count.
//!
//! *Cause of a cell.* The map is run again over the failing cells with one thing changed at a time: every landmark box
//! narrowed to `remap.resurvey_half_width_m`; dead reckoning perfect; sonar without errors. In this order:
//!
//! 1. *undecided*: the headings on which the cell budget ran out could let the cell pass;
//! 2. *boxes too wide*: it passes with narrow boxes (first, because a survey can do something about that);
//! 3. *too few landmarks*: even with narrow boxes fewer headings than must pass meet at least three landmarks that are
//!    certain to be detected within the required distance (three, and as many more as strays and misses are budgeted);
//! 4. *dead reckoning* or *sonar*: it passes when that is perfect (when each would do, the one that lets more headings
//!    pass; dead reckoning when that is equal);
//! 5. *look-alike ground*: on at least half of the failing headings several places remain, although there are landmarks
//!    enough;
//! 6. *several errors*: otherwise; only improvements together could help.
//!
//! Where no landmark is certain to be detected (a detection chance below 1 and no budget of misses) every cell fails for
//! *detection not certain*.
//!
//! *Regions.* Failing cells that share an edge and a cause form a region. Groups of fewer than
//! `remap.smallest_region_cells` cells join the neighbouring group with the longest common border, so that a region has a
//! main cause and shares of its cells by cause; a small group without a neighbour is a speck, counted and left out. The
//! polygon of a region is the union of its cell squares, holes kept: the areas of regions and specks add up to that of the
//! failing cells.
//!
//! *Cure and gain.* See `resurvey.rs`.

mod cause;
mod crossing;
mod region;
mod resurvey;

pub use crossing::{RegionIndex, mark_segments};
pub use resurvey::{SurveyGround, survey_ground};

use cause::Tally;
use region::Group;

use super::Setup;
use super::area::{area_grid, headings_rad, outcomes};
use crate::dive::{AreaOptions, Dive};
use crate::interval::smaller;
use crate::report::{
    AreaGrid, CauseShare, REMAP_STATEMENT, RemapCause, RemapRegion, RemapReport, TOO_FEW_LANDMARKS_NOTE,
};

/// What the analysis tells about its progress, in runs (one cell, one heading).
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum RemapProgress {
    /// So many more runs will be made.
    Planned(usize),
    /// So many more runs are done.
    Done(usize),
}

/// One analysis: the same cells and headings over and over again.
struct Run<'a> {
    setup: &'a Setup<'a>,
    area: AreaOptions,
    grid: AreaGrid,
    headings_rad: Vec<f64>,
    progress: &'a (dyn Fn(RemapProgress) + Sync),
}

impl Run<'_> {
    fn required_m(&self) -> f64 {
        self.setup.dive.scoring.required_fix_m
    }

    /// The headings of each of `places`, counted, with the inputs of `dive`.
    fn tallies(&self, dive: &Dive, places: &[(usize, usize)]) -> Vec<Tally> {
        (self.progress)(RemapProgress::Planned(places.len() * self.headings_rad.len()));
        let setup = Setup::new(dive);
        let done = |runs: usize| (self.progress)(RemapProgress::Done(runs));
        let runs = outcomes(&setup, &self.area, &self.grid, places, &self.headings_rad, &done);
        runs.chunks(self.headings_rad.len()).map(|runs| Tally::of(runs, self.required_m())).collect()
    }

    fn cell_km2(&self) -> f64 {
        self.grid.cell_m * self.grid.cell_m / 1e6
    }
}

/// The area map that the analysis runs: cells of `remap.cell_m`, runs no longer than the required distance.
pub fn remap_area_options(dive: &Dive) -> AreaOptions {
    AreaOptions {
        cell_m: dive.remap.cell_m,
        longest_run_m: smaller(dive.area.longest_run_m, dive.scoring.required_fix_m),
        ..dive.area
    }
}

/// Finds the regions that fail the requirement, their causes, and what a re-survey of each would buy.
pub fn remap(setup: &Setup<'_>, progress: &(dyn Fn(RemapProgress) + Sync)) -> RemapReport {
    let dive = setup.dive;
    let area = remap_area_options(dive);
    let (grid, places) = area_grid(setup, &area);
    let run = Run { setup, area, grid, headings_rad: headings_rad(&area), progress };
    let options = dive.remap;
    let tallies = run.tallies(dive, &places);
    let failing: Vec<usize> = (0..places.len()).filter(|&i| !tallies[i].passes(options.pass_share)).collect();
    let failing_places: Vec<(usize, usize)> = failing.iter().map(|&i| places[i]).collect();
    let failing_tallies: Vec<Tally> = failing.iter().map(|&i| tallies[i]).collect();
    let (causes, undecided) = if failing.is_empty() {
        (Vec::new(), false)
    } else {
        cause::causes(&run, &failing_places, &failing_tallies)
    };
    let (groups, specks) = region::join(&failing_places, &causes, options.smallest_region_cells);
    let map =
        resurvey::Map { passing: places.len() - failing.len(), cells: places.len(), failing: failing_places };
    let (regions, undecided_after) = ranked(&run, &map, groups);
    let index = RegionIndex::new(grid, &regions);
    RemapReport {
        provenance: setup.provenance("fixability.remap"),
        parameters: setup.parameters(),
        options,
        headings: area.headings,
        run_m: area.longest_run_m,
        statement: REMAP_STATEMENT,
        grid,
        cells: places.len(),
        failing_cells: map.failing.len(),
        failing_km2: map.failing.len() as f64 * run.cell_km2(),
        specks: specks.len(),
        speck_cells: specks.iter().map(|speck| speck.cells.len()).sum(),
        undecided: undecided || undecided_after || tallies.iter().any(|tally| tally.undecided > 0),
        lines: crossing::lines(setup, &index),
        regions,
        search_area: dive.start.search_area.clone(),
        landmarks: setup.chart_landmarks(),
        speck_grid_cells: specks.into_iter().flat_map(|speck| speck.cells).collect(),
    }
}

/// The regions of the groups, best gain first, and whether some re-run was undecided.
fn ranked(run: &Run<'_>, map: &resurvey::Map, mut groups: Vec<Group>) -> (Vec<RemapRegion>, bool) {
    // Largest first; the order of the cells breaks ties, because the sort keeps it.
    groups.sort_by_key(|group| std::cmp::Reverse(group.cells.len()));
    let mut undecided = false;
    let mut regions: Vec<RemapRegion> = groups
        .into_iter()
        .enumerate()
        .map(|(place, group)| {
            let (region, is_undecided) = examined(run, map, group, place < run.setup.dive.remap.gain_regions);
            undecided |= is_undecided;
            region
        })
        .collect();
    let gain = |region: &RemapRegion| region.resurvey.map_or(-1.0, |resurvey| resurvey.gained_per_surveyed);
    regions.sort_by(|a, b| gain(b).total_cmp(&gain(a)));
    for (place, region) in regions.iter_mut().enumerate() {
        region.number = place + 1;
    }
    (regions, undecided)
}

/// One region with all that is known of it; the re-survey only when `with_gain`.
fn examined(run: &Run<'_>, map: &resurvey::Map, group: Group, with_gain: bool) -> (RemapRegion, bool) {
    let dive = run.setup.dive;
    let outline = region::outline(&group.cells, &run.grid);
    let reach_m = dive.sonar.reach_m();
    let near = survey_ground(dive, &outline, reach_m);
    let causes = shares(&group.causes);
    let main = causes[0].cause;
    let (tried, ground) =
        if with_gain && !matches!(main, RemapCause::Undecided | RemapCause::DetectionNotCertain) {
            let wide = survey_ground(dive, &outline, run.area.longest_run_m + reach_m);
            resurvey::best(run, map, &group.cells, near, wide)
        } else {
            (resurvey::Tried::default(), near)
        };
    let region = RemapRegion {
        number: 0,
        cause: main,
        causes,
        cells: group.cells.len(),
        area_km2: group.cells.len() as f64 * run.cell_km2(),
        survey_margin_m: ground.margin_m,
        survey_km2: ground.area_km2,
        landmarks_inside: ground.inside,
        landmarks_surveyed: ground.landmarks.len(),
        label_at: region::label_at(&group.cells, &run.grid),
        verdict: verdict(main, &tried, ground.margin_m, with_gain, dive.remap.gain_regions),
        resurvey: tried.resurvey,
        outline,
        grid_cells: group.cells,
    };
    (region, tried.is_undecided)
}

/// Cells by cause, most first; ties in the order of the causes.
fn shares(causes: &[RemapCause]) -> Vec<CauseShare> {
    let mut shares: Vec<CauseShare> = RemapCause::ALL
        .into_iter()
        .map(|cause| {
            let cells = causes.iter().filter(|&&c| c == cause).count();
            CauseShare { cause, cells, share: cells as f64 / causes.len() as f64 }
        })
        .filter(|share| share.cells > 0)
        .collect();
    shares.sort_by_key(|share| std::cmp::Reverse(share.cells));
    shares
}

/// What to do about a region, in words.
fn verdict(
    cause: RemapCause,
    tried: &resurvey::Tried,
    margin_m: f64,
    with_gain: bool,
    gain_regions: usize,
) -> String {
    let advice = match cause {
        RemapCause::BoxesTooWide => {
            "its cells need narrow boxes everywhere, or part of them fails for another cause"
        }
        RemapCause::TooFewLandmarks => TOO_FEW_LANDMARKS_NOTE,
        RemapCause::DeadReckoning => "better dead reckoning does",
        RemapCause::Sonar => "smaller sonar errors do",
        RemapCause::LookAlikeGround => {
            "the ground repeats itself within the errors: run elsewhere, or map objects that tell it apart"
        }
        RemapCause::SeveralErrors => "several errors would have to shrink together",
        RemapCause::Undecided => return "raise scoring.cell_budget to decide it".to_owned(),
        RemapCause::DetectionNotCertain => {
            return "set budget.misses: no landmark is certain to be detected".to_owned();
        }
    };
    match tried.resurvey {
        Some(resurvey) if resurvey.cures => {
            format!(
                "half-widths of at most {:.2} m, here and within {margin_m:.0} m, cure this",
                resurvey.half_width_after_m
            )
        }
        _ if !with_gain => {
            format!("cure and gain not computed: not among the {gain_regions} largest regions")
        }
        Some(_) => format!("tighter boxes do not cure this; {advice}"),
        None if tried.has_no_landmarks => format!("no landmark here to survey again; {advice}"),
        None => format!("the boxes are as narrow as a re-survey makes them; {advice}"),
    }
}
