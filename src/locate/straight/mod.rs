//! Many straight runs at once: the guaranteed fix distance of every start of a block on one heading.
//!
//! The answers are those of the plain solver, [`ComposedRun::solve`] on a straight track of one start, found in another
//! order. No set is made smaller and none larger; work is saved in four ways.
//!
//! *1. Sines and cosines once per heading* (`terms.rs`): the numbers are the same to the last digit.
//!
//! *2. Only what decides is computed.* A run has its fix at the first sighting k at which the spread of W_k is at most the
//! fix size. The true position p_k lies in W_k (claim of `composed.rs`, for the dive without errors). So one cell of W_k
//! that is farther than the fix size from p_k proves that there is no fix yet, and all others can wait. Only when every
//! cell that is left lies near p_k are all of them computed, and then the spread exactly as the plain solver does it.
//!
//! *3. Chains instead of sets.* Without stray budget, each cell of W_k belongs to a window of bias and a chain of landmarks
//! (j_1 … j_k), one per sighting: it is the search area moved and cut by each landmark's vantage in turn. Take two
//! sightings a < b of the run. A cell of the chain at b has, in direction d_i, a reach of at most
//! box_{j_a}(i) + look_a(i) + travel_{ab}(i), because cutting never adds reach; it is cut by a vantage whose
//! reach in the opposite direction is box_{j_b}(i′) + look_b(i′). When the sum of the two is below zero, the solver finds
//! max d_i·p < min d_i·p and drops the cell as empty. The sum is a property of the pair (j_a, j_b): with v the vector
//! between the charted positions, the pair can only belong to a cell that is not empty if d_i·v is at most
//! c_i = look_a(i) + travel_{ab}(i) + look_b(i′), plus half-widths, in **all** directions. So candidates for the first two
//! sightings come from an index over landmark pairs by their vector, later ones by the same test against all earlier
//! members. **The tests drop only chains whose cell is empty**: the sums are evaluated with an allowance
//! ([`chain::TEST_SLACK_M`]) far above the rounding of the plain solver's reaches, which are rounded up, so
//! a sum below minus the allowance is below zero in the solver's own numbers too. What passes the tests is decided
//! by the solver's own operations on the chain, the query of its R-tree included.
//!
//! *4. Neighbours share candidates.* Starts of the block that pass the same landmarks in the same order are taken
//! together. Their limits differ a little (ranges and windows differ); candidates are looked up once with the largest
//! limits, and each start then applies its own. A larger list changes no answer, by 3.
//!
//! *What is not kept.* The plain solver drops cells inside other cells of the same window; here they stay. The union, its
//! hull, its spread and its places are the same, because moving and cutting are monotone.
//!
//! *Cost.* At 100 landmarks per km² and runs of 600 m a start has about four sightings before its fix, and groups hold three
//! to five starts. A third of the time goes into candidates for the first two and three sightings, whose number grows with
//! the number of landmarks (1500 pairs per group at 10⁴, 14 000 at 10⁵); the rest, which does not grow, into sightings,
//! their sets, and the cells that decide. So ten times the landmarks cost about six times as much per start
//! (`tests/bench/area.rs`). To grow more slowly, the proof that no other chain is left would have to begin from a choice
//! that is rarer than a pair: every pair that explains two sightings has to be looked at once.
//!
//! *Budget.* The cell budget counts cells kept at once. Here candidates are counted, per group of starts; where they are
//! more than [`CANDIDATES_PER_BUDGET`] budgets, and with a stray or miss budget, each start is solved by the plain solver,
//! which may answer that it is undecided. Where the plain solver runs out of its budget, this one may still decide, with
//! the answer that the plain solver gives to a larger budget.

mod chain;
mod index;
mod terms;
mod tree;

use chain::TEST_SLACK_M;
use index::{PairIndex, PointGrid};
use terms::HeadingTerms;

use super::composed::composed_travels;
use super::{Bounds, ComposedRun, Solver};
use crate::detect::Scene;
use crate::frame::LocalPoint;
use crate::interval::{Box2, Interval, larger};
use crate::track::plan::{Plan, direction};
use crate::vehicle::SonarKind;

/// Candidates per group of starts, in cell budgets, beyond which the plain solver takes over: a group's limits are wider
/// than those of its members, so its list is longer than any member's.
const CANDIDATES_PER_BUDGET: usize = 4;

/// Most landmarks looked at to show that the group around the true position is closed.
const GROUP_MAX: usize = 40;

/// What is guaranteed of one straight run.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum StraightOutcome {
    /// A fix at this distance, metres.
    Fix(f64),
    /// No fix within the run.
    NoFix {
        /// Certain sightings on the run.
        certain_sightings: usize,
        /// Whether more than one place is left at the last of them.
        has_places: bool,
    },
    /// The cell budget ran out.
    Undecided,
}

/// A landmark as the tests use it, metres.
#[derive(Clone, Copy, Debug)]
struct Point {
    east_m: f64,
    north_m: f64,
    half_east_m: f64,
    half_north_m: f64,
}

/// The map and the bounds, indexed for straight runs.
#[derive(Debug)]
struct Field<'a> {
    scene: Scene<'a>,
    solver: Solver<'a>,
    points: Vec<Point>,
    /// The landmarks that can be the first one seen by a vehicle that starts in the search area, and perhaps others.
    starters: Vec<u32>,
    /// By landmark: its number among the starters.
    starter_number: Vec<Option<u32>>,
    /// Largest half-widths of a box.
    half_east_m: f64,
    half_north_m: f64,
    grid: PointGrid,
    pairs: PairIndex,
}

/// Straight runs up to one length over one map, ready to be solved for blocks of starts.
#[derive(Debug)]
pub struct StraightRuns<'a> {
    field: Field<'a>,
    bounds: Bounds,
    misses: u8,
    longest_run_m: f64,
}

impl<'a> StraightRuns<'a> {
    /// Indexes the map. Runs are up to `longest_run_m` long; `solver` states search area, fix size and budgets, and at most
    /// `misses` landmarks are missed in a dive.
    pub fn new(scene: Scene<'a>, solver: Solver<'a>, bounds: Bounds, misses: u8, longest_run_m: f64) -> Self {
        let points: Vec<Point> = scene
            .landmarks
            .iter()
            .map(|landmark| Point {
                east_m: landmark.position.east_m,
                north_m: landmark.position.north_m,
                half_east_m: landmark.half_width_east_m,
                half_north_m: landmark.half_width_north_m,
            })
            .collect();
        let places: Vec<LocalPoint> = scene.landmarks.iter().map(|landmark| landmark.position).collect();
        let most = |of: fn(&Point) -> f64| points.iter().map(of).fold(0.0, larger);
        let (half_east_m, half_north_m) = (most(|p| p.half_east_m), most(|p| p.half_north_m));
        let grid = PointGrid::new(&places);
        // Two landmarks seen one after the other lie at most the run and two ranges apart.
        let pairs = PairIndex::new(&places, &grid, longest_run_m + 2.0 * scene.sonar.range_max_m);
        // A history travels up to a little more than the planned run before its first sighting.
        let travel_m = composed_travels(&bounds)
            .iter()
            .map(|travel| (travel.scale.hi() + travel.drift_mps / scene.vehicle.speed_mps) * longest_run_m)
            .fold(longest_run_m, larger);
        let reach = Interval::around(
            0.0,
            travel_m + 2.0 * scene.sonar.range_max_m + half_east_m + half_north_m + 10.0,
        );
        let start_box = solver.search_area.bounding_box().minkowski_sum(Box2 { east: reach, north: reach });
        let is_starter: Vec<bool> = places.iter().map(|place| start_box.contains(*place)).collect();
        let starters: Vec<u32> =
            (0..).zip(&is_starter).filter(|(_, is_starter)| **is_starter).map(|(number, _)| number).collect();
        let mut starter_number = vec![None; places.len()];
        for (number, &landmark) in (0..).zip(&starters) {
            starter_number[landmark as usize] = Some(number);
        }
        Self {
            field: Field {
                scene,
                solver,
                points,
                starters,
                starter_number,
                half_east_m,
                half_north_m,
                grid,
                pairs,
            },
            bounds,
            misses,
            longest_run_m,
        }
    }

    /// What is guaranteed of the runs from `starts` on `heading_rad`, in the order of the starts. Starts near each other
    /// share work; they may be any.
    pub fn solve(&self, heading_rad: f64, starts: &[LocalPoint]) -> Vec<StraightOutcome> {
        if self.field.solver.stray_budget > 0 || self.misses > 0 {
            return starts.iter().map(|&start| self.solve_plainly(heading_rad, start)).collect();
        }
        let terms = HeadingTerms::new(&self.field.scene, &self.bounds, heading_rad);
        let runs = self.runs(&terms, starts);
        tree::Tree::solve(self, &terms, runs)
    }

    /// The same for one start by the plain solver: one composed run, one query of the R-tree per cell.
    pub fn solve_plainly(&self, heading_rad: f64, start: LocalPoint) -> StraightOutcome {
        let plan = Plan::straight(start, heading_rad, self.longest_run_m);
        let run = ComposedRun::new(&self.field.scene, &plan, &[0.0], &self.bounds);
        let outcome = run.solve(&self.field.solver, self.misses, 0.0, |_, _| {});
        match outcome.fix_m {
            Some(fix_m) => StraightOutcome::Fix(fix_m),
            None if outcome.is_undecided => StraightOutcome::Undecided,
            None => StraightOutcome::NoFix {
                certain_sightings: outcome.certain_sightings,
                has_places: outcome.places.is_some_and(|places| places > 1),
            },
        }
    }

    /// The runs with their certain sightings in order.
    fn runs(&self, terms: &HeadingTerms, starts: &[LocalPoint]) -> Vec<chain::Run> {
        let Some(&origin) = starts.first() else { return Vec::new() };
        let scene = &self.field.scene;
        let along = direction(terms.heading_rad);
        let ahead =
            |p: LocalPoint| (p.east_m - origin.east_m) * along.x + (p.north_m - origin.north_m) * along.y;
        let abeam =
            |p: LocalPoint| (p.east_m - origin.east_m) * along.y - (p.north_m - origin.north_m) * along.x;
        let reach_m = scene.sonar.range_max_m;
        // Landmarks near any of the tracks, by distance abeam. The metre covers rounding and boxes' corners: a certain
        // sighting has its charted position within the range abeam, and its window holds the place abeam of it (behind
        // it by up to the range for a forward-looking sonar).
        let ends = |start: LocalPoint| {
            let run = along * self.longest_run_m;
            [start, LocalPoint::new(start.east_m + run.x, start.north_m + run.y)]
        };
        let all: Vec<LocalPoint> = starts.iter().flat_map(|&start| ends(start)).collect();
        let reach = Interval::around(0.0, reach_m + 1.0);
        let near = Box2::hull_of(&all).minkowski_sum(Box2 { east: reach, north: reach });
        let mut near: Vec<(f64, f64, usize)> = scene
            .index
            .meeting(near)
            .map(|number| {
                let p = scene.landmarks[number].position;
                (abeam(p), ahead(p), number)
            })
            .collect();
        near.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.2.cmp(&b.2)));
        let most_ahead_m = match scene.sonar.kind {
            SonarKind::SideLooking { .. } => self.longest_run_m + 1.0,
            SonarKind::ForwardLooking { .. } => self.longest_run_m + reach_m + 1.0,
        };
        let mut piece = Plan::straight(origin, terms.heading_rad, self.longest_run_m).pieces[0];
        let mut numbers = Vec::new();
        starts
            .iter()
            .map(|&start| {
                let (side_m, back_m) = (abeam(start), ahead(start));
                let first = near.partition_point(|(abeam_m, ..)| *abeam_m < side_m - reach_m - 1.0);
                numbers.clear();
                numbers.extend(
                    near[first..]
                        .iter()
                        .take_while(|(abeam_m, ..)| *abeam_m <= side_m + reach_m + 1.0)
                        .filter(|(_, ahead_m, _)| {
                            let ahead_m = ahead_m - back_m;
                            -1.0 <= ahead_m && ahead_m <= most_ahead_m
                        })
                        .map(|(.., number)| *number),
                );
                numbers.sort_unstable();
                piece.start = start;
                let mut sightings = Vec::with_capacity(numbers.len());
                for &landmark in &numbers {
                    terms.sightings(scene, &piece, landmark, &mut sightings);
                }
                sightings.sort_by(|a, b| {
                    a.window.hi().total_cmp(&b.window.hi()).then(a.landmark.cmp(&b.landmark))
                });
                chain::Run::new(start, sightings)
            })
            .collect()
    }
}

impl Field<'_> {
    /// Whether the true landmark `here` and the landmark `there` certainly belong to different places, when both explain
    /// the sighting. `around` holds the positions, less the landmark's, from which it may be seen; `candidates` are the
    /// landmarks that may explain it, and perhaps more, of which `explains` says by number which do, and perhaps more.
    ///
    /// Each of them stands for its whole vantage, which can only join places. When the group around `here` is closed
    /// without `there`, the two are apart.
    fn are_apart(
        &self,
        here: u32,
        there: u32,
        around: Box2,
        candidates: impl Iterator<Item = u32>,
        mut explains: impl FnMut(usize) -> bool,
    ) -> bool {
        let gap = self.solver.fix_size_m + 2.0 * TEST_SLACK_M;
        let east_m = gap + around.east.width() + 2.0 * self.half_east_m;
        let north_m = gap + around.north.width() + 2.0 * self.half_north_m;
        let mut rest: Vec<(u32, usize)> =
            candidates.zip(0..).filter(|&(landmark, _)| landmark != here).collect();
        let mut group = vec![here];
        let mut next = 0;
        while next < group.len() {
            let p = self.points[group[next] as usize];
            next += 1;
            rest.retain(|&(landmark, number)| {
                let q = self.points[landmark as usize];
                let is_near =
                    (q.east_m - p.east_m).abs() <= east_m && (q.north_m - p.north_m).abs() <= north_m;
                if is_near && explains(number) && !group.contains(&landmark) {
                    group.push(landmark);
                }
                !is_near
            });
            if group.len() > GROUP_MAX {
                return false;
            }
        }
        !group.contains(&there)
    }
}
