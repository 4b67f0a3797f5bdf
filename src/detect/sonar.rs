//! When landmarks are detected: abeam for side-looking sonar, on entering and leaving the sector for forward-looking.

use std::f64::consts::FRAC_PI_2;

use nalgebra::Vector2;

use super::motion::{Stop, TrueLeg};
use super::{Errors, Scene, Sighting, SightingErrors, vector};
use crate::frame::LocalPoint;
use crate::interval::{Box2, larger, smaller};
use crate::track::plan::{direction, wrap};
use crate::vehicle::SonarKind;

/// All detections of a dive, in no particular order.
pub(super) fn sightings(scene: &Scene<'_>, legs: &[TrueLeg], errors: &impl Errors) -> Vec<Stop> {
    let mut stops = Vec::new();
    for number in landmarks_near(scene, legs) {
        if errors.is_gone(number, scene.gone_chance) {
            continue;
        }
        let landmark = &scene.landmarks[number];
        let f = errors.landmark(number);
        let position = vector(landmark.position)
            + Vector2::new(f.x * landmark.half_width_east_m, f.y * landmark.half_width_north_m);
        let target = Target { scene, legs, number, position };
        match scene.sonar.kind {
            SonarKind::SideLooking { nadir_gap_rad } => {
                for (way, side) in [(0, -FRAC_PI_2), (1, FRAC_PI_2)] {
                    target.abeam(side, nadir_gap_rad, way, errors.sighting(number, way), &mut stops);
                }
            }
            SonarKind::ForwardLooking { half_sector_rad } => {
                let e = [errors.sighting(number, 0), errors.sighting(number, 1)];
                target.through_sector(half_sector_rad, e, &mut stops);
            }
        }
    }
    stops
}

/// Numbers of the landmarks that could be in reach of some leg, ascending.
fn landmarks_near(scene: &Scene<'_>, legs: &[TrueLeg]) -> Vec<usize> {
    let mut near: Vec<usize> = legs
        .iter()
        .flat_map(|leg| {
            let end = leg.point_at(leg.length_m);
            let ends = [LocalPoint::new(leg.start.x, leg.start.y), LocalPoint::new(end.x, end.y)];
            // Slant range bounds horizontal range, so this box holds everything in reach.
            let reach =
                Box2::around(LocalPoint::new(0.0, 0.0), scene.sonar.range_max_m, scene.sonar.range_max_m);
            scene.index.meeting(Box2::hull_of(&ends).minkowski_sum(reach))
        })
        .collect();
    near.sort_unstable();
    near.dedup();
    near
}

fn cross(a: Vector2<f64>, b: Vector2<f64>) -> f64 {
    a.x * b.y - a.y * b.x
}

/// One landmark, its true position, and the motion past it.
struct Target<'a> {
    scene: &'a Scene<'a>,
    legs: &'a [TrueLeg],
    number: usize,
    position: Vector2<f64>,
}

impl Target<'_> {
    /// Detections by the beam on one side (`side` is ±π/2 from the bow, plus the beam error).
    ///
    /// On a leg the beam is a ray of fixed direction that moves with the vehicle: it meets the landmark where
    /// cross(ray, landmark − position) = 0. At a joint of two legs the bow swings; where that expression changes sign
    /// there, the beam swept over the landmark on the spot.
    fn abeam(&self, side: f64, nadir_gap_rad: f64, way: usize, e: SightingErrors, stops: &mut Vec<Stop>) {
        let pointing = side + e.bearing * self.scene.sonar.bearing_error_rad;
        let ray = |leg: &TrueLeg| direction(leg.bow_rad + pointing);
        for (number, leg) in self.legs.iter().enumerate().filter(|(_, leg)| leg.sees) {
            let from_start = self.position - leg.start;
            let beam = ray(leg);
            let advance = cross(beam, leg.course);
            let run_m = cross(beam, from_start) / advance;
            if (0.0..leg.length_m).contains(&run_m) {
                let range_m = beam.dot(&(self.position - leg.point_at(run_m)));
                self.side_stop(number, run_m, leg.bow_rad, range_m, side, nadir_gap_rad, way, e, stops);
            }
            let Some(next) = self.legs.get(number + 1).filter(|next| next.sees) else { continue };
            let from_joint = self.position - next.start;
            let (before, after) = (cross(beam, from_joint), cross(ray(next), from_joint));
            if before * after < 0.0 && beam.dot(&from_joint) > 0.0 && ray(next).dot(&from_joint) > 0.0 {
                let bow_rad = libm::atan2(from_joint.x, from_joint.y) - pointing;
                let range_m = from_joint.norm();
                self.side_stop(number, leg.length_m, bow_rad, range_m, side, nadir_gap_rad, way, e, stops);
            }
        }
    }

    #[allow(
        clippy::too_many_arguments,
        reason = "one private call site per geometry; a struct would only rename them"
    )]
    fn side_stop(
        &self,
        leg: usize,
        run_m: f64,
        bow_rad: f64,
        range_m: f64,
        side: f64,
        nadir_gap_rad: f64,
        way: usize,
        e: SightingErrors,
        stops: &mut Vec<Stop>,
    ) {
        let sonar = &self.scene.sonar;
        let altitude_m = self.altitude_m(e);
        let slant_m = libm::hypot(range_m, altitude_m);
        let is_seen = range_m > 0.0
            && (sonar.range_min_m..=sonar.range_max_m).contains(&slant_m)
            && range_m >= altitude_m * libm::tan(nadir_gap_rad);
        if is_seen {
            self.report(leg, run_m, bow_rad, slant_m, side, way, e, stops);
        }
    }

    /// Detections by a forward sector: where the landmark enters and where it leaves.
    ///
    /// On a leg the sector's limits are met at roots of two circles (near and far range) and two rays (the edges of
    /// the sector); between neighbouring roots the landmark is inside throughout or outside throughout.
    fn through_sector(&self, half_sector_rad: f64, e: [SightingErrors; 2], stops: &mut Vec<Stop>) {
        let sonar = &self.scene.sonar;
        let altitude_m = self.altitude_m(e[0]);
        let square = |range_m: f64| (range_m * range_m - altitude_m * altitude_m).clamp(0.0, f64::INFINITY);
        let (near_m2, far_m2) = (square(sonar.range_min_m), square(sonar.range_max_m));
        let is_inside = |leg: &TrueLeg, run_m: f64| {
            let to = self.position - leg.point_at(run_m);
            let relative = wrap(libm::atan2(to.x, to.y) - leg.bow_rad);
            leg.sees && (near_m2..=far_m2).contains(&to.norm_squared()) && relative.abs() <= half_sector_rad
        };
        let mut was_inside = false;
        for (number, leg) in self.legs.iter().enumerate() {
            let mut roots = vec![0.0];
            let from_start = self.position - leg.start;
            let (b, c) = (leg.course.dot(&from_start), from_start.norm_squared());
            for r2 in [near_m2, far_m2] {
                let discriminant = b * b - (c - r2);
                if discriminant > 0.0 {
                    roots.extend([b - discriminant.sqrt(), b + discriminant.sqrt()]);
                }
            }
            for edge in [-half_sector_rad, half_sector_rad] {
                let ray = direction(leg.bow_rad + edge);
                roots.push(cross(ray, from_start) / cross(ray, leg.course));
            }
            roots.retain(|r| (0.0..leg.length_m).contains(r));
            roots.push(leg.length_m);
            roots.sort_by(f64::total_cmp);
            for span in roots.windows(2) {
                let inside = is_inside(leg, 0.5 * (span[0] + span[1]));
                if inside != was_inside {
                    let way = usize::from(was_inside);
                    // When the bow swings at a joint, the leg on which the landmark is inside gives the heading.
                    let seen_from = if way == 1 && span[0] == 0.0 { number - 1 } else { number };
                    let run_m = if seen_from == number { span[0] } else { self.legs[seen_from].length_m };
                    self.sector_stop(seen_from, run_m, way, e[way], altitude_m, stops);
                }
                was_inside = inside;
            }
        }
        if was_inside {
            let last = self.legs.len() - 1;
            self.sector_stop(last, self.legs[last].length_m, 1, e[1], altitude_m, stops);
        }
    }

    fn sector_stop(
        &self,
        leg: usize,
        run_m: f64,
        way: usize,
        e: SightingErrors,
        altitude_m: f64,
        stops: &mut Vec<Stop>,
    ) {
        let bow_rad = self.legs[leg].bow_rad;
        let to = self.position - self.legs[leg].point_at(run_m);
        let slant_m = libm::hypot(to.norm(), altitude_m);
        let relative = wrap(libm::atan2(to.x, to.y) - bow_rad);
        let measured = relative - e.bearing * self.scene.sonar.bearing_error_rad;
        self.report(leg, run_m, bow_rad, slant_m, measured, way, e, stops);
    }

    fn altitude_m(&self, e: SightingErrors) -> f64 {
        let sonar = &self.scene.sonar;
        // A vehicle is never below the seabed; both limits lie within the altitude's bound.
        larger(sonar.altitude_m + e.altitude * sonar.altitude_error_m, 0.0)
    }

    #[allow(clippy::too_many_arguments, reason = "one private helper; a struct would only rename them")]
    fn report(
        &self,
        leg: usize,
        run_m: f64,
        bow_rad: f64,
        slant_m: f64,
        measured_bearing_rad: f64,
        way: usize,
        e: SightingErrors,
        stops: &mut Vec<Stop>,
    ) {
        let sonar = &self.scene.sonar;
        if e.chance >= sonar.detection_chance {
            return;
        }
        let bound_m = sonar.range_error_m + sonar.range_error_fraction * slant_m;
        let from = &self.legs[leg];
        stops.push(Stop {
            along_m: from.along_m + smaller(run_m, from.length_m),
            leg,
            run_m,
            sighting: Some(Sighting {
                slant_range_m: larger(slant_m + e.range * bound_m, 0.0),
                relative_bearing_rad: measured_bearing_rad,
                // The compass errs by the same bias and noise as on the leg, also while the bow swings at its end.
                heading_rad: from.reported_heading_rad + (bow_rad - from.bow_rad),
            }),
            landmark: Some(self.number),
            tie: way,
        });
    }
}
