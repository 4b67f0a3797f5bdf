//! Landmark files: encodings, separators, uncertainty, identifiers.

use std::fmt::Write;
use std::time::Instant;

use super::{REEF, Scene, holds};

#[test]
fn case_40_byte_order_mark_crlf_semicolons_and_tabs() {
    let plain = Scene::new().dive().landmarks;
    for text in [
        format!("\u{feff}{REEF}"),
        REEF.replace('\n', "\r\n"),
        REEF.replace(',', ";"),
        REEF.replace(',', "\t"),
        format!("\u{feff}{}", REEF.replace(',', ";").replace('\n', "\r\n")),
        REEF.replace('\n', "\n\n"),
        format!("{REEF},,,\n"),
        REEF.replace("id,easting,northing", "\"id\",\"Easting\",\"NORTHING\""),
    ] {
        assert_eq!(Scene::new().file("reef.csv", &text).dive().landmarks, plain, "{text:?}");
    }
}

#[test]
fn case_40_a_comma_in_a_number_is_never_guessed() {
    let text = REEF.replace(',', ";").replace("500100", "500,100");
    holds(
        &Scene::new().file("reef.csv", &text).errors(),
        &[
            "reef.csv:2: column easting: \"500,100\" is not a number; a comma is not read as a decimal sign",
            "if it is one, set decimal_comma = true",
        ],
    );
    let text = text.replace("500,100", "500100,25");
    let dive = Scene::new().file("reef.csv", &text).swap("[lines]", "decimal_comma = true\n[lines]").dive();
    assert_eq!(dive.landmarks[0].position.east_m, 500100.25);
    holds(
        &Scene::new()
            .file("reef.csv", text.replace("500100,25", "500.100,25"))
            .swap("[lines]", "decimal_comma = true\n[lines]")
            .errors(),
        &["\"500.100,25\" has a point although decimal_comma = true is set"],
    );
}

#[test]
fn lines_are_counted_right_after_blank_lines_and_crlf() {
    let text = "id,easting,northing,uncertainty_m\r\n\r\nA,500100,6200100,2\r\n\r\n\r\nB,x,6200050,2\r\n";
    holds(
        &Scene::new().file("reef.csv", text).errors(),
        &["reef.csv:6: column easting: \"x\" is not a number"],
    );
}

#[test]
fn not_a_number_and_infinity_are_refused() {
    for (word, why) in
        [("nan", "is not a finite number"), ("inf", "is not a finite number"), ("1e999", "is not a finite")]
    {
        let text = Scene::new().file("reef.csv", REEF.replace("500300", word)).errors();
        holds(&text, &[&format!("reef.csv:3: column easting: \"{word}\" {why}")]);
    }
}

#[test]
fn text_that_is_not_utf_8_has_its_byte_and_line() {
    let mut bytes = REEF.as_bytes().to_vec();
    bytes[36] = 0xE9;
    holds(
        &Scene::new().file("reef.csv", &bytes).errors(),
        &["reef.csv:2: byte 37 (0xE9) is not UTF-8 text; accepted: UTF-8 text; save the file as UTF-8"],
    );
    holds(&Scene::new().file("reef.csv", b"\xFF\xFEi\0d\0").errors(), &["reef.csv: is UTF-16 text"]);
}

#[test]
fn degrees_and_minutes_are_read_with_their_sign() {
    let text = "id;lat;lon;uncertainty_m\nA;55°56'45.24\"N;3°00'06\"E;2\nB;55.9454;3.0050;2\n";
    let dive = Scene::new()
        .file("reef.csv", text)
        .swap("EPSG:32631", "EPSG:4326")
        .swap("[lines]\n", "[lines]\ncrs = \"EPSG:32631\"\n");
    let dive = dive.dive();
    let geo = dive.frame.to_geo(dive.landmarks[0].position).unwrap();
    assert!((geo.lat_deg - 55.9459).abs() < 1e-9 && (geo.lon_deg - 3.0016666667).abs() < 1e-9, "{geo:?}");
    assert_eq!(dive.frame.epsg(), Some(32631));
}

#[test]
fn case_8_no_landmarks_is_a_valid_answer() {
    let scene = Scene::new().file("reef.csv", "id,easting,northing,uncertainty_m\n");
    assert!(scene.dive().landmarks.is_empty());
    holds(&scene.notices(), &["warning: reef.csv: no landmarks: the vehicle will never get a fix"]);
}

#[test]
fn case_9_one_or_two_landmarks_say_what_can_be_located() {
    let head = "id,easting,northing,uncertainty_m\nA,500100,6200100,2\n";
    holds(
        &Scene::new().file("reef.csv", head).notices(),
        &["warning: reef.csv: one landmark: with a good heading"],
    );
    let two = format!("{head}B,500300,6200050,2\n");
    holds(&Scene::new().file("reef.csv", two).notices(), &["two landmarks: one detection leaves two places"]);
}

#[test]
fn case_10_duplicate_identifiers_list_their_rows() {
    let text = Scene::new().file("reef.csv", REEF.replace("\nC,", "\nA,").replace("\nD,", "\nA,")).errors();
    holds(&text, &["reef.csv:2: the identifier \"A\" stands 3 times: line 2, line 4, line 5"]);
}

#[test]
fn case_11_coincident_and_overlapping_landmarks_are_kept_and_counted() {
    let scene = Scene::new()
        .file("reef.csv", format!("{REEF}E,500100,6200100,1\nF,500303,6200050,2\nG,500600,6200000,1\n"));
    assert_eq!(scene.dive().landmarks.len(), 7);
    holds(
        &scene.notices(),
        &[
            "warning: reef.csv: 1 landmark at exactly the same place as another",
            "warning: reef.csv: 4 landmarks whose box overlaps another's",
        ],
    );
}

#[test]
fn case_12_missing_uncertainty_is_refused_or_defaulted_and_counted() {
    let without = REEF.replace("6200050,2", "6200050,");
    let text = Scene::new().file("reef.csv", &without).errors();
    holds(&text, &["1 of 4 landmarks have no uncertainty: line 3", "uncertainty_m = … under [map]"]);
    let scene = Scene::new().file("reef.csv", &without).swap("[lines]", "uncertainty_m = 7\n[lines]");
    assert!((scene.dive().landmarks[1].half_width_east_m - 7.0).abs() < 1e-2);
    holds(&scene.notices(), &["1 landmark without own uncertainty, set to 7 m"]);
}

#[test]
fn case_13_zero_uncertainty_warns_and_the_others_are_refused() {
    let scene = Scene::new().file("reef.csv", REEF.replace("6200050,2", "6200050,0"));
    holds(&scene.notices(), &["warning: reef.csv: 1 landmark with zero uncertainty", "line 3"]);
    for (bad, why) in
        [("-2", "\"-2\" is negative"), ("nan", "\"nan\" is not a finite number"), ("inf", "not a finite")]
    {
        let text =
            Scene::new().file("reef.csv", REEF.replace("6200050,2", &format!("6200050,{bad}"))).errors();
        holds(&text, &["reef.csv:3: column uncertainty_m: ", why]);
    }
}

#[test]
fn axes_may_have_their_own_uncertainty() {
    let text = "id,easting,northing,uncertainty_east_m,uncertainty_north_m\nA,500100,6200100,2,5\nB,500300,6200050,1,1\n";
    let dive = Scene::new().file("reef.csv", text).swap("EPSG:32631", "local").dive();
    assert_eq!((dive.landmarks[0].half_width_east_m, dive.landmarks[0].half_width_north_m), (2.0, 5.0));
    let text = text.replace(",uncertainty_north_m", ",remark");
    holds(
        &Scene::new().file("reef.csv", text).errors(),
        &["the uncertainty columns do not fit together: uncertainty_east_m"],
    );
}

#[test]
fn extra_columns_are_listed_and_left_alone() {
    let text = REEF
        .replace("uncertainty_m", "uncertainty_m,remark")
        .replace(",2\n", ",2,x\n")
        .replace(",3\n", ",3,\n");
    holds(
        &Scene::new().file("reef.csv", text).notices(),
        &["information: reef.csv: columns not used: remark"],
    );
}

#[test]
fn case_37_one_bad_row_among_100_000_is_named_quickly() {
    let mut text = String::from("id,easting,northing,uncertainty_m\n");
    for i in 0..100_000 {
        let (e, n) = (500_000 + 7 * (i % 316), 6_200_000 + 7 * (i / 316));
        let n = if i == 77_776 { "62O0000".into() } else { n.to_string() };
        writeln!(text, "L{i},{e},{n},2").unwrap();
    }
    let scene = Scene::new().file("reef.csv", &text);
    let start = Instant::now();
    let errors = scene.errors();
    // The check is against quadratic behaviour, which would take minutes; the limit leaves room for a busy machine.
    assert!(start.elapsed().as_secs() < 20, "{:?}", start.elapsed());
    assert_eq!(
        errors,
        "reef.csv:77778: column northing: \"62O0000\" is not a number; accepted: metres, such as 512300.5"
    );
    let skipping = scene.swap("[lines]", "skip_bad_rows = true\n[lines]");
    let start = Instant::now();
    assert_eq!(skipping.dive().landmarks.len(), 99_999);
    assert!(start.elapsed().as_secs() < 20, "{:?}", start.elapsed());
    holds(
        &skipping.notices(),
        &["warning: reef.csv: 1 row with problems left out", "reef.csv:77778: column northing"],
    );
}

#[test]
fn many_problems_are_cut_in_print_but_counted() {
    let mut text = String::from("id,easting,northing,uncertainty_m\n");
    for i in 0..200 {
        writeln!(text, "L{i},x,6200000,2").unwrap();
    }
    let errors = Scene::new().file("reef.csv", &text).errors();
    assert_eq!(errors.lines().count(), 51);
    holds(&errors, &["reef.csv: and 150 more problems"]);
}

#[test]
fn geojson_points_and_multipoints() {
    let text = r#"{"type":"FeatureCollection","features":[
        {"type":"Feature","properties":{"name":"P","uncertainty_m":3},"geometry":{"type":"Point","coordinates":[3.0016,55.9459]}},
        {"type":"Feature","id":9,"properties":{"uncertainty_east_m":1,"uncertainty_north_m":2},
         "geometry":{"type":"MultiPoint","coordinates":[[3.004,55.9459],[3.006,55.9458]]}}]}"#;
    let scene = Scene::new()
        .swap("reef.csv", "reef.geojson")
        .swap("EPSG:32631", "EPSG:4326")
        .swap("[lines]\n", "[lines]\ncrs = \"EPSG:32631\"\n");
    let dive = scene.file("reef.geojson", text).dive();
    let ids: Vec<&str> = dive.landmarks.iter().map(|l| l.id.as_str()).collect();
    assert_eq!(ids, ["P", "9-1", "9-2"]);
    assert!((dive.landmarks[2].half_width_north_m - 2.0).abs() < 1e-2);
    let bad = text
        .replace("[3.0016,55.9459]", "[3.0016]")
        .replace("\"uncertainty_east_m\":1", "\"uncertainty_east_m\":-1");
    let errors = Scene::new()
        .swap("reef.csv", "reef.geojson")
        .swap("EPSG:32631", "EPSG:4326")
        .swap("[lines]\n", "[lines]\ncrs = \"EPSG:32631\"\n")
        .file("reef.geojson", bad)
        .errors();
    holds(
        &errors,
        &[
            "reef.geojson: feature 1: ",
            "reef.geojson: feature 2: property uncertainty_east_m: -1 is negative",
        ],
    );
    let errors =
        Scene::new().swap("reef.csv", "reef.geojson").file("reef.geojson", "{\"type\":\n nope}").errors();
    holds(&errors, &["reef.geojson:2: character", "is not valid JSON"]);
}

#[test]
fn an_unclosed_quotation_mark_does_not_swallow_rows() {
    let text = REEF
        .replace("uncertainty_m", "uncertainty_m,remark")
        .replace(",2\n", ",2,x\n")
        .replace(",3\n", ",3,y\n");
    let text = text.replacen(",x\n", ",\"x\n", 1);
    holds(
        &Scene::new().file("reef.csv", text).errors(),
        &["reef.csv:2: a field runs over more than one line"],
    );
}

#[test]
fn bad_rows_do_not_hide_what_is_wrong_with_the_others() {
    let text = REEF.replace("500300", "5003o0").replace("D,500700,6200080,2", "A,500700,6200080,");
    holds(
        &Scene::new().file("reef.csv", text).errors(),
        &[
            "reef.csv:3: column easting: \"5003o0\" is not a number",
            "reef.csv:2: the identifier \"A\" stands 2 times: line 2, line 5",
            "1 of 3 landmarks have no uncertainty: line 5",
        ],
    );
}
