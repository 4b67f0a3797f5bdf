//! Sound files to start from, and the words of each format.

use std::collections::BTreeMap;
use std::path::PathBuf;

use super::{Format, Way};

const DIVE: &str = include_str!("corpus/dive.toml");

/// The files that the sound dive names.
pub fn files_of_the_dive() -> BTreeMap<PathBuf, Vec<u8>> {
    BTreeMap::from([
        ("reef.csv".into(), include_bytes!("corpus/reef.csv").to_vec()),
        ("lines.csv".into(), include_bytes!("corpus/lines.csv").to_vec()),
    ])
}

/// The sound dive with one of its files replaced by `name`.
pub fn dive_with(role: &str, name: &str, way: Way) -> String {
    let crs = ["EPSG:4326", "EPSG:32631", "local"][way.crs % 3];
    let comma = if way.decimal_comma { "decimal_comma = true\n" } else { "" };
    match role {
        "landmarks" => DIVE
            .replace("\"reef.csv\"", &format!("\"{name}\"\n{comma}skip_bad_rows = {}", way.skip_bad_rows))
            .replace("crs = \"EPSG:32631\"", &format!("crs = \"{crs}\""))
            .replace("[lines]", "[lines]\ncrs = \"EPSG:32631\""),
        "lines" => DIVE.replace("[\"lines.csv\"]", &format!("[\"{name}\"]\n{comma}")),
        "search_area" => DIVE.replace("[start]", &format!("[start]\nsearch_area = \"{name}\"")),
        "complete" => DIVE
            .replace("[map]", &format!("[map]\ncomplete_inside = \"{name}\""))
            .replace("[budget]", "[budget]\nnothing_seen = true"),
        _ => panic!("no role {role}"),
    }
}

/// Sound files of a format.
pub fn seeds(format: Format) -> Vec<&'static [u8]> {
    match format {
        Format::Csv => vec![
            include_bytes!("corpus/reef.csv"),
            include_bytes!("corpus/lines.csv"),
            include_bytes!("corpus/degrees.csv"),
            include_bytes!("corpus/commas.csv"),
            include_bytes!("corpus/order.tsv"),
        ],
        Format::GeoJson => vec![
            include_bytes!("corpus/points.geojson"),
            include_bytes!("corpus/lines.geojson"),
            include_bytes!("corpus/area.geojson"),
        ],
        Format::Gpx => vec![include_bytes!("corpus/routes.gpx"), include_bytes!("corpus/old.gpx")],
        Format::Kml => vec![include_bytes!("corpus/points.kml"), include_bytes!("corpus/lines.kml")],
        Format::Toml => vec![include_bytes!("corpus/dive.toml"), include_bytes!("corpus/full.toml")],
    }
}

/// Words that mean something in a format.
pub fn words(format: Format) -> &'static [&'static str] {
    match format {
        Format::Csv => &[
            ",", ";", "\t", "\"", "\"\"", "\n", "\r\n", "\r", "id", "lat", "lon", "easting", "northing", "line",
            "order", "uncertainty_m", "uncertainty_east_m", "uncertainty_north_m", "surveyed", "2024-02-30",
            "2024-02-29", "°", "'", "N", "W", "−", "1,5", "1.5", " ", "\n\n", "nan", "inf", "0x10",
        ],
        Format::GeoJson => &[
            "{", "}", "[", "]", ",", ":", "\"", "null", "true", "\\u0000", "\\ud800", "\\u001b[2J", "\"type\"",
            "\"Feature\"", "\"FeatureCollection\"", "\"GeometryCollection\"", "\"geometries\"", "\"geometry\"",
            "\"coordinates\"", "\"properties\"", "\"Point\"", "\"MultiPoint\"", "\"LineString\"",
            "\"MultiLineString\"", "\"Polygon\"", "\"features\"", "\"crs\"", "\"name\"", "\"id\"", "\"bbox\"",
            "\"EPSG:32631\"", "\"urn:ogc:def:crs:OGC:1.3:CRS84\"", "[[[", "]]]", "{\"a\":", "\"uncertainty_m\"",
        ],
        Format::Gpx => &[
            "<", ">", "/>", "</", "\"", "'", "=", "&", ";", "&amp;", "&#0;", "&#27;", "&#x110000;", "&x;", "<!--",
            "-->", "<![CDATA[", "]]>", "<?xml version=\"1.0\"?>", "<!DOCTYPE a [<!ENTITY x \"y\">]>", "<rte>",
            "</rte>", "<rtept lat=\"1\" lon=\"2\">", "</rtept>", "<trk>", "</trk>", "<trkseg>", "</trkseg>",
            "<trkpt lat=\"1\" lon=\"2\"/>", "<wpt lat=\"1\" lon=\"2\"/>", "<name>", "</name>", "<time>", "</time>",
            "<extensions>", "</extensions>", "<ele>", "</ele>", "<bounds/>", "<link href=\"x\"/>", "<fix>3d</fix>",
            "lat=\"", "lon=\"", " xmlns:a=\"b\"", "version=\"1.0\"", "version=\"1.1\"", "2016-03-27T18:57:55Z",
            "<metadata>", "</metadata>", "<copyright author=\"a\"/>", "<author>", "</author>", "<email/>",
        ],
        Format::Kml => &[
            "<", ">", "/>", "</", "\"", "'", "=", "&", ";", "&amp;", "&#0;", "&#27;", "&#x110000;", "&x;", "<!--",
            "-->", "<![CDATA[", "]]>", "<?xml version=\"1.0\"?>", "<!DOCTYPE a [<!ENTITY x \"y\">]>",
            "<Placemark>", "</Placemark>", "<Point>", "</Point>", "<LineString>", "</LineString>",
            "<coordinates>", "</coordinates>", "<MultiGeometry>", "</MultiGeometry>", "<Polygon>", "</Polygon>",
            "<name>", "</name>", "<ExtendedData>", "</ExtendedData>", "<Data name=\"uncertainty_m\">", "</Data>",
            "<value>", "</value>", "<SchemaData>", "<SimpleData name=\"id\">", "</SimpleData>", "<Folder>",
            "</Folder>", "<NetworkLink/>", " id=\"x\"", "1,2", "1,2,3", " ,", ", ", "\n",
        ],
        Format::Toml => &[
            "[", "]", "[[", "]]", "{", "}", "=", "\"", "'", "\"\"\"", "'''", "#", ".", ",", "\n", "\r\n", "true",
            "false", "nan", "inf", "-inf", "0x7F", "1_000", "1979-05-27T07:32:00Z", "2024-02-30", "\\u0000",
            "\\U00110000", "\\u001b", "a.b.c", "map", "lines", "vehicle", "sonar", "budget", "scoring", "crs",
            "[map]", "[sonar]", "../reef.csv", "/dev/zero", "EPSG:4326", "EPSG:99999", "local", "files = []",
        ],
    }
}

/// Numbers that have broken programs.
pub const NUMBERS: &[&str] = &[
    "0", "-0", "1", "-1", "90", "90.0000001", "180", "-180", "360", "1e308", "1e309", "-1e309", "1e-400",
    "1e999999999", "1e-999999999", "1e99999999999999999999", "9223372036854775807", "9223372036854775808",
    "18446744073709551616", "4.9e-324", "0.1e1", ".5", "5.", "+5", "--5", "1e", "e1", "1e+", "00012", "1.2.3",
    "1,234", "0x1p3", "NaN", "Infinity", "1_0", "１２", "٣", "1e5", "99999999", "1e7", "2147483648",
];
