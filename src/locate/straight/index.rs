//! Two indexes of the map: landmarks by place, and pairs of landmarks by the vector from one to the other.
//!
//! Both answer a query with everything that meets it and perhaps more; the caller tests. Order depends on the map alone.

use crate::frame::LocalPoint;
use crate::interval::{larger, smaller};
use crate::locate::cell::{DIRECTIONS, EAST, HALF, NORTH, Reaches};

/// Most pairs kept (16 bytes each).
const PAIRS_MAX: usize = 12_000_000;

/// Side of a square of the grid of vectors, metres.
const VECTOR_CELL_M: f64 = 5.0;

/// Below this reach the index is given up, metres.
const REACH_LEAST_M: f64 = 5.0;

/// Rounding of the stored vectors (binary32, below 1 mm at 10 km) and of the query, metres.
pub(super) const VECTOR_SLACK_M: f64 = 2e-3;

/// Items in numbered bins, bin after bin.
#[derive(Debug)]
struct Bins<T> {
    starts: Vec<u32>,
    items: Vec<T>,
}

impl<T: Copy> Bins<T> {
    const EMPTY: Self = Self { starts: Vec::new(), items: Vec::new() };

    /// From the number of items in each bin and a source that gives every item with its bin.
    fn new(counts: &[u32], blank: T, give: impl FnOnce(&mut dyn FnMut(usize, T))) -> Self {
        let mut starts = Vec::with_capacity(counts.len() + 1);
        starts.push(0);
        for count in counts {
            starts.push(starts[starts.len() - 1] + count);
        }
        let mut items = vec![blank; starts[counts.len()] as usize];
        let mut next = starts.clone();
        give(&mut |bin, item| {
            items[next[bin] as usize] = item;
            next[bin] += 1;
        });
        Self { starts, items }
    }

    /// The items of the bins from `first` to `last`.
    #[inline]
    fn of(&self, first: usize, last: usize) -> &[T] {
        &self.items[self.starts[first] as usize..self.starts[last + 1] as usize]
    }
}

/// Points on a square grid.
#[derive(Debug)]
pub(super) struct PointGrid {
    west_m: f64,
    south_m: f64,
    cell_m: f64,
    columns: usize,
    rows: usize,
    bins: Bins<u32>,
}

impl PointGrid {
    /// About one point in a square.
    pub fn new(points: &[LocalPoint]) -> Self {
        let ends = |of: fn(&LocalPoint) -> f64| {
            let low = points.iter().map(of).reduce(smaller).unwrap_or(0.0);
            (low, points.iter().map(of).reduce(larger).unwrap_or(0.0) - low)
        };
        let ((west_m, width_m), (south_m, height_m)) = (ends(|p| p.east_m), ends(|p| p.north_m));
        let count = (points.len() as f64).clamp(1.0, f64::INFINITY);
        // The second bound keeps a row of points from making a grid of very many squares.
        let cell_m = larger(
            larger(libm::sqrt(width_m * height_m / count), larger(width_m, height_m) / (4.0 * count)),
            1e-3,
        );
        let side = |length_m: f64| (length_m / cell_m).floor() as usize + 1;
        let (columns, rows) = (side(width_m), side(height_m));
        let mut grid = Self { west_m, south_m, cell_m, columns, rows, bins: Bins::EMPTY };
        let bins: Vec<usize> =
            points.iter().map(|p| grid.row(p.north_m) * columns + grid.column(p.east_m)).collect();
        let mut counts = vec![0; columns * rows];
        for &bin in &bins {
            counts[bin] += 1;
        }
        grid.bins = Bins::new(&counts, 0, |put| {
            for (number, &bin) in (0..).zip(&bins) {
                put(bin, number);
            }
        });
        grid
    }

    fn column(&self, east_m: f64) -> usize {
        // The cast takes what lies west of the grid to 0.
        (((east_m - self.west_m) / self.cell_m) as usize).min(self.columns - 1)
    }

    fn row(&self, north_m: f64) -> usize {
        (((north_m - self.south_m) / self.cell_m) as usize).min(self.rows - 1)
    }

    /// Calls `found` with every point in the box, and some near it.
    #[inline]
    pub fn for_each(&self, low: LocalPoint, high: LocalPoint, mut found: impl FnMut(u32)) {
        let (first, last) = (self.column(low.east_m), self.column(high.east_m));
        for row in self.row(low.north_m)..=self.row(high.north_m) {
            let begin = row * self.columns;
            for &number in self.bins.of(begin + first, begin + last) {
                found(number);
            }
        }
    }
}

/// A pair of landmarks and the vector from the first to the second, metres.
#[derive(Clone, Copy, Debug)]
struct Pair {
    first: u32,
    second: u32,
    east_m: f32,
    north_m: f32,
}

/// All ordered pairs of landmarks within reach of each other, each landmark paired with itself too, on a grid of the
/// vectors from the first to the second.
#[derive(Debug)]
pub(super) struct PairIndex {
    /// Half the side of the square of vectors that the index holds, metres.
    reach_m: f64,
    side: usize,
    bins: Bins<Pair>,
}

impl PairIndex {
    /// Pairs up to `wanted_m` apart along each axis, or as far as the limit on their number allows.
    pub fn new(points: &[LocalPoint], grid: &PointGrid, wanted_m: f64) -> Self {
        let mut reach_m = wanted_m;
        while reach_m > REACH_LEAST_M {
            let side = (2.0 * reach_m / VECTOR_CELL_M).floor() as usize + 1;
            let mut index = Self { reach_m, side, bins: Bins::EMPTY };
            let mut counts = vec![0u32; side * side];
            let mut total = 0;
            let is_whole = for_each_pair(points, grid, reach_m, |pair| {
                counts[index.bin(&pair)] += 1;
                total += 1;
                total <= PAIRS_MAX
            });
            if is_whole {
                let blank = Pair { first: 0, second: 0, east_m: 0.0, north_m: 0.0 };
                index.bins = Bins::new(&counts, blank, |put| {
                    for_each_pair(points, grid, reach_m, |pair| {
                        put(index.bin(&pair), pair);
                        true
                    });
                });
                return index;
            }
            reach_m *= 0.8;
        }
        // So many landmarks in one place that their pairs are of no use: the index reaches nowhere.
        Self { reach_m: 0.0, side: 0, bins: Bins::EMPTY }
    }

    fn bin(&self, pair: &Pair) -> usize {
        self.line(f64::from(pair.north_m)) * self.side + self.line(f64::from(pair.east_m))
    }

    /// Column or row of a coordinate.
    fn line(&self, x: f64) -> usize {
        (((x + self.reach_m) / VECTOR_CELL_M) as usize).min(self.side - 1)
    }

    /// Calls `found` with the pairs whose first landmark is wanted and whose vector v has dᵢ·v ≤ `most`ᵢ in every
    /// direction (a little more are found, none less), until it answers `false`. `None` when the index does not reach
    /// that far: then nothing was called.
    pub fn for_each(
        &self,
        most: &Reaches,
        wants: impl Fn(u32) -> bool,
        mut found: impl FnMut(u32, u32) -> bool,
    ) -> Option<()> {
        let most = most.map(|reach| reach + 5.0 * VECTOR_SLACK_M);
        let (low, high) = ends(&most);
        let (west_m, east_m, south_m, north_m) = (low.east_m, high.east_m, low.north_m, high.north_m);
        let reach_m = self.reach_m - VECTOR_SLACK_M;
        if west_m < -reach_m || east_m > reach_m || south_m < -reach_m || north_m > reach_m {
            return None;
        }
        if west_m > east_m || south_m > north_m {
            return Some(());
        }
        for row in self.line(south_m)..=self.line(north_m) {
            let begin = row * self.side;
            for pair in self.bins.of(begin + self.line(west_m), begin + self.line(east_m)) {
                if !wants(pair.first) {
                    continue;
                }
                let (e, n) = (f64::from(pair.east_m), f64::from(pair.north_m));
                let keeps = |i: usize| {
                    let along = DIRECTIONS[i][0] * e + DIRECTIONS[i][1] * n;
                    (along <= most[i]) & (-along <= most[i + HALF])
                };
                // Most vectors fail along an axis or a diagonal.
                if !(0..4).fold(true, |all, k| all & keeps(k * (HALF / 4))) {
                    continue;
                }
                let is_within = (0..HALF).fold(true, |all, i| all & keeps(i));
                if is_within && !found(pair.first, pair.second) {
                    return Some(());
                }
            }
        }
        Some(())
    }
}

/// South-west and north-east end of a set given by its reaches.
pub(super) fn ends(reach: &Reaches) -> (LocalPoint, LocalPoint) {
    // Unit vectors, as a test of the cells holds them to.
    (LocalPoint::new(-reach[EAST + HALF], -reach[NORTH + HALF]), LocalPoint::new(reach[EAST], reach[NORTH]))
}

/// Calls `found` with all pairs within `reach_m` of each other along each axis until it answers `false`. Whether all
/// were given.
fn for_each_pair(
    points: &[LocalPoint],
    grid: &PointGrid,
    reach_m: f64,
    mut found: impl FnMut(Pair) -> bool,
) -> bool {
    for (first, p) in (0..).zip(points) {
        let low = LocalPoint::new(p.east_m - reach_m, p.north_m - reach_m);
        let high = LocalPoint::new(p.east_m + reach_m, p.north_m + reach_m);
        let mut goes_on = true;
        grid.for_each(low, high, |second| {
            let q = points[second as usize];
            let (east_m, north_m) = (q.east_m - p.east_m, q.north_m - p.north_m);
            if goes_on && east_m.abs() <= reach_m && north_m.abs() <= reach_m {
                goes_on = found(Pair { first, second, east_m: east_m as f32, north_m: north_m as f32 });
            }
        });
        if !goes_on {
            return false;
        }
    }
    true
}
