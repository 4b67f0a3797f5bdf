//! The first two detections of a run from an unknown start, without a cell for every landmark.
//!
//! The first detection may be any landmark, so its set has one cell per landmark and slice, and the second detection
//! ends most of them. The answers here are those of [`super::Solver`]'s plain way, to the last digit, found with less
//! work. It is used without stray budget and without silence as evidence, where a state is no more than its cell and
//! slice.
//!
//! *1. Whole vantages are not stored.* The cell of landmark j is its vantage [M_j] ⊕ −S cut by the moved search area A
//! = X_0 ⊕ D. Where the vantage lies inside A, [`Cell::intersection`] returns the vantage itself, whose reaches follow
//! from the box and the look alone. In each strip of the map ([`Strips`]) the landmarks between two eastings are found
//! for which that holds in every slice: with N_i the greatest north part of d_i·p in the strip and c_i = min over
//! slices of A_i − look_i, a box lies far enough inside if its own reach east is at most c_i − N_i in every direction,
//! an upper limit of its east edge or a lower limit of its west edge. They are *whole*. All others near the area are
//! intersected one by one and stored: *cut*. Calling a whole one cut costs time and changes nothing. [`SLACK_M`] lies
//! between the test and the rounding of the reaches, so a whole vantage is inside in the solver's own numbers, and its
//! box meets the solver's query.
//!
//! *2. Hulls.* Adding a constant and rounding up is monotone, so the greatest reach of all whole vantages of a slice
//! is the greatest reach of their boxes, plus that of the look, rounded up: the same number as the greatest of the
//! sums.
//!
//! *3. Places.* The plain way joins two cells when their bounding boxes pass [`is_near`]. The same test is made here
//! on the same boxes, on all pairs that can pass it ([`Strips::near_pairs`], or [`Strips::join`]); their number is in
//! proportion to the number of landmarks. A whole landmark stands for its cells of all slices: they are called whole
//! only if every two neighbouring slices of one landmark pass the test with room to spare, so they are one place
//! anyway. Places = cells (a whole landmark counted once) less joins that united two groups.
//!
//! *4. The second detection*: `second.rs`.

use std::ops::Range;

use super::cell::{Cell, DIRECTION_COUNT, DIRECTIONS, EAST, HALF, NORTH, Reaches};
use super::feasible::{Feasible, State, groups, is_near, root};
use super::forward::{Solver, SolverMap};
use super::steps::Look;
use super::strips::Strips;
use super::unseen::Missed;
use crate::interval::{Box2, Interval, larger, smaller, up};

/// Allowance for rounding between a test and the numbers it speaks for, metres. Coordinates stay below 10⁸ m, where one
/// rounding is below 2·10⁻⁸ m, and fewer than a hundred of them meet in a test.
pub(super) const SLACK_M: f64 = 1e-3;

/// A cell at the border of the search area.
#[derive(Clone, Copy, Debug)]
pub(super) struct CutCell {
    pub slice: u16,
    /// Place of its landmark in the strips.
    pub place: usize,
    pub cell: Cell,
}

/// The feasible set after the first detection.
#[derive(Debug)]
pub(super) struct FirstSet<'a> {
    pub(super) map: &'a SolverMap,
    pub(super) looks: &'a [Option<Look>],
    /// Places of the whole vantages, one range for each strip.
    pub(super) whole: Vec<Range<usize>>,
    whole_count: usize,
    /// The others, by strip, landmark and slice.
    pub(super) cut: Vec<CutCell>,
}

impl<'a> FirstSet<'a> {
    /// The set after `solver`'s search area has moved by `travel` and `looks` were had; none when it has more cells
    /// than the budget.
    pub fn new(solver: &Solver<'a>, travel: &[Reaches], looks: &'a [Option<Look>]) -> Option<Self> {
        let map = solver.map;
        let strips = &map.strips;
        let moved: Vec<Cell> = travel.iter().map(|travel| solver.search_area.minkowski_sum(travel)).collect();
        let pairs = || moved.iter().zip(looks).filter_map(|(moved, look)| Some((moved, look.as_ref()?)));
        let mut room = [f64::INFINITY; DIRECTION_COUNT];
        let mut near = Box2::EMPTY;
        for (moved, look) in pairs() {
            for ((room, area), look) in room.iter_mut().zip(moved.reaches()).zip(&look.from_landmark) {
                *room = smaller(*room, area - look - SLACK_M);
            }
            near = near.hull(moved.bounding_box().minkowski_sum(look.extent));
        }
        let has_whole = pairs().next().is_some() && slices_are_one_place(looks, solver.fix_size_m);
        let whole: Vec<Range<usize>> = (0..strips.count())
            .map(|strip| {
                let none = strips.places(strip).start..strips.places(strip).start;
                if has_whole { whole_range(strips, strip, &room).unwrap_or(none) } else { none }
            })
            .collect();
        let whole_count = whole.iter().map(ExactSizeIterator::len).sum();
        let mut set = Self { map, looks, whole: Vec::new(), whole_count, cut: Vec::new() };
        strips.for_each_meeting_outside(&whole, near, |place| {
            // More than the budget: the answer is known.
            if set.cut.len() > solver.cell_budget {
                return;
            }
            let b = strips.box_at(place);
            for (slice, (moved, look)) in (0..).zip(moved.iter().zip(looks)) {
                let Some(look) = look else { continue };
                if b.intersection(moved.bounding_box().minkowski_sum(look.extent)).is_empty() {
                    continue;
                }
                let vantage = map.vantage(strips.landmark_at(place), look);
                set.cut.extend(moved.intersection(&vantage).map(|cell| CutCell { slice, place, cell }));
            }
        });
        set.whole = whole;
        (set.len() <= solver.cell_budget).then_some(set)
    }

    /// Number of cells.
    pub fn len(&self) -> usize {
        self.whole_count * self.looks.iter().flatten().count() + self.cut.len()
    }

    /// The smallest cell that holds all cells of a slice, for each slice.
    pub fn slice_hulls(&self) -> Vec<Option<Cell>> {
        let boxes = (self.whole_count > 0).then(|| self.greatest_reaches());
        let mut hulls: Vec<Option<Cell>> = self
            .looks
            .iter()
            .map(|look| Some(Cell::from_reaches(boxes?).minkowski_sum(&look.as_ref()?.from_landmark)))
            .collect();
        for cut in &self.cut {
            let hull = &mut hulls[usize::from(cut.slice)];
            *hull = Some(hull.map_or(cut.cell, |hull| hull.hull(&cut.cell)));
        }
        hulls
    }

    /// The greatest reach of the boxes of whole vantages in every direction.
    ///
    /// Landmarks are looked at from the end of a strip that the direction points to, until what is left of the strip
    /// cannot reach farther.
    fn greatest_reaches(&self) -> Reaches {
        let strips = &self.map.strips;
        std::array::from_fn(|i| {
            let [east, north] = DIRECTIONS[i];
            let mut best = f64::NEG_INFINITY;
            for k in 0..self.whole.len() {
                let strip = if north > 0.0 { self.whole.len() - 1 - k } else { k };
                let range = self.whole[strip].clone();
                let rest = farthest(north, strips.north_of(strip)) + SLACK_M;
                for k in 0..range.len() {
                    let (place, width_m) = if east > 0.0 {
                        (range.end - 1 - k, strips.widest_m(strip))
                    } else {
                        (range.start + k, 0.0)
                    };
                    if east * (strips.box_at(place).east.lo() + width_m) + rest <= best {
                        break;
                    }
                    best = larger(best, self.map.reaches_of(strips.landmark_at(place))[i]);
                }
            }
            best
        })
    }

    /// Number of places, as [`Feasible::places`] counts them.
    pub fn places(&self, gap_m: f64) -> usize {
        if self.len() == 0 {
            return 0;
        }
        let strips = &self.map.strips;
        let looks: Vec<&Look> = self.looks.iter().flatten().collect();
        // A whole landmark has its place in the strips as its number; the cut cells come after.
        let count = strips.len();
        let mut group: Vec<u32> = (0..).take(count + self.cut.len()).collect();
        let mut places = self.whole_count + self.cut.len();
        let mut unite = |a: usize, b: usize| {
            let (mine, theirs) = (root(&mut group, a), root(&mut group, b));
            if mine != theirs {
                group[mine as usize] = theirs;
                places -= 1;
            }
        };
        // Where a vantage lies, less its box: over all slices.
        let around = looks.iter().fold(Box2::EMPTY, |all, look| all.hull(-look.extent));
        let gap = Interval::around(0.0, gap_m + SLACK_M);
        let gap = Box2 { east: gap, north: gap };
        let apart = around.minkowski_sum(-around).minkowski_sum(gap);
        let are_near = |a: Box2, b: Box2| {
            looks.iter().any(|look| {
                let a = vantage_box(a, look);
                looks.iter().any(|look| is_near(a, vantage_box(b, look), gap_m))
            })
        };
        let mut look_at = |first: usize, second: usize| {
            if are_near(strips.box_at(first), strips.box_at(second)) {
                unite(first, second);
            }
        };
        let is_whole = |place: usize| self.whole[strips.strip_of(place)].contains(&place);
        let farthest_m = larger(apart.east.hi(), apart.north.hi());
        if let Some(pairs) = strips.near_pairs(farthest_m) {
            pairs.filter(|pair| pair.iter().all(|&place| is_whole(place))).for_each(|[a, b]| look_at(a, b));
        } else {
            // One of the two boxes does not begin farther west than the other: half of the window is enough.
            let eastward = Box2 { east: Interval::new(0.0, apart.east.hi()), ..apart };
            strips.join(&self.whole, eastward, |first, second| {
                let is_east = strips.box_at(second).east.lo() >= strips.box_at(first).east.lo();
                if is_east && first != second && is_whole(second) {
                    look_at(first, second);
                }
                true
            });
        }
        let boxes: Vec<Box2> = self.cut.iter().map(|cut| cut.cell.bounding_box()).collect();
        for (number, &b) in (count..).zip(&boxes) {
            let query = b.minkowski_sum(-around).minkowski_sum(gap);
            strips.for_each_meeting(query, |place| {
                let vantages = || looks.iter().map(|look| vantage_box(strips.box_at(place), look));
                if is_whole(place) && vantages().any(|a| is_near(a, b, gap_m)) {
                    unite(number, place);
                }
            });
        }
        for (number, representative) in groups(boxes, gap_m).into_iter().enumerate() {
            unite(count + number, count + representative as usize);
        }
        places
    }

    /// All cells, in the order of the plain way.
    pub fn to_feasible(&self) -> Feasible {
        let strips = &self.map.strips;
        let mut states: Vec<(u32, State)> = Vec::with_capacity(self.len());
        for (slice, look) in (0..).zip(self.looks) {
            let Some(look) = look else { continue };
            states.extend(self.whole.iter().cloned().flatten().map(|place| {
                let vantage = self.map.vantage(strips.landmark_at(place), look);
                (strips.order(place), state(Cell::from_reaches(vantage), slice))
            }));
        }
        states.extend(self.cut.iter().map(|cut| (strips.order(cut.place), state(cut.cell, cut.slice))));
        states.sort_unstable_by_key(|(order, state)| (state.slice, *order));
        Feasible { states: states.into_iter().map(|(_, state)| state).collect() }
    }
}

pub(super) fn state(cell: Cell, slice: u16) -> State {
    State { cell, slice, strays: 0, missed: Missed::NONE }
}

/// The greatest x · n over the northings of a strip.
fn farthest(x: f64, north: Interval) -> f64 {
    x * if x > 0.0 { north.hi() } else { north.lo() }
}

/// The places of a strip whose vantages lie whole inside the area, by the `room` that it leaves a box in every
/// direction. Not necessarily all of them; none when no limit leaves room.
fn whole_range(strips: &Strips, strip: usize, room: &Reaches) -> Option<Range<usize>> {
    let north = strips.north_of(strip);
    let (mut west_m, mut east_m) = (f64::NEG_INFINITY, f64::INFINITY);
    for (i, &[e, n]) in DIRECTIONS.iter().enumerate() {
        let left = room[i] - farthest(n, north);
        if e > 0.0 {
            east_m = smaller(east_m, left / e);
        } else if e < 0.0 {
            west_m = larger(west_m, left / e);
        } else if left < 0.0 {
            return None;
        }
    }
    let start = strips.first_from(strip, west_m);
    let end = strips.first_from(strip, east_m - strips.widest_m(strip));
    (start < end).then_some(start..end)
}

/// Whether the cells of one landmark in all slices are one place, wherever it lies.
fn slices_are_one_place(looks: &[Option<Look>], gap_m: f64) -> bool {
    let vantages: Vec<Box2> =
        looks.iter().flatten().map(|look| Cell::from_reaches(look.from_landmark).bounding_box()).collect();
    vantages.windows(2).all(|pair| {
        let near =
            |a: Interval, b: Interval| larger(a.lo(), b.lo()) - smaller(a.hi(), b.hi()) <= gap_m - SLACK_M;
        near(pair[0].east, pair[1].east) && near(pair[0].north, pair[1].north)
    })
}

/// The bounding box of a whole vantage: the same four reaches, with the same rounding.
fn vantage_box(b: Box2, look: &Look) -> Box2 {
    let side = |side: Interval, i: usize| {
        let hi = up(side.hi() + look.from_landmark[i]);
        let lo = -up(-side.lo() + look.from_landmark[i + HALF]);
        Interval::new(smaller(lo, hi), larger(lo, hi))
    };
    Box2 { east: side(b.east, EAST), north: side(b.north, NORTH) }
}
