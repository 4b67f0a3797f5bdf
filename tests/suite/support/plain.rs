//! The solver written out plainly, from public items: every cell is kept, moved, and cut by every landmark that a query
//! for it finds. The tests hold the program's solver to it, the benchmarks compare its time.

use fixability::interval::Box2;
use fixability::locate::cell::{DIRECTION_COUNT, Reaches, add_reaches, box_reaches};
use fixability::locate::{EventSummary, Feasible, Look, Missed, Solver, State, Step};
use fixability::map::Landmark;
use fixability::map::index::LandmarkIndex;

/// How the landmarks that may explain a detection are found.
#[derive(Clone, Copy)]
pub enum Finding<'a> {
    /// All boxes are looked at.
    Scan,
    /// One query of the R-tree.
    Tree(&'a LandmarkIndex),
}

/// A map as the plain solver uses it.
pub struct PlainMap<'a> {
    boxes: Vec<Box2>,
    reaches: Vec<Reaches>,
    finding: Finding<'a>,
}

/// The result of a plain solve.
#[derive(Debug, Default)]
pub struct PlainOutcome {
    pub events: Vec<(EventSummary, Feasible)>,
    pub is_undecided: bool,
}

impl<'a> PlainMap<'a> {
    pub fn new(landmarks: &[Landmark], finding: Finding<'a>) -> Self {
        let boxes: Vec<Box2> = landmarks.iter().map(Landmark::bounds).collect();
        let reaches = boxes.iter().map(|b| box_reaches(*b)).collect();
        Self { boxes, reaches, finding }
    }

    fn meeting(&self, query: Box2) -> Vec<usize> {
        match self.finding {
            Finding::Scan => {
                let meets = |&j: &usize| !self.boxes[j].intersection(query).is_empty();
                (0..self.boxes.len()).filter(meets).collect()
            }
            Finding::Tree(index) => index.meeting(query).collect(),
        }
    }

    /// As [`Solver::run_where`] with `solver`'s search area and budgets, without silence as evidence. Sets are kept only
    /// when `keeps_sets`.
    pub fn run(
        &self,
        solver: &Solver<'_>,
        steps: &[Step],
        uses: impl Fn(usize) -> bool,
        keeps_sets: bool,
    ) -> PlainOutcome {
        let mut outcome = PlainOutcome::default();
        let Some(first) = steps.first() else { return outcome };
        let slices = first.travel.len();
        let start = |slice| State {
            cell: solver.search_area,
            slice: u16::try_from(slice).expect("fewer than 65 536 slices"),
            strays: 0,
            missed: Missed::NONE,
        };
        let mut set = Feasible { states: (0..slices).map(start).collect() };
        let mut travel = vec![[0.0; DIRECTION_COUNT]; slices];
        for (number, step) in steps.iter().enumerate() {
            for (total, more) in travel.iter_mut().zip(&step.travel) {
                add_reaches(total, more);
            }
            let Some(looks) = step.sighting.as_ref().filter(|_| uses(number)) else { continue };
            let Some(next) = self.advance(solver, &set, &travel, looks) else {
                outcome.is_undecided = true;
                break;
            };
            set = next;
            travel.fill([0.0; DIRECTION_COUNT]);
            let summary = EventSummary {
                step: number,
                along_m: step.along_m,
                cells: set.states.len(),
                places: set.places(solver.fix_size_m),
                spread_m: set.spread_m(),
            };
            let kept = if keeps_sets { set.clone() } else { Feasible::default() };
            outcome.events.push((summary, kept));
            if set.states.is_empty() {
                break;
            }
        }
        outcome
    }

    fn advance(
        &self,
        solver: &Solver<'_>,
        set: &Feasible,
        travel: &[Reaches],
        looks: &[Option<Look>],
    ) -> Option<Feasible> {
        let mut next = Feasible::default();
        let mut has_branched = false;
        for state in &set.states {
            let before = next.states.len();
            let slice = usize::from(state.slice);
            let moved = state.cell.minkowski_sum(&travel[slice]);
            if let Some(look) = &looks[slice] {
                for j in self.meeting(moved.bounding_box().minkowski_sum(look.extent)) {
                    let mut vantage = self.reaches[j];
                    add_reaches(&mut vantage, &look.from_landmark);
                    if let Some(cell) = moved.intersection(&vantage) {
                        next.states.push(State { cell, ..*state });
                    }
                }
            }
            if state.strays < solver.stray_budget {
                next.states.push(State { cell: moved, strays: state.strays + 1, ..*state });
            }
            has_branched |= next.states.len() > before + 1;
            if next.states.len() > solver.cell_budget {
                return None;
            }
        }
        if has_branched && set.states.len() > travel.len() {
            drop_covered(&mut next);
        }
        Some(next)
    }
}

/// Drops cells that lie inside another one of the same slice with no more strays.
fn drop_covered(set: &mut Feasible) {
    if set.states.len() < 2 {
        return;
    }
    let side = |state: &State| state.cell.bounding_box().east;
    set.states.sort_by(|a, b| {
        let (a, b) = (side(a), side(b));
        a.lo().total_cmp(&b.lo()).then(b.hi().total_cmp(&a.hi()))
    });
    let mut kept: Vec<State> = Vec::new();
    let mut open: Vec<State> = Vec::new();
    for state in &set.states {
        open.retain(|other| side(other).hi() >= side(state).lo());
        let is_covered = open.iter().any(|other| {
            other.slice == state.slice
                && other.strays <= state.strays
                && other.cell.contains_cell(&state.cell)
        });
        if !is_covered {
            kept.push(*state);
            open.push(*state);
        }
    }
    set.states = kept;
}
