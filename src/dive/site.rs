//! Landmarks and lines brought into one working frame.

use std::path::PathBuf;

use geo::{Bearing, Distance, Geodesic, Point};

use super::read::systems;
use crate::frame::{Crs, Frame, FrameError, GeoPoint, Given, LocalPoint, MERIDIAN_WARN_DEG};
use crate::interval::{larger, smaller};
use crate::map::read::LandmarkFile;
use crate::problem::{Findings, Problem};
use crate::track::Line;
use crate::track::read::LineFile;
use crate::units::{bearing_words, count_words, length_words, position_words};

/// What the files hold, each in its own coordinate system.
#[derive(Debug)]
pub(super) struct Sources {
    pub dive_file: PathBuf,
    pub landmark_file: PathBuf,
    pub landmarks: LandmarkFile,
    pub lines: Vec<(PathBuf, LineFile)>,
}

/// A line in the working frame, before it is checked.
#[derive(Debug)]
pub(super) struct PlacedLine {
    pub file: PathBuf,
    pub name: String,
    pub origin: String,
    pub waypoints: Vec<LocalPoint>,
}

/// Everything in the working frame.
#[derive(Debug)]
pub(super) struct Site {
    pub frame: Frame,
    pub landmarks: Vec<LocalPoint>,
    pub lines: Vec<PlacedLine>,
}

/// Distance, metres, beyond which landmarks and lines are compared on the ellipsoid before any grid is tried: no single
/// grid serves a site that wide.
const FAR_APART_M: f64 = 200_000.0;
/// By how many times swapping latitude and longitude must shrink the distance to be called a likely cause.
const SWAP_GAIN: f64 = 20.0;

impl Site {
    pub(super) fn place(
        sources: &Sources,
        working: Option<Frame>,
        reach_m: f64,
        findings: &mut Findings,
    ) -> Option<Self> {
        let before = findings.problems.len();
        refuse_mixed_local(sources, findings);
        refuse_far_apart(sources, reach_m, findings);
        if findings.problems.len() > before {
            return None;
        }
        let frame = match working {
            Some(frame) => frame,
            None => choose_frame(sources, findings)?,
        };
        let mut landmarks = Vec::with_capacity(sources.landmarks.rows.len());
        for row in &sources.landmarks.rows {
            match sources.landmarks.crs.to_frame(row.position, &frame) {
                Ok(p) => landmarks.push(p),
                Err(e) => findings.problem(place_problem(
                    &sources.landmark_file,
                    row.line,
                    row.place.as_deref(),
                    &e,
                )),
            }
        }
        let mut lines = Vec::new();
        for (file, content) in &sources.lines {
            for line in &content.lines {
                let mut waypoints = Vec::with_capacity(line.waypoints.len());
                for w in &line.waypoints {
                    match content.crs.to_frame(w.position, &frame) {
                        Ok(p) => waypoints.push(p),
                        Err(e) => findings.problem(place_problem(file, w.line, w.place.as_deref(), &e)),
                    }
                }
                lines.push(PlacedLine {
                    file: file.clone(),
                    name: line.name.clone(),
                    origin: line.origin.clone(),
                    waypoints,
                });
            }
        }
        (findings.problems.len() == before).then_some(Self { frame, landmarks, lines })
    }

    /// Says in words where everything is and in which system, so that swapped axes and wrong zones show.
    pub(super) fn report(&self, sources: &Sources, lines: &[Line], findings: &mut Findings) {
        findings.inform(None, format!("working frame: {}", self.frame.name()));
        let mut files = vec![(&sources.landmark_file, &sources.landmarks.crs)];
        files.extend(sources.lines.iter().map(|(file, content)| (file, &content.crs)));
        for (file, crs) in files {
            if !matches!(crs, Crs::Grid(own) if *own == self.frame) && *crs != Crs::Local {
                findings.inform(Some(file), format!("{} converted to {}", crs.name(), self.frame.name()));
            }
        }
        if let (Some(p), Some(row)) = (self.landmarks.first(), sources.landmarks.rows.first()) {
            findings.inform(
                Some(&sources.landmark_file),
                format!(
                    "{}; the first, {}, is at {}; extent {}",
                    count_words(self.landmarks.len(), "landmark"),
                    row.label(),
                    self.words(*p),
                    extent_words(&self.landmarks)
                ),
            );
        }
        let waypoints: Vec<LocalPoint> = lines.iter().flat_map(|l| l.waypoints.iter().copied()).collect();
        if let Some(first) = lines.first() {
            findings.inform(
                sources.lines.first().map(|(file, _)| file.as_path()),
                format!(
                    "{} with {} in all; the first, {}, starts at {}; extent {}",
                    count_words(lines.len(), "line"),
                    count_words(waypoints.len(), "waypoint"),
                    first.name,
                    self.words(first.waypoints[0]),
                    extent_words(&waypoints)
                ),
            );
        }
        self.report_datums(sources, findings);
        self.report_meridian(&waypoints, findings);
    }

    fn report_datums(&self, sources: &Sources, findings: &mut Findings) {
        let all = systems(sources);
        let mixed = all.iter().any(|(_, crs)| crs.datum_name() != self.frame.datum_name());
        let mut said = Vec::new();
        for (file, crs) in all {
            let Some(statement) = crs.datum_statement() else { continue };
            if said.contains(&statement) {
                continue;
            }
            if mixed {
                findings.warn(
                    Some(file),
                    format!("{statement}; files on different datums are mixed here, so add that to the uncertainty"),
                );
            } else {
                findings.inform(
                    Some(file),
                    format!("{statement}; it cancels between landmarks and lines, which share the datum"),
                );
            }
            said.push(statement);
        }
        if let Some(statement) = self.frame.datum_statement().filter(|s| !said.contains(s)) {
            findings.warn(None, format!("{statement}; the files are on WGS 84, the working frame is not"));
        }
    }

    fn report_meridian(&self, waypoints: &[LocalPoint], findings: &mut Findings) {
        let mut worst: Option<(f64, LocalPoint)> = None;
        for p in self.landmarks.iter().chain(waypoints) {
            if let Some(off) = self.frame.to_geo(*p).ok().and_then(|g| self.frame.degrees_from_meridian(g))
                && worst.is_none_or(|(w, _)| off > w)
            {
                worst = Some((off, *p));
            }
        }
        let Some((off, p)) = worst.filter(|(off, _)| *off > MERIDIAN_WARN_DEG) else { return };
        let scale = self.frame.distortion_at(p).map_or(f64::NAN, |d| d.scale_max);
        findings.warn(
            None,
            format!(
                "the site reaches {off:.2}° of longitude from the central meridian of {}, more than half a zone: grid \
                 lengths there are {scale:.5} times true lengths; check that this zone is meant",
                self.frame.name()
            ),
        );
    }

    /// A position in geographic and grid words.
    pub(super) fn words(&self, p: LocalPoint) -> String {
        let grid = format!("{:.1} m E, {:.1} m N", p.east_m, p.north_m);
        match self.frame.to_geo(p) {
            Ok(g) => format!("{} = {grid}", position_words(g.lat_deg, g.lon_deg)),
            Err(_) => grid,
        }
    }
}

fn place_problem(file: &std::path::Path, line: Option<u64>, place: Option<&str>, e: &FrameError) -> Problem {
    let problem = Problem::new(file, e.to_string()).line(line);
    match place {
        Some(place) => problem.place(place),
        None => problem,
    }
}

fn extent_words(points: &[LocalPoint]) -> String {
    let Some((low, high)) = bounding(points.iter().copied()) else { return "none".into() };
    format!(
        "{} east by {} north",
        length_words(high.east_m - low.east_m),
        length_words(high.north_m - low.north_m)
    )
}

/// South-west and north-east corner of the points.
pub(super) fn bounding(points: impl IntoIterator<Item = LocalPoint>) -> Option<(LocalPoint, LocalPoint)> {
    points.into_iter().fold(None, |old, p| {
        let (low, high) = old.unwrap_or((p, p));
        Some((
            LocalPoint::new(smaller(low.east_m, p.east_m), smaller(low.north_m, p.north_m)),
            LocalPoint::new(larger(high.east_m, p.east_m), larger(high.north_m, p.north_m)),
        ))
    })
}

fn refuse_mixed_local(sources: &Sources, findings: &mut Findings) {
    let map_local = sources.landmarks.crs == Crs::Local;
    for (file, content) in &sources.lines {
        if (content.crs == Crs::Local) != map_local {
            findings.problem(
                Problem::new(
                    file,
                    format!(
                        "the lines are in {}, the landmarks in {}; local metres cannot be joined with anything else",
                        content.crs.name(),
                        sources.landmarks.crs.name()
                    ),
                )
                .accepted("local metres for both, or for neither")
                .advice("state the coordinate system of the line files with crs under [lines]"),
            );
        }
    }
}

/// The grid of the landmark file, or the UTM zone of the first position.
fn choose_frame(sources: &Sources, findings: &mut Findings) -> Option<Frame> {
    let crs = &sources.landmarks.crs;
    match crs {
        Crs::Local => return Some(Frame::local()),
        Crs::Grid(frame) => return Some(frame.clone()),
        Crs::Geographic { .. } => {}
    }
    let first_landmark = sources
        .landmarks
        .rows
        .first()
        .map(|r| (&sources.landmark_file, r.line, r.place.as_deref(), crs.to_geo(r.position)));
    let first_waypoint = || {
        let (file, content) = sources.lines.first()?;
        let w = content.lines.first()?.waypoints.first()?;
        Some((file, w.line, w.place.as_deref(), content.crs.to_geo(w.position)))
    };
    let (file, line, place, geo) = first_landmark.or_else(first_waypoint)?;
    match geo.and_then(Frame::utm_for) {
        Ok(frame) => Some(frame),
        Err(e) => {
            findings.problem(place_problem(file, line, place, &e));
            None
        }
    }
}

/// Extent in degrees of some positions, as its corners; longitudes as written.
fn geographic_bounds(points: impl IntoIterator<Item = GeoPoint>) -> Option<(GeoPoint, GeoPoint)> {
    points.into_iter().fold(None, |old, p| {
        let (low, high) = old.unwrap_or((p, p));
        let at = |pick: fn(f64, f64) -> f64, a: GeoPoint| GeoPoint {
            lat_deg: pick(a.lat_deg, p.lat_deg),
            lon_deg: pick(a.lon_deg, p.lon_deg),
        };
        Some((at(smaller, low), at(larger, high)))
    })
}

fn middle(bounds: (GeoPoint, GeoPoint)) -> Point<f64> {
    Point::new(0.5 * (bounds.0.lon_deg + bounds.1.lon_deg), 0.5 * (bounds.0.lat_deg + bounds.1.lat_deg))
}

/// Refuses lines that are so far from the landmarks that no grid holds both, and says when swapped axes explain it.
fn refuse_far_apart(sources: &Sources, reach_m: f64, findings: &mut Findings) {
    let geo = |crs: &Crs, given: Given| crs.to_geo(given).ok();
    let map = geographic_bounds(
        sources.landmarks.rows.iter().filter_map(|r| geo(&sources.landmarks.crs, r.position)),
    );
    let Some(map) = map else { return };
    for (file, content) in &sources.lines {
        let points = content.lines.iter().flat_map(|l| &l.waypoints);
        let Some(lines) = geographic_bounds(points.filter_map(|w| geo(&content.crs, w.position))) else {
            continue;
        };
        let (a, b) = (middle(map), middle(lines));
        let half = |c: (GeoPoint, GeoPoint), m: Point<f64>| {
            Geodesic.distance(m, Point::new(c.0.lon_deg, c.0.lat_deg))
        };
        let apart = Geodesic.distance(a, b);
        let gap = apart - half(map, a) - half(lines, b) - 2.0 * reach_m;
        if gap < FAR_APART_M {
            continue;
        }
        let bearing = Geodesic.bearing(a, b).to_radians();
        let mut problem = Problem::new(
            file,
            format!(
                "lines and landmarks do not meet: the lines are {} from the landmarks, bearing {} (middle to middle)",
                length_words(apart),
                bearing_words(bearing)
            ),
        )
        .accepted("lines within sonar reach of the mapped area");
        let swapped = |p: Point<f64>| (p.x().abs() <= 90.0).then(|| Point::new(p.y(), p.x()));
        let swap_gap = |p: Option<Point<f64>>, q: Option<Point<f64>>| {
            p.zip(q).map(|(p, q)| Geodesic.distance(p, q)).filter(|d| *d * SWAP_GAIN < apart)
        };
        let lines_swapped = swap_gap(Some(a), swapped(b)).filter(|_| content.crs.is_geographic());
        let map_swapped = swap_gap(swapped(a), Some(b)).filter(|_| sources.landmarks.crs.is_geographic());
        if let Some(d) = lines_swapped.or(map_swapped) {
            problem = problem.advice(format!(
                "latitude and longitude look swapped in {} or in {}: swapped in one of them, the distance would be {}; \
                 correct the file, nothing is swapped silently",
                file.display(),
                sources.landmark_file.display(),
                length_words(d)
            ));
        } else {
            problem = problem.advice("check the coordinate systems and zones of both files");
        }
        findings.problem(problem);
    }
}
