//! The runs of a block, sorted into a tree by the landmarks they pass.

use super::chain::{LOOK_BACK, Limits, Run, TEST_SLACK_M, keeps, places};
use super::index::ends;
use super::terms::HeadingTerms;
use super::{CANDIDATES_PER_BUDGET, Field, StraightOutcome, StraightRuns};
use crate::frame::LocalPoint;
use crate::interval::larger;
use crate::locate::cell::{Cell, DIRECTION_COUNT};

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
}

impl<'a, 'f> Tree<'a, 'f> {
    pub fn solve(all: &'a StraightRuns<'f>, terms: &'a HeadingTerms, runs: Vec<Run>) -> Vec<StraightOutcome> {
        let starters = &all.field.starters;
        let first = Chains { length: 1, landmarks: starters.clone(), parents: vec![0; starters.len()] };
        let none = StraightOutcome::NoFix { certain_sightings: 0, has_places: false };
        let outcomes = vec![none; runs.len()];
        let mut tree = Tree { all, field: &all.field, terms, runs, outcomes, first: &first };
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
    fn lengthen(&self, group: &[usize], depth: usize, before: &Chains) -> Option<Chains> {
        let most = CANDIDATES_PER_BUDGET.saturating_mul(self.field.solver.cell_budget);
        let windows = self.terms.window_count();
        let limits: Vec<Limits> = (0..depth.min(LOOK_BACK))
            .map(|back| {
                let mut widest = [f64::NEG_INFINITY; DIRECTION_COUNT];
                for &run in group {
                    for limit in &self.runs[run].steps[depth].limits[back * windows..(back + 1) * windows] {
                        widest = std::array::from_fn(|i| larger(widest[i], limit[i]));
                    }
                }
                widest
            })
            .collect();
        let mut longer = Chains::new(depth + 1);
        let field = self.field;
        if depth == 1 {
            let mut widest = limits[0];
            for (reach, [e, n]) in widest.iter_mut().zip(crate::locate::cell::DIRECTIONS) {
                *reach += 2.0 * (e.abs() * field.half_east_m + n.abs() * field.half_north_m) + TEST_SLACK_M;
            }
            let found = field.pairs.for_each(&widest, |first, second| {
                longer.push(&[first], second, first);
                longer.len() <= most
            });
            if found.is_some() {
                return (longer.len() <= most).then_some(longer);
            }
        }
        let reaches: Vec<(LocalPoint, LocalPoint)> = limits.iter().map(ends).collect();
        for number in 0..before.len() {
            let chain = before.chain(number);
            let mut near: Option<(LocalPoint, LocalPoint)> = None;
            for (back, (low, high)) in reaches.iter().enumerate() {
                let p = field.points[chain[depth - 1 - back] as usize];
                let east = p.half_east_m + field.half_east_m + TEST_SLACK_M;
                let north = p.half_north_m + field.half_north_m + TEST_SLACK_M;
                let this = (
                    LocalPoint::new(p.east_m + low.east_m - east, p.north_m + low.north_m - north),
                    LocalPoint::new(p.east_m + high.east_m + east, p.north_m + high.north_m + north),
                );
                near = Some(near.map_or(this, |other| Field::overlap(this, other)));
            }
            let Some((low, high)) = near else { continue };
            if low.east_m > high.east_m || low.north_m > high.north_m {
                continue;
            }
            field.for_each_in(low, high, |landmark| {
                let second = &field.points[landmark as usize];
                let is_kept = limits.iter().enumerate().all(|(back, limit)| {
                    keeps(limit, &field.points[chain[depth - 1 - back] as usize], second)
                });
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

    /// What the last step says of a run.
    fn find(&mut self, run: usize, chains: &Chains) -> Finding {
        let run = &mut self.runs[run];
        for number in 0..chains.len() {
            let chain = chains.chain(number);
            let last = chain[chain.len() - 1];
            if run.is_far(self.field, last)
                && (0..self.terms.window_count()).any(|window| {
                    run.keeps(self.field, chain, window)
                        && run
                            .cell(self.field, chain, window, number as u32, chains.parents[number])
                            .is_some()
                })
            {
                return Finding::Elsewhere(last);
            }
        }
        let mut cells = Vec::new();
        for number in 0..chains.len() {
            let chain = chains.chain(number);
            if !run.is_far(self.field, chain[chain.len() - 1]) {
                collect(run, self.field, self.terms, chains, number, &mut cells);
            }
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
                if self.field.are_apart(here, there, around).is_some() {
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
