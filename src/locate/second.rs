//! The second detection of a run from an unknown start, straight from the first set ([`FirstSet`]).
//!
//! It is asked for each landmark j by the plain way's own query: which boxes meet the bounding box of the moved cell,
//! grown by the look. For whole vantages the queries of all landmarks are one join. What it finds is cut down by the
//! sums of the reaches: the moved cell has in direction d_i a reach of at most box_j(i) + look(i) + travel(i), the
//! vantage of k in the opposite direction box_k(i′) + look′(i′); a sum below zero proves the intersection empty, in
//! the solver's own numbers too, because of the slack (see [`super::straight`], 3). Whatever is left is decided by the
//! plain way's own operations, in its own order: by slice, then by the first landmark, then by the second, both in the
//! order of the R-tree.

use super::cell::{Cell, DIRECTION_COUNT, HALF, Reaches};
use super::feasible::Feasible;
use super::first::{FirstSet, SLACK_M, state};
use super::forward::Solver;
use super::steps::Look;
use crate::interval::{Box2, Interval};

/// Candidates per cell budget beyond which the plain way is taken: it stops as soon as the budget is exceeded.
const CANDIDATES_PER_BUDGET: usize = 2;

/// The set after the second detection.
#[derive(Debug)]
pub(super) enum Second {
    /// The set, and whether a cell had more than one successor.
    Set {
        /// The cells, none dropped yet.
        set: Feasible,
        /// Whether a cell had more than one successor.
        has_branched: bool,
    },
    /// More cells than the budget.
    Undecided,
    /// Too many candidates to be listed: nothing is known.
    Crowded,
}

/// What the cell of a candidate's first landmark is.
#[derive(Clone, Copy, Debug)]
enum Origin {
    /// The whole vantage of the landmark at a place in the strips.
    Whole(u32),
    /// A cut cell.
    Cut(u32),
}

/// Two landmarks that may explain the first two detections, in one slice.
#[derive(Clone, Copy, Debug)]
struct Candidate {
    slice: u16,
    /// Their ranks in the order of the R-tree.
    order: [u32; 2],
    first: Origin,
    /// Place of the second in the strips.
    second: u32,
}

impl FirstSet<'_> {
    /// Moves the set by `travel` and keeps what `looks` explain, before covered cells are dropped; with it whether
    /// some cell had more than one successor.
    pub fn advance(&self, solver: &Solver<'_>, travel: &[Reaches], looks: &[Option<Look>]) -> Second {
        let strips = &self.map.strips;
        let Some(mut candidates) = self.candidates(solver, travel, looks) else { return Second::Crowded };
        candidates.sort_unstable_by_key(|candidate| (candidate.slice, candidate.order));
        let mut set = Feasible::default();
        let mut has_branched = false;
        for chunk in candidates.chunk_by(|a, b| (a.slice, a.order[0]) == (b.slice, b.order[0])) {
            let Candidate { slice, first, .. } = chunk[0];
            let slice_number = usize::from(slice);
            let Some(look) = &looks[slice_number] else { continue };
            let cell = match (first, &self.looks[slice_number]) {
                (Origin::Whole(place), Some(look)) => {
                    Cell::from_reaches(self.map.vantage(strips.landmark_at(place as usize), look))
                }
                (Origin::Cut(number), _) => self.cut[number as usize].cell,
                (Origin::Whole(_), None) => continue,
            };
            let moved = cell.minkowski_sum(&travel[slice_number]);
            let query = moved.bounding_box().minkowski_sum(look.extent);
            let before = set.states.len();
            for second in chunk.iter().map(|candidate| candidate.second as usize) {
                if strips.box_at(second).intersection(query).is_empty() {
                    continue;
                }
                let vantage = self.map.vantage(strips.landmark_at(second), look);
                set.states.extend(moved.intersection(&vantage).map(|cell| state(cell, slice)));
            }
            has_branched |= set.states.len() > before + 1;
            if set.states.len() > solver.cell_budget {
                return Second::Undecided;
            }
        }
        Second::Set { set, has_branched }
    }

    /// All pairs of landmarks that may explain the first two detections, and perhaps more; none when they are too many.
    fn candidates(
        &self,
        solver: &Solver<'_>,
        travel: &[Reaches],
        looks: &[Option<Look>],
    ) -> Option<Vec<Candidate>> {
        let strips = &self.map.strips;
        let most = CANDIDATES_PER_BUDGET * solver.cell_budget;
        let mut candidates = Vec::new();
        let short = |number: usize| u32::try_from(number).expect("fewer than 2³² landmarks");
        // By slice: how far a box of the second landmark may lie from one of the first, in every direction.
        let mut limits: Vec<(u16, Reaches)> = Vec::new();
        let mut window = Box2::EMPTY;
        for (slice, (travel, looks)) in (0..).zip(travel.iter().zip(self.looks.iter().zip(looks))) {
            let (Some(first), Some(second)) = looks else { continue };
            let moved = Cell::from_reaches(first.from_landmark).minkowski_sum(travel);
            window = window.hull(moved.bounding_box().minkowski_sum(second.extent));
            let against = |i: usize| second.from_landmark[(i + HALF) % DIRECTION_COUNT];
            let limit = std::array::from_fn(|i| moved.reaches()[i] + against(i) + SLACK_M);
            limits.push((slice, limit));
        }
        if limits.is_empty() {
            return Some(candidates);
        }
        let slack = Interval::around(0.0, SLACK_M);
        let window = window.minkowski_sum(Box2 { east: slack, north: slack });
        strips.join(&self.whole, window, |first, second| {
            let from = self.map.reaches_of(strips.landmark_at(first));
            let to = self.map.reaches_of(strips.landmark_at(second));
            for (slice, limit) in &limits {
                let keeps = |i: usize| from[i] + limit[i] + to[(i + HALF) % DIRECTION_COUNT] >= 0.0;
                if (0..DIRECTION_COUNT).all(keeps) {
                    candidates.push(Candidate {
                        slice: *slice,
                        order: [strips.order(first), strips.order(second)],
                        first: Origin::Whole(short(first)),
                        second: short(second),
                    });
                }
            }
            candidates.len() <= most
        });
        for (number, cut) in (0..).zip(&self.cut) {
            let Some(look) = &looks[usize::from(cut.slice)] else { continue };
            if candidates.len() > most {
                return None;
            }
            let moved = cut.cell.minkowski_sum(&travel[usize::from(cut.slice)]);
            strips.for_each_meeting(moved.bounding_box().minkowski_sum(look.extent), |second| {
                candidates.push(Candidate {
                    slice: cut.slice,
                    order: [strips.order(cut.place), strips.order(second)],
                    first: Origin::Cut(number),
                    second: short(second),
                });
            });
        }
        (candidates.len() <= most).then_some(candidates)
    }
}
