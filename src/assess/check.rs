//! What a dive looks like before anything is simulated.

use super::Setup;
use crate::detect::expected_detections;
use crate::frame::LocalPoint;
use crate::problem::Notice;
use crate::report::{CheckReport, CheckedLine};
use crate::track::Line;
use crate::track::plan::Plan;

/// Offsets tried for a line that meets nothing, as shares of the sonar's reach.
const OFFSET_SHARES: [f64; 8] = [0.25, 0.5, 0.75, 1.0, 1.5, 2.0, 3.0, 4.0];

/// Says what was understood: parameters, lines, expected detections, notices.
pub fn check(setup: &Setup<'_>) -> CheckReport {
    let dive = setup.dive;
    let lines = dive
        .lines
        .iter()
        .map(|line| {
            let plan = plan(setup, line);
            CheckedLine {
                name: line.name.clone(),
                waypoints: line.waypoints.clone(),
                length_m: plan.length_m,
                detections_expected: expected_detections(&setup.scene(), &plan).len(),
                blind_turn_m: setup.blind_turn_m(&plan),
            }
        })
        .collect();
    let notices = dive.notices.iter().cloned().chain(line_notices(setup)).collect();
    CheckReport {
        provenance: setup.provenance("fixability.check"),
        parameters: setup.parameters(),
        lines,
        notices,
    }
}

/// What planners should know about their lines before they are scored.
pub fn line_notices(setup: &Setup<'_>) -> Vec<Notice> {
    let mut notices = Vec::new();
    let mut note = |text: String, is_warning| notices.push(Notice { file: None, text, is_warning });
    for line in &setup.dive.lines {
        let plan = plan(setup, line);
        for turn in &plan.notes {
            let how = if turn.radius_used_m == 0.0 {
                "is a reversal and is run as a turn on the spot".to_owned()
            } else {
                format!("has legs too short for it and is run with a radius of {:.1} m", turn.radius_used_m)
            };
            let radius_m = setup.dive.vehicle.turn_radius_m;
            note(
                format!("line {}: the turn at waypoint {} {how}, not {radius_m} m", line.name, turn.waypoint),
                true,
            );
        }
        let blind_m = setup.blind_turn_m(&plan);
        if blind_m > 0.0 {
            note(
                format!(
                    "line {}: {blind_m:.0} m lie in turns, where no landmark is detected (sonar.detect_in_turns)",
                    line.name
                ),
                false,
            );
        }
        if !setup.dive.landmarks.is_empty() && expected_detections(&setup.scene(), &plan).is_empty() {
            note(format!("line {}: 0 detections expected; {}", line.name, suggest_offset(setup, line)), true);
        }
    }
    notices
}

/// The nearest parallel line on which something is met.
fn suggest_offset(setup: &Setup<'_>, line: &Line) -> String {
    let (first, last) = (line.waypoints[0], line.waypoints[line.waypoints.len() - 1]);
    let bearing = first.bearing_rad(last);
    for share in OFFSET_SHARES {
        for (side, word) in [(1.0, "starboard"), (-1.0, "port")] {
            let offset_m = share * setup.dive.sonar.reach_m();
            // Starboard of a bearing (sin b, cos b) is (cos b, −sin b).
            let (east, north) = (libm::cos(bearing) * offset_m * side, -libm::sin(bearing) * offset_m * side);
            let moved = Line {
                name: line.name.clone(),
                waypoints: line
                    .waypoints
                    .iter()
                    .map(|p| LocalPoint::new(p.east_m + east, p.north_m + north))
                    .collect(),
            };
            let met = expected_detections(&setup.scene(), &plan(setup, &moved)).len();
            if met > 0 {
                return format!("offset by {offset_m:.0} m to {word} it would meet {met}");
            }
        }
    }
    "no parallel line within four times the sonar's reach meets any either".to_owned()
}

fn plan(setup: &Setup<'_>, line: &Line) -> Plan {
    Plan::new(line, setup.dive.vehicle.turn_radius_m)
}
