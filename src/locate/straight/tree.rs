//! The runs of a block, sorted into a tree by the landmarks they pass.

use super::chain::{LOOK_BACK, Limits, Run, TEST_SLACK_M, keeps, places};
use super::index::ends;
use super::terms::HeadingTerms;
use super::{CANDIDATES_PER_BUDGET, Field, StraightOutcome, StraightRuns};
use crate::frame::LocalPoint;
use crate::interval::{Box2, larger, smaller};
use crate::locate::cell::{Cell, DIRECTION_COUNT, DIRECTIONS};

/// No chain.
const NONE: u32 = u32::MAX;

/// Up to this length a list of chains is lengthened by a look around each.
const SHORT_LIST: usize = 24;

/// Chains of landmarks of one length, with the number of the chain without its last member in the list before.
#[derive(Debug)]
struct Chains {
    length: usize,
    landmarks: Vec<u32>,
    parents: Vec<u32>,
}

impl Chains {
    fn new(length: usize) -> Self {
        Self { length, landmarks: Vec::new(), parents: Vec::new() }
    }

    fn len(&self) -> usize {
        self.parents.len()
    }

    fn chain(&self, number: usize) -> &[u32] {
        &self.landmarks[number * self.length..(number + 1) * self.length]
    }

    fn push(&mut self, before: &[u32], last: u32, parent: u32) {
        self.landmarks.extend_from_slice(before);
        self.landmarks.push(last);
        self.parents.push(parent);
    }
}

/// What the last step of a run says.
enum Finding {
    /// The spread is at most the fix size.
    Fix,
    /// This landmark explains the sighting from a place farther than the fix size from the true one.
    Elsewhere(u32),
    /// These are all the cells, and they spread too wide.
    Wide(Vec<(usize, Cell)>),
}

pub(super) struct Tree<'a, 'f> {
    all: &'a StraightRuns<'f>,
    field: &'a Field<'f>,
    terms: &'a HeadingTerms,
    runs: Vec<Run>,
    outcomes: Vec<StraightOutcome>,
    first: &'a Chains,
    /// By landmark: the first chain that ends with it, while a list is lengthened.
    heads: Vec<u32>,
    /// The landmarks that have one, bit by bit: small enough to stay in the nearest cache.
    marks: Vec<u64>,
}

impl<'a, 'f> Tree<'a, 'f> {
    pub fn solve(all: &'a StraightRuns<'f>, terms: &'a HeadingTerms, runs: Vec<Run>) -> Vec<StraightOutcome> {
        let starters = &all.field.starters;
        let first = Chains { length: 1, landmarks: starters.clone(), parents: vec![0; starters.len()] };
        let none = StraightOutcome::NoFix { certain_sightings: 0, has_places: false };
        let outcomes = vec![none; runs.len()];
        let mut tree = Tree {
            all,
            field: &all.field,
            terms,
            runs,
            outcomes,
            first: &first,
            heads: vec![NONE; all.field.points.len()],
            marks: vec![0; all.field.points.len() / 64 + 1],
        };
        let members = (0..tree.runs.len()).collect();
        tree.branch(members, 0, &Chains::new(0));
        tree.outcomes
    }

    /// Takes the runs that have passed the same `depth` landmarks, explained by `chains`, on to their next sighting.
    fn branch(&mut self, mut members: Vec<usize>, depth: usize, chains: &Chains) {
        members.retain(|&run| self.runs[run].sightings.len() > depth);
        let next = |run: usize, tree: &Self| tree.runs[run].sightings[depth].landmark;
        members.sort_by_key(|&run| (next(run, self), run));
        let mut rest = members.as_slice();
        while let Some(&first) = rest.first() {
            let landmark = next(first, self);
            let (group, others) = rest.split_at(rest.partition_point(|&run| next(run, self) <= landmark));
            rest = others;
            self.node(group, depth, chains);
        }
    }

    /// One more sighting, of the same landmark for all of `group`. `depth` sightings came before.
    fn node(&mut self, group: &[usize], depth: usize, before: &Chains) {
        for &run in group {
            self.runs[run].advance(self.terms);
        }
        let longer;
        let chains = if depth == 0 {
            self.first
        } else {
            let Some(chains) = self.lengthen(group, depth, before) else {
                for &run in group {
                    let start = self.runs[run].start;
                    self.outcomes[run] = self.all.solve_plainly(self.terms.heading_rad, start);
                    self.runs[run].sightings.clear();
                }
                return;
            };
            longer = chains;
            &longer
        };
        let mut unfixed = Vec::with_capacity(group.len());
        for &run in group {
            match self.find(run, chains) {
                Finding::Fix => {
                    self.outcomes[run] = StraightOutcome::Fix(self.runs[run].sightings[depth].window.hi());
                }
                finding if self.runs[run].sightings.len() == depth + 1 => {
                    let has_places = self.has_places(run, chains, finding);
                    self.outcomes[run] = StraightOutcome::NoFix { certain_sightings: depth + 1, has_places };
                }
                _ => {
                    unfixed.push(run);
                    continue;
                }
            }
            self.runs[run].steps = Vec::new();
        }
        self.branch(unfixed, depth + 1, chains);
    }

    /// Candidates with one more landmark, for all of `group`; `None` when they are too many.
    #[inline(never)]
    fn lengthen(&mut self, group: &[usize], depth: usize, before: &Chains) -> Option<Chains> {
        let most = CANDIDATES_PER_BUDGET.saturating_mul(self.field.solver.cell_budget);
        let limits: Vec<Limits> =
            (0..depth.min(LOOK_BACK)).map(|back| self.widest(group, depth, back)).collect();
        let mut longer = Chains::new(depth + 1);
        let field = self.field;
        // The limits of earlier pairs are narrower for this group than for the one that its list was made for.
        let earlier: Vec<(usize, Limits)> = match depth {
            0 | 1 => Vec::new(),
            _ => (0..(depth - 1).min(LOOK_BACK))
                .map(|back| (depth - 2 - back, self.widest(group, depth - 1, back)))
                .collect(),
        };
        let keeps_earlier = |chain: &[u32]| {
            let last = &field.points[chain[depth - 1] as usize];
            earlier.iter().all(|(a, limit)| keeps(limit, &field.points[chain[*a] as usize], last))
        };
        let keeps_limits = |chain: &[u32], next: u32| {
            let next = &field.points[next as usize];
            limits
                .iter()
                .enumerate()
                .all(|(back, limit)| keeps(limit, &field.points[chain[depth - 1 - back] as usize], next))
        };
        // A long list is joined with the pairs of its last landmarks and the next; a short one looks around each.
        if depth == 1 || before.len() > SHORT_LIST {
            let mut widest = limits[0];
            for (reach, [e, n]) in widest.iter_mut().zip(DIRECTIONS) {
                *reach += 2.0 * (e.abs() * field.half_east_m + n.abs() * field.half_north_m) + TEST_SLACK_M;
            }
            let found = if depth == 1 {
                let number_of = |first: u32| field.starter_number[first as usize];
                field.pairs.for_each(
                    &widest,
                    |first| number_of(first).is_some(),
                    |first, second| {
                        let number = number_of(first).expect("only starters are wanted");
                        longer.push(&[first], second, number);
                        longer.len() <= most
                    },
                )
            } else {
                // Chains by last landmark, as linked lists.
                let mut after = Vec::with_capacity(before.len());
                for number in 0..before.len() {
                    let last = before.chain(number)[depth - 1] as usize;
                    let head = &mut self.heads[last];
                    after.push(*head);
                    *head = number as u32;
                    self.marks[last / 64] |= 1 << (last % 64);
                }
                let (heads, marks) = (&self.heads, &self.marks);
                let found = field.pairs.for_each(
                    &widest,
                    |first| marks[first as usize / 64] >> (first % 64) & 1 == 1,
                    |first, second| {
                        let mut number = heads[first as usize];
                        while number != NONE {
                            let chain = before.chain(number as usize);
                            if keeps_limits(chain, second) && keeps_earlier(chain) {
                                longer.push(chain, second, number);
                            }
                            number = after[number as usize];
                        }
                        longer.len() <= most
                    },
                );
                for number in 0..before.len() {
                    let last = before.chain(number)[depth - 1] as usize;
                    self.heads[last] = NONE;
                    self.marks[last / 64] = 0;
                }
                found
            };
            if found.is_some() {
                return (longer.len() <= most).then_some(longer);
            }
        }
        // Where the next landmark may lie from each earlier one, boxes at their largest.
        let east_m = 2.0 * field.half_east_m + TEST_SLACK_M;
        let north_m = 2.0 * field.half_north_m + TEST_SLACK_M;
        let reaches: Vec<(LocalPoint, LocalPoint)> = limits
            .iter()
            .map(|limit| {
                let (low, high) = ends(limit);
                (
                    LocalPoint::new(low.east_m - east_m, low.north_m - north_m),
                    LocalPoint::new(high.east_m + east_m, high.north_m + north_m),
                )
            })
            .collect();
        for number in 0..before.len() {
            let chain = before.chain(number);
            if !keeps_earlier(chain) {
                continue;
            }
            let (mut west_m, mut east_m) = (f64::NEG_INFINITY, f64::INFINITY);
            let (mut south_m, mut north_m) = (f64::NEG_INFINITY, f64::INFINITY);
            for (back, (low, high)) in reaches.iter().enumerate() {
                let p = &field.points[chain[depth - 1 - back] as usize];
                west_m = larger(west_m, p.east_m + low.east_m);
                east_m = smaller(east_m, p.east_m + high.east_m);
                south_m = larger(south_m, p.north_m + low.north_m);
                north_m = smaller(north_m, p.north_m + high.north_m);
            }
            if west_m > east_m || south_m > north_m {
                continue;
            }
            let (low, high) = (LocalPoint::new(west_m, south_m), LocalPoint::new(east_m, north_m));
            field.grid.for_each(low, high, |landmark| {
                let next = &field.points[landmark as usize];
                let is_inside = (west_m <= next.east_m)
                    & (next.east_m <= east_m)
                    & (south_m <= next.north_m)
                    & (next.north_m <= north_m);
                let is_kept = is_inside && keeps_limits(chain, landmark);
                if is_kept && longer.len() <= most {
                    longer.push(chain, landmark, number as u32);
                }
            });
            if longer.len() > most {
                return None;
            }
        }
        Some(longer)
    }

    /// The largest limits of a group for the sighting of step `depth` against the one `back` + 1 before.
    fn widest(&self, group: &[usize], depth: usize, back: usize) -> Limits {
        let windows = self.terms.window_count();
        let mut widest = [f64::NEG_INFINITY; DIRECTION_COUNT];
        for &run in group {
            for limit in &self.runs[run].steps[depth].limits[back * windows..(back + 1) * windows] {
                widest = std::array::from_fn(|i| larger(widest[i], limit[i]));
            }
        }
        widest
    }

    /// What the last step says of a run.
    fn find(&mut self, run: usize, chains: &Chains) -> Finding {
        let run = &mut self.runs[run];
        for number in 0..chains.len() {
            let chain = chains.chain(number);
            let last = chain[chain.len() - 1];
            if run.is_far(self.field, last)
                && (0..self.terms.window_count()).any(|window| {
                    run.keeps(self.field, chain, window)
                        && (run.surely_has_cell(self.field, chain, window)
                            || run
                                .cell(self.field, chain, window, number as u32, chains.parents[number])
                                .is_some())
                })
            {
                return Finding::Elsewhere(last);
            }
        }
        // All that is left lies near the true position. Whole vantages that fit into the fix size need no cells.
        let near: Vec<usize> = (0..chains.len())
            .filter(|&number| {
                let chain = chains.chain(number);
                !run.is_far(self.field, chain[chain.len() - 1])
                    && (0..self.terms.window_count()).any(|window| run.keeps(self.field, chain, window))
            })
            .collect();
        let outer = near
            .iter()
            .map(|&number| run.outer_box(self.field, self.terms, chains.chain(number)[chains.length - 1]))
            .reduce(Box2::hull);
        let fits = outer.is_some_and(|outer| {
            let diagonal = libm::hypot(outer.east.width(), outer.north.width());
            diagonal + TEST_SLACK_M <= self.field.solver.fix_size_m
        });
        if fits {
            return Finding::Fix;
        }
        let mut cells = Vec::new();
        for number in near {
            collect(run, self.field, self.terms, chains, number, &mut cells);
        }
        let is_fix =
            run.spread_m(self.terms, &cells).is_some_and(|spread_m| spread_m <= self.field.solver.fix_size_m);
        if is_fix { Finding::Fix } else { Finding::Wide(cells) }
    }

    /// Whether more than one place is left at the last sighting.
    fn has_places(&mut self, run: usize, chains: &Chains, finding: Finding) -> bool {
        let fix_size_m = self.field.solver.fix_size_m;
        let run = &mut self.runs[run];
        match finding {
            Finding::Wide(cells) => places(&cells, fix_size_m) > 1,
            Finding::Elsewhere(there) => {
                let here = run.sightings[chains.length - 1].landmark as u32;
                let around = run.steps[chains.length - 1].around;
                let windows = self.terms.window_count();
                let last = (0..chains.len()).map(|number| chains.chain(number)[chains.length - 1]);
                let explains = |number: usize| {
                    (0..windows).any(|window| run.keeps(self.field, chains.chain(number), window))
                };
                if self.field.are_apart(here, there, around, last, explains) {
                    return true;
                }
                let mut cells = Vec::new();
                for number in 0..chains.len() {
                    collect(run, self.field, self.terms, chains, number, &mut cells);
                }
                places(&cells, fix_size_m) > 1
            }
            Finding::Fix => false,
        }
    }
}

/// Adds the cells of a chain in all windows.
fn collect(
    run: &mut Run,
    field: &Field<'_>,
    terms: &HeadingTerms,
    chains: &Chains,
    number: usize,
    cells: &mut Vec<(usize, Cell)>,
) {
    let chain = chains.chain(number);
    for window in 0..terms.window_count() {
        if run.keeps(field, chain, window)
            && let Some(cell) = run.cell(field, chain, window, number as u32, chains.parents[number])
        {
            cells.push((window, cell));
        }
    }
}
