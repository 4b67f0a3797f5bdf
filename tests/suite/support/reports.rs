//! Invented report values for charts and exporters: seeded scenes, no solver behind them.

use fixability::dive::{ErrorShape, InputFile, RankBy};
use fixability::frame::{Frame, LocalPoint};
use fixability::report::{
    CAUTION, ChartLandmark, CorridorReport, Estimate, EstimatedFix, GuaranteedFix, Hindsight, HindsightEvent,
    LineReport, LinesReport, Parameters, ProfilePoint, Provenance, SegmentReport, TraceEvent, TraceReport,
};
use rand::{Rng, RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// South-west corner of every scene, metres east and north.
pub const ORIGIN: (f64, f64) = (512_000.0, 6_231_000.0);

pub fn generator(seed: u64) -> ChaCha8Rng {
    ChaCha8Rng::seed_from_u64(seed)
}

pub fn at(east_m: f64, north_m: f64) -> LocalPoint {
    LocalPoint::new(ORIGIN.0 + east_m, ORIGIN.1 + north_m)
}

pub fn provenance(schema: &'static str) -> Provenance {
    let input = |name: &str, byte: &str| InputFile { name: name.to_owned(), sha256: byte.repeat(32) };
    Provenance {
        schema,
        schema_version: 1,
        tool_version: "0.1.0",
        dive: "Kettle Deep (invented)".to_owned(),
        inputs: vec![input("dive.toml", "4f"), input("landmarks.csv", "9a"), input("lines.csv", "77")],
        seed: 20_261_201,
        generator: "ChaCha8",
        issued: None,
        surveyed: None,
        map_age_days: None,
        coordinate_system: "WGS 84 / UTM zone 31N (EPSG:32631)".to_owned(),
        epsg: Some(32_631),
        frame: Frame::from_epsg(32_631).expect("a projected code"),
        caution: CAUTION,
    }
}

pub fn parameters() -> Parameters {
    Parameters {
        speed_mps: 1.5,
        turn_radius_m: 15.0,
        scale_error_pct: 0.3,
        heading_bias_deg: 0.7,
        heading_noise_deg: 0.2,
        drift_mps: 0.0,
        heading_slices: 4,
        strays_per_km: 0.0,
        stray_budget: 0,
        miss_budget: 0,
        nothing_seen: false,
        sonar_kind: "side-looking",
        range_min_m: 10.0,
        range_max_m: 75.0,
        nearest_horizontal_m: 5.0,
        farthest_horizontal_m: 74.3,
        sector_deg: None,
        nadir_gap_deg: Some(30.0),
        altitude_m: 10.0,
        range_error_m: 0.2,
        range_error_pct: 0.5,
        bearing_error_deg: 1.0,
        altitude_error_m: 0.3,
        detection_chance: 1.0,
        detect_in_turns: false,
        landmarks: 0,
        landmark_uncertainty: "bounds as given".to_owned(),
        half_width_min_m: Some(1.0),
        half_width_max_m: Some(3.0),
        search_area_km2: 4.5,
        scatter_m: 50.0,
        common_shift_m: 0.0,
        gone_chance: 0.0,
        fix_size_m: 25.0,
        required_fix_m: 450.0,
        segment_m: 50.0,
        draws: 200,
        error_shapes: vec![ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady],
        cell_budget: 100_000,
    }
}

fn around(value: f64) -> Estimate {
    Estimate { value: Some(value), low: Some(value * 0.9), high: Some(value * 1.1) }
}

const NONE: Estimate = Estimate { value: None, low: None, high: None };

/// Statistics with this 95th percentile; none means that too many dives have no fix.
pub fn estimated(p95_m: Option<f64>, undecided_share: f64) -> EstimatedFix {
    EstimatedFix {
        dives: 200,
        median_m: p95_m.map_or(NONE, |p95| around(p95 * 0.6)),
        p95_m: p95_m.map_or(NONE, around),
        within_required_share: around(p95_m.map_or(0.3, |p95| (1.2 - p95 / 1500.0).clamp(0.0, 1.0))),
        no_fix_share: around(if p95_m.is_some() { 0.01 } else { 0.2 }),
        lasting_median_m: p95_m.map_or(NONE, around),
        lasting_p95_m: p95_m.map_or(NONE, around),
        relapse_share: 0.0,
        contradiction_share: 0.0,
        wrong_fix_share: 0.0,
        undecided_share,
    }
}

/// A straight or bent line through `corners`, in segments of about 50 m. `finding` gives the statistics of segment n
/// of m.
pub fn line(
    name: &str,
    rank: usize,
    corners: &[LocalPoint],
    mut finding: impl FnMut(usize, usize) -> EstimatedFix,
) -> LineReport {
    let mut segments = Vec::new();
    let mut along = 0.0;
    let count: usize = corners.windows(2).map(|w| pieces(w[0], w[1])).sum();
    for pair in corners.windows(2) {
        let (from, to) = (pair[0], pair[1]);
        let n = pieces(from, to);
        let length = from.distance_m(to) / n as f64;
        let point = |i: usize| {
            let t = i as f64 / n as f64;
            LocalPoint::new(
                from.east_m + (to.east_m - from.east_m) * t,
                from.north_m + (to.north_m - from.north_m) * t,
            )
        };
        for i in 0..n {
            segments.push(SegmentReport {
                number: segments.len() + 1,
                start_m: along,
                end_m: along + length,
                path: vec![point(i), point(i + 1)],
                detections_ahead: (count - segments.len()) * 2,
                estimated: finding(segments.len(), count),
                guaranteed: None,
                look_alikes: Vec::new(),
                remap_regions: Vec::new(),
            });
            along += length;
        }
    }
    LineReport {
        guaranteed: None,
        name: name.to_owned(),
        rank,
        length_m: along,
        detections_expected: 2 * count,
        blind_turn_m: 12.5,
        waypoints: corners.to_vec(),
        estimated: estimated(Some(180.0 + 110.0 * rank as f64), 0.0),
        segments_p95_within_share: 0.8,
        segments,
        profile: (0..=(along / 50.0) as usize).map(profile_point).collect(),
    }
}

/// Places after 50 m times `step`: none before the first detection, then ever fewer.
fn profile_point(step: usize) -> ProfilePoint {
    let places = |from: usize, halving: f64| {
        (step >= from).then(|| (250.0 * 0.5_f64.powf((step - from) as f64 / halving)).ceil())
    };
    ProfilePoint {
        run_m: 50.0 * step as f64,
        dives: 200,
        places_median: places(1, 0.7),
        places_p95: places(3, 1.5),
        spread_median_m: None,
        spread_p95_m: None,
        fixed_share: 0.0,
    }
}

fn pieces(from: LocalPoint, to: LocalPoint) -> usize {
    ((from.distance_m(to) / 50.0).round() as usize).max(1)
}

fn landmarks(random: &mut impl Rng, count: usize, width_m: f64, height_m: f64) -> Vec<ChartLandmark> {
    (0..count)
        .map(|_| ChartLandmark {
            position: at(random.random_range(-100.0..width_m), random.random_range(-100.0..height_m)),
            half_width_east_m: random.random_range(1.0..3.0),
            half_width_north_m: random.random_range(1.0..3.0),
        })
        .collect()
}

/// Four lines over 400 rocks: every class, a stretch without a fix, and a few undecided segments.
pub fn four_lines() -> LinesReport {
    let mut random = generator(1);
    let mut walk = |low: f64, high: f64| {
        let mut random = generator(random.random());
        let mut value = (low + high) / 2.0;
        move |segment: usize, count: usize| {
            value = (value + random.random_range(-90.0..90.0_f64)).clamp(low, high);
            if segment + 4 > count { estimated(None, 0.0) } else { estimated(Some(value), 0.0) }
        }
    };
    let (mut a, mut b, mut c, mut d) =
        (walk(100.0, 560.0), walk(60.0, 420.0), walk(60.0, 500.0), walk(80.0, 600.0));
    let lines = vec![
        line("A", 2, &[at(100.0, 1700.0), at(2500.0, 1700.0)], &mut a),
        line("B", 1, &[at(100.0, 1150.0), at(1300.0, 1250.0), at(2500.0, 1150.0)], &mut b),
        line("C", 4, &[at(120.0, 450.0), at(2500.0, 450.0)], |segment, count| match segment {
            29..=38 => estimated(None, 0.0),
            40..=42 => estimated(None, 0.2),
            _ => c(segment, count),
        }),
        line("D", 3, &[at(400.0, 100.0), at(900.0, 1850.0)], &mut d),
    ];
    let landmarks = landmarks(&mut generator(2), 400, 2700.0, 2000.0);
    report(lines, landmarks)
}

pub fn report(lines: Vec<LineReport>, landmarks: Vec<ChartLandmark>) -> LinesReport {
    let mut parameters = parameters();
    parameters.landmarks = landmarks.len();
    LinesReport {
        guarantee: None,
        provenance: provenance("fixability.lines"),
        parameters,
        rank_by: RankBy::Share,
        lines,
        landmarks,
    }
}

/// The same report with a guaranteed distance on every segment that has an estimate.
pub fn guaranteed(mut report: LinesReport) -> LinesReport {
    for segment in report.lines.iter_mut().flat_map(|line| &mut line.segments) {
        let distance_m = segment.estimated.p95_m.value.map(|p95| p95 * 1.15);
        let reason = distance_m.is_none().then(|| "look-alike ground, evenly spaced".to_owned());
        segment.guaranteed =
            Some(GuaranteedFix { distance_m, lasting_m: None, certain_detections: 5, cause: None, reason });
    }
    report
}

/// Names that are awkward to draw.
pub const NAMES: [&str; 8] = [
    "A",
    "Långgrundet väst – öst, första försöket före stormen i november",
    "Линия восемь через каменное поле",
    "Γραμμή 7 (βόρεια)",
    "north-east approach to the mooring blocks, second alternative, reversed",
    "line\twith\ttabs",
    "測線一",
    "Ligne n° 4 à l’écart des épaves",
];

/// A random scene: 1 to 12 lines of 2 to 4 corners, many starting at the same place, with awkward names.
pub fn random_scene(seed: u64) -> LinesReport {
    let mut random = generator(seed);
    let (width, height) = (random.random_range(300.0..8000.0), random.random_range(300.0..8000.0));
    let shared = at(random.random_range(0.0..width), random.random_range(0.0..height));
    let count = random.random_range(1..=12);
    let lines = (0..count)
        .map(|number| {
            let mut corners: Vec<LocalPoint> = (0..random.random_range(2..=4))
                .map(|_| at(random.random_range(0.0..width), random.random_range(0.0..height)))
                .collect();
            if number % 3 == 1 {
                corners[0] = shared;
            }
            let name = format!("{} {}", NAMES[random.random_range(0..NAMES.len())], number + 1);
            let mut random = generator(random.random());
            line(&name, number + 1, &corners, move |_, _| match random.random_range(0..10) {
                0 => estimated(None, 0.0),
                1 => estimated(None, 0.15),
                _ => estimated(Some(random.random_range(20.0..900.0)), 0.0),
            })
        })
        .collect();
    let marks = landmarks(&mut random, 300, width, height);
    report(lines, marks)
}

/// A traced dive of `count` detections along a straight line over a 2 km search area, its feasible cells shrinking.
pub fn trace(count: usize) -> TraceReport {
    let mut random = generator(7);
    let path = vec![at(300.0, 1000.0), at(1700.0, 1100.0)];
    let marks = landmarks(&mut random, 300, 2000.0, 2000.0);
    let mut events = Vec::new();
    for index in 0..count {
        let t = (index + 1) as f64 / (count + 1) as f64;
        let truth = at(300.0 + 1400.0 * t, 1000.0 + 100.0 * t);
        let wanted = (300.0 / 4.0_f64.powi(index as i32)).clamp(1.0, 300.0).round() as usize;
        let half = 12.0 / (index as f64 + 1.0);
        let mut cells: Vec<Vec<LocalPoint>> = (1..wanted)
            .map(|_| octagon(at(random.random_range(0.0..2000.0), random.random_range(0.0..2000.0)), half))
            .collect();
        cells.push(octagon(truth, half));
        let spread_m = if cells.len() > 1 { 1800.0 / (index + 1) as f64 } else { 2.0 * half };
        events.push(TraceEvent {
            number: index + 1,
            run_m: 1403.0 * t,
            along_m: 1403.0 * t,
            time_s: 935.0 * t,
            slant_range_m: 40.25,
            relative_bearing_deg: 90.0,
            heading_deg: 86.0,
            cells: cells.len(),
            places: cells.len(),
            spread_m: Some(spread_m),
            is_fix: spread_m <= 25.0,
            true_landmark: format!("R{index:03}"),
            true_position: truth,
            truth_inside: true,
            hindsight: Some(HindsightEvent {
                cells: 1,
                places: 1,
                spread_m: 2.0 * half,
                identified: (index % 4 < 2).then(|| format!("R{index:03}")),
                candidate_count: [1, 1, 2, 40][index % 4],
                candidates: (0..[1, 1, 2, 20][index % 4]).map(|k| format!("R{:03}", index + k)).collect(),
                may_be_stray: false,
                truth_inside: true,
                cell_corners: vec![octagon(truth, half)],
            }),
            cell_corners: cells,
        });
    }
    let mut parameters = parameters();
    parameters.landmarks = marks.len();
    TraceReport {
        lasting_fix_distance_m: None,
        relapses: 0,
        contradiction: None,
        provenance: provenance("fixability.trace"),
        parameters,
        line: "B".to_owned(),
        from_m: 0.0,
        draw: 3,
        error_shape: ErrorShape::Corners,
        fix_distance_m: events.iter().find(|event| event.is_fix).map(|event| event.run_m),
        undecided: false,
        path,
        search_area: vec![at(0.0, 0.0), at(2000.0, 0.0), at(2000.0, 2000.0), at(0.0, 2000.0)],
        events,
        hindsight: Some(Hindsight {
            sweeps: 2,
            at_rest: true,
            start_places: 1,
            start_spread_m: 40.0,
            corridor_spacing_m: 1000.0,
            corridor: vec![CorridorReport {
                reported_from_m: 0.0,
                reported_to_m: 1000.0,
                from_s: 0.0,
                to_s: 667.0,
                polygons: vec![octagon(at(800.0, 1030.0), 540.0)],
            }],
        }),
        landmarks: marks,
    }
}

fn octagon(centre: LocalPoint, half: f64) -> Vec<LocalPoint> {
    let cut = half * 0.6;
    [
        (half, -cut),
        (half, cut),
        (cut, half),
        (-cut, half),
        (-half, cut),
        (-half, -cut),
        (-cut, -half),
        (cut, -half),
    ]
    .map(|(e, n)| LocalPoint::new(centre.east_m + e, centre.north_m + n))
    .to_vec()
}
