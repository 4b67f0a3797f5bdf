//! Sound input: what comes out.

use std::f64::consts::PI;

use fixability::dive::{ErrorShape, RankBy};
use fixability::frame::{GeoPoint, LocalPoint};
use fixability::vehicle::SonarKind;

use super::{Scene, holds};

#[test]
fn a_sound_dive_is_read_whole() {
    let dive = Scene::new().dive();
    assert_eq!(dive.name, "Trial");
    assert_eq!(dive.frame.name(), "WGS 84 / UTM zone 31N (EPSG:32631)");
    assert_eq!(dive.landmarks.len(), 4);
    assert_eq!(dive.landmarks[2].id, "C");
    assert_eq!(dive.landmarks[0].position, LocalPoint::new(500100.0, 6200100.0));
    assert_eq!(dive.lines.len(), 2);
    assert_eq!(dive.lines[1].name, "south");
    assert_eq!(dive.lines[1].waypoints.len(), 3);
    assert_eq!(dive.sonar.kind, SonarKind::SideLooking { nadir_gap_rad: 0.0 });
    assert_eq!(dive.scoring.draws, 60);
    assert_eq!(dive.scoring.seed, 1);
    assert_eq!(dive.scoring.rank_by, RankBy::Guaranteed);
    assert_eq!(dive.scoring.error_shapes, [ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady]);
    assert_eq!(dive.start.search_area.len(), 4);
    let names: Vec<&str> = dive.inputs.iter().map(|i| i.name.as_str()).collect();
    assert_eq!(names, ["dive.toml", "reef.csv", "lines.csv"]);
}

#[test]
fn fingerprints_are_sha_256_of_the_bytes() {
    // FIPS 180-4 example "abc" (NIST): the file is refused as a landmark table, so look at a whole reading with a byte-order
    // mark instead: one bit of difference in the bytes must show.
    let plain = Scene::new().dive();
    let marked = Scene::new().file("reef.csv", format!("\u{feff}{}", super::REEF)).dive();
    assert_ne!(plain.inputs[1].sha256, marked.inputs[1].sha256);
    assert_eq!(plain.inputs[2].sha256, marked.inputs[2].sha256);
    assert_eq!(plain.landmarks, marked.landmarks);
    let mut findings = fixability::problem::Findings::default();
    let abc = fixability::input::InputText::from_bytes(b"abc", "abc".as_ref(), &mut findings).unwrap();
    assert_eq!(abc.sha256, "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
}

#[test]
fn bounds_are_widened_by_the_grid_and_never_narrowed() {
    let dive = Scene::new().dive();
    // On the central meridian of a UTM zone grid lengths are 0.9996 of true lengths (definition of UTM).
    assert!(dive.dead_reckoning.scale_error > 0.0104 && dive.dead_reckoning.scale_error < 0.010_41);
    assert!(dive.sonar.range_error_fraction > 0.0004 && dive.sonar.range_error_fraction < 0.000_402);
    assert!(dive.dead_reckoning.heading_noise_rad > 0.5_f64.to_radians());
    assert!(dive.dead_reckoning.heading_noise_rad < 0.52_f64.to_radians());
    assert!(dive.landmarks.iter().all(|l| l.half_width_east_m >= 2.0));
    holds(
        &Scene::new().notices(),
        &[
            "grid lengths are 0.999600 to 0.999600 times true lengths",
            "is added to the distance error",
            "headings are to grid north",
        ],
    );
    let deep = Scene::new().swap("[lines]", "seabed_depth_m = 4000\n[lines]").dive();
    // 4000 m of depth: 1 / (1 − 4000/6.37e6) = 1.000628 (arithmetic), so the scale is about 1.00023.
    assert!(deep.dead_reckoning.scale_error < 0.0103 && deep.dead_reckoning.scale_error > 0.0102);
    assert!(deep.landmarks[0].half_width_east_m > 2.0004);
}

#[test]
fn local_metres_change_nothing() {
    let dive = Scene::new().swap("EPSG:32631", "local").dive();
    assert_eq!(dive.frame.name(), "local metres");
    assert_eq!(dive.dead_reckoning.scale_error, 0.01);
    assert_eq!(dive.sonar.range_error_fraction, 0.0);
    assert_eq!(dive.landmarks[0].half_width_east_m, 2.0);
}

#[test]
fn the_first_positions_are_echoed_in_words() {
    // 500000 m E is the central meridian of zone 31, 3° east (definition of UTM).
    let notices = Scene::new().notices();
    holds(
        &notices,
        &[
            "information: reef.csv: 4 landmarks; the first, A, is at 55.9",
            "° north, 3.0016",
            "° east = 500100.0 m E, 6200100.0 m N; extent 600 m east by 70 m north",
            "2 lines with 5 waypoints in all; the first, north, starts at",
            "working frame: WGS 84 / UTM zone 31N (EPSG:32631)",
        ],
    );
}

#[test]
fn several_formats_and_systems_join_in_one_frame() {
    // 3.0016° E, 55.9459° N lies among the landmarks of the scene.
    let line = r#"{"type":"Feature","properties":{"name":"west"},"geometry":{"type":"LineString",
        "coordinates":[[3.0016,55.9459],[3.01,55.9459]]}}"#;
    let gpx = r#"<?xml version="1.0"?><gpx version="1.1" creator="t"><rte><name>run</name>
        <rtept lat="55.9459" lon="3.002"/><rtept lat="55.9459" lon="3.009"/></rte>
        <trk><trkseg><trkpt lat="55.9458" lon="3.002"/><trkpt lat="55.9458" lon="3.009"/></trkseg></trk>
        <wpt lat="1" lon="2"/></gpx>"#;
    let scene = Scene::new()
        .swap("[\"lines.csv\"]", "[\"lines.csv\", \"l.geojson\", \"r.gpx\"]")
        .file("l.geojson", line)
        .file("r.gpx", gpx);
    let dive = scene.dive();
    let names: Vec<&str> = dive.lines.iter().map(|l| l.name.as_str()).collect();
    assert_eq!(names, ["north", "south", "west", "run", "r track 1"]);
    let start = dive.lines[2].waypoints[0];
    assert!((start.east_m - 500100.0).abs() < 20.0, "{start:?}");
    holds(
        &scene.notices(),
        &[
            "information: l.geojson: WGS 84 (EPSG:4326) converted to WGS 84 / UTM zone 31N (EPSG:32631)",
            "r.gpx: 1 single waypoint (wpt) not used",
        ],
    );
}

#[test]
fn widened_bounds_hold_true_displacements_anywhere_on_the_site() {
    use geo::{Destination, Geodesic, Point};
    // Outside value: geodesics after Karney 2013 (geo crate), in every direction, over a site 40 km wide off the meridian.
    let reef = "id,easting,northing,uncertainty_m\nA,560000,6200000,2\nB,600000,6220000,2\n";
    let lines = "line,easting,northing\nnorth,560000,6200060\nnorth,600000,6219960\n";
    for code in ["EPSG:32631", "EPSG:3035"] {
        let scene = Scene::new().file("reef.csv", reef).file("lines.csv", lines);
        let working = format!("EPSG:32631\"\nworking_crs = \"{code}");
        let dive = scene.swap("EPSG:32631", &working).dive();
        let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
        let corners = &dive.start.search_area;
        let (west, east) = (corners[0].east_m, corners[2].east_m);
        let (south, north) = (corners[0].north_m, corners[2].north_m);
        let scale = dive.dead_reckoning.scale_error - 0.01;
        for i in 0..=12 {
            for j in 0..=12 {
                let at = LocalPoint::new(
                    west + (east - west) * f64::from(i) / 12.0,
                    south + (north - south) * f64::from(j) / 12.0,
                );
                let from = dive.frame.to_geo(at).unwrap();
                for k in 0..16 {
                    let bearing_deg = 22.5 * f64::from(k);
                    let q = Geodesic.destination(Point::new(from.lon_deg, from.lat_deg), bearing_deg, 200.0);
                    let to = dive.frame.to_local(GeoPoint { lat_deg: q.y(), lon_deg: q.x() }).unwrap();
                    let ratio = at.distance_m(to) / 200.0;
                    assert!((ratio - 1.0).abs() <= scale, "{code} {at:?}: {ratio} against {scale}");
                    let turn =
                        (at.bearing_rad(to) - bearing_deg.to_radians() + 3.0 * PI).rem_euclid(2.0 * PI) - PI;
                    low = if turn < low { turn } else { low };
                    high = if turn > high { turn } else { high };
                }
            }
        }
        let added = dive.dead_reckoning.heading_noise_rad - 0.5_f64.to_radians();
        assert!(0.5 * (high - low) <= added, "{code}: {low} to {high} against {added}");
        assert!(added < 1.0 * (high - low), "{code}: far too wide, {low} to {high} against {added}");
    }
}
