//! Charts: the picture is decoded and its pixels are looked at.

use fixability::render::{self, ChartSize};

use crate::reports;

/// Writes the pictures of the test scenes for a person to look at: `FIXABILITY_PICTURES=DIR cargo test --release
/// -- --ignored write_pictures`.
#[test]
#[ignore = "writes pictures for the eye"]
fn write_pictures() {
    let dir = std::path::PathBuf::from(std::env::var("FIXABILITY_PICTURES").expect("a folder to write to"));
    std::fs::create_dir_all(&dir).unwrap();
    let size = ChartSize::default();
    let write = |name: &str, bytes: Vec<u8>| std::fs::write(dir.join(name), bytes).unwrap();
    let four = reports::four_lines();
    write("lines.png", render::lines_png(&four, &size).unwrap());
    write("lines-guaranteed.png", render::lines_png(&reports::guaranteed(four.clone()), &size).unwrap());
    let small = ChartSize { width_px: 900, height_px: 640 };
    write("lines-small.png", render::lines_png(&four, &small).unwrap());
    let tall = ChartSize { width_px: 1240, height_px: 1754 };
    write("lines-tall.png", render::lines_png(&four, &tall).unwrap());
    for count in [0, 1, 3, 9, 14] {
        let bytes = render::trace_png(&reports::trace(count), &size).unwrap();
        write(&format!("trace-{count}.png"), bytes);
    }
    for seed in 0..4 {
        let bytes = render::lines_png(&reports::random_scene(seed), &size).unwrap();
        write(&format!("random-{seed}.png"), bytes);
    }
}
