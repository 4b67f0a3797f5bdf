//! Texts of every chart on random scenes with names that are awkward to draw: none overlaps another or leaves the canvas,
//! and what was cut shows it.

use fixability::alias::{self, LookAlikeRequest};
use fixability::assess::{self, Setup, TraceRequest};
use fixability::dive::{AreaOptions, Dive};
use fixability::frame::{Frame, LocalPoint};
use fixability::map::Landmark;
use fixability::render::{self, AreaChart, ChartSize, Paper, PlacedText};
use fixability::report::{
    AreaReport, LinesReport, LookAlikesReport, RemapReport, SensitivityReport, SuggestReport, TraceReport,
};
use fixability::track::Line;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use crate::support::layout::assert_clear;
use crate::support::program::project;

/// Names that are awkward to draw: long, of other scripts, from right to left, with marks on marks, without spaces, with
/// characters that have no ink.
const NAMES: [&str; 12] = [
    "A",
    "Långgrundet väst – öst, första försöket före stormen i november, utan bottenlås och med gammal karta",
    "Линия восемь через каменное поле и обратно к месту погружения",
    "測線一",
    "測線二〇二六年春季調査海域北側第三区画往復測量計画(改訂第二版)のための候補線",
    "קו שלוש מצפון לדרום",
    "خط المسح الخامس من الشرق إلى الغرب عبر حقل الصخور",
    "a\u{301}\u{323}\u{308}e\u{302}\u{301}o\u{303}\u{304} N\u{330}\u{303}",
    "Geschwindigkeitsbegrenzungsüberwachungsstreckenabschnittsnummernverzeichnisseintragsbezeichnung",
    "line\twith\ttabs\nand lines",
    "left\u{202e}right\u{200b}\u{feff} 🌊⚓",
    "<b>&amp; \"quoted\" \\ %s {}",
];

/// A dive on the demo's site with random landmarks and lines. Every third is on local metres, every third in the south.
fn dive(seed: u64) -> Dive {
    let mut rng = ChaCha8Rng::seed_from_u64(0x1ABE1 ^ seed);
    let mut dive = Dive::read(&project("demo-data/dive.toml")).unwrap();
    let mut name = |number: usize| format!("{} {number}", NAMES[rng.random_range(0..NAMES.len())]);
    let (title, names): (String, Vec<String>) = (name(0), (1..=9).map(&mut name).collect());
    let ids: Vec<String> = (0..90).map(name).collect();
    dive.name = title;
    dive.frame = match seed % 3 {
        0 => Frame::from_epsg(32_631).unwrap(),
        1 => Frame::from_epsg(32_760).unwrap(),
        _ => Frame::local(),
    };
    dive.uncertainty_statement = NAMES[rng.random_range(0..NAMES.len())].repeat(3);
    if seed.is_multiple_of(2) {
        dive.issued = time::Date::from_ordinal_date(2026, 335).ok();
        dive.surveyed = time::Date::from_ordinal_date(2026, 60).ok();
    }
    let corners = dive.start.search_area.clone();
    let of = |value: fn(&LocalPoint) -> f64| {
        let values: Vec<f64> = corners.iter().map(value).collect();
        (values.iter().copied().fold(f64::MAX, f64::min), values.iter().copied().fold(f64::MIN, f64::max))
    };
    let ((west, east), (south, north)) = (of(|p| p.east_m), of(|p| p.north_m));
    let mut point = || LocalPoint::new(rng.random_range(west..east), rng.random_range(south..north));
    // Landmarks lie in clusters and a third of them have a twin, so that there is ground that looks like other ground.
    let shift = (point().east_m - west) / 2.0;
    let centres: Vec<LocalPoint> = (0..6).map(|_| point()).collect();
    dive.landmarks = ids
        .into_iter()
        .enumerate()
        .map(|(number, id)| {
            let half = 0.3 + 0.01 * number as f64;
            let (centre, off) = (centres[number % centres.len()], point());
            // A place of the site made small: 90 m in each direction at most.
            let position = LocalPoint::new(
                centre.east_m + 90.0 * (off.east_m - west) / (east - west),
                centre.north_m + 90.0 * (off.north_m - south) / (north - south),
            );
            Landmark { id, position, half_width_east_m: half, half_width_north_m: half }
        })
        .collect();
    let twins: Vec<Landmark> = dive.landmarks[..30]
        .iter()
        .map(|own| {
            let position = LocalPoint::new(own.position.east_m + shift, own.position.north_m);
            Landmark { id: format!("{} twin", own.id), position, ..own.clone() }
        })
        .collect();
    dive.landmarks.extend(twins);
    let count = 1 + (seed as usize * 3) % 9;
    dive.lines = names
        .into_iter()
        .take(count)
        .map(|name| Line { name, waypoints: vec![point(), point(), point()] })
        .collect();
    dive.scoring.draws = 2;
    dive.scoring.segment_m = 250.0;
    dive.scoring.cell_budget = 3_000;
    dive.area = AreaOptions { cell_m: 300.0, headings: 3, longest_run_m: 500.0 };
    dive.remap.cell_m = 300.0;
    dive.remap.smallest_region_cells = 1;
    dive.remap.gain_regions = 3;
    dive
}

/// Every report that is drawn, of one dive.
struct Reports {
    lines: LinesReport,
    area: AreaReport,
    look_alikes: LookAlikesReport,
    remap: RemapReport,
    trace: TraceReport,
    suggest: SuggestReport,
    sensitivity: SensitivityReport,
}

impl Reports {
    fn of(dive: &Dive) -> Self {
        let setup = Setup::new(dive);
        let head = (setup.provenance("fixability.lookalikes"), setup.parameters(), setup.chart_landmarks());
        let request = TraceRequest { line: None, from_m: 0.0, draw: 0, corridor_spacing_m: 500.0 };
        Self {
            lines: assess::score_lines(&setup, &|| {}),
            area: assess::area(&setup, &dive.area, &|_| {}),
            look_alikes: alias::look_alikes(dive, &LookAlikeRequest::default(), head),
            remap: assess::remap(&setup, &|_| {}),
            trace: assess::trace(&setup, &request).unwrap(),
            suggest: assess::suggest(&setup, &dive.area, &|_| {}),
            sensitivity: assess::sensitivity(&setup, 0.5, &|| {}),
        }
    }

    fn layouts(&self, size: &ChartSize) -> Vec<(&'static str, Vec<PlacedText>)> {
        let area = |chart| render::area_layout(&self.area, chart, size).unwrap();
        vec![
            ("lines", render::lines_layout(&self.lines, size).unwrap()),
            ("profiles", render::profiles_layout(&self.lines, size).unwrap()),
            ("worst", area(AreaChart::Worst)),
            ("best", area(AreaChart::Best)),
            ("share", area(AreaChart::Share)),
            ("look-alikes", render::lookalikes_layout(&self.look_alikes, size).unwrap()),
            ("panels", render::lookalike_panels_layout(&self.look_alikes, size).unwrap()),
            ("remap", render::remap_layout(&self.remap, size).unwrap()),
            ("trace", render::trace_layout(&self.trace, size).unwrap()),
            ("suggest", render::suggest_layout(&self.suggest, size).unwrap()),
            ("sensitivity", render::sensitivity_layout(&self.sensitivity, size).unwrap()),
        ]
    }
}

fn sizes() -> [ChartSize; 5] {
    [
        ChartSize::default(),
        ChartSize::paper(Paper::A3, 300),
        ChartSize::pixels(800, 560),
        ChartSize::pixels(850, 1200),
        ChartSize::pixels(2400, 900),
    ]
}

/// A name as charts write it: one line, without what has no ink.
fn printable(name: &str) -> String {
    let inked: String = name.chars().filter(|c| !['\u{202e}', '\u{200b}', '\u{feff}'].contains(c)).collect();
    inked.split_whitespace().collect::<Vec<_>>().join(" ")
}

#[test]
fn case_39_no_text_overlaps_another_or_leaves_the_canvas_and_cuts_show() {
    let mut found = 0;
    for seed in 0..10 {
        let dive = dive(seed);
        let reports = Reports::of(&dive);
        let names: Vec<String> = dive
            .lines
            .iter()
            .map(|line| &line.name)
            .chain([&dive.name])
            .map(|name| printable(name))
            .collect();
        found += reports.look_alikes.look_alikes.len();
        for size in sizes() {
            for (chart, texts) in reports.layouts(&size) {
                let what = format!("{chart}, seed {seed}, {size:?}");
                assert!(texts.len() > 10, "{what}");
                assert_clear(&texts, &size, &what);
                for text in &texts {
                    // Every beginning of a name is the whole of it or ends visibly.
                    let is_part = names.iter().any(|name| name.starts_with(&text.text) && *name != text.text);
                    let is_whole = names.contains(&text.text) || text.text.chars().count() < 4;
                    assert!(!is_part || is_whole, "{what}: cut without a mark: {text:?}");
                }
            }
        }
    }
    assert!(found > 100, "the scenes have look-alikes to draw: {found}");
}

/// On paper, type keeps its points, whatever the sheet and its resolution; and there are three sizes of it.
#[test]
fn type_has_the_same_points_on_every_paper() {
    let reports = Reports::of(&dive(1));
    let mut all = Vec::new();
    for (paper, dpi) in [(Paper::A4, 150), (Paper::A4, 300), (Paper::A3, 150), (Paper::A3, 300)] {
        let size = ChartSize::paper(paper, dpi);
        let mut points: Vec<f64> = reports
            .layouts(&size)
            .iter()
            .flat_map(|(_, texts)| texts)
            // A point is 1/72 inch.
            .map(|text| (text.em_px / f64::from(dpi) * 72.0 * 100.0).round() / 100.0)
            .collect();
        points.sort_by(f64::total_cmp);
        points.dedup();
        assert!(points[0] >= 7.0, "{paper:?} at {dpi} dpi: {points:?}");
        assert_eq!(points.len(), 3, "{points:?}");
        all.push(points);
    }
    assert!(all.windows(2).all(|pair| pair[0] == pair[1]), "{all:?}");
}

/// The map takes what a larger sheet has more than a smaller one.
#[test]
fn a_larger_paper_shows_more() {
    let reports = Reports::of(&dive(4));
    let labels = |paper| {
        let texts = render::lines_layout(&reports.lines, &ChartSize::paper(paper, 150)).unwrap();
        texts.iter().filter(|text| text.text.parse::<f64>().is_ok_and(|value| value > 1e5)).count()
    };
    assert!(labels(Paper::A3) > labels(Paper::A4), "{} {}", labels(Paper::A3), labels(Paper::A4));
}

/// Writes the charts of two scenes for a person to look at: `FIXABILITY_PICTURES=DIR cargo test --release -- --ignored
/// write_pictures`.
#[test]
#[ignore = "writes pictures for the eye"]
fn write_pictures_of_labels() {
    let dir = std::path::PathBuf::from(std::env::var("FIXABILITY_PICTURES").expect("a folder to write to"));
    std::fs::create_dir_all(&dir).unwrap();
    for seed in [1, 2, 6] {
        let reports = Reports::of(&dive(seed));
        for (name, size) in [("a4", ChartSize::default()), ("tall", ChartSize::pixels(850, 1200))] {
            let charts = [
                ("lines", render::lines_png(&reports.lines, &size)),
                ("profiles", render::profiles_png(&reports.lines, &size)),
                ("best", render::area_png(&reports.area, AreaChart::Best, &size)),
                ("look-alikes", render::lookalikes_png(&reports.look_alikes, &size)),
                ("panels", render::lookalike_panels_png(&reports.look_alikes, &size)),
                ("remap", render::remap_png(&reports.remap, &size)),
                ("trace", render::trace_png(&reports.trace, &size)),
                ("suggest", render::suggest_png(&reports.suggest, &size)),
                ("sensitivity", render::sensitivity_png(&reports.sensitivity, &size)),
            ];
            for (chart, bytes) in charts {
                std::fs::write(dir.join(format!("labels-{seed}-{name}-{chart}.png")), bytes.unwrap())
                    .unwrap();
            }
        }
    }
}
