//! The solver's shortcuts change no digit: against the solver written out plainly (`support/plain.rs`), and against
//! its own plain way, which it takes when a history is recorded or silence is evidence.

use fixability::detect::{DrawnErrors, simulate};
use fixability::dive::ErrorShape;
use fixability::frame::LocalPoint;
use fixability::locate::cell::Cell;
use fixability::locate::{ComposedRun, EventSummary, Feasible, Silence, Solver, SolverMap, Step, steps};
use fixability::map::Landmark;
use fixability::vehicle::SonarKind;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use crate::support::plain::{Finding, PlainMap, PlainOutcome};
use crate::support::scenes::{RandomScene, SITE_M};

/// What the scenes of a run had.
#[derive(Debug, Default)]
struct Tally {
    solves: usize,
    events: usize,
    /// First sets with cells cut by the border, and with cells that are not.
    cut: usize,
    whole: usize,
    /// Sets left empty, by number of the event.
    empty: [usize; 3],
    /// Solves out of budget, by number of the event.
    undecided: [usize; 3],
    several_slices: usize,
    several_places: usize,
    skipped: usize,
}

/// The random scene of that number with more landmarks, other search areas, slices, budgets, fix sizes and bounds.
struct Case {
    random: RandomScene,
    landmarks: Vec<Landmark>,
    map: SolverMap,
    search_area: Cell,
    cell_budget: usize,
    fix_size_m: f64,
    rng: ChaCha8Rng,
}

impl Case {
    fn new(number: u64) -> Self {
        let mut rng = ChaCha8Rng::seed_from_u64(0xFA57 ^ number);
        let mut random = RandomScene::new(number);
        random.bounds.heading_slices = rng.random_range(1..9);
        let west_south = random.search_area[0];
        let at = |rng: &mut ChaCha8Rng| {
            LocalPoint::new(
                west_south.east_m + 150.0 + rng.random_range(-200.0..SITE_M + 200.0),
                west_south.north_m + 150.0 + rng.random_range(-200.0..SITE_M + 200.0),
            )
        };
        let mut landmarks = random.landmarks.clone();
        let more = [0, 0, 200, 800][rng.random_range(0..4)];
        for i in 0..more {
            let half_m = rng.random_range(0.0..3.0);
            landmarks.push(Landmark {
                id: format!("M{i}"),
                // Some of them one on top of another.
                position: if rng.random_bool(0.02) {
                    landmarks[landmarks.len() - 1].position
                } else {
                    at(&mut rng)
                },
                half_width_east_m: half_m,
                half_width_north_m: half_m,
            });
        }
        let corners: Vec<LocalPoint> = match rng.random_range(0..6) {
            // A point, a small area, an area that is no box, all of it.
            0 => vec![at(&mut rng)],
            1 => {
                let p = at(&mut rng);
                let size_m = rng.random_range(0.0..200.0);
                vec![p, LocalPoint::new(p.east_m + size_m, p.north_m + 0.6 * size_m)]
            }
            2 | 3 => (0..3).map(|_| at(&mut rng)).collect(),
            _ => random.search_area.clone(),
        };
        let cell_budget = [200_000, 200_000, 200_000, 5000, 300, 20][rng.random_range(0..6)];
        let fix_size_m = if rng.random_bool(0.1) { 0.0 } else { rng.random_range(0.0..60.0) };
        Self {
            map: SolverMap::new(&landmarks),
            search_area: Cell::around_points(&corners),
            landmarks,
            random,
            cell_budget,
            fix_size_m,
            rng,
        }
    }

    fn solver(&self) -> Solver<'_> {
        Solver {
            map: &self.map,
            search_area: self.search_area,
            cell_budget: self.cell_budget,
            fix_size_m: self.fix_size_m,
            ..self.random.solver()
        }
    }

    /// Steps of a dive; its errors sometimes go beyond the bounds of the solve.
    fn steps(&mut self, draw: u64) -> Vec<Step> {
        let shape = [ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady][(draw % 3) as usize];
        let errors = DrawnErrors::new(draw, "plain", draw, shape);
        // Marks without a sighting between the sightings.
        let marks: Vec<f64> = (1..4).map(|k| f64::from(k) * 0.2 * self.random.plan.length_m).collect();
        let mut scene = self.random.scene();
        scene.landmarks = &self.landmarks;
        scene.index = self.map.index();
        let dive = simulate(&scene, &self.random.plan, &marks, &errors);
        let mut bounds = self.random.bounds;
        if self.rng.random_bool(0.2) {
            bounds.sonar.range_error_m *= 0.2;
            bounds.sonar.range_error_fraction *= 0.2;
        }
        steps(&dive.log, &bounds)
    }
}

fn assert_same(
    fast: &(Vec<(EventSummary, Feasible)>, bool),
    plain: &PlainOutcome,
    what: &dyn std::fmt::Debug,
) {
    let bits =
        |s: &EventSummary| (s.step, s.along_m.to_bits(), s.cells, s.places, s.spread_m.map(f64::to_bits));
    assert_eq!(fast.1, plain.is_undecided, "{what:?}");
    let summaries =
        |events: &[(EventSummary, Feasible)]| events.iter().map(|(s, _)| bits(s)).collect::<Vec<_>>();
    assert_eq!(summaries(&fast.0), summaries(&plain.events), "{what:?}");
    for ((_, fast), (_, plain)) in fast.0.iter().zip(&plain.events) {
        assert!(fast == plain, "{what:?}");
    }
}

/// Every event of a run of the program's solver.
fn run(
    solver: &Solver<'_>,
    steps: &[Step],
    uses: impl Fn(usize) -> bool,
) -> (Vec<(EventSummary, Feasible)>, bool) {
    let mut events = Vec::new();
    let outcome = solver.run_where(steps, uses, |summary, set| {
        let hulls = set.slice_hulls();
        assert_eq!(hulls, Feasible::slice_hulls(set, hulls.len()));
        events.push((summary, Feasible::clone(set)));
    });
    assert_eq!(outcome.events, events.iter().map(|(summary, _)| *summary).collect::<Vec<_>>());
    (events, outcome.is_undecided)
}

fn compare(numbers: std::ops::Range<u64>) -> Tally {
    let mut tally = Tally::default();
    for number in numbers {
        let mut case = Case::new(number);
        for draw in 0..2 {
            let all = case.steps(draw);
            let start = case.rng.random_range(0..=all.len() / 2);
            let skipped = case.rng.random_range(0..9usize);
            let uses = |k: usize| skipped > 2 || k % 3 != skipped;
            let steps = &all[start..];
            let stray_budget = u8::from(case.rng.random_bool(0.1));
            // A budget at the edge: what the largest set needs, or one cell less.
            let edge = case.rng.random_bool(0.3).then(|| case.rng.random_range(0..2));
            let mut solver = Solver { stray_budget, ..case.solver() };
            if let Some(short) = edge {
                let events = solver.run_where(steps, uses, |_, _| {}).events;
                let needed = events.iter().map(|event| event.cells).max().unwrap_or(0);
                solver.cell_budget = needed.saturating_sub(short);
            }
            let fast = run(&solver, steps, uses);
            let plain_map = PlainMap::new(&case.landmarks, Finding::Tree(case.map.index()));
            let plain = plain_map.run(&solver, steps, uses, true);
            assert_same(&fast, &plain, &(number, draw));
            if skipped > 2 {
                let mut events = Vec::new();
                let (outcome, _) =
                    solver.run_recorded(steps, |summary, set| events.push((summary, Feasible::clone(set))));
                assert_same(&(events, outcome.is_undecided), &plain, &(number, draw, "recorded"));
            } else {
                tally.skipped += 1;
            }
            tally.solves += 1;
            tally.events += plain.events.len();
            if let Some((_, first)) = plain.events.first() {
                let slices = first.states.iter().map(|state| state.slice).max().unwrap_or(0);
                tally.several_slices += usize::from(slices > 0);
                // A whole vantage is as wide as the widest of its kind; a cut one is narrower than some other.
                let widths = first.states.iter().map(|state| state.cell.area_m2());
                let (least, most) = widths.fold((f64::MAX, 0.0f64), |(a, b), w| (a.min(w), b.max(w)));
                tally.cut += usize::from(least < 0.5 * most);
                tally.whole += usize::from(first.states.len() > 100);
                tally.several_places += usize::from(plain.events[0].0.places > 1);
            }
            let last = plain.events.len();
            if plain.is_undecided {
                tally.undecided[last.min(2)] += 1;
            } else if plain.events.last().is_some_and(|(summary, _)| summary.cells == 0) {
                tally.empty[(last - 1).min(2)] += 1;
            }
        }
    }
    tally
}

#[test]
fn no_digit_differs() {
    let tally = compare(0..1100);
    println!("{tally:?}");
    assert!(tally.solves >= 2000 && tally.events > 5000, "{tally:?}");
    let rare = tally.empty.iter().chain([
        &tally.undecided[0],
        &tally.cut,
        &tally.whole,
        &tally.several_slices,
        &tally.several_places,
        &tally.skipped,
    ]);
    assert!(rare.into_iter().all(|&count| count >= 20), "too little to mean much: {tally:?}");
    // The first set is nearly always the largest.
    assert!(tally.undecided[1] >= 5, "too little to mean much: {tally:?}");
}

/// Twenty times as many, on demand.
#[test]
#[ignore = "takes many minutes"]
fn no_digit_differs_in_many_more() {
    println!("{:?}", compare(1500..30_000));
}

#[test]
fn composed_runs_are_the_same_the_plain_way() {
    let (mut solved, mut fixes) = (0, 0);
    for number in 0..200 {
        let mut case = Case::new(number);
        case.random.scatter_m = 0.0;
        let starts_m = [0.0, 0.3 * case.random.plan.length_m];
        let mut scene = case.random.scene();
        scene.landmarks = &case.landmarks;
        scene.index = case.map.index();
        let run = ComposedRun::new(&scene, &case.random.plan, &starts_m, &case.random.bounds);
        // Evidence from no landmark at all: nothing is concluded from it, and the plain way is taken.
        let mut sonar = case.random.bounds.sonar;
        sonar.kind = SonarKind::SideLooking { nadir_gap_rad: 0.1 };
        let silence = Silence::new(vec![false; case.landmarks.len()], sonar).unwrap();
        for start_m in starts_m {
            let solve = |silence| {
                let mut sets = Vec::new();
                let solver = Solver { silence, ..case.solver() };
                let outcome = run.solve(&solver, 0, start_m, |along_m, set| {
                    sets.push((along_m, Feasible::clone(set)));
                });
                (outcome, sets)
            };
            let (fast, plain) = (solve(None), solve(Some(&silence)));
            assert!(fast == plain, "scene {number} from {start_m}: {:?} {:?}", fast.0, plain.0);
            solved += usize::from(fast.0.certain_sightings > 1);
            fixes += usize::from(fast.0.fix_m.is_some());
        }
    }
    assert!(solved > 100 && fixes > 20, "{solved} {fixes}");
}
