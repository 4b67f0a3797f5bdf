//! Many broken files per format: no panic, no second of time, no memory beyond the stated multiple, no control character in
//! a message.
//!
//! The long run, a million cases per format, prints what it measured:
//! `cargo test --release --test suite -- --ignored --nocapture hostile::fuzz::a_million`.

use std::time::{Duration, Instant};

use super::corpus::seeds;
use super::mutate::case;
use super::{FORMATS, Format, MEMORY_BESIDES, PLAIN, Way, fault};

/// Cases per format in the ordinary run.
const FEW: u64 = 1500;

/// What a run saw.
#[derive(Debug, Default)]
struct Seen {
    cases: u64,
    accepted: u64,
    slowest: Duration,
    slowest_case: u64,
    most_bytes: usize,
    /// Memory beyond the fixed part, as a multiple of the input.
    worst_multiple: f64,
    worst_case: u64,
}

fn run(format: Format, seed: u64, cases: std::ops::Range<u64>) -> Seen {
    let mut seen = Seen::default();
    for number in cases {
        let (bytes, way) = case(format, seed, number);
        let cost = fault(format, &bytes, way).unwrap_or_else(|what| {
            let name = format!("hostile-{number}.{}", format.ending());
            let path = std::env::temp_dir().join(name);
            std::fs::write(&path, &bytes).expect("a file in the temporary folder");
            panic!("{format:?} case {number} of seed {seed:#x} ({way:?}): {what}; kept as {}", path.display())
        });
        seen.cases += 1;
        seen.accepted += u64::from(cost.reading.accepted);
        if cost.time > seen.slowest {
            (seen.slowest, seen.slowest_case) = (cost.time, number);
        }
        seen.most_bytes = seen.most_bytes.max(cost.peak_bytes);
        let multiple = cost.peak_bytes.saturating_sub(MEMORY_BESIDES) as f64 / bytes.len().max(1) as f64;
        if multiple > seen.worst_multiple {
            (seen.worst_multiple, seen.worst_case) = (multiple, number);
        }
    }
    seen
}

fn some(format: Format) {
    let seen = run(format, 0xF1, 0..FEW);
    // Mutants that are all refused at the first byte would test nothing.
    assert!(seen.accepted > FEW / 100, "{seen:?}");
    assert!(seen.accepted < FEW, "{seen:?}");
}

#[test]
fn some_csv() {
    some(Format::Csv);
}

#[test]
fn some_geojson() {
    some(Format::GeoJson);
}

#[test]
fn some_gpx() {
    some(Format::Gpx);
}

#[test]
fn some_kml() {
    some(Format::Kml);
}

#[test]
fn some_toml() {
    some(Format::Toml);
}

#[test]
#[ignore = "takes half an hour"]
fn a_million_of_each() {
    for format in FORMATS {
        let start = Instant::now();
        let seen = run(format, 0xA_0001, 0..1_000_000);
        println!("{format:?}: {seen:?} in {:.0?}", start.elapsed());
    }
}

#[test]
fn the_files_to_start_from_are_sound() {
    for format in FORMATS {
        for (i, bytes) in seeds(format).into_iter().enumerate() {
            let readings: Vec<_> = ["landmarks", "lines", "search_area"]
                .into_iter()
                .flat_map(|role| (0..3).map(move |crs| (role, crs)))
                .flat_map(|role| [false, true].map(|comma| (role, comma)))
                .map(|((role, crs), decimal_comma)| Way { crs, decimal_comma, in_dive: Some(role), ..PLAIN })
                .map(|way| fault(format, bytes, way).expect("no fault").reading)
                .collect();
            let is_sound = readings.iter().any(|reading| reading.accepted);
            assert!(
                is_sound,
                "{format:?} {i}: {:#?}",
                readings.iter().map(|r| &r.messages).collect::<Vec<_>>()
            );
        }
    }
}
