//! The remap analysis: causes on scenes made to have one cause each, gains against separate runs, polygons, files.

use fixability::assess::{self, Setup, mark_segments, remap, remap_area_options, survey_ground};
use fixability::dive::Dive;
use fixability::frame::LocalPoint;
use fixability::report::{RemapCause, RemapReport};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use crate::support::layout::assert_clear;
use crate::support::program::{Workplace, project};

/// A dive on a square site of `side_m` in local metres. `errors` replaces lines of the default error model.
struct Site {
    side_m: f64,
    landmarks: Vec<(f64, f64)>,
    half_width_m: f64,
    replaced: Vec<(&'static str, &'static str)>,
}

const DIVE: &str = "\
name = \"one cause\"
[map]
landmarks = \"l.csv\"
crs = \"local\"
uncertainty = \"bound\"
[lines]
files = [\"t.csv\"]
[vehicle]
speed_mps = 1.5
turn_radius_m = 10
[dead_reckoning]
scale_error_pct = 0.2
heading_bias_deg = 0.2
heading_noise_deg = 0.1
[sonar]
kind = \"side-looking\"
range_max_m = 75
nadir_gap_deg = 20
altitude_m = 10
range_error_m = 0.1
bearing_error_deg = 0.3
altitude_error_m = 0.1
[start]
search_area = \"a.geojson\"
crs = \"local\"
[scoring]
fix_size_m = 20
required_fix_m = 250
draws = 1
[area]
headings = 8
[remap]
cell_m = 50
smallest_region_cells = 2
";

/// Irregular positions, at least 25 m apart, over the square and 260 m beyond it on all sides.
fn irregular(count: usize, side_m: f64, seed: u64) -> Vec<(f64, f64)> {
    let mut random = ChaCha8Rng::seed_from_u64(seed);
    let mut found: Vec<(f64, f64)> = Vec::new();
    while found.len() < count {
        let mut draw = || random.random_range(-260.0..side_m + 260.0);
        let (e, n) = (draw(), draw());
        if found.iter().all(|(a, b)| libm::hypot(a - e, b - n) > 25.0) {
            found.push((e, n));
        }
    }
    found
}

impl Site {
    /// Ground that passes: about 220 landmarks per square kilometre, narrow boxes, small errors.
    fn good() -> Self {
        Self { side_m: 350.0, landmarks: irregular(165, 350.0, 5), half_width_m: 0.3, replaced: vec![] }
    }

    fn dive(&self) -> Dive {
        let mut dive = DIVE.to_owned();
        for (key, line) in &self.replaced {
            let old = dive.lines().find(|line| line.starts_with(key)).expect("the key is there").to_owned();
            dive = dive.replace(&old, line);
        }
        let mut landmarks = String::from("id,easting,northing,uncertainty_m\n");
        for (i, (e, n)) in self.landmarks.iter().enumerate() {
            landmarks += &format!("L{i},{e},{n},{}\n", self.half_width_m);
        }
        let s = self.side_m;
        let area =
            format!("{{\"type\":\"Polygon\",\"coordinates\":[[[0,0],[{s},0],[{s},{s}],[0,{s}],[0,0]]]}}");
        let place = Workplace::new()
            .write("dive.toml", &dive)
            .write("l.csv", &landmarks)
            .write("t.csv", &format!("line,easting,northing\nL,10,20\nL,{},{}\n", s - 10.0, s - 20.0))
            .write("a.geojson", &area);
        Dive::read(&place.path("dive.toml")).unwrap_or_else(|e| panic!("{e}"))
    }

    fn report(&self) -> (Dive, RemapReport) {
        let dive = self.dive();
        let report = remap(&Setup::new(&dive), &|_| {});
        (dive, report)
    }
}

/// Every failing cell has this cause, and there are some.
fn only(report: &RemapReport, cause: RemapCause) {
    let causes: Vec<_> = report.regions.iter().flat_map(|region| &region.causes).collect();
    assert!(report.failing_cells * 2 > report.cells, "{} of {}", report.failing_cells, report.cells);
    assert!(!causes.is_empty() && causes.iter().all(|share| share.cause == cause), "{causes:?}");
}

#[test]
fn good_ground_passes() {
    let (_, report) = Site::good().report();
    assert_eq!((report.failing_cells, report.regions.len(), report.specks), (0, 0, 0));
    assert_eq!(report.cells, 49);
}

#[test]
fn too_few_landmarks() {
    let site = Site { landmarks: vec![(120.0, 130.0), (260.0, 310.0), (310.0, 90.0)], ..Site::good() };
    let (_, report) = site.report();
    only(&report, RemapCause::TooFewLandmarks);
    assert!(report.regions.iter().all(|region| region.resurvey.is_none_or(|r| !r.cures)));
    let note = fixability::report::TOO_FEW_LANDMARKS_NOTE;
    assert!(
        report.regions.iter().all(|region| region.verdict.contains(note)),
        "{:?}",
        report.regions[0].verdict
    );
}

#[test]
fn look_alike_ground() {
    // A grid of 40 m, wider than the site and the runs: no improvement tells its meshes apart.
    let grid = (0..22).flat_map(|i| (0..22).map(move |j| (40.0 * i as f64 - 263.0, 40.0 * j as f64 - 261.0)));
    let site = Site { landmarks: grid.collect(), ..Site::good() };
    let (_, report) = site.report();
    only(&report, RemapCause::LookAlikeGround);
    assert!(report.regions.iter().all(|region| region.resurvey.is_none_or(|r| !r.cures)));
}

#[test]
fn boxes_too_wide() {
    let (_, report) = Site { half_width_m: 7.0, ..Site::good() }.report();
    only(&report, RemapCause::BoxesTooWide);
    let best = report.regions[0].resurvey.expect("boxes can be narrowed");
    assert!(best.cures && best.half_width_after_m < best.half_width_before_m && best.gained_km2 > 0.0);
}

#[test]
fn dead_reckoning() {
    let replaced = vec![
        ("scale_error_pct", "scale_error_pct = 15"),
        ("heading_bias_deg", "heading_bias_deg = 10"),
        ("heading_noise_deg", "heading_noise_deg = 15"),
    ];
    let (_, report) = Site { replaced, ..Site::good() }.report();
    only(&report, RemapCause::DeadReckoning);
}

#[test]
fn sonar() {
    let replaced =
        vec![("range_error_m", "range_error_m = 7"), ("bearing_error_deg", "bearing_error_deg = 4")];
    let (_, report) = Site { replaced, ..Site::good() }.report();
    only(&report, RemapCause::Sonar);
}

#[test]
fn detection_that_is_not_certain_is_named() {
    let replaced = vec![("altitude_error_m", "altitude_error_m = 0.1\ndetection_chance = 0.9")];
    let (_, report) = Site { replaced, ..Site::good() }.report();
    only(&report, RemapCause::DetectionNotCertain);
    assert_eq!(report.failing_cells, report.cells);
}

/// A site with several causes: a grid in one corner, nothing in another, wide boxes.
fn mixed() -> Site {
    let mut landmarks = irregular(160, 900.0, 11);
    let cleared = |e: f64, n: f64| (e < 450.0 && n < 450.0) || (e > 600.0 && n > 500.0);
    landmarks.retain(|&(e, n)| !cleared(e, n));
    landmarks.extend((0..9).flat_map(|i| (0..9).map(move |j| (50.0 * i as f64, 50.0 * j as f64))));
    Site { side_m: 900.0, landmarks, half_width_m: 2.0, replaced: vec![] }
}

/// Area of a ring by the trapezoidal rule, positive counter-clockwise.
fn ring_area(ring: &[LocalPoint]) -> f64 {
    let next = ring.iter().cycle().skip(1);
    ring.iter().zip(next).map(|(a, b)| (b.east_m - a.east_m) * (a.north_m + b.north_m) / -2.0).sum()
}

#[test]
fn polygons_and_specks_cover_exactly_the_failing_cells() {
    let (_, report) = mixed().report();
    assert!(report.regions.len() > 1, "{}", report.regions.len());
    let mut sum = 0.0;
    for region in &report.regions {
        let outer = ring_area(&region.outline.outer);
        assert!(outer > 0.0, "the outer ring runs counter-clockwise");
        let holes: f64 = region.outline.holes.iter().map(|hole| ring_area(hole)).sum();
        assert!(region.outline.holes.iter().all(|hole| ring_area(hole) < 0.0), "holes run clockwise");
        assert!((outer + holes - 1e6 * region.area_km2).abs() < 1e-6);
        assert_eq!(region.cells, region.causes.iter().map(|share| share.cells).sum::<usize>());
        assert_eq!(region.cells, region.grid_cells.len());
        assert_eq!(region.cause, region.causes[0].cause);
        assert!(region.survey_km2 > region.area_km2);
        sum += outer + holes;
    }
    let cell_m2 = report.grid.cell_m.powi(2);
    sum += report.speck_cells as f64 * cell_m2;
    assert!((sum - report.failing_cells as f64 * cell_m2).abs() < 1e-6, "{sum}");
    assert!((sum - 1e6 * report.failing_km2).abs() < 1e-6);
    let mut all: Vec<_> = report.regions.iter().flat_map(|region| region.grid_cells.clone()).collect();
    all.extend(&report.speck_grid_cells);
    all.sort_unstable();
    let count = all.len();
    all.dedup();
    assert_eq!(
        (all.len(), count),
        (report.failing_cells, report.failing_cells),
        "no cell lies in two regions"
    );
    let gains: Vec<f64> =
        report.regions.iter().map(|r| r.resurvey.map_or(-1.0, |x| x.gained_per_surveyed)).collect();
    assert!(gains.windows(2).all(|pair| pair[0] >= pair[1]), "{gains:?}");
}

/// The number of cells that pass on the area map of a dive.
fn passing(dive: &Dive) -> usize {
    let report = assess::area(&Setup::new(dive), &remap_area_options(dive), &|_| {});
    report.cells.iter().filter(|cell| cell.within_required_share >= dive.remap.pass_share).count()
}

#[test]
fn a_gain_equals_a_separate_run_with_the_changed_inputs() {
    let (dive, report) = mixed().report();
    let before = passing(&dive);
    assert_eq!(report.cells - report.failing_cells, before);
    let mut compared = 0;
    for region in report.regions.iter().take(4) {
        let Some(resurvey) = region.resurvey else { continue };
        let ground = survey_ground(&dive, &region.outline, region.survey_margin_m);
        assert_eq!(ground.landmarks.len(), region.landmarks_surveyed);
        let mut changed = dive.clone();
        for &number in &ground.landmarks {
            let landmark = &mut changed.landmarks[number];
            for half_width in [&mut landmark.half_width_east_m, &mut landmark.half_width_north_m] {
                *half_width = half_width.min((*half_width * resurvey.factor).max(resurvey.floor_m));
            }
        }
        let after = passing(&changed);
        assert_eq!((resurvey.map_cells_passing_before, resurvey.map_cells_passing_after), (before, after));
        let gained_km2 = (after - before) as f64 * report.grid.cell_m.powi(2) / 1e6;
        assert!((resurvey.gained_km2 - gained_km2).abs() < 1e-12);
        assert!((resurvey.gained_per_surveyed - gained_km2 / region.survey_km2).abs() < 1e-12);
        assert!((resurvey.gained_share - (after - before) as f64 / report.cells as f64).abs() < 1e-12);
        compared += usize::from(after > before);
    }
    assert!(compared > 0, "some re-survey gains something");
}

#[test]
fn stretches_of_lines_agree_with_a_walk_along_them() {
    let (dive, report) = mixed().report();
    let line = &report.lines[0];
    let index = assess::RegionIndex::new(report.grid, &report.regions);
    let steps = 20_000;
    let (from, to) = (line.track[0], *line.track.last().unwrap());
    let over = (0..steps)
        .filter(|k| {
            let t = (*k as f64 + 0.5) / steps as f64;
            let p = LocalPoint::new(
                from.east_m + t * (to.east_m - from.east_m),
                from.north_m + t * (to.north_m - from.north_m),
            );
            index.region_at(p).is_some()
        })
        .count();
    let walked = line.length_m * over as f64 / steps as f64;
    assert!(walked > 0.0 && (walked - line.over_regions_m).abs() < 1.0, "{walked} {}", line.over_regions_m);
    let mut lines = assess::score_lines(&Setup::new(&dive), &|| {});
    mark_segments(&mut lines, &report);
    let marked = lines.lines[0].segments.iter().filter(|segment| !segment.remap_regions.is_empty()).count();
    assert!(marked > 0, "segments on regions are marked");
}

/// Whether a closed ring of degrees runs counter-clockwise.
fn is_counter_clockwise(ring: &[serde_json::Value]) -> bool {
    let at = |p: &serde_json::Value| (p[0].as_f64().unwrap(), p[1].as_f64().unwrap());
    let doubled: f64 = ring
        .windows(2)
        .map(|pair| {
            let ((ax, ay), (bx, by)) = (at(&pair[0]), at(&pair[1]));
            (bx - ax) * (ay + by)
        })
        .sum();
    doubled < 0.0
}

/// RFC 7946: FeatureCollection, longitude before latitude, closed rings, outer ones counter-clockwise (section 3.1.6).
#[test]
fn files_of_the_demo() {
    let place = Workplace::new();
    let dive = std::fs::read_to_string(project("demo-data/dive.toml")).unwrap();
    let mut place =
        place.write("dive.toml", &format!("{dive}\n[area]\nheadings = 8\n[remap]\ncell_m = 125\n"));
    for name in ["landmarks.csv", "lines.csv"] {
        place = place.write(name, &std::fs::read_to_string(project(&format!("demo-data/{name}"))).unwrap());
    }
    let one = place.run("remap dive.toml --out one --threads 1").expect(0);
    let two = place.run("remap dive.toml --out two --threads 2").expect(0);
    assert_eq!(one.stdout, two.stdout);
    let names = ["remap.csv", "remap.geojson", "remap.json", "remap.png"];
    assert_eq!(place.names("one"), names);
    for name in names {
        assert!(place.bytes(format!("one/{name}")) == place.bytes(format!("two/{name}")), "{name}");
    }
    place.run("remap dive.toml --out one").expect(3);

    let report: serde_json::Value = serde_json::from_slice(&place.bytes("one/remap.json")).unwrap();
    assert_eq!(report["schema"], "fixability.remap");
    assert!(report["caution"].as_str().unwrap().contains("not for navigation"));
    assert!(report.get("landmarks").is_none(), "contact positions stay out of the files");
    let regions = report["regions"].as_array().unwrap();
    let causes: Vec<&str> = regions.iter().map(|region| region["cause"].as_str().unwrap()).collect();
    assert!(causes.contains(&"look-alike-ground"), "the planted grid and row: {causes:?}");

    let geo: geojson::GeoJson =
        String::from_utf8(place.bytes("one/remap.geojson")).unwrap().parse().expect("GeoJSON");
    let geojson::GeoJson::FeatureCollection(collection) = geo else { panic!("a collection") };
    assert_eq!(collection.features.len(), regions.len());
    assert!(collection.foreign_members.unwrap()["positions"].as_str().unwrap().contains("WGS 84"));
    let text: serde_json::Value = serde_json::from_slice(&place.bytes("one/remap.geojson")).unwrap();
    assert!(text.get("crs").is_none());
    let frame = fixability::frame::Frame::from_epsg(32631).unwrap();
    for (feature, region) in text["features"].as_array().unwrap().iter().zip(regions) {
        let rings = feature["geometry"]["coordinates"].as_array().unwrap();
        let mut area = 0.0;
        for (number, ring) in rings.iter().enumerate() {
            let ring = ring.as_array().unwrap();
            assert!(ring.len() >= 4 && ring.first() == ring.last(), "closed");
            assert_eq!(is_counter_clockwise(ring), number == 0);
            let local: Vec<LocalPoint> = ring[1..]
                .iter()
                .map(|p| {
                    let (lon_deg, lat_deg) = (p[0].as_f64().unwrap(), p[1].as_f64().unwrap());
                    assert!((3.0..3.5).contains(&lon_deg) && (55.0..56.0).contains(&lat_deg));
                    frame.to_local(fixability::frame::GeoPoint { lat_deg, lon_deg }).unwrap()
                })
                .collect();
            area += ring_area(&local);
        }
        let stated = region["area_km2"].as_f64().unwrap() * 1e6;
        assert!((area - stated).abs() < 1e-6 * stated + 1.0, "{area} {stated}");
    }

    let csv_bytes = place.bytes("one/remap.csv");
    let mut reader = csv::Reader::from_reader(csv_bytes.as_slice());
    assert_eq!(reader.records().count(), regions.len());
    let mut png = png::Decoder::new(std::io::Cursor::new(place.bytes("one/remap.png"))).read_info().unwrap();
    let mut pixels = vec![0; png.output_buffer_size().unwrap()];
    let info = png.next_frame(&mut pixels).unwrap();
    assert_eq!((info.width, info.height), (1754, 1240));
    let inked = pixels.chunks(3).filter(|p| p[0] < 100).count();
    assert!(inked > 40_000, "regions, lines and text are drawn: {inked}");
}

/// Every text lies on the sheet and none overlaps another.
#[test]
fn the_chart_is_legible() {
    let (_, report) = mixed().report();
    for size in [(1754, 1240), (2400, 1000), (1000, 1400)] {
        let size = fixability::render::ChartSize::pixels(size.0, size.1);
        let texts = fixability::render::remap_layout(&report, &size).unwrap();
        assert_clear(&texts, &size, &format!("{size:?}"));
        assert!(texts.iter().any(|text| text.text.contains("look-alike")));
    }
}

#[test]
fn local_metres_have_no_geojson() {
    use fixability::export::Exporter as _;
    let (_, report) = mixed().report();
    let error = fixability::export::RemapGeoJson.bytes(&report).unwrap_err().to_string();
    assert!(error.contains("remap.geojson") && error.contains("local metres"), "{error}");
}

#[test]
#[ignore = "writes a picture for the eye: FIXABILITY_PICTURES=DIR"]
fn write_pictures_of_remap() {
    let folder = std::env::var("FIXABILITY_PICTURES").expect("FIXABILITY_PICTURES names a folder");
    let (_, report) = mixed().report();
    let bytes = fixability::render::remap_png(&report, &fixability::render::ChartSize::default()).unwrap();
    std::fs::write(format!("{folder}/remap-mixed.png"), bytes).unwrap();
}
