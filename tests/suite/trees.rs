//! A clustered field with voids as the map of a whole job with strays and misses: 3604 trees (`bei`, fetched by
//! `tests/fetch-trees`, which names its source), ten times as far apart as in the forest.

use std::path::Path;

use fixability::assess::Setup;
use fixability::detect::{DrawnErrors, simulate};
use fixability::dive::Dive;
use fixability::locate::steps;
use fixability::track::plan::Plan;

use crate::support::outside::left_out;
use crate::support::program::{Ran, Workplace, project};

/// From a forest to a seabed: the median distance to the nearest neighbour becomes 32 m.
const SCALE: f64 = 10.0;

const DIVE: &str = "\
name = \"Trees, ten times as far apart\"
[map]
landmarks = \"trees.csv\"
crs = \"local\"
uncertainty = \"bound\"
uncertainty_m = 1.5
gone_chance = 0.02
[lines]
files = [\"lines.csv\"]
[vehicle]
speed_mps = 1.5
turn_radius_m = 20
[dead_reckoning]
scale_error_pct = 0.5
heading_bias_deg = 1
heading_noise_deg = 0.5
drift_mps = 0.01
[sonar]
kind = \"side-looking\"
range_max_m = 100
nadir_gap_deg = 20
altitude_m = 15
range_error_m = 0.5
range_error_pct = 0.5
bearing_error_deg = 1
altitude_error_m = 0.5
detection_chance = 0.9
strays_per_km = 0.7
[budget]
strays = 2
misses = 2
[start]
scatter_m = 30
[scoring]
fix_size_m = 40
required_fix_m = 800
segment_m = 400
draws = 6
seed = 3604
";

/// One line through thick and thin, one through the voids.
const LINES: &str = "line,easting,northing\n\
    thick,500,1000\nthick,3500,1400\nvoid,9500,4200\nvoid,7600,3400\nvoid,6200,3900\n";

/// The job in a folder, or none where the trees have not been fetched.
fn job(checks: &str) -> Option<Workplace> {
    let path = project("target/outside/bei.csv");
    if !path.exists() {
        left_out("the field of trees target/outside/bei.csv (written by tests/fetch-trees)", checks);
        return None;
    }
    let mut reader = csv::Reader::from_path(&path).expect("the table of trees");
    assert_eq!(reader.headers().expect("a header"), vec!["x_m", "y_m"]);
    let mut table = String::from("id,easting,northing\n");
    for (i, row) in reader.records().enumerate() {
        let row = row.expect("a row");
        let metres = |column: usize| SCALE * row[column].parse::<f64>().expect("a number");
        table += &format!("T{i},{},{}\n", metres(0), metres(1));
    }
    Some(Workplace::new().write("dive.toml", DIVE).write("trees.csv", &table).write("lines.csv", LINES))
}

#[test]
fn a_whole_job_in_a_clustered_field_runs_to_its_end() {
    let Some(place) = job("a whole job in a clustered field") else { return };
    // Four unexplained detections where neighbours stand 32 m apart: the program may run out of budget, and then says so.
    let decided = |ran: &Ran| {
        assert!(matches!(ran.code, Some(0 | 5)), "{ran:?}");
        assert_eq!(ran.code == Some(5), ran.stderr.contains("undecided"), "{}", ran.stderr);
    };
    let ran = place.run("lines dive.toml --out out");
    decided(&ran);
    assert!(ran.stdout.contains("thick") && ran.stdout.contains("void"), "{}", ran.stdout);
    let table = place.bytes("out/lines.csv");
    let mut reader = csv::Reader::from_reader(table.as_slice());
    let header = reader.headers().expect("a header").clone();
    let column = |name: &str| header.iter().position(|h| h == name).unwrap_or_else(|| panic!("no {name}"));
    let (median, undecided) = (column("estimated_median_fix_m"), column("undecided_share"));
    let rows: Vec<csv::StringRecord> = reader.records().map(|row| row.expect("a row")).collect();
    assert!(rows.len() >= 14, "{} segments", rows.len());
    assert!(rows.iter().all(|row| &row[undecided] == "0"), "a simulated dive is undecided");
    assert!(rows.iter().any(|row| !row[median].is_empty()), "no segment with a median fix distance");
}

/// Up to the stray that exceeds the budget, the truth is inside the feasible set at every event.
#[test]
fn the_truth_is_never_lost_in_a_clustered_field_with_strays_and_misses() {
    let Some(place) = job("that the truth is never lost in a clustered field with strays and misses") else {
        return;
    };
    let dive = Dive::read(&place.path(Path::new("dive.toml"))).expect("the job is sound");
    assert_eq!(dive.landmarks.len(), 3604);
    let setup = Setup::new(&dive);
    let (scene, solver, bounds) = (setup.scene(), setup.solver(), setup.bounds());
    let shapes = &dive.scoring.error_shapes;
    let certain = fixability::detect::Scene {
        sonar: fixability::vehicle::Sonar { detection_chance: 1.0, strays_per_km: 0.0, ..scene.sonar },
        gone_chance: 0.0,
        ..scene
    };
    let (mut events, mut lost, mut empty, mut undecided, mut runs) = (0, 0, 0, 0, 0);
    let (mut strays, mut seen, mut there) = (0_usize, 0_usize, 0_usize);
    for line in &dive.lines {
        let plan = Plan::new(line, dive.vehicle.turn_radius_m);
        let marks: Vec<f64> = (0..)
            .map(|k| f64::from(k) * dive.scoring.segment_m)
            .take_while(|&at_m| at_m < plan.length_m)
            .collect();
        for draw in 0..2 * dive.scoring.draws {
            let errors =
                DrawnErrors::new(dive.scoring.seed, &line.name, draw as u64, shapes[draw % shapes.len()]);
            let simulated = simulate(&scene, &plan, &marks, &errors);
            let is_stray: Vec<bool> = simulated
                .log
                .events
                .iter()
                .zip(&simulated.truth)
                .map(|(event, truth)| event.sighting.is_some() && truth.landmark.is_none())
                .collect();
            strays += is_stray.iter().filter(|stray| **stray).count();
            seen += simulated.truth.iter().filter(|truth| truth.landmark.is_some()).count();
            let all = simulate(&certain, &plan, &marks, &errors);
            there += all.truth.iter().filter(|truth| truth.landmark.is_some()).count();
            let steps = steps(&simulated.log, &bounds);
            for start in (0..steps.len()).filter(|&i| steps[i].sighting.is_none()) {
                let beyond = (start + 1..steps.len())
                    .filter(|&i| is_stray[i])
                    .nth(usize::from(dive.budget.strays))
                    .unwrap_or(steps.len());
                runs += 1;
                let truth = &simulated.truth[start + 1..beyond];
                let outcome = solver.run(&steps[start + 1..beyond], |event, set| {
                    events += 1;
                    let position = truth[event.step].position;
                    lost += usize::from(!set.states.iter().any(|state| state.cell.contains(position)));
                });
                empty += usize::from(outcome.contradiction().is_some());
                undecided += usize::from(outcome.is_undecided);
            }
        }
    }
    let missed = there - seen;
    println!(
        "{runs} runs, {events} events: {lost} lost, {empty} empty, {undecided} undecided; {strays} strays, {missed} of {there} \
         missed"
    );
    assert!(events >= 1_000 && strays >= 20 && missed >= 50, "{events} {strays} {missed}");
    assert_eq!((lost, empty), (0, 0));
    assert!(undecided * 10 <= runs, "{undecided} of {runs}");
}
