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
        let geometry = PieceGeometry::new(scene, piece, bounds);
        for landmark in numbers {
            geometry.sightings(scene, piece, landmark, &mut found);
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

/// What all sightings from one straight piece of the track have in common. Nothing here depends on where the piece
/// starts or ends, so it serves all pieces on one heading.
#[derive(Clone, Copy, Debug)]
pub(super) struct PieceGeometry {
    /// Sine and cosine of the heading.
    sin: Interval,
    cos: Interval,
    /// Altitude above the seabed.
    altitude: Interval,
    /// Half of the crab angle's interval; none when the drift may be as fast as the vehicle.
    crab_rad: Option<f64>,
    /// Of the beams of a side-looking sonar; none when the beam may point along the track.
    beams: Option<Beams>,
}

/// The two beams of a side-looking sonar, against the normal of the track.
#[derive(Clone, Copy, Debug)]
struct Beams {
    /// Angle off the normal: crab and beam error.
    off: Interval,
    cos_off: Interval,
    tan_off: Interval,
    /// Farthest end of the nadir gap, metres.
    gap_m: f64,
}

impl PieceGeometry {
    pub fn new(scene: &Scene<'_>, piece: &Piece, bounds: &Bounds) -> Self {
        let heading = Interval::point(piece.heading_rad);
        let ratio = bounds.dead_reckoning.drift_mps / scene.vehicle.speed_mps;
        let altitude = bounds.altitude();
        // `libm::asin` is within 1 ulp; the resolution of angles covers it many times over.
        let crab_rad = (ratio < 1.0).then(|| libm::asin(ratio) + RESOLUTION_RAD);
        let beams = match scene.sonar.kind {
            SonarKind::SideLooking { nadir_gap_rad } => crab_rad
                .map(|crab_rad| crab_rad + scene.sonar.bearing_error_rad + RESOLUTION_RAD)
                .filter(|&off| off < 1.0)
                .map(|off| {
                    let off = Interval::new(-off, off);
                    let nadir_gap = Interval::point(nadir_gap_rad);
                    let gap = (altitude * nadir_gap.sin()) / nadir_gap.cos();
                    Beams { off, cos_off: off.cos(), tan_off: off.sin() / off.cos(), gap_m: gap.hi() }
                }),
            SonarKind::ForwardLooking { .. } => None,
        };
        Self { sin: heading.sin(), cos: heading.cos(), altitude, crab_rad, beams }
    }

    /// Adds the certain sightings of a landmark from `piece`, which is on the heading of this geometry.
    pub fn sightings(
        &self,
        scene: &Scene<'_>,
        piece: &Piece,
        landmark: usize,
        found: &mut Vec<CertainSighting>,
    ) {
        let approach = Approach::new(scene, piece, landmark, self);
        match scene.sonar.kind {
            SonarKind::SideLooking { .. } => found.extend(approach.abeam()),
            SonarKind::ForwardLooking { half_sector_rad } => {
                let entering = approach.entering(half_sector_rad);
                if entering.is_some() {
                    found.extend(approach.leaving(half_sector_rad));
                }
                found.extend(entering);
            }
        }
    }
}

/// World direction, less γ, of a landmark that a beam of a side-looking sonar sees on a side of the track (1 for
/// starboard, −1 for port); none when the beam may point along the track.
pub(super) fn beam_bearing(geometry: &PieceGeometry, side: f64, heading_rad: f64) -> Option<Interval> {
    let off = geometry.beams?.off;
    let quarter = Interval::point(side * std::f64::consts::FRAC_PI_2) + Interval::around(0.0, RESOLUTION_RAD);
    Some((quarter + off) + Interval::point(heading_rad))
}

/// One landmark's box seen from one straight piece of the track.
struct Approach<'a> {
    scene: &'a Scene<'a>,
    piece: &'a Piece,
    geometry: &'a PieceGeometry,
    landmark: usize,
    /// Along the piece from its start, metres.
    ahead: Interval,
    /// To starboard of the piece, metres.
    starboard: Interval,
}

impl<'a> Approach<'a> {
    fn new(scene: &'a Scene<'a>, piece: &'a Piece, number: usize, geometry: &'a PieceGeometry) -> Self {
        let landmark: &Landmark = &scene.landmarks[number];
        let b = landmark.bounds();
        let slack = Interval::around(0.0, RESOLUTION_M);
        let east = b.east - Interval::point(piece.start.east_m) + slack;
        let north = b.north - Interval::point(piece.start.north_m) + slack;
        let (sin, cos) = (geometry.sin, geometry.cos);
        Self {
            scene,
            piece,
            geometry,
            landmark: number,
            ahead: east * sin + north * cos,
            starboard: east * cos - north * sin,
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
            theta,
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
        horizontal_range(lo.hull(hi).intersection(Interval::new(0.0, f64::INFINITY)), self.geometry.altitude)
    }

    /// Side-looking sonar: the beam passes the landmark.
    fn abeam(&self) -> Option<CertainSighting> {
        let sonar = &self.scene.sonar;
        let across = self.across()?;
        let beams = self.geometry.beams?;
        let rho = across / beams.cos_off;
        let slant = (rho.sqr() + self.geometry.altitude.sqr()).sqrt();
        let is_in_swath =
            slant.lo() > sonar.range_min_m && slant.hi() < sonar.range_max_m && rho.lo() > beams.gap_m;
        if !is_in_swath {
            return None;
        }
        let window = self.ahead + across * beams.tan_off;
        let side = if self.starboard.lo() > 0.0 { 1.0 } else { -1.0 };
        let theta = beam_bearing(self.geometry, side, self.piece.heading_rad)?;
        self.certain(window, self.composed_range(slant), theta)
    }

    /// Forward-looking sonar: the landmark comes within the far range while inside the sector.
    fn entering(&self, half_sector_rad: f64) -> Option<CertainSighting> {
        let sonar = &self.scene.sonar;
        let slant = Interval::point(sonar.range_max_m);
        let far = horizontal_range(slant, self.geometry.altitude);
        let forward = (far.sqr() - self.starboard.sqr()).sqrt();
        let near = horizontal_range(Interval::point(sonar.range_min_m), self.geometry.altitude);
        if far.is_empty() || forward.is_empty() || forward.lo() <= 0.0 {
            return None;
        }
        // A landmark nearer than the nearest range would enter from inside.
        if !near.is_empty() && near.hi() >= far.lo() {
            return None;
        }
        let bearing = bearing_of(self.starboard, forward);
        let crab = Interval::around(0.0, self.geometry.crab_rad?);
        let relative = bearing + crab;
        let inside = Interval::new(-half_sector_rad, half_sector_rad);
        if !(inside.contains_interval(relative)
            && relative.hi() < half_sector_rad
            && relative.lo() > -half_sector_rad)
        {
            return None;
        }
        let twice_error = Interval::around(0.0, 2.0 * sonar.bearing_error_rad + RESOLUTION_RAD);
        let theta = bearing + twice_error + Interval::point(self.piece.heading_rad);
        self.certain(self.ahead - forward, self.composed_range(slant), theta)
    }

    /// Forward-looking sonar: the landmark leaves across the edge of the sector, having entered.
    fn leaving(&self, half_sector_rad: f64) -> Option<CertainSighting> {
        let sonar = &self.scene.sonar;
        let across = self.across()?;
        let edge = Interval::around(half_sector_rad, self.geometry.crab_rad?);
        if edge.hi() > LEAVING_SECTOR_MAX_RAD || edge.lo() <= 0.0 {
            return None;
        }
        let rho = across / edge.sin();
        let slant = (rho.sqr() + self.geometry.altitude.sqr()).sqrt();
        if slant.lo() <= sonar.range_min_m || slant.hi() >= sonar.range_max_m {
            return None;
        }
        let window = self.ahead - across * (edge.cos() / edge.sin());
        let side = if self.starboard.lo() > 0.0 { edge } else { -edge };
        let twice_error = Interval::around(0.0, 2.0 * sonar.bearing_error_rad + RESOLUTION_RAD);
        let theta = side + twice_error + Interval::point(self.piece.heading_rad);
        self.certain(window, self.composed_range(slant), theta)
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
