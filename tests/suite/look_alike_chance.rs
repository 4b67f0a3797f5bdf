//! Chance look-alikes: how many wrong places a random field explains, against closed forms.
//!
//! *Setting.* A Poisson field of landmarks on a torus, density λ, area A, N = λA on average; heading known, travel known
//! exactly. The vehicle sees k objects that have nothing to do with the field, so every explanation is wrong and the
//! moments of the Poisson process give the expected number of explanations exactly (multivariate Campbell formula).
//!
//! - *Anchored.* The first object is seen exactly, each later one within a square match box of area a: ordered choices
//!   of k landmarks number **N (λa)^(k−1)** on average. The places, that is choices of the first landmark that are
//!   explained at all, number N (1 − e^(−λa))^(k−1), because the match boxes of one anchor do not overlap.
//! - *Common window.* Every object is seen with the same box of half-width w, so the k residuals must fit one window of
//!   2w per axis: **N k² (4λw²)^(k−1)** choices. (k² 4w²^(k−1) is the volume of k-tuples in the plane, modulo shifts,
//!   that fit such a window: k·(2w)^(k−1) per axis.)
//!
//! *Sources.* The forms in bold, and what a Monte Carlo run of another program found for them (3.93, 1.278, 6.60; 12.0 ±
//! 0.2, 0.76 ± 0.03): computed independently of this crate. The form for places: derived above.
//!
//! *Choices and places.* The solver unites histories that end in the same place, so places are read off one run over
//! all k sightings, while choices are counted by going on from each cell by itself.

use fixability::frame::LocalPoint;
use fixability::interval::Box2;
use fixability::locate::cell::{Cell, DIRECTION_COUNT, box_reaches};
use fixability::locate::{Look, Solver, SolverMap, Step};
use fixability::map::Landmark;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

const NOWHERE: [f64; DIRECTION_COUNT] = [0.0; DIRECTION_COUNT];

/// Farthest an object is seen from the anchor, per axis, metres.
const REACH_M: f64 = 420.0;

/// Relative positions of the objects seen, the first one straight below the vehicle. No two are closer than the match
/// boxes are wide.
const SEEN: [(f64, f64); 5] = [(0.0, 0.0), (137.0, 61.0), (-223.0, 188.0), (402.0, -95.0), (-51.0, -311.0)];

/// A poisson-distributed number (Knuth's product of uniforms, in blocks whose exponential does not underflow).
fn poisson(rng: &mut ChaCha8Rng, mean: f64) -> usize {
    let (mut left, mut count) = (mean, 0);
    while left > 0.0 {
        let block = left.min(300.0);
        left -= block;
        let (limit, mut product) = ((-block).exp(), rng.random_range(0.0..1.0f64));
        while product > limit {
            count += 1;
            product *= rng.random_range(0.0..1.0f64);
        }
    }
    count
}

fn landmark(east_m: f64, north_m: f64, half_m: f64) -> Landmark {
    Landmark {
        id: String::new(),
        position: LocalPoint::new(east_m, north_m),
        half_width_east_m: half_m,
        half_width_north_m: half_m,
    }
}

/// The torus unrolled: the field on [0, side)², and copies of it as far as `margin_m` outside.
fn unrolled(field: &[(f64, f64)], side_m: f64, margin_m: f64, half_m: f64) -> Vec<Landmark> {
    let mut all = Vec::new();
    for de in [-side_m, 0.0, side_m] {
        for dn in [-side_m, 0.0, side_m] {
            let inside = |x: f64| (-margin_m..side_m + margin_m).contains(&x);
            all.extend(
                field
                    .iter()
                    .map(|&(e, n)| (e + de, n + dn))
                    .filter(|&(e, n)| inside(e) && inside(n))
                    .map(|(e, n)| landmark(e, n, half_m)),
            );
        }
    }
    all
}

/// The vehicle stands still and sees an object at `at`, each coordinate within `half_m`.
fn step(at: (f64, f64), half_m: f64) -> Step {
    let from_landmark = box_reaches(Box2::around(LocalPoint::new(-at.0, -at.1), half_m, half_m));
    Step {
        along_m: 0.0,
        travel: vec![NOWHERE],
        passage: vec![None],
        sighting: Some(vec![Some(Look::new(from_landmark))]),
    }
}

fn solver(map: &SolverMap, search_area: Cell) -> Solver<'_> {
    Solver {
        map,
        search_area,
        cell_budget: 1_000_000,
        stray_budget: 0,
        silence: None,
        miss_budget: 0,
        fix_size_m: 0.0,
    }
}

/// Ordered choices of landmarks that explain all steps from `cell`. One step from one cell merges nothing.
fn choices(map: &SolverMap, cell: Cell, steps: &[Step]) -> usize {
    let Some((first, rest)) = steps.split_first() else { return 1 };
    let mut total = 0;
    solver(map, cell).run(std::slice::from_ref(first), |_, set| {
        total += set.states.iter().map(|state| choices(map, state.cell, rest)).sum::<usize>();
    });
    total
}

/// Choices with the first landmark in the base area: the anchor is its exact position or its box, so that a search
/// area that ends at the base's edge would cut boxes. Hence each anchor is started by itself.
fn choices_and_places(
    map: &SolverMap,
    field: &[(f64, f64)],
    anchor_half_m: f64,
    rest: &[Step],
) -> (usize, usize) {
    let mut total = (0, 0);
    for &(e, n) in field {
        let anchor = Cell::from_box(Box2::around(LocalPoint::new(e, n), anchor_half_m, anchor_half_m));
        let found = choices(map, anchor, rest);
        total.0 += found;
        total.1 += usize::from(found > 0);
    }
    total
}

/// Mean and standard error.
#[derive(Default)]
struct Sample {
    values: Vec<f64>,
}

impl Sample {
    fn mean(&self) -> f64 {
        self.values.iter().sum::<f64>() / self.values.len() as f64
    }

    fn standard_error(&self) -> f64 {
        let (mean, count) = (self.mean(), self.values.len() as f64);
        (self.values.iter().map(|x| (x - mean).powi(2)).sum::<f64>() / (count - 1.0) / count).sqrt()
    }

    /// The expected value lies within three standard errors, and those are small enough to tell.
    fn check(&self, what: &str, expected: f64) {
        let (mean, error) = (self.mean(), self.standard_error());
        let off = (mean - expected) / error;
        println!("{what}: expected {expected:.4}, found {mean:.4} ± {error:.4} ({off:+.2} standard errors)");
        assert!(off.abs() <= 3.0, "{what}");
        assert!(error <= 0.035 * expected, "{what}: too few fields to mean anything");
    }
}

#[test]
fn anchored_look_alikes_of_a_random_field_follow_the_closed_form() {
    let (density, side_m) = (50e-6, 2000.0);
    let mean_count = density * side_m * side_m;
    for (k, a_side_m, fields, published) in
        [(2, 20.0f64, 1500, 4.000), (3, 40.0, 2500, 1.280), (4, 80.0, 1500, 6.554)]
    {
        let (mut found, mut merged) = (Sample::default(), Sample::default());
        let mut rng = ChaCha8Rng::seed_from_u64(1900 + k as u64);
        let steps: Vec<Step> =
            (0..k).map(|i| step(SEEN[i], if i == 0 { 0.0 } else { 0.5 * a_side_m })).collect();
        for _ in 0..fields {
            let field: Vec<(f64, f64)> = (0..poisson(&mut rng, mean_count))
                .map(|_| (rng.random_range(0.0..side_m), rng.random_range(0.0..side_m)))
                .collect();
            let map = SolverMap::new(&unrolled(&field, side_m, REACH_M + a_side_m, 0.0));
            let (choices, places) = choices_and_places(&map, &field, 0.0, &steps[1..]);
            found.values.push(choices as f64);
            // One run from the whole base area must find the same places; an anchor is a point, so nothing is cut.
            let base = Cell::from_box(Box2::around(
                LocalPoint::new(0.5 * side_m, 0.5 * side_m),
                0.5 * side_m,
                0.5 * side_m,
            ));
            let outcome = solver(&map, base).run(&steps, |_, _| {});
            let last = outcome.events.last().map_or(0, |event| event.places);
            assert_eq!(last, places, "one run over all sightings, and one from each anchor");
            merged.values.push(last as f64);
        }
        let match_mean = density * a_side_m * a_side_m;
        let expected = mean_count * match_mean.powi(k as i32 - 1);
        assert!((expected - published).abs() < 5e-4, "{expected}");
        found.check(&format!("k = {k}, a = {a_side_m}² m², choices"), expected);
        let places = mean_count * (1.0 - (-match_mean).exp()).powi(k as i32 - 1);
        merged.check(&format!("k = {k}, a = {a_side_m}² m², places"), places);
    }
}

#[test]
fn look_alikes_within_a_common_window_follow_the_closed_form() {
    let (mean_count, side_m, w_m) = (1000.0, 1000.0, 3.0f64);
    let density = mean_count / (side_m * side_m);
    for (k, fields, published) in [(2, 60, 144.0), (3, 300, 11.7), (4, 2400, 0.75)] {
        let mut found = Sample::default();
        let mut rng = ChaCha8Rng::seed_from_u64(2000 + k as u64);
        // The box of each landmark carries the half-width; the sonar is exact.
        let steps: Vec<Step> = (1..k).map(|i| step(SEEN[i], 0.0)).collect();
        for _ in 0..fields {
            let field: Vec<(f64, f64)> = (0..poisson(&mut rng, mean_count))
                .map(|_| (rng.random_range(0.0..side_m), rng.random_range(0.0..side_m)))
                .collect();
            let map = SolverMap::new(&unrolled(&field, side_m, REACH_M + 4.0 * w_m, w_m));
            found.values.push(choices_and_places(&map, &field, w_m, &steps).0 as f64);
        }
        let expected = mean_count * (k * k) as f64 * (4.0 * density * w_m * w_m).powi(k as i32 - 1);
        assert!((expected - published).abs() < 0.05, "{expected}");
        found.check(&format!("k = {k}, w = {w_m} m"), expected);
    }
}

/// A density formula predicts next to nothing here; the solver must report every one of the 31² − 1 shifts.
#[test]
fn a_regular_grid_has_a_look_alike_at_every_shift() {
    let (side, spacing_m) = (31, 40.0);
    let side_m = f64::from(side) * spacing_m;
    let field: Vec<(f64, f64)> = (0..side)
        .flat_map(|i| {
            (0..side).map(move |j| ((f64::from(i) + 0.5) * spacing_m, (f64::from(j) + 0.5) * spacing_m))
        })
        .collect();
    let map = SolverMap::new(&unrolled(&field, side_m, 12.0 * spacing_m, 2.0));
    let middle = LocalPoint::new(0.5 * side_m, 0.5 * side_m);
    let base = Cell::from_box(Box2::around(middle, 0.5 * side_m, 0.5 * side_m));
    let mut rng = ChaCha8Rng::seed_from_u64(31);
    // Ten true landmarks of the grid, each within its box.
    let steps: Vec<Step> = (0..10)
        .map(|_| {
            let mut shift =
                || f64::from(rng.random_range(-8..=8)) * spacing_m + rng.random_range(-2.0..2.0f64);
            step((shift(), shift()), 0.0)
        })
        .collect();
    let outcome = solver(&map, base).run(&steps, |_, _| {});
    assert_eq!(outcome.events.len(), 10);
    for (k, event) in outcome.events.iter().enumerate() {
        assert_eq!(event.places - 1, 960, "after {} detections", k + 1);
    }
    let density_form = 961.0 * (16.0 / spacing_m.powi(2)).powi(9) * 100.0;
    println!(
        "960 look-alike shifts after each of 10 detections; a field of this density: {density_form:.1e}"
    );
}
