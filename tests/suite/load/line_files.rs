//! Line files: CSV, GeoJSON and GPX, and what is refused of their lines.

use super::{LINES, Scene, holds};

#[test]
fn case_18_single_points_and_zero_length_are_refused() {
    let text = "line,easting,northing\nnorth,500000,6200060\nsouth,500000,6200020\nsouth,500000,6200020\n";
    holds(
        &Scene::new().file("lines.csv", text).errors(),
        &[
            "lines.csv: line \"north\" (line 2): has 1 waypoint; accepted: at least two waypoints",
            "lines.csv: line \"south\" (line 3): has zero length: its 2 waypoints are the same point",
        ],
    );
}

#[test]
fn case_18_a_repeated_waypoint_is_dropped_with_a_notice() {
    let scene =
        Scene::new().file("lines.csv", LINES.replace("north,500800", "north,500000,6200060\nnorth,500800"));
    assert_eq!(scene.dive().lines[0].waypoints.len(), 2);
    holds(&scene.notices(), &["information: lines.csv: line \"north\": 1 repeated waypoint dropped"]);
}

#[test]
fn an_order_column_sorts_and_must_not_repeat() {
    let text = "line,order,easting,northing\nnorth,2,500800,6200060\nnorth,1,500000,6200060\n";
    let dive = Scene::new().file("lines.csv", text).dive();
    assert_eq!(dive.lines[0].waypoints[0].east_m, 500000.0);
    holds(
        &Scene::new().file("lines.csv", text.replace("north,2", "north,1")).errors(),
        &["lines.csv:3: column order: line \"north\" has the order 1 twice (also in line 2)"],
    );
}

#[test]
fn duplicate_line_names_across_files_are_refused() {
    let text = Scene::new()
        .swap("[\"lines.csv\"]", "[\"lines.csv\", \"more.csv\"]")
        .file("more.csv", LINES)
        .errors();
    holds(&text, &["more.csv: line \"north\" (line 2): the name is already used (lines.csv, line 2)"]);
}

#[test]
fn a_missing_line_column_names_what_is_there() {
    let text = Scene::new().file("lines.csv", LINES.replace("line,", "leg,")).errors();
    holds(&text, &["lines.csv:1: no column line", "the header has: leg, easting, northing"]);
}

#[test]
fn gpx_points_are_counted_and_named_with_their_line() {
    let gpx = "<?xml version=\"1.0\"?>\n<gpx version=\"1.1\" creator=\"t\">\n<trk><trkseg>\n\
        <trkpt lat=\"55.9458\" lon=\"3.002\"/>\n<trkpt lat=\"155.9458\" lon=\"3.009\"/>\n\
        <trkpt lat=\"nan\" lon=\"3.009\"/>\n<trkpt lat=\"55.9\"/>\n</trkseg></trk></gpx>";
    let text = Scene::new().swap("lines.csv", "run.gpx").file("run.gpx", gpx).errors();
    holds(
        &text,
        &[
            "run.gpx:5: trkpt 2, attribute lat: \"155.9458\" is out of range; accepted: −90 to 90 degrees",
            "run.gpx:6: trkpt 3, attribute lat: \"nan\" is not a finite number",
            "run.gpx:7: trkpt 4, attribute lon: is missing",
        ],
    );
    let text =
        Scene::new().swap("lines.csv", "run.gpx").file("run.gpx", "<gpx version=\"1.1\"><rte>").errors();
    holds(&text, &["run.gpx: is not valid GPX"]);
    let text = Scene::new()
        .swap("lines.csv", "run.gpx")
        .file("run.gpx", "<gpx version=\"1.1\" creator=\"t\"></gpx>")
        .errors();
    holds(&text, &["run.gpx: holds no line"]);
}

#[test]
fn geojson_multi_lines_become_parts_and_other_shapes_are_refused() {
    let text = r#"{"type":"FeatureCollection","features":[{"type":"Feature","properties":{"name":"M"},"geometry":
        {"type":"MultiLineString","coordinates":[[[3.001,55.9459],[3.01,55.9459]],[[3.001,55.9460],[3.01,55.9460]]]}}]}"#;
    let scene = Scene::new().swap("lines.csv", "l.geojson").file("l.geojson", text);
    let dive = scene.dive();
    let names: Vec<&str> = dive.lines.iter().map(|l| l.name.as_str()).collect();
    assert_eq!(names, ["M part 1", "M part 2"]);
    let point = r#"{"type":"Feature","properties":{},"geometry":{"type":"Point","coordinates":[3,55]}}"#;
    holds(
        &Scene::new().swap("lines.csv", "l.geojson").file("l.geojson", point).errors(),
        &["l.geojson: feature 1: is a Point, not a line; accepted: LineString or MultiLineString"],
    );
}

#[test]
fn a_stated_system_in_geojson_is_used_or_must_agree() {
    let text = r#"{"type":"FeatureCollection","crs":{"type":"name","properties":{"name":"urn:ogc:def:crs:EPSG::32631"}},
        "features":[{"type":"Feature","properties":{"name":"M"},"geometry":
        {"type":"LineString","coordinates":[[500000,6200060],[500800,6200060]]}}]}"#;
    let dive = Scene::new().swap("lines.csv", "l.geojson").file("l.geojson", text).dive();
    assert_eq!(dive.lines[0].waypoints[1].east_m, 500800.0);
    let text = Scene::new()
        .swap("lines.csv", "l.geojson")
        .swap("[lines]\n", "[lines]\ncrs = \"EPSG:4326\"\n")
        .file("l.geojson", text)
        .errors();
    holds(
        &text,
        &["the file says WGS 84 / UTM zone 31N (EPSG:32631), the dive file says WGS 84 (EPSG:4326)"],
    );
}
