//! The area map: how far must the vehicle run straight from here, on this heading, until its position is unambiguous?
//!
//! *What is computed.* For the centre of every start cell and every heading the guaranteed fix distance of a straight
//! run ([`crate::locate::StraightRuns`]), lost in the whole search area. The search area bounds the start only: a run may
//! leave it.
//!
//! *What it holds for.* Starts at the centres of the cells, on the headings computed. Everything here is guaranteed; no
//! draw of a random number is involved.
//!
//! *What may be expected.* Smaller error bounds never make a distance longer. **More landmarks may**: a new landmark is
//! one more sighting for a vehicle that passes it, but also one more explanation of what a vehicle sees elsewhere. A
//! second rock beside the only one on the map turns a fix into a look-alike.

use std::collections::BTreeMap;

use geo::{Contains, Coord, LineString, Polygon};
use rayon::prelude::*;

use super::Setup;
use super::guarantee::FEW_DETECTIONS;
use super::statistics::{at_rank_of_share, sort_missing_last};
use crate::dive::AreaOptions;
use crate::frame::LocalPoint;
use crate::interval::{larger, smaller};
use crate::locate::{StraightOutcome, StraightRuns};
use crate::report::{AreaCell, AreaGrid, AreaReport, Cause, NoFixCounts, RunOutcome};

/// Most runs (cells times headings) of one map: beyond it the result would not fit into the memory of a laptop.
pub const AREA_STARTS_MAX: usize = 50_000_000;

/// Side of a block of cells that is solved in one go.
const BLOCK_CELLS: usize = 32;

/// The grid of start cells over the search area, and the cells (column, row) whose centre lies in it, row by row.
pub fn area_grid(setup: &Setup<'_>, options: &AreaOptions) -> (AreaGrid, Vec<(usize, usize)>) {
    let grid = grid_of(setup, options);
    let corners = &setup.dive.start.search_area;
    let ring = corners.iter().map(|p| Coord { x: p.east_m, y: p.north_m }).collect();
    let area = Polygon::new(LineString::new(ring), vec![]);
    let columns = grid.columns;
    let cells = (0..grid.rows)
        .into_par_iter()
        .flat_map_iter(|row| (0..columns).map(move |column| (column, row)))
        .filter(|&(column, row)| {
            let centre = grid.centre(column, row);
            area.contains(&Coord { x: centre.east_m, y: centre.north_m })
        })
        .collect();
    (grid, cells)
}

/// The grid over the box around the search area.
fn grid_of(setup: &Setup<'_>, options: &AreaOptions) -> AreaGrid {
    let corners = &setup.dive.start.search_area;
    let side = |of: fn(&LocalPoint) -> f64| {
        let low = corners.iter().map(of).reduce(smaller).unwrap_or(0.0);
        let high = corners.iter().map(of).reduce(larger).unwrap_or(0.0);
        let first = (low / options.cell_m).floor();
        (first * options.cell_m, ((high / options.cell_m).ceil() - first) as usize)
    };
    let ((west_m, columns), (south_m, rows)) = (side(|p| p.east_m), side(|p| p.north_m));
    AreaGrid { cell_m: options.cell_m, west_m, south_m, columns, rows }
}

/// Runs of the map: start cells times headings. A grid that is far too fine is not counted cell by cell: the answer is then
/// that of the box around the search area.
pub fn area_starts(setup: &Setup<'_>, options: &AreaOptions) -> usize {
    let all = grid_of(setup, options);
    let most = all.columns.saturating_mul(all.rows).saturating_mul(options.headings);
    if most > 4 * AREA_STARTS_MAX { most } else { area_grid(setup, options).1.len() * options.headings }
}

/// Computes the area map. `tick` is called with the number of runs finished since the last call; all calls add up to
/// cells times headings.
pub fn area(setup: &Setup<'_>, options: &AreaOptions, tick: &(dyn Fn(usize) + Sync)) -> AreaReport {
    let (grid, places) = area_grid(setup, options);
    let headings_rad = headings_rad(options);
    let outcomes = outcomes(setup, options, &grid, &places, &headings_rad, tick);
    let required_m = setup.dive.scoring.required_fix_m;
    let cells = places
        .iter()
        .zip(outcomes.chunks(headings_rad.len()))
        .map(|(&(column, row), runs)| summary(column, row, runs, required_m))
        .collect();
    AreaReport {
        provenance: setup.provenance("fixability.area"),
        parameters: setup.parameters(),
        options: *options,
        grid,
        headings_deg: (0..options.headings).map(|k| 360.0 * k as f64 / options.headings as f64).collect(),
        cells,
        outcomes,
        search_area: setup.dive.start.search_area.clone(),
        landmarks: setup.chart_landmarks(),
    }
}

/// The headings, radians clockwise from grid north.
pub(super) fn headings_rad(options: &AreaOptions) -> Vec<f64> {
    let count = options.headings;
    (0..count).map(|k| std::f64::consts::TAU * k as f64 / count as f64).collect()
}

/// What is guaranteed of the runs from the cells `places` of `grid`: cell by cell, in the order of the headings. `tick`
/// as in [`area`].
pub(super) fn outcomes(
    setup: &Setup<'_>,
    options: &AreaOptions,
    grid: &AreaGrid,
    places: &[(usize, usize)],
    headings_rad: &[f64],
    tick: &(dyn Fn(usize) + Sync),
) -> Vec<RunOutcome> {
    let count = headings_rad.len();
    if !setup.dive.is_detection_certain() && setup.dive.budget.misses == 0 {
        tick(places.len() * count);
        return vec![RunOutcome::NoFix(Cause::DetectionNotCertain); places.len() * count];
    }
    let runs = StraightRuns::new(
        setup.scene(),
        setup.solver(),
        setup.bounds(),
        setup.dive.budget.misses,
        options.longest_run_m,
    );
    let blocks = blocks(places);
    let work: Vec<(usize, usize)> =
        (0..blocks.len()).flat_map(|block| (0..count).map(move |heading| (block, heading))).collect();
    let solved: Vec<Vec<RunOutcome>> = work
        .par_iter()
        .map(|&(block, heading)| {
            let starts: Vec<LocalPoint> =
                blocks[block].iter().map(|&place| grid.centre(places[place].0, places[place].1)).collect();
            let outcomes = runs.solve(headings_rad[heading], &starts).into_iter().map(outcome).collect();
            tick(starts.len());
            outcomes
        })
        .collect();
    let mut all = vec![RunOutcome::NoFix(Cause::Undecided); places.len() * count];
    for ((block, heading), outcomes) in work.into_iter().zip(solved) {
        for (&place, outcome) in blocks[block].iter().zip(outcomes) {
            all[place * count + heading] = outcome;
        }
    }
    all
}

/// Numbers of the cells in square blocks, each solved in one go.
fn blocks(places: &[(usize, usize)]) -> Vec<Vec<usize>> {
    let mut blocks: BTreeMap<(usize, usize), Vec<usize>> = BTreeMap::new();
    for (number, (column, row)) in places.iter().enumerate() {
        blocks.entry((row / BLOCK_CELLS, column / BLOCK_CELLS)).or_default().push(number);
    }
    blocks.into_values().collect()
}

/// The outcome of one run, with the cause that a segment of a line would get.
pub(super) fn outcome(found: StraightOutcome) -> RunOutcome {
    match found {
        StraightOutcome::Fix(fix_m) => RunOutcome::Fix(fix_m),
        StraightOutcome::Undecided => RunOutcome::NoFix(Cause::Undecided),
        StraightOutcome::NoFix { certain_sightings: 0, .. } => RunOutcome::NoFix(Cause::TooFewLandmarks),
        StraightOutcome::NoFix { has_places: false, .. } => RunOutcome::NoFix(Cause::TooWide),
        StraightOutcome::NoFix { certain_sightings, .. } if certain_sightings < FEW_DETECTIONS => {
            RunOutcome::NoFix(Cause::TooFewLandmarks)
        }
        StraightOutcome::NoFix { .. } => RunOutcome::NoFix(Cause::LookAlikes),
    }
}

/// Sums the headings of a cell up.
fn summary(column: usize, row: usize, runs: &[RunOutcome], required_m: f64) -> AreaCell {
    let mut sorted: Vec<Option<f64>> = runs.iter().map(|run| run.fix_m()).collect();
    sort_missing_last(&mut sorted);
    let best_m = sorted.first().copied().flatten();
    let mut no_fix = NoFixCounts::default();
    for cause in runs.iter().filter_map(|run| run.cause()) {
        no_fix.add(cause);
    }
    let within = sorted.iter().flatten().filter(|&&fix_m| fix_m <= required_m).count();
    AreaCell {
        column,
        row,
        worst_m: sorted.last().copied().flatten(),
        best_m,
        median_m: at_rank_of_share(&sorted, 0.5),
        best_heading: best_m.and_then(|best_m| runs.iter().position(|run| run.fix_m() == Some(best_m))),
        within_required_share: within as f64 / runs.len() as f64,
        no_fix,
    }
}
