//! A solver's sets between its events.

use fixability::locate::cell::{Cell, DIRECTION_COUNT, add_reaches};
use fixability::locate::{Feasible, Step};

/// The feasible set at step `at`, moved from the last sighting before it (`sets` by step number, ascending), or from
/// `area` at step `start` when there is none.
pub fn set_at(sets: &[(usize, Feasible)], steps: &[Step], start: usize, at: usize, area: Cell) -> Vec<Cell> {
    let last = sets.iter().rev().find(|(step, _)| *step <= at);
    let (from, states) = match last {
        Some((step, set)) => (step + 1, set.states.iter().map(|s| (s.cell, usize::from(s.slice))).collect()),
        None => (start, (0..steps[at].travel.len()).map(|slice| (area, slice)).collect::<Vec<_>>()),
    };
    states
        .into_iter()
        .map(|(cell, slice)| {
            let mut travel = [0.0; DIRECTION_COUNT];
            for step in &steps[from..=at] {
                add_reaches(&mut travel, &step.travel[slice]);
            }
            cell.minkowski_sum(&travel)
        })
        .collect()
}
