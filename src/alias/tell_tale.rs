//! What tells two grounds apart: the nearest landmark that is present on one of them only.
//!
//! A landmark k beside ground 1 has a counterpart when for some landmark l the match (k→l) agrees with every match of the
//! constellation. Without a counterpart its detection contradicts the other ground. (A stray budget above 0 lets the
//! vehicle put that many detections aside.)

use super::constellation::Constellation;
use super::triangles::{Agreement, Match};
use crate::frame::LocalPoint;
use crate::interval::{Box2, larger, smaller};
use crate::map::Landmark;
use crate::map::index::LandmarkIndex;
use crate::report::TellTale;

/// The nearest landmark present on ground `ground` (1 or 2) only; none when every landmark of the map has a counterpart.
pub(super) fn tell_tale(
    constellation: &Constellation,
    ground: u8,
    landmarks: &[Landmark],
    index: &LandmarkIndex,
    agreement: &Agreement<'_>,
) -> Option<TellTale> {
    let oriented = |k: u32, l: u32| -> Match { if ground == 1 { (k, l) } else { (l, k) } };
    let here = |m: &Match| if ground == 1 { m.0 } else { m.1 };
    let overlay = &constellation.overlay;
    let (middle, other_side): (LocalPoint, &dyn Fn(LocalPoint) -> LocalPoint) = if ground == 1 {
        (overlay.middle_1, &|p| overlay.there(p))
    } else {
        (overlay.middle_2, &|p| overlay.back(p))
    };
    let own: Vec<LocalPoint> =
        constellation.matches.iter().map(|m| landmarks[here(m) as usize].position).collect();
    let mut order: Vec<(f64, usize)> = landmarks
        .iter()
        .enumerate()
        .filter(|(k, _)| !constellation.matches.iter().any(|m| here(m) as usize == *k))
        .map(|(k, l)| (own.iter().fold(f64::INFINITY, |d, p| smaller(d, p.distance_m(l.position))), k))
        .collect();
    order.sort_unstable_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
    let (from_edge_m, number) = order.into_iter().find(|&(_, k)| {
        let position = landmarks[k].position;
        let farthest_m = own.iter().fold(0.0, |d, p| larger(d, p.distance_m(position)));
        // The fitted overlay misses each match by at most the worst disagreement.
        let reach_m = agreement.search_m(farthest_m) + constellation.worst_m;
        !index.meeting(Box2::around(other_side(position), reach_m, reach_m)).any(|l| {
            let counterpart = oriented(k as u32, l as u32);
            constellation.matches.iter().all(|&m| agreement.agrees_far(counterpart, m))
        })
    })?;
    let landmark = &landmarks[number];
    Some(TellTale {
        landmark: landmark.id.clone(),
        ground,
        from_edge_m,
        from_middle_m: middle.distance_m(landmark.position),
        number,
    })
}
