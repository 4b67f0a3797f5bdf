//! Hostile content by name, in every format it can stand in; and the smallest inputs that once did harm.

use super::corpus::{seeds, words};
use super::{FORMATS, Format, PLAIN, Way, fault, refused};
use crate::load::holds;

/// Every sound file of a format, read in every role.
fn ways(format: Format) -> Vec<Way> {
    let roles: &[Option<&'static str>] = match format {
        Format::Toml => &[None],
        Format::Gpx => &[None, Some("lines")],
        Format::GeoJson => &[None, Some("landmarks"), Some("search_area")],
        Format::Csv | Format::Kml => &[None, Some("landmarks"), Some("lines")],
    };
    roles.iter().map(|&in_dive| Way { in_dive, ..PLAIN }).collect()
}

#[track_caller]
fn sound(format: Format, bytes: &[u8], what: &str) {
    for way in ways(format) {
        if let Err(fault) = fault(format, bytes, way) {
            panic!("{format:?} {what} ({way:?}): {fault}");
        }
    }
}

#[test]
fn files_cut_off_at_every_byte() {
    for format in FORMATS {
        for whole in seeds(format) {
            for end in 0..whole.len() {
                sound(format, &whole[..end], &format!("cut after {end} bytes"));
            }
        }
    }
}

#[test]
fn a_cut_file_is_called_so_or_ill_formed() {
    for (format, words) in [
        (Format::GeoJson, "is not valid JSON: EOF"),
        (Format::Gpx, "is not valid GPX"),
        (Format::Kml, "the file is cut off"),
    ] {
        let whole = seeds(format)[0];
        let end = whole.iter().rposition(|b| *b == if format == Format::GeoJson { b']' } else { b'<' });
        holds(&refused(format, &whole[..end.expect("a bracket")], PLAIN), &[words]);
    }
}

#[test]
fn control_characters_and_other_encodings_are_refused_with_their_line() {
    for format in FORMATS {
        for whole in seeds(format) {
            for at in (0..whole.len()).step_by(11) {
                let line = 1 + whole[..at].iter().filter(|b| **b == b'\n').count();
                let name = if format == Format::Toml { "dive" } else { "case" };
                let start = format!("{name}.{}:{line}: byte {} ", format.ending(), at + 1);
                for (bytes, words) in [
                    (&b"\0"[..], "(0x00) is a control character, which no text holds; accepted: UTF-8 text"),
                    (b"\x1B", "(0x1B) is a control character"),
                    (b"\xFF", "is not UTF-8 text"),
                    (b"\xED\xA0\x80", "is not UTF-8 text"),
                ] {
                    // Inside a character of several bytes the character before is the one that breaks.
                    let is_boundary = std::str::from_utf8(&whole[..at]).is_ok();
                    // What starts like a mark of another encoding is called by its name.
                    if !is_boundary || at == 0 {
                        continue;
                    }
                    let mut broken = whole.to_vec();
                    broken.splice(at..at, bytes.iter().copied());
                    let text = refused(format, &broken, PLAIN);
                    holds(&text, &[&start, words]);
                }
            }
        }
        let utf16: Vec<u8> = "﻿id,lat".encode_utf16().flat_map(u16::to_le_bytes).collect();
        holds(&refused(format, utf16, PLAIN), &["is UTF-16 text"]);
    }
}

#[test]
fn the_byte_of_an_encoding_error_is_counted_with_the_byte_order_mark() {
    let text = refused(Format::Csv, b"\xEF\xBB\xBFid,lat\n\xFF", PLAIN);
    holds(
        &text,
        &["case.csv:2: byte 11 (0xFF) is not UTF-8 text; accepted: UTF-8 text; save the file as UTF-8"],
    );
}

#[test]
fn control_characters_spelled_as_escapes_do_not_reach_names_or_messages() {
    let json = r#"{"type":"Feature","id":"\u001b[2J\u0000","properties":{"uncertainty_m":1},"geometry":{"type":"Point","coordinates":[3.0016,55.9459]}}"#;
    let text = refused(Format::GeoJson, json, Way { in_dive: Some("landmarks"), ..PLAIN });
    holds(&text, &[r#"feature 1: the name "\u{1b}[2J\u{0}" holds a control character; accepted: printable"#]);
    let toml = include_str!("corpus/dive.toml");
    for (text, key) in
        [("\"Trial\"", "name"), ("\"reef.csv\"", "map.landmarks"), ("\"EPSG:32631\"", "map.crs")]
    {
        let toml = toml.replace(text, "\"a\\u001b[2J\"");
        let words = format!("key {key}: \"a\\u001b[2J\" holds a line end or another control character");
        holds(&refused(Format::Toml, toml, PLAIN), &[&words]);
    }
}

#[test]
fn numbers_of_a_million_digits() {
    let digits = "9".repeat(1_000_000);
    let kml = |x: &str| {
        format!("<kml><Placemark><Point><coordinates>{x},2.0</coordinates></Point></Placemark></kml>")
    };
    for (format, text, words) in [
        (Format::Csv, format!("lat,lon\n{digits},2\n"), "case.csv:2: column lat: \"99999"),
        (Format::Csv, format!("lat,lon\n1.{digits},x\n"), "\"x\" is not a number"),
        (
            Format::GeoJson,
            format!("{{\"type\":\"Point\",\"coordinates\":[{digits},2]}}"),
            "case.geojson:1: character 1000031: is not valid JSON: number out of range",
        ),
        (
            Format::Gpx,
            format!("<gpx version=\"1.1\"><rte><rtept lat=\"{digits}\" lon=\"2\"/></rte></gpx>"),
            "case.gpx:1: rtept 1, attribute lat: \"99999",
        ),
        (Format::Kml, kml(&format!("{digits}.0")), "is not a finite number"),
    ] {
        holds(&refused(format, text, PLAIN), &[words]);
    }
    sound(Format::Csv, format!("lat,lon\n1.{digits},2\n").as_bytes(), "a million decimals");
    sound(Format::Kml, kml(&format!("1.{digits}")).as_bytes(), "a million decimals");
    // A dive file may not be that long, so a number of 200 000 digits has to do.
    for (number, words) in [
        (digits[..200_000].to_owned(), "dive.toml:10: key vehicle.speed_mps: 99999"),
        (format!("{}.5", &digits[..200_000]), "dive.toml:10: key vehicle.speed_mps: 99999"),
        (format!("1.{}e9", &digits[..200_000]), "dive.toml:10: key vehicle.speed_mps: 1.9999"),
    ] {
        let toml = include_str!("corpus/dive.toml").replace("= 1.5", &format!("= {number}"));
        holds(&refused(Format::Toml, toml, PLAIN), &[words]);
    }
}

#[test]
fn exponents_without_end() {
    for exponent in ["1e999999999", "-1e999999999999999999999999", "1e+400"] {
        holds(&refused(Format::Csv, format!("lat,lon\n{exponent},2\n"), PLAIN), &["is not a finite number"]);
        let json = format!("{{\"type\":\"Point\",\"coordinates\":[{exponent},2]}}");
        holds(&refused(Format::GeoJson, json, PLAIN), &["number out of range"]);
        let gpx = format!("<gpx version=\"1.1\"><rte><rtept lat=\"{exponent}\" lon=\"2\"/></rte></gpx>");
        holds(&refused(Format::Gpx, gpx, PLAIN), &["is not a finite number"]);
        let kml = format!(
            "<kml><Placemark><Point><coordinates>{exponent},2.0</coordinates></Point></Placemark></kml>"
        );
        holds(&refused(Format::Kml, kml, PLAIN), &["is not a finite number"]);
        let toml = include_str!("corpus/dive.toml").replace("= 1.5", &format!("= {exponent}"));
        holds(&refused(Format::Toml, toml, PLAIN), &["key vehicle.speed_mps: "]);
    }
    for exponent in ["1e-999999999", "1e-99999999999999999999999"] {
        sound(Format::Csv, format!("lat,lon\n{exponent},2\n").as_bytes(), exponent);
        sound(
            Format::GeoJson,
            format!("{{\"type\":\"Point\",\"coordinates\":[{exponent},2]}}").as_bytes(),
            exponent,
        );
    }
}

#[test]
fn what_stands_twice_is_refused() {
    let json = r#"{"type":"Feature","properties":{"uncertainty_m":1,"uncertainty_m":50},"geometry":null}"#;
    holds(
        &refused(Format::GeoJson, json, PLAIN),
        &["case.geojson:1: character ", "the name \"uncertainty_m\" stands twice in one object"],
    );
    let toml = include_str!("corpus/dive.toml").replace("= 1.5", "= 1.5\nspeed_mps = 2");
    holds(&refused(Format::Toml, toml, PLAIN), &["dive.toml:11: \"speed_mps = 2\": duplicate key"]);
    holds(
        &refused(Format::Csv, "lat,lon,Latitude\n1,2,3\n", PLAIN),
        &["\"lat\" and \"Latitude\" mean the same"],
    );
    let gpx = "<gpx version=\"1.1\"><rte><rtept lat=\"1\" lat=\"2\" lon=\"2\"/></rte></gpx>";
    holds(&refused(Format::Gpx, gpx, PLAIN), &["case.gpx:1: is not well-formed XML: "]);
    let kml = "<kml><Placemark id=\"a\" id=\"b\"><Point><coordinates>1.5,2.5</coordinates></Point></Placemark></kml>";
    holds(&refused(Format::Kml, kml, PLAIN), &["case.kml:1: is not well-formed XML"]);
}

#[test]
fn entities_are_neither_expanded_nor_fetched() {
    let mut laughs = String::from("<!DOCTYPE x [<!ENTITY l0 \"ha\">");
    for i in 1..10 {
        laughs += &format!("<!ENTITY l{i} \"{}\">", format!("&l{};", i - 1).repeat(10));
    }
    laughs += "]>";
    let outside = "<!DOCTYPE x [<!ENTITY l9 SYSTEM \"file:///etc/hostname\">]>";
    let dtd = "<!DOCTYPE x SYSTEM \"file:///etc/hostname\">";
    for declaration in [laughs.as_str(), outside, dtd] {
        for (format, body) in [
            (Format::Gpx, "<gpx version=\"1.1\"><rte><name>&l9;</name></rte></gpx>"),
            (Format::Kml, "<kml><Placemark><name>&l9;</name></Placemark></kml>"),
        ] {
            let text = refused(format, format!("{declaration}{body}"), PLAIN);
            holds(&text, &["has a document type declaration (DTD)", "remove the <!DOCTYPE …>"]);
            // Without its declaration the entity has no meaning.
            let text = refused(format, body, PLAIN);
            assert!(text.contains("is not valid GPX") || text.contains("&l9; is not declared"), "{text}");
        }
    }
}

#[test]
fn a_hundred_thousand_levels() {
    const LEVELS: usize = 100_000;
    for (format, before, open, close, words) in [
        (Format::GeoJson, "", "[", "]", "recursion limit exceeded"),
        (Format::GeoJson, "", "{\"a\":", "}", "recursion limit exceeded"),
        (
            Format::GeoJson,
            "",
            "{\"type\":\"GeometryCollection\",\"geometries\":[",
            "]}",
            "recursion limit exceeded",
        ),
        (Format::Gpx, "<gpx version=\"1.1\">", "<a>", "</a>", "elements are nested deeper than 64"),
        (Format::Kml, "<kml>", "<Folder>", "</Folder>", "elements are nested deeper than 64"),
        (Format::Toml, "a=", "[", "]", "recurs"),
        (Format::Toml, "a=", "{a=", "}", "recurs"),
        (Format::Toml, "", "a.", "", "recurs"),
        (Format::Toml, "[", "a.", "", "recurs"),
    ] {
        let text = format!("{before}{}{}", open.repeat(LEVELS), close.repeat(LEVELS));
        let text = &text[..text.len().min(250_000.max(if format == Format::Toml { 0 } else { usize::MAX }))];
        holds(&refused(format, text, PLAIN), &[words]);
    }
}

/// The reader of XML below the GPX reader copies every open namespace for every element, so depth times count would be the
/// cost: megabytes would take hours (reckoned from the number of copies, not timed).
#[test]
fn gpx_and_kml_limit_levels_attributes_and_namespaces() {
    let many = |piece: &dyn Fn(usize) -> String| (0..65).map(piece).collect::<String>();
    for (format, root, end) in
        [(Format::Gpx, "<gpx version=\"1.1\"", "</gpx>"), (Format::Kml, "<kml", "</kml>")]
    {
        let attributes = many(&|i| format!(" a{i}=\"\""));
        holds(
            &refused(format, format!("{root}{attributes}>{end}"), PLAIN),
            &["an element has more than 64 attributes"],
        );
        let levels = "<a>".repeat(65);
        holds(
            &refused(format, format!("{root}>{levels}{end}"), PLAIN),
            &["elements are nested deeper than 64"],
        );
    }
    let namespaces = many(&|i| format!("<a xmlns:b{i}=\"c\"/>"));
    holds(
        &refused(
            Format::Gpx,
            format!("<gpx version=\"1.1\"><extensions>{namespaces}</extensions></gpx>"),
            PLAIN,
        ),
        &["more than 64 namespaces are declared"],
    );
}

/// Lines were counted from the top for every bad point: twice the file, four times the time.
#[test]
fn gpx_with_a_hundred_thousand_bad_points() {
    let points = "\n<wpt lat=\"x\" lon=\"2\"/>".repeat(100_000);
    let text = refused(Format::Gpx, format!("<gpx version=\"1.1\">{points}</gpx>"), PLAIN);
    holds(&text, &["case.gpx:50: wpt 49, attribute lat: \"x\" is not a number", "and 99951 more problems"]);
}

/// A tag without an end was searched for its end from every other one.
#[test]
fn gpx_tags_without_an_end() {
    let text = format!("<gpx version=\"1.1\">{}", "<wpt".repeat(100_000));
    holds(&refused(Format::Gpx, text, PLAIN), &["case.gpx"]);
}

/// Lines were counted, and words compared, for every fault.
#[test]
fn toml_with_sixty_thousand_faults() {
    // Three faults of each line but the first: no key, no value, and the same key again.
    let text = refused(Format::Toml, "=\n".repeat(60_000), PLAIN);
    holds(&text, &["dive.toml:17: \"=\": ", "and 179949 more problems"]);
    let keys: String = (0..15_000).map(|i| format!("speeed{i}=1\n")).collect();
    holds(&refused(Format::Toml, keys, PLAIN), &["dive.toml:1: key speeed0: ", " more problems"]);
    holds(&refused(Format::Toml, format!("{}=1", "n".repeat(200_000)), PLAIN), &["key nnnnn"]);
}

/// Every bad row carried the whole name of its column: a long header times many rows.
#[test]
fn csv_with_a_long_header_and_many_bad_rows() {
    let header = format!("lat,lon,{}", "n".repeat(1_000_000));
    let text = refused(Format::Csv, format!("{header}\n{}", "x,y,z\n".repeat(10_000)), PLAIN);
    holds(&text, &["more problems"]);
}

#[test]
fn csv_with_a_million_bad_rows_counts_them_all() {
    let text = refused(Format::Csv, format!("lat,lon,line\n{}", "1\n".repeat(1_000_000)), PLAIN);
    // Once as landmarks and once as lines.
    holds(&text, &["case.csv:51: the row has 1 fields, the header 3", "and 1999950 more problems"]);
    let way = Way { skip_bad_rows: true, in_dive: Some("landmarks"), crs: 1, ..PLAIN };
    let rows = format!("easting,northing\n500100,6200100\n{}", "1\n".repeat(100_000));
    let cost = fault(Format::Csv, rows.as_bytes(), way).unwrap();
    assert!(cost.reading.accepted);
    holds(&cost.reading.messages.join("\n"), &["100000 rows with problems left out because skip_bad_rows"]);
}

#[test]
fn csv_with_a_million_columns() {
    let columns: String = (0..1_000_000).map(|i| format!(",c{i}")).collect();
    let text = refused(Format::Csv, format!("lat,lon{columns}\n1,2\n"), PLAIN);
    holds(
        &text,
        &["columns not used: c0, c1, ", " and 999960 more", "the row has 2 fields, the header 1000002"],
    );
}

#[test]
fn csv_of_one_endless_line() {
    one_endless_line(8 << 20);
}

#[test]
#[ignore = "takes a gigabyte of memory"]
fn csv_of_one_line_of_200_megabytes() {
    one_endless_line(200 << 20);
}

fn one_endless_line(size: usize) {
    for piece in ["a", "a,", "\"", "9,9;"] {
        let text = piece.repeat(size / piece.len());
        let start = std::time::Instant::now();
        let cost = super::measured(Format::Csv, text.as_bytes(), PLAIN).unwrap();
        assert!(!cost.reading.accepted);
        holds(&cost.reading.messages.join("\n"), &["case.csv:1: the header \"", "\" names no known column"]);
        let multiple = cost.peak_bytes as f64 / size as f64;
        println!("{} MiB of {piece:?}: {:?}, {multiple:.1} times the memory", size >> 20, start.elapsed());
        assert!(multiple < 8.0, "{multiple}");
    }
    for before in ["lat,lon\n1,", "lat,lon\n1,\""] {
        let text = format!("{before}{}", "9".repeat(size));
        let cost = super::measured(Format::Csv, text.as_bytes(), PLAIN).unwrap();
        assert!(!cost.reading.accepted);
        let multiple = cost.peak_bytes as f64 / size as f64;
        println!("{} MiB in one field: {:?}, {multiple:.1} times the memory", size >> 20, cost.time);
        assert!(multiple < 8.0, "{multiple}");
    }
}

#[test]
fn empty_files() {
    for format in FORMATS {
        for blank in ["", " ", "\n\n\n", "\u{feff}", "\r\n\t "] {
            let text = refused(format, blank, PLAIN);
            holds(&text, &[format.ending()]);
        }
    }
    holds(&refused(Format::Csv, "", PLAIN), &["case.csv: is empty"]);
    holds(&refused(Format::Kml, "", PLAIN), &["has no element kml"]);
    holds(&refused(Format::Gpx, "", PLAIN), &["is not valid GPX"]);
    holds(&refused(Format::GeoJson, "", PLAIN), &["is not valid JSON"]);
}

#[test]
fn a_word_alone_is_no_file() {
    for format in FORMATS {
        for word in words(format) {
            sound(format, word.as_bytes(), word);
        }
    }
}
