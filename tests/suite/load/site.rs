//! Whether map, lines, sonar and search area fit together on the ground.

use super::{LINES, REEF, Scene, holds};

#[test]
fn case_3_swapped_axes_are_named_with_the_distance_and_not_swapped() {
    let reef = "id,lat,lon,uncertainty_m\nA,55.9459,3.0016,2\nB,55.9454,3.0050,2\n";
    let lines = "line,lat,lon\nnorth,3.001,55.9457\nnorth,3.01,55.9457\n";
    let text =
        Scene::new().swap("EPSG:32631", "EPSG:4326").file("reef.csv", reef).file("lines.csv", lines).errors();
    holds(
        &text,
        &[
            "lines.csv: lines and landmarks do not meet: the lines are ",
            " km from the landmarks, bearing ",
            "latitude and longitude look swapped in lines.csv or in reef.csv",
            "nothing is swapped silently",
        ],
    );
    let text = Scene::new()
        .swap("EPSG:32631", "EPSG:4326")
        .file("reef.csv", "id,lat,lon,uncertainty_m\nA,-37,144.4,2\n".replace("-37,144.4", "144.4,-37"))
        .file("lines.csv", "line,lat,lon\nnorth,-37,144.4\nnorth,-37,144.41\n")
        .errors();
    holds(&text, &["reef.csv: 1 of 1 positions cannot be degrees", "latitude and longitude look swapped"]);
}

#[test]
fn case_4_degrees_given_as_metres_and_the_reverse() {
    let text = Scene::new()
        .file("reef.csv", "id,easting,northing,uncertainty_m\nA,3.0016,55.9459,2\nB,3.005,55.943,2\n");
    holds(
        &text.errors(),
        &[
            "reef.csv: eastings run from 3.0016 to 3.005 and northings from 55.943 to 55.9459: these look like degrees",
            "WGS 84 / UTM zone 31N (EPSG:32631), in metres",
            "set crs = \"EPSG:4326\"",
        ],
    );
    let text = Scene::new()
        .swap("EPSG:32631", "EPSG:4326")
        .file("reef.csv", REEF.replace("easting,northing", "lon,lat"))
        .file("lines.csv", LINES.replace("easting,northing", "lon,lat"))
        .errors();
    holds(
        &text,
        &[
            "reef.csv: 4 of 4 positions cannot be degrees: longitudes (x) run from 500100 to 500700, latitudes (y) from \
             6200050 to 6200120",
            "these look like metres",
            "lines.csv: 5 of 5 positions cannot be degrees",
        ],
    );
    let text = Scene::new().swap("EPSG:32631", "EPSG:4326").errors();
    holds(
        &text,
        &[
            "reef.csv:1: no column lon (or lng",
            "the file has easting and northing: state the coordinate system",
        ],
    );
}

#[test]
fn case_5_lines_that_do_not_meet_the_map_have_gap_and_bearing() {
    let text = Scene::new().file("lines.csv", LINES.replace("62000", "62050")).errors();
    holds(
        &text,
        &[
            "lines.csv: lines and landmarks do not meet: the gap is 4900 m",
            "bearing 000°",
            "the sonar reaches 99 m",
        ],
    );
}

#[test]
fn case_20_a_line_that_sees_nothing_gets_an_offset() {
    let lines = format!("{LINES}far,500000,6199900\nfar,500800,6199900\n");
    holds(
        &Scene::new().file("lines.csv", lines).notices(),
        &[
            "warning: line \"far\": 0 detections expected",
            "the nearest, B, is 150 m away",
            "an offset of 100 m toward 000°",
        ],
    );
}

#[test]
fn case_28_a_line_that_leaves_the_search_area_is_refused() {
    let area = |east: f64| {
        format!(
            r#"{{"type":"Feature","properties":{{}},"geometry":{{"type":"Polygon","coordinates":
            [[[499900,6199900],[{east},6199900],[{east},6200300],[499900,6200300],[499900,6199900]]]}}}}"#
        )
    };
    let scene = |east: f64| {
        Scene::new()
            .swap("[start]", "[start]\nsearch_area = \"area.geojson\"\ncrs = \"EPSG:32631\"")
            .file("area.geojson", area(east))
    };
    assert_eq!(scene(500900.0).dive().start.search_area.len(), 4);
    // The line ends at 500800 m E; with 20 m of scatter the area has to reach 500820 m E.
    holds(
        &scene(500810.0).errors(),
        &[
            "area.geojson: line \"north\" with its descent scatter of 20 m leaves the search area by 10 m",
            "area.geojson: line \"south\"",
        ],
    );
}

#[test]
fn a_search_area_that_is_not_convex_is_searched_as_its_hull() {
    let area = r#"{"type":"Feature","properties":{},"geometry":{"type":"Polygon","coordinates":
        [[[499900,6199900],[500900,6199900],[500900,6200300],[500400,6200200],[499900,6200300],[499900,6199900]]]}}"#;
    let scene = Scene::new()
        .swap("[start]", "[start]\nsearch_area = \"area.geojson\"\ncrs = \"EPSG:32631\"")
        .file("area.geojson", area);
    holds(&scene.notices(), &["the polygon is not convex: its convex hull is searched"]);
}
