//! The area map against the plain solver, against simulated dives, and against itself under smaller bounds.

use std::path::Path;
use std::sync::atomic::{AtomicUsize, Ordering};

use fixability::assess::{Setup, area, area_grid};
use fixability::detect::{DrawnErrors, simulate};
use fixability::dive::{AreaOptions, Dive, ErrorShape};
use fixability::export::{AreaCsv, AreaJson, Exporter};
use fixability::frame::LocalPoint;
use fixability::locate::{Bounds, StraightOutcome, StraightRuns, steps};
use fixability::map::Landmark;
use fixability::render::{AreaChart, ChartSize, area_layout, area_png, ramp};
use fixability::report::{AreaReport, Cause, NoFixCounts, RunOutcome};
use fixability::track::plan::Plan;
use fixability::vehicle::SonarKind;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use crate::guarantee::scaled;
use crate::support::layout::assert_clear;
use crate::support::program::{Workplace, project};

fn read(path: &str) -> Dive {
    Dive::read(&Path::new(env!("CARGO_MANIFEST_DIR")).join(path)).expect("the dive file is good")
}

fn demo() -> Dive {
    read("demo-data/dive.toml")
}

fn craters() -> Dive {
    read("tests/data/craters/dive.toml")
}

/// Clusters of landmarks over the ground of the demo.
fn clusters(seed: u64) -> Dive {
    let mut dive = demo();
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let (low, high) = ends(&dive.start.search_area);
    let mut centre = low;
    dive.landmarks = (0..500)
        .map(|i| {
            if i % 7 == 0 {
                centre = LocalPoint::new(
                    rng.random_range(low.east_m..high.east_m),
                    rng.random_range(low.north_m..high.north_m),
                );
            }
            Landmark {
                id: i.to_string(),
                position: LocalPoint::new(
                    centre.east_m + rng.random_range(-60.0..60.0),
                    centre.north_m + rng.random_range(-60.0..60.0),
                ),
                half_width_east_m: rng.random_range(0.0..3.0),
                half_width_north_m: rng.random_range(0.0..3.0),
            }
        })
        .collect();
    dive
}

fn ends(corners: &[LocalPoint]) -> (LocalPoint, LocalPoint) {
    let of = |pick: fn(f64, f64) -> f64| {
        corners
            .iter()
            .copied()
            .reduce(|a, b| LocalPoint::new(pick(a.east_m, b.east_m), pick(a.north_m, b.north_m)))
            .expect("an area has corners")
    };
    (of(f64::min), of(f64::max))
}

fn straight_runs<'a>(setup: &'a Setup<'_>, options: &AreaOptions) -> StraightRuns<'a> {
    StraightRuns::new(
        setup.scene(),
        setup.solver(),
        setup.bounds(),
        setup.dive.budget.misses,
        options.longest_run_m,
    )
}

/// Compares blocks of the map with the plain solver until `pairs` runs are compared.
fn compare(dive: &Dive, options: &AreaOptions, pairs: usize, seed: u64) -> [usize; 3] {
    let setup = Setup::new(dive);
    let runs = straight_runs(&setup, options);
    let (grid, cells) = area_grid(&setup, options);
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let mut kinds = [0; 3];
    let mut compared = 0;
    while compared < pairs {
        let heading_rad =
            std::f64::consts::TAU * rng.random_range(0..options.headings) as f64 / options.headings as f64;
        // A block of neighbours, so that they share work, of which some are compared.
        let (column, row) = cells[rng.random_range(0..cells.len())];
        let starts: Vec<LocalPoint> = cells
            .iter()
            .filter(|(c, r)| c.abs_diff(column) < 8 && r.abs_diff(row) < 8)
            .map(|&(c, r)| grid.centre(c, r))
            .collect();
        let outcomes = runs.solve(heading_rad, &starts);
        for _ in 0..20 {
            let k = rng.random_range(0..starts.len());
            let plain = runs.solve_plainly(heading_rad, starts[k]);
            compared += 1;
            kinds[match plain {
                StraightOutcome::Fix(_) => 0,
                StraightOutcome::NoFix { .. } => 1,
                StraightOutcome::Undecided => 2,
            }] += 1;
            if plain != StraightOutcome::Undecided {
                assert_eq!(outcomes[k], plain, "from {:?} on {heading_rad}", starts[k]);
            }
        }
    }
    kinds
}

const OPTIONS: AreaOptions = AreaOptions { cell_m: 25.0, headings: 16, longest_run_m: 600.0 };

#[test]
fn the_map_is_that_of_the_plain_solver() {
    let wide = AreaOptions { cell_m: 50.0, headings: 12, longest_run_m: 1200.0 };
    for (name, dive, options) in
        [("demo", demo(), OPTIONS), ("craters", craters(), wide), ("clusters", clusters(5), OPTIONS)]
    {
        let kinds = compare(&dive, &options, 2000, 11);
        println!("{name}: fixes, none, undecided {kinds:?}");
        assert!(kinds[0] > 100 && kinds[1] > 100 && kinds[2] == 0, "{name}: {kinds:?}");
    }
}

#[test]
fn other_sonars_areas_and_slices_too() {
    let mut forward = demo();
    forward.sonar.kind = SonarKind::ForwardLooking { half_sector_rad: 0.7 };
    let mut one_slice = demo();
    one_slice.heading_slices = 1;
    // Most landmarks cannot be the first one seen.
    let mut corner = demo();
    let (low, high) = ends(&corner.start.search_area);
    let part = |share: f64, from: f64, to: f64| from + share * (to - from);
    let at = |e: f64, n: f64| {
        LocalPoint::new(part(e, low.east_m, high.east_m), part(n, low.north_m, high.north_m))
    };
    corner.start.search_area = vec![at(0.6, 0.1), at(0.85, 0.3), at(0.7, 0.4)];
    let mut drifting = clusters(9);
    drifting.dead_reckoning.drift_mps = 0.05;
    drifting.scoring.fix_size_m = 45.0;
    for (name, dive) in
        [("forward", forward), ("one slice", one_slice), ("corner", corner), ("drifting", drifting)]
    {
        let kinds = compare(&dive, &OPTIONS, 300, 3);
        println!("{name}: fixes, none, undecided {kinds:?}");
        assert!(kinds[0] > 20 && kinds[2] == 0, "{name}: {kinds:?}");
    }
}

/// With a cell budget that is too small, runs are undecided or have the answer of a larger budget.
#[test]
fn a_small_budget_never_gives_another_answer() {
    let dive = demo();
    let mut poor = dive.clone();
    poor.scoring.cell_budget = 100;
    let (setup, poor_setup) = (Setup::new(&dive), Setup::new(&poor));
    let (runs, poor_runs) = (straight_runs(&setup, &OPTIONS), straight_runs(&poor_setup, &OPTIONS));
    let (grid, cells) = area_grid(&setup, &OPTIONS);
    let starts: Vec<LocalPoint> = cells.iter().step_by(37).map(|&(c, r)| grid.centre(c, r)).collect();
    let (all, few) = (runs.solve(0.0, &starts), poor_runs.solve(0.0, &starts));
    let undecided = few.iter().filter(|outcome| **outcome == StraightOutcome::Undecided).count();
    for (rich, poor) in all.iter().zip(&few) {
        assert!(*poor == StraightOutcome::Undecided || poor == rich, "{poor:?} {rich:?}");
    }
    println!("{undecided} of {} undecided", few.len());
    assert!(undecided > 0 && undecided < few.len(), "{undecided} of {}", few.len());
}

/// No dive from a start and on a heading of the map needs longer than the map says.
#[test]
fn no_simulated_dive_fixes_later_than_guaranteed() {
    let mut dives = 0;
    for (name, mut dive, longest_run_m) in
        [("demo", demo(), 600.0), ("craters", craters(), 1200.0), ("clusters", clusters(21), 600.0)]
    {
        dive.start.scatter_m = 0.0;
        let setup = Setup::new(&dive);
        let options = AreaOptions { longest_run_m, ..OPTIONS };
        let runs = straight_runs(&setup, &options);
        let (grid, cells) = area_grid(&setup, &options);
        let mut rng = ChaCha8Rng::seed_from_u64(77);
        let mut guaranteed = 0;
        while guaranteed < 60 {
            let (column, row) = cells[rng.random_range(0..cells.len())];
            let start = grid.centre(column, row);
            let heading_rad = std::f64::consts::TAU * f64::from(rng.random_range(0..16u8)) / 16.0;
            let StraightOutcome::Fix(guaranteed_m) = runs.solve(heading_rad, &[start])[0] else { continue };
            guaranteed += 1;
            let plan = Plan::straight(start, heading_rad, longest_run_m);
            for draw in 0..6 {
                let shape = [ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady][draw % 3];
                let errors = DrawnErrors::new(guaranteed, name, draw as u64, shape);
                let log = simulate(&setup.scene(), &plan, &[0.0], &errors).log;
                let all = steps(&log, &setup.bounds());
                // The mark at the start is the first event that is no detection.
                let mark = all.iter().position(|step| step.sighting.is_none()).expect("the mark");
                let outcome = setup.solver().run(&all[mark + 1..], |_, _| {});
                let fix_m = outcome.first_fix_along_m(dive.scoring.fix_size_m);
                assert!(
                    fix_m.is_some_and(|fix_m| fix_m <= guaranteed_m),
                    "{name}: {fix_m:?} > {guaranteed_m}"
                );
                dives += 1;
            }
        }
    }
    assert_eq!(dives, 3 * 60 * 6);
}

/// Every bound multiplied by `share`.
fn shrunken(dive: &Dive, share: f64) -> Dive {
    let mut small = dive.clone();
    for landmark in &mut small.landmarks {
        landmark.half_width_east_m *= share;
        landmark.half_width_north_m *= share;
    }
    let (dead_reckoning, sonar, heading_slices) = (dive.dead_reckoning, dive.sonar, dive.heading_slices);
    let bounds = scaled(Bounds { dead_reckoning, sonar, heading_slices }, share);
    (small.dead_reckoning, small.sonar) = (bounds.dead_reckoning, bounds.sonar);
    small
}

#[test]
fn smaller_bounds_never_lengthen_a_distance() {
    for dive in [demo(), clusters(33)] {
        let small = shrunken(&dive, 0.7);
        let options = AreaOptions { cell_m: 100.0, headings: 8, longest_run_m: 600.0 };
        let map = |dive: &Dive| area(&Setup::new(dive), &options, &|_| {});
        let (before, after) = (map(&dive), map(&small));
        let mut shorter = 0;
        for (before, after) in before.outcomes.iter().zip(&after.outcomes) {
            if let Some(before_m) = before.fix_m() {
                let after_m = after.fix_m();
                assert!(after_m.is_some_and(|after_m| after_m <= before_m), "{before:?} {after:?}");
                shorter += usize::from(after_m < Some(before_m));
            }
        }
        assert!(shorter > 500, "{shorter}");
    }
}

/// Adding a landmark can take a fix away: what the module says of it is shown here.
#[test]
fn one_more_landmark_can_take_a_fix_away() {
    let mut dive = demo();
    dive.landmarks.truncate(1);
    dive.scoring.fix_size_m = 60.0;
    let place = dive.landmarks[0].position;
    dive.start.search_area = [(-900.0, -900.0), (900.0, -900.0), (900.0, 900.0), (-900.0, 900.0)]
        .map(|(e, n)| LocalPoint::new(place.east_m + e, place.north_m + n))
        .to_vec();
    let start = LocalPoint::new(place.east_m - 40.0, place.north_m - 200.0);
    let outcome = |dive: &Dive| straight_runs(&Setup::new(dive), &OPTIONS).solve(0.0, &[start])[0];
    assert!(matches!(outcome(&dive), StraightOutcome::Fix(_)), "{:?}", outcome(&dive));
    let mut twin = dive.landmarks[0].clone();
    twin.position.east_m += 500.0;
    dive.landmarks.push(twin);
    assert_eq!(outcome(&dive), StraightOutcome::NoFix { certain_sightings: 1, has_places: true });
}

/// Counts add up, figures fit together, and every cell's centre lies in the search area.
#[test]
fn figures_of_a_map_fit_together() {
    let dive = demo();
    let setup = Setup::new(&dive);
    let options = AreaOptions { cell_m: 100.0, headings: 4, longest_run_m: 600.0 };
    let done = AtomicUsize::new(0);
    let report = area(&setup, &options, &|count| {
        done.fetch_add(count, Ordering::Relaxed);
    });
    assert_eq!(done.into_inner(), report.outcomes.len());
    assert_eq!(report.outcomes.len(), report.cells.len() * 4);
    let (low, high) = ends(&dive.start.search_area);
    let size = (high.east_m - low.east_m) * (high.north_m - low.north_m);
    assert!((report.cells.len() as f64 * 1e4 / size - 1.0).abs() < 0.1);
    let required_m = dive.scoring.required_fix_m;
    for (number, cell) in report.cells.iter().enumerate() {
        let centre = report.grid.centre(cell.column, cell.row);
        assert!(low.east_m < centre.east_m && centre.east_m < high.east_m);
        assert!(low.north_m < centre.north_m && centre.north_m < high.north_m);
        let runs: Vec<Option<f64>> = report.outcomes_of(number).iter().map(|run| run.fix_m()).collect();
        let mut fixes: Vec<f64> = runs.iter().copied().flatten().collect();
        fixes.sort_by(f64::total_cmp);
        assert_eq!(cell.best_m, fixes.first().copied());
        assert_eq!(cell.best_m, cell.best_heading.and_then(|heading| runs[heading]));
        assert_eq!(cell.worst_m, fixes.get(3).copied());
        assert_eq!(cell.median_m, fixes.get(1).copied());
        assert_eq!(usize::from(cell.no_fix.total()), 4 - fixes.len());
        let within = fixes.iter().filter(|&&m| m <= required_m).count();
        assert_eq!(cell.within_required_share, within as f64 / 4.0);
    }
}

/// Without certain detection nothing is guaranteed, and the map says so.
#[test]
fn uncertain_detection_guarantees_nothing() {
    let mut dive = demo();
    dive.sonar.detection_chance = 0.9;
    let options = AreaOptions { cell_m: 400.0, headings: 2, longest_run_m: 600.0 };
    let report = area(&Setup::new(&dive), &options, &|_| {});
    assert!(report.outcomes.iter().all(|run| run.cause() == Some(Cause::DetectionNotCertain)));
    assert!(report.cells.iter().all(|cell| cell.no_fix.detection_not_certain == 2));
}

struct Picture {
    width: usize,
    pixels: Vec<[u8; 3]>,
}

fn picture(report: &AreaReport, chart: AreaChart) -> Picture {
    let bytes = area_png(report, chart, &ChartSize::default()).unwrap();
    let mut reader = png::Decoder::new(std::io::Cursor::new(bytes)).read_info().unwrap();
    let mut buffer = vec![0; reader.output_buffer_size().unwrap()];
    let info = reader.next_frame(&mut buffer).unwrap();
    Picture {
        width: info.width as usize,
        pixels: buffer.chunks_exact(3).map(|p| [p[0], p[1], p[2]]).collect(),
    }
}

impl Picture {
    /// Share of the pixels in the middle of the map (well inside the frame) that have a colour.
    fn share(&self, (r, g, b): (u8, u8, u8)) -> f64 {
        let height = self.pixels.len() / self.width;
        let (mut hits, mut all) = (0, 0);
        for y in height * 35 / 100..height * 60 / 100 {
            for x in self.width * 30 / 100..self.width * 50 / 100 {
                all += 1;
                hits += usize::from(self.pixels[y * self.width + x] == [r, g, b]);
            }
        }
        f64::from(hits as u32) / f64::from(all)
    }
}

/// A map whose cells all have one outcome.
fn uniform(outcome: RunOutcome) -> AreaReport {
    let mut dive = demo();
    dive.landmarks.clear();
    let options = AreaOptions { cell_m: 100.0, headings: 2, longest_run_m: 600.0 };
    let mut report = area(&Setup::new(&dive), &options, &|_| {});
    for cell in &mut report.cells {
        let fix_m = outcome.fix_m();
        (cell.worst_m, cell.best_m, cell.median_m) = (fix_m, fix_m, fix_m);
        cell.best_heading = fix_m.map(|_| 1);
        cell.within_required_share = if fix_m.is_some() { 1.0 } else { 0.0 };
        cell.no_fix = NoFixCounts::default();
        if let Some(cause) = outcome.cause() {
            cell.no_fix.add(cause);
            cell.no_fix.add(cause);
        }
    }
    report.outcomes.fill(outcome);
    report
}

#[test]
fn no_fix_is_hatched_undecided_is_dotted_and_neither_has_a_colour_of_the_ramp() {
    const GROUND_OF_UNDECIDED: (u8, u8, u8) = (190, 195, 200);
    const INK: (u8, u8, u8) = (24, 32, 40);
    const WHITE: (u8, u8, u8) = (255, 255, 255);
    let classes = |p: &Picture| ramp().iter().map(|&colour| p.share(colour)).sum::<f64>();
    for chart in [AreaChart::Worst, AreaChart::Best, AreaChart::Share] {
        let none = picture(&uniform(RunOutcome::NoFix(Cause::LookAlikes)), chart);
        assert_eq!(classes(&none), 0.0, "{chart:?}");
        assert_eq!(none.share(GROUND_OF_UNDECIDED), 0.0);
        assert!(none.share(WHITE) > 0.4 && none.share(INK) > 0.05, "{chart:?}: {}", none.share(INK));
        let undecided = picture(&uniform(RunOutcome::NoFix(Cause::Undecided)), chart);
        assert_eq!(classes(&undecided), 0.0, "{chart:?}");
        assert!(undecided.share(GROUND_OF_UNDECIDED) > 0.6 && undecided.share(INK) > 0.02, "{chart:?}");
        let fixed = picture(&uniform(RunOutcome::Fix(100.0)), chart);
        assert!(classes(&fixed) > 0.7, "{chart:?}: {}", classes(&fixed));
        assert_eq!(fixed.share(GROUND_OF_UNDECIDED), 0.0);
        // Arrows on the best heading only.
        assert_eq!(fixed.share(INK) > 0.004, chart == AreaChart::Best, "{chart:?}");
    }
}

#[test]
fn texts_of_the_charts_keep_clear_of_each_other() {
    let dive = demo();
    let report =
        area(&Setup::new(&dive), &AreaOptions { cell_m: 200.0, headings: 3, longest_run_m: 600.0 }, &|_| {});
    for (width_px, height_px) in [(1754, 1240), (800, 560), (1240, 1754)] {
        let size = ChartSize::pixels(width_px, height_px);
        for chart in [AreaChart::Worst, AreaChart::Best, AreaChart::Share] {
            let texts = area_layout(&report, chart, &size).unwrap();
            assert_clear(&texts, &size, &format!("{chart:?} {size:?}"));
            if width_px > 1000 {
                let cut: Vec<_> = texts.iter().filter(|text| text.text.ends_with('…')).collect();
                assert!(cut.is_empty(), "{chart:?} {size:?}: {cut:?}");
            }
        }
    }
}

/// Whether a JSON value is this number, up to the last digit that the reader of the tests may lose, or `null` for none.
fn is_same(json: &serde_json::Value, number: Option<f64>) -> bool {
    match (json.as_f64(), number) {
        (Some(a), Some(b)) => (a - b).abs() <= 1e-12 * b,
        (None, None) => json.is_null(),
        _ => false,
    }
}

/// The JSON and the CSV say the same as the report, with empty values where there are none.
#[test]
fn files_hold_the_report() {
    let dive = demo();
    let report =
        area(&Setup::new(&dive), &AreaOptions { cell_m: 200.0, headings: 3, longest_run_m: 500.0 }, &|_| {});
    let json: serde_json::Value = serde_json::from_slice(&AreaJson.bytes(&report).unwrap()).unwrap();
    assert_eq!(json["schema"], "fixability.area");
    assert!(json["caution"].as_str().is_some_and(|text| text.contains("not for navigation")));
    assert_eq!(json["headings_deg"], serde_json::json!([0.0, 120.0, 240.0]));
    let runs = json["runs"]["guaranteed_fix_m"].as_array().unwrap();
    let csv = AreaCsv.bytes(&report).unwrap();
    let mut reader = csv::Reader::from_reader(csv.as_slice());
    let header = reader.headers().unwrap().clone();
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    assert_eq!((rows.len(), runs.len()), (report.cells.len(), report.cells.len()));
    let mut empty = 0;
    for (number, (cell, row)) in report.cells.iter().zip(&rows).enumerate() {
        let field = |name: &str| &row[header.iter().position(|column| column == name).unwrap()];
        let value = |name: &str| field(name).parse::<f64>().ok();
        assert_eq!(value("guaranteed_worst_fix_m"), cell.worst_m);
        assert_eq!(value("guaranteed_best_fix_m"), cell.best_m);
        assert_eq!(value("within_required_share"), Some(cell.within_required_share));
        assert!(is_same(&json["cells"]["guaranteed_worst_fix_m"][number], cell.worst_m));
        empty += usize::from(field("guaranteed_worst_fix_m").is_empty());
        for (heading, run) in report.outcomes_of(number).iter().enumerate() {
            assert!(is_same(&runs[number][heading], run.fix_m()));
            let cause = json["runs"]["no_guaranteed_fix_cause"][number][heading].as_str();
            assert_eq!(cause, run.cause().map(Cause::word));
        }
    }
    assert!(empty > 0, "some cell has a heading without a fix");
}

#[test]
fn the_command_refuses_what_it_cannot_do_and_says_undecided() {
    let place = Workplace::with_small_dive();
    let ran = place.run("area dive.toml --cell-m 1 --headings 360").expect(3);
    assert!(ran.stderr.contains("at most 50000000 are computed"), "{}", ran.stderr);
    let ran = place.run("area dive.toml --cell-m 0.5").expect(2);
    assert!(ran.stderr.contains("a number, 1 to 10000 m"), "{}", ran.stderr);
    let ran = place.run("area dive.toml --cell-m 10000").expect(3);
    assert!(ran.stderr.contains("no cell of 10000 m has its centre in the search area"), "{}", ran.stderr);
    let ran = place.run("area dive.toml --cell-m 100 --headings 4").expect(0);
    assert!(ran.stdout.contains("fix guaranteed within 300 m"), "{}", ran.stdout);
    let read = |name: &str| std::fs::read_to_string(project("demo-data").join(name)).unwrap();
    let poor = read("dive.toml") + "cell_budget = 100\n\n[area]\ncell_m = 100\nheadings = 2\n";
    let place = Workplace::new()
        .write("poor.toml", &poor)
        .write("landmarks.csv", &read("landmarks.csv"))
        .write("lines.csv", &read("lines.csv"));
    let ran = place.run("area poor.toml").expect(5);
    assert!(ran.stdout.contains("undecided: the cell budget ran out"), "{}", ran.stdout);
    assert!(ran.stderr.contains("raise scoring.cell_budget"), "{}", ran.stderr);
}
