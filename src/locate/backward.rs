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
//! side looked at is dropped. Going backward, a state whose sets fall into groups that lie apart is split into one
//! state per group, so that the search area does not stay one cell when only two distant parts of it are left. The two
//! directions take turns until nothing moves.
//!
//! *Guarantee.* No admissible history is lost. Before any sweep the graph holds a chain of links for each (proof in
//! [`super::history`]). Let all its positions lie in the cells of its chain before a step of a sweep. Its position at
//! either end of each link lies in the set that the step computes for that link (the two guarantees of
//! [`History::landing`] and [`History::origin`]), hence the set is not empty, the link stays, and the position lies in
//! the state's new cell, which holds the sets of all its links. So it does after the step. When a state is split, the
//! history's link to the next detection goes with one of the parts, whose cell holds the link's set; the links from
//! the detection before are given to every part, so the chain goes on through that part. At the last detection
//! nothing is asked of later links, at the start nothing of earlier ones. Hence stopping after any sweep is sound too.
//!
//! *Shrinking.* The set of a link lies inside the state's cell by an intersection whose reaches are never above
//! either operand's, and the join's reaches are the largest of these: a sweep never makes a reach larger.
//!
//! *Rest.* Without thinning out, one solve and one backward sweep would be exact up to the shape of cells, because
//! what is seen before and after a position only meet there. A further sweep narrows only what the joins and covering
//! cells had made too wide.

use super::cell::{Cell, DIRECTION_COUNT};
use super::feasible::{State, groups};
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

/// A state is not split when that would copy more links than this: memory stays in proportion. (Not splitting is sound.)
const LINKS_PER_SPLIT_MAX: usize = 100_000;

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
            let (links, origins) = self.alive(level, &mut has_moved, |history, link| {
                let landing = history.landing(level, link, map)?;
                history.origin(level, link, &landing)
            });
            self.levels[level].links = links;
            has_moved |= self.split(level, &origins);
            let joined = joined(
                self.levels[level - 1].states.len(),
                self.levels[level].links.iter().map(|link| link.from).zip(origins),
            );
            narrow(&mut self.levels[level - 1].states, &joined, &mut has_moved);
        }
        has_moved
    }

    /// From the start to the last detection; returns whether anything moved.
    fn sweep_forward(&mut self, map: &SolverMap) -> bool {
        let mut has_moved = false;
        for level in 1..self.levels.len() {
            let (links, landings) =
                self.alive(level, &mut has_moved, |history, link| history.landing(level, link, map));
            let here = &mut self.levels[level];
            let joined = joined(here.states.len(), links.iter().map(|link| link.to).zip(landings));
            here.links = links;
            narrow(&mut here.states, &joined, &mut has_moved);
        }
        has_moved
    }

    /// The links of `level` for which `set` is not empty, and their sets.
    fn alive(
        &self,
        level: usize,
        has_moved: &mut bool,
        set: impl Fn(&Self, &Link) -> Option<Cell>,
    ) -> (Vec<Link>, Vec<Cell>) {
        let links = &self.levels[level].links;
        let alive: (Vec<Link>, Vec<Cell>) =
            links.iter().filter_map(|link| Some((*link, set(self, link)?))).unzip();
        *has_moved |= alive.0.len() < links.len();
        alive
    }

    /// Splits the states before `level` whose `origins` (by link of `level`) fall into groups that lie apart. The first
    /// group keeps the number of its state. Returns whether anything was split.
    fn split(&mut self, level: usize, origins: &[Cell]) -> bool {
        let (before, after) = self.levels.split_at_mut(level);
        let (before, links) = (&mut before[level - 1], &mut after[0].links);
        // Number of the link and of the state it leaves.
        let mut by_state: Vec<(usize, u32)> = links.iter().map(|link| link.from).enumerate().collect();
        by_state.sort_by_key(|&(_, from)| from);
        // New states by the state that they are parts of.
        let mut parts: Vec<(u32, u32)> = Vec::new();
        let mut coming_in = vec![0u32; before.states.len()];
        for link in &before.links {
            coming_in[link.to as usize] += 1;
        }
        for chunk in by_state.chunk_by(|a, b| a.1 == b.1) {
            if chunk.len() < 2 {
                continue;
            }
            let from = chunk[0].1;
            let boxes = chunk.iter().map(|&(link, _)| origins[link].bounding_box()).collect();
            let group = groups(boxes, 0.0);
            let apart = (1..)
                .zip(&group[1..])
                .filter(|&(i, &representative)| representative == i && i != group[0])
                .count();
            // A copy of every incoming link per part: more of them than outgoing links would be out of proportion.
            if apart == 0 || apart * coming_in[from as usize] as usize > LINKS_PER_SPLIT_MAX {
                continue;
            }
            let mut number_of: Vec<u32> = vec![from; group.len()];
            for i in 0..group.len() {
                if group[i] as usize == i && group[i] != group[0] {
                    number_of[i] = u32::try_from(before.states.len()).expect("fewer than 2³² states");
                    before.states.push(before.states[from as usize]);
                    parts.push((from, number_of[i]));
                }
            }
            for (&(link, _), &representative) in chunk.iter().zip(&group) {
                links[link].from = number_of[representative as usize];
            }
        }
        let mut copies: Vec<Link> = Vec::new();
        for link in &before.links {
            // `parts` is in the order of the states.
            let first = parts.partition_point(|(of, _)| *of < link.to);
            let own = parts[first..].iter().take_while(|(of, _)| *of == link.to);
            copies.extend(own.map(|&(_, to)| Link { to, ..*link }));
        }
        before.links.extend(copies);
        !parts.is_empty()
    }
}

/// For each of `count` states the smallest cell that holds all of its sets.
fn joined(count: usize, sets: impl Iterator<Item = (u32, Cell)>) -> Vec<Option<Cell>> {
    let mut joined: Vec<Option<Cell>> = vec![None; count];
    for (state, cell) in sets {
        let all = &mut joined[state as usize];
        *all = Some(all.map_or(cell, |all| all.hull(&cell)));
    }
    joined
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
