//! Convex cells with sixteen fixed edge directions: the pieces a feasible set is made of.
//!
//! A cell is { p : dᵢ·p ≤ hᵢ for i = 0 … 15 } with dᵢ the integer vectors of [`DIRECTIONS`]; hᵢ is its *reach* in
//! direction i. A cell is **tight** when every hᵢ is attained (hᵢ is the support function of the cell), and then
//!
//! - the Minkowski sum of two tight cells has reaches hᵢ + gᵢ (support functions add), exactly;
//! - the intersection has reaches min(hᵢ, gᵢ), which [`Cell::intersection`] tightens again;
//! - the smallest cell that holds two cells has reaches max(hᵢ, gᵢ).
//!
//! *Why sixteen.* Adjacent integer directions have determinant 1, so corners need no division, and the gaps between
//! directions are 18.4° and 26.6°. Measured against exact feasible areas, eight directions were looser
//! (see `tests/suite/tightness.rs`).
//!
//! *Guarantee.* Reaches are only ever rounded up, so a cell holds the exact set it stands for. All operations are
//! monotone: larger operands give larger results, rounding included, because each is a chain of monotone steps.
//!
//! *Frame and units.* Working frame, metres (a reach in direction (2, 1) is in units of √5 m).
//!
//! *References.* Bounded-error recursion: [`crate::bibliography::BERTSEKAS_RHODES_1971`].

use std::sync::LazyLock;

use crate::frame::LocalPoint;
use crate::interval::{Box2, Interval, larger, smaller, up};

/// Number of edge directions.
pub const DIRECTION_COUNT: usize = 16;
/// Index distance between a direction and its opposite.
const HALF: usize = DIRECTION_COUNT / 2;

/// Outward edge directions (east, north), anticlockwise from east. Direction i + 8 is the opposite of direction i.
pub const DIRECTIONS: [[f64; 2]; DIRECTION_COUNT] = [
    [1.0, 0.0],
    [2.0, 1.0],
    [1.0, 1.0],
    [1.0, 2.0],
    [0.0, 1.0],
    [-1.0, 2.0],
    [-1.0, 1.0],
    [-2.0, 1.0],
    [-1.0, 0.0],
    [-2.0, -1.0],
    [-1.0, -1.0],
    [-1.0, -2.0],
    [0.0, -1.0],
    [1.0, -2.0],
    [1.0, -1.0],
    [2.0, -1.0],
];

const EAST: usize = 0;
const NORTH: usize = 4;

/// Reaches of a convex set in the sixteen directions, rounded up.
pub type Reaches = [f64; DIRECTION_COUNT];

/// A way to bound one direction by two others: dᵢ = α·dⱼ + γ·dₖ with α, γ ≥ 0, so p·dᵢ ≤ α·hⱼ + γ·hₖ on the cell.
struct Combination {
    target: usize,
    first: usize,
    second: usize,
    alpha: Interval,
    gamma: Interval,
}

/// All combinations whose two directions enclose the target and span less than half a turn. The bound of a redundant
/// edge is attained at the corner of its two nearest active neighbours, and that pair is among them, so one pass over
/// all pairs tightens a cell completely.
static COMBINATIONS: LazyLock<Vec<Combination>> = LazyLock::new(|| {
    let cross = |a: [f64; 2], b: [f64; 2]| a[0] * b[1] - a[1] * b[0];
    let mut all = Vec::new();
    for (target, &d) in DIRECTIONS.iter().enumerate() {
        for before in 1..HALF {
            for after in 1..(HALF - before) {
                let first = (target + DIRECTION_COUNT - before) % DIRECTION_COUNT;
                let second = (target + after) % DIRECTION_COUNT;
                let (a, b) = (DIRECTIONS[first], DIRECTIONS[second]);
                // Cramer's rule on small integers: numerators and determinant are exact, the quotient is enclosed.
                let det = cross(a, b);
                let share = |numerator: f64| {
                    let quotient = numerator / det;
                    // A multiple of 1/8 times a small integer is exact in binary, so equality proves the quotient exact.
                    if (quotient * 8.0).fract() == 0.0 && quotient * det == numerator {
                        Interval::point(quotient)
                    } else {
                        Interval::point(numerator) / Interval::point(det)
                    }
                };
                let (alpha, gamma) = (share(cross(d, b)), share(cross(a, d)));
                debug_assert!(alpha.lo() >= 0.0 && gamma.lo() >= 0.0);
                all.push(Combination { target, first, second, alpha, gamma });
            }
        }
    }
    all
});

/// Upper end of coefficient · reach, for a coefficient known to lie in an interval of non-negative numbers.
#[inline]
fn scaled_up(coefficient: Interval, reach: f64) -> f64 {
    if coefficient.lo() == 1.0 && coefficient.hi() == 1.0 {
        return reach;
    }
    up(if reach >= 0.0 { coefficient.hi() * reach } else { coefficient.lo() * reach })
}

/// A bounded convex cell, tight and not empty.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Cell {
    reach: Reaches,
}

impl Cell {
    /// The cell with these reaches; they must be those of a non-empty set (each attained, rounding aside).
    pub fn from_reaches(reach: Reaches) -> Self {
        Self { reach }
    }

    /// The smallest cell that holds a box.
    ///
    /// # Panics
    /// When the box is empty.
    pub fn from_box(b: Box2) -> Self {
        assert!(!b.is_empty(), "a cell is made from a box that is not empty");
        Self { reach: box_reaches(b) }
    }

    /// The smallest cell that holds the convex hull of `points`, rounded outward.
    ///
    /// # Panics
    /// When there are no points.
    pub fn around_points(points: &[LocalPoint]) -> Self {
        assert!(!points.is_empty(), "a cell is made from at least one point");
        let mut reach = [f64::NEG_INFINITY; DIRECTION_COUNT];
        for p in points {
            let at = box_reaches(Box2::hull_of(&[*p]));
            reach = std::array::from_fn(|i| larger(reach[i], at[i]));
        }
        Self { reach }
    }

    /// Reaches in the sixteen directions.
    pub fn reaches(&self) -> &Reaches {
        &self.reach
    }

    /// Minkowski sum with a convex set given by its reaches, rounded outward.
    #[inline]
    #[must_use]
    pub fn minkowski_sum(&self, other: &Reaches) -> Self {
        let mut reach = self.reach;
        for i in 0..DIRECTION_COUNT {
            reach[i] = up(reach[i] + other[i]);
        }
        Self { reach }
    }

    /// Points in both; `None` when there are none. `other` must be the reaches of a set, each attained.
    ///
    /// *Guarantee.* The minimum of the reaches describes the intersection exactly. Tightening replaces hᵢ by an upper
    /// bound of α·hⱼ + γ·hₖ where dᵢ = α·dⱼ + γ·dₖ, which no point of the intersection exceeds. `None` is returned only
    /// when an upper bound of max dᵢ·p lies below a lower bound of min dᵢ·p: then no point exists.
    #[must_use]
    pub fn intersection(&self, other: &Reaches) -> Option<Self> {
        let mut least = self.reach;
        let mut is_unchanged = true;
        let mut is_other = true;
        for (mine, theirs) in least.iter_mut().zip(other) {
            if theirs < mine {
                *mine = *theirs;
                is_unchanged = false;
            } else if *mine < *theirs {
                is_other = false;
            }
        }
        if is_unchanged {
            return Some(*self);
        }
        if is_other {
            return Some(Self { reach: *other });
        }
        Self::tightened(&least)
    }

    /// The cell { p : dᵢ·p ≤ `bound`ᵢ } with every reach tight; `None` when no point exists.
    #[must_use]
    pub fn tightened(bound: &Reaches) -> Option<Self> {
        if has_gap(bound) {
            return None;
        }
        let mut tight = *bound;
        for c in COMBINATIONS.iter() {
            let implied = up(scaled_up(c.alpha, bound[c.first]) + scaled_up(c.gamma, bound[c.second]));
            if implied < tight[c.target] {
                tight[c.target] = implied;
            }
        }
        if has_gap(&tight) { None } else { Some(Self { reach: tight }) }
    }

    /// The smallest cell that holds both.
    #[must_use]
    pub fn hull(&self, other: &Self) -> Self {
        let reach = std::array::from_fn(|i| larger(self.reach[i], other.reach[i]));
        Self { reach }
    }

    /// Whether every point of `other` is inside.
    #[inline]
    pub fn contains_cell(&self, other: &Self) -> bool {
        self.reach.iter().zip(&other.reach).all(|(mine, theirs)| theirs <= mine)
    }

    /// Whether `p` is inside, within the rounding of one dot product (towards "yes").
    pub fn contains(&self, p: LocalPoint) -> bool {
        DIRECTIONS.iter().zip(&self.reach).all(|(d, h)| {
            let along = Interval::point(d[0]) * Interval::point(p.east_m)
                + Interval::point(d[1]) * Interval::point(p.north_m);
            along.lo() <= *h
        })
    }

    /// The smallest box that holds the cell.
    pub fn bounding_box(&self) -> Box2 {
        let side = |i: usize| {
            let (lo, hi) = (-self.reach[i + HALF], self.reach[i]);
            Interval::new(smaller(lo, hi), larger(lo, hi))
        };
        Box2 { east: side(EAST), north: side(NORTH) }
    }

    /// The sixteen corners in order (neighbours coincide where an edge has no length), each within a small box.
    fn corner_boxes(&self) -> [Box2; DIRECTION_COUNT] {
        std::array::from_fn(|i| {
            let next = (i + 1) % DIRECTION_COUNT;
            let (d, e) = (DIRECTIONS[i], DIRECTIONS[next]);
            let (h, g) = (Interval::point(self.reach[i]), Interval::point(self.reach[next]));
            // Solves d·p = h, e·p = g; the determinant of adjacent directions is 1.
            Box2 {
                east: h * Interval::point(e[1]) - g * Interval::point(d[1]),
                north: g * Interval::point(d[0]) - h * Interval::point(e[0]),
            }
        })
    }

    /// Corners in order, anticlockwise, without repeats; nearest values, for drawing and for areas.
    pub fn corners(&self) -> Vec<LocalPoint> {
        let mut corners: Vec<LocalPoint> = Vec::with_capacity(DIRECTION_COUNT);
        for b in self.corner_boxes() {
            let p = LocalPoint::new(b.east.middle(), b.north.middle());
            if corners.last().is_none_or(|q| q.distance_m(p) > CORNER_MERGE_M) {
                corners.push(p);
            }
        }
        while corners.len() > 1 && corners[0].distance_m(corners[corners.len() - 1]) <= CORNER_MERGE_M {
            corners.pop();
        }
        corners
    }

    /// Area, m² (nearest value, for reports).
    pub fn area_m2(&self) -> f64 {
        let corners = self.corners();
        let Some(first) = corners.first() else { return 0.0 };
        let mut twice = 0.0;
        for pair in corners.windows(2) {
            twice += (pair[0].east_m - first.east_m) * (pair[1].north_m - first.north_m)
                - (pair[1].east_m - first.east_m) * (pair[0].north_m - first.north_m);
        }
        (0.5 * twice).abs()
    }

    /// Longest distance between two points of the cell, rounded up.
    ///
    /// *Guarantee.* A convex polygon's diameter joins two corners; every corner lies in its box, and the distance
    /// between boxes is evaluated outward.
    pub fn diameter_m(&self) -> f64 {
        let corners = self.corner_boxes();
        let mut longest = 0.0;
        for (i, a) in corners.iter().enumerate() {
            for b in &corners[i + 1..] {
                let d = ((a.east - b.east).sqr() + (a.north - b.north).sqr()).sqrt();
                longest = larger(longest, d.hi());
            }
        }
        longest
    }
}

/// Corners closer than this are drawn as one, metres (a tenth of a millimetre; display only).
const CORNER_MERGE_M: f64 = 1e-4;

/// Whether two opposite reaches prove a set empty: max dᵢ·p < min dᵢ·p.
#[inline]
fn has_gap(reach: &Reaches) -> bool {
    (0..HALF).any(|i| reach[i] < -reach[i + HALF])
}

/// Reaches of a box, rounded up.
pub fn box_reaches(b: Box2) -> Reaches {
    let extreme = |component: f64, side: Interval| {
        // Components are 0, ±1 or ±2: the product is exact.
        if component > 0.0 {
            component * side.hi()
        } else if component < 0.0 {
            component * side.lo()
        } else {
            0.0
        }
    };
    std::array::from_fn(|i| {
        let [e, n] = DIRECTIONS[i];
        let (x, y) = (extreme(e, b.east), extreme(n, b.north));
        if e == 0.0 {
            y
        } else if n == 0.0 {
            x
        } else {
            up(x + y)
        }
    })
}

/// Reaches of the polar patch { ρ·(sin θ, cos θ) : ρ ∈ `rho`, θ ∈ `theta` }, which are those of its convex hull.
pub fn polar_reaches(rho: Interval, theta: Interval) -> Reaches {
    Fan::new(theta).reaches(rho)
}

/// A range of bearings, ready for polar patches of many lengths.
///
/// dᵢ·ρ(sin θ, cos θ) = ρ·|dᵢ|·cos(θ − φᵢ) with φᵢ the bearing of dᵢ; evaluated outward.
#[derive(Clone, Copy, Debug)]
pub struct Fan([Interval; DIRECTION_COUNT]);

impl Fan {
    /// The bearings `theta`, radians.
    pub fn new(theta: Interval) -> Self {
        static POLAR: LazyLock<[(Interval, Interval); DIRECTION_COUNT]> = LazyLock::new(|| {
            DIRECTIONS.map(|[e, n]| {
                let length = (Interval::point(e).sqr() + Interval::point(n).sqr()).sqrt();
                let bearing = libm::atan2(e, n);
                // `libm::atan2` is within 1 ulp; four steps outward leave room to spare.
                let (lo, hi) =
                    ((0..4).fold(bearing, |x, _| x.next_down()), (0..4).fold(bearing, |x, _| x.next_up()));
                (length, Interval::new(lo, hi))
            })
        });
        Self(std::array::from_fn(|i| {
            let (length, bearing) = POLAR[i];
            length * (theta - bearing).cos()
        }))
    }

    /// Reaches of the patch with lengths `rho`, rounded up.
    #[inline]
    pub fn reaches(&self, rho: Interval) -> Reaches {
        self.0.map(|along| (rho * along).hi())
    }
}

/// Reaches of the mirrored set −A: the reach of −A in direction i is that of A in direction i + 8.
pub fn mirrored(reach: &Reaches) -> Reaches {
    std::array::from_fn(|i| reach[(i + HALF) % DIRECTION_COUNT])
}

/// Reaches of a disc of radius `radius_m` about the origin, rounded up.
pub fn disc_reaches(radius_m: f64) -> Reaches {
    static LENGTHS: LazyLock<[f64; DIRECTION_COUNT]> = LazyLock::new(|| {
        DIRECTIONS.map(|[e, n]| (Interval::point(e).sqr() + Interval::point(n).sqr()).sqrt().hi())
    });
    std::array::from_fn(|i| up(LENGTHS[i] * radius_m))
}

/// Sum of reaches, rounded up: the reaches of a Minkowski sum.
pub fn add_reaches(total: &mut Reaches, more: &Reaches) {
    for i in 0..DIRECTION_COUNT {
        total[i] = up(total[i] + more[i]);
    }
}

#[cfg(test)]
#[path = "cell_tests.rs"]
mod tests;
