//! The re-survey that would cure a region, and what it buys.
//!
//! *Inputs changed.* Half-widths of the landmarks charted inside the region or within the horizontal reach of the sonar
//! of it shrink to a share of their present value, but not below `remap.resurvey_half_width_m`. The boxes keep their
//! charted centres: where the landmarks really lie is not known, and a re-survey may also move them.
//!
//! *Cure.* The first step of [`LADDER`] with which at least `remap.cured_share` of the cells of the region pass. When not
//! even the last step does, tighter boxes do not cure the region, and the gain is that of the last step.
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
    /// Numbers of the landmarks charted inside the region or within the reach of the sonar of it, ascending.
    pub landmarks: Vec<usize>,
    /// How many of them are charted inside.
    pub inside: usize,
    /// Area of the region and the ground within reach of it, km².
    pub area_km2: f64,
}

/// The ground that a survey of the region `outline` covers.
pub fn survey_ground(dive: &Dive, outline: &RegionOutline) -> SurveyGround {
    let polygon = region::polygon(outline);
    let reach_m = dive.sonar.reach_m();
    let point = |number: usize| {
        let p = dive.landmarks[number].position;
        Point::new(p.east_m, p.north_m)
    };
    let landmarks: Vec<usize> = (0..dive.landmarks.len())
        .filter(|&number| Euclidean.distance(&point(number), &polygon) <= reach_m)
        .collect();
    let inside = landmarks.iter().filter(|&&number| polygon.contains(&point(number))).count();
    SurveyGround { landmarks, inside, area_km2: region::area_with_margin_m2(outline, reach_m) / 1e6 }
}

/// Looks for the cure of a region and computes the gain.
pub(super) fn best(run: &Run<'_>, map: &Map, cells: &[(usize, usize)], ground: &SurveyGround) -> Tried {
    let mut tried = Tried { has_no_landmarks: ground.landmarks.is_empty(), ..Tried::default() };
    let dive = run.setup.dive;
    let floor_m = dive.remap.resurvey_half_width_m;
    let after = |factor: f64| {
        narrowed(dive, factor, floor_m, |number| ground.landmarks.binary_search(&number).is_ok())
    };
    let widest = |dive: &Dive| widest_m(dive, ground);
    let last = after(0.0);
    if last.landmarks == dive.landmarks {
        return tried;
    }
    let mut passing = |changed: &Dive, places: &[(usize, usize)]| {
        let tallies = run.tallies(changed, places);
        tried.is_undecided |= tallies.iter().any(|tally| tally.undecided > 0);
        tallies.iter().filter(|tally| tally.passes(dive.remap.pass_share)).count()
    };
    let is_cured = |passing: usize| passing as f64 >= dive.remap.cured_share * cells.len() as f64;
    let mut choice = (0.0, passing(&last, cells));
    let cures = is_cured(choice.1);
    if cures {
        for factor in LADDER {
            let changed = after(factor);
            if changed.landmarks == last.landmarks {
                // Every box has reached the floor: this and all further steps are the last one.
                choice.0 = factor;
                break;
            }
            let count = passing(&changed, cells);
            if is_cured(count) {
                choice = (factor, count);
                break;
            }
        }
    }
    let (factor, region_cells_passing) = choice;
    let changed = after(factor);
    let gained = passing(&changed, &map.failing);
    let gained_km2 = gained as f64 * run.cell_km2();
    tried.resurvey = Some(Resurvey {
        factor,
        floor_m,
        half_width_before_m: widest(dive),
        half_width_after_m: widest(&changed),
        cures,
        region_cells_passing,
        map_cells_passing_before: map.passing,
        map_cells_passing_after: map.passing + gained,
        gained_km2,
        gained_share: gained as f64 / map.cells as f64,
        gained_per_surveyed: gained_km2 / ground.area_km2,
    });
    tried
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
