//! Look-alikes against plain brute force, against simulated dives that could be confused, and on the demo.

use std::collections::{BTreeMap, BTreeSet};
use std::f64::consts::{FRAC_PI_2, PI};

use fixability::alias::{self, AgreementBounds, Component, LookAlikeRequest, Triangle};
use fixability::assess::Setup;
use fixability::dive::Dive;
use fixability::frame::LocalPoint;
use fixability::map::Landmark;
use fixability::render::{self, ChartSize};
use fixability::report::{LookAlikeKind, LookAlikesReport};
use fixability::vehicle::{DeadReckoning, Sonar, SonarKind};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use crate::support::layout::assert_clear;
use crate::support::program::{Workplace, project};

type Node = (u32, u32);

fn landmark(number: usize, east_m: f64, north_m: f64, half_width_m: f64) -> Landmark {
    Landmark {
        id: format!("L{number}"),
        position: LocalPoint::new(east_m, north_m),
        half_width_east_m: half_width_m,
        half_width_north_m: half_width_m * 0.7,
    }
}

fn random_bounds(rng: &mut ChaCha8Rng) -> AgreementBounds {
    let mut sometimes = |most: f64| if rng.random_bool(0.2) { 0.0 } else { rng.random_range(0.0..most) };
    AgreementBounds {
        dead_reckoning: DeadReckoning {
            scale_error: sometimes(0.02),
            heading_bias_rad: sometimes(0.04),
            heading_noise_rad: sometimes(0.02),
            drift_mps: sometimes(0.03),
        },
        sonar: Sonar {
            kind: SonarKind::SideLooking { nadir_gap_rad: sometimes(0.6) },
            range_min_m: sometimes(10.0),
            range_max_m: 80.0,
            altitude_m: 12.0,
            range_error_m: sometimes(1.0),
            range_error_fraction: sometimes(0.01),
            bearing_error_rad: sometimes(0.03),
            altitude_error_m: sometimes(1.0),
            detection_chance: 1.0,
            strays_per_km: 0.0,
            detect_in_turns: false,
        },
        speed_mps: 1.5,
    }
}

/// The largest displacement of one sighting, by plain sampling: true range over the swath, altitudes at their ends.
fn displacement_m(bounds: &AgreementBounds) -> f64 {
    let (dr, sonar) = (&bounds.dead_reckoning, &bounds.sonar);
    let heights = [sonar.altitude_m - sonar.altitude_error_m, sonar.altitude_m + sonar.altitude_error_m];
    let SonarKind::SideLooking { nadir_gap_rad } = sonar.kind else { panic!("side-looking only") };
    let mut worst: f64 = 0.0;
    for h in heights {
        for step in 0..=4000 {
            let slant =
                sonar.range_min_m + (sonar.range_max_m - sonar.range_min_m) * f64::from(step) / 4000.0;
            if slant < h || (slant * slant - h * h).sqrt() < h * nadir_gap_rad.tan() {
                continue;
            }
            let range = (slant * slant - h * h).sqrt();
            let (a, b) = (sonar.range_error_m, sonar.range_error_fraction);
            for other in
                [((slant * (1.0 + b) + a) + a) / (1.0 - b), ((slant * (1.0 - b) - a) - a) / (1.0 + b)]
            {
                for h2 in heights {
                    let other_range = (other.max(0.0).powi(2) - h2 * h2).max(0.0).sqrt();
                    let turn = 2.0 * (dr.heading_noise_rad + sonar.bearing_error_rad);
                    let (x, y) = (other_range * turn.sin(), other_range * turn.cos() - range);
                    worst = worst.max(x.hypot(y));
                }
            }
        }
    }
    worst
}

/// Whether two separations agree, by the definition and nothing else: some turn, some points of the boxes.
struct PlainCheck<'a> {
    map: &'a [Landmark],
    bounds: AgreementBounds,
    sightings_m: f64,
    separation_max_m: f64,
    extra_m: f64,
}

impl<'a> PlainCheck<'a> {
    fn new(map: &'a [Landmark], bounds: AgreementBounds, separation_max_m: f64, extra_m: f64) -> Self {
        let sightings_m = 2.0 * displacement_m(&bounds);
        Self { map, bounds, sightings_m, separation_max_m, extra_m }
    }

    fn vector(&self, i: u32, j: u32) -> (f64, f64) {
        let (a, b) = (self.map[i as usize].position, self.map[j as usize].position);
        (b.east_m - a.east_m, b.north_m - a.north_m)
    }

    fn agrees(&self, (i, j): Node, (i2, j2): Node, is_near: bool) -> bool {
        let (d, e) = (self.vector(i, i2), self.vector(j, j2));
        let longest = d.0.hypot(d.1).max(e.0.hypot(e.1));
        if i == i2 || j == j2 || (is_near && longest > self.separation_max_m) {
            return false;
        }
        let dr = &self.bounds.dead_reckoning;
        let all = [i, i2, j, j2].map(|n| &self.map[n as usize]);
        let box_e: f64 = all.iter().map(|l| l.half_width_east_m).sum();
        let box_n: f64 = all.iter().map(|l| l.half_width_north_m).sum();
        let crab = (dr.drift_mps / self.bounds.speed_mps).asin();
        let beam = (self.bounds.sonar.bearing_error_rad + crab + dr.heading_noise_rad).min(FRAC_PI_2);
        let low = self.bounds.sonar.altitude_m - self.bounds.sonar.altitude_error_m;
        let far = (self.bounds.sonar.range_max_m.powi(2) - low * low).sqrt();
        let travel = longest + box_e + box_n + 2.0 * far * beam.sin();
        let k = (1.0 + dr.scale_error) / (1.0 - dr.scale_error);
        let turn = 2.0 * dr.heading_noise_rad;
        let per_m =
            (k * turn.sin()).hypot(k * turn.cos() - 1.0) + (1.0 + k) * dr.drift_mps / self.bounds.speed_mps;
        let radius = self.sightings_m + per_m * travel + self.extra_m;
        let most = 2.0 * dr.heading_bias_rad;
        (0..=400).any(|step| {
            let g = most * (f64::from(step) / 200.0 - 1.0);
            let turned = (d.0 * g.cos() + d.1 * g.sin(), d.1 * g.cos() - d.0 * g.sin());
            let side = |h: f64, other: f64| h + other * most.sin();
            let x = ((e.0 - turned.0).abs() - side(box_e, box_n)).max(0.0);
            let y = ((e.1 - turned.1).abs() - side(box_n, box_e)).max(0.0);
            x.hypot(y) <= radius
        })
    }

    /// All triangles, by trying every three landmarks against every three.
    fn triangles(&self) -> BTreeSet<[Node; 3]> {
        let count = self.map.len() as u32;
        let nodes: Vec<Node> =
            (0..count).flat_map(|i| (0..count).filter(move |&j| j != i).map(move |j| (i, j))).collect();
        let joined: Vec<Vec<bool>> =
            nodes.iter().map(|&u| nodes.iter().map(|&v| self.agrees(u, v, true)).collect()).collect();
        let mut found = BTreeSet::new();
        for a in 0..nodes.len() {
            for b in (a + 1)..nodes.len() {
                if joined[a][b] {
                    for c in (b + 1)..nodes.len() {
                        if joined[a][c] && joined[b][c] {
                            found.insert([nodes[a], nodes[b], nodes[c]]);
                        }
                    }
                }
            }
        }
        found
    }
}

fn image(triangle: &[Node; 3]) -> [Node; 3] {
    let mut image = triangle.map(|(i, j)| (j, i));
    image.sort_unstable();
    image
}

/// All triangles of components and their images.
fn both_ways(components: &[Component]) -> BTreeSet<[Node; 3]> {
    components.iter().flat_map(|c| &c.triangles).flat_map(|t| [*t, image(t)]).collect()
}

/// Components by plain code: triangles that share two nodes, images counted once.
fn plain_components(triangles: &BTreeSet<[Node; 3]>) -> BTreeSet<Vec<Node>> {
    let mut left: Vec<[Node; 3]> = triangles.iter().copied().collect();
    let mut found = BTreeSet::new();
    while let Some(seed) = left.pop() {
        let mut group = vec![seed];
        let mut next = 0;
        while next < group.len() {
            let at = group[next];
            let shares = |t: &[Node; 3]| t.iter().filter(|n| at.contains(n)).count() == 2;
            group.extend(left.iter().filter(|t| shares(t)));
            left.retain(|t| !shares(t));
            next += 1;
        }
        let nodes = |group: &mut dyn Iterator<Item = Node>| {
            let set: BTreeSet<Node> = group.collect();
            set.into_iter().collect::<Vec<Node>>()
        };
        let one = nodes(&mut group.iter().flatten().copied());
        let other = nodes(&mut group.iter().flatten().map(|&(i, j)| (j, i)));
        found.insert(one.min(other));
    }
    found
}

fn small_map(rng: &mut ChaCha8Rng) -> Vec<Landmark> {
    let count = rng.random_range(8..13usize);
    let regular = rng.random_bool(0.3);
    (0..count)
        .map(|i| {
            let (e, n) = if regular {
                ((i % 4) as f64 * 50.0, (i / 4) as f64 * 60.0)
            } else {
                (rng.random_range(0.0..350.0), rng.random_range(0.0..350.0))
            };
            landmark(i, 500_000.0 + e, 6_000_000.0 + n, rng.random_range(0.0..1.5))
        })
        .collect()
}

#[test]
fn small_maps_have_exactly_the_look_alikes_of_brute_force() {
    let mut rng = ChaCha8Rng::seed_from_u64(41);
    let (mut triangles, mut settled, mut components_seen) = (0, 0, 0);
    for _ in 0..60 {
        let map = small_map(&mut rng);
        let bounds = random_bounds(&mut rng);
        let separation_max_m = rng.random_range(90.0..220.0);
        let (found, complete) = alias::components(&map, &bounds, separation_max_m);
        assert!(complete);
        let ours = both_ways(&found);
        let least = PlainCheck::new(&map, bounds, separation_max_m, 0.0).triangles();
        // What the closed test may add: the height of the arc over its chord twice, and a piece of the swath.
        let height = separation_max_m * (1.0 - (2.0 * bounds.dead_reckoning.heading_bias_rad).cos());
        let most = PlainCheck::new(&map, bounds, separation_max_m, 2.0 * height + 0.6).triangles();
        let missed: Vec<_> = least.difference(&ours).collect();
        assert!(missed.is_empty(), "not found: {missed:?}");
        let made_up: Vec<_> = ours.difference(&most).collect();
        assert!(made_up.is_empty(), "rejected by brute force: {made_up:?}");
        triangles += least.len();
        if least == most {
            settled += 1;
            let ours: BTreeSet<Vec<Node>> = found.iter().map(|c| c.matches.clone()).collect();
            assert_eq!(ours, plain_components(&least));
            components_seen += ours.len();
        }
    }
    assert!(
        triangles > 500 && settled > 8 && components_seen > 20,
        "{triangles} {settled} {components_seen}"
    );
}

/// A straight run past three landmarks, and another history that explains what is detected, errors at the ends of their
/// bounds or anywhere: the landmarks of the history are look-alikes of those of the run.
#[test]
fn what_a_dive_could_confuse_is_found() {
    let mut rng = ChaCha8Rng::seed_from_u64(7);
    for round in 0..4000 {
        let mut bounds = random_bounds(&mut rng);
        bounds.dead_reckoning.drift_mps = 0.0;
        bounds.sonar.range_min_m = 0.0;
        let (dr, sonar) = (bounds.dead_reckoning, bounds.sonar);
        let corners = rng.random_bool(0.7);
        let mut error = |most: f64| {
            if corners {
                if rng.random_bool(0.5) { most } else { -most }
            } else {
                rng.random_range(-1.0..=1.0) * most
            }
        };
        let (bias, other_bias) = (error(dr.heading_bias_rad), error(dr.heading_bias_rad));
        let course = error(PI);
        let step = |p: &mut (f64, f64), length: f64, heading: f64| {
            *p = (p.0 + length * heading.sin(), p.1 + length * heading.cos());
        };
        let (mut truth, mut history) = ((1000.0, 2000.0), (4000.0 + error(300.0), 5000.0 + error(300.0)));
        let (mut first, mut second) = (Vec::new(), Vec::new());
        for number in 0..3 {
            let run = 30.0 + error(20.0);
            let (noise, other_noise) = (error(dr.heading_noise_rad), error(dr.heading_noise_rad));
            let reported = run / (1.0 + error(dr.scale_error));
            step(&mut truth, run, course);
            let heading = course - bias - noise + other_bias + other_noise;
            step(&mut history, reported * (1.0 + error(dr.scale_error)), heading);
            let side = if error(1.0) > 0.0 { FRAC_PI_2 } else { -FRAC_PI_2 };
            let range = 45.0 + error(20.0);
            let height = sonar.altitude_m + error(sonar.altitude_error_m);
            let slant = range.hypot(height);
            let measured = slant + error(sonar.range_error_m + sonar.range_error_fraction * slant);
            let (a, b) = (sonar.range_error_m, sonar.range_error_fraction);
            let ends = ((measured - a) / (1.0 + b), (measured + a) / (1.0 - b));
            let other_slant = 0.5 * (ends.0 + ends.1) + error(0.5 * (ends.1 - ends.0));
            let other_height = sonar.altitude_m + error(sonar.altitude_error_m);
            let other_range = (other_slant * other_slant - other_height * other_height).max(0.0).sqrt();
            let (mut seen, mut placed) = (truth, history);
            step(&mut seen, range, course + side + error(sonar.bearing_error_rad));
            let at_sighting = course - bias - error(dr.heading_noise_rad);
            let heading = at_sighting + other_bias + error(dr.heading_noise_rad);
            step(&mut placed, other_range, heading + side + error(sonar.bearing_error_rad));
            let mut charted = |p: (f64, f64), n: usize| landmark(n, p.0 + error(1.2), p.1 + error(0.84), 1.2);
            first.push(charted(seen, number));
            second.push(charted(placed, number + 3));
        }
        let map: Vec<Landmark> = first.into_iter().chain(second).collect();
        let (found, _) = alias::components(&map, &bounds, 400.0);
        let wanted: Triangle = [(0, 3), (1, 4), (2, 5)];
        assert!(both_ways(&found).contains(&wanted), "round {round}: {bounds:?}");
    }
}

/// A random map with copies of groups in it: pairs of landmark numbers that were planted.
fn planted(rng: &mut ChaCha8Rng) -> (Vec<Landmark>, Vec<Vec<Node>>) {
    let mut map: Vec<Landmark> = Vec::new();
    let mut plants = Vec::new();
    for plant in 0..3 {
        let size = rng.random_range(4..9usize);
        let from = (300.0 + 900.0 * f64::from(plant), 300.0);
        let shift = (rng.random_range(-100.0..100.0), rng.random_range(1000.0..1400.0));
        let mut nodes = Vec::new();
        for _ in 0..size {
            let (e, n) = (from.0 + rng.random_range(-60.0..60.0), from.1 + rng.random_range(-60.0..60.0));
            let half = rng.random_range(0.5..2.0);
            nodes.push((map.len() as u32, map.len() as u32 + 1));
            map.push(landmark(map.len(), e, n, half));
            let (x, y) = (rng.random_range(-half..half), rng.random_range(-half..half) * 0.7);
            map.push(landmark(map.len(), e + shift.0 + x, n + shift.1 + y, half));
        }
        plants.push(nodes);
    }
    for _ in 0..60 {
        let at = (rng.random_range(0.0..3000.0), rng.random_range(0.0..2200.0));
        map.push(landmark(map.len(), at.0, at.1, rng.random_range(0.5..2.0)));
    }
    (map, plants)
}

const DIVE: &str = "\
name = \"Look-alikes\"
[map]
landmarks = \"landmarks.csv\"
crs = \"local\"
uncertainty = \"bound\"
[lines]
files = [\"lines.csv\"]
[vehicle]
speed_mps = 1.5
[dead_reckoning]
scale_error_pct = 0.3
heading_bias_deg = 0.5
heading_noise_deg = 0.2
[sonar]
kind = \"side-looking\"
range_max_m = 80
altitude_m = 6
range_error_m = 0.3
bearing_error_deg = 0.5
[scoring]
fix_size_m = 25
required_fix_m = 300
segment_m = 100
draws = 2
";

/// The same map as files.
fn place_of(map: &[Landmark], lines: &str, dive: &str) -> Workplace {
    let mut text = String::from("id,easting,northing,uncertainty_east_m,uncertainty_north_m\n");
    for l in map {
        let p = l.position;
        text += &format!(
            "{},{},{},{},{}\n",
            l.id, p.east_m, p.north_m, l.half_width_east_m, l.half_width_north_m
        );
    }
    Workplace::new().write("dive.toml", dive).write("landmarks.csv", &text).write("lines.csv", lines)
}

fn dive_of(map: &[Landmark], lines: &str) -> Dive {
    Dive::read(&place_of(map, lines, DIVE).path("dive.toml")).unwrap()
}

const LINE: &str = "line,easting,northing\nWest,100,300\nWest,2800,320\n";

fn report(dive: &Dive, request: &LookAlikeRequest) -> LookAlikesReport {
    let setup = Setup::new(dive);
    let head = (setup.provenance("fixability.lookalikes"), setup.parameters(), setup.chart_landmarks());
    alias::look_alikes(dive, request, head)
}

#[test]
fn every_planted_pair_is_found_and_none_is_reported_that_brute_force_rejects() {
    let mut rng = ChaCha8Rng::seed_from_u64(5);
    let mut checked = 0;
    for _ in 0..12 {
        let (map, plants) = planted(&mut rng);
        let dive = dive_of(&map, LINE);
        let bounds = AgreementBounds::of(&dive);
        let separation_max_m = alias::separation_default_m(&dive);
        let (components, _) = alias::components(&dive.landmarks, &bounds, separation_max_m);
        let request = LookAlikeRequest { listed: 5000, ..LookAlikeRequest::default() };
        let report = report(&dive, &request);
        assert_eq!(report.unlisted(), 0);
        for nodes in &plants {
            let holds = |c: &Component| {
                nodes.iter().all(|n| c.matches.contains(n) || c.matches.contains(&(n.1, n.0)))
            };
            assert!(components.iter().any(holds), "planted {nodes:?}");
            let reported = report.look_alikes.iter().any(|entry| {
                let pairs: BTreeSet<Node> = (entry.numbers_1.iter().zip(&entry.numbers_2))
                    .flat_map(|(&i, &j)| [(i as u32, j as u32), (j as u32, i as u32)])
                    .collect();
                nodes.iter().filter(|n| pairs.contains(n)).count() >= nodes.len().min(4)
            });
            assert!(reported, "planted {nodes:?}");
        }
        let plain = PlainCheck::new(&dive.landmarks, bounds, separation_max_m, 0.3);
        for entry in &report.look_alikes {
            let nodes: Vec<Node> =
                entry.numbers_1.iter().zip(&entry.numbers_2).map(|(&i, &j)| (i as u32, j as u32)).collect();
            assert!(nodes.len() >= 3 && nodes.len() == entry.landmarks);
            assert!(entry.apart_m > dive.scoring.fix_size_m * 0.5, "{entry:?}");
            for (k, &u) in nodes.iter().enumerate() {
                for &v in &nodes[..k] {
                    assert!(plain.agrees(u, v, false), "{u:?} and {v:?} of {entry:?}");
                    checked += 1;
                }
            }
            assert!(entry.disagreement_rms_m <= entry.disagreement_worst_m);
        }
        // Most landmarks first.
        assert!(report.look_alikes.windows(2).all(|pair| pair[0].landmarks >= pair[1].landmarks));
    }
    assert!(checked > 300, "{checked}");
}

fn scaled(dive: &Dive, scale: f64) -> (Vec<Landmark>, AgreementBounds) {
    let mut landmarks = dive.landmarks.clone();
    for l in &mut landmarks {
        l.half_width_east_m *= scale;
        l.half_width_north_m *= scale;
    }
    let mut bounds = AgreementBounds::of(dive);
    let (dr, sonar) = (&mut bounds.dead_reckoning, &mut bounds.sonar);
    for bound in [
        &mut dr.scale_error,
        &mut dr.heading_bias_rad,
        &mut dr.heading_noise_rad,
        &mut dr.drift_mps,
        &mut sonar.range_error_m,
        &mut sonar.range_error_fraction,
        &mut sonar.bearing_error_rad,
        &mut sonar.altitude_error_m,
    ] {
        *bound *= scale;
    }
    (landmarks, bounds)
}

#[test]
fn a_look_alike_breaks_at_its_break_scale() {
    let mut rng = ChaCha8Rng::seed_from_u64(15);
    let mut checked = 0;
    for _ in 0..4 {
        let (map, _) = planted(&mut rng);
        let dive = dive_of(&map, LINE);
        let separation_max_m = alias::separation_default_m(&dive);
        let (whole, _) = alias::components(&dive.landmarks, &AgreementBounds::of(&dive), separation_max_m);
        for entry in report(&dive, &LookAlikeRequest::default()).look_alikes.iter().take(12) {
            let nodes: Vec<Node> =
                entry.numbers_1.iter().zip(&entry.numbers_2).map(|(&i, &j)| (i as u32, j as u32)).collect();
            let component = whole
                .iter()
                .find(|c| nodes.iter().all(|n| c.matches.contains(n)))
                .expect("an entry comes from a component");
            let own: BTreeSet<[Node; 3]> = component.triangles.iter().copied().collect();
            let left = |factor: f64| {
                let (landmarks, bounds) = scaled(&dive, entry.break_scale * factor);
                let (found, _) = alias::components(&landmarks, &bounds, separation_max_m);
                both_ways(&found).intersection(&own).count()
            };
            if entry.break_scale * 1.01 <= 1.0 {
                assert!(left(1.01) > 0, "{entry:?}");
                checked += 1;
            }
            assert_eq!(left(0.99), 0, "{entry:?}");
        }
    }
    assert!(checked > 10, "{checked}");
}

#[test]
fn smaller_bounds_never_add_a_look_alike() {
    let mut rng = ChaCha8Rng::seed_from_u64(77);
    let mut lost = 0;
    for _ in 0..150 {
        let map = small_map(&mut rng);
        let bounds = random_bounds(&mut rng);
        let before = both_ways(&alias::components(&map, &bounds, 200.0).0);
        for which in 0..9 {
            let factor = rng.random_range(0.0..1.0);
            let (mut map, mut smaller) = (map.clone(), bounds);
            match which {
                0 => smaller.dead_reckoning.scale_error *= factor,
                1 => smaller.dead_reckoning.heading_bias_rad *= factor,
                2 => smaller.dead_reckoning.heading_noise_rad *= factor,
                3 => smaller.dead_reckoning.drift_mps *= factor,
                4 => smaller.sonar.range_error_m *= factor,
                5 => smaller.sonar.range_error_fraction *= factor,
                6 => smaller.sonar.bearing_error_rad *= factor,
                7 => smaller.sonar.altitude_error_m *= factor,
                _ => map.iter_mut().for_each(|l| {
                    l.half_width_east_m *= factor;
                    l.half_width_north_m *= factor;
                }),
            }
            let after = both_ways(&alias::components(&map, &smaller, 200.0).0);
            assert!(after.is_subset(&before), "bound {which} times {factor}");
            lost += before.len() - after.len();
        }
    }
    assert!(lost > 50, "{lost}");
}

/// Ground that looks like other ground turned by half a turn confuses a vehicle without a compass, and no other.
#[test]
fn case_17_half_a_turn_is_reported_where_the_heading_is_loose() {
    let mut rng = ChaCha8Rng::seed_from_u64(3);
    let group: Vec<(f64, f64)> =
        (0..6).map(|_| (rng.random_range(-50.0..50.0), rng.random_range(-50.0..50.0))).collect();
    let mut map: Vec<Landmark> =
        group.iter().enumerate().map(|(n, p)| landmark(n, 200.0 + p.0, 300.0 + p.1, 0.5)).collect();
    map.extend(group.iter().enumerate().map(|(n, p)| landmark(6 + n, 1500.0 - p.0, 800.0 - p.1, 0.5)));
    let dive_with = |bias: &str| {
        let text = DIVE.replace("heading_bias_deg = 0.5", &format!("heading_bias_deg = {bias}"));
        Dive::read(&place_of(&map, LINE, &text).path("dive.toml")).unwrap()
    };
    let turned = |dive: &Dive| {
        let report = report(dive, &LookAlikeRequest::default());
        let found: Vec<(usize, f64)> = report
            .look_alikes
            .iter()
            .filter(|entry| entry.turn_deg.abs() > 170.0)
            .map(|entry| (entry.landmarks, entry.apart_m))
            .collect();
        found
    };
    let loose = turned(&dive_with("180"));
    assert_eq!(loose[0].0, 6, "{loose:?}");
    let middle = |points: &[Landmark]| {
        let sum = points.iter().fold((0.0, 0.0), |s, l| (s.0 + l.position.east_m, s.1 + l.position.north_m));
        LocalPoint::new(sum.0 / 6.0, sum.1 / 6.0)
    };
    assert!((loose[0].1 - middle(&map[..6]).distance_m(middle(&map[6..]))).abs() < 1e-6);
    assert!(turned(&dive_with("1")).is_empty());
    assert!(turned(&dive_with("60")).is_empty());
}

/// On a plain grid of m by n blocks the shift (a, b) matches (m − |a|)(n − |b|) of them (counting).
#[test]
fn case_16_a_grid_is_one_entry_with_its_periods_and_all_shifts() {
    let grid: Vec<Landmark> = (0..30)
        .map(|n| landmark(n, 400.0 + 60.0 * (n % 6) as f64, 250.0 + 50.0 * (n / 6) as f64, 0.5))
        .collect();
    let dive = dive_of(&grid, LINE);
    let report = report(&dive, &LookAlikeRequest::default());
    let first = &report.look_alikes[0];
    assert_eq!(first.kind, LookAlikeKind::Grid);
    let layout = first.layout.as_ref().unwrap();
    assert_eq!(layout.landmarks, 30);
    let mut periods: Vec<f64> = layout.periods.iter().map(|p| p.period_m).collect();
    periods.sort_by(f64::total_cmp);
    assert!((periods[0] - 50.0).abs() < 1e-6 && (periods[1] - 60.0).abs() < 1e-6, "{periods:?}");
    // Shifts that leave a triangle of blocks: at least two rows and two columns, or three in a line.
    let mut shifts = 0;
    for a in -5i32..=5 {
        for b in 0..=4i32 {
            let (m, n) = (6 - a.abs(), 5 - b);
            let spans = (m >= 2 && n >= 2) || m >= 3 && n >= 1 || n >= 3 && m >= 1;
            if (b > 0 || a > 0) && spans {
                shifts += 1;
            }
        }
    }
    assert_eq!(layout.shifts, shifts);
    assert_eq!(first.landmarks, 25, "the shortest shift leaves 25 blocks or 24");
    assert!(report.look_alikes.len() == 1, "{:?}", report.look_alikes.len());
    assert!(first.break_scale < 1e-3);
    // The nearest landmark on one side only is the next block of the grid.
    let tell = first.nearest_tell_tale().unwrap();
    assert!((tell.from_edge_m - 50.0).abs() < 1e-6 || (tell.from_edge_m - 60.0).abs() < 1e-6, "{tell:?}");
    assert!(first.line_m > 200.0, "the line runs through the grid: {}", first.line_m);
}

#[test]
fn grid_and_row_of_the_demo_come_out_on_top() {
    let dive = Dive::read(&project("demo-data/dive.toml")).unwrap();
    let report = report(&dive, &LookAlikeRequest::default());
    let [grid, row, rest @ ..] = report.look_alikes.as_slice() else { panic!("a list") };
    assert_eq!((grid.kind, row.kind), (LookAlikeKind::Grid, LookAlikeKind::Row));
    let (of_grid, of_row) = (grid.layout.as_ref().unwrap(), row.layout.as_ref().unwrap());
    assert_eq!((of_grid.landmarks, of_row.landmarks), (42, 20));
    assert!(of_grid.periods.iter().all(|p| (p.period_m - 70.0).abs() < 0.01));
    assert!((of_row.periods[0].period_m - 40.0).abs() < 0.01 && of_row.periods.len() == 1);
    // Leg 1 of line C runs from (120, 880) to (1098, 1088): the row lies along it.
    let leg_deg = (978f64 / 208.0).atan().to_degrees();
    assert!((of_row.periods[0].bearing_deg - leg_deg).abs() < 0.01);
    assert!(grid.ground_1.iter().all(|id| id.starts_with("M-")));
    assert!(row.ground_1.iter().all(|id| id.starts_with('T')));
    assert!(rest.iter().all(|entry| entry.kind == LookAlikeKind::Pair && entry.landmarks < row.landmarks));
    // Shifts are not listed one by one.
    let regular = |id: &str| id.starts_with("M-") || id.starts_with('T');
    assert!(rest.iter().all(|entry| !entry.ground_1.iter().chain(&entry.ground_2).all(|id| regular(id))));
    assert!(report.in_layouts > 50);
}

#[test]
fn charts_keep_their_texts_apart() {
    let demo = Dive::read(&project("demo-data/dive.toml")).unwrap();
    let mut rng = ChaCha8Rng::seed_from_u64(21);
    let (map, _) = planted(&mut rng);
    let none: Vec<Landmark> = (0..2).map(|n| landmark(n, 500.0 + 40.0 * n as f64, 350.0, 1.0)).collect();
    for (dive, has_some) in [(demo, true), (dive_of(&map, LINE), true), (dive_of(&none, LINE), false)] {
        let report = report(&dive, &LookAlikeRequest::default());
        assert_eq!(!report.look_alikes.is_empty(), has_some);
        for (width_px, height_px) in [(1754, 1240), (1000, 700), (1240, 1754)] {
            let size = ChartSize::pixels(width_px, height_px);
            let texts = render::lookalikes_layout(&report, &size).unwrap();
            assert!(texts.len() > 15);
            assert_clear(&texts, &size, "map");
            assert_clear(&render::lookalike_panels_layout(&report, &size).unwrap(), &size, "panels");
        }
        let bytes = render::lookalikes_png(&report, &ChartSize::default()).unwrap();
        assert_eq!(bytes, render::lookalikes_png(&report, &ChartSize::default()).unwrap());
        assert!(!render::lookalike_panels_png(&report, &ChartSize::default()).unwrap().is_empty());
    }
}

const FILES: [&str; 5] =
    ["lookalikes-panels.png", "lookalikes.csv", "lookalikes.geojson", "lookalikes.json", "lookalikes.png"];

#[test]
fn files_say_what_was_found() {
    let place = Workplace::new();
    let demo = project("demo-data/dive.toml");
    let run = |options: &[&str]| {
        let mut arguments = vec!["lookalikes", demo.to_str().unwrap()];
        arguments.extend(options);
        crate::support::program::Ran::of(place.command(arguments).output().unwrap())
    };
    let ran = run(&["--out", "out"]).expect(0);
    assert!(
        ran.stdout.is_ascii() && ran.stdout.contains("Number 1: a grid of 42 landmarks"),
        "{}",
        ran.stdout
    );
    assert_eq!(place.names("out"), FILES);
    let json: serde_json::Value = serde_json::from_slice(&place.bytes("out/lookalikes.json")).unwrap();
    assert_eq!(json["schema"], "fixability.lookalikes");
    assert_eq!(json["schema_version"], 1);
    assert_eq!(json["inputs"][0]["sha256"].as_str().unwrap().len(), 64);
    assert!(json["caution"].as_str().unwrap().contains("not for navigation"));
    let entries = json["look_alikes"].as_array().unwrap();
    assert_eq!(entries.len(), 40);
    assert!(json.get("landmarks").is_none());

    let mut reader = csv::Reader::from_reader(std::io::Cursor::new(place.bytes("out/lookalikes.csv")));
    let header = reader.headers().unwrap().clone();
    let rows: Vec<BTreeMap<String, String>> = reader
        .records()
        .map(|row| header.iter().map(str::to_owned).zip(row.unwrap().iter().map(str::to_owned)).collect())
        .collect();
    assert_eq!(rows.len(), entries.len());
    for (row, entry) in rows.iter().zip(entries) {
        for name in ["number", "landmarks", "apart_m", "break_scale", "line_m", "disagreement_worst_m"] {
            // The JSON reader of this test may be off by one in the last digit.
            let (in_csv, in_json) = (row[name].parse::<f64>().unwrap(), entry[name].as_f64().unwrap());
            assert!((in_csv - in_json).abs() <= 1e-12 * in_json.abs(), "{name}");
        }
        assert_eq!(row["kind"], entry["kind"].as_str().unwrap());
        assert_eq!(row["ground_1"].split(' ').count() as u64, entry["landmarks"].as_u64().unwrap());
        assert_eq!(row["layout_landmarks"].is_empty(), row["kind"] == "pair");
    }

    let text = String::from_utf8(place.bytes("out/lookalikes.geojson")).unwrap();
    let collection: geojson::FeatureCollection = text.parse().unwrap();
    assert_eq!(collection.features.len(), 5 * entries.len());
    for feature in &collection.features {
        let value = serde_json::to_value(feature.geometry.as_ref().unwrap()).unwrap();
        let mut numbers: Vec<f64> = Vec::new();
        let mut stack = vec![&value["coordinates"]];
        while let Some(at) = stack.pop() {
            match at.as_array() {
                Some(list) if list[0].is_number() => {
                    let (lon, lat) = (list[0].as_f64().unwrap(), list[1].as_f64().unwrap());
                    // The demo lies between 512 and 514.6 km E, 6171 and 6173 km N in UTM zone 31N.
                    assert!((3.18..3.24).contains(&lon) && (55.68..55.71).contains(&lat), "{lon} {lat}");
                    numbers.push(lon);
                }
                Some(list) => stack.extend(list),
                None => panic!("{at}"),
            }
        }
        assert!(numbers.len() >= 2);
        if value["type"] == "Polygon" {
            let ring: Vec<(f64, f64)> = value["coordinates"][0]
                .as_array()
                .unwrap()
                .iter()
                .map(|p| (p[0].as_f64().unwrap(), p[1].as_f64().unwrap()))
                .collect();
            assert_eq!(ring.first(), ring.last());
            let from = ring[0];
            let at = |p: (f64, f64)| (p.0 - from.0, p.1 - from.1);
            let area: f64 =
                ring.windows(2).map(|w| (at(w[0]), at(w[1]))).map(|(a, b)| a.0 * b.1 - b.0 * a.1).sum();
            assert!(area > 0.0, "RFC 7946: exterior rings run anticlockwise");
        }
    }

    let again = run(&["--out", "out"]).expect(3);
    assert!(again.stderr.contains("lookalikes.json") && again.stderr.contains("--force"));
    let few = run(&["--listed", "2", "--json", "--quiet"]).expect(0).json();
    assert_eq!(few["look_alikes"].as_array().unwrap().len(), 2);
    assert_eq!(few["found"], json["found"]);
    assert_eq!(few["look_alikes"][1], entries[1]);
    let near = run(&["--separation-m", "60", "--json", "--quiet"]).expect(0).json();
    assert!(near["found"].as_u64() < json["found"].as_u64());
    run(&["--separation-m", "0"]).expect(2);
    run(&["--listed", "0"]).expect(2);
}

#[test]
fn local_metres_give_no_geojson_and_say_so() {
    let mut rng = ChaCha8Rng::seed_from_u64(2);
    let (map, _) = planted(&mut rng);
    let place = place_of(&map, LINE, DIVE);
    let ran = place.run("lookalikes dive.toml --out out").expect(0);
    assert!(ran.stderr.contains("lookalikes.geojson is not written"), "{}", ran.stderr);
    assert_eq!(
        place.names("out"),
        ["lookalikes-panels.png", "lookalikes.csv", "lookalikes.json", "lookalikes.png"]
    );
}

/// Boxes as wide as the site: everything agrees with everything.
#[test]
fn a_search_that_grows_too_large_is_undecided() {
    let map: Vec<Landmark> =
        (0..150).map(|n| landmark(n, (n * 257 % 701) as f64, (n * n * 131 % 601) as f64, 300.0)).collect();
    let place = place_of(&map, "line,easting,northing\nA,0,300\nA,700,300\n", DIVE);
    let ran = place.run("lookalikes dive.toml").expect(5);
    assert!(
        ran.stdout.contains("(not all were found)") && ran.stderr.contains("--separation-m"),
        "{}",
        ran.stderr
    );
    // Marks from some of the look-alikes would look like clear ground elsewhere: a list of some is then no list.
    let dive = dive_of(&map, "line,easting,northing\nA,0,300\nA,700,300\n");
    let whole = LookAlikeRequest { only_whole: true, ..LookAlikeRequest::default() };
    let nothing = report(&dive, &whole);
    assert!(!nothing.complete && nothing.look_alikes.is_empty());
}

#[test]
fn lines_mark_the_segments_over_look_alike_ground() {
    let place = Workplace::new();
    let demo = project("demo-data/dive.toml");
    let ran =
        place.command(["lines", demo.to_str().unwrap(), "--draws", "1", "--json", "-q"]).output().unwrap();
    let json = crate::support::program::Ran::of(ran).json();
    let line = |name: &str| {
        json["lines"].as_array().unwrap().iter().find(|l| l["name"] == name).unwrap()["segments"].clone()
    };
    let marked = |segments: &serde_json::Value, number: u64| -> Vec<(f64, f64)> {
        let has = |s: &&serde_json::Value| s["look_alikes"].as_array().unwrap().contains(&number.into());
        let ends = |s: &serde_json::Value| (s["start_m"].as_f64().unwrap(), s["end_m"].as_f64().unwrap());
        segments.as_array().unwrap().iter().filter(has).map(ends).collect()
    };
    let c = line("C");
    // The row stands beside line C from 60 m to 820 m; the grid about its second leg.
    let row = marked(&c, 2);
    assert_eq!((row[0].0, row[row.len() - 1].1), (50.0, 850.0));
    let grid = marked(&c, 1);
    assert!(grid.len() >= 8 && grid[0].0 > 1100.0, "{grid:?}");
    assert!(marked(&line("B"), 1).is_empty() && marked(&line("B"), 2).is_empty());
}
