//! The search area: read from a polygon, or the box around everything.

use geo::{ConvexHull, Coord, LineString, Polygon};
use geojson::GeometryValue;
use nalgebra::Vector2;

use super::site::{Site, bounding};
use crate::frame::{Crs, Frame, Given, LocalPoint};
use crate::input::position::PositionCheck;
use crate::input::{Format, InputText, geojson as features};
use crate::interval::{down, larger, smaller, up};
use crate::problem::{Findings, Problem, ProblemList};
use crate::track::Line;
use crate::units::length_words;

/// The box around landmarks and lines, grown by `margin_m`, rounded outward.
pub(super) fn around(
    site: &Site,
    lines: &[Line],
    margin_m: f64,
    findings: &mut Findings,
) -> Option<Vec<LocalPoint>> {
    let points = site.landmarks.iter().chain(lines.iter().flat_map(|l| &l.waypoints)).copied();
    let (low, high) = bounding(points)?;
    let (west, south) = (down(low.east_m - margin_m), down(low.north_m - margin_m));
    let (east, north) = (up(high.east_m + margin_m), up(high.north_m + margin_m));
    findings.inform(
        None,
        format!(
            "search area: the box around landmarks and lines, grown by {} (sonar reach, scatter, turns): {} by {}",
            length_words(margin_m),
            length_words(east - west),
            length_words(north - south)
        ),
    );
    Some(vec![
        LocalPoint::new(west, south),
        LocalPoint::new(east, south),
        LocalPoint::new(east, north),
        LocalPoint::new(west, north),
    ])
}

/// Reads a polygon: the corners of the outer ring in the working frame, in order, not repeated. `role` names it in
/// messages ("search area").
pub(super) fn polygon(
    input: &InputText,
    role: &str,
    declared: Option<&Crs>,
    frame: &Frame,
    findings: &mut Findings,
) -> Option<Vec<LocalPoint>> {
    let problem = |what: &str| {
        Problem::new(&input.name, what).accepted("GeoJSON with one Polygon, at least three corners apart")
    };
    if input.format() != Some(Format::GeoJson) {
        findings.problem(problem("is not GeoJSON"));
        return None;
    }
    let content = features::read(input, findings)?;
    let crs = features::settle_crs(input, content.crs, declared, Crs::wgs84(), findings)?;
    if let Some(faulty) = content.faulty.first() {
        findings.problem(faulty.clone());
        return None;
    }
    let [only] = content.list.as_slice() else {
        findings.problem(problem(&format!("has {} features", content.list.len())));
        return None;
    };
    let Some(GeometryValue::Polygon { coordinates }) = only.feature.geometry.as_ref().map(|g| &g.value)
    else {
        findings.problem(problem("holds no Polygon").place("feature 1"));
        return None;
    };
    if coordinates.len() > 1 {
        findings.inform(Some(&input.name), format!("holes of the {role} are ignored"));
    }
    let mut problems = ProblemList::default();
    let mut check = PositionCheck::new(&input.name, &crs);
    let mut corners: Vec<LocalPoint> = Vec::new();
    for (i, position) in coordinates.first().map_or(&[][..], Vec::as_slice).iter().enumerate() {
        let place = format!("corner {}", i + 1);
        let given =
            features::xy(position).and_then(|(x, y)| check.pair(x, y, None, &place, &place, &mut problems));
        match given.map(|g: Given| crs.to_frame(g, frame)) {
            Some(Ok(p)) if corners.last() != Some(&p) => corners.push(p),
            Some(Ok(_)) | None => {}
            Some(Err(e)) => problems.push(Problem::new(&input.name, e.to_string()).place(place)),
        }
    }
    if check.plausible(findings) {
        findings.problems.extend(problems);
    }
    if !findings.problems.is_empty() {
        return None;
    }
    if corners.len() > 1 && corners.first() == corners.last() {
        corners.pop();
    }
    if convex_hull(&corners).len() < 3 {
        findings.problem(problem("the polygon encloses no area"));
        return None;
    }
    Some(corners)
}

/// Reads the search area and refuses lines that leave it.
pub(super) fn read(
    input: &InputText,
    declared: Option<&Crs>,
    frame: &Frame,
    lines: &[Line],
    scatter_m: f64,
    findings: &mut Findings,
) -> Option<Vec<LocalPoint>> {
    let corners = polygon(input, "search area", declared, frame, findings)?;
    let hull = convex_hull(&corners);
    if !is_convex(&corners) {
        findings.inform(
            Some(&input.name),
            "the polygon is not convex: its convex hull is searched, which is larger",
        );
    }
    for line in lines {
        let worst =
            line.waypoints.iter().map(|p| outside_m(&hull, *p)).fold(f64::NEG_INFINITY, larger) + scatter_m;
        if worst > 0.0 {
            let what = format!(
                "line \"{}\" with its descent scatter of {scatter_m} m leaves the search area by {}",
                line.name,
                length_words(worst)
            );
            findings.problem(
                Problem::new(&input.name, what)
                    .accepted("a search area that holds every place where the vehicle may start")
                    .advice("enlarge the search area, or move the line"),
            );
        }
    }
    findings.inform(Some(&input.name), format!("search area: a polygon with {} corners", corners.len()));
    Some(corners)
}

/// The convex hull of a search area: where the solver takes the vehicle to start.
#[derive(Clone, Debug)]
pub struct SearchHull {
    /// Corners, counter-clockwise.
    ring: Vec<LocalPoint>,
}

impl SearchHull {
    /// The hull of the corners of a search area, which encloses some area.
    pub fn new(corners: &[LocalPoint]) -> Self {
        Self { ring: convex_hull(corners) }
    }

    /// Distance from a point inside to the nearest edge, metres; negative outside.
    pub fn inside_m(&self, p: LocalPoint) -> f64 {
        -outside_m(&self.ring, p)
    }

    /// How far a point may move in a direction (a unit vector east, north) and stay `margin_m` inside, metres; 0 for one
    /// that does not lie so far inside.
    pub fn room_m(&self, from: LocalPoint, along: Vector2<f64>, margin_m: f64) -> f64 {
        let ahead = LocalPoint::new(from.east_m + along.x, from.north_m + along.y);
        let edges = (0..self.ring.len()).map(|i| (self.ring[i], self.ring[(i + 1) % self.ring.len()]));
        let room = edges.map(|(a, b)| {
            let depth = |p: LocalPoint| cross(a, b, p) / a.distance_m(b);
            let (spare_m, shrinks) = (depth(from) - margin_m, depth(from) - depth(ahead));
            if spare_m < 0.0 {
                0.0
            } else if shrinks > 0.0 {
                spare_m / shrinks
            } else {
                f64::INFINITY
            }
        });
        room.fold(f64::INFINITY, smaller)
    }
}

/// The corners of an area that holds every point within `by_m` of the convex hull of `corners`; `corners` themselves when
/// `by_m` is 0.
///
/// *Guarantee.* The hull of the corners, each moved by ±`by_m` (rounded outward) along both axes, is the Minkowski sum of
/// their hull and a square, and the square holds the disc.
pub(super) fn grown(corners: Vec<LocalPoint>, by_m: f64) -> Vec<LocalPoint> {
    if by_m <= 0.0 {
        return corners;
    }
    let moved = |p: &LocalPoint| {
        let (west, east) = (down(p.east_m - by_m), up(p.east_m + by_m));
        let (south, north) = (down(p.north_m - by_m), up(p.north_m + by_m));
        [(west, south), (east, south), (east, north), (west, north)].map(|(e, n)| LocalPoint::new(e, n))
    };
    let all: Vec<LocalPoint> = corners.iter().flat_map(moved).collect();
    convex_hull(&all)
}

fn convex_hull(corners: &[LocalPoint]) -> Vec<LocalPoint> {
    let ring: Vec<Coord<f64>> = corners.iter().map(|p| Coord { x: p.east_m, y: p.north_m }).collect();
    let hull = Polygon::new(LineString::new(ring), vec![]).convex_hull();
    let mut out: Vec<LocalPoint> = hull.exterior().0.iter().map(|c| LocalPoint::new(c.x, c.y)).collect();
    out.pop();
    out
}

fn cross(a: LocalPoint, b: LocalPoint, c: LocalPoint) -> f64 {
    (b.east_m - a.east_m) * (c.north_m - a.north_m) - (b.north_m - a.north_m) * (c.east_m - a.east_m)
}

/// Whether a ring turns one way only.
fn is_convex(corners: &[LocalPoint]) -> bool {
    let n = corners.len();
    let turns = (0..n).map(|i| cross(corners[i], corners[(i + 1) % n], corners[(i + 2) % n]));
    let (left, right) = turns.fold((false, false), |(l, r), t| (l || t > 0.0, r || t < 0.0));
    // A ring that crosses itself may turn one way only and yet be no convex polygon; its hull has fewer corners.
    !(left && right) && convex_hull(corners).len() == n
}

/// How far a point lies outside a convex ring (counter-clockwise); negative inside: the distance to the nearest edge.
fn outside_m(hull: &[LocalPoint], p: LocalPoint) -> f64 {
    (0..hull.len())
        .map(|i| {
            let (a, b) = (hull[i], hull[(i + 1) % hull.len()]);
            -cross(a, b, p) / a.distance_m(b)
        })
        .fold(f64::NEG_INFINITY, larger)
}
