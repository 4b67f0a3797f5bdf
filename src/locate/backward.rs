//! Sweeps over a recorded history: what is seen later narrows where the vehicle was before, and back again.
//!
//! With C_k the cell of a state at detection k, D the travel, and L the landing of a link (all positions at its
//! detection of histories through it, see [`History`]),
//!
//! ```text
//! backward:  C_(k−1) ← ⊔ over links to the next detection   of  C_(k−1) ∩ ( L ⊕ −D )
//! forward:   C_k     ← ⊔ over links from the one before     of  L = C_k ∩ ( C_(k−1) ⊕ D ) ∩ ( [M_j] ⊕ −S )
//! ```
//!
//! where ⊔ is the smallest cell that holds all of them. A link whose set is empty is cut; a state without links on the
//! side looked at is dropped. The two directions take turns until nothing moves.
//!
//! *Guarantee.* No admissible history is lost. Before any sweep the graph holds a chain of links for each (proof in
//! [`super::history`]). Let all its positions lie in the cells of its chain before a step of a sweep. Its position at
//! either end of each link lies in the set that the step computes for that link (the two guarantees of
//! [`History::landing`] and [`History::origin`]), hence the set is not empty, the link stays, and the position lies in
//! the state's new cell, which holds the sets of all its links. So it does after the step. At the last detection
//! nothing is asked of later links, at the start nothing of earlier ones. Hence stopping after any sweep is sound too.
//!
//! *Shrinking.* Every set of a link lies inside the state's cell by an intersection whose reaches are never above
//! either operand's, and the join's reaches are the largest of these: a sweep never makes a reach larger.
//!
//! *Rest.* Without thinning out, one solve and one backward sweep would be exact up to the shape of cells, because
//! what is seen before and after a position only meet there. A further sweep narrows only what the joins and covering
//! cells had made too wide.

use super::cell::{Cell, DIRECTION_COUNT};
use super::feasible::State;
use super::forward::SolverMap;
use super::history::{History, Link};

/// Sweeps after which the history is left as it is. Stopping early is sound; measured histories rest sooner.
pub const SWEEPS_MAX: usize = 16;

/// A sweep that moves no edge of a cell by more than this, drops nothing and cuts nothing is the last, metres: a
/// centimetre, well below the resolution of any sonar the program is meant for.
pub const SHRINK_M: f64 = 0.01;

/// What the sweeps did.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Sweeps {
    /// Sweeps made, backward and forward counted one by one.
    pub count: usize,
    /// Whether the last sweep changed nothing worth another; otherwise the limit was reached.
    pub is_at_rest: bool,
}

/// Direction of a sweep.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Direction {
    Backward,
    Forward,
}

impl History {
    /// Sweeps until nothing moves by more than [`SHRINK_M`], or [`SWEEPS_MAX`] times. `map` must be the solver's.
    /// `visit` gets the history after each sweep.
    pub fn sweep(&mut self, map: &SolverMap, mut visit: impl FnMut(&Self)) -> Sweeps {
        let mut sweeps = Sweeps::default();
        // The solve itself was the first forward pass.
        let directions = [Direction::Backward, Direction::Forward].into_iter().cycle();
        for direction in directions.take(SWEEPS_MAX) {
            let has_moved = match direction {
                Direction::Backward => self.sweep_backward(map),
                Direction::Forward => self.sweep_forward(map),
            };
            sweeps.count += 1;
            visit(self);
            if !has_moved {
                sweeps.is_at_rest = true;
                break;
            }
        }
        sweeps
    }

    /// From the last detection to the start; returns whether anything moved.
    fn sweep_backward(&mut self, map: &SolverMap) -> bool {
        let mut has_moved = false;
        for level in (1..self.levels.len()).rev() {
            let joined = self.join(level, level - 1, &mut has_moved, |history, link| {
                let landing = history.landing(level, link, map)?;
                Some((link.from, history.origin(level, link, &landing)?))
            });
            narrow(&mut self.levels[level - 1].states, &joined, &mut has_moved);
        }
        has_moved
    }

    /// From the start to the last detection; returns whether anything moved.
    fn sweep_forward(&mut self, map: &SolverMap) -> bool {
        let mut has_moved = false;
        for level in 1..self.levels.len() {
            let joined = self.join(level, level, &mut has_moved, |history, link| {
                Some((link.to, history.landing(level, link, map)?))
            });
            narrow(&mut self.levels[level].states, &joined, &mut has_moved);
        }
        has_moved
    }

    /// Cuts the links of `level` for which `set` is empty, and joins the sets of the others by the state of level
    /// `target` that they belong to.
    fn join(
        &mut self,
        level: usize,
        target: usize,
        has_moved: &mut bool,
        set: impl Fn(&Self, &Link) -> Option<(u32, Cell)>,
    ) -> Vec<Option<Cell>> {
        let mut joined: Vec<Option<Cell>> = vec![None; self.levels[target].states.len()];
        let mut links = std::mem::take(&mut self.levels[level].links);
        let before = links.len();
        links.retain(|link| match set(self, link) {
            None => false,
            Some((state, cell)) => {
                let all = &mut joined[state as usize];
                *all = Some(all.map_or(cell, |all| all.hull(&cell)));
                true
            }
        });
        *has_moved |= links.len() < before;
        self.levels[level].links = links;
        joined
    }
}

/// Gives every state its new cell and drops those without one.
fn narrow(states: &mut [Option<State>], joined: &[Option<Cell>], has_moved: &mut bool) {
    for (state, cell) in states.iter_mut().zip(joined) {
        match (state.as_mut(), cell) {
            (None, _) => {}
            (Some(_), None) => {
                *state = None;
                *has_moved = true;
            }
            (Some(state), Some(cell)) => {
                let (old, new) = (state.cell.reaches(), cell.reaches());
                *has_moved |= (0..DIRECTION_COUNT).any(|i| old[i] - new[i] > SHRINK_M);
                state.cell = *cell;
            }
        }
    }
}
