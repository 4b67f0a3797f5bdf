//! Triangles of the agreement graph: three landmarks and three others with all three separations in agreement.

use rayon::prelude::*;

use super::near::{Near, Neighbour, SeparationGrid};
use super::tolerance::{Separation, Tolerance, is_own_mirror};

/// A node of the agreement graph: a landmark and the one that it may be taken for.
pub type Match = (u32, u32);

/// Three matches that agree with each other, in order of their first landmarks.
pub type Triangle = [Match; 3];

/// Landmarks that are searched between two looks at the limit. One landmark may use this share of it, so that a batch
/// never holds more than the limit.
const BATCH: usize = 16;

/// The agreement graph of a map at one scale of the bounds and in one window of turns.
#[derive(Clone, Copy, Debug)]
pub(super) struct Agreement<'a> {
    near: &'a Near<'a>,
    there: Tolerance,
    back: Tolerance,
    /// Whether the mirror image of a triangle is one of the same graph.
    is_own_mirror: bool,
}

impl<'a> Agreement<'a> {
    pub(super) fn new(near: &'a Near<'a>, tolerance: Tolerance, window: usize) -> Self {
        Self { near, there: tolerance, back: tolerance.mirrored(), is_own_mirror: is_own_mirror(window) }
    }

    /// Whether the separations of (i→j) and (i′→j′) agree. Landmarks of one side must differ and be near each other.
    pub(super) fn joins(&self, (i, j): Match, (i2, j2): Match) -> bool {
        match (self.near.separation(i, i2), self.near.separation(j, j2)) {
            (Some(first), Some(second)) => {
                let boxes = sum(self.near.boxes_m(i, i2), self.near.boxes_m(j, j2));
                self.agrees((i, i2, first), (j, j2, second), boxes)
            }
            _ => false,
        }
    }

    /// The same whatever the distance, for matches of different landmarks on both sides.
    pub(super) fn joins_far(&self, (i, j): Match, (i2, j2): Match) -> bool {
        i != i2 && j != j2 && self.agrees_far((i, j), (i2, j2))
    }

    /// The same whatever the distance; a landmark may be taken twice.
    pub(super) fn agrees_far(&self, (i, j): Match, (i2, j2): Match) -> bool {
        let boxes = sum(self.near.boxes_m(i, i2), self.near.boxes_m(j, j2));
        self.agrees((i, i2, self.near.between(i, i2)), (j, j2, self.near.between(j, j2)), boxes)
    }

    /// Centre and half-width of the turns, radians.
    pub(super) fn turns(&self) -> (f64, f64) {
        self.there.turns()
    }

    /// How far from where the turned separation leads an agreeing landmark may lie, for separations of at most `length_m`
    /// on the first side, whatever the boxes.
    pub(super) fn search_m(&self, length_m: f64) -> f64 {
        let boxes = self.near.widest_boxes_m().map(|widest| 2.0 * widest);
        // The separation on the other side is longer by what is searched for: one round more holds it, since the
        // tolerance grows by far less than a metre for each metre.
        let once = self.there.search_m(length_m, boxes);
        self.there.search_m(length_m + 2.0 * once, boxes)
    }

    /// The same for separations at hand. One of the two orders is always asked, so that (i→j),(i′→j′) and the mirrored
    /// (j→i),(j′→i′) have the same answer to the last digit.
    #[inline]
    fn agrees(
        &self,
        (i, i2, first): (u32, u32, Separation),
        (j, j2, second): (u32, u32, Separation),
        boxes_m: [f64; 2],
    ) -> bool {
        if unordered(i, i2) <= unordered(j, j2) {
            self.there.agrees(first, second, boxes_m)
        } else {
            self.back.agrees(second, first, boxes_m)
        }
    }

    /// All triangles, or as many as were found when there were more than `most`; and whether these are all. In a window
    /// that is its own mirror only one of each triangle and its mirror image is found: the canonical one.
    pub(super) fn triangles(&self, grid: &SeparationGrid, most: usize) -> (Vec<Triangle>, bool) {
        let count = self.near.len();
        let share = most / BATCH;
        let mut found: Vec<Triangle> = Vec::new();
        for start in (0..count).step_by(BATCH) {
            let batch = start..smaller_count(start + BATCH, count);
            let parts: Vec<Vec<Triangle>> = batch
                .into_par_iter()
                .map(|i| {
                    let mut of_i = Vec::new();
                    for second in self.near.of(i as u32).iter().filter(|n| n.number as usize > i) {
                        self.over(i as u32, second, grid, share, &mut of_i);
                    }
                    of_i
                })
                .collect();
            let is_full = parts.iter().any(|part| part.len() > share);
            for part in parts {
                found.extend(part);
            }
            if is_full || found.len() > most {
                found.truncate(most);
                return (found, false);
            }
        }
        (found, true)
    }

    /// The triangles over the separation from landmark `i` to `second`; third landmarks come after both.
    /// Ends when `found` holds more than `most`.
    fn over(
        &self,
        i: u32,
        second: &Neighbour,
        grid: &SeparationGrid,
        most: usize,
        found: &mut Vec<Triangle>,
    ) {
        let i2 = second.number;
        let thirds: Vec<Third> = self
            .near
            .of(i)
            .iter()
            .filter(|n| n.number > i2)
            .filter_map(|n| {
                let boxes_first = self.near.boxes_m(i, n.number);
                Some(Third {
                    number: n.number,
                    turned: self.there.turned(n.separation),
                    reach_m: self
                        .there
                        .search_m(grid.separation_max_m(), sum(boxes_first, self.near.widest_boxes_m())),
                    from_first: n.separation,
                    boxes_first,
                    from_second: self.near.separation(i2, n.number)?,
                    boxes_second: self.near.boxes_m(i2, n.number),
                })
            })
            .collect();
        if thirds.is_empty() {
            return;
        }
        let own_boxes = self.near.boxes_m(i, i2);
        let widest = self.near.widest_boxes_m();
        let reach = self.there.search_m(grid.separation_max_m(), sum(own_boxes, widest));
        let turned = self.there.turned(second.separation);
        for pair in grid.around(turned, reach).flatten() {
            let (j, j2) = (pair.from, pair.to);
            if is_beyond(turned, pair.separation, reach) {
                continue;
            }
            // With a landmark before i on the other side the mirror image is the canonical one.
            if i == j || i2 == j2 || (self.is_own_mirror && (j < i || j2 < i)) {
                continue;
            }
            if !self.agrees(
                (i, i2, second.separation),
                (j, j2, pair.separation),
                sum(own_boxes, pair.boxes_m),
            ) {
                continue;
            }
            for third in &thirds {
                self.close([(i, j), (i2, j2)], third, found);
            }
            if found.len() > most {
                return;
            }
        }
    }

    /// The triangles that a third landmark makes with an edge.
    fn close(&self, [(i, j), (i2, j2)]: [Match; 2], third: &Third, found: &mut Vec<Triangle>) {
        let i3 = third.number;
        for other in self.near.of(j) {
            let j3 = other.number;
            if is_beyond(third.turned, other.separation, third.reach_m)
                || j3 == i3
                || j3 == j2
                || (self.is_own_mirror && j3 < i)
            {
                continue;
            }
            let boxes = sum(third.boxes_first, self.near.boxes_m(j, j3));
            if !self.agrees((i, i3, third.from_first), (j, j3, other.separation), boxes) {
                continue;
            }
            let Some(opposite) = self.near.separation(j2, j3) else { continue };
            let boxes = sum(third.boxes_second, self.near.boxes_m(j2, j3));
            if self.agrees((i2, i3, third.from_second), (j2, j3, opposite), boxes) {
                let triangle = [(i, j), (i2, j2), (i3, j3)];
                if !self.is_own_mirror || triangle <= mirrored(&triangle) {
                    found.push(triangle);
                }
            }
        }
    }
}

/// A landmark near both ends of a separation.
struct Third {
    number: u32,
    /// Separation from the first landmark, turned by the centre of the window, and how far an agreeing one may be off.
    turned: (f64, f64),
    reach_m: f64,
    from_first: Separation,
    boxes_first: [f64; 2],
    from_second: Separation,
    boxes_second: [f64; 2],
}

/// The triangle seen from the other side.
pub(super) fn mirrored(triangle: &Triangle) -> Triangle {
    let mut mirrored = triangle.map(|(i, j)| (j, i));
    mirrored.sort_unstable();
    mirrored
}

/// Whether a separation is farther than `reach_m` from a point: a quick no before the exact test.
#[inline]
fn is_beyond((east_m, north_m): (f64, f64), separation: Separation, reach_m: f64) -> bool {
    let (e, n) = (separation.east_m - east_m, separation.north_m - north_m);
    e * e + n * n > reach_m * reach_m
}

fn smaller_count(a: usize, b: usize) -> usize {
    if a < b { a } else { b }
}

fn unordered(a: u32, b: u32) -> (u32, u32) {
    if a < b { (a, b) } else { (b, a) }
}

fn sum(a: [f64; 2], b: [f64; 2]) -> [f64; 2] {
    [a[0] + b[0], a[1] + b[1]]
}
