//! KML: what is read of it, and the text of every refusal.

use std::fmt::Write as _;

use super::{Scene, holds};

const HEAD: &str = "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<kml xmlns=\"http://www.opengis.net/kml/2.2\">\n<Document>\n";
const TAIL: &str = "</Document>\n</kml>\n";

/// Four points on the site of the sound dive file, one a line from line 4 on.
const POINTS: [&str; 4] = [
    "<Placemark><name>A</name><Point><coordinates>3.0016,55.9459</coordinates></Point></Placemark>\n",
    "<Placemark><name>B</name><Point><coordinates>3.0048,55.9455,-30.5</coordinates></Point></Placemark>\n",
    "<Placemark><name>C</name><Point><coordinates> 3.0080,55.9461 </coordinates></Point></Placemark>\n",
    "<Placemark><name>D</name><Point><coordinates>3.0112,55.9458</coordinates></Point></Placemark>\n",
];

const LINE: &str = "<Placemark><name>north</name><LineString><coordinates>\n3.0005,55.9456\n3.0130,55.9456,0\n\
    </coordinates></LineString></Placemark>\n";

fn with_landmarks(kml: impl AsRef<[u8]>) -> Scene {
    Scene::new()
        .swap("reef.csv", "reef.kml")
        .swap("EPSG:32631", "EPSG:4326")
        .swap("uncertainty = \"bound\"\n", "uncertainty = \"bound\"\nuncertainty_m = 2\n")
        .swap("[lines]\n", "[lines]\ncrs = \"EPSG:32631\"\n")
        .file("reef.kml", kml)
}

fn with_lines(kml: impl AsRef<[u8]>) -> Scene {
    Scene::new().swap("lines.csv", "run.kml").file("run.kml", kml)
}

fn document(body: &str) -> String {
    format!("{HEAD}{body}{TAIL}")
}

fn ids(scene: &Scene) -> Vec<String> {
    scene.dive().landmarks.iter().map(|landmark| landmark.id.clone()).collect()
}

#[test]
fn points_in_any_nesting_and_spelling() {
    let body = format!(
        "<Style id=\"s\"><IconStyle><scale>2</scale></IconStyle></Style>\n{}<Folder><name>F</name><Folder>{}</Folder></Folder>\n{}{}",
        POINTS[0], POINTS[1], POINTS[2], POINTS[3]
    );
    let plain = with_landmarks(document(&body));
    assert_eq!(ids(&plain), ["A", "B", "C", "D"]);
    let dive = plain.dive();
    assert!((dive.landmarks[0].half_width_east_m - 2.0).abs() < 0.01);
    holds(&plain.notices(), &["4 landmarks without own uncertainty, set to 2 m"]);

    // The same with prefixes, a byte-order mark, CRLF and comments gives the same landmarks.
    let mut prefixed =
        document(&body).replace("xmlns=", "xmlns:k=").replace("</", "</k:").replace('<', "<k:");
    prefixed = prefixed.replace("<k:/k:", "</k:").replace("<k:?xml", "<?xml").replace('\n', "\r\n");
    prefixed = prefixed.replace("<k:coordinates>", "<k:coordinates><!-- lon, lat -->");
    let mut bytes = vec![0xEF, 0xBB, 0xBF];
    bytes.extend(prefixed.as_bytes());
    assert_eq!(with_landmarks(bytes).dive().landmarks, dive.landmarks);
    // As characters that need not be looked at, and by references.
    let cdata = document(&body)
        .replace("<name>A</name>", "<name><![CDATA[A]]></name>")
        .replace("<name>B</name>", "<name>&#66;</name>")
        .replace("3.0080,55.9461", "<![CDATA[3.0080,55]]>.9461");
    assert_eq!(with_landmarks(cdata).dive().landmarks, dive.landmarks);
    // Without an ending that says so.
    let scene =
        with_landmarks(document(&body)).swap("reef.kml", "reef.data").file("reef.data", document(&body));
    assert_eq!(scene.dive().landmarks, dive.landmarks);
}

#[test]
fn names_with_markup_and_references_stay_text() {
    let body = POINTS.concat().replace("<name>A</name>", "<name>a &lt;b&gt; &amp; <![CDATA[<c>]]></name>");
    assert_eq!(ids(&with_landmarks(document(&body)))[0], "a <b> & <c>");
}

#[test]
fn extended_data_hold_identifier_and_uncertainty() {
    let data = "<ExtendedData><Data name=\"Contact ID\"><value> K1 </value></Data>\
        <Data name=\"uncertainty_m\"><value>3.5</value></Data><Data name=\"depth\"><value>31</value></Data>\
        <Data name=\"Survey date\"><value>2026-05-31</value></Data></ExtendedData>";
    let schema = "<ExtendedData><SchemaData schemaUrl=\"#s\"><SimpleData name=\"uncertainty_east_m\">1</SimpleData>\
        <SimpleData name=\"uncertainty_north_m\">4</SimpleData></SchemaData></ExtendedData>";
    let multi = "<Placemark id=\"m7\"><MultiGeometry><Point><coordinates>3.0080,55.9461</coordinates></Point>\
        <MultiGeometry><Point><coordinates>3.0112,55.9458</coordinates></Point></MultiGeometry></MultiGeometry></Placemark>";
    let body = format!(
        "{}{}{multi}",
        POINTS[0].replace("<Point>", &format!("{data}<Point>")),
        POINTS[1].replace("</Point>", &format!("</Point>{schema}")),
    );
    let scene = with_landmarks(document(&body));
    assert_eq!(ids(&scene), ["K1", "B", "m7-1", "m7-2"]);
    let widths: Vec<(f64, f64)> =
        scene.dive().landmarks.iter().map(|l| (l.half_width_east_m, l.half_width_north_m)).collect();
    for (found, expected) in widths.iter().zip([(3.5, 3.5), (1.0, 4.0), (2.0, 2.0), (2.0, 2.0)]) {
        assert!((found.0 - expected.0).abs() < 0.01 && (found.1 - expected.1).abs() < 0.01, "{widths:?}");
    }
    holds(&scene.notices(), &["information: reef.kml: data not used: depth"]);

    let refused = |from: &str, to: &str| with_landmarks(document(&body.replace(from, to))).errors();
    holds(
        &refused("<value>3.5</value>", "<value>-3.5</value>"),
        &["reef.kml:4: placemark 1, data uncertainty_m: \"-3.5\" is negative; accepted: 0"],
    );
    holds(
        &refused("<value>3.5</value>", "<value>3,5</value>"),
        &["placemark 1, data uncertainty_m: \"3,5\" is not a number with a decimal point"],
    );
    holds(&refused("<value>3.5</value>", "<value>nan</value>"), &["\"nan\" is not a finite number"]);
    holds(&refused("<value>3.5</value>", "<value>1e6</value>"), &["\"1e6\" is out of range"]);
    holds(&refused("<value>3.5</value>", "<value>wide</value>"), &["\"wide\" is not a number"]);
    holds(
        &refused("<SimpleData name=\"uncertainty_east_m\">1</SimpleData>", ""),
        &[
            "reef.kml:5: placemark 2: the uncertainties do not fit together; accepted: uncertainty_m for both axes",
        ],
    );
    holds(
        &refused("2026-05-31", "31.5.2026"),
        &[
            "reef.kml:4: placemark 1, data Survey date: \"31.5.2026\" is not a date; accepted: a date as year-month-day",
        ],
    );
    holds(
        &refused("\"depth\"", "\"Uncertainty\""),
        &["placemark 1: the data \"uncertainty_m\" and \"Uncertainty\" mean the same; accepted: one of them"],
    );
}

#[test]
fn malformed_tuples_are_refused_with_line_and_text() {
    let one =
        |tuple: &str| with_landmarks(document(&POINTS.concat().replace("3.0080,55.9461", tuple))).errors();
    let accepted = "accepted: longitude,latitude or longitude,latitude,altitude with decimal points, and blanks between \
                    tuples only";
    let cases = [
        (
            "3.0080, 55.9461",
            "\"3.0080, 55.9461\" has a blank beside a comma",
            "remove the blanks inside the tuple",
        ),
        (
            "3.0080 ,55.9461",
            "\"3.0080 ,55.9461\" has a blank beside a comma",
            "remove the blanks inside the tuple",
        ),
        ("3.0080", "\"3.0080\" has 1 number", "join longitude and latitude by a comma"),
        ("3.0080 55.9461", "\"55.9461\" has 1 number", "join longitude and latitude by a comma"),
        (
            "3,0080,55,9461",
            "\"3,0080,55,9461\" has 4 numbers",
            "if commas are decimal signs, write points instead",
        ),
        ("3.0080,", "\"3.0080,\" has an empty number", ""),
        (",55.9461", "\",55.9461\" has an empty number", ""),
        ("3.0080,55.9461,", "\"3.0080,55.9461,\" has an empty number", ""),
        ("3.0080,55.9461,deep", "\"3.0080,55.9461,deep\" is no position: \"deep\" is not a number", ""),
        ("3.0080,nan", "\"3.0080,nan\" is no position: \"nan\" is not a finite number", ""),
        ("3.0080,55°56'", "\"3.0080,55°56'\" is no position: \"55°56'\" is not a number", ""),
        ("3,0080", "\"3,0080\" has no decimal point", "if the comma is a decimal sign, write a point"),
        ("3.0080;55.9461", "\"3.0080;55.9461\" has 1 number", ""),
    ];
    for (tuple, what, advice) in cases {
        holds(&one(tuple), &[&format!("reef.kml:6: placemark 3: {what}; {accepted}"), advice]);
    }
    holds(
        &one("3.0080,95.9461"),
        &[
            "reef.kml:6: placemark 3, latitude: 95.9461 is out of range",
            "longitude, then latitude, in degrees",
        ],
    );
    holds(&one(""), &["reef.kml:6: placemark 3: the Point has no coordinates; accepted: one tuple"]);
    holds(&one("3.0080,55.9461 3.0081,55.9461"), &["reef.kml:6: placemark 3: the Point has 2 positions"]);
    let long = "7".repeat(300);
    let text = one(&long);
    assert!(text.contains('…') && text.len() < 400, "{text}");

    // Every bad tuple of a line is named with the line it stands on.
    let line = LINE.replace("3.0005,55.9456\n", "3.0005,55.9456\n3.0050,\n\n 55.9456 3.0060\n");
    holds(
        &with_lines(document(&line)).errors(),
        &[
            "run.kml:6: placemark 1: \"3.0050, 55.9456\" has a blank beside a comma",
            "run.kml:8: placemark 1: \"3.0060\" has 1 number",
        ],
    );
    // Lines are counted through comments and CDATA as well.
    let line = LINE.replace("3.0005,55.9456\n", "<!--\n\n-->3.0005,55.9456\n<![CDATA[\n3.0050]]>\n");
    holds(&with_lines(document(&line)).errors(), &["run.kml:9: placemark 1: \"3.0050\" has 1 number"]);
}

#[test]
fn bad_points_are_left_out_and_counted_on_request() {
    let scene = with_landmarks(document(&POINTS.concat().replace("3.0080,55.9461", "3.0080")))
        .swap("uncertainty_m = 2\n", "uncertainty_m = 2\nskip_bad_rows = true\n");
    assert_eq!(ids(&scene), ["A", "B", "D"]);
    holds(&scene.notices(), &["warning: reef.kml: 1 row with problems left out", "\"3.0080\" has 1 number"]);
}

#[test]
fn lines_take_their_names_and_parts() {
    let parts = "<Placemark><MultiGeometry><LineString><coordinates>3.0005,55.9460 3.0130,55.9460</coordinates></LineString>\
        <LineString><coordinates>3.0005,55.9452 3.0130,55.9452</coordinates></LineString></MultiGeometry></Placemark>\n";
    let named = "<Placemark><name>shown</name><ExtendedData><Data name=\"line\"><value>south</value></Data></ExtendedData>\
        <LineString><coordinates>3.0005,55.9450 3.0130,55.9450 3.0130,55.9448</coordinates></LineString></Placemark>\n";
    let scene = with_lines(document(&format!("{LINE}{parts}{named}{}", POINTS[0])));
    let dive = scene.dive();
    let names: Vec<(&str, usize)> = dive.lines.iter().map(|l| (l.name.as_str(), l.waypoints.len())).collect();
    assert_eq!(
        names,
        [("north", 2), ("run placemark 2 part 1", 2), ("run placemark 2 part 2", 2), ("south", 3)]
    );
    // The direction is that of the file: eastward.
    assert!(dive.lines[0].waypoints[0].east_m < dive.lines[0].waypoints[1].east_m);
    holds(&scene.notices(), &["run.kml: not used: 1 × Point; lines are LineStrings"]);

    let text = with_lines(document(&LINE.replace("3.0130,55.9456,0\n", ""))).errors();
    holds(
        &text,
        &["run.kml: line \"north\" (placemark 1): has 1 waypoint; accepted: at least two waypoints"],
    );
    holds(&with_lines(document(POINTS[0])).errors(), &["run.kml: holds no line"]);
    holds(
        &with_lines(document(&LINE.replace("3.0130,", "933.0130,"))).errors(),
        &["run.kml:6: placemark 1, position 2, longitude: 933.013 is out of range"],
    );
}

#[test]
fn other_geometry_is_counted_not_read() {
    let others = format!(
        "<Placemark><name>P</name><Polygon><outerBoundaryIs><LinearRing><coordinates>3,55 3.1,55 3,55.1 broken\
         </coordinates></LinearRing></outerBoundaryIs></Polygon></Placemark>\n\
         <Placemark><name>T</name><Track><coord>3 55 0</coord></Track></Placemark>\n\
         <Placemark><name>E</name></Placemark>\n<NetworkLink><Link><href>x.kml</href></Link></NetworkLink>\n{LINE}"
    );
    let scene = with_landmarks(document(&format!("{}{others}", POINTS.concat())));
    assert_eq!(ids(&scene), ["A", "B", "C", "D"]);
    holds(
        &scene.notices(),
        &[
            "not used: 1 × LineString; landmarks are Points",
            "not used: 2 × Polygon, Model or Track",
            "not used: 1 × placemark without geometry",
            "not used: 1 × NetworkLink",
        ],
    );
    holds(&with_landmarks(document(&others)).errors(), &["reef.kml: holds no Point"]);
}

#[test]
fn the_coordinate_system_is_settled() {
    let scene = Scene::new().swap("reef.csv", "reef.kml").file("reef.kml", document(&POINTS.concat()));
    holds(
        &scene.errors(),
        &[
            "reef.kml: KML is always WGS 84 (EPSG:4326), the dive file says WGS 84 / UTM zone 31N (EPSG:32631)",
            "set crs = \"EPSG:4326\" under [map]",
        ],
    );
    let scene = with_lines(document(LINE)).swap("[lines]\n", "[lines]\ncrs = \"EPSG:4326\"\n");
    holds(&scene.errors(), &["key lines.crs: has no effect: GPX and KML are always WGS 84"]);
}

#[test]
fn files_that_are_no_kml_are_refused() {
    let refused = |text: &str| with_landmarks(text).errors();
    let points = POINTS.concat();
    holds(&refused("<gpx version=\"1.1\"></gpx>"), &["reef.kml:1: has the root element gpx, not kml"]);
    holds(&refused("no markup\n"), &["reef.kml:2: has no element kml; accepted: KML 2.2 or 2.3"]);
    holds(&refused(""), &["reef.kml:1: has no element kml"]);
    holds(&refused(&format!("{}<kml/>", document(&points))), &["has the root element kml, not kml"]);
    // Cut off at any byte: never a panic, never a map.
    let whole = document(&points);
    for cut in (0..whole.len() - 2).filter(|cut| whole.is_char_boundary(*cut)) {
        with_landmarks(&whole[..cut]).errors();
    }
    holds(&refused(&whole[..whole.len() - 20]), &["reef.kml:", "the file is cut off"]);
    holds(&refused(&whole.replace("</Document>", "</Folder>")), &["reef.kml:8: is not well-formed XML"]);
    holds(
        &refused(&whole.replace("<Placemark>", "<Placemark><Placemark>")),
        &["a Placemark inside a Placemark"],
    );

    // Entities: none are declared, none are expanded.
    let bomb = "<!DOCTYPE kml [<!ENTITY a \"aaaaaaaaaa\"><!ENTITY b \"&a;&a;&a;&a;\">]>\n";
    let text = whole.replace("<kml ", &format!("{bomb}<kml ")).replace("<name>A", "<name>&b;");
    holds(&refused(&text), &["reef.kml:2: has a document type declaration (DTD)", "remove the <!DOCTYPE"]);
    holds(&refused(&whole.replace("<name>A", "<name>&b;")), &["reef.kml:4: &b; is not declared in XML"]);
    holds(
        &refused(&whole.replace("encoding=\"UTF-8\"", "encoding=\"ISO-8859-1\"")),
        &["reef.kml:1: says that it is encoded in ISO-8859-1", "save the file as UTF-8"],
    );
    let mut deep = String::new();
    for _ in 0..100 {
        deep.push_str("<Folder>\n");
    }
    let text = document(&format!("{deep}{points}{}", "</Folder>".repeat(100)));
    holds(&refused(&text), &["elements are nested deeper than 64"]);
    let scene = with_landmarks(b"PK\x03\x04\x14\x00\x00\x00").swap("reef.kml", "reef.kmz");
    let text = scene.file("reef.kmz", b"PK\x03\x04\x14\x00\x00\x00doc.kml").errors();
    holds(&text, &["reef.kmz: is a compressed archive (ZIP)", "in a KMZ archive usually doc.kml"]);
}

#[test]
fn a_large_file_is_read_in_one_pass() {
    let mut body = String::new();
    for i in 0..20_000 {
        let (lon, lat) = (3.0 + f64::from(i % 200) * 1e-4, 55.94 + f64::from(i / 200) * 1e-4);
        writeln!(body, "<Placemark><name>L{i}</name><Point><coordinates>{lon:.7},{lat:.7}</coordinates></Point></Placemark>")
            .unwrap();
    }
    let scene = with_landmarks(document(&body));
    let begun = std::time::Instant::now();
    assert_eq!(scene.dive().landmarks.len(), 20_000);
    // Far above what it takes; a pass over the file for each point would take minutes.
    assert!(begun.elapsed().as_secs() < 20);
}
