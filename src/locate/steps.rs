//! From a vehicle's log to the sets of one solver step: travel and relative position, as reaches.
//!
//! *Travel.* The true heading at each instant is the reported one plus the bias plus noise, and the true distance the
//! reported one times 1 ± s. The displacements over a straight piece of reported length L and heading ψ form the set
//! ∫ ρ(l)·u(θ(l)) dl with ρ ∈ [1 − s, 1 + s], θ ∈ ψ + bias ± noise free at every l. The integral of a set-valued map
//! is the convex hull scaled by L (Aumann 1965), so its reaches are those of the polar patch
//! [L(1 − s), L(1 + s)] × (ψ + bias ± noise). Pieces and the drift disc add up as Minkowski sums, whose reaches add.
//!
//! *Bias.* One constant for the whole dive. Its interval is cut into slices; each slice is solved by itself and the
//! answers are united. The true bias lies in one of the slices, so the truth lies in the union.
//!
//! *Sighting.* |measured − R| ≤ a + b·R gives R ∈ [(r − a)/(1 + b), (r + a)/(1 − b)]; horizontal range and bearing
//! follow by interval arithmetic.

use crate::detect::{Log, ReportedPiece, Sighting};
use crate::interval::{Box2, Interval, larger};
use crate::locate::cell::{
    DIRECTION_COUNT, EAST, HALF, NORTH, Reaches, add_reaches, disc_reaches, mirrored, polar_reaches,
};
use crate::locate::unseen::Passage;
use crate::vehicle::{DeadReckoning, Sonar, horizontal_range};

/// Reported lengths and ranges are taken as exact to this, metres: an allowance for the rounding of reported values,
/// added to every range and to every travel. One micrometre is far below any instrument and far above binary64
/// rounding at coordinates of 10⁷ m (2 nm).
pub const RESOLUTION_M: f64 = 1e-6;

/// Reported angles are taken as exact to this, radians (a micrometre at 1 km).
pub const RESOLUTION_RAD: f64 = 1e-9;

/// Error bounds in force for a solve.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bounds {
    /// Of dead reckoning.
    pub dead_reckoning: DeadReckoning,
    /// Of the sonar (its ranges and sector are not used here, only errors and altitude).
    pub sonar: Sonar,
    /// Number of slices of the heading-bias interval, at least 1.
    pub heading_slices: usize,
}

impl Bounds {
    /// The altitudes above the seabed that the bounds allow, metres.
    pub(super) fn altitude(&self) -> Interval {
        Interval::around(self.sonar.altitude_m, self.sonar.altitude_error_m)
            .intersection(Interval::new(0.0, f64::INFINITY))
    }

    /// The slices of the bias interval. Neighbours share their end, so their union is the whole interval.
    fn bias_slices(&self) -> Vec<Interval> {
        let bias = self.dead_reckoning.heading_bias_rad;
        let count = self.heading_slices;
        let end = |k: usize| if k == count { bias } else { bias * (2.0 * k as f64 / count as f64 - 1.0) };
        (0..count).map(|k| Interval::new(end(k), end(k + 1))).collect()
    }
}

/// Relative positions of the detected landmark that a sighting allows, for one slice of the bias.
#[derive(Clone, Debug, PartialEq)]
pub struct Look {
    /// Reaches of −S: added to a landmark's box they give the positions from which it would be seen so.
    pub from_landmark: Reaches,
    /// A box around S, for the index.
    pub extent: Box2,
}

impl Look {
    /// From the reaches of −S.
    pub fn new(from_landmark: Reaches) -> Self {
        let s = mirrored(&from_landmark);
        let side = |toward: usize| {
            let away = (toward + HALF) % DIRECTION_COUNT;
            Interval::new(-larger(s[away], -s[toward]), s[toward])
        };
        Self { extent: Box2 { east: side(EAST), north: side(NORTH) }, from_landmark }
    }
}

/// One event as the solver sees it.
#[derive(Clone, Debug, PartialEq)]
pub struct Step {
    /// Distance along the planned track, metres.
    pub along_m: f64,
    /// Reaches of the displacement since the event before, by slice.
    pub travel: Vec<Reaches>,
    /// The travel as a passage by landmarks that were not seen, by slice; none where the sonar was blind on the way.
    pub passage: Vec<Option<Passage>>,
    /// The sighting, by slice; none at a mark. An inner `None` means that no relative position explains the
    /// measurement.
    pub sighting: Option<Vec<Option<Look>>>,
}

/// Translates a log under `bounds`.
pub fn steps(log: &Log, bounds: &Bounds) -> Vec<Step> {
    let slices = bounds.bias_slices();
    log.events
        .iter()
        .map(|event| Step {
            along_m: event.along_m,
            travel: slices
                .iter()
                .map(|&bias| TravelError::new(bias, &bounds.dead_reckoning).reaches(&event.travel))
                .collect(),
            passage: slices
                .iter()
                .map(|&bias| TravelError::new(bias, &bounds.dead_reckoning).passage(&event.travel))
                .collect(),
            sighting: event
                .sighting
                .as_ref()
                .map(|sighting| slices.iter().map(|&bias| look(sighting, bias, bounds)).collect()),
        })
        .collect()
}

/// What travel may differ from its report: true distance over reported distance, true heading less reported heading,
/// and what is added in any direction.
#[derive(Clone, Copy, Debug)]
pub(super) struct TravelError {
    /// True distance over reported distance.
    pub scale: Interval,
    /// True heading less reported heading, radians.
    pub heading: Interval,
    /// Drift, metres per second.
    pub drift_mps: f64,
    /// Added once per travel, metres.
    pub slack_m: f64,
}

impl TravelError {
    /// Under `bounds`, one for each slice of the bias.
    pub fn by_slice(bounds: &Bounds) -> Vec<Self> {
        bounds.bias_slices().into_iter().map(|bias| Self::new(bias, &bounds.dead_reckoning)).collect()
    }

    /// Under `bounds`, for one slice of the bias.
    fn new(bias: Interval, dead_reckoning: &DeadReckoning) -> Self {
        Self {
            scale: Interval::around(1.0, dead_reckoning.scale_error),
            heading: heading_error(bias, dead_reckoning),
            drift_mps: dead_reckoning.drift_mps,
            slack_m: RESOLUTION_M,
        }
    }

    /// The passage over reported pieces; none when the sonar is blind on one of them.
    ///
    /// Every part of the travel is a part of each piece in turn, so the sum of the hulls conv{0, travel of the piece} holds
    /// its displacement.
    fn passage(&self, pieces: &[ReportedPiece]) -> Option<Passage> {
        let mut passage = Passage::NONE;
        for piece in pieces {
            if piece.is_blind {
                return None;
            }
            let heading = Interval::point(piece.heading_rad) + self.heading;
            let within = self.reaches(std::slice::from_ref(piece)).map(|reach| larger(reach, 0.0));
            passage = passage.then(&Passage { heading, within });
        }
        Some(passage)
    }

    /// Reaches of the displacements that reported pieces allow.
    pub fn reaches(&self, pieces: &[ReportedPiece]) -> Reaches {
        let mut total = [0.0; DIRECTION_COUNT];
        let mut slack_m = Interval::point(self.slack_m);
        for piece in pieces {
            let rho = Interval::point(piece.length_m) * self.scale;
            let theta = Interval::point(piece.heading_rad) + self.heading;
            add_reaches(&mut total, &polar_reaches(rho, theta));
            slack_m = slack_m + Interval::point(self.drift_mps) * Interval::point(piece.duration_s);
        }
        add_reaches(&mut total, &disc_reaches(slack_m.hi()));
        total
    }
}

/// Bias and noise together: what the true heading may differ from the reported one.
fn heading_error(bias: Interval, dead_reckoning: &DeadReckoning) -> Interval {
    bias + Interval::around(0.0, dead_reckoning.heading_noise_rad) + Interval::around(0.0, RESOLUTION_RAD)
}

/// Relative positions that a sighting allows; none when no altitude within its bound reaches the slant range.
fn look(sighting: &Sighting, bias: Interval, bounds: &Bounds) -> Option<Look> {
    let sonar = &bounds.sonar;
    let additive = Interval::around(0.0, sonar.range_error_m) + Interval::around(0.0, RESOLUTION_M);
    let growth = Interval::around(1.0, sonar.range_error_fraction);
    let measured = Interval::point(sighting.slant_range_m);
    let slant = ((measured + additive) / growth).intersection(Interval::new(0.0, f64::INFINITY));
    let rho = horizontal_range(slant, bounds.altitude());
    if rho.is_empty() {
        return None;
    }
    let theta = Interval::point(sighting.heading_rad)
        + Interval::point(sighting.relative_bearing_rad)
        + Interval::around(0.0, sonar.bearing_error_rad)
        + heading_error(bias, &bounds.dead_reckoning);
    Some(Look::new(mirrored(&polar_reaches(rho, theta))))
}
