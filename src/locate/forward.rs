//! The forward pass from an unknown start.

use super::cell::{Cell, DIRECTION_COUNT, Reaches, add_reaches, box_reaches};
use super::feasible::{EventSet, Feasible, State};
use super::first::FirstSet;
use super::history::{History, NoTrail, Trail};
use super::second::Second;
use super::steps::{Look, Step};
use super::strips::Strips;
use super::unseen::{Missed, Passage, Silence};
use crate::interval::Box2;
use crate::map::Landmark;
use crate::map::index::LandmarkIndex;

/// The map as the solver uses it: an R-tree, strips, and the reaches of every box.
#[derive(Debug)]
pub struct SolverMap {
    index: LandmarkIndex,
    pub(super) strips: Strips,
    boxes: Vec<Box2>,
    reaches: Vec<Reaches>,
}

impl SolverMap {
    /// Indexes `landmarks`.
    pub fn new(landmarks: &[Landmark]) -> Self {
        let index = LandmarkIndex::new(landmarks);
        let boxes: Vec<Box2> = landmarks.iter().map(Landmark::bounds).collect();
        Self {
            strips: Strips::new(&boxes, &index),
            index,
            reaches: boxes.iter().map(|b| box_reaches(*b)).collect(),
            boxes,
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

    /// The reaches of the box of landmark number `landmark`.
    pub(super) fn reaches_of(&self, landmark: usize) -> &Reaches {
        &self.reaches[landmark]
    }

    /// The positions from which landmark number `landmark` may have been seen when `look` explains its detection.
    pub(super) fn vantage(&self, landmark: usize, look: &Look) -> Reaches {
        let mut vantage = self.reaches[landmark];
        add_reaches(&mut vantage, &look.from_landmark);
        vantage
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

/// The feasible set between two events of a solve.
enum Known<'a> {
    /// The search area, before the first sighting.
    Start(Feasible),
    /// After the first sighting.
    First(FirstSet<'a>),
    /// All cells.
    Cells(Feasible),
}

impl Known<'_> {
    fn len(&self) -> usize {
        match self {
            Self::First(first) => first.len(),
            Self::Start(set) | Self::Cells(set) => set.states.len(),
        }
    }

    fn places(&self, fix_size_m: f64) -> usize {
        match self {
            Self::First(first) => first.places(fix_size_m),
            Self::Start(set) | Self::Cells(set) => set.places(fix_size_m),
        }
    }

    fn slice_hulls(&self, slices: usize) -> Vec<Option<Cell>> {
        match self {
            Self::First(first) => first.slice_hulls(),
            Self::Start(set) | Self::Cells(set) => set.slice_hulls(slices),
        }
    }

    fn shown<'a>(&'a self, hulls: &'a [Option<Cell>]) -> EventSet<'a> {
        match self {
            Self::First(first) => EventSet::of_first(first, hulls),
            Self::Start(set) | Self::Cells(set) => EventSet::of_cells(set, hulls),
        }
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

impl<'a> Solver<'a> {
    /// Runs the forward pass over `steps`, lost in the search area just before the first of them. The travel of the
    /// first step is part of the run. `visit` is called with every event's feasible set.
    pub fn run(&self, steps: &[Step], visit: impl FnMut(EventSummary, &EventSet<'_>)) -> Outcome {
        self.run_where(steps, |_| true, visit)
    }

    /// As [`Solver::run`], but uses the sighting of step number `k` only where `uses(k)`. Leaving sightings out can only
    /// enlarge the sets.
    pub fn run_where(
        &self,
        steps: &[Step],
        uses: impl Fn(usize) -> bool,
        visit: impl FnMut(EventSummary, &EventSet<'_>),
    ) -> Outcome {
        self.solve(steps, uses, visit, &mut NoTrail)
    }

    /// As [`Solver::run`], and keeps the history of every event for [`History::sweep`].
    pub fn run_recorded(
        &self,
        steps: &[Step],
        visit: impl FnMut(EventSummary, &EventSet<'_>),
    ) -> (Outcome, History) {
        let mut history = History::default();
        let outcome = self.solve(steps, |_| true, visit, &mut history);
        (outcome, history)
    }

    fn solve(
        &self,
        steps: &[Step],
        uses: impl Fn(usize) -> bool,
        mut visit: impl FnMut(EventSummary, &EventSet<'_>),
        trail: &mut impl Trail,
    ) -> Outcome {
        let Some(first) = steps.first() else { return Outcome::default() };
        let slices = first.travel.len();
        let start = Feasible {
            states: (0..slices)
                .map(|slice| State {
                    cell: self.search_area,
                    slice: u16::try_from(slice).expect("fewer than 65 536 slices"),
                    strays: 0,
                    missed: Missed::NONE,
                })
                .collect(),
        };
        trail.start(&start);
        let mut known = Known::Start(start);
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
            let Some(next) = self.next(&known, &travel, &passages, looks, trail) else {
                outcome.is_undecided = true;
                break;
            };
            known = next;
            if let Known::Start(set) | Known::Cells(set) = &known {
                trail.event(number, &travel, looks, set);
            }
            travel.fill([0.0; DIRECTION_COUNT]);
            passages.fill(Some(Passage::NONE));
            let hulls = known.slice_hulls(slices);
            let summary = EventSummary {
                step: number,
                along_m: step.along_m,
                cells: known.len(),
                places: known.places(self.fix_size_m),
                spread_m: hulls
                    .iter()
                    .flatten()
                    .copied()
                    .reduce(|a, b| a.hull(&b))
                    .map(|hull| hull.diameter_m()),
            };
            outcome.events.push(summary);
            visit(summary, &known.shown(&hulls));
            if summary.cells == 0 {
                break;
            }
        }
        outcome
    }

    /// What is known after the next sighting; `None` when the cell budget is exhausted.
    fn next<'b, T: Trail>(
        &self,
        known: &Known<'_>,
        travel: &[Reaches],
        passages: &[Option<Passage>],
        looks: &'b [Option<Look>],
        trail: &mut T,
    ) -> Option<Known<'b>>
    where
        'a: 'b,
    {
        match known {
            Known::Start(_) if !T::IS_KEPT && self.stray_budget == 0 && self.silence.is_none() => {
                FirstSet::new(self, travel, looks).map(Known::First)
            }
            Known::Start(set) | Known::Cells(set) => {
                self.advance(set, travel, passages, looks, trail).map(Known::Cells)
            }
            Known::First(first) => match first.advance(self, travel, looks) {
                Second::Set { mut set, has_branched } => {
                    if has_branched && first.len() > travel.len() {
                        set.drop_covered();
                    }
                    Some(Known::Cells(set))
                }
                Second::Undecided => None,
                Second::Crowded => {
                    self.advance(&first.to_feasible(), travel, passages, looks, trail).map(Known::Cells)
                }
            },
        }
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
        let mut meeting = Vec::new();
        for (number, state) in set.states.iter().enumerate() {
            let slice = usize::from(state.slice);
            let moved = state.cell.minkowski_sum(&travel[slice]);
            let Some(missed) = self.missed(state, &moved, passages[slice].as_ref()) else { continue };
            let state = &State { missed, ..*state };
            let before = next.states.len();
            if let Some(look) = &looks[slice] {
                let strips = &self.map.strips;
                strips.meeting(moved.bounding_box().minkowski_sum(look.extent), &mut meeting);
                for landmark in meeting.iter().map(|&place| strips.landmark_at(place)) {
                    if let Some(cell) = moved.intersection(&self.map.vantage(landmark, look)) {
                        next.states.push(State { cell, ..*state });
                        trail.child(number, Some(landmark));
                    }
                }
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
