//! The search on the cells of the area map: dive points, lower bounds of their figures, causes of no fix.

use std::collections::BTreeMap;

use rayon::prelude::*;

use super::RUN_OUT_M;
use crate::dive::SearchHull;
use crate::frame::LocalPoint;
use crate::order::larger;
use crate::report::{AreaGrid, Cause, CauseCount, RunOutcome};
use crate::track::plan::direction;

/// The cells of the area map with what is guaranteed of their runs.
pub(super) struct Cells<'a> {
    pub grid: AreaGrid,
    pub places: &'a [(usize, usize)],
    /// By row and column: number among `places`.
    pub numbers: Vec<Option<usize>>,
    pub outcomes: &'a [RunOutcome],
}

pub(super) fn numbers(grid: &AreaGrid, places: &[(usize, usize)]) -> Vec<Option<usize>> {
    let mut numbers = vec![None; grid.columns * grid.rows];
    for (number, (column, row)) in places.iter().enumerate() {
        numbers[row * grid.columns + column] = Some(number);
    }
    numbers
}

pub(super) fn grid_centre(cells: &Cells<'_>, candidate: &Candidate) -> LocalPoint {
    let (column, row) = cells.places[candidate.place];
    cells.grid.centre(column, row)
}

impl Cells<'_> {
    /// The dive points whose disc lies inside the search area, each with the cells in its disc.
    pub fn discs(&self, scatter_m: f64, room: &Room<'_>) -> Vec<(usize, Vec<usize>)> {
        let reach = (scatter_m / self.grid.cell_m).floor() as isize;
        let within = |(columns, rows): &(isize, isize)| {
            libm::hypot(*columns as f64, *rows as f64) * self.grid.cell_m <= scatter_m
        };
        let steps: Vec<(isize, isize)> = (-reach..=reach)
            .flat_map(|rows| (-reach..=reach).map(move |columns| (columns, rows)))
            .filter(within)
            .collect();
        (0..self.places.len())
            .into_par_iter()
            .filter_map(|place| {
                let (column, row) = self.places[place];
                if room.hull.inside_m(self.grid.centre(column, row)) < room.margin_m {
                    return None;
                }
                let disc: Option<Vec<usize>> = steps
                    .iter()
                    .map(|&(columns, rows)| {
                        let column = column.checked_add_signed(columns)?;
                        let row = row.checked_add_signed(rows)?;
                        if column >= self.grid.columns || row >= self.grid.rows {
                            return None;
                        }
                        self.numbers[row * self.grid.columns + column]
                    })
                    .collect();
                Some((place, disc?))
            })
            .collect()
    }

    /// The longest guaranteed fix distance over the cells of a disc, or the first cause of none.
    pub fn judge(&self, place: usize, disc: &[usize], heading: usize, headings: usize) -> Judged {
        let mut fix_m: f64 = 0.0;
        for cell in disc {
            match self.outcomes[cell * headings + heading] {
                RunOutcome::Fix(of_cell_m) => fix_m = larger(fix_m, of_cell_m),
                RunOutcome::NoFix(cause) => return Judged::Without(cause),
            }
        }
        Judged::Candidate(Candidate { place, heading, fix_m })
    }
}

/// A dive point and a heading with a lower bound of the longest guaranteed fix distance.
#[derive(Clone, Copy, Debug)]
pub(super) struct Candidate {
    pub place: usize,
    pub heading: usize,
    pub fix_m: f64,
}

pub(super) enum Judged {
    Candidate(Candidate),
    Without(Cause),
}

/// Candidates without a fix, by the word of the cause.
#[derive(Default)]
pub(super) struct Tally {
    pub without: BTreeMap<&'static str, CauseCount>,
}

impl Tally {
    pub fn count(&mut self, judged: Judged) -> Option<Candidate> {
        match judged {
            Judged::Candidate(candidate) => Some(candidate),
            Judged::Without(cause) => {
                self.add(cause);
                None
            }
        }
    }

    pub fn add(&mut self, cause: Cause) {
        self.without.entry(cause.word()).or_insert(CauseCount { cause, candidates: 0 }).candidates += 1;
    }

    /// Most first; equal counts by the word of the cause.
    pub fn sorted(self) -> Vec<CauseCount> {
        let mut counts: Vec<CauseCount> = self.without.into_values().collect();
        counts.sort_by_key(|count| std::cmp::Reverse(count.candidates));
        counts
    }
}

/// How far a run may go.
pub(super) struct Room<'a> {
    pub hull: &'a SearchHull,
    /// What disc and inset need.
    pub margin_m: f64,
}

impl Room<'_> {
    pub fn ahead_m(&self, from: LocalPoint, heading_rad: f64) -> f64 {
        self.hull.room_m(from, direction(heading_rad), self.margin_m)
    }

    pub fn is_enough(&self, from: LocalPoint, heading_rad: f64, fix_m: f64) -> bool {
        self.ahead_m(from, heading_rad) >= fix_m + RUN_OUT_M
    }
}
