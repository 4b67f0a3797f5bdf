//! The corridor: where the vehicle may have been at every instant, not only at detections.
//!
//! The reported travel is cut into intervals, each within one straight reported piece. For a link from cell A at one
//! detection to cell B at the next, and an interval from distance a to distance b of the reported travel between them,
//!
//! ```text
//! ( A ⊕ D(0→a) ⊕ V ) ∩ ( B ⊕ −D(b→end) ⊕ −V ),      V = conv( {0} ∪ D(a→b) )
//! ```
//!
//! holds the position at every instant of the interval of every history through the link. The corridor is the union over
//! all links. Before the first detection A is the search area at the start; after the last one only the left part is
//! there.
//!
//! *Proof.* A history's position at an instant t of the interval is p(t) = p_A + x + v with x its travel over 0→a and v
//! its travel over a→t; and p(t) = p_B − y − w with y its travel over b→end and w its travel over t→b. x and y lie in
//! D(0→a) and D(b→end). A piece is one reported heading and one reported speed, so the part a→t of an interval with
//! reported length L and duration T has length λL and duration λT for some λ in [0, 1]. Its travel set is the integral
//! over that part plus the drift of that time: λ times the polar patch's hull (Aumann, see [`super::steps`]) plus λ times
//! the drift disc, which is λ·D(a→b), up to the resolution allowance, which is a set that holds 0. A convex set that
//! holds 0 and D holds λ·D. So v lies in V, and w likewise with 1 − λ. The reach of V in a direction is the larger of 0
//! and that of D.
//!
//! *Frame and units.* Working frame, metres of **reported** travel since the start, seconds since the start.

use super::Bounds;
use super::cell::{Cell, DIRECTION_COUNT, Reaches, add_reaches, disc_reaches, mirrored};
use super::feasible::{Feasible, State};
use super::forward::SolverMap;
use super::history::History;
use super::steps::TravelError;
use super::unseen::Missed;
use crate::detect::{LogEvent, ReportedPiece};
use crate::interval::larger;

/// How finely the corridor is described.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CorridorGrain {
    /// Longest interval, metres of reported travel; positive.
    pub spacing_m: f64,
    /// Most cells per interval, at least 1; more are joined group by group, which only enlarges.
    pub cells_max: usize,
}

/// The corridor over one interval of the reported travel.
#[derive(Clone, Debug, PartialEq)]
pub struct CorridorInterval {
    /// Reported travel since the start at the interval's start, metres.
    pub from_m: f64,
    /// Reported travel since the start at the interval's end, metres.
    pub to_m: f64,
    /// Time since the start at the interval's start, seconds.
    pub from_s: f64,
    /// Time since the start at the interval's end, seconds.
    pub to_s: f64,
    /// Their union holds the vehicle at every instant from start to end; empty when no history is left.
    pub cells: Vec<Cell>,
}

/// An interval before its cells are known.
struct Span {
    piece: ReportedPiece,
    from_m: f64,
    from_s: f64,
}

impl History {
    /// The corridor along `events`, the log that the recorded steps were made from, under the same `bounds` and `map`.
    /// Joints of reported pieces and events cut intervals too. The last interval ends where the log ends.
    ///
    /// *Guarantee.* While the bounds hold, the true position lies in the cells of the interval at every instant.
    ///
    /// # Panics
    /// When the spacing is not positive.
    pub fn corridor(
        &self,
        events: &[LogEvent],
        bounds: &Bounds,
        map: &SolverMap,
        grain: CorridorGrain,
    ) -> Vec<CorridorInterval> {
        assert!(grain.spacing_m > 0.0, "the spacing of a corridor is positive");
        let errors: Vec<TravelError> = TravelError::by_slice(bounds);
        let mut corridor = Vec::new();
        let (mut from_m, mut from_s) = (0.0, 0.0);
        let mut spans_of = |events: &[LogEvent]| {
            let mut spans = Vec::new();
            for piece in events.iter().flat_map(|event| &event.travel) {
                for part in cut(piece, grain.spacing_m) {
                    spans.push(Span { piece: part, from_m, from_s });
                    from_m += part.length_m;
                    from_s += part.duration_s;
                }
            }
            spans
        };
        for level in 1..self.levels.len() {
            let spans = spans_of(&events[self.steps_to(level)]);
            corridor.extend(self.between(level, &spans, &errors, map, grain.cells_max));
        }
        if let Some(last) = self.levels.last() {
            let after = if self.levels.len() == 1 { 0 } else { last.step + 1 };
            let spans = spans_of(&events[after..]);
            let reach: Vec<Vec<Reaches>> = errors.iter().map(|error| ahead(error, &spans)).collect();
            for (number, span) in spans.iter().enumerate() {
                let cells = last
                    .states
                    .iter()
                    .flatten()
                    .map(|state| state.cell.minkowski_sum(&reach[usize::from(state.slice)][number]));
                corridor.push(span.with(cells.collect(), grain.cells_max));
            }
        }
        corridor
    }

    /// The corridor from the level before to `level`.
    fn between(
        &self,
        level: usize,
        spans: &[Span],
        errors: &[TravelError],
        map: &SolverMap,
        cells_max: usize,
    ) -> Vec<CorridorInterval> {
        let reach: Vec<(Vec<Reaches>, Vec<Reaches>)> =
            errors.iter().map(|error| (ahead(error, spans), behind(error, spans))).collect();
        // By link: slice, where histories through it come from, and where they land.
        let ends: Vec<(usize, Cell, Cell)> = self.levels[level]
            .links
            .iter()
            .filter_map(|link| {
                let landing = self.landing(level, link, map)?;
                let origin = self.origin(level, link, &landing)?;
                let from = self.levels[level - 1].state(link.from)?;
                Some((usize::from(from.slice), origin, landing))
            })
            .collect();
        spans
            .iter()
            .enumerate()
            .map(|(number, span)| {
                let cells = ends.iter().filter_map(|(slice, origin, landing)| {
                    let (ahead, behind) = &reach[*slice];
                    let behind = landing.minkowski_sum(&behind[number]);
                    origin.minkowski_sum(&ahead[number]).intersection(behind.reaches())
                });
                span.with(cells.collect(), cells_max)
            })
            .collect()
    }
}

impl Span {
    /// The finished interval.
    fn with(&self, cells: Vec<Cell>, cells_max: usize) -> CorridorInterval {
        CorridorInterval {
            from_m: self.from_m,
            to_m: self.from_m + self.piece.length_m,
            from_s: self.from_s,
            to_s: self.from_s + self.piece.duration_s,
            cells: thinned(cells, cells_max),
        }
    }
}

/// Equal parts of a piece, each at most `spacing_m` long. Their lengths and durations add up to the piece's within
/// rounding, which the resolution allowance covers.
fn cut(piece: &ReportedPiece, spacing_m: f64) -> impl Iterator<Item = ReportedPiece> + use<> {
    let parts = larger((piece.length_m / spacing_m).ceil(), 1.0);
    let part =
        ReportedPiece { length_m: piece.length_m / parts, duration_s: piece.duration_s / parts, ..*piece };
    std::iter::repeat_n(part, parts as usize)
}

/// Reaches of each span's travel without the resolution allowance.
fn travels(error: &TravelError, spans: &[Span]) -> Vec<Reaches> {
    let bare = TravelError { slack_m: 0.0, ..*error };
    spans.iter().map(|span| bare.reaches(&[span.piece])).collect()
}

/// For each span the reaches of D(0→a) ⊕ conv({0} ∪ D(a→b)).
fn ahead(error: &TravelError, spans: &[Span]) -> Vec<Reaches> {
    accumulated(error, travels(error, spans).iter())
}

/// For each span the reaches of −( D(b→end) ⊕ conv({0} ∪ D(a→b)) ).
fn behind(error: &TravelError, spans: &[Span]) -> Vec<Reaches> {
    let mut all = accumulated(error, travels(error, spans).iter().rev());
    all.reverse();
    all.iter().map(mirrored).collect()
}

/// For each set of `travels`: the sum of those before it, conv({0} ∪ itself), and the resolution allowance. (The
/// allowance is due once per travel; both ends of an interval are rounded, so it is added twice.)
fn accumulated<'a>(error: &TravelError, travels: impl Iterator<Item = &'a Reaches>) -> Vec<Reaches> {
    let slack = disc_reaches(2.0 * error.slack_m);
    let mut before = [0.0; DIRECTION_COUNT];
    travels
        .map(|travel| {
            let mut reach = before;
            add_reaches(&mut reach, &travel.map(|r| larger(r, 0.0)));
            add_reaches(&mut reach, &slack);
            add_reaches(&mut before, travel);
            reach
        })
        .collect()
}

/// Drops cells inside others and joins near ones while there are too many.
fn thinned(cells: Vec<Cell>, cells_max: usize) -> Vec<Cell> {
    let mut set = Feasible {
        states: cells
            .into_iter()
            .map(|cell| State { cell, slice: 0, strays: 0, missed: Missed::NONE })
            .collect(),
    };
    set.drop_covered();
    let mut cells: Vec<Cell> = set.states.into_iter().map(|state| state.cell).collect();
    let mut joined = Vec::with_capacity(cells.len().min(cells_max));
    join_groups(&mut cells, cells_max, &mut joined);
    joined
}

/// Halves the cells across the wider side of their surroundings until `groups` groups are reached, and joins each.
fn join_groups(cells: &mut [Cell], groups: usize, joined: &mut Vec<Cell>) {
    if cells.len() <= groups {
        joined.extend_from_slice(cells);
    } else if groups <= 1 {
        joined.extend(cells.iter().copied().reduce(|a, b| a.hull(&b)));
    } else {
        let around = cells.iter().copied().reduce(|a, b| a.hull(&b)).expect("more cells than groups");
        let around = around.bounding_box();
        let is_wide = around.east.width() >= around.north.width();
        let middle = |cell: &Cell| {
            let b = cell.bounding_box();
            if is_wide { b.east.middle() } else { b.north.middle() }
        };
        cells.sort_by(|a, b| middle(a).total_cmp(&middle(b)));
        let (low, high) = cells.split_at_mut(cells.len() / 2);
        join_groups(low, groups / 2, joined);
        join_groups(high, groups - groups / 2, joined);
    }
}
