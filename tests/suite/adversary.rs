//! A search for a dive that breaks the guarantee: hill climbing over every error and every landmark position.
//!
//! A dive along the planned track is a list of numbers within [−1, 1]: the heading bias, the errors of every leg and
//! every sighting, the true position of every landmark in its box. The climb changes a few of them at a time and keeps
//! what makes the dive fix no sooner: more sightings until the fix; or as many, and a smaller share by which a solver's
//! bounds would have to grow for it not to fix there (which tells how near the last wrong place was to survive); or the
//! same, and a wider set at the fix. No dive may fix later than guaranteed, and on the way every feasible set must lie in
//! the composed one.

use fixability::detect::{
    DrawnErrors, ERROR_HOLD_M, Errors, LegErrors, Log, SightingErrors, StrayDraw, simulate,
};
use fixability::dive::ErrorShape;
use fixability::locate::cell::Cell;
use fixability::locate::{ComposedRun, EventSet, Feasible, steps};
use nalgebra::Vector2;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use crate::guarantee::scaled;
use crate::moved::set_at;
use crate::support::scenes::RandomScene;

/// Every error of a dive, given outright.
#[derive(Clone)]
struct Genes {
    heading_bias: f64,
    legs: Vec<LegErrors>,
    landmarks: Vec<Vector2<f64>>,
    sightings: Vec<[SightingErrors; 2]>,
}

impl Errors for Genes {
    fn start_offset(&self) -> Vector2<f64> {
        Vector2::zeros()
    }
    fn heading_bias(&self) -> f64 {
        self.heading_bias
    }
    fn landmark(&self, number: usize) -> Vector2<f64> {
        self.landmarks[number]
    }
    fn leg(&self, number: usize) -> LegErrors {
        self.legs[number]
    }
    fn sighting(&self, landmark: usize, way: usize) -> SightingErrors {
        self.sightings[landmark][way]
    }
    fn strays(&self, _: f64, _: f64) -> Vec<StrayDraw> {
        Vec::new()
    }
    fn decoy(&self, _: usize) -> Option<[usize; 2]> {
        None
    }
}

impl Genes {
    fn copied(drawn: &DrawnErrors, random: &RandomScene) -> Self {
        let legs: usize =
            random.plan.pieces.iter().map(|piece| (piece.length_m / ERROR_HOLD_M).ceil() as usize).sum();
        let numbers = 0..random.landmarks.len();
        Self {
            heading_bias: drawn.heading_bias(),
            legs: (0..legs).map(|number| drawn.leg(number)).collect(),
            landmarks: numbers.clone().map(|number| drawn.landmark(number)).collect(),
            sightings: numbers.map(|number| [0, 1].map(|way| drawn.sighting(number, way))).collect(),
        }
    }

    /// Changes a few numbers. `met` are the landmarks that the dive sights, `legs` the legs from the start on.
    fn change(&mut self, met: &[usize], legs: std::ops::Range<usize>, rng: &mut ChaCha8Rng) {
        for _ in 0..rng.random_range(1..=5) {
            match rng.random_range(0..10) {
                0 => nudge(&mut self.heading_bias, rng),
                1..=3 => {
                    let leg = &mut self.legs[rng.random_range(legs.clone())];
                    match rng.random_range(0..3) {
                        0 => nudge(&mut leg.scale, rng),
                        1 => nudge(&mut leg.heading_noise, rng),
                        _ => {
                            nudge(&mut leg.drift.x, rng);
                            nudge(&mut leg.drift.y, rng);
                            if leg.drift.norm() > 1.0 {
                                leg.drift *= (1.0 - 4.0 * f64::EPSILON) / leg.drift.norm();
                            }
                        }
                    }
                }
                4..=6 => {
                    let at = &mut self.landmarks[met[rng.random_range(0..met.len())]];
                    nudge(if rng.random_bool(0.5) { &mut at.x } else { &mut at.y }, rng);
                }
                _ => {
                    let sighting = &mut self.sightings[met[rng.random_range(0..met.len())]]
                        [usize::from(rng.random_bool(0.5))];
                    match rng.random_range(0..3) {
                        0 => nudge(&mut sighting.range, rng),
                        1 => nudge(&mut sighting.bearing, rng),
                        _ => nudge(&mut sighting.altitude, rng),
                    }
                }
            }
        }
    }
}

/// To an end of the bound, anywhere, or a little to one side.
fn nudge(x: &mut f64, rng: &mut ChaCha8Rng) {
    *x = match rng.random_range(0..5) {
        0 => 1.0,
        1 => -1.0,
        2 => rng.random_range(-1.0..=1.0),
        _ => (*x + rng.random_range(-0.3..0.3)).clamp(-1.0, 1.0),
    };
}

/// Largest growth of the bounds that is looked at: composed bounds are at most about twice as wide.
const GROWTH_MOST: f64 = 3.0;

/// A scene with a guaranteed fix.
struct Arena {
    random: RandomScene,
    start_m: f64,
    guaranteed_m: f64,
    /// The composed sets, by distance along the track.
    composed: Vec<(f64, Vec<Cell>)>,
}

/// What one dive showed.
struct Verdict {
    /// Sightings until the fix, how near the dive is to not fixing there, and the spread there: what the climb
    /// maximises.
    score: (usize, f64, f64),
    /// None when the line ends without a fix.
    fix_m: Option<f64>,
    /// Landmarks sighted, each once.
    met: Vec<usize>,
    /// Cells outside the composed set.
    outside: usize,
}

impl Arena {
    /// Scene number `number`, when it has a guaranteed fix and has had at least two sightings by then.
    fn new(number: u64, composed_share: f64) -> Option<Self> {
        let mut random = RandomScene::new(number);
        random.scatter_m = 0.0;
        random.bounds.sonar.detection_chance = 1.0;
        let start_m = 0.1 * random.plan.length_m;
        let bounds = scaled(random.bounds, composed_share);
        let run = ComposedRun::new(&random.scene(), &random.plan, &[start_m], &bounds);
        let mut composed = Vec::new();
        let outcome = run.solve(&random.solver(), 0, start_m, |along_m, set: &EventSet<'_>| {
            composed.push((along_m, set.states.iter().map(|state| state.cell).collect()));
        });
        let guaranteed_m = outcome.fix_m?;
        composed.retain(|(along_m, _)| *along_m - start_m <= guaranteed_m);
        (composed.len() >= 2).then_some(Self { random, start_m, guaranteed_m, composed })
    }

    /// By how much (as a factor, in steps of 2 %) a solver's bounds must at least grow so that the log leaves it without
    /// a fix at event `until`; at most [`GROWTH_MOST`].
    fn growth_without_fix(&self, log: &Log, start: usize, until: usize) -> f64 {
        let events = Log { events: log.events[..=until].to_vec() };
        let is_fixed = |growth: f64| {
            let steps = steps(&events, &scaled(self.random.bounds, growth));
            let run = self.random.solver().run(&steps[start..], |_, _| {});
            run.events.last().is_some_and(|event| {
                event.step == until - start && event.spread_m.is_some_and(|s| s <= self.random.fix_size_m)
            })
        };
        let (mut fixed, mut open) = (1.0, GROWTH_MOST);
        while open / fixed > 1.02 {
            let middle = (fixed * open).sqrt();
            if is_fixed(middle) {
                fixed = middle;
            } else {
                open = middle;
            }
        }
        open
    }

    fn dive(&self, genes: &Genes, is_compared: bool) -> Option<Verdict> {
        let random = &self.random;
        let mut marks = vec![self.start_m];
        if is_compared {
            marks.extend(self.composed.iter().map(|(along_m, _)| *along_m));
        }
        let dive = simulate(&random.scene(), &random.plan, &marks, genes);
        let steps = steps(&dive.log, &random.bounds);
        let marked: Vec<usize> = (0..steps.len()).filter(|&i| steps[i].sighting.is_none()).collect();
        let start = marked[0] + 1;
        let solver = random.solver();
        let mut seen: Vec<(usize, Feasible)> = Vec::new();
        let run = solver.run(&steps[start..], |summary, set| {
            if is_compared {
                seen.push((start + summary.step, Feasible::clone(set)));
            }
        });
        if run.is_undecided {
            return None;
        }
        let outside = marked[1..].iter().zip(&self.composed).map(|(&mark, (_, w))| {
            let cells = set_at(&seen, &steps, start, mark, solver.search_area);
            cells.iter().filter(|cell| !w.iter().any(|other| other.contains_cell(cell))).count()
        });
        let fix = run
            .events
            .iter()
            .position(|event| event.spread_m.is_some_and(|spread| spread <= random.fix_size_m));
        let mut met: Vec<usize> = dive.truth[start..].iter().filter_map(|truth| truth.landmark).collect();
        met.sort_unstable();
        met.dedup();
        Some(Verdict {
            score: match fix {
                Some(event) => {
                    let until = start + run.events[event].step;
                    let spread_m = run.events[event].spread_m.expect("a fix has a spread");
                    (event, -self.growth_without_fix(&dive.log, start, until), spread_m)
                }
                None => (usize::MAX, 0.0, 0.0),
            },
            fix_m: fix.map(|event| run.events[event].along_m - self.start_m),
            outside: outside.sum(),
            met,
        })
    }
}

/// What a climb showed, in shares of the guaranteed distance.
#[derive(Clone, Copy, Debug, Default)]
struct Climb {
    /// Latest fix among the dives drawn at random to start from.
    drawn: f64,
    /// Latest fix found.
    latest: f64,
    /// Dives that fixed later than guaranteed.
    late: usize,
    outside: usize,
    dives: usize,
}

impl Climb {
    fn see(&mut self, arena: &Arena, verdict: &Verdict) {
        self.dives += 1;
        self.outside += verdict.outside;
        match verdict.fix_m {
            Some(fix_m) if fix_m <= arena.guaranteed_m => {
                self.latest = self.latest.max(fix_m / arena.guaranteed_m);
            }
            _ => self.late += 1,
        }
    }
}

fn climb(arena: &Arena, number: u64, tries: usize) -> Climb {
    let mut rng = ChaCha8Rng::seed_from_u64(number ^ 0xC11B);
    let mut found = Climb::default();
    let mut best: Option<(Genes, Verdict)> = None;
    for draw in 0..12 {
        let shape = [ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady][draw % 3];
        let genes = Genes::copied(&DrawnErrors::new(number, "adversary", draw as u64, shape), &arena.random);
        let Some(verdict) = arena.dive(&genes, true) else { continue };
        found.see(arena, &verdict);
        if best.as_ref().is_none_or(|(_, other)| verdict.score > other.score) {
            best = Some((genes, verdict));
        }
    }
    found.drawn = found.latest;
    let Some((mut genes, mut verdict)) = best else { return found };
    // Errors before the start tell the vehicle nothing.
    let first_leg = (arena.start_m / ERROR_HOLD_M) as usize;
    let legs = first_leg.min(genes.legs.len() - 1)..genes.legs.len();
    for _ in 0..tries {
        if verdict.met.is_empty() {
            break;
        }
        let mut other = genes.clone();
        other.change(&verdict.met, legs.clone(), &mut rng);
        let Some(mut outcome) = arena.dive(&other, false) else { continue };
        if outcome.score >= verdict.score {
            outcome = arena.dive(&other, true).expect("decided before");
            (genes, verdict) = (other, outcome);
            found.see(arena, &verdict);
        } else {
            found.see(arena, &outcome);
        }
        if found.late > 0 {
            break;
        }
    }
    found
}

fn attack(scenes: usize, tries: usize, composed_share: f64) -> Vec<Climb> {
    let arenas = (0..).filter_map(|number| Some((number, Arena::new(number, composed_share)?)));
    let climbs: Vec<Climb> =
        arenas.take(scenes).map(|(number, arena)| climb(&arena, number, tries)).collect();
    let mean = |pick: fn(&Climb) -> f64| climbs.iter().map(pick).sum::<f64>() / scenes as f64;
    let most = |pick: fn(&Climb) -> f64| climbs.iter().map(pick).fold(0.0, f64::max);
    let room = climbs.iter().filter(|climb| climb.drawn < 0.999).count();
    let reached = climbs.iter().filter(|climb| climb.latest > 0.999).count();
    let improved = climbs.iter().filter(|climb| climb.latest > climb.drawn + 0.001).count();
    println!(
        "{scenes} scenes, {} dives: latest fix over guaranteed distance, mean {:.3} drawn, {:.3} climbed; largest {:.5} \
         drawn, {:.5} climbed; {room} scenes with room, {improved} improved, {reached} within a thousandth; {} late, {} cells outside",
        climbs.iter().map(|climb| climb.dives).sum::<usize>(),
        mean(|climb| climb.drawn),
        mean(|climb| climb.latest),
        most(|climb| climb.drawn),
        most(|climb| climb.latest),
        climbs.iter().map(|climb| climb.late).sum::<usize>(),
        climbs.iter().map(|climb| climb.outside).sum::<usize>(),
    );
    climbs
}

fn assert_unbroken(climbs: &[Climb]) {
    assert!(climbs.iter().all(|climb| climb.late == 0), "a dive fixes later than guaranteed");
    assert!(climbs.iter().all(|climb| climb.outside == 0), "a feasible set leaves the composed set");
    let room = climbs.iter().filter(|climb| climb.drawn < 0.999).count();
    let improved = climbs.iter().filter(|climb| climb.latest > climb.drawn + 0.001).count();
    assert!(improved * 5 > room, "the search hardly improves on chance: {improved} of {room}");
}

#[test]
fn no_dive_is_found_that_fixes_later_than_guaranteed() {
    assert_unbroken(&attack(30, 300, 1.0));
}

#[test]
#[ignore = "a longer search; run by hand with --ignored"]
fn no_dive_is_found_that_fixes_later_than_guaranteed_in_a_long_search() {
    assert_unbroken(&attack(60, 1500, 1.0));
}

/// Proof that the search can succeed: bounds that are not composed promise too much, and it finds the dives.
#[test]
fn the_search_breaks_a_guarantee_without_composed_bounds() {
    let climbs = attack(16, 200, 0.5);
    let drawn = climbs.iter().filter(|climb| climb.late > 0).count();
    assert!(drawn > 0, "half of the bounds must not do");
}
