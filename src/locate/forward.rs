//! The forward pass from an unknown start.

use super::cell::{Cell, DIRECTION_COUNT, Reaches, add_reaches, box_reaches};
use super::feasible::{Feasible, State};
use super::history::{History, NoTrail, Trail};
use super::steps::{Look, Step};
use super::unseen::{Missed, Passage, Silence};
use crate::interval::Box2;
use crate::map::Landmark;
use crate::map::index::LandmarkIndex;

/// The map as the solver uses it: an R-tree and the reaches of every box.
#[derive(Debug)]
pub struct SolverMap {
    index: LandmarkIndex,
    boxes: Vec<Box2>,
    reaches: Vec<Reaches>,
}

impl SolverMap {
    /// Indexes `landmarks`.
    pub fn new(landmarks: &[Landmark]) -> Self {
        Self {
            index: LandmarkIndex::new(landmarks),
            boxes: landmarks.iter().map(Landmark::bounds).collect(),
            reaches: landmarks.iter().map(|landmark| box_reaches(landmark.bounds())).collect(),
        }
    }

    /// The R-tree, for others who look for landmarks.
    pub fn index(&self) -> &LandmarkIndex {
        &self.index
    }

    /// The box of landmark number `landmark`.
    pub(super) fn box_of(&self, landmark: usize) -> Box2 {
        self.boxes[landmark]
    }

    /// The positions from which landmark number `landmark` may have been seen when `look` explains its detection.
    pub(super) fn vantage(&self, landmark: usize, look: &Look) -> Reaches {
        let mut vantage = self.reaches[landmark];
        add_reaches(&mut vantage, &look.from_landmark);
        vantage
    }

    /// Calls `found` with the number and the [`SolverMap::vantage`] of every landmark that `place` allows.
    fn for_each_vantage(&self, place: Box2, look: &Look, mut found: impl FnMut(usize, Reaches)) {
        for j in self.index.meeting(place.minkowski_sum(look.extent)) {
            found(j, self.vantage(j, look));
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
    /// What it means that nothing was seen; none when silence is no evidence.
    pub silence: Option<&'a Silence>,
    /// Landmarks that may be certainly passed without being detected (used with `silence` only).
    pub miss_budget: u8,
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
        visit: impl FnMut(EventSummary, &Feasible),
    ) -> Outcome {
        self.solve(steps, uses, visit, &mut NoTrail)
    }

    /// As [`Solver::run`], and keeps the history of every event for [`History::sweep`].
    pub fn run_recorded(
        &self,
        steps: &[Step],
        visit: impl FnMut(EventSummary, &Feasible),
    ) -> (Outcome, History) {
        let mut history = History::default();
        let outcome = self.solve(steps, |_| true, visit, &mut history);
        (outcome, history)
    }

    fn solve(
        &self,
        steps: &[Step],
        uses: impl Fn(usize) -> bool,
        mut visit: impl FnMut(EventSummary, &Feasible),
        trail: &mut impl Trail,
    ) -> Outcome {
        let Some(first) = steps.first() else { return Outcome::default() };
        let slices = first.travel.len();
        let mut set = Feasible {
            states: (0..slices)
                .map(|slice| State {
                    cell: self.search_area,
                    slice: u16::try_from(slice).expect("fewer than 65 536 slices"),
                    strays: 0,
                    missed: Missed::NONE,
                })
                .collect(),
        };
        trail.start(&set);
        let mut outcome = Outcome::default();
        let mut travel = vec![[0.0; DIRECTION_COUNT]; slices];
        let mut passages = vec![Some(Passage::NONE); slices];
        for (number, step) in steps.iter().enumerate() {
            for (total, more) in travel.iter_mut().zip(&step.travel) {
                add_reaches(total, more);
            }
            for (so_far, more) in passages.iter_mut().zip(&step.passage) {
                *so_far = so_far.take().zip(more.as_ref()).map(|(passage, more)| passage.then(more));
            }
            let Some(looks) = step.sighting.as_ref().filter(|_| uses(number)) else { continue };
            let Some(next) = self.advance(&set, &travel, &passages, looks, trail) else {
                outcome.is_undecided = true;
                break;
            };
            set = next;
            trail.event(number, &travel, looks, &set);
            travel.fill([0.0; DIRECTION_COUNT]);
            passages.fill(Some(Passage::NONE));
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
    fn advance(
        &self,
        set: &Feasible,
        travel: &[Reaches],
        passages: &[Option<Passage>],
        looks: &[Option<Look>],
        trail: &mut impl Trail,
    ) -> Option<Feasible> {
        let mut next = Feasible::default();
        let mut has_branched = false;
        for (number, state) in set.states.iter().enumerate() {
            let slice = usize::from(state.slice);
            let moved = state.cell.minkowski_sum(&travel[slice]);
            let Some(missed) = self.missed(state, &moved, passages[slice].as_ref()) else { continue };
            let state = &State { missed, ..*state };
            let before = next.states.len();
            if let Some(look) = &looks[slice] {
                self.map.for_each_vantage(moved.bounding_box(), look, |landmark, vantage| {
                    if let Some(cell) = moved.intersection(&vantage) {
                        next.states.push(State { cell, ..*state });
                        trail.child(number, Some(landmark));
                    }
                });
            }
            if state.strays < self.stray_budget {
                next.states.push(State { cell: moved, strays: state.strays + 1, ..*state });
                trail.child(number, None);
            }
            has_branched |= next.states.len() > before + 1;
            if next.states.len() > self.cell_budget {
                return None;
            }
        }
        // From a single start every cell stems from another landmark; covered cells can only arise after a branching.
        if has_branched && set.states.len() > travel.len() {
            trail.replaced(&next.drop_covered());
        }
        Some(next)
    }

    /// The landmarks missed by a state after it has moved; `None` when they are more than the budget.
    fn missed(&self, state: &State, moved: &Cell, passage: Option<&Passage>) -> Option<Missed> {
        let (Some(silence), Some(passage)) = (self.silence, passage) else { return Some(state.missed) };
        let map = self.map;
        let ends = [&state.cell, moved];
        silence.pass(&map.boxes, &map.index, ends, passage, state.missed, self.miss_budget)
    }
}
