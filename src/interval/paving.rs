//! Set inversion by bisection: a set in the plane between an inner and an outer pile of boxes.
//!
//! *Guarantee.* With a test that answers truly, the inner boxes lie wholly inside the set, the outside boxes wholly
//! outside, and what is left undecided is called boundary. So the set lies between the inner boxes and the inner
//! and boundary boxes together, and its area lies between theirs.
//!
//! *Proof.* The start box is undecided at first. A step takes one undecided box and either moves it to the inner or
//! outside pile on the test's word, or puts its two halves in its place. The halves share the cut and together are
//! the box. So at any time the three piles cover the start box and meet only along edges, which have no area;
//! stopping early leaves more boundary and moves no other box.
//!
//! *References.* [`crate::bibliography::JAULIN_WALTER_1993`].

use std::collections::VecDeque;

use super::{Box2, Interval};

/// What a test knows about a box and a set.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Verdict {
    /// Every point of the box is in the set.
    Inside,
    /// No point of the box is in the set.
    Outside,
    /// Neither is known.
    Unknown,
}

impl Verdict {
    /// For a set of points that meet at least `needed` conditions: `certain` of them hold in the whole box, and
    /// `possible` of them (the certain ones included) hold at some point or are not known to fail everywhere.
    ///
    /// *Proof.* Each point of the box meets at least the certain conditions and at most the possible ones.
    #[must_use]
    pub fn at_least(needed: usize, certain: usize, possible: usize) -> Self {
        if certain >= needed {
            Self::Inside
        } else if possible < needed {
            Self::Outside
        } else {
            Self::Unknown
        }
    }
}

/// A start box divided into boxes inside a set, outside it, and undecided.
#[derive(Clone, Debug, PartialEq)]
pub struct Paving {
    /// Boxes wholly inside the set.
    pub inner: Vec<Box2>,
    /// Boxes wholly outside.
    pub outside: Vec<Box2>,
    /// Boxes that were left undecided when the budget was spent.
    pub boundary: Vec<Box2>,
    /// Boxes tested.
    pub tested: usize,
}

/// A group of inner and boundary boxes that hang together, apart from all others.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Part {
    /// Smallest box that holds the group.
    pub outer: Box2,
    /// Smallest box that holds the group's inner boxes; empty when it has none.
    pub inner: Box2,
    /// Enclosure of the area of the set within the group.
    pub area: Interval,
}

/// Divides `start` until every box is decided or `budget` boxes have been tested.
///
/// Boxes are taken in the order in which they came, so that all are about equally large when the budget ends, and the
/// result depends on nothing else.
///
/// # Panics
/// When `start` is unbounded: it has no middle.
pub fn pave(start: Box2, budget: usize, verdict: impl Fn(Box2) -> Verdict) -> Paving {
    let mut paving = Paving { inner: Vec::new(), outside: Vec::new(), boundary: Vec::new(), tested: 0 };
    let mut undecided = VecDeque::new();
    if !start.is_empty() {
        undecided.push_back(start);
    }
    while paving.tested < budget {
        let Some(next) = undecided.pop_front() else { break };
        paving.tested += 1;
        match verdict(next) {
            Verdict::Inside => paving.inner.push(next),
            Verdict::Outside => paving.outside.push(next),
            Verdict::Unknown => match halves(next) {
                Some(both) => undecided.extend(both),
                None => paving.boundary.push(next),
            },
        }
    }
    paving.boundary.extend(undecided);
    paving
}

/// The box cut across its longer side; none when there is no number left to cut at.
fn halves(whole: Box2) -> Option<[Box2; 2]> {
    let cut = |side: Interval| {
        let middle = side.middle();
        (side.lo < middle && middle < side.hi)
            .then(|| [Interval::new(side.lo, middle), Interval::new(middle, side.hi)])
    };
    let across_east = || cut(whole.east).map(|sides| sides.map(|east| Box2 { east, ..whole }));
    let across_north = || cut(whole.north).map(|sides| sides.map(|north| Box2 { north, ..whole }));
    if whole.east.width() >= whole.north.width() {
        across_east().or_else(across_north)
    } else {
        across_north().or_else(across_east)
    }
}

/// Enclosure of the summed area of boxes, square metres where the sides are metres.
fn area_of<'a>(boxes: impl IntoIterator<Item = &'a Box2>) -> Interval {
    let side = |i: Interval| Interval::point(i.hi) - Interval::point(i.lo);
    let sum = boxes.into_iter().fold(Interval::ZERO, |sum, b| sum + side(b.east) * side(b.north));
    sum.intersection(Interval::new(0.0, f64::INFINITY))
}

impl Paving {
    /// Enclosure of the area of the inner boxes.
    pub fn inner_area(&self) -> Interval {
        area_of(&self.inner)
    }

    /// Enclosure of the area of the outside boxes.
    pub fn outside_area(&self) -> Interval {
        area_of(&self.outside)
    }

    /// Enclosure of the area of the boundary boxes.
    pub fn boundary_area(&self) -> Interval {
        area_of(&self.boundary)
    }

    /// Enclosure of the area of the set: from that of the inner boxes to that of inner and boundary boxes together.
    pub fn area(&self) -> Interval {
        let inner = self.inner_area();
        inner.hull(inner + self.boundary_area())
    }

    /// The groups of inner and boundary boxes that hang together, in the order of their western and southern sides.
    ///
    /// *Guarantee.* Groups are closed and apart, so each connected piece of the set lies within one of them: the set
    /// has at least as many pieces as there are groups with inner boxes, and none outside the groups.
    pub fn parts(&self) -> Vec<Part> {
        let mut boxes: Vec<(Box2, bool)> = self.inner.iter().map(|b| (*b, true)).collect();
        boxes.extend(self.boundary.iter().map(|b| (*b, false)));
        boxes.sort_by(|(a, _), (b, _)| {
            a.east.lo.total_cmp(&b.east.lo).then(a.north.lo.total_cmp(&b.north.lo))
        });
        let groups = groups_that_touch(&boxes);
        groups
            .into_iter()
            .map(|members| {
                let hull = |wanted: &dyn Fn(bool) -> bool| {
                    members
                        .iter()
                        .map(|i| boxes[*i])
                        .filter(|(_, is_inner)| wanted(*is_inner))
                        .fold(Box2::EMPTY, |hull, (b, _)| hull.hull(b))
                };
                let of_kind = |inner: bool| {
                    area_of(members.iter().map(|i| &boxes[*i]).filter(|(_, k)| *k == inner).map(|(b, _)| b))
                };
                let inner_area = of_kind(true);
                Part {
                    outer: hull(&|_| true),
                    inner: hull(&|is_inner| is_inner),
                    area: inner_area.hull(inner_area + of_kind(false)),
                }
            })
            .collect()
    }
}

/// Indices of boxes grouped by touching, for boxes in the order of their western sides. Groups come in the order of
/// their first member.
fn groups_that_touch(boxes: &[(Box2, bool)]) -> Vec<Vec<usize>> {
    let mut leader: Vec<usize> = (0..boxes.len()).collect();
    fn first(leader: &mut [usize], mut i: usize) -> usize {
        while leader[i] != i {
            leader[i] = leader[leader[i]];
            i = leader[i];
        }
        i
    }
    for (i, (one, _)) in boxes.iter().enumerate() {
        // Later boxes begin farther east: the first that begins beyond this one's eastern side ends the search.
        for (j, (other, _)) in boxes.iter().enumerate().skip(i + 1) {
            if other.east.lo > one.east.hi {
                break;
            }
            if !one.north.intersection(other.north).is_empty() {
                let (a, b) = (first(&mut leader, i), first(&mut leader, j));
                // The smaller index leads, so a group is found at its first member.
                leader[a.max(b)] = a.min(b);
            }
        }
    }
    let mut groups: Vec<Vec<usize>> = vec![Vec::new(); boxes.len()];
    for i in 0..boxes.len() {
        groups[first(&mut leader, i)].push(i);
    }
    groups.retain(|members| !members.is_empty());
    groups
}
