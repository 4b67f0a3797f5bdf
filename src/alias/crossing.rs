//! Where the candidate lines run over the ground of a look-alike.
//!
//! A line runs over a ground where at least three of its landmarks come abeam within the sonar's range, none more than
//! the longest separation after the one before. (Fewer could not be taken for the other ground as a look-alike.)

use super::LANDMARKS_LEAST;
use crate::dive::Dive;
use crate::interval::{Box2, larger};
use crate::map::index::LandmarkIndex;
use crate::report::LookAlikeStretch;
use crate::track::plan::Plan;

/// Where landmarks come abeam of the lines.
#[derive(Debug)]
pub(super) struct Passings {
    separation_max_m: f64,
    /// For each line its name and, in order, distance along it and landmark.
    lines: Vec<(String, Vec<(f64, u32)>)>,
}

impl Passings {
    pub(super) fn new(dive: &Dive, separation_max_m: f64) -> Self {
        let index = LandmarkIndex::new(&dive.landmarks);
        let (nearest_m, reach_m) = (dive.sonar.nearest_m(), dive.sonar.reach_m());
        let lines = dive
            .lines
            .iter()
            .map(|line| {
                let plan = Plan::new(line, dive.vehicle.turn_radius_m);
                let mut passings = Vec::new();
                for piece in plan.pieces.iter().filter(|piece| dive.sonar.detect_in_turns || !piece.in_turn) {
                    let ends = Box2::hull_of(&[piece.start, piece.point_at(piece.length_m)]);
                    let reach = Box2::around(crate::frame::LocalPoint::new(0.0, 0.0), reach_m, reach_m);
                    let ahead = piece.direction();
                    for number in index.meeting(ends.minkowski_sum(reach)) {
                        let p = dive.landmarks[number].position;
                        let (e, n) = (p.east_m - piece.start.east_m, p.north_m - piece.start.north_m);
                        let (along, across) = (e * ahead.x + n * ahead.y, e * ahead.y - n * ahead.x);
                        if (0.0..=piece.length_m).contains(&along)
                            && (nearest_m..=reach_m).contains(&across.abs())
                        {
                            passings.push((piece.along_m + along, number as u32));
                        }
                    }
                }
                passings.sort_unstable_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
                (line.name.clone(), passings)
            })
            .collect();
        Self { separation_max_m, lines }
    }

    /// The stretches over a ground, given its landmarks in order.
    pub(super) fn over(&self, landmarks: &[u32], ground: u8) -> Vec<LookAlikeStretch> {
        let mut found = Vec::new();
        for (line, passings) in &self.lines {
            let mut run: Vec<(f64, u32)> = Vec::new();
            let mut close = |run: &mut Vec<(f64, u32)>| {
                let mut different: Vec<u32> = run.iter().map(|p| p.1).collect();
                different.sort_unstable();
                different.dedup();
                if let (true, Some(first), Some(last)) =
                    (different.len() >= LANDMARKS_LEAST, run.first(), run.last())
                {
                    found.push(LookAlikeStretch {
                        line: line.clone(),
                        ground,
                        from_m: first.0,
                        to_m: last.0,
                    });
                }
                run.clear();
            };
            for &passing in passings.iter().filter(|p| landmarks.binary_search(&p.1).is_ok()) {
                if run.last().is_some_and(|last| passing.0 - last.0 > self.separation_max_m) {
                    close(&mut run);
                }
                run.push(passing);
            }
            close(&mut run);
        }
        found
    }
}

/// Metres of line under the stretches; where two overlap they count once.
pub(super) fn length_m(stretches: &[LookAlikeStretch]) -> f64 {
    let mut sorted: Vec<&LookAlikeStretch> = stretches.iter().collect();
    sorted.sort_by(|a, b| a.line.cmp(&b.line).then(a.from_m.total_cmp(&b.from_m)));
    let (mut total, mut line, mut until) = (0.0, "", 0.0);
    for stretch in sorted {
        if stretch.line != line {
            (line, until) = (&stretch.line, stretch.from_m);
        }
        total += larger(stretch.to_m - larger(stretch.from_m, until), 0.0);
        until = larger(until, stretch.to_m);
    }
    total
}
