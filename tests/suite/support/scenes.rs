//! Seeded random scenes: maps, lines, vehicles and sonars of many kinds, all invented.

use fixability::detect::{Scene, SimulatedDive};
use fixability::dive::ErrorShape;
use fixability::frame::LocalPoint;
use fixability::locate::cell::Cell;
use fixability::locate::{Bounds, Solver, SolverMap};
use fixability::map::Landmark;
use fixability::track::Line;
use fixability::track::plan::Plan;
use fixability::vehicle::{DeadReckoning, Sonar, SonarKind, Vehicle};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// Everything a simulated dive and its solve need, owned.
pub struct RandomScene {
    pub landmarks: Vec<Landmark>,
    pub map: SolverMap,
    pub line: Line,
    pub plan: Plan,
    pub vehicle: Vehicle,
    pub bounds: Bounds,
    pub scatter_m: f64,
    pub search_area: Vec<LocalPoint>,
    pub shape: ErrorShape,
    pub fix_size_m: f64,
}

/// Side of the square site, metres.
pub const SITE_M: f64 = 1000.0;

impl RandomScene {
    /// Scene number `number`. Every kind of map, sonar, error shape and coordinate size occurs.
    pub fn new(number: u64) -> Self {
        let mut rng = ChaCha8Rng::seed_from_u64(0x5CE4E ^ number);
        // Local frames near 0 and projected ones up to 10⁷ m.
        let origin = [(0.0, 0.0), (512_000.0, 6_231_000.0), (9_998_000.0, 9_999_000.0), (-4000.0, -9000.0)]
            [rng.random_range(0..4)];
        let landmarks = random_map(&mut rng, origin);
        let map = SolverMap::new(&landmarks);
        let line = random_line(&mut rng, origin);
        let vehicle = Vehicle {
            speed_mps: rng.random_range(0.5..3.0),
            turn_radius_m: if rng.random_bool(0.3) { 0.0 } else { rng.random_range(1.0..40.0) },
        };
        let plan = Plan::new(&line, vehicle.turn_radius_m);
        let bounds = random_bounds(&mut rng);
        let scatter_m = if rng.random_bool(0.3) { 0.0 } else { rng.random_range(0.0..40.0) };
        let corner = |e: f64, n: f64| LocalPoint::new(origin.0 + e, origin.1 + n);
        let (lo, hi) = (-150.0, SITE_M + 150.0);
        let shape = [ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady][rng.random_range(0..3)];
        Self {
            landmarks,
            map,
            line,
            plan,
            vehicle,
            bounds,
            scatter_m,
            search_area: vec![corner(lo, lo), corner(hi, lo), corner(hi, hi), corner(lo, hi)],
            shape,
            fix_size_m: rng.random_range(10.0..40.0),
        }
    }

    pub fn scene(&self) -> Scene<'_> {
        Scene {
            landmarks: &self.landmarks,
            index: self.map.index(),
            vehicle: self.vehicle,
            dead_reckoning: self.bounds.dead_reckoning,
            sonar: self.bounds.sonar,
            scatter_m: self.scatter_m,
            gone_chance: 0.0,
        }
    }

    pub fn solver(&self) -> Solver<'_> {
        Solver {
            map: &self.map,
            search_area: Cell::around_points(&self.search_area),
            cell_budget: 200_000,
            stray_budget: 0,
            silence: None,
            miss_budget: 0,
            fix_size_m: self.fix_size_m,
        }
    }
}

/// Number of strays in a dive's log after event number `start`.
pub fn strays_from(dive: &SimulatedDive, start: usize) -> usize {
    let seen = dive.log.events.iter().zip(&dive.truth).skip(start + 1);
    seen.filter(|(event, truth)| event.sighting.is_some() && truth.landmark.is_none()).count()
}

fn random_map(rng: &mut ChaCha8Rng, origin: (f64, f64)) -> Vec<Landmark> {
    let count = rng.random_range(3..120usize);
    let widest = rng.random_range(0.0..4.0);
    let kind = rng.random_range(0..3);
    let spacing = rng.random_range(30.0..90.0);
    let columns = (SITE_M / spacing) as usize;
    let mut centre = (0.0, 0.0);
    (0..count)
        .map(|i| {
            let (e, n) = match kind {
                0 => (rng.random_range(0.0..SITE_M), rng.random_range(0.0..SITE_M)),
                1 => {
                    if i % 6 == 0 {
                        centre = (rng.random_range(0.0..SITE_M), rng.random_range(0.0..SITE_M));
                    }
                    (centre.0 + rng.random_range(-25.0..25.0), centre.1 + rng.random_range(-25.0..25.0))
                }
                _ => ((i % columns) as f64 * spacing, (i / columns) as f64 * spacing),
            };
            Landmark {
                id: format!("L{i}"),
                position: LocalPoint::new(origin.0 + e, origin.1 + n),
                half_width_east_m: rng.random_range(0.0..=widest),
                half_width_north_m: rng.random_range(0.0..=widest),
            }
        })
        .collect()
}

fn random_line(rng: &mut ChaCha8Rng, origin: (f64, f64)) -> Line {
    let count = rng.random_range(2..6);
    let waypoints = (0..count)
        .map(|_| {
            LocalPoint::new(
                origin.0 + rng.random_range(0.0..SITE_M),
                origin.1 + rng.random_range(0.0..SITE_M),
            )
        })
        .collect();
    Line { name: "random".into(), waypoints }
}

fn random_bounds(rng: &mut ChaCha8Rng) -> Bounds {
    let sometimes = |rng: &mut ChaCha8Rng, most: f64| {
        if rng.random_bool(0.2) { 0.0 } else { rng.random_range(0.0..most) }
    };
    let kind = if rng.random_bool(0.65) {
        SonarKind::SideLooking { nadir_gap_rad: sometimes(rng, 0.6) }
    } else {
        SonarKind::ForwardLooking { half_sector_rad: rng.random_range(0.2..1.2) }
    };
    let altitude_m = sometimes(rng, 20.0);
    Bounds {
        dead_reckoning: DeadReckoning {
            scale_error: sometimes(rng, 0.02),
            heading_bias_rad: sometimes(rng, 0.05),
            heading_noise_rad: sometimes(rng, 0.03),
            drift_mps: sometimes(rng, 0.1),
        },
        sonar: Sonar {
            kind,
            range_min_m: sometimes(rng, 10.0),
            range_max_m: rng.random_range(40.0..140.0),
            altitude_m,
            range_error_m: sometimes(rng, 1.5),
            range_error_fraction: sometimes(rng, 0.02),
            bearing_error_rad: sometimes(rng, 0.05),
            altitude_error_m: sometimes(rng, 2.0),
            detection_chance: if rng.random_bool(0.5) { 1.0 } else { 0.8 },
            strays_per_km: 0.0,
            detect_in_turns: rng.random_bool(0.5),
        },
        heading_slices: rng.random_range(1..4),
    }
}

/// A random field of `count` landmarks at 100 per km² with a straight line through its middle: the scene of the
/// benchmarks. Side-looking sonar to 75 m, 0.3 % and 1° dead reckoning, boxes of ± 2 m.
#[allow(dead_code, reason = "the benchmarks use it")]
pub fn open_field(count: usize) -> RandomScene {
    let mut rng = ChaCha8Rng::seed_from_u64(count as u64);
    let side_m = 100.0 * (count as f64).sqrt();
    let landmarks: Vec<Landmark> = (0..count)
        .map(|i| Landmark {
            id: i.to_string(),
            position: LocalPoint::new(rng.random_range(0.0..side_m), rng.random_range(0.0..side_m)),
            half_width_east_m: 2.0,
            half_width_north_m: 2.0,
        })
        .collect();
    let middle = 0.5 * side_m;
    let line = Line {
        name: "field".into(),
        waypoints: vec![
            LocalPoint::new(middle - 600.0, middle - 300.0),
            LocalPoint::new(middle + 600.0, middle + 300.0),
        ],
    };
    let degree = 1f64.to_radians();
    RandomScene {
        map: SolverMap::new(&landmarks),
        landmarks,
        plan: Plan::new(&line, 15.0),
        line,
        vehicle: Vehicle { speed_mps: 1.5, turn_radius_m: 15.0 },
        bounds: Bounds {
            dead_reckoning: DeadReckoning {
                scale_error: 0.003,
                heading_bias_rad: 0.7 * degree,
                heading_noise_rad: 0.3 * degree,
                drift_mps: 0.0,
            },
            sonar: Sonar {
                kind: SonarKind::SideLooking { nadir_gap_rad: 30.0 * degree },
                range_min_m: 0.0,
                range_max_m: 75.0,
                altitude_m: 15.0,
                range_error_m: 0.5,
                range_error_fraction: 0.005,
                bearing_error_rad: degree,
                altitude_error_m: 0.5,
                detection_chance: 1.0,
                strays_per_km: 0.0,
                detect_in_turns: false,
            },
            heading_slices: 1,
        },
        scatter_m: 0.0,
        search_area: vec![
            LocalPoint::new(0.0, 0.0),
            LocalPoint::new(side_m, 0.0),
            LocalPoint::new(side_m, side_m),
            LocalPoint::new(0.0, side_m),
        ],
        shape: ErrorShape::Uniform,
        fix_size_m: 25.0,
    }
}
