//! The demo data: equal to what the generator makes, and of the make-up that its description states.

use std::path::Path;

use proj4rs::Proj;
use proj4rs::adaptors::transform_xy;

use crate::support::demo;

/// Set to 1 to write `demo-data/` anew instead of failing.
const WRITE: &str = "FIXABILITY_WRITE_DEMO";

#[test]
fn demo_files_equal_the_generator_output() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-data");
    for (name, text) in demo::files() {
        let path = folder.join(name);
        if std::env::var(WRITE).is_ok_and(|value| value == "1") {
            std::fs::create_dir_all(&folder).expect("the demo folder can be made");
            std::fs::write(&path, &text).expect("the demo file can be written");
        }
        let on_disk = std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
        assert!(on_disk == text, "{} differs from the generator; {WRITE}=1 writes it anew", path.display());
    }
}

/// Name or identifier, then easting and northing in UTM zone 31N, then the fields that follow.
fn projected_rows(file: &str) -> Vec<(String, [f64; 2], Vec<String>)> {
    let (_, text) = demo::files().into_iter().find(|(name, _)| *name == file).expect("the file is generated");
    let system = |code| Proj::from_epsg_code(code).expect("the system is in the table");
    let (geographic, grid) = (system(4326), system(32631));
    text.lines()
        .skip(1)
        .map(|row| {
            let fields: Vec<String> = row.split(',').map(str::to_owned).collect();
            let radians = |i: usize| fields[i].parse::<f64>().expect("a number").to_radians();
            let (east, north) =
                transform_xy(&geographic, &grid, radians(2), radians(1)).expect("inside the zone");
            (fields[0].clone(), [east, north], fields[3..].to_vec())
        })
        .collect()
}

#[test]
fn demo_survey_is_what_its_description_says() {
    let landmarks = projected_rows("landmarks.csv");
    assert_eq!(landmarks.len(), 430);
    let mut ids: Vec<&str> = landmarks.iter().map(|(id, ..)| id.as_str()).collect();
    ids.sort_unstable();
    ids.dedup();
    assert_eq!(ids.len(), landmarks.len(), "identifiers are unique");
    let half_width = |i: usize| landmarks[i].2[0].parse::<f64>().unwrap();
    for (i, (id, [east, north], _)) in landmarks.iter().enumerate() {
        assert!(
            (512_000.0..=514_600.0).contains(east) && (6_171_000.0..=6_173_000.0).contains(north),
            "{id}"
        );
        assert!((1.0..=3.0).contains(&half_width(i)), "{id}");
        for (j, (other, [e, n], _)) in landmarks.iter().enumerate().take(i) {
            let both = half_width(i) + half_width(j);
            assert!((e - east).abs() > both || (n - north).abs() > both, "boxes of {id} and {other} overlap");
        }
    }
    // Sparse and crowded ground: squares of 200 m hold from none to more than eight landmarks.
    let mut held = [0usize; 130];
    for (_, [east, north], _) in &landmarks {
        held[((east - 512_000.0) / 200.0) as usize + 13 * ((north - 6_171_000.0) / 200.0) as usize] += 1;
    }
    assert!(held.iter().filter(|n| **n == 0).count() >= 10, "{held:?}");
    assert!(held.iter().filter(|n| **n > 8).count() >= 3, "{held:?}");
}

#[test]
fn attractive_line_meets_most_landmarks_and_most_of_those_repeat() {
    let landmarks = projected_rows("landmarks.csv");
    let waypoints = projected_rows("lines.csv");
    // Horizontal ranges that the sonar of the dive file sees: 12 tan 30° to √(75² − 12²).
    let seen = 6.93..74.03;
    let mut met: Vec<(usize, usize, &str)> = Vec::new();
    for name in ["A", "B", "C", "D"] {
        let points: Vec<[f64; 2]> = waypoints.iter().filter(|w| w.0 == name).map(|w| w.1).collect();
        let (mut length, mut all, mut regular) = (0.0, 0, 0);
        for leg in points.windows(2) {
            let [e, n] = [leg[1][0] - leg[0][0], leg[1][1] - leg[0][1]];
            let leg_length = libm::hypot(e, n);
            length += leg_length;
            for (id, [east, north], _) in &landmarks {
                let [x, y] = [east - leg[0][0], north - leg[0][1]];
                let (along, across) = ((x * e + y * n) / leg_length, (x * n - y * e) / leg_length);
                if (0.0..leg_length).contains(&along) && seen.contains(&across.abs()) {
                    all += 1;
                    regular += usize::from(!id.starts_with('R'));
                }
            }
        }
        assert!((2200.0..=2600.0).contains(&length), "line {name} is {length} m long");
        met.push((all, regular, name));
    }
    met.sort_unstable();
    println!("landmarks abeam in range, of them in a regular pattern: {met:?}");
    let (all, regular, name) = met[3];
    assert_eq!(name, "C");
    assert!(2 * regular > all);
}
