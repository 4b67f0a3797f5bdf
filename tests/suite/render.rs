//! Charts: the picture is decoded and its pixels are looked at; the layout's rectangles are tested on seeded scenes.

#![allow(clippy::unwrap_used, reason = "helpers of tests may panic as tests do")]

use std::io::Cursor;

use fixability::render::{self, CLASSES, ChartSize, Paper, PlacedText, RenderError, ramp};
use fixability::report::{CAUTION, LinesReport};

use crate::reports;
use crate::support::layout;

struct Picture {
    width: usize,
    height: usize,
    pixels: Vec<[u8; 3]>,
}

impl Picture {
    fn decode(bytes: &[u8]) -> Self {
        let mut reader = png::Decoder::new(Cursor::new(bytes)).read_info().unwrap();
        let mut buffer = vec![0; reader.output_buffer_size().unwrap()];
        let info = reader.next_frame(&mut buffer).unwrap();
        assert_eq!((info.color_type, info.bit_depth), (png::ColorType::Rgb, png::BitDepth::Eight));
        let pixels = buffer.chunks_exact(3).map(|p| [p[0], p[1], p[2]]).collect();
        Self { width: info.width as usize, height: info.height as usize, pixels }
    }

    fn lines(report: &LinesReport) -> Self {
        Self::decode(&render::lines_png(report, &ChartSize::default()).unwrap())
    }

    fn row(&self, y: usize) -> &[[u8; 3]] {
        &self.pixels[y * self.width..(y + 1) * self.width]
    }

    fn count(&self, (r, g, b): (u8, u8, u8)) -> usize {
        self.pixels.iter().filter(|&&pixel| pixel == [r, g, b]).count()
    }

    /// The middle one of the rows with most pixels of one colour, and the columns between which it has them in the left three quarters.
    fn longest_run(&self, (r, g, b): (u8, u8, u8)) -> (usize, std::ops::Range<usize>) {
        let map = self.width * 3 / 4;
        let hits = |y: usize| {
            let row = &self.row(y)[..map];
            row.iter()
                .enumerate()
                .filter(|&(_, &pixel)| pixel == [r, g, b])
                .map(|(x, _)| x)
                .collect::<Vec<_>>()
        };
        let most = (0..self.height).map(|y| hits(y).len()).max().unwrap();
        let rows: Vec<usize> = (0..self.height).filter(|&y| hits(y).len() == most).collect();
        let y = rows[rows.len() / 2];
        let columns = hits(y);
        (y, columns[0]..columns[columns.len() - 1])
    }
}

fn luma([r, g, b]: [u8; 3]) -> f64 {
    // ITU-R BT.601: how a colour is turned into grey by most printers and viewers.
    0.299 * f64::from(r) + 0.587 * f64::from(g) + 0.114 * f64::from(b)
}

/// One line due east, all of it with the same finding.
fn uniform(p95_m: Option<f64>, undecided_share: f64) -> LinesReport {
    let corners = [reports::at(0.0, 0.0), reports::at(2000.0, 0.0)];
    let line = reports::line("A", 1, &corners, |_, _| reports::estimated(p95_m, undecided_share));
    reports::report(vec![line], Vec::new())
}

/// Panics unless all texts lie on the canvas and none overlaps another.
fn assert_clear(texts: &[PlacedText], size: &ChartSize, what: &str) {
    assert!(texts.len() > 20, "{what}: the layout has its texts");
    assert!(texts.iter().all(|text| !text.text.is_empty()), "{what}: an empty text");
    layout::assert_clear(texts, size, what);
}

fn all_text(texts: &[PlacedText]) -> String {
    texts.iter().map(|placed| placed.text.replace('\u{a0}', " ")).collect::<Vec<_>>().join(" ")
}

#[test]
fn canvas_has_the_size_asked_for() {
    for (width_px, height_px) in [(1754, 1240), (800, 560), (1240, 1754), (2400, 900)] {
        let size = ChartSize::pixels(width_px, height_px);
        let picture = Picture::decode(&render::lines_png(&reports::four_lines(), &size).unwrap());
        assert_eq!((picture.width, picture.height), (width_px as usize, height_px as usize));
        let picture = Picture::decode(&render::trace_png(&reports::trace(5), &size).unwrap());
        assert_eq!((picture.width, picture.height), (width_px as usize, height_px as usize));
    }
}

/// ISO 216: A4 is 210 mm by 297 mm, A3 297 mm by 420 mm; an inch is 25.4 mm.
#[test]
fn papers_have_their_pixels_and_say_their_resolution() {
    let size = |paper, dpi| {
        let size = ChartSize::paper(paper, dpi);
        (size.width_px, size.height_px)
    };
    assert_eq!(size(Paper::A4, 150), (1754, 1240));
    assert_eq!(size(Paper::A4, 300), (3508, 2480));
    assert_eq!(size(Paper::A3, 150), (2480, 1754));
    assert_eq!(size(Paper::A3, 300), (4961, 3508));
    for paper in [Paper::A4, Paper::A3] {
        for dpi in 150..=300 {
            ChartSize::paper(paper, dpi).check().unwrap();
        }
    }
    let bytes = render::lines_png(&uniform(Some(100.0), 0.0), &ChartSize::paper(Paper::A3, 300)).unwrap();
    let reader = png::Decoder::new(Cursor::new(&bytes)).read_info().unwrap();
    // 300 dots per inch are 11 811 per metre.
    let density = reader.info().pixel_dims.unwrap();
    assert_eq!((density.xppu, density.yppu), (11_811, 11_811));
    let picture = Picture::decode(&bytes);
    assert_eq!((picture.width, picture.height), (4961, 3508));
    assert!(picture.count(ramp()[0]) > 50_000, "the line is drawn");
}

#[test]
fn case_38_a_huge_picture_is_refused_with_the_computed_size() {
    let size = ChartSize::paper(Paper::A3, 600);
    let refusal = render::profiles_png(&reports::four_lines(), &size).unwrap_err().to_string();
    assert!(refusal.contains("9921 × 7016"), "{refusal}");
    assert!(refusal.contains("69605736 pixels, and at most 18000000"), "{refusal}");
    let small = ChartSize { dpi: 300, ..ChartSize::default() };
    let refusal = render::lines_png(&reports::four_lines(), &small).unwrap_err().to_string();
    assert!(refusal.contains("at 300 dpi its type needs at least 297 × 210 mm"), "{refusal}");
}

#[test]
fn case_38_sizes_that_cannot_be_drawn_are_refused_with_the_reason() {
    let refusal = |width_px, height_px| {
        let size = ChartSize::pixels(width_px, height_px);
        render::lines_png(&reports::four_lines(), &size).unwrap_err().to_string()
    };
    assert!(refusal(100_000, 100_000).contains("10000000000 pixels, and at most 18000000"));
    assert!(refusal(799, 560).contains("at least 800 × 560"));
    assert!(refusal(6000, 1000).contains("3 times its short side"));
    assert!(refusal(0, 0).contains("0 × 0"));
}

#[test]
fn reports_without_ground_are_refused() {
    let empty = reports::report(Vec::new(), Vec::new());
    assert!(matches!(render::lines_png(&empty, &ChartSize::default()), Err(RenderError::Nothing(_))));
    let mut trace = reports::trace(0);
    trace.path.clear();
    trace.search_area.clear();
    assert!(matches!(render::trace_png(&trace, &ChartSize::default()), Err(RenderError::Nothing(_))));
}

#[test]
fn every_class_of_the_legend_has_its_colour() {
    let picture = Picture::lines(&uniform(None, 0.0));
    for colour in ramp() {
        // A swatch is some 50 by 20 pixels; nothing but the legend shows the ramp here.
        let count = picture.count(colour);
        assert!((600..1400).contains(&count), "{colour:?}: {count} pixels");
    }
    assert!(picture.count((190, 30, 45)) > 100, "the requirement is marked");
}

#[test]
fn segments_take_the_colour_of_their_class() {
    // Required is 450 m, so the limits are 150, 300, 450, 900 and none.
    let values = [100.0, 250.0, 400.0, 480.0, 950.0];
    let corners = [reports::at(0.0, 0.0), reports::at(250.0, 0.0)];
    let line = reports::line("A", 1, &corners, |n, _| reports::estimated(Some(values[n]), 0.0));
    let picture = Picture::lines(&reports::report(vec![line], Vec::new()));
    let (y, columns) = picture.longest_run(ramp()[2]);
    let (first, length) = (columns.start, columns.len());
    for (class, &(r, g, b)) in ramp().iter().enumerate() {
        let x = (first + length / 2 + class * length) - 2 * length;
        assert_eq!(picture.row(y)[x], [r, g, b], "class {class}");
    }
}

#[test]
fn segments_without_a_fix_are_hatched_and_undecided_ones_dotted() {
    let (y, columns) = Picture::lines(&uniform(Some(100.0), 0.0)).longest_run(ramp()[0]);
    assert!(columns.len() > 500, "the line spans the map");
    let changes = |picture: &Picture| {
        let dark: Vec<bool> = picture.row(y)[columns.clone()].iter().map(|&p| luma(p) < 128.0).collect();
        dark.windows(2).filter(|pair| pair[0] != pair[1]).count()
    };
    let plain = Picture::lines(&uniform(Some(100.0), 0.0));
    assert_eq!(changes(&plain), 0);

    let hatched = Picture::lines(&uniform(None, 0.0));
    assert!(changes(&hatched) > 100, "{}", changes(&hatched));
    let light = hatched.row(y)[columns.clone()].iter().filter(|&&p| p == [255, 255, 255]).count();
    assert!(light > columns.len() / 3, "hatch stands on white");

    let dotted = Picture::lines(&uniform(None, 0.2));
    assert!(changes(&dotted) > 100);
    let grey = dotted.row(y)[columns.clone()].iter().filter(|&&p| p == [190, 195, 200]).count();
    assert!(grey > columns.len() / 4, "dots stand on grey");
}

#[test]
fn ramp_keeps_its_order_in_grey_and_shows_on_white() {
    let grey: Vec<f64> = ramp().iter().map(|&(r, g, b)| luma([r, g, b])).collect();
    assert!(grey.windows(2).all(|pair| pair[0] - pair[1] >= 30.0), "{grey:?}");
    assert!(grey[0] <= 210.0, "the lightest class shows on white: {grey:?}");
    assert_eq!(grey.len(), CLASSES);
}

#[test]
fn texts_never_overlap_nor_leave_the_canvas() {
    let sizes = [(1754, 1240), (900, 640), (1240, 1754)]
        .map(|(width_px, height_px)| ChartSize::pixels(width_px, height_px));
    for seed in 0..10 {
        let report = reports::random_scene(seed);
        for size in &sizes {
            let texts = render::lines_layout(&report, size).unwrap();
            assert_clear(&texts, size, &format!("seed {seed}, {size:?}"));
            let texts = render::profiles_layout(&report, size).unwrap();
            assert_clear(&texts, size, &format!("profiles, seed {seed}, {size:?}"));
            let texts = render::lines_layout(&reports::guaranteed(report.clone()), size).unwrap();
            assert_clear(&texts, size, &format!("guaranteed, seed {seed}, {size:?}"));
        }
    }
    for size in &sizes {
        for count in [0, 1, 2, 3, 5, 9, 30] {
            let texts = render::trace_layout(&reports::trace(count), size).unwrap();
            assert_clear(&texts, size, &format!("trace of {count} events, {size:?}"));
        }
    }
}

#[test]
fn awkward_provenance_is_cut_visibly() {
    let mut report = reports::four_lines();
    report.provenance.dive = "Ein sehr langer Name ".repeat(30);
    report.provenance.inputs = vec![report.provenance.inputs[0].clone(); 40];
    report.parameters.required_fix_m = 123.456;
    let texts = render::lines_layout(&report, &ChartSize::default()).unwrap();
    assert_clear(&texts, &ChartSize::default(), "long provenance");
    assert!(texts.iter().any(|placed| placed.text.ends_with('…')));
}

#[test]
fn many_lines_end_in_a_count_of_the_rest() {
    let corners = |n: usize| [reports::at(0.0, n as f64 * 30.0), reports::at(1000.0, n as f64 * 30.0)];
    let lines = (0..60)
        .map(|n| {
            reports::line(&format!("line {n}"), n + 1, &corners(n), |_, _| {
                reports::estimated(Some(90.0), 0.0)
            })
        })
        .collect();
    let size = ChartSize::default();
    let texts = render::lines_layout(&reports::report(lines, Vec::new()), &size).unwrap();
    assert_clear(&texts, &size, "60 lines");
    assert!(all_text(&texts).contains("more, in lines.csv and lines.json"));
}

#[test]
fn no_text_is_under_seven_points_on_a4_and_there_are_three_sizes() {
    let mut texts = render::lines_layout(&reports::random_scene(3), &ChartSize::default()).unwrap();
    texts.extend(render::trace_layout(&reports::trace(9), &ChartSize::default()).unwrap());
    let mut sizes: Vec<f64> = texts.iter().map(|placed| placed.em_px).collect();
    sizes.sort_by(f64::total_cmp);
    sizes.dedup();
    assert_eq!(sizes.len(), 3, "{sizes:?}");
    // 1754 pixels across 297 mm; a point is 1/72 inch.
    let points = sizes[0] / 1754.0 * 297.0 / 25.4 * 72.0;
    assert!(points >= 7.0, "{points}");
}

#[test]
fn chart_says_what_it_shows() {
    let report = reports::four_lines();
    let words = all_text(&render::lines_layout(&report, &ChartSize::default()).unwrap());
    for wanted in [
        "Which line fixes the vehicle soonest?",
        "Estimated fix distance, 95th percentile of simulated dives",
        CAUTION,
        "seed 20261201",
        "WGS 84 / UTM zone 31N (EPSG:32631)",
        "dive.toml 4f4f4f4f",
        "400 landmarks, half-width 1–3 m",
        "required fix distance 450 m",
        "800 simulated dives scored",
        "6231500",
        "512500",
    ] {
        assert!(words.contains(wanted), "{wanted:?} in {words:?}");
    }
    assert!(!words.contains("Guaranteed"));
    let words = all_text(&render::lines_layout(&reports::guaranteed(report), &ChartSize::default()).unwrap());
    assert!(words.contains("Guaranteed fix distance"));
    assert!(!words.contains("95th percentile of simulated dives"));
}

/// Latitude and longitude stand on the edges opposite the grid's; without a grid there are none. The scene lies at
/// 56°13′N 3°11′E (the demo's zone, west of the meridian's 0.2° of convergence per 0.25° of longitude).
#[test]
fn georeferenced_maps_have_latitude_longitude_and_true_north() {
    let report = reports::four_lines();
    let texts = render::lines_layout(&report, &ChartSize::default()).unwrap();
    let find = |end: &str| {
        let found = texts.iter().filter(|t| t.text.ends_with(end) && t.text.contains('°'));
        found.map(|t| t.rect.centre()).collect::<Vec<_>>()
    };
    let (north, east) = (find("′N"), find("′E"));
    assert!(north.len() >= 3 && east.len() >= 3, "{north:?} {east:?}");
    assert!(north.iter().all(|&(x, _)| x > 1100.0), "on the right edge: {north:?}");
    assert!(east.iter().all(|&(_, y)| y < 200.0), "on the upper edge: {east:?}");
    let words = all_text(&texts);
    assert!(words.contains("true north 0.2° west of grid north"), "{words}");
    let mut local = report.clone();
    local.provenance.frame = fixability::frame::Frame::local();
    let words = all_text(&render::lines_layout(&local, &ChartSize::default()).unwrap());
    assert!(!words.contains("′N") && !words.contains("true north"), "{words}");
}

#[test]
fn foot_states_issue_age_and_uncertainty() {
    let words = |change: fn(&mut LinesReport)| {
        let mut report = reports::four_lines();
        change(&mut report);
        all_text(&render::lines_layout(&report, &ChartSize::default()).unwrap())
    };
    let plain = words(|_| {});
    assert!(plain.contains("age of the map not stated") && !plain.contains("issued"));
    assert!(plain.contains("400 landmarks, half-width 1–3 m (bounds as given)"));
    let dated = words(|report| {
        report.provenance.issued = Some("2026-12-01".to_owned());
        report.provenance.surveyed = Some("2026-03-01".to_owned());
        report.provenance.map_age_days = Some(275);
    });
    assert!(dated.contains("issued 2026-12-01"));
    assert!(dated.contains("landmarks surveyed 2026-03-01 (275 days before issue)"));
    let surveyed = words(|report| report.provenance.surveyed = Some("2026-03-01".to_owned()));
    assert!(surveyed.contains("landmarks surveyed 2026-03-01") && !surveyed.contains("issue)"));
    let long = words(|report| report.parameters.landmark_uncertainty = "as declared ".repeat(40));
    assert!(long.contains("(as declared as declared") && long.contains('…'));
}

#[test]
fn profiles_say_what_they_show_and_what_they_leave_out() {
    let size = ChartSize::default();
    let report = reports::guaranteed(reports::four_lines());
    let texts = render::profiles_layout(&report, &size).unwrap();
    let words = all_text(&texts);
    for wanted in [
        "How far must the vehicle run, depending on where it is lost?",
        "estimated, 95th percentile",
        "estimated, median",
        "required fix distance 450 m",
        "strips from above: guaranteed, 95th percentile, median",
        CAUTION,
    ] {
        assert!(words.contains(wanted), "{wanted:?} in {words:?}");
    }
    for name in ["A", "B", "C", "D"] {
        assert_eq!(texts.iter().filter(|text| text.text == name).count(), 1, "{name}");
    }
    assert_eq!(texts.iter().filter(|text| text.text == "none").count(), 4);
    assert!(!words.contains("not drawn"));
    // Without a guarantee nothing is called so.
    let words = all_text(&render::profiles_layout(&reports::four_lines(), &size).unwrap());
    assert!(!words.to_lowercase().contains("guaranteed"), "{words}");

    let lines = (0..9).map(|n| {
        let corners = [reports::at(0.0, 90.0 * n as f64), reports::at(900.0, 90.0 * n as f64)];
        reports::line(&format!("line {n}"), n + 1, &corners, |_, _| reports::estimated(Some(90.0), 0.0))
    });
    let many = reports::report(lines.rev().collect(), Vec::new());
    let texts = render::profiles_layout(&many, &size).unwrap();
    assert_clear(&texts, &size, "nine lines");
    let words = all_text(&texts);
    assert!(words.contains("3 more lines are not drawn (ranks 7 to 9): see lines.csv"), "{words}");
    assert!(words.contains("line 5") && !words.contains("line 6"));
    let none = reports::report(Vec::new(), Vec::new());
    assert!(matches!(render::profiles_png(&none, &size), Err(RenderError::Nothing(_))));
}

/// Guaranteed is drawn in ink and through, estimated broken; the accent crosses the plot at the required distance; the
/// strip of what is missing is hatched.
#[test]
fn profiles_keep_guaranteed_and_estimated_apart_without_colour() {
    let corners = [reports::at(0.0, 0.0), reports::at(1000.0, 0.0)];
    let line = reports::line("A", 1, &corners, |n, _| {
        if n < 15 { reports::estimated(Some(300.0), 0.0) } else { reports::estimated(None, 0.0) }
    });
    let report = reports::guaranteed(reports::report(vec![line], Vec::new()));
    let picture = Picture::decode(&render::profiles_png(&report, &ChartSize::default()).unwrap());
    let longest = |of: &dyn Fn([u8; 3]) -> bool, y: usize| {
        picture.row(y).split(|&pixel| !of(pixel)).map(<[_]>::len).max().unwrap_or(0)
    };
    // Rows between the frame's edges that hold a long stroke of each colour.
    let in_plot = 400..1000;
    let ink = |p: [u8; 3]| p == [24, 32, 40];
    let accent = |p: [u8; 3]| p == [190, 30, 45];
    let (r, g, b) = ramp()[3];
    let estimated = |p: [u8; 3]| p == [r, g, b];
    let most = |of: &dyn Fn([u8; 3]) -> bool| in_plot.clone().map(|y| longest(of, y)).max().unwrap();
    assert!((600..900).contains(&most(&ink)), "{}: three quarters of the plot", most(&ink));
    let across = (250..1000).map(|y| longest(&accent, y)).max().unwrap();
    assert!(across > 900, "{across}");
    assert!((5..=14).contains(&most(&estimated)), "{}: dashes", most(&estimated));
    let dashed = in_plot.clone().map(|y| picture.row(y).iter().filter(|&&p| estimated(p)).count()).max();
    assert!(dashed.unwrap() > 350, "the dashes reach over the same ground: {dashed:?}");
}

#[test]
fn every_line_is_named_on_the_map_and_in_the_ranking() {
    let texts = render::lines_layout(&reports::four_lines(), &ChartSize::default()).unwrap();
    for name in ["A", "B", "C", "D"] {
        assert_eq!(texts.iter().filter(|placed| placed.text == name).count(), 2, "{name}");
    }
}

#[test]
fn trace_shows_first_fix_and_last_event() {
    let words = all_text(&render::trace_layout(&reports::trace(14), &ChartSize::default()).unwrap());
    let report = reports::trace(14);
    let fix = report.events.iter().find(|event| event.is_fix).unwrap();
    for number in [1, fix.number, 14] {
        assert!(words.contains(&format!("Event {number},")), "{number} in {words:?}");
    }
    assert!(words.contains("Close-up of event 14"));
    assert!(words.contains(CAUTION));
    assert!(!words.contains("TRUTH OUTSIDE"));
    let mut report = reports::trace(3);
    report.events[1].truth_inside = false;
    report.events[2].cells = 5000;
    let words = all_text(&render::trace_layout(&report, &ChartSize::default()).unwrap());
    assert!(words.contains("TRUTH OUTSIDE"));
    assert!(words.contains("of 5000 cells drawn"));
}

#[test]
fn same_report_same_bytes() {
    let size = ChartSize::default();
    let report = reports::random_scene(5);
    assert_eq!(render::lines_png(&report, &size), render::lines_png(&report, &size));
    assert_eq!(render::trace_png(&reports::trace(4), &size), render::trace_png(&reports::trace(4), &size));
}

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
    let small = ChartSize::pixels(900, 640);
    write("lines-small.png", render::lines_png(&four, &small).unwrap());
    let tall = ChartSize::pixels(1240, 1754);
    write("lines-tall.png", render::lines_png(&four, &tall).unwrap());
    let profiles = |report: &LinesReport, size| render::profiles_png(report, size).unwrap();
    write("profiles.png", profiles(&reports::guaranteed(four.clone()), &size));
    write("profiles-estimated-small.png", profiles(&four, &small));
    write("profiles-tall.png", profiles(&reports::guaranteed(reports::random_scene(3)), &tall));
    for count in [0, 1, 3, 9, 14] {
        let bytes = render::trace_png(&reports::trace(count), &size).unwrap();
        write(&format!("trace-{count}.png"), bytes);
    }
    for seed in 0..4 {
        let bytes = render::lines_png(&reports::random_scene(seed), &size).unwrap();
        write(&format!("random-{seed}.png"), bytes);
    }
}
