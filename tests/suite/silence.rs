//! "Nothing seen" as evidence: it removes places, and never the true one while at most g landmarks are missed.

use fixability::detect::{DrawnErrors, Errors, LegErrors, SightingErrors, StrayDraw, simulate};
use fixability::locate::{Silence, Solver, steps};
use fixability::vehicle::SonarKind;
use nalgebra::Vector2;

use crate::support::scenes::RandomScene;

/// Drawn errors in which exactly the landmarks of a list are missed.
struct Missing<'a>(DrawnErrors, &'a [usize]);

impl Errors for Missing<'_> {
    fn start_offset(&self) -> Vector2<f64> {
        self.0.start_offset()
    }
    fn heading_bias(&self) -> f64 {
        self.0.heading_bias()
    }
    fn landmark(&self, number: usize) -> Vector2<f64> {
        self.0.landmark(number)
    }
    fn leg(&self, number: usize) -> LegErrors {
        self.0.leg(number)
    }
    fn sighting(&self, landmark: usize, way: usize) -> SightingErrors {
        let chance = if self.1.contains(&landmark) { 1.0 } else { 0.0 };
        SightingErrors { chance, ..self.0.sighting(landmark, way) }
    }
    fn strays(&self, _: f64, _: f64) -> Vec<StrayDraw> {
        Vec::new()
    }
    fn decoy(&self, _: usize) -> Option<[usize; 2]> {
        None
    }
}

#[derive(Debug, Default)]
struct Tally {
    events: usize,
    lost: usize,
    places_with: usize,
    places_without: usize,
}

/// Dives in which `missed` of the landmarks met are missed, solved with a miss budget.
fn run(dives: usize, missed: usize, miss_budget: u8) -> Tally {
    let mut tally = Tally::default();
    let (mut number, mut done) = (0, 0);
    while done < dives {
        number += 1;
        let mut random = RandomScene::new(number);
        if !matches!(random.bounds.sonar.kind, SonarKind::SideLooking { .. }) {
            continue;
        }
        random.bounds.sonar.detection_chance = 1.0;
        let silence = Silence::new(vec![true; random.landmarks.len()], random.bounds.sonar).unwrap();
        let without = random.solver();
        let with = Solver { silence: Some(&silence), miss_budget, ..without };
        for draw in 0..4 {
            let drawn = DrawnErrors::new(number, "silence", draw, random.shape);
            let met: Vec<usize> = simulate(&random.scene(), &random.plan, &[], &drawn)
                .truth
                .iter()
                .filter_map(|truth| truth.landmark)
                .collect();
            let first = met.len() / 3;
            let missing: Vec<usize> = met.iter().copied().skip(first).take(missed).collect();
            let dive = simulate(&random.scene(), &random.plan, &[], &Missing(drawn, &missing));
            let steps = steps(&dive.log, &random.bounds);
            done += 1;
            with.run(&steps, |event, set| {
                tally.events += 1;
                tally.places_with += event.places;
                tally.lost += usize::from(!set.contains(dive.truth[event.step].position));
            });
            tally.places_without +=
                without.run(&steps, |_, _| {}).events.iter().map(|e| e.places).sum::<usize>();
        }
    }
    tally
}

#[test]
fn silence_never_loses_the_truth_within_the_miss_budget_and_removes_places() {
    for (missed, budget) in [(0, 0), (1, 1), (2, 2), (1, 3)] {
        let tally = run(1500, missed, budget);
        println!("{missed} missed, budget {budget}: {tally:?}");
        assert_eq!(tally.lost, 0, "{tally:?}");
        assert!(tally.places_with < tally.places_without, "silence must remove places: {tally:?}");
        assert!(tally.events > 5000, "{tally:?}");
    }
}

/// Proof that the check above can fail.
#[test]
fn more_misses_than_the_budget_lose_the_truth() {
    let tally = run(800, 1, 0);
    println!("{tally:?}");
    assert!(tally.lost > 0, "{tally:?}");
}
