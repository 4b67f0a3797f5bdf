//! Detections of things that are not on the map: unmapped or moved objects, false contacts.
//!
//! Placed either at random in the swath, or as **decoys**: taken from what the vehicle would detect if it ran the same
//! track somewhere else on the map, so that they speak for a wrong place. Decoys are the worse case.

use std::f64::consts::FRAC_PI_2;

use super::errors::NoErrors;
use super::motion::{Stop, TrueLeg, stop_at_mark};
use super::{Errors, Scene, Sighting, sonar, vector};
use crate::track::plan::Plan;
use crate::vehicle::SonarKind;

/// The strays of a dive, as stops of the log.
pub(super) fn strays(scene: &Scene<'_>, plan: &Plan, legs: &[TrueLeg], errors: &impl Errors) -> Vec<Stop> {
    let drawn = errors.strays(scene.sonar.strays_per_km, plan.length_m);
    if drawn.is_empty() {
        return Vec::new();
    }
    let mut decoys =
        errors.decoy(scene.landmarks.len()).map_or_else(Vec::new, |pair| decoys(scene, legs, pair));
    drawn
        .iter()
        .filter_map(|stray| {
            let place = stop_at_mark(legs, stray.along_m);
            if let Some(decoy) = take_nearest(&mut decoys, stray.along_m) {
                return Some(decoy);
            }
            let leg = &legs[place.leg];
            if !leg.sees {
                return None;
            }
            let (nearest_m, farthest_m) = (scene.sonar.nearest_m(), scene.sonar.reach_m());
            let range_m = nearest_m + stray.range * (farthest_m - nearest_m);
            let relative_bearing_rad = match scene.sonar.kind {
                SonarKind::SideLooking { .. } => FRAC_PI_2.copysign(stray.across),
                SonarKind::ForwardLooking { half_sector_rad } => stray.across * half_sector_rad,
            };
            let sighting = Sighting {
                slant_range_m: libm::hypot(range_m, scene.sonar.altitude_m),
                relative_bearing_rad,
                heading_rad: leg.reported_heading_rad,
            };
            Some(Stop { sighting: Some(sighting), ..place })
        })
        .collect()
}

/// What would be detected on the same track moved from the surroundings of one landmark to those of another.
fn decoys(scene: &Scene<'_>, legs: &[TrueLeg], [from, to]: [usize; 2]) -> Vec<Stop> {
    let shift = vector(scene.landmarks[to].position) - vector(scene.landmarks[from].position);
    let moved: Vec<TrueLeg> = legs.iter().map(|leg| TrueLeg { start: leg.start + shift, ..*leg }).collect();
    let mut stops = sonar::sightings(scene, &moved, &NoErrors);
    for stop in &mut stops {
        stop.landmark = None;
    }
    stops.sort_by(|a, b| a.along_m.total_cmp(&b.along_m));
    stops
}

/// Takes out the decoy nearest along the track: no two strays are the same.
fn take_nearest(decoys: &mut Vec<Stop>, along_m: f64) -> Option<Stop> {
    let off = |stop: &Stop| (stop.along_m - along_m).abs();
    let nearest = (0..decoys.len()).min_by(|&a, &b| off(&decoys[a]).total_cmp(&off(&decoys[b])))?;
    Some(decoys.swap_remove(nearest))
}
