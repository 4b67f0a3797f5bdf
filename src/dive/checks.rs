//! Checks of the whole: identifiers, uncertainty, lines, and whether map, lines and sonar fit together.

use std::collections::{BTreeMap, BTreeSet};
use std::path::Path;

use rstar::primitives::{GeomWithData, Rectangle};
use rstar::{AABB, RTree};
use time::Date;

use super::section::Document;
use super::settings::Settings;
use super::site::{Site, Sources, bounding};
use crate::frame::LocalPoint;
use crate::input::InputText;
use crate::interval::larger;
use crate::map::Landmark;
use crate::map::read::LandmarkFile;
use crate::problem::{Findings, Problem};
use crate::track::Line;
use crate::units::{bearing_words, count_words, length_words};
use crate::vehicle::Sonar;

/// Waypoints closer than this are the same point, metres: a millimetre, the last digit surveys write.
const SAME_POINT_M: f64 = 1e-3;
/// Most places named in one message.
const NAMED: usize = 10;

fn joined(names: Vec<String>) -> String {
    joined_with(names, ", ")
}

fn joined_with(mut names: Vec<String>, between: &str) -> String {
    let more = names.len().saturating_sub(NAMED);
    names.truncate(NAMED);
    let list = names.join(between);
    if more > 0 { format!("{list} and {more} more") } else { list }
}

/// Puts identifiers and names of lines on one line, as blanks and line ends of XML and JSON may spread them, and refuses
/// what other control characters they hold: names are printed, drawn and written to other files.
pub(super) fn plain_names(sources: &mut Sources, findings: &mut Findings) {
    let mut plain = |name: &mut String, file: &Path, line: Option<u64>, place: &str| {
        if !name.contains(char::is_control) {
            return;
        }
        *name = name.split_whitespace().collect::<Vec<_>>().join(" ");
        if name.contains(char::is_control) {
            findings.problems.push_with(file, || {
                Problem::new(file, format!("the name \"{name}\" holds a control character"))
                    .line(line)
                    .place(place)
                    .accepted("printable characters")
            });
        }
    };
    for row in &mut sources.landmarks.rows {
        let place = row.where_words();
        if let Some(id) = &mut row.id {
            plain(id, &sources.landmark_file, row.line, &place);
        }
    }
    for (file, content) in &mut sources.lines {
        for line in &mut content.lines {
            plain(&mut line.name, file, None, &line.origin);
        }
    }
}

/// Refuses landmarks that share an identifier.
pub(super) fn identifiers(sources: &Sources, findings: &mut Findings) {
    let mut seen: BTreeMap<String, Vec<usize>> = BTreeMap::new();
    for (i, row) in sources.landmarks.rows.iter().enumerate() {
        seen.entry(row.label()).or_default().push(i);
    }
    let mut twice: Vec<(usize, String, Vec<usize>)> =
        seen.into_iter().filter(|(_, rows)| rows.len() > 1).map(|(id, rows)| (rows[0], id, rows)).collect();
    twice.sort();
    for (first, id, rows) in twice {
        let places = rows.iter().map(|i| sources.landmarks.rows[*i].where_words()).collect();
        findings.problem(
            Problem::new(
                &sources.landmark_file,
                format!("the identifier \"{id}\" stands {} times: {}", rows.len(), joined(places)),
            )
            .line(sources.landmarks.rows[first].line)
            .accepted("each identifier once")
            .advice("rename or remove the duplicates"),
        );
    }
}

/// What is missing to turn the uncertainty figures into bounds.
pub(super) fn missing_uncertainty(sources: &Sources, settings: &Settings) -> Option<Vec<Problem>> {
    let rows = &sources.landmarks.rows;
    if rows.is_empty() {
        return None;
    }
    let mut problems = Vec::new();
    let without: Vec<String> =
        rows.iter().filter(|r| r.uncertainty_m.is_none()).map(|r| r.where_words()).collect();
    if !without.is_empty() && settings.uncertainty_m.is_none() {
        problems.push(
            Problem::new(
                &sources.landmark_file,
                format!(
                    "{} of {} landmarks have no uncertainty: {}",
                    without.len(),
                    rows.len(),
                    joined(without)
                ),
            )
            .accepted("an uncertainty for every landmark (columns uncertainty_m, or uncertainty_east_m and uncertainty_north_m)")
            .advice("add it, or set a default with uncertainty_m = … under [map] in the dive file"),
        );
    }
    if settings.declared.is_none() {
        problems.push(
            Problem::new(
                &sources.dive_file,
                "is missing: a 95 % figure is not a bound, so the file must say what its figures mean",
            )
            .place("key map.uncertainty")
            .accepted("\"bound\" (hard limits), \"sigma\" (one standard deviation per axis) or \"p95\" (95 % radius)"),
        );
    }
    (!problems.is_empty()).then_some(problems)
}

/// The bounds of all landmarks, true metres east and north, from the figures and the declared factor.
pub(super) fn half_widths(
    sources: &Sources,
    settings: &Settings,
    findings: &mut Findings,
) -> Option<Vec<(f64, f64)>> {
    let rows = &sources.landmarks.rows;
    let factor = settings.declared.map_or(1.0, |d| d.factor());
    let scaled = |u: f64| if factor > 1.0 { crate::interval::up(u * factor) } else { u };
    let mut out = Vec::with_capacity(rows.len());
    let (mut defaulted, mut zero) = (0, Vec::new());
    for row in rows {
        let (east, north) = match row.uncertainty_m {
            Some(own) => own,
            None => {
                defaulted += 1;
                let default = settings.uncertainty_m?;
                (default, default)
            }
        };
        if east <= 0.0 || north <= 0.0 {
            zero.push(row.where_words());
        }
        out.push((scaled(east), scaled(north)));
    }
    let file = Some(sources.landmark_file.as_path());
    if let Some(default) = settings.uncertainty_m.filter(|_| defaulted > 0) {
        findings.inform(
            file,
            format!("{} without own uncertainty, set to {default} m", count_words(defaulted, "landmark")),
        );
    }
    if !zero.is_empty() {
        findings.warn(
            file,
            format!(
                "{} with zero uncertainty, which no survey reaches: {}; results hold only if these are exact",
                count_words(zero.len(), "landmark"),
                joined(zero)
            ),
        );
    }
    Some(out)
}

/// Lines with distinct names, at least two waypoints and no repeated ones.
pub(super) fn lines(site: &Site, findings: &mut Findings) -> Vec<Line> {
    let mut out: Vec<Line> = Vec::new();
    let mut first_use: BTreeMap<&str, String> = BTreeMap::new();
    for line in &site.lines {
        let problem = |what: String| {
            Problem::new(&line.file, what).place(format!("line \"{}\" ({})", line.name, line.origin))
        };
        let here = format!("{}, {}", line.file.display(), line.origin);
        if let Some(earlier) = first_use.get(line.name.as_str()) {
            findings.problem(
                problem(format!("the name is already used ({earlier})")).accepted("each line name once"),
            );
        }
        first_use.entry(&line.name).or_insert(here);
        if line.waypoints.len() < 2 {
            findings.problem(
                problem(format!("has {}", count_words(line.waypoints.len(), "waypoint")))
                    .accepted("at least two waypoints"),
            );
            continue;
        }
        let mut kept: Vec<LocalPoint> = Vec::with_capacity(line.waypoints.len());
        for p in &line.waypoints {
            if kept.last().is_none_or(|last| last.distance_m(*p) >= SAME_POINT_M) {
                kept.push(*p);
            }
        }
        if kept.len() < 2 {
            findings.problem(
                problem(format!(
                    "has zero length: its {} waypoints are the same point",
                    line.waypoints.len()
                ))
                .accepted("at least two waypoints apart"),
            );
            continue;
        }
        let dropped = line.waypoints.len() - kept.len();
        if dropped > 0 {
            findings.inform(
                Some(&line.file),
                format!("line \"{}\": {} dropped", line.name, count_words(dropped, "repeated waypoint")),
            );
        }
        out.push(Line { name: line.name.clone(), waypoints: kept });
    }
    out
}

/// Refuses a map and lines that lie apart by more than the sonar reaches.
pub(super) fn meet(site: &Site, lines: &[Line], sonar: &Sonar, findings: &mut Findings) {
    let map = bounding(site.landmarks.iter().copied());
    let track = bounding(lines.iter().flat_map(|l| l.waypoints.iter().copied()));
    let Some(((map_low, map_high), (low, high))) = map.zip(track) else { return };
    let apart = |a_low: f64, a_high: f64, b_low: f64, b_high: f64| {
        larger(0.0, larger(b_low - a_high, a_low - b_high))
    };
    let gap = libm::hypot(
        apart(map_low.east_m, map_high.east_m, low.east_m, high.east_m),
        apart(map_low.north_m, map_high.north_m, low.north_m, high.north_m),
    );
    if gap <= sonar.reach_m() {
        return;
    }
    let middle = |a: LocalPoint, b: LocalPoint| {
        LocalPoint::new(0.5 * (a.east_m + b.east_m), 0.5 * (a.north_m + b.north_m))
    };
    let bearing = middle(map_low, map_high).bearing_rad(middle(low, high));
    let file = site.lines.first().map(|l| l.file.clone()).unwrap_or_default();
    findings.problem(
        Problem::new(
            file,
            format!(
                "lines and landmarks do not meet: the gap is {gap:.0} m, the lines lie on bearing {} from the \
                 landmarks, and the sonar reaches {}",
                bearing_words(bearing),
                length_words(sonar.reach_m())
            ),
        )
        .accepted("lines within sonar reach of the mapped area")
        .advice("check the coordinate systems of both files, and for swapped axes"),
    );
}

/// Leaves out landmarks surveyed before `oldest`. They may still be there, so the warning says what that means.
pub(super) fn leave_out_old(
    document: &Document<'_>,
    file: &mut LandmarkFile,
    oldest: Date,
    input: Option<&InputText>,
    findings: &mut Findings,
) {
    let all = file.rows.len();
    let undated = file.rows.iter().filter(|row| row.surveyed.is_none()).count();
    if undated == all {
        let what = "has no effect: no landmark has a survey date of its own (column or property surveyed)";
        findings
            .problem(document.problem("map", "oldest_survey", what).advice("remove it, or add the dates"));
        return;
    }
    let (old, kept): (Vec<_>, Vec<_>) = std::mem::take(&mut file.rows)
        .into_iter()
        .partition(|row| row.surveyed.is_some_and(|date| date < oldest));
    file.rows = kept;
    let name = input.map(|input| input.name.as_path());
    if !old.is_empty() {
        findings.warn(
            name,
            format!(
                "{} of {all} surveyed before {oldest} left out: {}; where they are still there, each detection of one is \
                 a stray, so allow for them in budget.strays",
                count_words(old.len(), "landmark"),
                joined(old.iter().map(|row| row.label()).collect())
            ),
        );
    }
    if undated > 0 {
        findings.warn(name, format!("{} without a survey date kept", count_words(undated, "landmark")));
    }
}

/// Says what a common shift of the map means.
pub(super) fn common_shift(shift_m: f64, findings: &mut Findings) {
    if shift_m > 0.0 {
        findings.inform(
            None,
            format!(
                "common shift of the whole map of up to {}: it cannot be found from relative positions, so no fix removes it; \
                 add it to every absolute position; descent scatter and search area are widened by it",
                length_words(shift_m)
            ),
        );
    }
}

/// Says what few, coincident or overlapping landmarks mean.
pub(super) fn landmarks(sources: &Sources, landmarks: &[Landmark], findings: &mut Findings) {
    let file = Some(sources.landmark_file.as_path());
    match landmarks.len() {
        0 => findings.warn(file, "no landmarks: the vehicle will never get a fix, on any line"),
        1 => findings.warn(
            file,
            "one landmark: with a good heading one detection of it gives a position, as wide as its box and the sonar and \
             heading errors; with a loose heading it gives a ring about it, and a false detection cannot be told from it",
        ),
        2 => findings.warn(
            file,
            "two landmarks: one detection leaves two places, so both must be detected on one run; with a loose heading \
             runs in opposite directions look alike",
        ),
        _ => {}
    }
    let mut sorted: Vec<LocalPoint> = landmarks.iter().map(|l| l.position).collect();
    sorted.sort_by(|a, b| a.east_m.total_cmp(&b.east_m).then(a.north_m.total_cmp(&b.north_m)));
    let coincident = sorted.windows(2).filter(|w| w[0] == w[1]).count();
    if coincident > 0 {
        findings.warn(
            file,
            format!(
                "{} at exactly the same place as another: probably the same object picked twice; kept",
                count_words(coincident, "landmark")
            ),
        );
    }
    let tree = RTree::bulk_load(
        landmarks
            .iter()
            .enumerate()
            .map(|(i, l)| {
                let (low, high) = corners_of(l);
                GeomWithData::new(Rectangle::from_corners(low, high), i)
            })
            .collect(),
    );
    let meeting = |i: usize| {
        let (low, high) = corners_of(&landmarks[i]);
        tree.locate_in_envelope_intersecting(AABB::from_corners(low, high)).map(|b| b.data)
    };
    // Two hits are enough to know (the box always meets itself), so dense maps cost no more than sparse ones.
    let overlapping: Vec<usize> = (0..landmarks.len()).filter(|&i| meeting(i).take(2).count() > 1).collect();
    if overlapping.is_empty() {
        return;
    }
    let mut text = format!(
        "{} whose box overlaps another's: they cannot be told apart by position; kept",
        count_words(overlapping.len(), "landmark")
    );
    if overlapping.len() <= NAMED_OVERLAPS {
        let clusters = clusters(&overlapping, meeting);
        let names = |cluster: &Vec<usize>| {
            cluster.iter().map(|&i| landmarks[i].id.as_str()).collect::<Vec<_>>().join(" + ")
        };
        text += &format!("; inseparable: {}", joined_with(clusters.iter().map(names).collect(), "; "));
    }
    findings.warn(file, text);
}

/// Most overlapping landmarks whose clusters are worked out and named; on denser maps names would not help.
const NAMED_OVERLAPS: usize = 1000;

fn corners_of(landmark: &Landmark) -> ([f64; 2], [f64; 2]) {
    let (e, n) = (landmark.position.east_m, landmark.position.north_m);
    let (we, wn) = (landmark.half_width_east_m, landmark.half_width_north_m);
    ([e - we, n - wn], [e + we, n + wn])
}

/// Groups of landmarks that hang together by overlapping boxes, each in ascending order.
fn clusters<I: Iterator<Item = usize>>(
    overlapping: &[usize],
    meeting: impl Fn(usize) -> I,
) -> Vec<Vec<usize>> {
    let mut left: BTreeSet<usize> = overlapping.iter().copied().collect();
    let mut clusters = Vec::new();
    while let Some(first) = left.pop_first() {
        let mut cluster = vec![first];
        let mut next = 0;
        while let Some(&member) = cluster.get(next) {
            cluster.extend(meeting(member).filter(|other| left.remove(other)));
            next += 1;
        }
        cluster.sort_unstable();
        clusters.push(cluster);
    }
    clusters
}
