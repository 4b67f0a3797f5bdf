//! Exporters and the writing of files.

#![allow(clippy::unwrap_used, reason = "helpers of tests may panic as tests do")]

use std::fs;
use std::path::Path;

use fixability::export::{self, ExportError, Exporter, LinesCsv, LinesJson, TraceJson};
use fixability::report::{Estimate, LinesReport};

use crate::reports;

fn csv_rows(report: &LinesReport) -> (Vec<String>, Vec<csv::StringRecord>) {
    let bytes = LinesCsv.bytes(report).unwrap();
    let mut reader = csv::Reader::from_reader(bytes.as_slice());
    let header = reader.headers().unwrap().iter().map(str::to_owned).collect();
    (header, reader.records().map(Result::unwrap).collect())
}

#[test]
fn csv_reads_back_as_the_same_numbers() {
    let report = reports::random_scene(11);
    let (header, rows) = csv_rows(&report);
    let column =
        |name: &str| header.iter().position(|h| h == name).unwrap_or_else(|| panic!("column {name}"));
    let field = |row: &csv::StringRecord, name: &str| {
        let text = &row[column(name)];
        (!text.is_empty()).then(|| text.parse::<f64>().unwrap())
    };
    let segments: Vec<_> =
        report.lines.iter().flat_map(|line| line.segments.iter().map(move |s| (line, s))).collect();
    assert_eq!(rows.len(), segments.len());
    let mut missing = 0;
    for (row, (line, segment)) in rows.iter().zip(segments) {
        assert_eq!(&row[column("line")], line.name);
        assert_eq!(field(row, "line_rank"), Some(line.rank as f64));
        assert_eq!(field(row, "segment"), Some(segment.number as f64));
        assert_eq!(field(row, "start_m"), Some(segment.start_m));
        assert_eq!(field(row, "end_m"), Some(segment.end_m));
        assert_eq!(field(row, "start_easting_m"), Some(segment.path[0].east_m));
        assert_eq!(field(row, "start_northing_m"), Some(segment.path[0].north_m));
        assert_eq!(field(row, "end_easting_m"), segment.path.last().map(|p| p.east_m));
        assert_eq!(field(row, "end_northing_m"), segment.path.last().map(|p| p.north_m));
        let fix = &segment.estimated;
        let check = |name: &str, estimate: Estimate| {
            assert_eq!(field(row, name), estimate.value, "{name}");
            assert_eq!(field(row, &with_end(name, "low")), estimate.low);
            assert_eq!(field(row, &with_end(name, "high")), estimate.high);
        };
        check("estimated_median_fix_m", fix.median_m);
        check("estimated_p95_fix_m", fix.p95_m);
        check("estimated_within_required_share", fix.within_required_share);
        check("estimated_no_fix_share", fix.no_fix_share);
        assert_eq!(field(row, "undecided_share"), Some(fix.undecided_share));
        missing += usize::from(fix.p95_m.value.is_none());
    }
    assert!(missing > 0, "the scene has segments without a value");
}

/// `a_fix_m` and `low` make `a_fix_low_m`.
fn with_end(name: &str, end: &str) -> String {
    match name.strip_suffix("_m") {
        Some(stem) => format!("{stem}_{end}_m"),
        None => format!("{name}_{end}"),
    }
}

#[test]
fn guaranteed_columns_exist_only_when_computed() {
    let report = reports::four_lines();
    let (header, _) = csv_rows(&report);
    assert!(!header.iter().any(|name| name.contains("guaranteed")));
    assert!(!String::from_utf8(LinesJson.bytes(&report).unwrap()).unwrap().contains("guaranteed"));

    let (header, rows) = csv_rows(&reports::guaranteed(report));
    let distance = header.iter().position(|name| name == "guaranteed_fix_m").unwrap();
    let reason = header.iter().position(|name| name == "no_guaranteed_fix_reason").unwrap();
    assert!(rows.iter().any(|row| !row[distance].is_empty()));
    for row in rows {
        assert_eq!(row[distance].is_empty(), row[reason] == *"look-alike ground, evenly spaced");
    }
}

#[test]
fn json_is_whole_and_ends_with_a_newline() {
    let bytes = LinesJson.bytes(&reports::four_lines()).unwrap();
    assert_eq!(bytes.last(), Some(&b'\n'));
    let value: serde_json::Value = serde_json::from_slice(&bytes).unwrap();
    assert_eq!(value["schema"], "fixability.lines");
    assert_eq!(value["schema_version"], 1);
    assert_eq!(value["seed"], 20_261_201);
    assert_eq!(value["inputs"][0]["sha256"], "4f".repeat(32));
    assert_eq!(value["parameters"]["fix_size_m"], 25.0);
    assert_eq!(value["lines"].as_array().unwrap().len(), 4);
    assert!(value["lines"][2]["segments"][30]["estimated"]["p95_m"]["value"].is_null());
    // Positions of contacts may be sensitive.
    assert!(value.get("landmarks").is_none());

    let bytes = TraceJson.bytes(&reports::trace(3)).unwrap();
    assert_eq!(bytes.last(), Some(&b'\n'));
    let value: serde_json::Value = serde_json::from_slice(&bytes).unwrap();
    assert_eq!(value["schema"], "fixability.trace");
    assert_eq!(value["events"].as_array().unwrap().len(), 3);
    assert_eq!(value["events"][0]["hindsight"]["identified"], "R000");
    assert_eq!(value["hindsight"]["corridor"][0]["polygons"][0].as_array().unwrap().len(), 8);
    assert!(value.get("landmarks").is_none());
}

#[test]
fn tables_are_ranked_and_plain() {
    let mut report = reports::four_lines();
    let table = export::lines_table(&report);
    assert!(table.is_ascii(), "{table}");
    let place = |name: &str| table.find(&format!("| {name} ")).unwrap_or_else(|| panic!("{name} in {table}"));
    assert!(place("B") < place("A") && place("A") < place("D") && place("D") < place("C"));
    assert!(table.contains("within 450 m") && table.contains("seed 20261201"));
    assert!(!table.contains("guaranteed"));
    report.lines[0].name = "A\u{1b}[31m\nB".to_owned();
    assert!(!export::lines_table(&report).contains('\u{1b}'));
    assert!(export::lines_table(&reports::guaranteed(report)).contains("guaranteed within 450 m"));

    let table = export::trace_table(&reports::trace(4));
    assert!(table.is_ascii() && table.contains("no fix before the line ends"), "{table}");
    assert!(export::trace_table(&reports::trace(9)).contains("fix after"));
    for words in ["| R001 ", "| R002 or R003 ", "| one of 40 ", "lost at 1 place, 40.0 m across"] {
        assert!(table.contains(words), "{words} in {table}");
    }
}

fn names(dir: &Path) -> Vec<String> {
    let mut names: Vec<String> =
        fs::read_dir(dir).unwrap().map(|entry| entry.unwrap().file_name().into_string().unwrap()).collect();
    names.sort();
    names
}

fn files(text: &str) -> Vec<(&'static str, Vec<u8>)> {
    vec![("lines.csv", text.as_bytes().to_vec()), ("lines.json", text.as_bytes().to_vec())]
}

#[test]
fn files_are_written_into_a_new_folder() {
    let dir = tempfile::tempdir().unwrap();
    let out = dir.path().join("a").join("b");
    export::prepare(&out, &["lines.csv", "lines.json"], false).unwrap();
    assert!(names(dir.path()).is_empty(), "the check leaves nothing behind");
    export::write_all(&out, &files("one"), false).unwrap();
    assert_eq!(names(&out), ["lines.csv", "lines.json"]);
    assert_eq!(fs::read_to_string(out.join("lines.csv")).unwrap(), "one");
}

#[test]
fn existing_files_are_kept_without_force() {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("lines.json"), "old").unwrap();
    let names_wanted = ["lines.csv", "lines.json"];
    for error in [
        export::prepare(dir.path(), &names_wanted, false).unwrap_err(),
        export::write_all(dir.path(), &files("new"), false).unwrap_err(),
    ] {
        let text = error.to_string();
        assert!(text.contains("lines.json") && !text.contains("lines.csv"), "{text}");
        assert!(text.contains("--force") && text.contains(&dir.path().display().to_string()), "{text}");
    }
    assert_eq!(names(dir.path()), ["lines.json"]);
    assert_eq!(fs::read_to_string(dir.path().join("lines.json")).unwrap(), "old");

    export::prepare(dir.path(), &names_wanted, true).unwrap();
    export::write_all(dir.path(), &files("new"), true).unwrap();
    assert_eq!(names(dir.path()), names_wanted);
    assert_eq!(fs::read_to_string(dir.path().join("lines.json")).unwrap(), "new");
}

#[test]
fn failed_write_leaves_no_temporary_files() {
    let dir = tempfile::tempdir().unwrap();
    // A folder stands where a file should go, so the last renaming fails.
    fs::create_dir(dir.path().join("lines.json")).unwrap();
    let error = export::write_all(dir.path(), &files("new"), true).unwrap_err();
    assert!(matches!(error, ExportError::Io { .. }), "{error}");
    assert!(error.to_string().contains("lines.json"), "{error}");
    assert!(!names(dir.path()).iter().any(|name| name.starts_with('.')), "{:?}", names(dir.path()));
}

#[test]
fn path_through_a_file_is_explained() {
    let dir = tempfile::tempdir().unwrap();
    let file = dir.path().join("file");
    fs::write(&file, "").unwrap();
    for out in [file.clone(), file.join("below")] {
        let text = export::prepare(&out, &["lines.csv"], false).unwrap_err().to_string();
        assert!(text.contains("file") && text.contains("name a folder"), "{text}");
        assert!(export::write_all(&out, &files("x"), false).is_err());
    }
}

#[cfg(unix)]
#[test]
fn read_only_folder_is_explained() {
    use std::os::unix::fs::PermissionsExt;
    let dir = tempfile::tempdir().unwrap();
    fs::set_permissions(dir.path(), fs::Permissions::from_mode(0o555)).unwrap();
    if fs::write(dir.path().join("probe"), "").is_ok() {
        // The super-user may write anywhere; there is nothing to explain.
        return;
    }
    let text = export::prepare(dir.path(), &["lines.csv"], false).unwrap_err().to_string();
    assert!(text.contains("a folder you may write to"), "{text}");
    assert!(export::write_all(dir.path(), &files("x"), false).is_err());
    fs::set_permissions(dir.path(), fs::Permissions::from_mode(0o755)).unwrap();
}

#[cfg(unix)]
#[test]
fn outputs_can_be_read_by_whom_the_mask_allows() {
    use std::os::unix::fs::PermissionsExt;
    let dir = tempfile::tempdir().unwrap();
    let usual = dir.path().join("usual");
    fs::write(&usual, "").unwrap();
    export::write_all(dir.path(), &files("x"), false).unwrap();
    let mode = |path: &Path| fs::metadata(path).unwrap().permissions().mode() & 0o777;
    assert_eq!(mode(&dir.path().join("lines.csv")), mode(&usual));
}
