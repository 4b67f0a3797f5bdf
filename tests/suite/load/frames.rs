//! Coordinate systems: what is joined, refused and warned of.

use fixability::frame::LocalPoint;

use super::{Scene, holds};

#[test]
fn case_2_another_datum_is_refused_with_the_reason() {
    // EPSG:27700 is the British National Grid on OSGB 1936 (EPSG dataset).
    let text = Scene::new().swap("EPSG:32631", "EPSG:27700").errors();
    holds(
        &text,
        &[
            "dive.toml:4: key map.crs: \"EPSG:27700\" cannot be used",
            "is on another datum (OSGB 1936)",
            "is not guessed",
        ],
    );
}

#[test]
fn case_2_layers_in_different_systems_are_joined_and_said() {
    // (500000, 6200060) and (500800, 6200060) of zone 31 in zone 32, by pyproj 3.7.2.
    let lines = "line,easting,northing\nnorth,125526.6954,6216329.1502\nnorth,126325.0481,6216259.6295\n";
    let scene = Scene::new().swap("[lines]\n", "[lines]\ncrs = \"EPSG:32632\"\n").file("lines.csv", lines);
    let dive = scene.dive();
    let ends = [(500_000.0, 6_200_060.0), (500_800.0, 6_200_060.0)].map(|(e, n)| LocalPoint::new(e, n));
    for (found, expected) in dive.lines[0].waypoints.iter().zip(ends) {
        assert!(found.distance_m(expected) < 1e-3, "{found:?}");
    }
    holds(
        &scene.notices(),
        &[
            "information: lines.csv: WGS 84 / UTM zone 32N (EPSG:32632) converted to WGS 84 / UTM zone 31N (EPSG:32631)",
        ],
    );
}

#[test]
fn a_datum_taken_as_equal_is_stated_and_warned_of_when_mixed() {
    // EPSG:25831 is ETRS89 / UTM zone 31N (EPSG dataset).
    let same = Scene::new().swap("EPSG:32631", "EPSG:25831").notices();
    holds(
        &same,
        &[
            "information: reef.csv: ETRS89 is taken as equal to WGS 84",
            "it cancels between landmarks and lines",
        ],
    );
    let mixed = Scene::new()
        .swap("EPSG:32631", "EPSG:25831")
        .swap("[lines]\n", "[lines]\ncrs = \"EPSG:32631\"\n")
        .notices();
    holds(&mixed, &["warning: reef.csv: ETRS89 is taken as equal", "mixed here"]);
}

#[test]
fn unknown_and_unusable_codes_say_why() {
    for (code, why) in [
        ("EPSG:1", "is not a known coordinate system"),
        ("31N", "names no coordinate system"),
        ("EPSG:2263", "does not count in metres"),
        ("EPSG:4978", "is not a projected grid"),
    ] {
        holds(&Scene::new().swap("EPSG:32631", code).errors(), &["key map.crs", why]);
    }
    let text = Scene::new()
        .swap("crs = \"EPSG:32631\"", "crs = \"EPSG:32631\"\nworking_crs = \"EPSG:4326\"")
        .errors();
    holds(&text, &["key map.working_crs", "is latitude and longitude, not a grid in metres"]);
}

#[test]
fn case_6_far_from_the_meridian_warns_with_the_scale_and_refuses_far_outside() {
    let reef = "id,lat,lon,uncertainty_m\nA,55.9459,3.0016,2\nB,55.9454,3.0050,2\n";
    let lines = "line,lat,lon\nnorth,55.9457,3.001\nnorth,55.9457,3.01\n";
    let scene = |code: &str| {
        Scene::new()
            .swap("EPSG:32631", &format!("EPSG:4326\"\nworking_crs = \"{code}"))
            .file("reef.csv", reef)
            .file("lines.csv", lines)
    };
    holds(
        &scene("EPSG:32632").notices(),
        &[
            "warning: the site reaches 6.00° of longitude from the central meridian",
            "1.00132 times true lengths",
        ],
    );
    holds(
        &scene("EPSG:32633").errors(),
        &[
            "reef.csv:2: the position is 12.00° of longitude from the central meridian (15°)",
            "the limit is 10°",
        ],
    );
}

#[test]
fn case_7_the_antimeridian_works_in_one_zone_and_the_poles_state_their_limit() {
    let reef = "id,lat,lon,uncertainty_m\nA,-17.0000,179.9990,2\nB,-17.0000,-179.9990,2\nC,-17,180,2\nD,-17.001,-180,2\n";
    let lines = "line,lat,lon\nnorth,-17.0002,179.998\nnorth,-17.0002,-179.998\n";
    let scene = Scene::new().swap("EPSG:32631", "EPSG:4326").file("reef.csv", reef).file("lines.csv", lines);
    let dive = scene.dive();
    assert_eq!(dive.frame.epsg(), Some(32760));
    // 0.002° of longitude at 17° S: 0.002 · π/180 · 6378137 · cos 17° / √(1 − e² sin² 17°) = 212.97 m on the ellipsoid, and
    // 3° from the meridian the scale of UTM is 0.9996 · (1 + (3° · cos 17°)²/2) = 1.0009: 213.15 m (series, first term).
    let apart = dive.landmarks[1].position.distance_m(dive.landmarks[0].position);
    assert!((apart - 213.15).abs() < 0.05, "{apart}");
    let east = |i: usize| dive.landmarks[i].position.east_m;
    // Same meridian; 111 m apart in latitude, where the convergence of 0.88° makes 1.7 m.
    assert!((east(2) - east(3)).abs() < 2.0);
    let polar = Scene::new()
        .swap("EPSG:32631", "EPSG:4326")
        .file("reef.csv", "id,lat,lon,uncertainty_m\nA,85.5,10,2\n")
        .file("lines.csv", "line,lat,lon\nnorth,85.5,10\nnorth,85.501,10\n")
        .errors();
    holds(
        &polar,
        &["reef.csv:2: latitude 85.5000 is outside UTM, which ends at 84° N and 80° S", "EPSG:5041"],
    );
}

#[test]
fn a_grid_that_stretches_too_much_is_no_working_frame() {
    // EPSG:3857 stretches by about 1 / cos(latitude): 1.79 at 56° N.
    let reef = "id,easting,northing,uncertainty_m\nA,334136,7556000,2\nB,334500,7556050,2\n";
    let lines = "line,easting,northing\nnorth,334000,7556030\nnorth,334800,7556030\n";
    let text =
        Scene::new().swap("EPSG:32631", "EPSG:3857").file("reef.csv", reef).file("lines.csv", lines).errors();
    holds(&text, &["stretches lengths by 1.7", "name one with working_crs"]);
    let dive = Scene::new()
        .swap("EPSG:32631", "EPSG:3857\"\nworking_crs = \"EPSG:32631")
        .file("reef.csv", reef)
        .file("lines.csv", lines)
        .dive();
    assert_eq!(dive.frame.epsg(), Some(32631));
}

#[test]
fn local_metres_and_the_earth_are_not_joined() {
    let gpx = r#"<gpx version="1.1" creator="t"><rte><rtept lat="55.9459" lon="3.002"/><rtept lat="55.9459" lon="3.009"/></rte></gpx>"#;
    let text =
        Scene::new().swap("EPSG:32631", "local").swap("lines.csv", "r.gpx").file("r.gpx", gpx).errors();
    holds(&text, &["r.gpx: the lines are in WGS 84 (EPSG:4326), the landmarks in local metres"]);
}
