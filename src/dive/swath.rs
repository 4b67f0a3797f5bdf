//! Lines along which nothing will be seen, and the offset that would change it.

use rstar::primitives::GeomWithData;
use rstar::{AABB, RTree};

use crate::frame::LocalPoint;
use crate::interval::{larger, smaller};
use crate::map::Landmark;
use crate::problem::Findings;
use crate::track::Line;
use crate::units::{bearing_words, length_words};
use crate::vehicle::{Sonar, SonarKind};

/// Warns of lines along which nothing will be seen, with the offset that would change it.
pub(super) fn check(landmarks: &[Landmark], lines: &[Line], sonar: &Sonar, findings: &mut Findings) {
    if landmarks.is_empty() {
        return;
    }
    let (near, far) = (sonar.nearest_m(), sonar.reach_m());
    let side_looking = matches!(sonar.kind, SonarKind::SideLooking { .. });
    let tree: RTree<GeomWithData<[f64; 2], usize>> = RTree::bulk_load(
        landmarks
            .iter()
            .enumerate()
            .map(|(i, l)| GeomWithData::new([l.position.east_m, l.position.north_m], i))
            .collect(),
    );
    for line in lines {
        let seen = line.waypoints.windows(2).any(|leg| {
            let low =
                [smaller(leg[0].east_m, leg[1].east_m) - far, smaller(leg[0].north_m, leg[1].north_m) - far];
            let high =
                [larger(leg[0].east_m, leg[1].east_m) + far, larger(leg[0].north_m, leg[1].north_m) + far];
            tree.locate_in_envelope(AABB::from_corners(low, high)).any(|p| {
                let near_leg = NearLeg::of(leg[0], leg[1], landmarks[p.data].position);
                (near..=far).contains(&near_leg.distance_m) && (near_leg.is_abeam || !side_looking)
            })
        });
        if seen {
            continue;
        }
        let Some((NearLeg { distance_m: distance, foot, .. }, landmark)) = nearest(&tree, landmarks, line)
        else {
            continue;
        };
        let middle = 0.5 * (near + far);
        let toward = foot.bearing_rad(landmark.position);
        // Inside the gap the line has to move away from the landmark, beyond reach toward it.
        let bearing = if distance < near { toward + std::f64::consts::PI } else { toward };
        findings.warn(
            None,
            format!(
                "line \"{}\": 0 detections expected, no landmark lies {} to {} from it (the nearest, {}, is {} away); an \
                 offset of {} toward {} would bring it into the middle of the swath",
                line.name,
                length_words(near),
                length_words(far),
                landmark.id,
                length_words(distance),
                length_words((distance - middle).abs()),
                bearing_words(bearing),
            ),
        );
    }
}

/// The landmark nearest to a line.
fn nearest<'l>(
    tree: &RTree<GeomWithData<[f64; 2], usize>>,
    landmarks: &'l [Landmark],
    line: &Line,
) -> Option<(NearLeg, &'l Landmark)> {
    let mut best: Option<(NearLeg, &Landmark)> = None;
    for leg in line.waypoints.windows(2) {
        let middle = [0.5 * (leg[0].east_m + leg[1].east_m), 0.5 * (leg[0].north_m + leg[1].north_m)];
        let half = 0.5 * leg[0].distance_m(leg[1]);
        // No point of the leg is farther than half its length from the middle: once landmarks are farther from the
        // middle than that plus the best distance, none of the rest is nearer.
        for (p, distance_2) in tree.nearest_neighbor_iter_with_distance_2(middle) {
            if best.as_ref().is_some_and(|(b, _)| distance_2 > (half + b.distance_m).powi(2)) {
                break;
            }
            let here = NearLeg::of(leg[0], leg[1], landmarks[p.data].position);
            if best.as_ref().is_none_or(|(b, _)| here.distance_m < b.distance_m) {
                best = Some((here, &landmarks[p.data]));
            }
        }
    }
    best
}

/// Where a point lies from a leg.
#[derive(Clone, Copy)]
struct NearLeg {
    distance_m: f64,
    /// The nearest point of the leg.
    foot: LocalPoint,
    /// Whether the point comes abeam somewhere along the leg.
    is_abeam: bool,
}

impl NearLeg {
    fn of(a: LocalPoint, b: LocalPoint, p: LocalPoint) -> Self {
        let (de, dn) = (b.east_m - a.east_m, b.north_m - a.north_m);
        let along = ((p.east_m - a.east_m) * de + (p.north_m - a.north_m) * dn) / (de * de + dn * dn);
        let t = along.clamp(0.0, 1.0);
        let foot = LocalPoint::new(a.east_m + t * de, a.north_m + t * dn);
        Self { distance_m: foot.distance_m(p), foot, is_abeam: (0.0..=1.0).contains(&along) }
    }
}
