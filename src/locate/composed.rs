//! The guarantee: one run with composed bounds that holds every feasible set of every admissible dive along a track.
//!
//! *Idea.* Let the vehicle really run the planned track. Whatever it measures lies within the bounds of the truth, and
//! whatever another position explains lies within the bounds of the measurement. So another position's ideal values
//! lie within **twice composed** bounds of the truth's, and the truth's are known: they follow from the track and the
//! map. The solver is run once on these ideal values with the composed bounds. Call its result W(s), the set at
//! distance s along the track, and X(s) the feasible set of a dive.
//!
//! *Claim.* X(s) ⊆ W(s), for every dive along the track within the bounds, at every s at which W is evaluated.
//!
//! *Proof.* Take a dive, a history that its solver keeps, and write ′ for the values of that history. It suffices to
//! show that each step of the history is allowed in W; every operation is monotone, so the cells follow.
//!
//! 1. *Travel.* Through-water motion w(t) of the truth is reported as ρ(t), ψ(t) with |w| = ρ(1 + σ),
//!    dir w = ψ + β + ν. The history moves by ρ(1 + σ′) in direction ψ + β′ + ν′, plus c′. Hence its through-water
//!    motion is w turned by γ + (ν′ − ν), γ = β′ − β constant, and scaled by (1 + σ′)/(1 + σ), which lies in
//!    κ = [(1 − s)/(1 + s), (1 + s)/(1 − s)]. With w = g − c (g the planned motion over ground) the displacement is
//!    ∫ κ·Rot·g dt − ∫ κ·Rot·c dt + ∫ c′ dt: the polar patch of the planned motion with scale κ and heading error
//!    γ ± 2ν, plus a disc of radius (1 + max κ)·c·Δt. (Doubling c alone would be too little: the drift of the truth is
//!    scaled with the log.)
//! 2. *Bias.* A solver with n slices of width δ = 2B/n over [−B, B] keeps β′ in one slice, so γ lies in a window of
//!    width δ somewhere in [−2B, 2B]. Windows of width 2δ at steps of δ contain every such window whole.
//! 3. *Range.* |r − R| ≤ a + bR and |r − R′| ≤ a + bR′ give R′ ∈ [(R(1 − b) − 2a)/(1 + b), (R(1 + b) + 2a)/(1 − b)].
//!    The altitude enters as its interval both times.
//! 4. *Bearing, side-looking.* The truth sees the landmark in world direction bow ± 90° + ε; the history places it in
//!    direction bow ± 90° + ε′ + γ + (ν′ − ν), where bow lies within the crab angle χ = asin(c/v) of the track. The
//!    truth's own beam error moves the instant of the sighting, see 6.
//! 5. *Bearing, forward-looking.* The measured bearing errs by ε; the history's direction is the true direction
//!    + γ + (ν′ − ν) + (ε′ − ε).
//! 6. *Instant.* A landmark is sighted at some s_i in a window [s₁, s₂] that box, beam error and crab angle allow. Refer
//!    the constraint to s₂: the history's position there is its position at s_i plus its travel over s₂ − s_i, which
//!    lies in the convex hull of 0 and the travel over s₂ − s₁. The order of sightings within overlapping windows does
//!    not matter, because each constraint is stated at its own s₂ and the travel between those is exact to the bounds.
//! 7. *Certain sightings.* Only landmarks are used whose sighting happens in every admissible dive: the window lies
//!    within one straight piece, and range, nadir gap and sector are met over the whole box, altitude interval and crab
//!    angle. Bow direction and position change continuously, so the beam cannot skip the landmark. Sightings of other
//!    landmarks can only shrink X further.
//! 8. *Strays and misses.* At most g landmarks are missed in a dive, each of them perhaps at every pass (and both on
//!    entering and on leaving a sector), and the history may leave at most f sightings unexplained. W may leave
//!    unexplained f sightings and as many more as the g most often certain landmarks have. (f + g alone would be too
//!    little for a landmark that is met twice.)
//!
//! *Fix distance.* At s₂ of a sighting every dive has had that sighting. X at its last event before s₂ has a spread no
//! larger than that of ⋃ over the windows of bias of (W ⊕ E), where E = conv{0, s·u − κ·s·Rot·u} accounts for slices
//! that drift apart on the way from the event to s₂ (s = s₂ − s₁, u the direction of the track): moving a set by a
//! common vector leaves its spread as it is, and adding travel to it cannot make it narrower. That spread is compared
//! with the fix size.
//!
//! *References.* Method of [`crate::bibliography::BERTSEKAS_RHODES_1971`]; the composition is derived above.

use std::collections::BTreeMap;

use super::Bounds;
use super::cell::{Reaches, add_reaches, disc_reaches, mirrored, polar_reaches};
use super::certain::{CertainSighting, certain_sightings};
use super::feasible::EventSet;
use super::forward::Solver;
use super::steps::{Look, RESOLUTION_M, RESOLUTION_RAD, Step, TravelError};
use super::watch::FixWatch;
use crate::detect::{ReportedPiece, Scene};
use crate::interval::{Interval, larger};
use crate::track::plan::Plan;

/// Allowance per travel and per range, metres: covers the resolution allowance of both the truth's and the history's
/// solver and the rounding of a dive's own steps (each below 10⁻⁷ m at coordinates of 10⁷ m).
pub(super) const COMPOSED_RESOLUTION_M: f64 = 10.0 * RESOLUTION_M;

/// Likewise for angles, radians.
const COMPOSED_RESOLUTION_RAD: f64 = 4.0 * RESOLUTION_RAD;

/// The composed run along one track, ready to be solved from any start.
#[derive(Clone, Debug)]
pub struct ComposedRun {
    steps: Vec<Step>,
    /// Earliest instant of the sighting of each step, along the track; at a mark its own place.
    earliest_m: Vec<f64>,
    /// Landmark of each step; none at a mark.
    landmarks: Vec<Option<usize>>,
    /// By step and window of bias: what slices may drift apart between the event and the step (the set E).
    drift_apart: Vec<Vec<Reaches>>,
}

/// What the composed run says about one start.
#[derive(Clone, Debug, PartialEq)]
pub struct ComposedOutcome {
    /// Guaranteed fix distance from the start, metres.
    pub fix_m: Option<f64>,
    /// Guaranteed distance from the start to a fix that lasts to the end of the line, metres.
    pub lasting_m: Option<f64>,
    /// Certain sightings from the start to the end of the line.
    pub certain_sightings: usize,
    /// Places at the last certain sighting.
    pub places: Option<usize>,
    /// Upper bound of the spread at the last certain sighting, metres.
    pub spread_m: Option<f64>,
    /// Whether the cell budget ran out.
    pub is_undecided: bool,
}

impl ComposedRun {
    /// Prepares the composed run along `plan` (which is taken as the vehicle's true track), to be solved from any of
    /// `starts_m`, ascending distances along it.
    pub fn new(scene: &Scene<'_>, plan: &Plan, starts_m: &[f64], bounds: &Bounds) -> Self {
        let travels = composed_travels(bounds);
        let sightings = certain_sightings(scene, plan, bounds);
        // The end of the line is a mark too, so that a fix is known to last until there.
        let mut stops: Vec<(f64, Option<&CertainSighting>)> =
            starts_m.iter().chain([&plan.length_m]).map(|&at| (at, None)).collect();
        stops.extend(sightings.iter().map(|sighting| (sighting.window.hi(), Some(sighting))));
        stops.sort_by(|a, b| {
            a.0.total_cmp(&b.0)
                .then(a.1.is_some().cmp(&b.1.is_some()))
                .then(a.1.map(|x| x.landmark).cmp(&b.1.map(|x| x.landmark)))
        });
        let mut run = Self {
            steps: Vec::new(),
            earliest_m: Vec::new(),
            landmarks: Vec::new(),
            drift_apart: Vec::new(),
        };
        let mut at_m = 0.0;
        for (along_m, sighting) in stops {
            let pieces = pieces_between(plan, at_m, along_m, scene.vehicle.speed_mps);
            at_m = along_m;
            run.steps.push(Step {
                along_m,
                travel: travels.iter().map(|travel| travel.reaches(&pieces)).collect(),
                // What a dive does not see is not used: W is larger without it, and the claim holds.
                passage: vec![None; travels.len()],
                sighting: sighting.map(|x| {
                    travels.iter().map(|travel| Some(x.look(travel, scene.vehicle.speed_mps))).collect()
                }),
            });
            run.earliest_m.push(sighting.map_or(along_m, |x| x.window.lo()));
            run.landmarks.push(sighting.map(|x| x.landmark));
            run.drift_apart.push(match sighting {
                None => Vec::new(),
                Some(x) => travels.iter().map(|travel| x.drift_apart(travel)).collect(),
            });
        }
        run
    }

    /// Solves from `start_m`, one of the starts given to [`ComposedRun::new`], for dives of `solver`'s stray budget with at
    /// most `misses` landmarks missed. `visit` gets every set W at its distance along the track.
    ///
    /// # Panics
    /// When `start_m` is not one of the starts.
    pub fn solve(
        &self,
        solver: &Solver<'_>,
        misses: u8,
        start_m: f64,
        mut visit: impl FnMut(f64, &EventSet<'_>),
    ) -> ComposedOutcome {
        let first = 1 + self
            .steps
            .iter()
            .position(|step| step.sighting.is_none() && step.along_m == start_m)
            .expect("the start was announced");
        let mut outcome = ComposedOutcome {
            fix_m: None,
            lasting_m: None,
            certain_sightings: 0,
            places: None,
            spread_m: None,
            is_undecided: false,
        };
        let solver = Solver {
            stray_budget: solver.stray_budget.saturating_add(self.most_missed(first, start_m, misses)),
            ..*solver
        };
        let steps = &self.steps[first..];
        let mut watch = FixWatch::new(steps, solver.fix_size_m);
        let solved = solver.run_where(
            steps,
            // A sighting that may have happened before the start is not certain from here.
            |number| self.is_certain_from(first + number, start_m),
            |summary, set| {
                let spread_m = spread_over_window(set, &self.drift_apart[first + summary.step]);
                watch.see(summary.step, set, spread_m);
                outcome.certain_sightings += 1;
                outcome.places = Some(summary.places);
                outcome.spread_m = spread_m;
                visit(summary.along_m, set);
            },
        );
        outcome.is_undecided = solved.is_undecided;
        let history = watch.finish(!solved.is_undecided);
        outcome.fix_m = history.first_along_m.map(|along_m| along_m - start_m);
        outcome.lasting_m = history.lasting_along_m.map(|along_m| along_m - start_m);
        outcome
    }
}

impl ComposedRun {
    /// Whether the sighting of a step is certain from `start_m`: it cannot have happened before.
    fn is_certain_from(&self, step: usize, start_m: f64) -> bool {
        self.landmarks[step].is_some() && self.earliest_m[step] >= start_m
    }

    /// Most certain sightings that `misses` landmarks can take away from step number `first` on.
    fn most_missed(&self, first: usize, start_m: f64, misses: u8) -> u8 {
        let mut counts: BTreeMap<usize, u8> = BTreeMap::new();
        for step in (first..self.steps.len()).filter(|&step| self.is_certain_from(step, start_m)) {
            if let Some(landmark) = self.landmarks[step] {
                let count = counts.entry(landmark).or_insert(0);
                *count = count.saturating_add(1);
            }
        }
        let mut counts: Vec<u8> = counts.into_values().collect();
        counts.sort_unstable_by(|a, b| b.cmp(a));
        counts.iter().take(usize::from(misses)).fold(0, |sum, count| sum.saturating_add(*count))
    }
}

impl CertainSighting {
    /// The relative positions of the history at the end of the window.
    pub(super) fn look(&self, travel: &TravelError, speed_mps: f64) -> Look {
        let mut from_landmark = mirrored(&polar_reaches(self.rho, self.theta + travel.heading));
        add_reaches(&mut from_landmark, &self.carried(travel, speed_mps));
        add_reaches(&mut from_landmark, &disc_reaches(COMPOSED_RESOLUTION_M));
        Look::new(from_landmark)
    }

    /// conv{0, travel over the window}.
    fn carried(&self, travel: &TravelError, speed_mps: f64) -> Reaches {
        let length_m = self.window.width();
        let piece = ReportedPiece {
            length_m,
            heading_rad: self.heading_rad,
            duration_s: length_m / speed_mps,
            is_blind: false,
        };
        travel.reaches(&[piece]).map(|reach| larger(reach, 0.0))
    }

    /// conv{0, s·u − κ·s·Rot·u} with s the width of the window.
    pub(super) fn drift_apart(&self, travel: &TravelError) -> Reaches {
        let length = Interval::point(self.window.width());
        let heading = Interval::point(self.heading_rad);
        let mut apart = polar_reaches(length, heading);
        let turned = mirrored(&polar_reaches(length * travel.scale, heading + travel.heading));
        add_reaches(&mut apart, &turned);
        apart.map(|reach| larger(reach, 0.0))
    }
}

/// Spread of ⋃ (W ⊕ E) over the windows of bias.
fn spread_over_window(set: &EventSet<'_>, drift_apart: &[Reaches]) -> Option<f64> {
    // The hull of sums with one set is the sum with the hull, to the last digit: rounding up is monotone.
    let hulls = set.slice_hulls().iter().zip(drift_apart);
    hulls
        .filter_map(|(hull, apart)| Some(hull.as_ref()?.minkowski_sum(apart)))
        .reduce(|a, b| a.hull(&b))
        .map(|hull| hull.diameter_m())
}

/// Travel of a history against the planned motion, one for each window of γ; its heading is γ ± 2ν.
pub(super) fn composed_travels(bounds: &Bounds) -> Vec<TravelError> {
    let dead_reckoning = &bounds.dead_reckoning;
    let one = Interval::point(1.0);
    let s = Interval::point(dead_reckoning.scale_error);
    let scale = ((one - s) / (one + s)).hull((one + s) / (one - s));
    let drift_mps = (Interval::point(dead_reckoning.drift_mps) * (one + Interval::point(scale.hi()))).hi();
    let noise = Interval::around(0.0, dead_reckoning.heading_noise_rad);
    let heading_error = noise + noise + Interval::around(0.0, COMPOSED_RESOLUTION_RAD);
    gamma_windows(bounds)
        .into_iter()
        .map(|gamma| TravelError {
            scale,
            heading: gamma + heading_error,
            drift_mps,
            slack_m: COMPOSED_RESOLUTION_M,
        })
        .collect()
}

/// The windows of γ: width 2δ at steps of δ over [−2B, 2B], δ = 2B/n.
fn gamma_windows(bounds: &Bounds) -> Vec<Interval> {
    let bias = Interval::point(bounds.dead_reckoning.heading_bias_rad);
    let count = bounds.heading_slices;
    let end = |k: usize| {
        let share = Interval::point(2.0 * k as f64) / Interval::point(count as f64) - Interval::point(2.0);
        bias * share
    };
    (0..2 * count - 1).map(|k| end(k).hull(end(k + 2))).collect()
}

/// The planned motion between two distances along the track.
fn pieces_between(plan: &Plan, from_m: f64, to_m: f64, speed_mps: f64) -> Vec<ReportedPiece> {
    plan.pieces
        .iter()
        .filter_map(|piece| {
            let start = larger(from_m, piece.along_m);
            let end = crate::interval::smaller(to_m, piece.along_m + piece.length_m);
            (end > start).then(|| ReportedPiece {
                length_m: end - start,
                heading_rad: piece.heading_rad,
                duration_s: (end - start) / speed_mps,
                is_blind: piece.in_turn,
            })
        })
        .collect()
}
