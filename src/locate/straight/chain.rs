//! Chains of landmarks as explanations of the sightings of one run: cheap tests between their members, and the cell of
//! the plain solver for a whole chain.

use super::index::ends;
use super::terms::{HeadingTerms, StepSets};
use super::{Field, Point};
use crate::frame::LocalPoint;
use crate::interval::{Box2, Interval};
use crate::locate::cell::{Cell, DIRECTION_COUNT, DIRECTIONS, HALF, Reaches, add_reaches};
use crate::locate::certain::CertainSighting;
use crate::locate::feasible::{Feasible, State};
use crate::locate::unseen::Missed;

/// What a test between landmarks allows for rounding, metres. Coordinates stay below 10⁸ m, where one rounding is below
/// 2·10⁻⁸ m, and fewer than a hundred of them meet in a test.
pub(super) const TEST_SLACK_M: f64 = 1e-3;

/// Earlier sightings that a landmark is tested against.
pub(super) const LOOK_BACK: usize = 6;

/// Most cells that a run remembers per step.
const KNOWN_MAX: usize = 64;

/// Limits of two sightings a before b: a landmark pair (i, j) can explain both only if, in every direction,
/// dᵢ·(m_j − m_i) is at most the limit plus the boxes' reaches.
pub(super) type Limits = Reaches;

/// Whether landmarks `a` and `b` keep to `limits`.
#[inline]
pub(super) fn keeps(limits: &Limits, a: &Point, b: &Point) -> bool {
    keeps_by(TEST_SLACK_M, limits, a, b)
}

/// As [`keeps`] with an allowance of `slack_m`; below zero, the pair is well inside its limits.
#[inline]
fn keeps_by(slack_m: f64, limits: &Limits, a: &Point, b: &Point) -> bool {
    let (east, north) = (b.east_m - a.east_m, b.north_m - a.north_m);
    let (half_east, half_north) = (a.half_east_m + b.half_east_m, a.half_north_m + b.half_north_m);
    let mut keeps = true;
    for i in 0..HALF {
        let [e, n] = DIRECTIONS[i];
        let along = e * east + n * north;
        let room = e.abs() * half_east + n.abs() * half_north + slack_m;
        keeps &= (along <= limits[i] + room) & (-along <= limits[i + HALF] + room);
    }
    keeps
}

/// One sighting of a run.
#[derive(Debug)]
pub(super) struct RunStep {
    pub sets: StepSets,
    /// Limits against earlier sightings: entry `back` · windows + w is for the sighting `back` + 1 before, in window w.
    pub limits: Vec<Limits>,
    /// Where the vehicle is at the end of the window.
    pub position: LocalPoint,
    /// The positions, less the landmark's, from which it may be seen: all windows together.
    pub around: Box2,
}

/// One start on one heading, with what has been worked out so far.
#[derive(Debug)]
pub(super) struct Run {
    pub start: LocalPoint,
    pub sightings: Vec<CertainSighting>,
    pub steps: Vec<RunStep>,
    /// Cells of chains that end at the last step looked at, by number of the chain in its list and window.
    known: Vec<(u32, usize, Option<Cell>)>,
    /// The same for the step before.
    known_before: Vec<(u32, usize, Option<Cell>)>,
}

impl Run {
    pub fn new(start: LocalPoint, sightings: Vec<CertainSighting>) -> Self {
        Self { start, sightings, steps: Vec::new(), known: Vec::new(), known_before: Vec::new() }
    }

    /// Works out the sets of the next sighting.
    pub fn advance(&mut self, terms: &HeadingTerms) {
        let number = self.steps.len();
        let sighting = &self.sightings[number];
        let from_m = number.checked_sub(1).map_or(0.0, |before| self.sightings[before].window.hi());
        let sets = terms.step(sighting, from_m);
        let windows = terms.window_count();
        let mut limits = Vec::with_capacity(windows * number.min(LOOK_BACK));
        // Travel from the earlier sighting to this one, by window.
        let mut travel = sets.travel.clone();
        for back in 0..number.min(LOOK_BACK) {
            let earlier = &self.steps[number - 1 - back];
            for (window, look) in sets.looks.iter().enumerate() {
                let mut limit = travel[window];
                for (i, limit) in limit.iter_mut().enumerate() {
                    *limit += earlier.sets.looks[window].from_landmark[i]
                        + look.from_landmark[(i + HALF) % DIRECTION_COUNT];
                }
                limits.push(limit);
            }
            for (total, more) in travel.iter_mut().zip(&earlier.sets.travel) {
                add_reaches(total, more);
            }
        }
        let around = sets.looks.iter().map(|look| -look.extent).fold(Box2::EMPTY, Box2::hull);
        let along_m = sighting.window.hi();
        let (sin, cos) = (libm::sin(terms.heading_rad), libm::cos(terms.heading_rad));
        let position = LocalPoint::new(self.start.east_m + along_m * sin, self.start.north_m + along_m * cos);
        self.steps.push(RunStep { sets, limits, position, around });
        self.known_before = std::mem::take(&mut self.known);
    }

    /// Whether every position that `landmark` allows at the last step lies farther than the fix size from the true one.
    pub fn is_far(&self, field: &Field<'_>, landmark: u32) -> bool {
        let step = &self.steps[self.steps.len() - 1];
        let point = &field.points[landmark as usize];
        let gap = field.solver.fix_size_m + TEST_SLACK_M;
        let east = point.east_m - step.position.east_m;
        let north = point.north_m - step.position.north_m;
        east + step.around.east.lo() - point.half_east_m > gap
            || -(east + step.around.east.hi() + point.half_east_m) > gap
            || north + step.around.north.lo() - point.half_north_m > gap
            || -(north + step.around.north.hi() + point.half_north_m) > gap
    }

    /// Whether all members of a chain that ends at the last step keep to the limits of `window`.
    pub fn keeps(&self, field: &Field<'_>, chain: &[u32], window: usize) -> bool {
        // The latest pairs first: the list was made with wider limits, and these cut most.
        (1..chain.len()).rev().all(|b| {
            let limits = &self.steps[b].limits;
            let windows = self.steps[b].sets.looks.len();
            let second = &field.points[chain[b] as usize];
            (0..b.min(LOOK_BACK)).all(|back| {
                let first = &field.points[chain[b - 1 - back] as usize];
                keeps(&limits[back * windows + window], first, second)
            })
        })
    }

    /// Whether a chain of one or two landmarks certainly has a cell in `window`, by the tests alone.
    ///
    /// Where the first landmark's vantage lies whole inside the moved search area, that vantage is the first cell. Two
    /// cells A and B with the same edge directions meet exactly if 0 ∈ A ⊕ (−B), a polygon with no other edge
    /// directions, that is if the sums of opposite reaches are at least 0 in all of them: the limits of the pair.
    pub fn surely_has_cell(&self, field: &Field<'_>, chain: &[u32], window: usize) -> bool {
        let first = &self.steps[0].sets;
        let moved = field.solver.search_area.minkowski_sum(&first.travel[window]);
        let vantage = field.solver.map.vantage(chain[0] as usize, &first.looks[window]);
        if !moved.contains_cell(&Cell::from_reaches(vantage)) {
            return false;
        }
        match chain {
            [_] => true,
            &[a, b] => {
                let (a, b) = (&field.points[a as usize], &field.points[b as usize]);
                keeps_by(-TEST_SLACK_M, &self.steps[1].limits[window], a, b)
            }
            _ => false,
        }
    }

    /// The box around all positions that `landmark` allows at the last step, over its window.
    pub fn outer_box(&self, field: &Field<'_>, terms: &HeadingTerms, landmark: u32) -> Box2 {
        let last = self.steps.len() - 1;
        let mut apart = Box2 { east: Interval::ZERO, north: Interval::ZERO };
        for window in 0..terms.window_count() {
            let reaches = terms.drift_apart(window, &self.sightings[last]);
            let (low, high) = ends(&reaches);
            apart.east = apart.east.hull(Interval::new(low.east_m, high.east_m));
            apart.north = apart.north.hull(Interval::new(low.north_m, high.north_m));
        }
        field.solver.map.box_of(landmark as usize).minkowski_sum(self.steps[last].around).minkowski_sum(apart)
    }

    /// The plain solver's cell for a chain that ends at the last step; `None` when the solver drops it. `number` is the
    /// chain's number in its list, `parent` that of the chain without its last member in the list before.
    pub fn cell(
        &mut self,
        field: &Field<'_>,
        chain: &[u32],
        window: usize,
        number: u32,
        parent: u32,
    ) -> Option<Cell> {
        let known = |list: &[(u32, usize, Option<Cell>)], number: u32| {
            list.iter().find(|(n, w, _)| *n == number && *w == window).map(|(.., cell)| *cell)
        };
        if let Some(cell) = known(&self.known, number) {
            return cell;
        }
        let last = chain.len() - 1;
        let cell = match known(&self.known_before, parent).filter(|_| last > 0) {
            Some(before) => before.and_then(|cell| self.next(field, cell, last, chain[last], window)),
            None => chain.iter().enumerate().try_fold(field.solver.search_area, |cell, (step, &landmark)| {
                self.next(field, cell, step, landmark, window)
            }),
        };
        if self.known.len() < KNOWN_MAX {
            self.known.push((number, window, cell));
        }
        cell
    }

    /// One step of the plain solver for one landmark.
    fn next(&self, field: &Field<'_>, cell: Cell, step: usize, landmark: u32, window: usize) -> Option<Cell> {
        let sets = &self.steps[step].sets;
        let look = &sets.looks[window];
        let moved = cell.minkowski_sum(&sets.travel[window]);
        let map = field.solver.map;
        // What the solver's query does not find, it drops.
        let query = moved.bounding_box().minkowski_sum(look.extent);
        if map.box_of(landmark as usize).intersection(query).is_empty() {
            return None;
        }
        moved.intersection(&map.vantage(landmark as usize, look))
    }

    /// Upper bound of the spread of `cells` over the window of the last sighting; `None` without cells.
    pub fn spread_m(&self, terms: &HeadingTerms, cells: &[(usize, Cell)]) -> Option<f64> {
        let sighting = &self.sightings[self.steps.len() - 1];
        let apart: Vec<Reaches> =
            (0..terms.window_count()).map(|window| terms.drift_apart(window, sighting)).collect();
        cells
            .iter()
            .map(|(window, cell)| cell.minkowski_sum(&apart[*window]))
            .reduce(|a, b| a.hull(&b))
            .map(|hull| hull.diameter_m())
    }
}

/// Number of places of `cells`.
pub(super) fn places(cells: &[(usize, Cell)], fix_size_m: f64) -> usize {
    let states = cells
        .iter()
        .map(|&(window, cell)| State {
            cell,
            slice: u16::try_from(window).expect("fewer than 65 536 windows"),
            strays: 0,
            missed: Missed::NONE,
        })
        .collect();
    Feasible { states }.places(fix_size_m)
}
