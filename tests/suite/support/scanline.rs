//! The exact feasible set by dense sampling, and convex polygons. Shares no code with the solver.
//!
//! *Model.* One heading bias over the whole run, taken from a fine grid. At every instant a free heading noise, scale
//! error and drift: the travel over a reported piece is the convex hull of its polar patch, plus a disc. Each sighting
//! has its own range, altitude and bearing error; each landmark lies in its box. A set is kept as its sections with
//! parallel lines (rows) of a fine spacing, each a list of spans that is exact in its own direction; nothing is
//! replaced by a hull. Rows lie at sampled distances only and curves are replaced by inscribed chords, so the area
//! found grows towards the exact one as the spacing shrinks.
//!
//! *Coupling.* A landmark sighted once leaves nothing behind. A history in which one landmark explains two sightings
//! would have to keep the same point of its box; such histories are reported, not modelled.
//!
//! *Frame.* Turned so that the track runs along +y: x to starboard, y ahead, metres from `origin`.

use std::collections::BTreeMap;

use fixability::detect::LogEvent;
use fixability::frame::LocalPoint;
use fixability::locate::Bounds;
use fixability::map::Landmark;

/// A point.
pub type P = [f64; 2];

/// Spans of one row, ascending and disjoint.
type Spans = Vec<(f64, f64)>;

/// Chords per arc.
const CHORDS: usize = 6;

/// Neighbouring biases move things by at most this many row spacings. Sets are wide in the direction in which the bias
/// moves them, so the gaps between their shifted copies are small; halving the spacing shows that.
const BIAS_SPACINGS: f64 = 6.0;

fn turned(p: P, by_rad: f64) -> P {
    // Clockwise, as headings count.
    let (s, c) = by_rad.sin_cos();
    [p[0] * c + p[1] * s, -p[0] * s + p[1] * c]
}

fn all_turned(points: &[P], by_rad: f64) -> Vec<P> {
    points.iter().map(|&p| turned(p, by_rad)).collect()
}

fn polar(rho: f64, theta: f64) -> P {
    [rho * theta.sin(), rho * theta.cos()]
}

/// Convex hull, anticlockwise (monotone chain).
pub fn convex_hull(points: &[P]) -> Vec<P> {
    let mut sorted = points.to_vec();
    sorted.sort_by(|a, b| a[0].total_cmp(&b[0]).then(a[1].total_cmp(&b[1])));
    sorted.dedup();
    if sorted.len() < 3 {
        return sorted;
    }
    let cross = |o: P, a: P, b: P| (a[0] - o[0]) * (b[1] - o[1]) - (a[1] - o[1]) * (b[0] - o[0]);
    let chain = |points: &mut dyn Iterator<Item = P>| {
        let mut half: Vec<P> = Vec::new();
        for p in points {
            while half.len() >= 2 && cross(half[half.len() - 2], half[half.len() - 1], p) <= 0.0 {
                half.pop();
            }
            half.push(p);
        }
        half.pop();
        half
    };
    let mut hull = chain(&mut sorted.iter().copied());
    hull.extend(chain(&mut sorted.iter().rev().copied()));
    if hull.is_empty() { vec![sorted[0], sorted[sorted.len() - 1]] } else { hull }
}

/// Minkowski sum of convex polygons.
pub fn minkowski_sum(a: &[P], b: &[P]) -> Vec<P> {
    let sums: Vec<P> = a.iter().flat_map(|p| b.iter().map(move |q| [p[0] + q[0], p[1] + q[1]])).collect();
    convex_hull(&sums)
}

/// Section of a convex polygon with the row at `y`.
fn section(polygon: &[P], y: f64) -> Option<(f64, f64)> {
    let (mut lo, mut hi) = (f64::INFINITY, f64::NEG_INFINITY);
    for (i, &a) in polygon.iter().enumerate() {
        let b = polygon[(i + 1) % polygon.len()];
        if (a[1] - y) * (b[1] - y) > 0.0 {
            continue;
        }
        let at: &[f64] = if a[1] == b[1] {
            &[a[0], b[0]]
        } else {
            &[a[0] + (b[0] - a[0]) * ((y - a[1]) / (b[1] - a[1])).clamp(0.0, 1.0)]
        };
        for &x in at {
            lo = lo.min(x);
            hi = hi.max(x);
        }
    }
    (lo <= hi).then_some((lo, hi))
}

fn height_range(polygons: &[Vec<P>]) -> (f64, f64) {
    polygons.iter().flatten().fold((f64::INFINITY, f64::NEG_INFINITY), |r, p| (r.0.min(p[1]), r.1.max(p[1])))
}

fn united(mut spans: Spans) -> Spans {
    spans.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut out: Spans = Vec::with_capacity(1);
    for (lo, hi) in spans {
        match out.last_mut() {
            Some(last) if lo <= last.1 => last.1 = last.1.max(hi),
            _ => out.push((lo, hi)),
        }
    }
    out
}

/// Adds a span, joined to the one added last where they meet.
fn push(spans: &mut Spans, lo: f64, hi: f64) {
    match spans.last_mut() {
        Some(last) if lo <= last.1 && last.0 <= hi => *last = (last.0.min(lo), last.1.max(hi)),
        _ => spans.push((lo, hi)),
    }
}

/// Rows of the given spacing that fit into [lo, hi], centred: the first one, and how many.
fn rows_within(lo: f64, hi: f64, spacing: f64) -> (f64, usize) {
    let each_side = (0.5 * (hi - lo) / spacing).floor();
    (0.5 * (lo + hi) - each_side * spacing, 2 * each_side as usize + 1)
}

/// A set as its sections.
#[derive(Clone)]
struct Rows {
    first: f64,
    spans: Vec<Spans>,
}

/// Union of sections on common rows.
#[derive(Default)]
pub struct Union {
    rows: BTreeMap<i64, Spans>,
}

impl Union {
    /// Adds a convex polygon.
    pub fn add_polygon(&mut self, polygon: &[P], spacing: f64) {
        let (lo, hi) = height_range(&[polygon.to_vec()]);
        for row in (lo / spacing).ceil() as i64..=(hi / spacing).floor() as i64 {
            if let Some(span) = section(polygon, row as f64 * spacing) {
                self.rows.entry(row).or_default().push(span);
            }
        }
    }

    fn add(&mut self, rows: &Rows, spacing: f64) {
        let base = (rows.first / spacing).round() as i64;
        for (i, spans) in rows.spans.iter().enumerate().filter(|(_, spans)| !spans.is_empty()) {
            let row = self.rows.entry(base + i as i64).or_default();
            row.extend(spans);
            if row.len() > 64 {
                *row = united(std::mem::take(row));
            }
        }
    }

    /// Area, m².
    pub fn area_m2(self, spacing: f64) -> f64 {
        self.rows.into_values().flat_map(united).map(|(lo, hi)| hi - lo).sum::<f64>() * spacing
    }
}

/// One event, for bias 0 and in the turned frame.
struct Event {
    /// Convex set of displacements since the event before.
    travel: Vec<P>,
    /// −S as convex parts.
    look: Vec<Vec<P>>,
}

/// A log and a map, ready to be sampled.
pub struct ExactModel {
    boxes: Vec<Vec<P>>,
    events: Vec<Event>,
    bias_rad: f64,
    /// How far the whole picture reaches from the first sighting: metres that a radian of bias can move things.
    lever_m: f64,
    heading_rad: f64,
    origin: LocalPoint,
}

impl ExactModel {
    /// For the sightings of a log up to the one of interest. The track has the heading `heading_rad`.
    pub fn new(
        landmarks: &[Landmark],
        bounds: &Bounds,
        log: &[LogEvent],
        origin: LocalPoint,
        heading_rad: f64,
    ) -> Self {
        let mut model = Self {
            boxes: Vec::new(),
            events: Vec::new(),
            bias_rad: bounds.dead_reckoning.heading_bias_rad,
            lever_m: bounds.sonar.range_max_m,
            heading_rad,
            origin,
        };
        for l in landmarks {
            let (e, n) = (l.half_width_east_m, l.half_width_north_m);
            let corners = [[-e, -n], [e, -n], [e, n], [-e, n]]
                .map(|[x, y]| model.to_frame(LocalPoint::new(l.position.east_m + x, l.position.north_m + y)));
            model.boxes.push(convex_hull(&corners));
        }
        for event in log {
            model.events.push(Event {
                travel: travel(event, bounds, heading_rad),
                look: minus_relative(event, bounds, heading_rad),
            });
        }
        model.lever_m +=
            log[1..].iter().flat_map(|event| &event.travel).map(|piece| piece.length_m).sum::<f64>();
        model
    }

    /// A position in the turned frame.
    pub fn to_frame(&self, p: LocalPoint) -> P {
        turned([p.east_m - self.origin.east_m, p.north_m - self.origin.north_m], -self.heading_rad)
    }

    /// Area of the feasible set at the last event, with rows at a spacing of `spacing` metres and biases at a multiple
    /// of it; and whether some history explains two sightings by one landmark.
    pub fn area_m2(&self, spacing: f64) -> (f64, bool) {
        let mut has_repeat = false;
        let half = (self.bias_rad * self.lever_m / (BIAS_SPACINGS * spacing)).ceil().clamp(0.0, 2000.0);
        let mut union = Union::default();
        for k in -(half as i64)..=half as i64 {
            let bias = if half == 0.0 { 0.0 } else { self.bias_rad * k as f64 / half };
            let mut run = Run::new(self, bias, spacing, &mut union);
            for j in 0..self.boxes.len() {
                run.begin(j);
            }
            has_repeat |= run.has_repeat;
        }
        (union.area_m2(spacing), has_repeat)
    }
}

/// Displacements over the reported travel, for bias 0.
fn travel(event: &LogEvent, bounds: &Bounds, heading_rad: f64) -> Vec<P> {
    let dr = bounds.dead_reckoning;
    let mut total = vec![[0.0, 0.0]];
    for piece in &event.travel {
        let mut patch = Vec::new();
        for k in 0..=CHORDS {
            let share = 2.0 * k as f64 / CHORDS as f64 - 1.0;
            let theta = piece.heading_rad - heading_rad + share * dr.heading_noise_rad;
            patch.push(polar(piece.length_m * (1.0 + dr.scale_error), theta));
            patch.push(polar(piece.length_m * (1.0 - dr.scale_error), theta));
        }
        total = minkowski_sum(&total, &convex_hull(&patch));
    }
    let drift_m: f64 = event.travel.iter().map(|piece| piece.duration_s * dr.drift_mps).sum();
    if drift_m > 0.0 {
        let disc: Vec<P> =
            (0..32).map(|k| polar(drift_m, std::f64::consts::TAU * f64::from(k) / 32.0)).collect();
        total = minkowski_sum(&total, &convex_hull(&disc));
    }
    total
}

/// −S for bias 0, in convex parts that lie inside it.
fn minus_relative(event: &LogEvent, bounds: &Bounds, heading_rad: f64) -> Vec<Vec<P>> {
    let sonar = bounds.sonar;
    let y = event.sighting.expect("a sighting");
    let slant_lo = ((y.slant_range_m - sonar.range_error_m) / (1.0 + sonar.range_error_fraction)).max(0.0);
    let slant_hi = (y.slant_range_m + sonar.range_error_m) / (1.0 - sonar.range_error_fraction);
    let altitude_lo = (sonar.altitude_m - sonar.altitude_error_m).max(0.0);
    let altitude_hi = sonar.altitude_m + sonar.altitude_error_m;
    let horizontal = |slant: f64, altitude: f64| (slant * slant - altitude * altitude).max(0.0).sqrt();
    let (near, far) = (horizontal(slant_lo, altitude_hi), horizontal(slant_hi, altitude_lo));
    let middle = y.heading_rad + y.relative_bearing_rad - heading_rad + std::f64::consts::PI;
    let half = sonar.bearing_error_rad + bounds.dead_reckoning.heading_noise_rad;
    let theta = |k: usize| middle + half * (2.0 * k as f64 / CHORDS as f64 - 1.0);
    // The inner chord is moved out until it touches the inner arc, so that the part lies inside the patch.
    let inner = (near / (half / CHORDS as f64).cos()).min(far);
    (0..CHORDS)
        .map(|k| {
            let (a, b) = (theta(k), theta(k + 1));
            convex_hull(&[polar(inner, a), polar(far, a), polar(far, b), polar(inner, b)])
        })
        .collect()
}

/// A circle around a set.
#[derive(Clone, Copy)]
struct Circle {
    centre: P,
    radius: f64,
}

impl Circle {
    fn around(points: &mut dyn Iterator<Item = P>) -> Self {
        let (mut lo, mut hi) = ([f64::INFINITY; 2], [f64::NEG_INFINITY; 2]);
        for p in points {
            for i in 0..2 {
                lo[i] = lo[i].min(p[i]);
                hi[i] = hi[i].max(p[i]);
            }
        }
        Self {
            centre: [0.5 * (lo[0] + hi[0]), 0.5 * (lo[1] + hi[1])],
            radius: 0.5 * (hi[0] - lo[0]).hypot(hi[1] - lo[1]),
        }
    }

    fn plus(self, other: Self) -> Self {
        Self {
            centre: [self.centre[0] + other.centre[0], self.centre[1] + other.centre[1]],
            radius: self.radius + other.radius,
        }
    }

    fn meets(self, other: Self) -> bool {
        (self.centre[0] - other.centre[0]).hypot(self.centre[1] - other.centre[1])
            <= self.radius + other.radius
    }
}

/// All histories of one bias.
struct Run<'a> {
    model: &'a ExactModel,
    spacing: f64,
    travel: Vec<Vec<P>>,
    travel_circle: Vec<Circle>,
    look: Vec<Vec<Vec<P>>>,
    look_circle: Vec<Circle>,
    box_circle: Vec<Circle>,
    union: &'a mut Union,
    used: Vec<usize>,
    has_repeat: bool,
}

impl<'a> Run<'a> {
    fn new(model: &'a ExactModel, bias: f64, spacing: f64, union: &'a mut Union) -> Self {
        let travel: Vec<Vec<P>> = model.events.iter().map(|e| all_turned(&e.travel, bias)).collect();
        let look: Vec<Vec<Vec<P>>> =
            model.events.iter().map(|e| e.look.iter().map(|part| all_turned(part, bias)).collect()).collect();
        Self {
            model,
            spacing,
            travel_circle: travel.iter().map(|t| Circle::around(&mut t.iter().copied())).collect(),
            look_circle: look.iter().map(|l| Circle::around(&mut l.iter().flatten().copied())).collect(),
            box_circle: model.boxes.iter().map(|b| Circle::around(&mut b.iter().copied())).collect(),
            travel,
            look,
            union,
            used: Vec::new(),
            has_repeat: false,
        }
    }

    fn vantage_circle(&self, event: usize, j: usize) -> Circle {
        self.box_circle[j].plus(self.look_circle[event])
    }

    fn candidates(&self, event: usize, moved: Circle) -> Vec<usize> {
        (0..self.model.boxes.len()).filter(|&j| self.vantage_circle(event, j).meets(moved)).collect()
    }

    /// Parts of [M_j] ⊕ −S.
    fn vantage(&self, event: usize, j: usize) -> Vec<Vec<P>> {
        self.look[event].iter().map(|part| minkowski_sum(&self.model.boxes[j], part)).collect()
    }

    /// Histories in which landmark `j` explains the first sighting.
    fn begin(&mut self, j: usize) {
        if self.model.events.len() > 1 {
            let moved = self.vantage_circle(0, j).plus(self.travel_circle[1]);
            if self.candidates(1, moved).is_empty() {
                return;
            }
        }
        let parts = self.vantage(0, j);
        let (lo, hi) = height_range(&parts);
        let (first, count) = rows_within(lo, hi, self.spacing);
        let spans = (0..count)
            .map(|i| {
                united(parts.iter().filter_map(|p| section(p, first + i as f64 * self.spacing)).collect())
            })
            .collect();
        self.used.push(j);
        self.go_on(0, &Rows { first, spans });
        self.used.pop();
    }

    fn go_on(&mut self, event: usize, rows: &Rows) {
        let next = event + 1;
        if next == self.model.events.len() {
            let mut used = self.used.clone();
            used.sort_unstable();
            used.dedup();
            self.has_repeat |= used.len() < self.used.len();
            self.union.add(rows, self.spacing);
            return;
        }
        let corners = rows.spans.iter().enumerate().flat_map(|(i, spans)| {
            let y = rows.first + i as f64 * self.spacing;
            spans.iter().flat_map(move |&(lo, hi)| [[lo, y], [hi, y]])
        });
        let moved_circle = Circle::around(&mut corners.into_iter()).plus(self.travel_circle[next]);
        let candidates = self.candidates(next, moved_circle);
        if candidates.is_empty() {
            return;
        }
        let moved = self.moved(rows, next);
        for j in candidates {
            let parts = self.vantage(next, j);
            let mut is_empty = true;
            let spans = (0..moved.spans.len())
                .map(|i| {
                    if moved.spans[i].is_empty() {
                        return Spans::new();
                    }
                    let y = moved.first + i as f64 * self.spacing;
                    let seen = united(parts.iter().filter_map(|p| section(p, y)).collect());
                    let mut both = Spans::new();
                    for &(a, b) in &moved.spans[i] {
                        both.extend(
                            seen.iter().map(|&(c, d)| (a.max(c), b.min(d))).filter(|(lo, hi)| lo <= hi),
                        );
                    }
                    is_empty &= both.is_empty();
                    both
                })
                .collect();
            if !is_empty {
                self.used.push(j);
                self.go_on(next, &Rows { first: moved.first, spans });
                self.used.pop();
            }
        }
    }

    fn moved(&self, rows: &Rows, event: usize) -> Rows {
        let polygon = &self.travel[event];
        let (lo, hi) = height_range(std::slice::from_ref(polygon));
        let (first, count) = rows_within(lo, hi, self.spacing);
        let shifts: Vec<Option<(f64, f64)>> =
            (0..count).map(|m| section(polygon, first + m as f64 * self.spacing)).collect();
        let mut spans: Vec<Spans> = vec![Spans::new(); rows.spans.len() + count - 1];
        for (i, source) in rows.spans.iter().enumerate() {
            for (m, shift) in shifts.iter().enumerate() {
                let Some((left, right)) = shift else { continue };
                for &(lo, hi) in source {
                    push(&mut spans[i + m], lo + left, hi + right);
                }
            }
        }
        Rows { first: rows.first + first, spans: spans.into_iter().map(united).collect() }
    }
}
