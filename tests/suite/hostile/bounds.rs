//! Time and memory of readers against size: pieces that cost much for their length, repeated.

use std::collections::BTreeMap;
use std::time::Duration;

use super::{Format, PLAIN, measured};

/// Pieces by format: what stands before, what is repeated, what stands after.
const PIECES: &[(Format, &str, &str, &str)] = &[
    (Format::Csv, "lat,lon\n", "1,2\n", ""),
    (Format::Csv, "lat,lon\n", "x\n", ""),
    (Format::Csv, "lat,lon\n", "\n", ""),
    (Format::Csv, "lat,lon\n", ",\n", ""),
    (Format::Csv, "lat,lon\n", "a,b\n", ""),
    (Format::Csv, "lat,lon\n", "1,200,3\n", ""),
    (Format::Csv, "lat,lon\n", "\"a\nb\",1\n", ""),
    (Format::Csv, "lat,lon\n1,", "9", ""),
    (Format::Csv, "lat,lon\n1,\"", "\"\"", ""),
    (Format::Csv, "lat,lon\n1,\"", "\n", ""),
    (Format::Csv, "lat,lon", ",lat", "\n"),
    (Format::Csv, "lat,lon", ",", "\n1,2\n"),
    (Format::Csv, "lat,lon", ";lat", "\n1,2\n"),
    (Format::Csv, "lat", " ", ",lon\n1,2\n"),
    (Format::Csv, "lat,lon,name\n", "1,2,a\n", ""),
    (Format::Csv, "lat,lon,line\n", "1,2,a\n", ""),
    (Format::Csv, "lat,lon,line,order\n", "1,2,a,7\n", ""),
    (Format::Csv, "\n", "\n", "lat,lon\n1,2\n"),
    (Format::GeoJson, "[", "[],", "0]"),
    (Format::GeoJson, "[", "0,", "0]"),
    (Format::GeoJson, "[", "{},", "0]"),
    (Format::GeoJson, "[", "{\"\":0},", "0]"),
    (Format::GeoJson, "{\"type\":\"FeatureCollection\",\"features\":[", "0,", "0]}"),
    (Format::GeoJson, "{\"type\":\"FeatureCollection\",\"features\":[", "{\"type\":\"Feature\"},", "0]}"),
    (Format::GeoJson, "{\"type\":\"Feature\",\"properties\":{\"a\":[", "{\"\":0},", "0]},\"geometry\":null}"),
    (Format::GeoJson, "{\"type\":\"MultiPoint\",\"coordinates\":[", "[1,2],", "[1,2]]}"),
    (Format::GeoJson, "{\"type\":\"MultiPoint\",\"coordinates\":[", "[],", "[]]}"),
    (Format::GeoJson, "{\"type\":\"MultiPoint\",\"coordinates\":[", "[999,2],", "[1,2]]}"),
    (Format::GeoJson, "{\"type\":\"LineString\",\"coordinates\":[", "[1,2],", "[1,2]]}"),
    (Format::GeoJson, "{\"type\":\"LineString\",\"coordinates\":[", "[],", "[]]}"),
    (Format::GeoJson, "{\"type\":\"MultiLineString\",\"coordinates\":[", "[[1,2]],", "[[1,2]]]}"),
    (
        Format::GeoJson,
        "{\"type\":\"GeometryCollection\",\"geometries\":[",
        "{\"type\":\"Point\",\"coordinates\":[1,2]},",
        "0]}",
    ),
    (Format::GeoJson, "{\"type\":\"", "a", "\"}"),
    (Format::GeoJson, "{\"a\":", "9", "}"),
    (Format::GeoJson, "", "[", ""),
    (Format::GeoJson, "", "{\"a\":", ""),
    (Format::GeoJson, "{\"type\":\"Feature\",\"crs\":{\"properties\":{\"name\":\"", ":", "\"}}}"),
    (Format::Gpx, "<gpx version=\"1.1\">", "<a>", ""),
    (Format::Gpx, "<gpx version=\"1.1\"><extensions>", "<a></a>", "</extensions></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\"><extensions>", "<a/>", "</extensions></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\"", " a=\"\"", "></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\"", " xmlns:a=\"b\"", "></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\"><extensions>", "<a xmlns:b=\"c\">", ""),
    (Format::Gpx, "<gpx version=\"1.1\"><rte><name>", "&amp;", "</name></rte></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\"><rte><name>", "<![CDATA[]]>", "</name></rte></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\"><rte><name>", "a<!---->", "</name></rte></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\"><rte>", "<rtept lat=\"1\" lon=\"2\"/>", "</rte></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\"><rte>", "<rtept lat=\"x\"/>", "</rte></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\"><rte>", "<wpt", "</rte></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\"><rte>", "<wpt lat", "</rte></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\">", "<rte/>", "</gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\">", "<wpt lat=\"1\" lon=\"2\"/>", "</gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\"><trk>", "<trkseg/>", "</trk></gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\">", "<?a?>", "</gpx>"),
    (Format::Gpx, "<gpx version=\"1.1\">", " ", "</gpx>"),
    (Format::Kml, "<kml>", "<a>", ""),
    (Format::Kml, "<kml>", "<a/>", "</kml>"),
    (Format::Kml, "<kml>", "<Placemark/>", "</kml>"),
    (Format::Kml, "<kml>", "<Placemark><Point/></Placemark>", "</kml>"),
    (
        Format::Kml,
        "<kml><Placemark><Point><coordinates>",
        "1.0,2.0 ",
        "</coordinates></Point></Placemark></kml>",
    ),
    (
        Format::Kml,
        "<kml><Placemark><LineString><coordinates>",
        "1.0,2.0 ",
        "</coordinates></LineString></Placemark></kml>",
    ),
    (
        Format::Kml,
        "<kml><Placemark><LineString><coordinates>",
        "a ",
        "</coordinates></LineString></Placemark></kml>",
    ),
    (
        Format::Kml,
        "<kml><Placemark><LineString><coordinates>",
        ", ",
        "</coordinates></LineString></Placemark></kml>",
    ),
    (
        Format::Kml,
        "<kml><Placemark><LineString><coordinates>",
        "1,",
        "</coordinates></LineString></Placemark></kml>",
    ),
    (Format::Kml, "<kml><Placemark><name>", "&lt;", "</name></Placemark></kml>"),
    (Format::Kml, "<kml><Placemark", " a=\"\"", "/></kml>"),
    (
        Format::Kml,
        "<kml><Placemark><ExtendedData>",
        "<Data name=\"id\"><value>1</value></Data>",
        "</ExtendedData><Point><coordinates>1.0,2.0</coordinates></Point></Placemark></kml>",
    ),
    (
        Format::Kml,
        "<kml><Placemark><MultiGeometry>",
        "<Point><coordinates>1.5,2.5</coordinates></Point>",
        "</MultiGeometry></Placemark></kml>",
    ),
    (Format::Toml, "", "=\n", ""),
    (Format::Toml, "", "[", ""),
    (Format::Toml, "a=", "[", ""),
    (Format::Toml, "a=", "{a=", ""),
    (Format::Toml, "", "a.", "b=1"),
    (Format::Toml, "[", "a.", "b]"),
    (Format::Toml, "", "a=1\n", ""),
    (Format::Toml, "", "[a]\n", ""),
    (Format::Toml, "", "[[a]]\n", ""),
    (Format::Toml, "", "[[a.b]]\n", ""),
    (Format::Toml, "a=[", "[],", "]"),
    (Format::Toml, "a=[", "1,", "]"),
    (Format::Toml, "a=[", "\"\",", "]"),
    (Format::Toml, "a=", "9", ""),
    (Format::Toml, "a=\"", "\\n", "\""),
    (Format::Toml, "", "#\n", ""),
    (Format::Toml, "", "a", "=1"),
    (Format::Toml, "", ".", ""),
    (Format::Toml, "", "\"", ""),
    (Format::Toml, "[lines]\nfiles=[", "\"lines.csv\",", "]"),
    (Format::Toml, "", "\n", ""),
    (Format::Toml, "name=", "-", "1"),
];

fn text(piece: &(Format, &str, &str, &str), size: usize) -> Vec<u8> {
    let (_, before, repeated, after) = piece;
    format!("{before}{}{after}", repeated.repeat(size / repeated.len())).into_bytes()
}

/// What the worst pieces of each format take.
fn worst(size: usize, time_max: Duration) {
    let mut worst: BTreeMap<&str, (f64, Duration)> = BTreeMap::new();
    for piece in PIECES {
        let bytes = text(piece, size);
        let what = format!("{:?}, {} of {:?} after {:?}", piece.0, bytes.len(), piece.2, piece.1);
        let cost = measured(piece.0, &bytes, PLAIN).unwrap_or_else(|panic| panic!("{what}: {panic}"));
        let multiple = cost.peak_bytes as f64 / bytes.len() as f64;
        assert!(multiple <= piece.0.memory_multiple() as f64, "{what}: {multiple:.1} times the memory");
        // Once more when it took long: the machine may have been busy with something else.
        let time = if cost.time < time_max {
            cost.time
        } else {
            measured(piece.0, &bytes, PLAIN).expect("as before").time
        };
        assert!(time < time_max, "{what}: {time:?}");
        let of_format = worst.entry(piece.0.ending()).or_default();
        *of_format = (of_format.0.max(multiple), of_format.1.max(time));
    }
    println!("{size} bytes, worst multiple of memory and time: {worst:.1?}");
}

#[test]
fn no_piece_repeated_takes_more_than_its_share() {
    worst(200 << 10, Duration::from_secs(1));
}

/// Sixteen times the size in sixteen times the time, with some room: nothing grows with the square.
#[test]
#[ignore = "takes two minutes"]
fn no_piece_repeated_into_megabytes_takes_more_than_its_share() {
    worst(3200 << 10, Duration::from_secs(16));
}
