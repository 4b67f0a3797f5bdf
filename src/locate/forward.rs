//! The forward pass from an unknown start.

use super::cell::{Cell, DIRECTION_COUNT, Reaches, add_reaches, box_reaches};
use super::feasible::{Feasible, State};
use super::steps::{Look, Step};
use crate::interval::Box2;
use crate::map::Landmark;
use crate::map::index::LandmarkIndex;

/// The map as the solver uses it: an R-tree and the reaches of every box.
#[derive(Debug)]
pub struct SolverMap {
    index: LandmarkIndex,
    reaches: Vec<Reaches>,
}

impl SolverMap {
    /// Indexes `landmarks`.
    pub fn new(landmarks: &[Landmark]) -> Self {
        Self {
            index: LandmarkIndex::new(landmarks),
            reaches: landmarks.iter().map(|landmark| box_reaches(landmark.bounds())).collect(),
        }
    }

    /// The R-tree, for others who look for landmarks.
    pub fn index(&self) -> &LandmarkIndex {
        &self.index
    }

    /// Calls `found` with the positions from which a landmark whose detection is explained by `look` may have been
    /// seen, for every landmark that `place` allows.
    fn for_each_vantage(&self, place: Box2, look: &Look, mut found: impl FnMut(Reaches)) {
        for j in self.index.meeting(place.minkowski_sum(look.extent)) {
            let mut vantage = self.reaches[j];
            add_reaches(&mut vantage, &look.from_landmark);
            found(vantage);
        }
    }
}

/// Numbers of one event of a solve.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct EventSummary {
    /// Position of the event among the steps.
    pub step: usize,
    /// Distance along the planned track, metres.
    pub along_m: f64,
    /// Cells in the feasible set.
    pub cells: usize,
    /// Number of places.
    pub places: usize,
    /// Upper bound of the widest extent, metres; none when the set is empty.
    pub spread_m: Option<f64>,
}

/// The result of a solve.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Outcome {
    /// One entry per detection, in order, up to the end, to an empty set, or to the exhaustion of the budget.
    pub events: Vec<EventSummary>,
    /// Whether the cell budget ran out: the set at the next event is unknown.
    pub is_undecided: bool,
}

impl Outcome {
    /// Distance along the track of the first event at which the set is no wider than `fix_size_m`.
    pub fn first_fix_along_m(&self, fix_size_m: f64) -> Option<f64> {
        self.events
            .iter()
            .find(|event| event.spread_m.is_some_and(|spread| spread <= fix_size_m))
            .map(|event| event.along_m)
    }

    /// The first event at which no position explains the log: the bounds are violated.
    pub fn contradiction(&self) -> Option<EventSummary> {
        self.events.iter().copied().find(|event| event.spread_m.is_none())
    }
}

/// The solver for one map and one search area.
#[derive(Clone, Copy, Debug)]
pub struct Solver<'a> {
    /// The map.
    pub map: &'a SolverMap,
    /// Where the vehicle may be at the start.
    pub search_area: Cell,
    /// Most cells kept at once.
    pub cell_budget: usize,
    /// Detections that may be left unexplained.
    pub stray_budget: u8,
    /// Distance within which cells count as one place, metres.
    pub fix_size_m: f64,
}

impl Solver<'_> {
    /// Runs the forward pass over `steps`, lost in the search area just before the first of them. The travel of the
    /// first step is part of the run. `visit` is called with every event's feasible set.
    pub fn run(&self, steps: &[Step], visit: impl FnMut(EventSummary, &Feasible)) -> Outcome {
        self.run_where(steps, |_| true, visit)
    }

    /// As [`Solver::run`], but uses the sighting of step number `k` only where `uses(k)`. Leaving sightings out can only
    /// enlarge the sets.
    pub fn run_where(
        &self,
        steps: &[Step],
        uses: impl Fn(usize) -> bool,
        mut visit: impl FnMut(EventSummary, &Feasible),
    ) -> Outcome {
        let Some(first) = steps.first() else { return Outcome::default() };
        let slices = first.travel.len();
        let mut set = Feasible {
            states: (0..slices)
                .map(|slice| State {
                    cell: self.search_area,
                    slice: u16::try_from(slice).expect("fewer than 65 536 slices"),
                    strays: 0,
                })
                .collect(),
        };
        let mut outcome = Outcome::default();
        let mut travel = vec![[0.0; DIRECTION_COUNT]; slices];
        for (number, step) in steps.iter().enumerate() {
            for (total, more) in travel.iter_mut().zip(&step.travel) {
                add_reaches(total, more);
            }
            let Some(looks) = step.sighting.as_ref().filter(|_| uses(number)) else { continue };
            let Some(next) = self.advance(&set, &travel, looks) else {
                outcome.is_undecided = true;
                break;
            };
            set = next;
            travel.fill([0.0; DIRECTION_COUNT]);
            let summary = EventSummary {
                step: number,
                along_m: step.along_m,
                cells: set.states.len(),
                places: set.places(self.fix_size_m),
                spread_m: set.spread_m(),
            };
            outcome.events.push(summary);
            visit(summary, &set);
            if set.states.is_empty() {
                break;
            }
        }
        outcome
    }

    /// Moves the set by `travel` and keeps what the sighting explains; `None` when the cell budget is exhausted.
    fn advance(&self, set: &Feasible, travel: &[Reaches], looks: &[Option<Look>]) -> Option<Feasible> {
        let mut next = Feasible::default();
        let mut has_branched = false;
        for state in &set.states {
            let slice = usize::from(state.slice);
            let moved = state.cell.minkowski_sum(&travel[slice]);
            let before = next.states.len();
            if let Some(look) = &looks[slice] {
                self.map.for_each_vantage(moved.bounding_box(), look, |vantage| {
                    if let Some(cell) = moved.intersection(&vantage) {
                        next.states.push(State { cell, ..*state });
                    }
                });
            }
            if state.strays < self.stray_budget {
                next.states.push(State { cell: moved, slice: state.slice, strays: state.strays + 1 });
            }
            has_branched |= next.states.len() > before + 1;
            if next.states.len() > self.cell_budget {
                return None;
            }
        }
        // From a single start every cell stems from another landmark; covered cells can only arise after a branching.
        if has_branched && set.states.len() > travel.len() {
            next.drop_covered();
        }
        Some(next)
    }
}
