//! Files for GIS programs, read by programs and libraries from outside: GDAL where it is installed (`tests/run` installs it),
//! the `geojson` and `gpx` crates always.
//!
//! *Tolerances.* Coordinates 1 cm after a round trip through GDAL's projection (PROJ); cell values 1e-3.

use std::path::{Path, PathBuf};
use std::sync::LazyLock;

use fixability::assess::Setup;
use fixability::dive::Dive;
use fixability::export::{Exporter, LandmarksGeoJson, NONE_CODE};
use fixability::frame::{Frame, GeoPoint};
use serde_json::Value;

use crate::support::outside::{Gdal, gdal};
use crate::support::program::{Workplace, project};

const COORDINATES_M: f64 = 0.01;

/// A folder with every file for a GIS in `out`.
struct Pack {
    place: Workplace,
    epsg: u16,
}

impl Pack {
    fn new(place: Workplace, epsg: u16) -> Self {
        for command in ["lines --draws 2", "area", "lookalikes", "remap", "suggest"] {
            place.run(&format!("{command} dive.toml --out out --force")).expect(0);
        }
        let dive = Dive::read(&place.path("dive.toml")).expect("a sound dive");
        let bytes = LandmarksGeoJson.bytes(&Setup::new(&dive).landmarks_report()).unwrap();
        std::fs::write(place.path("out/landmarks.geojson"), bytes).unwrap();
        Self { place, epsg }
    }

    fn out(&self) -> PathBuf {
        self.place.path("out")
    }

    fn json(&self, name: &str) -> Value {
        serde_json::from_slice(&self.place.bytes(format!("out/{name}"))).unwrap()
    }

    /// Rows of a table by the names of its columns.
    fn rows(&self, name: &str) -> Vec<std::collections::HashMap<String, String>> {
        let bytes = self.place.bytes(format!("out/{name}"));
        csv::Reader::from_reader(bytes.as_slice()).deserialize().map(Result::unwrap).collect()
    }
}

/// The demo with coarse maps.
static DEMO: LazyLock<Pack> = LazyLock::new(|| {
    let read = |name: &str| std::fs::read_to_string(project(&format!("demo-data/{name}"))).unwrap();
    let maps = "\n[area]\ncell_m = 100\nheadings = 8\n[remap]\ncell_m = 125\n";
    let place = Workplace::new()
        .write("dive.toml", &(read("dive.toml") + maps))
        .write("landmarks.csv", &read("landmarks.csv"))
        .write("lines.csv", &read("lines.csv"));
    Pack::new(place, 32_631)
});

/// A place on the 180th meridian, in the last zone of UTM: the same five landmarks several times, so that there are
/// look-alikes, and a requirement that much of the ground fails.
static ACROSS: LazyLock<Pack> = LazyLock::new(|| {
    let frame = Frame::from_epsg(32_660).unwrap();
    let middle = frame.to_local(GeoPoint { lat_deg: 52.5, lon_deg: 180.0 }).unwrap();
    let at = |e: f64, n: f64| (middle.east_m + e, middle.north_m + n);
    let mut landmarks = String::from("id,easting,northing,uncertainty_m\n");
    for group in 0..6 {
        let (east, north) = (f64::from(group) * 250.0 - 700.0, f64::from(group % 2) * 300.0 - 150.0);
        for (i, (e, n)) in
            [(0.0, 0.0), (40.0, 25.0), (75.0, -20.0), (30.0, -55.0), (95.0, 40.0)].iter().enumerate()
        {
            let (e, n) = at(east + e, north + n);
            landmarks += &format!("g{group}-{i},{e},{n},1\n");
        }
    }
    let mut lines = String::from("line,easting,northing\n");
    for (name, from, to) in
        [("Westward", (600.0, 180.0), (-650.0, 120.0)), ("Eastward", (-650.0, -170.0), (600.0, -130.0))]
    {
        for (e, n) in [at(from.0, from.1), at(0.0, from.1), at(to.0, to.1)] {
            lines += &format!("{name},{e},{n}\n");
        }
    }
    let dive = std::fs::read_to_string(project("demo-data/dive.toml"))
        .unwrap()
        .replace("\"EPSG:4326\"", "\"EPSG:32660\"")
        .replace("required_fix_m = 450.0", "required_fix_m = 250.0");
    let maps = "\n[area]\ncell_m = 100\nheadings = 4\nlongest_run_m = 300\n[remap]\ncell_m = 100\n";
    let place = Workplace::new()
        .write("dive.toml", &(dive + maps))
        .write("landmarks.csv", &landmarks)
        .write("lines.csv", &lines);
    Pack::new(place, 32_660)
});

const COLLECTIONS: [&str; 5] =
    ["lines.geojson", "lookalikes.geojson", "remap.geojson", "suggest.geojson", "landmarks.geojson"];

/// Every position below `coordinates`.
fn positions(coordinates: &Value) -> Vec<[f64; 2]> {
    let list = coordinates.as_array().expect("a list");
    if list[0].is_number() {
        return vec![[list[0].as_f64().unwrap(), list[1].as_f64().unwrap()]];
    }
    list.iter().flat_map(positions).collect()
}

fn features(collection: &Value) -> &Vec<Value> {
    collection["features"].as_array().expect("features")
}

/// West, south, east, north.
fn extent(positions: &[[f64; 2]]) -> [f64; 4] {
    positions.iter().fold([f64::INFINITY, f64::INFINITY, f64::NEG_INFINITY, f64::NEG_INFINITY], |e, p| {
        [e[0].min(p[0]), e[1].min(p[1]), e[2].max(p[0]), e[3].max(p[1])]
    })
}

/// Signed area in square degrees.
fn turns_left(ring: &[[f64; 2]]) -> bool {
    let o = ring[0];
    let at = |p: [f64; 2]| [p[0] - o[0], p[1] - o[1]];
    ring.windows(2).map(|s| (at(s[0]), at(s[1]))).map(|(a, b)| a[0] * b[1] - b[0] * a[1]).sum::<f64>() > 0.0
}

#[test]
fn geojson_holds_what_the_standard_asks_for() {
    for pack in [&*DEMO, &*ACROSS] {
        for name in COLLECTIONS {
            // A general library reads it (types, nesting of coordinates).
            let text = String::from_utf8(pack.place.bytes(format!("out/{name}"))).unwrap();
            let parsed: geojson::GeoJson = text.parse().unwrap_or_else(|e| panic!("{name}: {e}"));
            assert!(matches!(parsed, geojson::GeoJson::FeatureCollection(_)));
            let collection = pack.json(name);
            // RFC 7946, section 4: no other coordinate system, and none stated.
            assert!(collection.get("crs").is_none());
            assert!(collection["positions"].as_str().unwrap().contains("WGS 84"));
            assert!(collection["caution"].as_str().unwrap().contains("not for navigation"));
            assert!(!collection["inputs"].as_array().unwrap().is_empty());
            let is_sensitive = ["lookalikes.geojson", "landmarks.geojson"].contains(&name);
            assert_eq!(collection.get("contact_positions").is_some(), is_sensitive, "{name}");
            // The place on the meridian need not have a start that can be suggested.
            assert!(
                !features(&collection).is_empty() || (name, pack.epsg) == ("suggest.geojson", ACROSS.epsg),
                "{name}"
            );
            for feature in features(&collection) {
                let geometry = &feature["geometry"];
                let all = positions(&geometry["coordinates"]);
                assert!(all.iter().all(|p| p[0].abs() <= 180.0 && p[1].abs() <= 90.0));
                let polygons: Vec<&Value> = match geometry["type"].as_str().unwrap() {
                    "Polygon" => vec![&geometry["coordinates"]],
                    "MultiPolygon" => geometry["coordinates"].as_array().unwrap().iter().collect(),
                    _ => continue,
                };
                // Section 3.1.6: closed, outer rings counter-clockwise, holes clockwise.
                for (number, ring) in polygons.iter().flat_map(|p| p.as_array().unwrap().iter().enumerate()) {
                    let ring = positions(ring);
                    assert!(ring.len() >= 4 && ring.first() == ring.last());
                    assert_eq!(turns_left(&ring), number == 0, "{name}");
                }
            }
        }
        // At least seven decimals (about 1 cm) are really there.
        let landmarks = pack.json("landmarks.geojson");
        let has_digits = |feature: &Value| {
            let text = feature["geometry"]["coordinates"][0].to_string();
            text.split('.').nth(1).is_some_and(|digits| digits.len() >= 7)
        };
        let fine = features(&landmarks).iter().filter(|feature| has_digits(feature)).count();
        assert!(fine * 10 >= features(&landmarks).len() * 9, "{fine}");
    }
}

/// The properties of a segment are the row of the table.
#[test]
fn segments_have_the_columns_of_the_table() {
    let (collection, rows) = (DEMO.json("lines.geojson"), DEMO.rows("lines.csv"));
    assert_eq!(features(&collection).len(), rows.len());
    for (feature, row) in features(&collection).iter().zip(&rows) {
        let properties = feature["properties"].as_object().unwrap();
        assert_eq!(properties.len(), row.len());
        for (name, value) in properties {
            let text = &row[name];
            match value {
                Value::Null => assert!(text.is_empty(), "{name}"),
                Value::String(own) => assert_eq!(own, text),
                // The JSON library reads numbers to the last digit but one.
                number => {
                    let (found, expected) = (number.as_f64().unwrap(), text.parse::<f64>().unwrap());
                    assert!((found - expected).abs() <= 1e-15 * expected.abs(), "{name} {found} {expected}");
                }
            }
        }
    }
}

#[test]
fn the_route_is_the_first_line_in_its_direction() {
    for pack in [&*DEMO, &*ACROSS] {
        let gpx = gpx::read(pack.place.bytes("out/recommended.gpx").as_slice()).expect("GPX");
        assert_eq!(gpx.version, gpx::GpxVersion::Gpx11);
        let metadata = gpx.metadata.expect("a head");
        assert!(metadata.description.unwrap().contains("not for navigation"));
        assert_eq!((gpx.routes.len(), gpx.tracks.len(), gpx.waypoints.len()), (1, 0, 0));
        let report = pack.json("lines.json");
        let first = report["lines"].as_array().unwrap().iter().find(|line| line["rank"] == 1).unwrap();
        let route = &gpx.routes[0];
        assert_eq!(route.name.as_deref(), first["name"].as_str());
        let frame = Frame::from_epsg(pack.epsg).unwrap();
        let waypoints = first["waypoints"].as_array().unwrap();
        assert_eq!(route.points.len(), waypoints.len());
        for (i, (point, waypoint)) in route.points.iter().zip(waypoints).enumerate() {
            assert_eq!(point.name, Some(format!("{} {}", first["name"].as_str().unwrap(), i + 1)));
            let geo = GeoPoint { lat_deg: point.point().y(), lon_deg: point.point().x() };
            let local = frame.to_local(geo).unwrap();
            let off = (local.east_m - waypoint["east_m"].as_f64().unwrap())
                .hypot(local.north_m - waypoint["north_m"].as_f64().unwrap());
            assert!(off < 1e-3, "{off}");
        }
        // The program itself can score it.
        let dive = std::fs::read_to_string(pack.place.path("dive.toml")).unwrap();
        let dive = dive.replace("\"lines.csv\"", "\"out/recommended.gpx\"");
        std::fs::write(pack.place.path(format!("route-{}.toml", pack.epsg)), dive).unwrap();
        pack.place.run(&format!("check route-{}.toml", pack.epsg)).expect(0);
    }
}

#[test]
fn local_metres_give_no_files_for_the_earth_and_say_so() {
    let place = Workplace::with_small_dive();
    let ran = place.run("lines dive.toml --out out").expect(0);
    assert!(ran.stderr.contains("lines.geojson, recommended.gpx are not written"), "{}", ran.stderr);
    assert_eq!(place.names("out"), ["lines.csv", "lines.json", "lines.png", "profiles.png"]);
    let ran = place.run("remap dive.toml --out remap").expect(0);
    assert!(ran.stderr.contains("remap.geojson is not written"), "{}", ran.stderr);
    place.run("area dive.toml --cell-m 100 --headings 4 --out area").expect(0);
    let Some(gdal) = gdal("a GeoTIFF in local metres has its grid and no coordinate system") else { return };
    let info = gdal.json(&place.path("area"), "gdalinfo", &["-json", "area.tif"]);
    let wkt = info.pointer("/coordinateSystem/wkt").and_then(Value::as_str).unwrap_or("");
    assert!(!wkt.contains("EPSG"), "{wkt}");
    assert_eq!(
        (info["geoTransform"][1].as_f64(), info["geoTransform"][5].as_f64()),
        (Some(100.0), Some(-100.0))
    );
    let text = info["metadata"][""]["TIFFTAG_IMAGEDESCRIPTION"].as_str().unwrap();
    assert!(text.contains("local metres, without a coordinate system"), "{text}");
}

/// What `ogrinfo` says of a file: features, and west, south, east, north.
fn summary(gdal: Gdal, folder: &Path, name: &str) -> (usize, [f64; 4], String) {
    let text = gdal.run(folder, "ogrinfo", &["-ro", "-so", "-al", name], "");
    let after =
        |key: &str| text.lines().find_map(|line| line.strip_prefix(key)).expect(key).trim().to_owned();
    let numbers: Vec<f64> =
        after("Extent:").split(|c: char| "(), ".contains(c)).filter_map(|word| word.parse().ok()).collect();
    (after("Feature Count:").parse().unwrap(), [numbers[0], numbers[1], numbers[2], numbers[3]], text)
}

#[test]
fn gdal_reads_every_vector_file_in_the_right_place() {
    let Some(gdal) = gdal("features, extent and coordinate system of every GeoJSON and GPX file") else {
        return;
    };
    for pack in [&*DEMO, &*ACROSS] {
        for name in COLLECTIONS {
            let collection = pack.json(name);
            if features(&collection).is_empty() {
                gdal.run(&pack.out(), "ogrinfo", &["-ro", "-so", "-al", name], "");
                continue;
            }
            let (count, found, text) = summary(gdal, &pack.out(), name);
            assert_eq!(count, features(&collection).len(), "{name}");
            assert!(text.contains("ID[\"EPSG\",4326]"), "{name}: {text}");
            let all: Vec<[f64; 2]> =
                features(&collection).iter().flat_map(|f| positions(&f["geometry"]["coordinates"])).collect();
            for (a, b) in found.iter().zip(extent(&all)) {
                assert!((a - b).abs() < 1e-6, "{name}: {found:?}");
            }
        }
        let suggested = features(&pack.json("suggest.geojson")).len();
        for (name, routes) in [("recommended.gpx", 1), ("suggest.gpx", suggested)] {
            let text = gdal.run(&pack.out(), "ogrinfo", &["-ro", "-so", name, "routes"], "");
            let count = format!("Feature Count: {routes}\n");
            assert!(text.contains(&count) && text.contains("Line String"), "{name}: {text}");
        }
    }
}

/// Grid coordinates of the tables against the positions of the files, through GDAL's projection.
#[test]
fn coordinates_come_back_within_a_centimetre() {
    let Some(gdal) = gdal("round trip of coordinates through GDAL's projection to 1 cm") else { return };
    for pack in [&*DEMO, &*ACROSS] {
        let mut worst: f64 = 0.0;
        let mut compare = |geo: &[[f64; 2]], grid: &[[f64; 2]]| {
            assert_eq!(geo.len(), grid.len());
            for (a, b) in gdal.to_grid(pack.epsg, geo).iter().zip(grid) {
                worst = worst.max((a[0] - b[0]).hypot(a[1] - b[1]));
            }
        };
        let (mut geo, mut grid) = (Vec::new(), Vec::new());
        for (feature, row) in features(&pack.json("lines.geojson")).iter().zip(pack.rows("lines.csv")) {
            let path = positions(&feature["geometry"]["coordinates"]);
            geo.extend([path[0], path[path.len() - 1]]);
            for end in ["start", "end"] {
                grid.push(
                    ["easting_m", "northing_m"].map(|axis| row[&format!("{end}_{axis}")].parse().unwrap()),
                );
            }
        }
        compare(&geo, &grid);
        let landmarks = pack.json("landmarks.geojson");
        let geo: Vec<[f64; 2]> =
            features(&landmarks).iter().flat_map(|f| positions(&f["geometry"]["coordinates"])).collect();
        let grid: Vec<[f64; 2]> = features(&landmarks)
            .iter()
            .map(|f| ["easting_m", "northing_m"].map(|axis| f["properties"][axis].as_f64().unwrap()))
            .collect();
        compare(&geo, &grid);
        // The route, as GDAL itself reads it.
        let table = gdal.run(
            &pack.out(),
            "ogr2ogr",
            &["-f", "CSV", "-lco", "GEOMETRY=AS_XY", "/vsistdout/", "recommended.gpx", "route_points"],
            "",
        );
        let mut reader = csv::Reader::from_reader(table.as_bytes());
        let geo: Vec<[f64; 2]> = reader
            .records()
            .map(|row| row.unwrap())
            .map(|row| [row[0].parse().unwrap(), row[1].parse().unwrap()])
            .collect();
        let report = pack.json("lines.json");
        let first = report["lines"].as_array().unwrap().iter().find(|line| line["rank"] == 1).unwrap();
        let grid: Vec<[f64; 2]> = first["waypoints"]
            .as_array()
            .unwrap()
            .iter()
            .map(|p| ["east_m", "north_m"].map(|axis| p[axis].as_f64().unwrap()))
            .collect();
        compare(&geo, &grid);
        assert!(worst < COORDINATES_M, "{worst} m");
    }
}

#[test]
fn gdal_reads_the_area_map_and_its_values() {
    let Some(gdal) = gdal("extent, coordinate system, bands, no-data and cell values of area.tif") else {
        return;
    };
    for pack in [&*DEMO, &*ACROSS] {
        let report = pack.json("area.json");
        let info = gdal.json(&pack.out(), "gdalinfo", &["-json", "area.tif"]);
        let grid = &report["grid"];
        let of = |key: &str| grid[key].as_f64().unwrap();
        let (cell, columns, rows) = (of("cell_m"), of("columns"), of("rows"));
        assert_eq!(info["size"], serde_json::json!([columns as u64, rows as u64]));
        let transform: Vec<f64> =
            info["geoTransform"].as_array().unwrap().iter().map(|x| x.as_f64().unwrap()).collect();
        let north = of("south_m") + rows * cell;
        assert_eq!(transform, [of("west_m"), cell, 0.0, north, 0.0, -cell]);
        let corner = |name: &str| {
            let corner = &info["cornerCoordinates"][name];
            [corner[0].as_f64().unwrap(), corner[1].as_f64().unwrap()]
        };
        assert_eq!(corner("lowerLeft"), [of("west_m"), of("south_m")]);
        assert_eq!(corner("upperRight"), [of("west_m") + columns * cell, north]);
        let wkt = info["coordinateSystem"]["wkt"].as_str().unwrap();
        assert!(wkt.trim_end().ends_with(&format!("ID[\"EPSG\",{}]]", pack.epsg)), "{wkt}");
        assert_eq!(info["metadata"][""]["AREA_OR_POINT"], "Area");
        assert!(info["metadata"][""]["CAUTION"].as_str().unwrap().contains("not for navigation"));
        assert_eq!(info["metadata"]["IMAGE_STRUCTURE"]["COMPRESSION"], "DEFLATE");
        let bands = info["bands"].as_array().unwrap();
        let names: Vec<&str> = bands.iter().map(|band| band["description"].as_str().unwrap()).collect();
        assert_eq!(
            names,
            [
                "guaranteed_worst_fix_m",
                "guaranteed_best_fix_m",
                "best_heading_deg",
                "guaranteed_median_fix_m",
                "within_required_share",
                "headings_without_fix",
                "undecided"
            ]
        );
        let units: Vec<&str> = bands.iter().map(|band| band["unit"].as_str().unwrap_or("")).collect();
        assert_eq!(units, ["m", "m", "degree", "m", "", "", ""]);
        assert!(bands.iter().all(|band| band["noDataValue"] == "NaN" && band["type"] == "Float64"));

        // Every cell of the grid by its coordinates, those outside the search area too.
        let mut input = String::new();
        let mut places = Vec::new();
        for row in 0..rows as u64 {
            for column in 0..columns as u64 {
                let east = of("west_m") + (column as f64 + 0.5) * cell;
                let north = of("south_m") + (row as f64 + 0.5) * cell;
                input += &format!("{east} {north}\n");
                places.push((column, row));
            }
        }
        let text = gdal.run(&pack.out(), "gdallocationinfo", &["-valonly", "-geoloc", "area.tif"], &input);
        let values: Vec<f64> = text.lines().map(|line| line.trim().parse().expect(line)).collect();
        assert_eq!(values.len(), places.len() * bands.len());
        let cells = &report["cells"];
        let list = |key: &str| cells[key].as_array().unwrap();
        let mut inside = std::collections::HashMap::new();
        for i in 0..list("column").len() {
            inside.insert((list("column")[i].as_u64().unwrap(), list("row")[i].as_u64().unwrap()), i);
        }
        let mut none = 0;
        for (place, found) in places.iter().zip(values.chunks(bands.len())) {
            let Some(&i) = inside.get(place) else {
                assert!(found.iter().all(|x| x.is_nan()), "outside the search area: {found:?}");
                continue;
            };
            for (name, &found) in names[..5].iter().zip(found) {
                match list(name)[i].as_f64() {
                    Some(expected) => assert!((found - expected).abs() < 1e-3, "{name} {found} {expected}"),
                    None => {
                        assert_eq!(found, NONE_CODE, "{name}");
                        none += 1;
                    }
                }
            }
            let counts = list("no_guaranteed_fix")[i].as_object().unwrap();
            let total: u64 = counts.values().map(|count| count.as_u64().unwrap()).sum();
            assert_eq!((found[5], found[6]), (total as f64, counts["undecided"].as_f64().unwrap()));
        }
        assert!(inside.len() >= 50 && none > 0, "{} cells compared, {none} without a fix", inside.len());
    }
}

/// Landmarks written for a GIS, turned into KML by GDAL, and read again, are the same landmarks; lines likewise.
#[test]
fn kml_made_by_gdal_reads_back() {
    let Some(gdal) = gdal("KML written by GDAL reads back to the same landmarks and lines") else { return };
    let dive = Dive::read(&DEMO.place.path("dive.toml")).unwrap();
    for driver in ["KML", "LIBKML"] {
        let place = Workplace::new();
        let from = |name: &str| DEMO.out().join(name).display().to_string();
        gdal.run(&place.path("."), "ogr2ogr", &["-f", driver, "marks.kml", &from("landmarks.geojson")], "");
        gdal.run(
            &place.path("."),
            "ogr2ogr",
            &["-f", driver, "run.kml", &from("recommended.gpx"), "routes"],
            "",
        );
        let text = std::fs::read_to_string(DEMO.place.path("dive.toml")).unwrap();
        let text = text.replace("landmarks.csv", "marks.kml").replace("lines.csv", "run.kml");
        let place = place.write("dive.toml", &text);
        let again = Dive::read(&place.path("dive.toml")).unwrap_or_else(|e| panic!("{driver}: {e}"));
        assert_eq!(again.frame, dive.frame);
        assert_eq!(again.landmarks.len(), dive.landmarks.len());
        for (a, b) in again.landmarks.iter().zip(&dive.landmarks) {
            assert_eq!(a.id, b.id);
            assert!(a.position.distance_m(b.position) < COORDINATES_M, "{driver} {}", a.id);
            // Bounds are widened for the grid each time they are read: never smaller, and by less than 0.2 %.
            for (wide, narrow) in
                [(a.half_width_east_m, b.half_width_east_m), (a.half_width_north_m, b.half_width_north_m)]
            {
                assert!(wide >= narrow && wide <= 1.002 * narrow, "{driver} {wide} {narrow}");
            }
        }
        let first = DEMO.json("lines.json");
        let first = first["lines"].as_array().unwrap().iter().find(|line| line["rank"] == 1).unwrap().clone();
        let line = dive.lines.iter().find(|line| line.name == first["name"].as_str().unwrap()).unwrap();
        assert_eq!(again.lines.len(), 1);
        assert_eq!(again.lines[0].name, line.name, "{driver}");
        assert_eq!(again.lines[0].waypoints.len(), line.waypoints.len());
        for (a, b) in again.lines[0].waypoints.iter().zip(&line.waypoints) {
            assert!(a.distance_m(*b) < COORDINATES_M);
        }
    }
}

/// RFC 7946, section 3.1.9: nothing reaches around the Earth.
#[test]
fn geometry_across_the_meridian_is_cut() {
    for name in COLLECTIONS {
        let collection = ACROSS.json(name);
        let mut cut = 0;
        for feature in features(&collection) {
            let geometry = &feature["geometry"];
            let parts: Vec<&Value> = match geometry["type"].as_str().unwrap() {
                "MultiPolygon" | "MultiLineString" => {
                    cut += 1;
                    geometry["coordinates"].as_array().unwrap().iter().collect()
                }
                "MultiPoint" => continue,
                _ => vec![&geometry["coordinates"]],
            };
            for part in parts {
                let [west, _, east, _] = extent(&positions(part));
                assert!(east - west < 0.1, "{name}: {west} to {east}");
            }
        }
        // Landmarks are points, and a suggestion need not cross.
        let must_cross = !["landmarks.geojson", "suggest.geojson"].contains(&name);
        assert!(cut > 0 || !must_cross, "{name}");
    }
    let Some(gdal) = gdal("parts and areas of geometry across the 180th meridian") else { return };
    for name in ["lines.geojson", "remap.geojson"] {
        let parts = gdal.json(
            &ACROSS.out(),
            "ogr2ogr",
            &["-f", "GeoJSON", "-explodecollections", "/vsistdout/", name],
        );
        assert!(features(&parts).len() > features(&ACROSS.json(name)).len());
        for feature in features(&parts) {
            let [west, _, east, _] = extent(&positions(&feature["geometry"]["coordinates"]));
            assert!(east - west < 0.1, "{name}: {west} to {east}");
        }
    }
    // Cut or not, regions keep their area in the grid.
    let folder = ACROSS.out();
    let grid = format!("EPSG:{}", ACROSS.epsg);
    let sql = "SELECT region, area_km2, OGR_GEOM_AREA AS area_m2 FROM remap";
    gdal.run(
        &folder,
        "ogr2ogr",
        &["-f", "GeoJSON", "-t_srs", &grid, "grid.json", "remap.geojson", "-nln", "remap"],
        "",
    );
    let table = gdal.run(&folder, "ogr2ogr", &["-f", "CSV", "/vsistdout/", "grid.json", "-sql", sql], "");
    let mut reader = csv::Reader::from_reader(table.as_bytes());
    let mut regions = 0;
    for row in reader.records().map(Result::unwrap) {
        let (stated, found): (f64, f64) = (row[1].parse().unwrap(), row[2].parse().unwrap());
        assert!((found - 1e6 * stated).abs() < 1e-5 * 1e6 * stated, "{stated} km2, {found} m2");
        regions += 1;
    }
    assert_eq!(regions, features(&ACROSS.json("remap.geojson")).len());
}
