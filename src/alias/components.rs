//! Triangles that share an edge belong together: the components of the agreement graph.
//!
//! *Mirror images.* (i→j) agrees with (i′→j′) exactly when (j→i) agrees with (j′→i′): every component has a mirror image,
//! which is the same pair of grounds seen from the other one. Only one of each triangle and its image is given here.
//! Union-find with parity puts the two back together: the parity of a triangle says whether it belongs to the component
//! as given or as its image. Where a triangle belongs both ways the component is its own image.

use rayon::prelude::*;

use super::tolerance::is_own_mirror;
use super::triangles::{Match, Triangle, mirrored};

/// One component of the agreement graph: matches held together by triangles that share edges.
#[derive(Clone, Debug, PartialEq)]
pub struct Component {
    /// Number of the window of turns in which it was found (0: at most 5° either way).
    pub window: usize,
    /// Its nodes: landmark and the one that it may be taken for, by their numbers, in order.
    pub matches: Vec<Match>,
    /// Its triangles: three matches of which every two agree.
    pub triangles: Vec<Triangle>,
}

impl Component {
    /// The most landmarks that can be matched one to one.
    pub(super) fn most(&self) -> usize {
        let (first, second) = (self.side(|m| m.0), self.side(|m| m.1));
        if first.len() < second.len() { first.len() } else { second.len() }
    }

    /// Number of landmarks that occur on both sides.
    pub(super) fn common(&self) -> usize {
        let second = self.side(|m| m.1);
        self.side(|m| m.0).iter().filter(|i| second.binary_search(i).is_ok()).count()
    }

    fn side(&self, of: fn(&Match) -> u32) -> Vec<u32> {
        let mut side: Vec<u32> = self.matches.iter().map(of).collect();
        side.sort_unstable();
        side.dedup();
        side
    }
}

/// An edge without its first landmark, and the triangle that it belongs to.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
struct Side {
    j: u32,
    i2: u32,
    j2: u32,
    /// Number of the triangle, shifted by one bit; the lowest bit says that the triangle has the image of the edge.
    triangle: u32,
}

/// The components of `landmarks` landmarks, in order of their first triangles. In a window that
/// is its own mirror the triangles are one of each and its image.
pub(super) fn components(triangles: &[Triangle], landmarks: usize, window: usize) -> Vec<Component> {
    let is_own_mirror = is_own_mirror(window);
    let mut forest = Forest::new(triangles.len());
    join(triangles, landmarks, is_own_mirror, &mut forest);
    let mut place: Vec<u32> = vec![u32::MAX; triangles.len()];
    let mut found: Vec<Vec<Triangle>> = Vec::new();
    for (t, triangle) in triangles.iter().enumerate() {
        let (root, is_image) = forest.root(t as u32);
        if place[root as usize] == u32::MAX {
            place[root as usize] = found.len() as u32;
            found.push(Vec::new());
        }
        let of = &mut found[place[root as usize] as usize];
        if forest.is_both[root as usize] {
            of.extend([*triangle, mirrored(triangle)]);
        } else {
            of.push(if is_image { mirrored(triangle) } else { *triangle });
        }
    }
    found.into_par_iter().map(|triangles| component(triangles, window)).collect()
}

fn component(mut triangles: Vec<Triangle>, window: usize) -> Component {
    let nodes = |triangles: &[Triangle]| {
        let mut matches: Vec<Match> = triangles.iter().flatten().copied().collect();
        matches.sort_unstable();
        matches.dedup();
        matches
    };
    let mut matches = nodes(&triangles);
    if is_own_mirror(window) {
        // Of the two views the one that comes first in the order of the landmarks.
        let mut image: Vec<Match> = matches.iter().map(|&(i, j)| (j, i)).collect();
        image.sort_unstable();
        if image < matches {
            matches = image;
            triangles = triangles.iter().map(mirrored).collect();
        }
    }
    triangles.sort_unstable();
    triangles.dedup();
    Component { window, matches, triangles }
}

/// Unites the triangles that share an edge.
fn join(triangles: &[Triangle], landmarks: usize, is_own_mirror: bool, forest: &mut Forest) {
    // Edges are put into one bucket for each first landmark, so that only small pieces have to be sorted.
    let edges = |triangle: &Triangle| {
        let [u, v, w] = *triangle;
        [(u, v), (u, w), (v, w)].map(|edge| if is_own_mirror { canonical(edge) } else { (edge, false) })
    };
    let mut begins = vec![0usize; landmarks + 1];
    for triangle in triangles {
        for (((i, _), _), _) in edges(triangle) {
            begins[i as usize + 1] += 1;
        }
    }
    for k in 1..begins.len() {
        begins[k] += begins[k - 1];
    }
    let mut next = begins.clone();
    let mut sides = vec![Side { j: 0, i2: 0, j2: 0, triangle: 0 }; 3 * triangles.len()];
    for (t, triangle) in triangles.iter().enumerate() {
        for (((i, j), (i2, j2)), is_image) in edges(triangle) {
            let at = &mut next[i as usize];
            sides[*at] = Side { j, i2, j2, triangle: (t as u32) << 1 | u32::from(is_image) };
            *at += 1;
            if is_own_mirror && i == j2 && j == i2 {
                forest.mark(t as u32);
            }
        }
    }
    let mut rest = sides.as_mut_slice();
    let mut buckets: Vec<&mut [Side]> = Vec::with_capacity(landmarks);
    for bounds in begins.windows(2) {
        let (bucket, after) = rest.split_at_mut(bounds[1] - bounds[0]);
        buckets.push(bucket);
        rest = after;
    }
    buckets.par_iter_mut().for_each(|bucket| bucket.sort_unstable());
    for bucket in buckets {
        for pair in bucket.windows(2) {
            let (a, b) = (pair[0], pair[1]);
            if (a.j, a.i2, a.j2) == (b.j, b.i2, b.j2) {
                forest.unite(a.triangle >> 1, b.triangle >> 1, (a.triangle ^ b.triangle) & 1 == 1);
            }
        }
    }
}

/// The first in order of an edge and its mirror image, and whether it is the image.
fn canonical(edge: (Match, Match)) -> ((Match, Match), bool) {
    let ((i, j), (i2, j2)) = edge;
    let image = if j < j2 { ((j, i), (j2, i2)) } else { ((j2, i2), (j, i)) };
    if image < edge { (image, true) } else { (edge, false) }
}

/// Union-find with parity.
struct Forest {
    /// Parent, shifted by one bit; the lowest bit is the parity against the parent.
    parents: Vec<u32>,
    /// Whether the component of a root belongs both ways.
    is_both: Vec<bool>,
}

impl Forest {
    fn new(count: usize) -> Self {
        Self { parents: (0..count as u32).map(|t| t << 1).collect(), is_both: vec![false; count] }
    }

    fn root(&mut self, t: u32) -> (u32, bool) {
        let (mut at, mut odd) = (t, 0);
        loop {
            let parent = self.parents[at as usize];
            if parent >> 1 == at {
                return (at, odd == 1);
            }
            // Halve the path on the way.
            let above = self.parents[(parent >> 1) as usize];
            self.parents[at as usize] = above ^ (parent & 1);
            odd ^= self.parents[at as usize] & 1;
            at = above >> 1;
        }
    }

    fn unite(&mut self, a: u32, b: u32, is_odd: bool) {
        let ((a, odd_a), (b, odd_b)) = (self.root(a), self.root(b));
        let is_odd = is_odd ^ odd_a ^ odd_b;
        if a == b {
            self.is_both[a as usize] |= is_odd;
            return;
        }
        // The smaller number is the root, so that results do not depend on the order of uniting.
        let (low, high) = if a < b { (a, b) } else { (b, a) };
        self.parents[high as usize] = low << 1 | u32::from(is_odd);
        self.is_both[low as usize] |= self.is_both[high as usize];
    }

    fn mark(&mut self, t: u32) {
        let (root, _) = self.root(t);
        self.is_both[root as usize] = true;
    }
}
