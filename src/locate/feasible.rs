//! The feasible set: a union of cells, its spread, and its places.

use std::cell::OnceCell;
use std::cmp::Ordering;
use std::ops::Deref;

use super::cell::Cell;
use super::first::FirstSet;
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

    /// The smallest cell that holds all cells of a slice, for each of `slices` slices; none for a slice without cells.
    pub fn slice_hulls(&self, slices: usize) -> Vec<Option<Cell>> {
        let mut hulls = vec![None; slices];
        for state in &self.states {
            let hull: &mut Option<Cell> = &mut hulls[usize::from(state.slice)];
            *hull = Some(hull.map_or(state.cell, |h| h.hull(&state.cell)));
        }
        hulls
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
        group.iter().zip(0..).filter(|&(&representative, i)| representative == i).count()
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

/// The feasible set after an event, as the solver shows it: a [`Feasible`] whose cells are worked out when they are
/// first looked at. The set after the first detection has a cell for every landmark, and few who watch a run ask for
/// them.
#[derive(Debug)]
pub struct EventSet<'a> {
    hulls: &'a [Option<Cell>],
    source: Source<'a>,
}

#[derive(Debug)]
enum Source<'a> {
    Cells(&'a Feasible),
    First(&'a FirstSet<'a>, OnceCell<Feasible>),
}

impl<'a> EventSet<'a> {
    /// A set whose cells are there, with the hulls of its slices.
    pub(super) fn of_cells(set: &'a Feasible, hulls: &'a [Option<Cell>]) -> Self {
        Self { hulls, source: Source::Cells(set) }
    }

    /// The set after the first detection, with the hulls of its slices.
    pub(super) fn of_first(set: &'a FirstSet<'a>, hulls: &'a [Option<Cell>]) -> Self {
        Self { hulls, source: Source::First(set, OnceCell::new()) }
    }

    /// The smallest cell that holds all cells of a slice, for each slice; none for a slice without cells.
    pub fn slice_hulls(&self) -> &[Option<Cell>] {
        self.hulls
    }
}

impl Deref for EventSet<'_> {
    type Target = Feasible;

    fn deref(&self) -> &Feasible {
        match &self.source {
            Source::Cells(set) => set,
            Source::First(first, cells) => cells.get_or_init(|| first.to_feasible()),
        }
    }
}

/// A sweep's list of open boxes is cleared of those left behind when it has grown to twice its last length plus this:
/// clearing then costs a constant share per box. What is left behind is told apart where the list is read.
const SWEEP_SLACK: usize = 16;

/// The order in which [`groups`] takes boxes.
fn by_corner(a: &Box2, b: &Box2) -> Ordering {
    a.east.lo().total_cmp(&b.east.lo()).then(a.north.lo().total_cmp(&b.north.lo()))
}

/// Whether two boxes are within `gap_m` of each other, as [`groups`] finds it: the sums are rounded, and which numbers
/// are added depends on which box comes first.
#[inline]
pub(super) fn is_near(a: Box2, b: Box2, gap_m: f64) -> bool {
    // Of two boxes with the same corner either may be the first: they are near in any case.
    let (first, b) = if by_corner(&a, &b).is_gt() { (b, a) } else { (a, b) };
    is_near_next(first, b, gap_m)
}

/// As [`is_near`], for boxes in their order.
#[inline]
fn is_near_next(first: Box2, b: Box2, gap_m: f64) -> bool {
    first.east.hi() + gap_m >= b.east.lo()
        && first.north.lo() - gap_m <= b.north.hi()
        && b.north.lo() <= first.north.hi() + gap_m
}

/// For each box the number of the box that represents its group. Each box of a group is within `gap_m` of another one.
pub(super) fn groups(boxes: Vec<Box2>, gap_m: f64) -> Vec<u32> {
    let mut group: Vec<u32> = (0..).take(boxes.len()).collect();
    let mut ordered: Vec<(Box2, usize)> = boxes.into_iter().zip(0..).collect();
    ordered.sort_by(|(a, _), (b, _)| by_corner(a, b));
    // Boxes that may still be met by one farther east.
    let mut open: Vec<(Box2, usize)> = Vec::new();
    let mut swept = 0;
    for (b, i) in ordered {
        if open.len() > 2 * swept + SWEEP_SLACK {
            open.retain(|(other, _)| other.east.hi() + gap_m >= b.east.lo());
            swept = open.len();
        }
        for &(other, j) in &open {
            if is_near_next(other, b, gap_m) {
                let (mine, theirs) = (root(&mut group, i), root(&mut group, j));
                group[mine as usize] = theirs;
            }
        }
        open.push((b, i));
    }
    for i in 0..group.len() {
        group[i] = root(&mut group, i);
    }
    group
}

/// Representative of a group, with path halving. Numbers are below 2³², as cells are.
pub(super) fn root(group: &mut [u32], i: usize) -> u32 {
    let mut i = i;
    while group[i] as usize != i {
        group[i] = group[group[i] as usize];
        i = group[i] as usize;
    }
    group[i]
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
