//! Regular layouts: a row or a grid looks like itself under every shift by whole periods.
//!
//! Shifts that overlap themselves are sorted by the landmarks that agree. The first one spans a set of landmarks; the
//! others that stay inside this set are shifts of the same layout. The shortest strong one gives the first period, the
//! shortest that points elsewhere the second; a layout is regular when most of its shifts are whole combinations of these.

use super::components::Component;
use super::constellation::Constellation;
use crate::report::{LookAlikeKind, Period};
use crate::track::plan::wrap;

/// Fewest landmarks that must agree in a shift from which a layout is built.
const AGREEING_LEAST: usize = 4;
/// Fewest landmarks that both grounds of such a shift must have in common.
const COMMON_LEAST: usize = 2;
/// Fewest shifts of a layout.
const SHIFTS_LEAST: usize = 3;
/// Share of the shifts inside a layout that must be whole combinations of the periods.
const FITTING_LEAST: f64 = 0.6;
/// Share of a shift's landmarks that must lie in the layout.
const INSIDE_LEAST: f64 = 0.8;
/// How far from a whole combination a shift may be, as a share of the shorter period.
const OFF_MOST: f64 = 0.25;
/// Smallest sine between the two periods of a grid (30°).
const APART_SINE: f64 = 0.5;

/// A layout and the numbers of the components that are its shifts.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Layout {
    pub(super) kind: LookAlikeKind,
    pub(super) periods: Vec<Period>,
    pub(super) landmarks: Vec<u32>,
    /// Components, ascending.
    pub(super) shifts: Vec<usize>,
}

/// Whether a component may be a shift that a layout is built from: cheap, before its constellation is known.
pub(super) fn may_be_shift(component: &Component) -> bool {
    component.window == 0 && component.most() >= AGREEING_LEAST && component.common() >= COMMON_LEAST
}

/// The layouts among `shifts`, pairs of component number and constellation. `components` are all there are.
pub(super) fn layouts(shifts: &[(usize, Constellation)], components: &[Component]) -> Vec<Layout> {
    let mut order: Vec<&(usize, Constellation)> = shifts
        .iter()
        .filter(|(_, c)| c.matches.len() >= AGREEING_LEAST && common(c) >= COMMON_LEAST)
        .collect();
    order.sort_by(|a, b| {
        let size = b.1.matches.len().cmp(&a.1.matches.len());
        size.then(a.1.overlay.apart_m().total_cmp(&b.1.overlay.apart_m())).then(a.0.cmp(&b.0))
    });
    let mut is_used = vec![false; components.len()];
    let mut found = Vec::new();
    for seed in 0..order.len() {
        if is_used[order[seed].0] {
            continue;
        }
        let set = landmarks(&order[seed].1);
        let inside: Vec<&(usize, Constellation)> = order[seed..]
            .iter()
            .copied()
            .filter(|(number, c)| !is_used[*number] && is_inside(&landmarks(c), &set))
            .collect();
        let Some(lattice) = Lattice::of(&inside) else { continue };
        let fitting: Vec<&&(usize, Constellation)> =
            inside.iter().filter(|(_, c)| lattice.holds(offset(c))).collect();
        if fitting.len() < SHIFTS_LEAST || (fitting.len() as f64) < FITTING_LEAST * inside.len() as f64 {
            continue;
        }
        let mut of_layout: Vec<u32> = fitting.iter().flat_map(|(_, c)| landmarks(c)).collect();
        of_layout.sort_unstable();
        of_layout.dedup();
        // Long shifts no longer overlap themselves, but belong here too.
        let shifts: Vec<usize> = components
            .iter()
            .enumerate()
            .filter(|(number, component)| {
                let is_in = |i: u32| of_layout.binary_search(&i).is_ok();
                !is_used[*number]
                    && component.window == 0
                    && component.matches.iter().all(|&(i, j)| is_in(i) && is_in(j))
            })
            .map(|(number, _)| number)
            .chain(fitting.iter().map(|(number, _)| *number))
            .collect();
        let mut shifts = shifts;
        shifts.sort_unstable();
        shifts.dedup();
        for &number in &shifts {
            is_used[number] = true;
        }
        found.push(Layout { kind: lattice.kind(), periods: lattice.periods(), landmarks: of_layout, shifts });
    }
    found
}

/// Landmarks of both grounds, in order.
fn landmarks(constellation: &Constellation) -> Vec<u32> {
    let mut all: Vec<u32> = constellation.matches.iter().flat_map(|&(i, j)| [i, j]).collect();
    all.sort_unstable();
    all.dedup();
    all
}

/// Number of landmarks that belong to both grounds.
fn common(constellation: &Constellation) -> usize {
    2 * constellation.matches.len() - landmarks(constellation).len()
}

fn is_inside(some: &[u32], set: &[u32]) -> bool {
    let inside = some.iter().filter(|i| set.binary_search(i).is_ok()).count();
    inside as f64 >= INSIDE_LEAST * some.len() as f64
}

fn offset(constellation: &Constellation) -> [f64; 2] {
    let (a, b) = (constellation.overlay.middle_1, constellation.overlay.middle_2);
    [b.east_m - a.east_m, b.north_m - a.north_m]
}

fn cross(a: [f64; 2], b: [f64; 2]) -> f64 {
    a[0] * b[1] - a[1] * b[0]
}

fn length(a: [f64; 2]) -> f64 {
    libm::hypot(a[0], a[1])
}

/// One or two periods.
#[derive(Clone, Copy, Debug)]
struct Lattice {
    first: [f64; 2],
    second: Option<[f64; 2]>,
}

impl Lattice {
    /// From shifts, the one with most agreeing landmarks first.
    fn of(shifts: &[&(usize, Constellation)]) -> Option<Self> {
        let most = shifts.first()?.1.matches.len();
        let mut strong: Vec<[f64; 2]> =
            shifts.iter().filter(|(_, c)| 2 * c.matches.len() >= most).map(|(_, c)| offset(c)).collect();
        strong.sort_by(|a, b| length(*a).total_cmp(&length(*b)));
        let first = *strong.first().filter(|v| length(**v) > 0.0)?;
        let second =
            strong.iter().copied().find(|v| cross(first, *v).abs() > APART_SINE * length(first) * length(*v));
        Some(Self { first, second })
    }

    /// Whether a shift is a whole combination of the periods.
    fn holds(&self, shift: [f64; 2]) -> bool {
        let first = self.first;
        let (a, b, second) = match self.second {
            Some(second) => {
                let area = cross(first, second);
                (cross(shift, second) / area, cross(first, shift) / area, second)
            }
            None => {
                let along = (shift[0] * first[0] + shift[1] * first[1]) / (length(first) * length(first));
                (along, 0.0, [0.0, 0.0])
            }
        };
        let (a, b) = (libm::round(a), libm::round(b));
        let off = [shift[0] - a * first[0] - b * second[0], shift[1] - a * first[1] - b * second[1]];
        length(off) <= OFF_MOST * length(first) && (a, b) != (0.0, 0.0)
    }

    fn kind(&self) -> LookAlikeKind {
        if self.second.is_some() { LookAlikeKind::Grid } else { LookAlikeKind::Row }
    }

    fn periods(&self) -> Vec<Period> {
        [Some(self.first), self.second]
            .into_iter()
            .flatten()
            .map(|v| Period { period_m: length(v), bearing_deg: axis_deg(v) })
            .collect()
    }
}

/// Bearing of a line through both ends of `v`, degrees in [0, 180).
fn axis_deg(v: [f64; 2]) -> f64 {
    let bearing = wrap(libm::atan2(v[0], v[1])).to_degrees();
    let axis = if bearing < 0.0 { bearing + 180.0 } else { bearing };
    if axis >= 180.0 { axis - 180.0 } else { axis }
}
