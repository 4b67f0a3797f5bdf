//! One straight run by the plain solver: the composed run and its forward pass with one query of the R-tree per cell.

use super::super::Setup;
use super::super::guarantee::why_not;
use crate::detect::Scene;
use crate::frame::LocalPoint;
use crate::locate::{Bounds, ComposedRun, Solver};
use crate::report::RunOutcome;
use crate::track::plan::Plan;

/// What every run has in common.
pub(super) struct Plain<'a> {
    scene: Scene<'a>,
    solver: Solver<'a>,
    bounds: Bounds,
    misses: u8,
    longest_run_m: f64,
}

impl<'a> Plain<'a> {
    pub(super) fn new(setup: &'a Setup<'_>, longest_run_m: f64) -> Self {
        Self {
            scene: setup.scene(),
            solver: setup.solver(),
            bounds: setup.bounds(),
            misses: setup.dive.budget.misses,
            longest_run_m,
        }
    }

    /// What is guaranteed of the run from `start` on `heading_rad`.
    pub(super) fn outcome(&self, start: LocalPoint, heading_rad: f64) -> RunOutcome {
        let plan = Plan::straight(start, heading_rad, self.longest_run_m);
        let run = ComposedRun::new(&self.scene, &plan, &[0.0], &self.bounds);
        let outcome = run.solve(&self.solver, self.misses, 0.0, |_, _| {});
        match outcome.fix_m {
            Some(fix_m) => RunOutcome::Fix(fix_m),
            None => RunOutcome::NoFix(why_not(&outcome, self.solver.fix_size_m).0),
        }
    }
}
