//! When two separations agree within the bounds: the set of separations that a history at the other place may have.
//!
//! See [`super`] for the derivation. Everything here is a function of one number λ, by which **all** bounds are
//! multiplied, and grows with it; so every agreement has one smallest λ at which it still holds, its break scale.

use std::f64::consts::{FRAC_PI_2, PI};

use crate::dive::Dive;
use crate::interval::{larger, smaller};
use crate::vehicle::{DeadReckoning, Sonar, SonarKind};

/// Half the width of a window of turns, radians (5°).
const TURN_HALF_RAD: f64 = 5.0 * PI / 180.0;
/// Number of the last window: the one about half a turn.
const LAST_WINDOW: usize = 18;
/// Added to every tolerance, metres: far above the rounding of this arithmetic at coordinates of 10⁷ m (10⁻⁸ m).
const ROUNDING_M: f64 = 1e-6;
/// Pieces of the swath over which the displacement of a sighting is bounded one by one.
const SWATH_PIECES: usize = 1024;

/// The bounds that decide whether two separations agree.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AgreementBounds {
    /// Bounds on dead reckoning.
    pub dead_reckoning: DeadReckoning,
    /// The sonar and its bounds.
    pub sonar: Sonar,
    /// Speed over ground, metres per second.
    pub speed_mps: f64,
}

impl AgreementBounds {
    /// The bounds of a dive.
    pub fn of(dive: &Dive) -> Self {
        Self { dead_reckoning: dive.dead_reckoning, sonar: dive.sonar, speed_mps: dive.vehicle.speed_mps }
    }

    /// Numbers of the windows of turns that these bounds reach: window k is centred on 2k·5°. Window 0 stands for the
    /// turns of at most 5° either way that the bias allows; the others enter whole once the bias reaches them.
    pub(super) fn windows(&self) -> Vec<usize> {
        (0..=LAST_WINDOW).filter(|&k| k == 0 || self.reaches(k, 1.0)).collect()
    }

    fn reaches(&self, window: usize, scale: f64) -> bool {
        let nearest_rad = (2.0 * window as f64 - 1.0) * TURN_HALF_RAD;
        2.0 * self.dead_reckoning.heading_bias_rad * scale >= nearest_rad
    }
}

/// Whether a window is its own mirror: turning back by a turn of it is again a turn of it.
pub(super) fn is_own_mirror(window: usize) -> bool {
    window == 0 || window == LAST_WINDOW
}

/// A vector between two charted positions, metres.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Separation {
    pub(super) east_m: f64,
    pub(super) north_m: f64,
    /// Its length.
    pub(super) length_m: f64,
}

/// The tolerance at one scale of the bounds, for one window of turns.
#[derive(Clone, Copy, Debug)]
pub(super) struct Tolerance {
    /// Factor on the half-widths of boxes.
    scale: f64,
    /// Both sightings together, and rounding, metres.
    sightings_m: f64,
    /// Growth per metre of travel.
    per_m: f64,
    /// How much longer the travel may be than the separation, metres.
    carry_m: f64,
    /// Half the window of turns: sine and cosine.
    half: (f64, f64),
    /// Centre of the window: sine and cosine.
    centre: (f64, f64),
    /// Largest sine in the window: how much of one side of a box may turn into the other.
    box_turn: f64,
}

impl Tolerance {
    /// The tolerance with all bounds multiplied by `scale` (0 to 1); none when the bounds do not reach the window.
    pub(super) fn at(bounds: &AgreementBounds, window: usize, scale: f64) -> Option<Self> {
        if window > 0 && !bounds.reaches(window, scale) {
            return None;
        }
        let dr = &bounds.dead_reckoning;
        let noise = dr.heading_noise_rad * scale;
        let beam = bounds.sonar.bearing_error_rad * scale;
        let half = if window == 0 {
            smaller(2.0 * dr.heading_bias_rad * scale, TURN_HALF_RAD)
        } else {
            TURN_HALF_RAD
        };
        let centre = 2.0 * window as f64 * TURN_HALF_RAD;
        let s = dr.scale_error * scale;
        let stretch = (1.0 + s) / (1.0 - s);
        // |κ·e^(iδ) − 1|² = (κ − 1)² + 4κ·sin²(δ/2), largest at the largest κ and at δ = 2ν.
        let bend = libm::sin(smaller(noise, FRAC_PI_2));
        let drift = dr.drift_mps * scale;
        let per_m = libm::hypot(stretch - 1.0, 2.0 * libm::sqrt(stretch) * bend)
            + (1.0 + stretch) * drift / bounds.speed_mps;
        let swath = Swath::new(&bounds.sonar, scale);
        let crab = libm::asin(smaller(drift / bounds.speed_mps, 1.0));
        let carry_m = match bounds.sonar.kind {
            SonarKind::SideLooking { .. } => {
                2.0 * swath.far_m * libm::sin(smaller(beam + crab + noise, FRAC_PI_2))
            }
            SonarKind::ForwardLooking { .. } => 2.0 * swath.far_m,
        };
        let (low, high) = (centre - half, centre + half);
        let box_turn = if (low..=high).contains(&FRAC_PI_2) {
            1.0
        } else {
            larger(libm::sin(low).abs(), libm::sin(high).abs())
        };
        Some(Self {
            scale,
            sightings_m: 2.0 * swath.displacement_m(2.0 * (noise + beam)) + ROUNDING_M,
            per_m,
            carry_m,
            half: (libm::sin(half), libm::cos(half)),
            centre: (libm::sin(centre), libm::cos(centre)),
            box_turn,
        })
    }

    /// The same with turns the other way.
    pub(super) fn mirrored(self) -> Self {
        Self { centre: (-self.centre.0, self.centre.1), ..self }
    }

    /// Centre and half-width of the window, radians.
    pub(super) fn turns(&self) -> (f64, f64) {
        (libm::atan2(self.centre.0, self.centre.1), libm::atan2(self.half.0, self.half.1))
    }

    /// `d` turned by the centre of the window (clockwise, as headings grow).
    pub(super) fn turned(&self, d: Separation) -> (f64, f64) {
        let (sin, cos) = self.centre;
        (d.east_m * cos + d.north_m * sin, d.north_m * cos - d.east_m * sin)
    }

    /// Tolerance besides boxes and turns for separations of at most `length_m`, with boxes of these half-widths.
    fn radius_m(&self, length_m: f64, boxes_m: [f64; 2]) -> f64 {
        let travel_m = length_m + boxes_m[0] + boxes_m[1] + self.carry_m;
        // The last term is what the chord of the window leaves out of its arc.
        self.sightings_m + self.per_m * travel_m + length_m * (1.0 - self.half.1)
    }

    /// How far from the turned separation an agreeing one may lie, for separations of at most `length_m`.
    pub(super) fn search_m(&self, length_m: f64, boxes_m: [f64; 2]) -> f64 {
        let boxes = [boxes_m[0] * self.scale, boxes_m[1] * self.scale];
        self.radius_m(length_m, boxes)
            + libm::hypot(boxes[0] + boxes[1] * self.box_turn, boxes[1] + boxes[0] * self.box_turn)
            + length_m * (self.half.0 + 1.0 - self.half.1)
    }

    /// Whether a vehicle that really passes two landmarks `first` apart may take them for two that are `second` apart.
    /// `boxes_m`: sum of the four half-widths, east and north.
    #[inline]
    pub(super) fn agrees(&self, first: Separation, second: Separation, boxes_m: [f64; 2]) -> bool {
        let boxes = [boxes_m[0] * self.scale, boxes_m[1] * self.scale];
        let radius = self.radius_m(larger(first.length_m, second.length_m), boxes);
        let (side_e, side_n) = (boxes[0] + boxes[1] * self.box_turn, boxes[1] + boxes[0] * self.box_turn);
        let (east, north) = self.turned(first);
        let (sin, cos) = self.half;
        let middle = (second.east_m - east * cos, second.north_m - north * cos);
        // From the middle of the chord to its end: the turned separation, square to itself.
        let arm = (north * sin, -east * sin);
        let outside = |(e, n): (f64, f64)| {
            let (e, n) = (e.abs() - side_e, n.abs() - side_n);
            let (e, n) = (if e > 0.0 { e } else { 0.0 }, if n > 0.0 { n } else { 0.0 });
            e * e + n * n
        };
        let near = outside(middle);
        if near <= radius * radius {
            return true;
        }
        let longest = radius + first.length_m * sin;
        if near > longest * longest {
            return false;
        }
        let (p, q) = ((middle.0 - arm.0, middle.1 - arm.1), (middle.0 + arm.0, middle.1 + arm.1));
        if outside(p) <= radius * radius || outside(q) <= radius * radius {
            return true;
        }
        // The nearest points of a segment and a box that do not meet include an end of the segment or a corner of the box;
        // when they meet, the segment crosses a side or a diagonal, and some corner lies on either side of it.
        let corners = [(side_e, side_n), (-side_e, side_n), (-side_e, -side_n), (side_e, -side_n)];
        let length2 = 4.0 * (arm.0 * arm.0 + arm.1 * arm.1);
        if length2 == 0.0 {
            return false;
        }
        let (mut left, mut right) = (false, false);
        for (e, n) in corners {
            let (x, y) = (e - p.0, n - p.1);
            let (dx, dy) = (2.0 * arm.0, 2.0 * arm.1);
            let along = (x * dx + y * dy) / length2;
            let across = x * dy - y * dx;
            if (0.0..=1.0).contains(&along) {
                if across * across <= radius * radius * length2 {
                    return true;
                }
                left |= across > 0.0;
                right |= across < 0.0;
            }
        }
        left && right
    }
}

/// The band of horizontal ranges and the errors of a range in it.
struct Swath {
    near_m: f64,
    far_m: f64,
    low_altitude_m: f64,
    high_altitude_m: f64,
    range_error_m: f64,
    range_error_fraction: f64,
}

impl Swath {
    fn new(sonar: &Sonar, scale: f64) -> Self {
        let low = larger(sonar.altitude_m - sonar.altitude_error_m * scale, 0.0);
        let high = sonar.altitude_m + sonar.altitude_error_m * scale;
        let gap_m = match sonar.kind {
            SonarKind::SideLooking { nadir_gap_rad } => low * libm::tan(nadir_gap_rad),
            SonarKind::ForwardLooking { .. } => 0.0,
        };
        let far_m = leg(sonar.range_max_m, low);
        Self {
            near_m: smaller(larger(leg(sonar.range_min_m, high), gap_m), far_m),
            far_m,
            low_altitude_m: low,
            high_altitude_m: high,
            range_error_m: sonar.range_error_m * scale,
            range_error_fraction: sonar.range_error_fraction * scale,
        }
    }

    /// Upper bound of |ρ′·e^(iδ) − ρ| over the swath, |δ| ≤ `turn_rad`: a piece of the swath at a time, ρ′ − ρ between
    /// the values at its ends.
    fn displacement_m(&self, turn_rad: f64) -> f64 {
        let bend = libm::sin(smaller(0.5 * turn_rad, FRAC_PI_2));
        let at = |k: usize| self.near_m + (self.far_m - self.near_m) * k as f64 / SWATH_PIECES as f64;
        (0..SWATH_PIECES).fold(0.0, |most, k| {
            let (near, far) = (at(k), at(k + 1));
            let (shortest, longest) = (self.shortest_m(near), self.longest_m(far));
            let change = larger(longest - near, far - shortest);
            larger(most, libm::hypot(change, 2.0 * libm::sqrt(longest * far) * bend))
        })
    }

    /// Longest horizontal range that explains what is measured at `range_m`.
    fn longest_m(&self, range_m: f64) -> f64 {
        let b = self.range_error_fraction;
        let slant_m = libm::hypot(range_m, self.high_altitude_m);
        leg((slant_m * (1.0 + b) + 2.0 * self.range_error_m) / (1.0 - b), self.low_altitude_m)
    }

    /// Shortest horizontal range that explains what is measured at `range_m`.
    fn shortest_m(&self, range_m: f64) -> f64 {
        let b = self.range_error_fraction;
        let slant_m = libm::hypot(range_m, self.low_altitude_m);
        leg((slant_m * (1.0 - b) - 2.0 * self.range_error_m) / (1.0 + b), self.high_altitude_m)
    }
}

/// √(s² − h²), 0 where that does not exist.
fn leg(slant_m: f64, altitude_m: f64) -> f64 {
    let slant_m = larger(slant_m, 0.0);
    libm::sqrt(larger((slant_m - altitude_m) * (slant_m + altitude_m), 0.0))
}
