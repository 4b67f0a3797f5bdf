//! Same input, same bytes, whatever the number of threads.

use crate::support::program::{Workplace, project};

fn compare(command: &str, extra: &[&str], files: &[&str]) {
    let place = Workplace::new();
    let dive = project("demo-data/dive.toml");
    let run = |threads: &str| {
        let mut arguments =
            vec![command, dive.to_str().expect("a plain path"), "--threads", threads, "--out"];
        arguments.push(threads);
        arguments.extend(extra);
        crate::support::program::Ran::of(place.command(arguments).output().expect("the program starts"))
            .expect(0)
    };
    let (one, two) = (run("1"), run("2"));
    assert_eq!(one.stdout, two.stdout);
    assert_eq!(place.names("1"), files);
    assert_eq!(place.names("2"), files);
    for file in files {
        assert!(
            place.bytes(format!("1/{file}")) == place.bytes(format!("2/{file}")),
            "{file} differs between one thread and two"
        );
    }
}

#[test]
fn case_32_scores_of_the_demo_do_not_depend_on_threads() {
    compare(
        "lines",
        &[],
        &["lines.csv", "lines.geojson", "lines.json", "lines.png", "profiles.png", "recommended.gpx"],
    );
}

#[test]
fn a_trace_of_the_demo_does_not_depend_on_threads() {
    compare("trace", &[], &["trace.json", "trace.png"]);
}

#[test]
fn an_area_map_of_the_demo_does_not_depend_on_threads() {
    let files = ["area-best.png", "area-share.png", "area-worst.png", "area.csv", "area.json", "area.tif"];
    compare("area", &["--cell-m", "60", "--headings", "8"], &files);
}

#[test]
fn look_alikes_of_the_demo_do_not_depend_on_threads() {
    let files = [
        "lookalikes-panels.png",
        "lookalikes.csv",
        "lookalikes.geojson",
        "lookalikes.json",
        "lookalikes.png",
    ];
    compare("lookalikes", &[], &files);
}
