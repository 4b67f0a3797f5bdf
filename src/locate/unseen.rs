//! "Nothing seen" as evidence: a landmark that was certainly passed within the swath and was not detected.
//!
//! Used only where the user declares two things: detection inside the swath is certain, and the map is complete inside
//! a polygon (what is mapped there exists and has not moved). Then a position whose travel since the last sighting
//! leads the beam certainly across a mapped landmark contradicts the silence, unless that landmark is one of the g that
//! may be missed.
//!
//! *When is a passage certain?* For a cell C of positions at the last sighting, true headings Θ throughout the travel and
//! a landmark's box M, let the coordinates of M − p ahead of and abeam of the bow be evaluated over **all** p, θ ∈ Θ and
//! m ∈ M. The landmark was passed between the two sightings if
//!
//! 1. at the start it lies ahead of the beam, and at the end behind it, by more than the beam error allows (so neither
//!    of the two sightings can be of this landmark, and the beam crossed it strictly in between, because the bow and the
//!    position change continuously);
//! 2. throughout, it lies on one side, and its range stays within what the sonar sees at every altitude of the bounds;
//! 3. the sonar was not blind (no turn).
//!
//! *Guarantee.* A state is dropped only when more than g landmarks were certainly passed from **every** position of its
//! cell. Where one of the conditions cannot be shown, nothing is concluded. While the bounds hold and at most g
//! landmarks are missed, the true history is never dropped.

use super::cell::{Cell, DIRECTION_COUNT, Reaches, add_reaches};
use super::steps::RESOLUTION_M;
use crate::interval::{Box2, Interval, larger};
use crate::map::index::LandmarkIndex;
use crate::vehicle::{Sonar, SonarKind};

/// Widest range of true headings over a travel for which passages are looked for, radians: beyond it ahead and abeam
/// are no longer told apart.
const HEADING_RANGE_MAX_RAD: f64 = 0.35;

/// A travel without sightings, for one slice of the bias.
#[derive(Clone, Debug, PartialEq)]
pub struct Passage {
    /// True headings of the bow at every instant.
    pub heading: Interval,
    /// Reaches of conv{0, displacement} over every part of the travel.
    pub within: Reaches,
}

impl Passage {
    /// A travel of nothing.
    pub const NONE: Self = Self { heading: Interval::EMPTY, within: [0.0; DIRECTION_COUNT] };

    /// The passage over this travel and then over `next`.
    #[must_use]
    pub fn then(mut self, next: &Self) -> Self {
        self.heading = self.heading.hull(next.heading);
        add_reaches(&mut self.within, &next.within);
        self
    }
}

/// Largest miss budget: a state remembers which landmarks it missed, so that one that is passed twice counts once.
pub const MISSES_MAX: usize = 4;

/// The landmarks that a history certainly passed without detecting them, ascending; unused places hold `u32::MAX`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Missed([u32; MISSES_MAX]);

impl Missed {
    /// None so far.
    pub const NONE: Self = Self([u32::MAX; MISSES_MAX]);

    /// With landmark `j` as well; `None` when that makes more than `budget`.
    fn with(mut self, j: usize, budget: u8) -> Option<Self> {
        let j = u32::try_from(j).expect("fewer than 2^32 landmarks");
        if self.0.contains(&j) {
            return Some(self);
        }
        let count = self.0.iter().filter(|&&m| m != u32::MAX).count();
        if count >= usize::from(budget).clamp(0, MISSES_MAX) {
            return None;
        }
        self.0[count] = j;
        self.0.sort_unstable();
        Some(self)
    }

    /// Whether every landmark missed here is missed in `other` too: then all that `other` may still do, this may.
    pub(super) fn is_within(&self, other: &Self) -> bool {
        self.0.iter().all(|m| *m == u32::MAX || other.0.contains(m))
    }
}

/// What the user declared, ready to be used.
#[derive(Clone, Debug)]
pub struct Silence {
    /// For each landmark, whether it lies inside the polygon of complete mapping.
    is_certain: Vec<bool>,
    sonar: Sonar,
    nadir_gap_rad: f64,
}

impl Silence {
    /// Evidence from the landmarks marked in `is_certain`; none for a sonar that does not look sideways.
    pub fn new(is_certain: Vec<bool>, sonar: Sonar) -> Option<Self> {
        match sonar.kind {
            SonarKind::SideLooking { nadir_gap_rad } => Some(Self { is_certain, sonar, nadir_gap_rad }),
            SonarKind::ForwardLooking { .. } => None,
        }
    }

    /// Adds to `missed` the landmarks certainly passed on the way from every position of `from` to `to` (= `from` moved by
    /// the whole travel), up to `budget`; `None` when there are more than that.
    pub(super) fn pass(
        &self,
        boxes: &[Box2],
        index: &LandmarkIndex,
        [from, to]: [&Cell; 2],
        passage: &Passage,
        missed: Missed,
        budget: u8,
    ) -> Option<Missed> {
        if passage.heading.is_empty() || passage.heading.width() > HEADING_RANGE_MAX_RAD {
            return Some(missed);
        }
        let reach = Interval::around(0.0, self.sonar.range_max_m);
        let near = from
            .minkowski_sum(&passage.within)
            .bounding_box()
            .minkowski_sum(Box2 { east: reach, north: reach });
        index
            .meeting(near)
            .filter(|&j| self.is_certain[j] && self.is_passed(boxes[j], [from, to], passage))
            .try_fold(missed, |missed, j| missed.with(j, budget))
    }

    fn is_passed(&self, landmark: Box2, [from, to]: [&Cell; 2], passage: &Passage) -> bool {
        let axes = Axes::new(passage.heading);
        let throughout = axes.abeam(landmark, from.minkowski_sum(&passage.within).bounding_box());
        let across = if throughout.lo() > 0.0 {
            throughout
        } else if throughout.hi() < 0.0 {
            -throughout
        } else {
            return false;
        };
        let off = Interval::around(0.0, self.sonar.bearing_error_rad);
        // The beam lies within the beam error of the bow's normal: it meets what lies ahead by at most this.
        let lead_m = larger((across * (off.sin() / off.cos())).hi(), 0.0) + RESOLUTION_M;
        if axes.ahead(landmark, from.bounding_box()).lo() <= lead_m
            || axes.ahead(landmark, to.bounding_box()).hi() >= -lead_m
        {
            return false;
        }
        let altitude = Interval::around(self.sonar.altitude_m, self.sonar.altitude_error_m)
            .intersection(Interval::new(0.0, f64::INFINITY));
        let rho = across / off.cos();
        let slant = (rho.sqr() + altitude.sqr()).sqrt();
        let gap = Interval::point(self.nadir_gap_rad);
        let unseen_below = altitude * (gap.sin() / gap.cos());
        slant.lo() > self.sonar.range_min_m
            && slant.hi() < self.sonar.range_max_m
            && rho.lo() > unseen_below.hi()
    }
}

/// Sine and cosine of the headings.
struct Axes {
    sin: Interval,
    cos: Interval,
}

impl Axes {
    fn new(heading: Interval) -> Self {
        Self { sin: heading.sin(), cos: heading.cos() }
    }

    /// How far ahead of the bow a landmark lies, over all its positions and all of the vehicle's.
    fn ahead(&self, landmark: Box2, vehicle: Box2) -> Interval {
        (landmark.east - vehicle.east) * self.sin + (landmark.north - vehicle.north) * self.cos
    }

    /// How far to starboard.
    fn abeam(&self, landmark: Box2, vehicle: Box2) -> Interval {
        (landmark.east - vehicle.east) * self.cos - (landmark.north - vehicle.north) * self.sin
    }
}
