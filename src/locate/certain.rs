//! Sightings that happen in every admissible dive along a track, in composed terms (points 3 to 7 of the proof in
//! `composed.rs`).

use super::Bounds;
use super::composed::COMPOSED_RESOLUTION_M;
use super::steps::{RESOLUTION_M, RESOLUTION_RAD};
use crate::detect::Scene;
use crate::interval::{Box2, Interval};
use crate::map::Landmark;
use crate::track::plan::{Piece, Plan};
use crate::vehicle::{SonarKind, horizontal_range};

/// Widest half-sector for which leaving the sector is used as a certain sighting, radians (80°): beyond it the range
/// at the edge is no longer monotone in the bearing. Entering is used for every sector.
const LEAVING_SECTOR_MAX_RAD: f64 = 80.0 * std::f64::consts::PI / 180.0;

/// One certain sighting in composed terms.
#[derive(Clone, Debug)]
pub(super) struct CertainSighting {
    /// Number of the landmark.
    pub landmark: usize,
    /// Along the track: earliest and latest instant.
    pub window: Interval,
    /// Horizontal range of the history, metres.
    pub rho: Interval,
    /// World direction of the landmark in the history less γ, radians.
    pub theta: Interval,
    /// Heading of the track, radians.
    pub heading_rad: f64,
}

/// All certain sightings along the track.
pub(super) fn certain_sightings(scene: &Scene<'_>, plan: &Plan, bounds: &Bounds) -> Vec<CertainSighting> {
    let reach = Interval::around(0.0, scene.sonar.range_max_m);
    let mut found = Vec::new();
    for piece in plan.pieces.iter().filter(|piece| scene.sonar.detect_in_turns || !piece.in_turn) {
        let ends = Box2::hull_of(&[piece.start, piece.point_at(piece.length_m)]);
        let near = ends.minkowski_sum(Box2 { east: reach, north: reach });
        let mut numbers: Vec<usize> = scene.index.meeting(near).collect();
        numbers.sort_unstable();
        for landmark in numbers {
            let geometry = Approach::new(scene, piece, landmark, bounds);
            match scene.sonar.kind {
                SonarKind::SideLooking { nadir_gap_rad } => found.extend(geometry.abeam(nadir_gap_rad)),
                SonarKind::ForwardLooking { half_sector_rad } => {
                    let entering = geometry.entering(half_sector_rad);
                    if entering.is_some() {
                        found.extend(geometry.leaving(half_sector_rad));
                    }
                    found.extend(entering);
                }
            }
        }
    }
    found
}

/// Number of landmarks that every admissible dive along `plan` is certain to have detected after `within_m`.
pub fn certain_landmarks(scene: &Scene<'_>, plan: &Plan, bounds: &Bounds, within_m: f64) -> usize {
    let mut numbers: Vec<usize> = certain_sightings(scene, plan, bounds)
        .into_iter()
        .filter(|sighting| sighting.window.hi() <= within_m)
        .map(|sighting| sighting.landmark)
        .collect();
    numbers.sort_unstable();
    numbers.dedup();
    numbers.len()
}

/// One landmark's box seen from one straight piece of the track.
struct Approach<'a> {
    scene: &'a Scene<'a>,
    piece: &'a Piece,
    landmark: usize,
    /// Along the piece from its start, metres.
    ahead: Interval,
    /// To starboard of the piece, metres.
    starboard: Interval,
    /// Altitude above the seabed.
    altitude: Interval,
    /// Half of the crab angle's interval; none when the drift may be as fast as the vehicle.
    crab_rad: Option<f64>,
}

impl<'a> Approach<'a> {
    fn new(scene: &'a Scene<'a>, piece: &'a Piece, number: usize, bounds: &'a Bounds) -> Self {
        let landmark: &Landmark = &scene.landmarks[number];
        let b = landmark.bounds();
        let slack = Interval::around(0.0, RESOLUTION_M);
        let east = b.east - Interval::point(piece.start.east_m) + slack;
        let north = b.north - Interval::point(piece.start.north_m) + slack;
        let heading = Interval::point(piece.heading_rad);
        let (sin, cos) = (heading.sin(), heading.cos());
        let ratio = bounds.dead_reckoning.drift_mps / scene.vehicle.speed_mps;
        Self {
            scene,
            piece,

            landmark: number,
            ahead: east * sin + north * cos,
            starboard: east * cos - north * sin,
            altitude: bounds.altitude(),
            // `libm::asin` is within 1 ulp; the resolution of angles covers it many times over.
            crab_rad: (ratio < 1.0).then(|| libm::asin(ratio) + RESOLUTION_RAD),
        }
    }

    /// |starboard| when the side is certain.
    fn across(&self) -> Option<Interval> {
        if self.starboard.lo() > 0.0 {
            Some(self.starboard)
        } else if self.starboard.hi() < 0.0 {
            Some(-self.starboard)
        } else {
            None
        }
    }

    /// The sighting when `window` (from the start of the piece) lies on the piece.
    fn certain(&self, window: Interval, rho: Interval, theta: Interval) -> Option<CertainSighting> {
        let on_piece = Interval::new(0.0, self.piece.length_m);
        (!rho.is_empty() && on_piece.contains_interval(window)).then(|| CertainSighting {
            landmark: self.landmark,
            window: window + Interval::point(self.piece.along_m),
            rho,
            theta: theta + Interval::point(self.piece.heading_rad),
            heading_rad: self.piece.heading_rad,
        })
    }

    /// Horizontal range in the history from the slant range in the truth (point 3 of the proof).
    fn composed_range(&self, slant: Interval) -> Interval {
        let sonar = &self.scene.sonar;
        let (a, b) = (sonar.range_error_m + COMPOSED_RESOLUTION_M, sonar.range_error_fraction);
        let (one, b) = (Interval::point(1.0), Interval::point(b));
        let twice = Interval::point(2.0) * Interval::point(a);
        let lo = ((slant * (one - b)) - twice) / (one + b);
        let hi = ((slant * (one + b)) + twice) / (one - b);
        horizontal_range(lo.hull(hi).intersection(Interval::new(0.0, f64::INFINITY)), self.altitude)
    }

    /// Side-looking sonar: the beam passes the landmark.
    fn abeam(&self, nadir_gap_rad: f64) -> Option<CertainSighting> {
        let sonar = &self.scene.sonar;
        let across = self.across()?;
        // Angle of the beam off the track's normal: crab and beam error.
        let off = self.crab_rad? + sonar.bearing_error_rad + RESOLUTION_RAD;
        if off >= 1.0 {
            return None;
        }
        let off = Interval::new(-off, off);
        let rho = across / off.cos();
        let slant = (rho.sqr() + self.altitude.sqr()).sqrt();
        let gap =
            (self.altitude * Interval::point(nadir_gap_rad).sin()) / Interval::point(nadir_gap_rad).cos();
        let is_in_swath =
            slant.lo() > sonar.range_min_m && slant.hi() < sonar.range_max_m && rho.lo() > gap.hi();
        if !is_in_swath {
            return None;
        }
        let window = self.ahead + across * (off.sin() / off.cos());
        let side = if self.starboard.lo() > 0.0 { 1.0 } else { -1.0 };
        let quarter =
            Interval::point(side * std::f64::consts::FRAC_PI_2) + Interval::around(0.0, RESOLUTION_RAD);
        self.certain(window, self.composed_range(slant), quarter + off)
    }

    /// Forward-looking sonar: the landmark comes within the far range while inside the sector.
    fn entering(&self, half_sector_rad: f64) -> Option<CertainSighting> {
        let sonar = &self.scene.sonar;
        let slant = Interval::point(sonar.range_max_m);
        let far = horizontal_range(slant, self.altitude);
        let forward = (far.sqr() - self.starboard.sqr()).sqrt();
        let near = horizontal_range(Interval::point(sonar.range_min_m), self.altitude);
        if far.is_empty() || forward.is_empty() || forward.lo() <= 0.0 {
            return None;
        }
        // A landmark nearer than the nearest range would enter from inside.
        if !near.is_empty() && near.hi() >= far.lo() {
            return None;
        }
        let bearing = bearing_of(self.starboard, forward);
        let crab = Interval::around(0.0, self.crab_rad?);
        let relative = bearing + crab;
        let inside = Interval::new(-half_sector_rad, half_sector_rad);
        if !(inside.contains_interval(relative)
            && relative.hi() < half_sector_rad
            && relative.lo() > -half_sector_rad)
        {
            return None;
        }
        let twice_error = Interval::around(0.0, 2.0 * sonar.bearing_error_rad + RESOLUTION_RAD);
        self.certain(self.ahead - forward, self.composed_range(slant), bearing + twice_error)
    }

    /// Forward-looking sonar: the landmark leaves across the edge of the sector, having entered.
    fn leaving(&self, half_sector_rad: f64) -> Option<CertainSighting> {
        let sonar = &self.scene.sonar;
        let across = self.across()?;
        let edge = Interval::around(half_sector_rad, self.crab_rad?);
        if edge.hi() > LEAVING_SECTOR_MAX_RAD || edge.lo() <= 0.0 {
            return None;
        }
        let rho = across / edge.sin();
        let slant = (rho.sqr() + self.altitude.sqr()).sqrt();
        if slant.lo() <= sonar.range_min_m || slant.hi() >= sonar.range_max_m {
            return None;
        }
        let window = self.ahead - across * (edge.cos() / edge.sin());
        let side = if self.starboard.lo() > 0.0 { edge } else { -edge };
        let twice_error = Interval::around(0.0, 2.0 * sonar.bearing_error_rad + RESOLUTION_RAD);
        self.certain(window, self.composed_range(slant), side + twice_error)
    }
}

/// Bearings of the points { (starboard, forward) } off the track, for forward > 0: atan2 is monotone in each argument
/// there, so its extremes lie at corners of the box.
fn bearing_of(starboard: Interval, forward: Interval) -> Interval {
    let mut bearing = Interval::EMPTY;
    for x in [starboard.lo(), starboard.hi()] {
        for y in [forward.lo(), forward.hi()] {
            // `libm::atan2` is within 1 ulp; the resolution of angles covers it many times over.
            bearing = bearing.hull(Interval::around(libm::atan2(x, y), RESOLUTION_RAD));
        }
    }
    bearing
}
