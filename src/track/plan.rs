//! The planned track: a line with turns of the vehicle's radius, as straight pieces.
//!
//! *Model.* At each waypoint the track leaves the leg early and joins the next one along a circular arc that touches
//! both (a fly-by turn). The arc is run as chords of at most [`TURN_STEP_RAD`] each, and these chords **are** the
//! track: the vehicle's true path, its reported travel and the solver all speak of the same polyline, so that no
//! curvature error is left to bound. At 20 m radius the chords lie within 3 mm of the arc.
//!
//! *Frame and units.* Working frame, metres, radians clockwise from grid north.

use std::f64::consts::PI;

use nalgebra::Vector2;

use super::Line;
use crate::frame::LocalPoint;
use crate::interval::smaller;

/// Largest change of heading between two chords of a turn, radians (2°).
pub const TURN_STEP_RAD: f64 = 2.0 * PI / 180.0;

/// Changes of heading above this are turned on the spot, radians (170°): a fly-by arc would leave the line far away.
const REVERSAL_RAD: f64 = 170.0 * PI / 180.0;

/// Legs shorter than this after the turns are left out, metres (shorter than any survey can place a waypoint).
const LEG_MIN_M: f64 = 1e-6;

/// A straight piece of the planned track.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Piece {
    /// Where it starts.
    pub start: LocalPoint,
    /// Direction, radians clockwise from grid north.
    pub heading_rad: f64,
    /// Length, metres, above 0.
    pub length_m: f64,
    /// Distance of its start along the track, metres.
    pub along_m: f64,
    /// Whether it belongs to a turn.
    pub in_turn: bool,
}

impl Piece {
    /// Unit vector (east, north) along the piece.
    pub fn direction(&self) -> Vector2<f64> {
        direction(self.heading_rad)
    }

    /// The point `run_m` metres after the start.
    pub fn point_at(&self, run_m: f64) -> LocalPoint {
        let d = self.direction();
        LocalPoint::new(self.start.east_m + run_m * d.x, self.start.north_m + run_m * d.y)
    }
}

/// Unit vector (east, north) of a heading.
pub fn direction(heading_rad: f64) -> Vector2<f64> {
    Vector2::new(libm::sin(heading_rad), libm::cos(heading_rad))
}

/// Something about a turn that differs from what the vehicle's turn radius asks for.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TurnNote {
    /// Waypoint number, from 1.
    pub waypoint: usize,
    /// Radius used, metres; 0 for a turn on the spot.
    pub radius_used_m: f64,
}

/// The track that the vehicle is asked to run.
#[derive(Clone, Debug, PartialEq)]
pub struct Plan {
    /// Straight pieces in order; never empty.
    pub pieces: Vec<Piece>,
    /// Length of the track, metres.
    pub length_m: f64,
    /// Turns made tighter than the turn radius because the legs are too short, or on the spot.
    pub notes: Vec<TurnNote>,
}

impl Plan {
    /// The track of `line` with turns of `turn_radius_m`.
    ///
    /// Where the legs beside a waypoint are too short for the turn, the radius is reduced to what fits, and reported
    /// in [`Plan::notes`].
    ///
    /// # Panics
    /// When the line has fewer than two distinct waypoints (refused when the file is read).
    pub fn new(line: &Line, turn_radius_m: f64) -> Self {
        let points: Vec<Vector2<f64>> =
            line.waypoints.iter().map(|p| Vector2::new(p.east_m, p.north_m)).collect();
        let mut builder = Builder { pieces: Vec::new(), at: points[0], along_m: 0.0 };
        let mut notes = Vec::new();
        for i in 1..points.len().saturating_sub(1) {
            let (before, after) = (points[i] - points[i - 1], points[i + 1] - points[i]);
            let (in_rad, out_rad) = (libm::atan2(before.x, before.y), libm::atan2(after.x, after.y));
            let change = wrap(out_rad - in_rad);
            if turn_radius_m == 0.0 || change.abs() >= REVERSAL_RAD {
                if turn_radius_m > 0.0 {
                    notes.push(TurnNote { waypoint: i + 1, radius_used_m: 0.0 });
                }
                builder.straight_to(points[i]);
                continue;
            }
            // Each interior leg is shared by two turns, so a turn may use half of it; the first and last leg are
            // used by one turn only.
            let share = |leg: f64, is_end: bool| if is_end { leg } else { 0.5 * leg };
            let room = smaller(share(before.norm(), i == 1), share(after.norm(), i + 2 == points.len()));
            let half = libm::tan(0.5 * change.abs());
            let mut radius_m = turn_radius_m;
            if radius_m * half > room {
                radius_m = room / half;
                notes.push(TurnNote { waypoint: i + 1, radius_used_m: radius_m });
            }
            builder.straight_to(points[i] - before.normalize() * (radius_m * half));
            builder.arc(in_rad, change, radius_m);
        }
        builder.straight_to(points[points.len() - 1]);
        assert!(!builder.pieces.is_empty(), "a line has at least two distinct waypoints");
        Self { length_m: builder.along_m, pieces: builder.pieces, notes }
    }

    /// A straight track from `start` on `heading_rad`. The heading is taken as it is, so that many tracks on one heading
    /// have it to the last digit.
    ///
    /// # Panics
    /// When `length_m` is not above 0.
    pub fn straight(start: LocalPoint, heading_rad: f64, length_m: f64) -> Self {
        assert!(length_m > 0.0, "a track has a length");
        let piece = Piece { start, heading_rad, length_m, along_m: 0.0, in_turn: false };
        Self { pieces: vec![piece], length_m, notes: Vec::new() }
    }

    /// The same track moved by `east_m` and `north_m`.
    #[must_use]
    pub fn moved(&self, east_m: f64, north_m: f64) -> Self {
        let mut moved = self.clone();
        for piece in &mut moved.pieces {
            piece.start = LocalPoint::new(piece.start.east_m + east_m, piece.start.north_m + north_m);
        }
        moved
    }

    /// Length of the track that lies in turns, metres.
    pub fn turn_length_m(&self) -> f64 {
        // The empty sum of floats is −0; the 0 in front makes it 0.
        self.pieces.iter().filter(|p| p.in_turn).fold(0.0, |sum, p| sum + p.length_m)
    }

    /// The point at a distance along the track, clamped to its ends.
    pub fn point_at(&self, along_m: f64) -> LocalPoint {
        let piece = &self.pieces[self.piece_at(along_m)];
        piece.point_at((along_m - piece.along_m).clamp(0.0, piece.length_m))
    }

    /// Points of the track between two distances along it, both ends included.
    pub fn path(&self, from_m: f64, to_m: f64) -> Vec<LocalPoint> {
        let mut path = vec![self.point_at(from_m)];
        path.extend(self.pieces.iter().filter(|p| from_m < p.along_m && p.along_m < to_m).map(|p| p.start));
        path.push(self.point_at(to_m));
        path
    }

    /// Number of the piece that holds a distance along the track.
    fn piece_at(&self, along_m: f64) -> usize {
        self.pieces.partition_point(|p| p.along_m <= along_m).saturating_sub(1)
    }
}

struct Builder {
    pieces: Vec<Piece>,
    at: Vector2<f64>,
    along_m: f64,
}

impl Builder {
    fn straight_to(&mut self, to: Vector2<f64>) {
        self.piece_to(to, false);
    }

    fn piece_to(&mut self, to: Vector2<f64>, in_turn: bool) {
        let run = to - self.at;
        let length_m = run.norm();
        if length_m <= LEG_MIN_M {
            return;
        }
        self.pieces.push(Piece {
            start: LocalPoint::new(self.at.x, self.at.y),
            heading_rad: libm::atan2(run.x, run.y),
            length_m,
            along_m: self.along_m,
            in_turn,
        });
        self.at = to;
        self.along_m += length_m;
    }

    fn arc(&mut self, in_rad: f64, change: f64, radius_m: f64) {
        let steps = (change.abs() / TURN_STEP_RAD).ceil().clamp(1.0, 200.0);
        let side = change.signum();
        let to_centre = direction(in_rad + side * 0.5 * PI) * radius_m;
        let centre = self.at + to_centre;
        let count = steps as usize;
        for k in 1..=count {
            let turned = in_rad + change * k as f64 / steps;
            self.piece_to(centre - direction(turned + side * 0.5 * PI) * radius_m, true);
        }
    }
}

/// The same angle in (−π, π].
pub fn wrap(angle_rad: f64) -> f64 {
    let turned = libm::remainder(angle_rad, 2.0 * PI);
    if turned <= -PI { turned + 2.0 * PI } else { turned }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn line(points: &[(f64, f64)]) -> Line {
        Line { name: "L".into(), waypoints: points.iter().map(|&(e, n)| LocalPoint::new(e, n)).collect() }
    }

    #[test]
    fn a_right_angle_is_rounded_with_the_radius() {
        let plan = Plan::new(&line(&[(0.0, 0.0), (0.0, 100.0), (100.0, 100.0)]), 20.0);
        // Two legs of 80 m and a quarter circle of 20 m radius, run as chords.
        let arc = 20.0 * 0.5 * PI;
        assert!((plan.length_m - (160.0 + arc)).abs() < 0.01, "{}", plan.length_m);
        assert!((plan.turn_length_m() - arc).abs() < 0.01);
        assert!(
            plan.pieces
                .windows(2)
                .all(|w| wrap(w[1].heading_rad - w[0].heading_rad).abs() <= TURN_STEP_RAD + 1e-9)
        );
        let end = plan.point_at(plan.length_m);
        assert!(end.distance_m(LocalPoint::new(100.0, 100.0)) < 1e-9);
        assert!(plan.notes.is_empty());
    }

    #[test]
    fn short_legs_tighten_the_turn_and_say_so() {
        let plan = Plan::new(&line(&[(0.0, 0.0), (0.0, 10.0), (100.0, 10.0)]), 50.0);
        assert_eq!(plan.notes, [TurnNote { waypoint: 2, radius_used_m: plan.notes[0].radius_used_m }]);
        assert!((plan.notes[0].radius_used_m - 10.0).abs() < 1e-9);
    }

    #[test]
    fn a_reversal_turns_on_the_spot() {
        let plan = Plan::new(&line(&[(0.0, 0.0), (0.0, 100.0), (0.0, 0.0)]), 20.0);
        assert_eq!(plan.pieces.len(), 2);
        assert_eq!(plan.notes[0].radius_used_m, 0.0);
        assert!((plan.length_m - 200.0).abs() < 1e-9);
    }

    #[test]
    fn a_path_runs_through_its_joints() {
        let plan = Plan::new(&line(&[(0.0, 0.0), (0.0, 100.0), (100.0, 100.0)]), 0.0);
        let path = plan.path(50.0, 150.0);
        assert_eq!(
            path,
            [LocalPoint::new(0.0, 50.0), LocalPoint::new(0.0, 100.0), LocalPoint::new(50.0, 100.0)]
        );
    }
}
