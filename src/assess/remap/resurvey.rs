//! The re-survey that would cure a region, and what it buys.
//!
//! *Inputs changed.* Half-widths of the landmarks charted on the ground of the survey shrink to a share of their present
//! value, but not below `remap.resurvey_half_width_m`. The boxes keep their charted centres: where the landmarks really
//! lie is not known, and a re-survey may also move them.
//!
//! *Ground of the survey.* The region and what lies within the horizontal reach of the sonar of it. Runs that start in
//! the region soon leave it; where that survey does not cure the region, the ground that the runs can see is tried: within
//! the length of the runs and the reach.
//!
//! *Cure.* The first step of [`LADDER`] with which at least `remap.cured_share` of the cells of the region pass. When not
//! even the last step does on either ground, tighter boxes do not cure the region, and the gain is that of the last step
//! on the narrower ground.
//!
//! *Gain.* All failing cells of the map, not only those of the region, are run again with the changed inputs: narrower
//! boxes also rule out the region as an explanation of what is seen elsewhere. Cells that pass stay so, because smaller
//! bounds never lengthen a guaranteed distance.

use geo::{Contains, Distance, Euclidean, Point};

use super::cause::narrowed;
use super::{Run, region};
use crate::dive::Dive;
use crate::interval::larger;
use crate::report::{RegionOutline, Resurvey};

/// Shares of the present half-widths that are tried, in this order; 0 means the narrowest that a re-survey can make.
pub(super) const LADDER: [f64; 6] = [2.0 / 3.0, 1.0 / 2.0, 1.0 / 3.0, 1.0 / 5.0, 1.0 / 10.0, 0.0];

/// What the analysis knows of the whole map.
pub(super) struct Map {
    /// Cells.
    pub cells: usize,
    /// Cells that pass.
    pub passing: usize,
    /// Cells that fail.
    pub failing: Vec<(usize, usize)>,
}

/// What came of the search for a cure.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Tried {
    /// The re-survey that cures, or the best one tried; none when no box can become narrower.
    pub resurvey: Option<Resurvey>,
    /// Whether there is no landmark to survey again.
    pub has_no_landmarks: bool,
    /// Whether the cell budget ran out on some run.
    pub is_undecided: bool,
}

/// What a survey of a region covers.
#[derive(Clone, Debug, PartialEq)]
pub struct SurveyGround {
    /// How far it goes beyond the region, metres.
    pub margin_m: f64,
    /// Numbers of the landmarks charted on it, ascending.
    pub landmarks: Vec<usize>,
    /// How many of them are charted inside the region.
    pub inside: usize,
    /// Its area, km².
    pub area_km2: f64,
}

/// The ground of a survey of the region `outline` and of all that lies within `margin_m` of it.
pub fn survey_ground(dive: &Dive, outline: &RegionOutline, margin_m: f64) -> SurveyGround {
    let polygon = region::polygon(outline);
    let point = |number: usize| {
        let p = dive.landmarks[number].position;
        Point::new(p.east_m, p.north_m)
    };
    let landmarks: Vec<usize> = (0..dive.landmarks.len())
        .filter(|&number| Euclidean.distance(&point(number), &polygon) <= margin_m)
        .collect();
    let inside = landmarks.iter().filter(|&&number| polygon.contains(&point(number))).count();
    SurveyGround {
        margin_m,
        landmarks,
        inside,
        area_km2: region::area_with_margin_m2(outline, margin_m) / 1e6,
    }
}

/// Looks for the cure of a region, first on the ground `near`, then on `wide`, and computes the gain. Returns what came
/// of it and the ground that it is about.
pub(super) fn best(
    run: &Run<'_>,
    map: &Map,
    cells: &[(usize, usize)],
    near: SurveyGround,
    wide: SurveyGround,
) -> (Tried, SurveyGround) {
    let first = step(run, cells, &near);
    let (mut found, ground) = if first.cures {
        (first, near)
    } else {
        let second = step(run, cells, &wide);
        if second.cures {
            (Step { is_undecided: first.is_undecided || second.is_undecided, ..second }, wide)
        } else {
            (Step { is_undecided: first.is_undecided || second.is_undecided, ..first }, near)
        }
    };
    let mut tried = Tried { has_no_landmarks: ground.landmarks.is_empty(), ..Tried::default() };
    let dive = run.setup.dive;
    let changed = surveyed(dive, found.factor, &ground);
    if changed.landmarks != dive.landmarks {
        let gained = found.passing(run, &changed, &map.failing);
        let gained_km2 = gained as f64 * run.cell_km2();
        tried.resurvey = Some(Resurvey {
            factor: found.factor,
            floor_m: dive.remap.resurvey_half_width_m,
            half_width_before_m: widest_m(dive, &ground),
            half_width_after_m: widest_m(&changed, &ground),
            cures: found.cures,
            region_cells_passing: found.region_cells_passing,
            map_cells_passing_before: map.passing,
            map_cells_passing_after: map.passing + gained,
            gained_km2,
            gained_share: gained as f64 / map.cells as f64,
            gained_per_surveyed: gained_km2 / ground.area_km2,
        });
    }
    tried.is_undecided = found.is_undecided;
    (tried, ground)
}

/// The dive after a re-survey of `ground` to the share `factor` of the half-widths.
fn surveyed(dive: &Dive, factor: f64, ground: &SurveyGround) -> Dive {
    narrowed(dive, factor, dive.remap.resurvey_half_width_m, |number| {
        ground.landmarks.binary_search(&number).is_ok()
    })
}

/// A step of the ladder on one ground: the first that cures, or the last.
#[derive(Clone, Copy, Debug, Default)]
struct Step {
    factor: f64,
    cures: bool,
    region_cells_passing: usize,
    is_undecided: bool,
}

impl Step {
    /// Cells of `places` that pass with the inputs of `changed`.
    fn passing(&mut self, run: &Run<'_>, changed: &Dive, places: &[(usize, usize)]) -> usize {
        let tallies = run.tallies(changed, places);
        self.is_undecided |= tallies.iter().any(|tally| tally.undecided > 0);
        tallies.iter().filter(|tally| tally.passes(changed.remap.pass_share)).count()
    }
}

fn step(run: &Run<'_>, cells: &[(usize, usize)], ground: &SurveyGround) -> Step {
    let dive = run.setup.dive;
    let is_cured = |passing: usize| passing as f64 >= dive.remap.cured_share * cells.len() as f64;
    let mut step = Step::default();
    let last = surveyed(dive, 0.0, ground);
    if last.landmarks == dive.landmarks {
        return step;
    }
    step.region_cells_passing = step.passing(run, &last, cells);
    step.cures = is_cured(step.region_cells_passing);
    if !step.cures {
        return step;
    }
    for factor in LADDER {
        let changed = surveyed(dive, factor, ground);
        if changed.landmarks == last.landmarks {
            // Every box has reached the floor: this and all further steps are the last one.
            step.factor = factor;
            break;
        }
        let count = step.passing(run, &changed, cells);
        if is_cured(count) {
            (step.factor, step.region_cells_passing) = (factor, count);
            break;
        }
    }
    step
}

/// Largest half-width of the landmarks concerned, metres.
fn widest_m(dive: &Dive, ground: &SurveyGround) -> f64 {
    ground
        .landmarks
        .iter()
        .map(|&number| &dive.landmarks[number])
        .flat_map(|landmark| [landmark.half_width_east_m, landmark.half_width_north_m])
        .fold(0.0, larger)
}
