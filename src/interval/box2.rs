//! Boxes in the plane: an interval east and an interval north.

use super::Interval;
use crate::frame::LocalPoint;

/// A closed box with sides along east and north; empty when either side is.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Box2 {
    /// East, metres.
    pub east: Interval,
    /// North, metres.
    pub north: Interval,
}

impl Box2 {
    /// The empty set.
    pub const EMPTY: Self = Self { east: Interval::EMPTY, north: Interval::EMPTY };

    /// `centre` ± half-widths in metres, rounded outward.
    ///
    /// # Panics
    /// When a half-width is negative or not a number.
    pub fn around(centre: LocalPoint, half_width_east_m: f64, half_width_north_m: f64) -> Self {
        Self {
            east: Interval::around(centre.east_m, half_width_east_m),
            north: Interval::around(centre.north_m, half_width_north_m),
        }
    }

    /// Smallest box that holds all `points` (exact); empty for none.
    pub fn hull_of(points: &[LocalPoint]) -> Self {
        points.iter().fold(Self::EMPTY, |hull, p| Self {
            east: hull.east.hull(Interval::point(p.east_m)),
            north: hull.north.hull(Interval::point(p.north_m)),
        })
    }

    /// Smallest box that holds both (exact).
    #[must_use]
    pub fn hull(self, other: Self) -> Self {
        Self { east: self.east.hull(other.east), north: self.north.hull(other.north) }
    }

    /// Whether no point is inside.
    pub fn is_empty(self) -> bool {
        self.east.is_empty() || self.north.is_empty()
    }

    /// Whether `p` is inside.
    pub fn contains(self, p: LocalPoint) -> bool {
        self.east.contains(p.east_m) && self.north.contains(p.north_m)
    }

    /// Minkowski sum { a + b }, rounded outward.
    #[must_use]
    pub fn minkowski_sum(self, other: Self) -> Self {
        Self { east: self.east + other.east, north: self.north + other.north }
    }

    /// Points in both (exact).
    #[must_use]
    pub fn intersection(self, other: Self) -> Self {
        Self { east: self.east.intersection(other.east), north: self.north.intersection(other.north) }
    }
}

/// The mirrored box { −p } (exact).
impl std::ops::Neg for Box2 {
    type Output = Self;

    fn neg(self) -> Self {
        Self { east: -self.east, north: -self.north }
    }
}
