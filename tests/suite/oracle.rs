//! The solver against an independent search: sampled histories, written plainly, sharing no code with the solver.
//!
//! The search draws positions, biases, noises and landmark positions inside their bounds and keeps those histories that
//! explain every sighting. Each position it finds is feasible by construction, so the solver's set must hold it.

use fixability::detect::{DrawnErrors, Log, LogEvent, simulate};
use fixability::dive::ErrorShape;
use fixability::frame::LocalPoint;
use fixability::locate::{Bounds, steps};
use fixability::map::Landmark;
use fixability::track::Line;
use fixability::track::plan::Plan;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use crate::support::scenes::RandomScene;

/// A sampled history, at its latest event.
#[derive(Clone, Copy)]
struct Particle {
    east: f64,
    north: f64,
    bias: f64,
}

/// Plain statement of the error model, in the oracle's own words.
struct Oracle<'a> {
    landmarks: &'a [Landmark],
    bounds: Bounds,
    rng: ChaCha8Rng,
}

impl Oracle<'_> {
    fn within(&mut self, bound: f64) -> f64 {
        // Half of the draws sit at an end of the bound: the edge of the set is where mistakes show.
        match self.rng.random_range(0..4) {
            0 => bound,
            1 => -bound,
            _ => self.rng.random_range(-1.0..=1.0) * bound,
        }
    }

    /// A displacement that the reported travel allows.
    fn displacement(&mut self, event: &LogEvent, bias: f64) -> (f64, f64) {
        let dr = self.bounds.dead_reckoning;
        let (mut east, mut north) = (0.0, 0.0);
        for piece in &event.travel {
            // The errors are free at every instant: change them half-way along the piece.
            for _ in 0..2 {
                let length = 0.5 * piece.length_m * (1.0 + self.within(dr.scale_error));
                let heading = piece.heading_rad + bias + self.within(dr.heading_noise_rad);
                let toward = self.rng.random_range(0.0..std::f64::consts::TAU);
                let drift =
                    self.rng.random_range(0.0..=1.0f64).sqrt() * dr.drift_mps * 0.5 * piece.duration_s;
                east += length * heading.sin() + drift * toward.sin();
                north += length * heading.cos() + drift * toward.cos();
            }
        }
        (east, north)
    }

    /// A relative position (bearing, horizontal range) that a sighting allows.
    fn relative(&mut self, event: &LogEvent, bias: f64) -> Option<(f64, f64)> {
        let sonar = self.bounds.sonar;
        let y = event.sighting.expect("a sighting");
        // |measured − R| ≤ a + b·R at its two ends, and anything between.
        let lo = (y.slant_range_m - sonar.range_error_m) / (1.0 + sonar.range_error_fraction);
        let hi = (y.slant_range_m + sonar.range_error_m) / (1.0 - sonar.range_error_fraction);
        let slant = (0.5 * (lo + hi) + self.within(0.5 * (hi - lo))).max(0.0);
        let altitude = (sonar.altitude_m + self.within(sonar.altitude_error_m)).max(0.0);
        let square = slant * slant - altitude * altitude;
        if square < 0.0 {
            return None;
        }
        let bearing = y.heading_rad
            + bias
            + self.within(self.bounds.dead_reckoning.heading_noise_rad)
            + y.relative_bearing_rad
            + self.within(sonar.bearing_error_rad);
        Some((bearing, square.sqrt()))
    }

    /// Whether some landmark, somewhere in its box, explains the sighting from `p`.
    fn explains(&mut self, p: Particle, event: &LogEvent) -> bool {
        for _ in 0..40 {
            let Some((bearing, range)) = self.relative(event, p.bias) else { continue };
            let (east, north) = (p.east + range * bearing.sin(), p.north + range * bearing.cos());
            let is_hit = self.landmarks.iter().any(|l| {
                (east - l.position.east_m).abs() <= l.half_width_east_m
                    && (north - l.position.north_m).abs() <= l.half_width_north_m
            });
            if is_hit {
                return true;
            }
        }
        false
    }

    /// Histories that explain the first sighting.
    fn first(&mut self, event: &LogEvent, count: usize) -> Vec<Particle> {
        let mut found = Vec::new();
        for k in 0..count {
            let bias = self.within(self.bounds.dead_reckoning.heading_bias_rad);
            let l = &self.landmarks[k % self.landmarks.len()];
            let (at, half_east, half_north) = (l.position, l.half_width_east_m, l.half_width_north_m);
            let east = at.east_m + self.within(half_east);
            let north = at.north_m + self.within(half_north);
            if let Some((bearing, range)) = self.relative(event, bias) {
                found.push(Particle {
                    east: east - range * bearing.sin(),
                    north: north - range * bearing.cos(),
                    bias,
                });
            }
        }
        found
    }

    /// Histories carried on to the next sighting.
    fn next(&mut self, from: &[Particle], event: &LogEvent, tries: usize) -> Vec<Particle> {
        let mut found = Vec::new();
        for k in 0..tries {
            let p = from[k % from.len()];
            let (east, north) = self.displacement(event, p.bias);
            let moved = Particle { east: p.east + east, north: p.north + north, ..p };
            if self.explains(moved, event) {
                found.push(moved);
            }
        }
        found
    }
}

/// Number of groups of points linked by steps of at most `gap`.
fn groups(points: &[Particle], gap: f64) -> usize {
    let mut left: Vec<Particle> = points.to_vec();
    let mut count = 0;
    while let Some(seed) = left.pop() {
        count += 1;
        let mut front = vec![seed];
        while let Some(p) = front.pop() {
            let (near, far) =
                left.into_iter().partition(|q: &Particle| (q.east - p.east).hypot(q.north - p.north) <= gap);
            left = far;
            front.extend::<Vec<Particle>>(near);
        }
    }
    count
}

/// A small scene: few landmarks, one straight line through them.
fn small_scene(number: u64) -> RandomScene {
    let mut scene = RandomScene::new(number);
    let mut rng = ChaCha8Rng::seed_from_u64(number ^ 0x0AC1E);
    let origin = scene.search_area[0];
    scene.landmarks.truncate(12);
    for l in &mut scene.landmarks {
        l.position = LocalPoint::new(
            origin.east_m + rng.random_range(0.0..400.0),
            origin.north_m + rng.random_range(0.0..400.0),
        );
    }
    let corner = |e: f64, n: f64| LocalPoint::new(origin.east_m + e, origin.north_m + n);
    scene.line = Line {
        name: "small".into(),
        waypoints: vec![
            corner(20.0, rng.random_range(50.0..350.0)),
            corner(380.0, rng.random_range(50.0..350.0)),
        ],
    };
    scene.plan = Plan::new(&scene.line, 0.0);
    // So large that it excludes nothing: the search below does not know the start area.
    let (lo, hi) = (-2000.0, 2400.0);
    scene.search_area = vec![corner(lo, lo), corner(hi, lo), corner(hi, hi), corner(lo, hi)];
    scene.map = fixability::locate::SolverMap::new(&scene.landmarks);
    scene.bounds.heading_slices = 6;
    scene
}

fn log_of(scene: &RandomScene, number: u64) -> Log {
    let errors = DrawnErrors::new(number, "small", 0, ErrorShape::Uniform);
    simulate(&scene.scene(), &scene.plan, &[], &errors).log
}

#[test]
fn every_position_that_an_independent_search_finds_is_in_the_set() {
    let (mut found, mut lost, mut compared, mut agreed) = (0usize, 0usize, 0usize, 0usize);
    for number in 0..40 {
        let scene = small_scene(number);
        let log = log_of(&scene, number);
        let steps = steps(&log, &scene.bounds);
        let mut oracle = Oracle {
            landmarks: &scene.landmarks,
            bounds: scene.bounds,
            rng: ChaCha8Rng::seed_from_u64(number),
        };
        let mut particles: Vec<Particle> = Vec::new();
        let mut is_running = true;
        scene.solver().run(&steps, |summary, set| {
            let event = &log.events[summary.step];
            if summary.step == 0 {
                particles = oracle.first(event, 6000);
            } else if is_running {
                particles = oracle.next(&particles, event, 12_000);
            }
            // Rejection thins the sample out; with few histories left it says nothing about what is not there.
            is_running &= particles.len() >= 200;
            if !is_running {
                return;
            }
            for p in &particles {
                found += 1;
                let at = LocalPoint::new(p.east, p.north);
                lost += usize::from(!set.states.iter().any(|state| state.cell.contains(at)));
            }
            // Where the groups of the sample do not hang on the exact linking distance, the number must agree.
            let count = groups(&particles, 0.6 * scene.fix_size_m);
            if count == groups(&particles, 1.5 * scene.fix_size_m) {
                compared += 1;
                let places = set.places(scene.fix_size_m);
                agreed += usize::from(places == count);
            }
        });
    }
    println!("{found} positions, {lost} lost; places agree at {agreed} of {compared} events");
    assert!(found > 500_000, "the search must find enough to mean something: {found}");
    assert_eq!(lost, 0);
    assert!(compared >= 60, "too few events to mean much: {compared}");
    assert_eq!(agreed, compared, "number of places");
}
