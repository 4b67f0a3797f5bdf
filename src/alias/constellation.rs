//! From a component to what is reported of it: landmarks that all agree, offset, turn, disagreement, break scale.

use super::components::Component;
use super::near::Near;
use super::tolerance::{AgreementBounds, Tolerance};
use super::triangles::{Agreement, Match};
use crate::frame::LocalPoint;
use crate::interval::{larger, smaller};
use crate::map::Landmark;
use crate::track::plan::wrap;

/// Triangles of a component from which a constellation is grown.
const SEEDS_MAX: usize = 12;
/// Width of the bracket at which the search for the break scale stops.
const SCALE_RESOLUTION: f64 = 1e-9;

/// Matches of which every two agree, and how one ground is laid over the other.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Constellation {
    /// In order of their first landmarks.
    pub(super) matches: Vec<Match>,
    pub(super) overlay: Overlay,
    pub(super) rms_m: f64,
    pub(super) worst_m: f64,
}

/// Turn and shift that lay ground 1 over ground 2.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Overlay {
    /// Middle of ground 1: mean of its charted positions.
    pub(super) middle_1: LocalPoint,
    /// Middle of ground 2.
    pub(super) middle_2: LocalPoint,
    /// Turn about the middle, radians clockwise.
    pub(super) turn_rad: f64,
}

impl Overlay {
    /// Least squares over charted positions, the turn kept within `half_rad` of `centre_rad`.
    fn fit(landmarks: &[Landmark], matches: &[Match], (centre_rad, half_rad): (f64, f64)) -> Self {
        let middle_1 = middle(landmarks, matches.iter().map(|m| m.0));
        let middle_2 = middle(landmarks, matches.iter().map(|m| m.1));
        let (mut dot, mut cross) = (0.0, 0.0);
        for &(i, j) in matches {
            let (a, b) = (arm(landmarks, middle_1, i), arm(landmarks, middle_2, j));
            dot += a.0 * b.0 + a.1 * b.1;
            cross += b.0 * a.1 - b.1 * a.0;
        }
        let off = wrap(libm::atan2(cross, dot) - centre_rad);
        let turn_rad = wrap(centre_rad + larger(-half_rad, smaller(off, half_rad)));
        Self { middle_1, middle_2, turn_rad }
    }

    /// Where a point of ground 1 comes to lie on ground 2.
    pub(super) fn there(&self, p: LocalPoint) -> LocalPoint {
        moved(p, self.middle_1, self.middle_2, self.turn_rad)
    }

    /// Where a point of ground 2 comes to lie on ground 1.
    pub(super) fn back(&self, p: LocalPoint) -> LocalPoint {
        moved(p, self.middle_2, self.middle_1, -self.turn_rad)
    }

    fn miss_m(&self, landmarks: &[Landmark], (i, j): Match) -> f64 {
        self.there(landmarks[i as usize].position).distance_m(landmarks[j as usize].position)
    }

    /// Distance between the middles, metres.
    pub(super) fn apart_m(&self) -> f64 {
        self.middle_1.distance_m(self.middle_2)
    }
}

fn moved(p: LocalPoint, from: LocalPoint, to: LocalPoint, turn_rad: f64) -> LocalPoint {
    let (e, n) = (p.east_m - from.east_m, p.north_m - from.north_m);
    let (sin, cos) = (libm::sin(turn_rad), libm::cos(turn_rad));
    LocalPoint::new(to.east_m + e * cos + n * sin, to.north_m + n * cos - e * sin)
}

/// Mean of charted positions.
pub(super) fn middle(landmarks: &[Landmark], numbers: impl Iterator<Item = u32> + Clone) -> LocalPoint {
    let count = numbers.clone().count() as f64;
    // Summed from the first one on, so that large grid values lose no digits.
    let origin = numbers.clone().next().map_or(LocalPoint::new(0.0, 0.0), |i| landmarks[i as usize].position);
    let (e, n) = numbers.fold((0.0, 0.0), |(e, n), i| {
        let p = landmarks[i as usize].position;
        (e + (p.east_m - origin.east_m), n + (p.north_m - origin.north_m))
    });
    LocalPoint::new(origin.east_m + e / count, origin.north_m + n / count)
}

fn arm(landmarks: &[Landmark], from: LocalPoint, i: u32) -> (f64, f64) {
    let p = landmarks[i as usize].position;
    (p.east_m - from.east_m, p.north_m - from.north_m)
}

/// The largest set of matches of the component found in which every two agree. A component holds more where one landmark
/// may be taken for several, and where matches hang together only through others between them.
pub(super) fn constellation(
    component: &Component,
    landmarks: &[Landmark],
    agreement: &Agreement<'_>,
) -> Constellation {
    let turns = agreement.turns();
    let count = component.triangles.len();
    let seeds = if count < SEEDS_MAX { count } else { SEEDS_MAX };
    let mut best: Vec<Match> = Vec::new();
    for seed in 0..seeds {
        let triangle = component.triangles[seed * count / seeds];
        let mut overlay = Overlay::fit(landmarks, &triangle, turns);
        // Three landmarks tell the shift well and the turn badly.
        overlay.turn_rad = turns.0;
        let first = grown(&triangle, component, &overlay, landmarks, agreement);
        let refitted = Overlay::fit(landmarks, &first, turns);
        let second = grown(&[], component, &refitted, landmarks, agreement);
        for grown in [first, second] {
            if grown.len() > best.len() {
                best = grown;
            }
        }
    }
    best.sort_unstable();
    let overlay = Overlay::fit(landmarks, &best, turns);
    let misses: Vec<f64> = best.iter().map(|&m| overlay.miss_m(landmarks, m)).collect();
    let squares: f64 = misses.iter().map(|miss| miss * miss).sum();
    Constellation {
        rms_m: libm::sqrt(squares / misses.len() as f64),
        worst_m: misses.into_iter().fold(0.0, larger),
        matches: best,
        overlay,
    }
}

/// `start` and all matches that agree with every one taken before, those that fit the overlay best first.
fn grown(
    start: &[Match],
    component: &Component,
    overlay: &Overlay,
    landmarks: &[Landmark],
    agreement: &Agreement<'_>,
) -> Vec<Match> {
    let mut order: Vec<(f64, Match)> =
        component.matches.iter().map(|&m| (overlay.miss_m(landmarks, m), m)).collect();
    order.sort_unstable_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
    let mut taken = start.to_vec();
    for (_, candidate) in order {
        if taken.iter().all(|&other| agreement.joins_far(candidate, other)) {
            taken.push(candidate);
        }
    }
    taken
}

/// The factor to which all bounds have to shrink before no triangle of the component is left, by bisection: an upper end
/// within 10⁻⁹ at which one still is.
pub(super) fn break_scale(component: &Component, near: &Near<'_>, bounds: &AgreementBounds) -> f64 {
    let (mut low, mut high) = (0.0, 1.0);
    let mut left = component.triangles.clone();
    while high - low > SCALE_RESOLUTION {
        let scale = 0.5 * (low + high);
        let agreement = Tolerance::at(bounds, component.window, scale)
            .map(|tolerance| Agreement::new(near, tolerance, component.window));
        let holding: Vec<_> = match &agreement {
            None => Vec::new(),
            Some(agreement) => left
                .iter()
                .copied()
                .filter(|[u, v, w]| {
                    agreement.joins(*u, *v) && agreement.joins(*u, *w) && agreement.joins(*v, *w)
                })
                .collect(),
        };
        if holding.is_empty() {
            low = scale;
        } else {
            (high, left) = (scale, holding);
        }
    }
    high
}
