//! The position solver: every position that some admissible history explains.
//!
//! Bounded-error (set-membership) localisation from an unknown start with anonymous detections. With D the set of
//! displacements that the reported travel allows, `[M_j]` the box of landmark j, and S(y) the set of relative positions
//! that a sighting y allows,
//!
//! ```text
//! X_k = ( X_(k−1) ⊕ D(d_k) ) ∩ ⋃_j ( [M_j] ⊕ −S(y_k) )
//! ```
//!
//! kept as a union of convex [`cell::Cell`]s: two distant answers stay two places.
//!
//! *Guarantee.* While the bounds hold, the true position at every event lies in the set returned for that event.
//! Every operation rounds outward; a cell is dropped only when it is proved empty or lies inside another cell of the
//! same kind; when the cell budget is exhausted the answer is [`Outcome::is_undecided`], never a smaller set.
//!
//! *What it never sees.* The true position, the true landmark of a detection, files, clocks, threads.
//!
//! *References.* [`crate::bibliography::BERTSEKAS_RHODES_1971`], [`crate::bibliography::JAULIN_2001`].

mod backward;
pub mod cell;
mod certain;
mod composed;
mod corridor;
mod feasible;
mod first;
mod forward;
mod history;
mod second;
mod steps;
mod straight;
mod strips;
mod unseen;
mod watch;

pub use backward::{SHRINK_M, SWEEPS_MAX, Sweeps};
pub use certain::certain_landmarks;
pub use composed::{ComposedOutcome, ComposedRun};
pub use corridor::{CorridorGrain, CorridorInterval};
pub use feasible::{EventSet, Feasible, State};
pub use forward::{EventSummary, Outcome, Solver, SolverMap};
pub use history::{Candidates, History};
pub use steps::{Bounds, Look, RESOLUTION_M, RESOLUTION_RAD, Step, steps};
pub use straight::{StraightOutcome, StraightRuns};
pub use unseen::{MISSES_MAX, Missed, Passage, Silence};
pub use watch::{FixHistory, FixWatch};
