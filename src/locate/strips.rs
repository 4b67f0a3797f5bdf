//! The landmarks' boxes in strips from west to east: for questions near a place, and for the same question asked of
//! every landmark.
//!
//! The boxes are sorted by their south edge and cut into about √n strips of equal number; within a strip they are
//! sorted by their west edge. Numbers, not metres, set the strips, so that a crowded corner or one stray position far
//! away does no harm. A place in this order is called a *place in the strips* here.
//!
//! *Guarantee.* No box that meets a query is left out: west and south edges are compared with ends moved out by the
//! widest box of the strip and the tallest of the map, rounded outward.
//!
//! *Order of answers.* The R-tree of the map gives its answers in an order that depends on the tree alone: a query only
//! leaves entries out. [`Strips::order`] is that order, so whoever sorts by it gets what the tree would have given.

use std::ops::Range;
use std::sync::OnceLock;

use crate::interval::{Box2, Interval, down, larger, up};
use crate::map::index::LandmarkIndex;

/// One strip.
#[derive(Clone, Debug)]
struct Strip {
    /// Its places.
    places: Range<usize>,
    /// Least and greatest south edge, metres.
    south_m: [f64; 2],
    /// Greatest north edge, metres.
    north_m: f64,
    /// Width of its widest box, metres, rounded up.
    widest_m: f64,
}

/// The boxes of a map in strips.
#[derive(Debug)]
pub(super) struct Strips {
    strips: Vec<Strip>,
    boxes: Vec<Box2>,
    landmark: Vec<u32>,
    order: Vec<u32>,
    /// Height of the tallest box, metres, rounded up.
    tallest_m: f64,
    /// Boxes in a strip (fewer in the last).
    each: usize,
    near: OnceLock<NearPairs>,
}

/// Pairs of boxes near each other, worked out when first asked for.
#[derive(Debug, Default)]
struct NearPairs {
    /// All pairs up to this distance are listed, metres.
    reach_m: f64,
    /// By distance, each band as wide as the others, in the order of the strips.
    bands: Vec<Vec<[u32; 2]>>,
}

/// Pairs are listed up to this distance, metres, or half of it, and so on, where they would be more than
/// [`NEAR_PER_BOX`] for each box: 8 bytes each.
const NEAR_REACH_M: f64 = 100.0;
/// See [`NEAR_REACH_M`].
const NEAR_PER_BOX: usize = 8;
/// Times that the distance is halved at most.
const NEAR_HALVINGS: u32 = 4;
/// Bands of distance.
const NEAR_BANDS: usize = 20;

impl Strips {
    /// Sorts `boxes`, which `index` holds too.
    pub fn new(boxes: &[Box2], index: &LandmarkIndex) -> Self {
        let mut landmark: Vec<u32> = (0..).take(boxes.len()).collect();
        let by = |edge: fn(&Box2) -> f64| {
            move |a: &u32, b: &u32| {
                edge(&boxes[*a as usize]).total_cmp(&edge(&boxes[*b as usize])).then(a.cmp(b))
            }
        };
        landmark.sort_unstable_by(by(|b| b.north.lo()));
        let each = ((boxes.len() as f64).sqrt().ceil() as usize).max(1);
        let mut strips = Vec::new();
        let mut begin = 0;
        for strip in landmark.chunks_mut(each) {
            let south_of = |number: u32| boxes[number as usize].north.lo();
            let south_m = [south_of(strip[0]), south_of(strip[strip.len() - 1])];
            strip.sort_unstable_by(by(|b| b.east.lo()));
            let most = |of: fn(&Box2) -> f64| {
                strip.iter().map(|&j| of(&boxes[j as usize])).fold(f64::NEG_INFINITY, larger)
            };
            strips.push(Strip {
                places: begin..begin + strip.len(),
                south_m,
                north_m: most(|b| b.north.hi()),
                widest_m: most(|b| up(b.east.hi() - b.east.lo())),
            });
            begin += strip.len();
        }
        let everything = boxes.iter().copied().fold(Box2::EMPTY, Box2::hull);
        let mut order_of = vec![0u32; boxes.len()];
        if !boxes.is_empty() {
            for (order, j) in (0..).zip(index.meeting(everything)) {
                order_of[j] = order;
            }
        }
        Self {
            strips,
            boxes: landmark.iter().map(|&j| boxes[j as usize]).collect(),
            order: landmark.iter().map(|&j| order_of[j as usize]).collect(),
            landmark,
            tallest_m: boxes.iter().map(|b| up(b.north.hi() - b.north.lo())).fold(0.0, larger),
            each,
            near: OnceLock::new(),
        }
    }

    /// The box at a place in the strips.
    #[inline]
    pub fn box_at(&self, place: usize) -> Box2 {
        self.boxes[place]
    }

    /// The number of the landmark at a place in the strips.
    #[inline]
    pub fn landmark_at(&self, place: usize) -> usize {
        self.landmark[place] as usize
    }

    /// When the R-tree would have given the landmark at a place.
    #[inline]
    pub fn order(&self, place: usize) -> u32 {
        self.order[place]
    }

    /// Number of landmarks.
    pub fn len(&self) -> usize {
        self.boxes.len()
    }

    /// Number of strips.
    pub fn count(&self) -> usize {
        self.strips.len()
    }

    /// The places of strip number `strip`.
    pub fn places(&self, strip: usize) -> Range<usize> {
        self.strips[strip].places.clone()
    }

    /// From the southernmost to the northernmost point of the boxes of strip number `strip`.
    pub fn north_of(&self, strip: usize) -> Interval {
        let Strip { south_m, north_m, .. } = self.strips[strip];
        Interval::new(south_m[0], north_m)
    }

    /// Width of the widest box of strip number `strip`, metres, rounded up.
    pub fn widest_m(&self, strip: usize) -> f64 {
        self.strips[strip].widest_m
    }

    /// The place in strip number `strip` from where on west edges are at least `west_m`.
    pub fn first_from(&self, strip: usize, west_m: f64) -> usize {
        let Range { start, end } = self.strips[strip].places;
        start + self.boxes[start..end].partition_point(|b| b.east.lo() < west_m)
    }

    /// The strip of a place.
    #[inline]
    pub fn strip_of(&self, place: usize) -> usize {
        place / self.each
    }

    /// The places of every pair of boxes at most `apart_m` from each other along both axes, once each, and of some
    /// that are farther apart; none when that far has not been worked out, because there are too many.
    pub fn near_pairs(&self, apart_m: f64) -> Option<impl Iterator<Item = [usize; 2]> + '_> {
        let near = self.near.get_or_init(|| {
            (0..NEAR_HALVINGS)
                .find_map(|times| self.all_near(NEAR_REACH_M / f64::from(1u32 << times)))
                .unwrap_or_default()
        });
        // The millimetre covers the rounding of the distances, here and in the join.
        let wanted_m = apart_m + 1e-3;
        let bands = (wanted_m < near.reach_m - 1e-3).then(|| near.band(wanted_m) + 1)?;
        Some(near.bands[..bands].iter().flatten().map(|pair| pair.map(|place| place as usize)))
    }

    /// All pairs up to `reach_m`, unless they are too many.
    fn all_near(&self, reach_m: f64) -> Option<NearPairs> {
        let mut near = NearPairs { reach_m, bands: vec![Vec::new(); NEAR_BANDS] };
        let all: Vec<Range<usize>> = self.strips.iter().map(|strip| strip.places.clone()).collect();
        let reach = Interval::around(0.0, reach_m);
        let mut count = 0;
        // One of the two does not begin farther west: half of the window is enough.
        let eastward = Box2 { east: Interval::new(0.0, reach.hi()), north: reach };
        self.join(&all, eastward, |a, b| {
            let (first, second) = (self.boxes[a], self.boxes[b]);
            let west = [first.east.lo(), second.east.lo()];
            if west[0] < west[1] || west[0] == west[1] && a < b {
                let north_m =
                    larger(second.north.lo() - first.north.hi(), first.north.lo() - second.north.hi());
                let apart_m = larger(second.east.lo() - first.east.hi(), north_m);
                let short = |place: usize| u32::try_from(place).expect("fewer than 2³² landmarks");
                let band = near.band(apart_m);
                near.bands[band].push([short(a), short(b)]);
                count += 1;
            }
            count <= NEAR_PER_BOX * self.boxes.len()
        });
        (count <= NEAR_PER_BOX * self.boxes.len()).then_some(near)
    }

    /// Numbers of the strips that may have boxes between two northings.
    fn meeting_strips(&self, north: Interval) -> impl Iterator<Item = usize> + '_ {
        let south_m = down(north.lo() - self.tallest_m);
        let first = self.strips.partition_point(|strip| strip.south_m[1] < south_m);
        (first..self.strips.len())
            .take_while(move |&strip| self.strips[strip].south_m[0] <= north.hi())
            .filter(move |&strip| self.strips[strip].north_m >= north.lo())
    }

    /// Calls `found` with the place of every box that meets `query`.
    pub fn for_each_meeting(&self, query: Box2, mut found: impl FnMut(usize)) {
        for strip in self.meeting_strips(query.north) {
            self.scan(self.first_meeting(strip, query)..self.strips[strip].places.end, query, &mut found);
        }
    }

    /// Calls `found` with the place of every box that meets `query` and is not in `except`, one range for each strip.
    pub fn for_each_meeting_outside(
        &self,
        except: &[Range<usize>],
        query: Box2,
        mut found: impl FnMut(usize),
    ) {
        for strip in self.meeting_strips(query.north) {
            let Range { start, end } = except[strip];
            let first = self.first_meeting(strip, query);
            let last = self.strips[strip].places.end;
            if start < end {
                self.scan(first..start, query, &mut found);
                self.scan(first.max(end)..last, query, &mut found);
            } else {
                self.scan(first..last, query, &mut found);
            }
        }
    }

    /// The first place of a strip whose box may meet `query`.
    fn first_meeting(&self, strip: usize, query: Box2) -> usize {
        self.first_from(strip, down(query.east.lo() - self.strips[strip].widest_m))
    }

    /// Calls `found` with the places of a strip's `range` whose boxes meet `query`.
    fn scan(&self, range: Range<usize>, query: Box2, mut found: impl FnMut(usize)) {
        for place in range {
            let b = self.boxes[place];
            if b.east.lo() > query.east.hi() {
                break;
            }
            if !b.intersection(query).is_empty() {
                found(place);
            }
        }
    }

    /// The landmarks whose boxes meet `query`, in the order of the R-tree, into `places`.
    pub fn meeting(&self, query: Box2, places: &mut Vec<usize>) {
        places.clear();
        self.for_each_meeting(query, |place| places.push(place));
        places.sort_unstable_by_key(|&place| self.order[place]);
    }

    /// Calls `found` with a place of `firsts` (one range for each strip), and the place of a box that meets the
    /// first's box ⊕ `window`, for all such pairs, until it answers `false`. The window's ends must have the caller's
    /// allowance for the rounding of that sum.
    ///
    /// One pass over each pair of strips: west edges only grow from one place to the next, and so do the places where
    /// their windows begin.
    pub fn join(&self, firsts: &[Range<usize>], window: Box2, mut found: impl FnMut(usize, usize) -> bool) {
        for (own, range) in firsts.iter().enumerate().filter(|(_, range)| !range.is_empty()) {
            for strip in self.meeting_strips(self.north_of(own) + window.north) {
                let Strip { places, south_m, north_m, widest_m } = &self.strips[strip];
                let west_m = |place: usize| self.boxes[place].east.lo() + window.east.lo() - widest_m;
                let mut next = self.first_from(strip, west_m(range.start));
                for first in range.clone() {
                    let b = self.boxes[first];
                    let (south, north) = (b.north.lo() + window.north.lo(), b.north.hi() + window.north.hi());
                    if north < south_m[0] || south > *north_m {
                        continue;
                    }
                    let from = west_m(first);
                    while next < places.end && self.boxes[next].east.lo() < from {
                        next += 1;
                    }
                    let (west, east) = (b.east.lo() + window.east.lo(), b.east.hi() + window.east.hi());
                    for (place, other) in (next..).zip(&self.boxes[next..places.end]) {
                        if other.east.lo() > east {
                            break;
                        }
                        let meets =
                            other.east.hi() >= west && other.north.lo() <= north && other.north.hi() >= south;
                        if meets && !found(first, place) {
                            return;
                        }
                    }
                }
            }
        }
    }
}

impl NearPairs {
    /// The band of a distance; 0 for boxes that overlap.
    fn band(&self, apart_m: f64) -> usize {
        // A conversion to an integer takes what is below 0 to 0.
        ((apart_m / self.reach_m * NEAR_BANDS as f64) as usize).min(NEAR_BANDS - 1)
    }
}

#[cfg(test)]
#[path = "strips_tests.rs"]
mod tests;
