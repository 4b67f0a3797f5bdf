//! A real field of look-alike landmarks (`tests/data/craters`, see its `SOURCE.md`) as the map of a full run.

use fixability::assess::Setup;
use fixability::detect::{DrawnErrors, simulate};
use fixability::dive::Dive;
use fixability::locate::steps;
use fixability::track::plan::Plan;

use crate::support::program::{Ran, Workplace, project};

const DIVE: &str = "tests/data/craters/dive.toml";

/// Everything from the file to the scores, by the program itself.
#[test]
fn a_full_run_over_a_real_field_gives_scores() {
    let place = Workplace::new();
    let dive = project(DIVE);
    let arguments = ["lines", dive.to_str().expect("a plain path"), "--quiet", "--out", "out"];
    let ran = Ran::of(place.command(arguments).output().expect("the program starts")).expect(0);
    assert!(ran.stdout.contains("north") && ran.stdout.contains("south"), "{}", ran.stdout);
    assert_eq!(place.names("out"), ["lines.csv", "lines.json", "lines.png", "profiles.png"]);

    let table = place.bytes("out/lines.csv");
    let mut reader = csv::Reader::from_reader(table.as_slice());
    let header = reader.headers().expect("a header").clone();
    let column = |name: &str| header.iter().position(|h| h == name).unwrap_or_else(|| panic!("no {name}"));
    let (median, p95) = (column("estimated_median_fix_m"), column("estimated_p95_fix_m"));
    let (line, undecided) = (column("line"), column("undecided_share"));
    let (mut segments, mut scored, mut reliable) = (0, [0, 0], 0);
    for row in reader.records() {
        let row = row.expect("a row");
        segments += 1;
        assert_eq!(&row[undecided], "0", "no dive is undecided");
        if !row[median].is_empty() {
            let metres: f64 = row[median].parse().expect("a number");
            assert!(metres.is_finite() && metres > 0.0);
            scored[usize::from(&row[line] == "south")] += 1;
        }
        reliable += usize::from(!row[p95].is_empty());
    }
    println!(
        "{segments} segments; with a median, north and south: {scored:?}; with a 95th percentile: {reliable}"
    );
    assert!(segments > 20, "{segments}");
    assert!(scored.iter().all(|&n| n >= 3) && reliable > 0, "{scored:?} {reliable}");
}

/// The same dives, seed and bounds through the library: the truth is inside the feasible set at every event.
#[test]
fn the_truth_is_never_lost_in_a_real_field() {
    let dive = Dive::read(&project(DIVE)).expect("the crater dive is sound");
    assert_eq!(dive.landmarks.len(), 1707);
    let setup = Setup::new(&dive);
    let (scene, solver, bounds) = (setup.scene(), setup.solver(), setup.bounds());
    let shapes = &dive.scoring.error_shapes;
    let (mut events, mut lost, mut empty, mut undecided, mut runs) = (0usize, 0usize, 0usize, 0usize, 0usize);
    for line in &dive.lines {
        let plan = Plan::new(line, dive.vehicle.turn_radius_m);
        let marks: Vec<f64> = (0..)
            .map(|k| f64::from(k) * dive.scoring.segment_m)
            .take_while(|&at_m| at_m < plan.length_m)
            .collect();
        for draw in 0..dive.scoring.draws {
            let shape = shapes[draw % shapes.len()];
            let errors = DrawnErrors::new(dive.scoring.seed, &line.name, draw as u64, shape);
            let simulated = simulate(&scene, &plan, &marks, &errors);
            let steps = steps(&simulated.log, &bounds);
            for start in (0..steps.len()).filter(|&i| steps[i].sighting.is_none()) {
                runs += 1;
                let truth = &simulated.truth[start + 1..];
                let outcome = solver.run(&steps[start + 1..], |event, set| {
                    events += 1;
                    let position = truth[event.step].position;
                    lost += usize::from(!set.states.iter().any(|state| state.cell.contains(position)));
                });
                empty += usize::from(outcome.contradiction().is_some());
                undecided += usize::from(outcome.is_undecided);
            }
        }
    }
    println!("{runs} runs, {events} events: {lost} lost, {empty} empty, {undecided} undecided");
    assert!(events >= 10_000, "{events}");
    assert_eq!((lost, empty, undecided), (0, 0, 0));
}
