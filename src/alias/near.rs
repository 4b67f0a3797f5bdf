//! Landmarks near each other, and all separations sorted into a grid.

use super::tolerance::Separation;
use crate::interval::{Box2, larger, smaller};
use crate::map::Landmark;
use crate::map::index::LandmarkIndex;

/// A landmark near another one.
#[derive(Clone, Copy, Debug)]
pub(super) struct Neighbour {
    pub(super) number: u32,
    pub(super) separation: Separation,
}

/// For each landmark those within the longest separation, in order of their numbers.
#[derive(Debug)]
pub(super) struct Near<'a> {
    landmarks: &'a [Landmark],
    lists: Vec<Vec<Neighbour>>,
    widest_m: [f64; 2],
}

impl<'a> Near<'a> {
    pub(super) fn new(landmarks: &'a [Landmark], separation_max_m: f64) -> Self {
        // Boxes only grow what the index returns; charted positions decide.
        let index = LandmarkIndex::new(landmarks);
        let lists = landmarks
            .iter()
            .enumerate()
            .map(|(i, landmark)| {
                let around = Box2::around(landmark.position, separation_max_m, separation_max_m);
                let mut near: Vec<Neighbour> = index
                    .meeting(around)
                    .filter(|&j| j != i)
                    .map(|j| Neighbour { number: j as u32, separation: between(landmarks, i, j) })
                    .filter(|neighbour| neighbour.separation.length_m <= separation_max_m)
                    .collect();
                near.sort_unstable_by_key(|neighbour| neighbour.number);
                near
            })
            .collect();
        let widest_m = landmarks.iter().fold([0.0, 0.0], |[east, north]: [f64; 2], landmark| {
            [larger(east, landmark.half_width_east_m), larger(north, landmark.half_width_north_m)]
        });
        Self { landmarks, lists, widest_m }
    }

    /// The landmarks near landmark `i`.
    pub(super) fn of(&self, i: u32) -> &[Neighbour] {
        &self.lists[i as usize]
    }

    /// The separation from `i` to `j` when the two are near.
    pub(super) fn separation(&self, i: u32, j: u32) -> Option<Separation> {
        let list = self.of(i);
        list.binary_search_by_key(&j, |neighbour| neighbour.number).ok().map(|at| list[at].separation)
    }

    /// The separation from `i` to `j`, near or not.
    pub(super) fn between(&self, i: u32, j: u32) -> Separation {
        between(self.landmarks, i as usize, j as usize)
    }

    /// Sum of the half-widths of two landmarks, east and north, metres.
    pub(super) fn boxes_m(&self, i: u32, j: u32) -> [f64; 2] {
        let (a, b) = (&self.landmarks[i as usize], &self.landmarks[j as usize]);
        [a.half_width_east_m + b.half_width_east_m, a.half_width_north_m + b.half_width_north_m]
    }

    /// At least the sum of the half-widths of any two landmarks, east and north, metres.
    pub(super) fn widest_boxes_m(&self) -> [f64; 2] {
        self.widest_m.map(|half_width_m| 2.0 * half_width_m)
    }

    /// Number of landmarks.
    pub(super) fn len(&self) -> usize {
        self.lists.len()
    }
}

fn between(landmarks: &[Landmark], i: usize, j: usize) -> Separation {
    let (from, to) = (landmarks[i].position, landmarks[j].position);
    let (east_m, north_m) = (to.east_m - from.east_m, to.north_m - from.north_m);
    Separation { east_m, north_m, length_m: libm::hypot(east_m, north_m) }
}

/// One ordered pair of near landmarks in the grid.
#[derive(Clone, Copy, Debug)]
pub(super) struct Pair {
    pub(super) from: u32,
    pub(super) to: u32,
    pub(super) separation: Separation,
    pub(super) boxes_m: [f64; 2],
}

/// All ordered pairs of near landmarks by their separation.
#[derive(Debug)]
pub(super) struct SeparationGrid {
    cell_m: f64,
    low_m: f64,
    across: usize,
    /// Where each cell begins in `pairs`.
    begins: Vec<u32>,
    pairs: Vec<Pair>,
}

impl SeparationGrid {
    /// Sorts the pairs into square cells of `cell_m`.
    pub(super) fn new(near: &Near<'_>, separation_max_m: f64, cell_m: f64) -> Self {
        let across = (2.0 * separation_max_m / cell_m).ceil().clamp(1.0, 2000.0) as usize;
        let cell_m = 2.0 * separation_max_m / across as f64;
        let mut grid = Self {
            cell_m,
            low_m: -separation_max_m,
            across,
            begins: vec![0; across * across + 1],
            pairs: Vec::new(),
        };
        let all = || (0..near.len() as u32).flat_map(|from| near.of(from).iter().map(move |to| (from, to)));
        let cell = |s: &Separation| grid.index(s.north_m) * across + grid.index(s.east_m);
        let mut begins = vec![0u32; across * across + 1];
        for (_, to) in all() {
            begins[cell(&to.separation) + 1] += 1;
        }
        for k in 1..begins.len() {
            begins[k] += begins[k - 1];
        }
        let mut next = begins.clone();
        let empty = Separation { east_m: 0.0, north_m: 0.0, length_m: 0.0 };
        let mut pairs = vec![
            Pair { from: 0, to: 0, separation: empty, boxes_m: [0.0; 2] };
            begins[across * across] as usize
        ];
        for (from, to) in all() {
            let at = &mut next[cell(&to.separation)];
            pairs[*at as usize] = Pair {
                from,
                to: to.number,
                separation: to.separation,
                boxes_m: near.boxes_m(from, to.number),
            };
            *at += 1;
        }
        grid.begins = begins;
        grid.pairs = pairs;
        grid
    }

    /// Longest separation.
    pub(super) fn separation_max_m(&self) -> f64 {
        -self.low_m
    }

    fn index(&self, at_m: f64) -> usize {
        smaller((at_m - self.low_m) / self.cell_m, (self.across - 1) as f64).clamp(0.0, f64::INFINITY)
            as usize
    }

    /// Runs of pairs whose separations cover the square of half-side `reach_m` about a point.
    pub(super) fn around(
        &self,
        (east_m, north_m): (f64, f64),
        reach_m: f64,
    ) -> impl Iterator<Item = &[Pair]> {
        let (west, east) = (self.index(east_m - reach_m), self.index(east_m + reach_m));
        let (south, north) = (self.index(north_m - reach_m), self.index(north_m + reach_m));
        (south..=north).map(move |row| {
            let row = row * self.across;
            &self.pairs[self.begins[row + west] as usize..self.begins[row + east + 1] as usize]
        })
    }
}
