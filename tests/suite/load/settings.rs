//! The dive file itself: missing, unknown and wrong keys.

use super::{Scene, holds};

#[test]
fn case_1_no_coordinate_system_is_refused_with_the_way_to_state_it() {
    let text = Scene::new().swap("crs = \"EPSG:32631\"\n", "").errors();
    holds(
        &text,
        &[
            "dive.toml:2: key map.crs: is missing",
            "crs = \"EPSG:4326\" for latitude and longitude",
            "crs = \"local\" for plain metres",
        ],
    );
}

#[test]
fn an_unknown_key_is_refused_with_the_nearest_known_one() {
    let text = Scene::new().swap("range_max_m", "range_maxx_m").errors();
    holds(
        &text,
        &[
            "dive.toml:17: key sonar.range_maxx_m: is not known and would have no effect; did you mean range_max_m?",
            "key sonar.range_max_m: is missing",
        ],
    );
    let text = Scene::new().swap("altitude_m = 10", "altitude_m = 10\nscatter_m = 3").errors();
    holds(&text, &["key sonar.scatter_m: is not known", "scatter_m belongs in [start]"]);
    holds(
        &Scene::new().swap("[vehicle]", "[vehicel]").errors(),
        &["dive.toml:8: the table [vehicel] is not known", "did you mean [vehicle]?"],
    );
}

#[test]
fn syntax_errors_have_their_line() {
    holds(
        &Scene::new().swap("speed_mps = 1.5", "speed_mps 1.5").errors(),
        &["dive.toml:9: \"speed_mps 1.5\""],
    );
}

#[test]
fn wrong_types_ranges_and_choices_name_key_and_text() {
    let text = Scene::new()
        .swap("speed_mps = 1.5", "speed_mps = \"fast\"")
        .swap("heading_bias_deg = 1", "heading_bias_deg = nan")
        .swap("range_error_m = 0.5", "range_error_m = -0.5")
        .swap("\"side-looking\"", "\"sideways\"")
        .swap("fix_size_m = 20", "fix_size_m = 20\ndraws = 2.5\nerror_shapes = [\"uniform\", \"worst\"]")
        .errors();
    holds(
        &text,
        &[
            "dive.toml:9: key vehicle.speed_mps: \"fast\" is not a number; accepted: a number, above 0 to 20 m/s",
            "key dead_reckoning.heading_bias_deg: nan is not a finite number in range",
            "key sonar.range_error_m: -0.5 is out of range; accepted: a number, 0 to 1000 m",
            "key sonar.kind: \"sideways\" is not one of the choices; accepted: \"side-looking\" or \"forward-looking\"",
            "key scoring.draws: 2.5 is not a whole number",
            "key scoring.error_shapes: \"worst\" is not one of the choices",
        ],
    );
}

#[test]
fn case_14_figures_must_say_what_they_are() {
    let text = Scene::new().swap("uncertainty = \"bound\"\n", "").errors();
    holds(&text, &["key map.uncertainty: is missing: a 95 % figure is not a bound", "\"p95\" (95 % radius)"]);
    let scene = Scene::new().swap("\"bound\"", "\"p95\"");
    let dive = scene.dive();
    // 2 m at 95 % times 1.754 (√(−2 ln 10⁻⁴) / √(−2 ln 0.05) = 1.7534, rounded up).
    assert!((dive.landmarks[0].half_width_east_m - 3.508).abs() < 2e-3);
    holds(
        &scene.notices(),
        &[
            "uncertainties are 95 % radii, multiplied by 1.754",
            "probability 99.99 % or more",
            "all 4 together",
        ],
    );
    let sigma = Scene::new().swap("\"bound\"", "\"sigma\"\nsigma_factor = 3");
    assert!((sigma.dive().landmarks[0].half_width_east_m - 6.0).abs() < 5e-3);
    // 1 − exp(−3²/2) = 0.98889 (Rayleigh distribution).
    holds(&sigma.notices(), &["multiplied by 3", "probability 98.88 % or more"]);
}

#[test]
fn keys_without_effect_are_refused() {
    let text = Scene::new()
        .swap("uncertainty = \"bound\"", "uncertainty = \"bound\"\nsigma_factor = 3")
        .swap("altitude_m = 10", "altitude_m = 10\nsector_deg = 90")
        .errors();
    holds(
        &text,
        &[
            "key map.sigma_factor: has no effect without uncertainty = \"sigma\"",
            "key sonar.sector_deg: has no effect with kind = \"side-looking\"",
        ],
    );
    let gpx = r#"<gpx version="1.1" creator="t"><rte><rtept lat="55.9459" lon="3.002"/><rtept lat="55.9459" lon="3.009"/></rte></gpx>"#;
    let text = Scene::new()
        .swap("[\"lines.csv\"]", "[\"r.gpx\"]\ncrs = \"EPSG:4326\"\ndecimal_comma = true")
        .file("r.gpx", gpx)
        .errors();
    holds(
        &text,
        &[
            "key lines.crs: has no effect: GPX and KML are always WGS 84",
            "key lines.decimal_comma: has no effect",
        ],
    );
    let text = Scene::new().swap("side-looking", "forward-looking").errors();
    holds(&text, &["key sonar.sector_deg: is missing", "needs the opening of its sector"]);
}

#[test]
fn case_21_altitude_above_the_longest_slant_range() {
    let text = Scene::new().swap("altitude_m = 10", "altitude_m = 120").errors();
    holds(
        &text,
        &[
            "dive.toml:18: key sonar.altitude_m: altitude 120 m is not below the longest slant range sonar.range_max_m, 100 m",
        ],
    );
    let text = Scene::new().swap("altitude_m = 10", "altitude_m = 90\nnadir_gap_deg = 45").errors();
    holds(&text, &["the nadir gap reaches 90.0 m at this altitude, the sonar only 43.6 m"]);
}

#[test]
fn missing_files_are_all_named() {
    let text = Scene::new().swap("reef.csv", "rief.csv").swap("lines.csv", "lins.csv").errors();
    holds(&text, &["rief.csv: no such file", "lins.csv: no such file", "relative to the dive file"]);
}

#[test]
fn all_problems_of_all_files_come_at_once() {
    let text = Scene::new()
        .swap("speed_mps = 1.5", "speed_mps = -1")
        .file("reef.csv", "id,easting,northing,uncertainty_m\nA,12.x,6200100,2\nB,500300,nan,-1\n")
        .file("lines.csv", "line,easting,northing\nnorth,500000,62000,60\nnorth,,6200060\n")
        .errors();
    holds(
        &text,
        &[
            "key vehicle.speed_mps: -1 is out of range",
            "reef.csv:2: column easting: \"12.x\" is not a number; accepted: metres",
            "reef.csv:3: column northing: \"nan\" is not a finite number",
            "reef.csv:3: column uncertainty_m: \"-1\" is negative",
            "lines.csv:2: the row has 4 fields, the header 3",
            "lines.csv:3: column easting: \"\" is empty",
        ],
    );
}
