//! The feasible set: a union of cells, its spread, and its places.

use super::cell::Cell;
use super::unseen::Missed;
use crate::frame::LocalPoint;
use crate::interval::{Box2, Interval};

/// One cell of the feasible set and the history that it stands for.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct State {
    /// Positions.
    pub cell: Cell,
    /// Slice of the heading bias.
    pub slice: u16,
    /// Detections left unexplained so far.
    pub strays: u8,
    /// Landmarks certainly passed without being detected so far.
    pub missed: Missed,
}

/// All positions that some admissible history explains, as a union of cells.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Feasible {
    /// The cells; they may overlap.
    pub states: Vec<State>,
}

impl Feasible {
    /// The smallest cell that holds the whole set; none when the set is empty.
    pub fn hull(&self) -> Option<Cell> {
        self.states.iter().map(|state| state.cell).reduce(|a, b| a.hull(&b))
    }

    /// Whether a position is in the set.
    pub fn contains(&self, p: LocalPoint) -> bool {
        self.states.iter().any(|state| state.cell.contains(p))
    }

    /// Upper bound of the widest extent of the whole set, metres; none when the set is empty.
    pub fn spread_m(&self) -> Option<f64> {
        self.hull().map(|hull| hull.diameter_m())
    }

    /// Number of places: groups of cells in which each is within `fix_size_m` of another (by their bounding boxes,
    /// which can only join groups that a finer distance would keep apart).
    pub fn places(&self, fix_size_m: f64) -> usize {
        let boxes = self.states.iter().map(|state| state.cell.bounding_box()).collect();
        let group = groups(boxes, fix_size_m);
        (0..group.len()).filter(|&i| group[i] == i).count()
    }

    /// Drops every cell that lies inside another one with the same slice and no more strays, which missed no
    /// other landmarks. The union is unchanged,
    /// and so is all that can follow from it, because moving and matching are monotone.
    ///
    /// Returns, for every state before, the number of the state that stands for it now: itself, or one that holds it.
    /// Empty when nothing changed.
    pub(super) fn drop_covered(&mut self) -> Vec<u32> {
        if self.states.len() < 2 {
            return Vec::new();
        }
        // Larger cells first among those that start at the same place; ties by position in the list.
        let mut keyed: Vec<(f64, f64, usize)> = self
            .states
            .iter()
            .enumerate()
            .map(|(number, state)| {
                let east: Interval = state.cell.bounding_box().east;
                (east.lo(), east.hi(), number)
            })
            .collect();
        keyed.sort_by(|a, b| a.0.total_cmp(&b.0).then(b.1.total_cmp(&a.1)));
        // A cell that covers another starts no farther east, so it stands before it in this order (or beside it with
        // the same extent, in which case one of the two is kept).
        let mut kept: Vec<State> = Vec::with_capacity(keyed.len());
        let mut open: Vec<(f64, u32)> = Vec::new();
        let mut swept = 0;
        let mut stands_for = vec![0; keyed.len()];
        for (lo, hi, number) in keyed {
            if open.len() > 2 * swept + SWEEP_SLACK {
                open.retain(|(end, _)| *end >= lo);
                swept = open.len();
            }
            let state = self.states[number];
            let cover = open.iter().find(|(end, standing)| {
                let other = &kept[*standing as usize];
                *end >= hi
                    && other.slice == state.slice
                    && other.strays <= state.strays
                    && other.missed.is_within(&state.missed)
                    && other.cell.contains_cell(&state.cell)
            });
            stands_for[number] = match cover {
                Some((_, standing)) => *standing,
                None => {
                    let standing = u32::try_from(kept.len()).expect("the cell budget is below 2³²");
                    kept.push(state);
                    open.push((hi, standing));
                    standing
                }
            };
        }
        self.states = kept;
        stands_for
    }
}

/// A sweep's list of open boxes is cleared of those left behind when it has grown to twice its last length plus this:
/// clearing then costs a constant share per box. What is left behind is told apart where the list is read.
const SWEEP_SLACK: usize = 16;

/// For each box the number of the box that represents its group. Each box of a group is within `gap_m` of another one.
pub(super) fn groups(boxes: Vec<Box2>, gap_m: f64) -> Vec<usize> {
    let mut group: Vec<usize> = (0..boxes.len()).collect();
    let mut ordered: Vec<(Box2, usize)> = boxes.into_iter().zip(0..).collect();
    ordered.sort_by(|(a, _), (b, _)| {
        a.east.lo().total_cmp(&b.east.lo()).then(a.north.lo().total_cmp(&b.north.lo()))
    });
    // Boxes that may still be met by one farther east.
    let mut open: Vec<(Box2, usize)> = Vec::new();
    let mut swept = 0;
    for (b, i) in ordered {
        if open.len() > 2 * swept + SWEEP_SLACK {
            open.retain(|(other, _)| other.east.hi() + gap_m >= b.east.lo());
            swept = open.len();
        }
        for &(other, j) in &open {
            let is_near = other.east.hi() + gap_m >= b.east.lo()
                && other.north.lo() - gap_m <= b.north.hi()
                && b.north.lo() <= other.north.hi() + gap_m;
            if is_near {
                let (mine, theirs) = (root(&mut group, i), root(&mut group, j));
                group[mine] = theirs;
            }
        }
        open.push((b, i));
    }
    for i in 0..group.len() {
        group[i] = root(&mut group, i);
    }
    group
}

/// Representative of a group, with path halving.
fn root(group: &mut [usize], mut i: usize) -> usize {
    while group[i] != i {
        group[i] = group[group[i]];
        i = group[i];
    }
    i
}

#[cfg(test)]
mod tests {
    use super::*;

    fn state(east_m: f64, north_m: f64, half_m: f64, strays: u8) -> State {
        State {
            cell: Cell::from_box(Box2::around(LocalPoint::new(east_m, north_m), half_m, half_m)),
            slice: 0,
            strays,
            missed: Missed::NONE,
        }
    }

    #[test]
    fn places_join_chains_and_keep_distant_groups() {
        let set = Feasible {
            states: vec![
                state(0.0, 0.0, 1.0, 0),
                state(20.0, 0.0, 1.0, 0),
                state(0.0, 300.0, 1.0, 0),
                state(38.0, 5.0, 1.0, 0),
            ],
        };
        assert_eq!(set.places(20.0), 2);
        assert_eq!(set.places(1.0), 4);
        assert_eq!(Feasible::default().places(20.0), 0);
    }

    #[test]
    fn only_covered_cells_of_the_same_kind_are_dropped() {
        let mut set = Feasible {
            states: vec![
                state(0.0, 0.0, 1.0, 0),
                state(0.0, 0.0, 2.0, 0),
                state(0.0, 0.0, 2.0, 1),
                state(0.0, 0.0, 3.0, 1),
                state(2.0, 0.0, 1.0, 0),
            ],
        };
        let before = set.states.clone();
        let stands_for = set.drop_covered();
        for (state, &standing) in before.iter().zip(&stands_for) {
            let standing = set.states[standing as usize];
            assert!(standing.cell.contains_cell(&state.cell) && standing.strays <= state.strays);
        }
        // The 1 m cell and the 2 m cell with a stray are covered by the 2 m cell without; the 3 m cell and the one
        // that sticks out are not.
        assert_eq!(set.states.len(), 3);
    }

    #[test]
    fn spread_is_the_distance_between_far_corners() {
        let set = Feasible { states: vec![state(0.0, 0.0, 1.0, 0), state(100.0, 0.0, 1.0, 0)] };
        let spread = set.spread_m().expect("not empty");
        assert!((spread - 102.0f64.hypot(2.0)).abs() < 1e-6 && spread >= 102.0f64.hypot(2.0));
        assert_eq!(Feasible::default().spread_m(), None);
    }
}
