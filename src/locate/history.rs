//! Which state of an event stems from which state of the event before, and by which landmark.
//!
//! A solve that is recorded keeps a graph. Level 0 is the start: the search area, once per slice of the heading bias.
//! Level k holds the states of detection k. A **link** joins a state of level k − 1 to a state of level k and carries
//! the landmark that explains detection k, or nothing where the detection is left unexplained as a stray.
//!
//! *Guarantee.* Take any admissible history of positions p₀, p₁, … (one slice of the bias, each detection explained by
//! a landmark or left unexplained, at most the budget of the latter). The graph holds a chain of links, one per
//! detection, whose states hold p₀, p₁, … and whose landmarks are those of the history. *Proof* by induction, with
//! the chain's state at level k having no more strays than the history so far: p₀ lies in the search area. If the
//! history explains detection k by landmark j, then p_k lies in (cell ⊕ D) ∩ ([M_j] ⊕ −S), which is not empty, so the
//! solver made that child and its link. If the history leaves it unexplained, then the state has strays to spare, and
//! the solver made the child cell ⊕ D with one stray more. Where that child was dropped because another state of the
//! same slice with no more strays holds it, its link was turned to that state, landmark unchanged, and p_k lies there.
//! (So a link into a covering state may come from a state with more strays; it never joins different slices.)

use super::cell::{Cell, Reaches, mirrored};
use super::feasible::{Feasible, State};
use super::forward::SolverMap;
use super::steps::Look;

/// What a solve tells about where its states come from.
pub(super) trait Trail {
    /// Whether anything is kept of what is told.
    const IS_KEPT: bool = true;
    /// The states before the first event.
    fn start(&mut self, set: &Feasible);
    /// A state of the coming event was made, next in order, from state number `from` of the event before.
    fn child(&mut self, from: usize, landmark: Option<usize>);
    /// The states made so far were thinned out; state number i is now held by number `stands_for[i]`. Nothing changed
    /// when the list is empty.
    fn replaced(&mut self, stands_for: &[u32]);
    /// The event of step number `step` is complete.
    fn event(&mut self, step: usize, travel: &[Reaches], looks: &[Option<Look>], set: &Feasible);
}

/// Keeps nothing.
pub(super) struct NoTrail;

impl Trail for NoTrail {
    const IS_KEPT: bool = false;
    #[inline]
    fn start(&mut self, _: &Feasible) {}
    #[inline]
    fn child(&mut self, _: usize, _: Option<usize>) {}
    #[inline]
    fn replaced(&mut self, _: &[u32]) {}
    #[inline]
    fn event(&mut self, _: usize, _: &[Reaches], _: &[Option<Look>], _: &Feasible) {}
}

/// A link from a state of the level before.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Link {
    /// Number of the state at the level before.
    pub from: u32,
    /// Number of the state at this level.
    pub to: u32,
    /// Number of the landmark that explains the detection; none when it is left unexplained.
    pub landmark: Option<u32>,
}

/// One level of the graph. At level 0 there are only states.
#[derive(Clone, Debug, Default)]
pub(super) struct Level {
    /// Position of the detection among the steps.
    pub step: usize,
    /// Reaches of the travel since the level before, by slice.
    pub travel: Vec<Reaches>,
    /// The detection, by slice.
    pub looks: Vec<Option<Look>>,
    /// The states; a dropped one leaves a gap, so that numbers stay.
    pub states: Vec<Option<State>>,
    /// Links from the level before.
    pub links: Vec<Link>,
}

impl Level {
    /// The state of a number, unless dropped.
    pub fn state(&self, number: u32) -> Option<&State> {
        self.states[number as usize].as_ref()
    }
}

/// The recorded history of a solve.
///
/// Detections are numbered from 1, in the order of [`super::Outcome::events`]; number 0 is the start. A solve without a
/// single step records nothing, not even the start.
#[derive(Clone, Debug, Default)]
pub struct History {
    pub(super) levels: Vec<Level>,
    /// Links of the event that is being made.
    coming: Vec<Link>,
    made: u32,
}

impl Trail for History {
    fn start(&mut self, set: &Feasible) {
        let states = set.states.iter().copied().map(Some).collect();
        self.levels = vec![Level { states, ..Level::default() }];
    }

    fn child(&mut self, from: usize, landmark: Option<usize>) {
        let short = |number: usize| u32::try_from(number).expect("fewer than 2³² states and landmarks");
        self.coming.push(Link { from: short(from), to: self.made, landmark: landmark.map(short) });
        self.made += 1;
    }

    fn replaced(&mut self, stands_for: &[u32]) {
        if !stands_for.is_empty() {
            for link in &mut self.coming {
                link.to = stands_for[link.to as usize];
            }
        }
    }

    fn event(&mut self, step: usize, travel: &[Reaches], looks: &[Option<Look>], set: &Feasible) {
        self.made = 0;
        self.levels.push(Level {
            step,
            travel: travel.to_vec(),
            looks: looks.to_vec(),
            states: set.states.iter().copied().map(Some).collect(),
            links: std::mem::take(&mut self.coming),
        });
    }
}

/// What a detection may have been, as far as the surviving links tell.
///
/// *Guarantee.* While the bounds hold, the landmark that was really seen is among `landmarks`, or the detection was a
/// stray and `may_be_stray` is set.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Candidates {
    /// Numbers of the landmarks, ascending.
    pub landmarks: Vec<usize>,
    /// Whether some surviving explanation leaves the detection unexplained.
    pub may_be_stray: bool,
}

impl Candidates {
    /// The landmark, when nothing else is possible.
    pub fn identified(&self) -> Option<usize> {
        self.sole_landmark().filter(|_| !self.may_be_stray)
    }

    /// The landmark, if it is not a stray.
    pub fn sole_landmark(&self) -> Option<usize> {
        match self.landmarks[..] {
            [one] => Some(one),
            _ => None,
        }
    }

    /// Whether no landmark explains the detection.
    pub fn is_stray(&self) -> bool {
        self.may_be_stray && self.landmarks.is_empty()
    }
}

impl History {
    /// Number of detections recorded.
    pub fn detections(&self) -> usize {
        self.levels.len().saturating_sub(1)
    }

    /// The set at detection number `detection`, or at the start (0).
    ///
    /// *Guarantee.* While the bounds hold, it contains the true position there; after a sweep it also uses what was
    /// seen later.
    ///
    /// # Panics
    /// When there is no such detection.
    pub fn set(&self, detection: usize) -> Feasible {
        Feasible { states: self.levels[detection].states.iter().flatten().copied().collect() }
    }

    /// The states at detection number `detection`, or at the start (0). A state keeps its number through all sweeps;
    /// none stands where it was dropped; parts of a state that was split are added at the end.
    ///
    /// # Panics
    /// When there is no such detection.
    pub fn states(&self, detection: usize) -> &[Option<State>] {
        &self.levels[detection].states
    }

    /// What detection number `detection` (from 1) may have been.
    ///
    /// # Panics
    /// When there is no such detection.
    pub fn candidates(&self, detection: usize) -> Candidates {
        assert!(detection > 0, "the start is not a detection");
        let (before, level) = (&self.levels[detection - 1], &self.levels[detection]);
        let mut found = Candidates::default();
        let alive = level
            .links
            .iter()
            .filter(|link| before.state(link.from).is_some() && level.state(link.to).is_some());
        for link in alive {
            match link.landmark {
                Some(landmark) => found.landmarks.push(landmark as usize),
                None => found.may_be_stray = true,
            }
        }
        found.landmarks.sort_unstable();
        found.landmarks.dedup();
        found
    }

    /// The positions at a link's detection of all histories through the link: (cell ⊕ D) ∩ ([M_j] ⊕ −S), within the
    /// state it leads to. None when there are none.
    ///
    /// *Guarantee.* A history through the link has p_(k−1) in the first state's cell, p_k − p_(k−1) in D, sees
    /// landmark j from p_k, and has p_k in the second state's cell.
    pub(super) fn landing(&self, level: usize, link: &Link, map: &SolverMap) -> Option<Cell> {
        let here = &self.levels[level];
        let from = self.levels[level - 1].state(link.from)?;
        let to = here.state(link.to)?;
        let slice = usize::from(from.slice);
        let mut cell = from.cell.minkowski_sum(&here.travel[slice]);
        if let Some(landmark) = link.landmark {
            let look = here.looks[slice].as_ref().expect("a landmark explains only what can be explained");
            cell = cell.intersection(&map.vantage(landmark as usize, look))?;
        }
        cell.intersection(to.cell.reaches())
    }

    /// The positions at the detection before a link's of all histories through the link: cell ∩ (landing ⊕ −D), with
    /// `landing` from [`History::landing`]. None when there are none.
    ///
    /// *Guarantee.* A history through the link has p_(k−1) in the first state's cell, p_k in the landing, and
    /// p_(k−1) = p_k − (p_k − p_(k−1)) with the bracket in D.
    pub(super) fn origin(&self, level: usize, link: &Link, landing: &Cell) -> Option<Cell> {
        let from = self.levels[level - 1].state(link.from)?;
        let back = mirrored(&self.levels[level].travel[usize::from(from.slice)]);
        from.cell.intersection(landing.minkowski_sum(&back).reaches())
    }

    /// Steps (by position among those solved) whose travel leads to level `level`.
    pub(super) fn steps_to(&self, level: usize) -> std::ops::RangeInclusive<usize> {
        let first = if level == 1 { 0 } else { self.levels[level - 1].step + 1 };
        first..=self.levels[level].step
    }

    /// Whether nothing explains the detections: some set is empty. While the bounds hold, this never happens.
    pub fn is_contradicted(&self) -> bool {
        self.levels.iter().any(|level| level.states.iter().all(Option::is_none))
    }
}
