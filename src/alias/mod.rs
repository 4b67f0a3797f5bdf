//! Look-alikes: grounds that the vehicle cannot tell apart within its bounds, what separates them, and by how much the
//! errors would have to shrink.
//!
//! *Agreement graph.* A node is a **match** (i→j), i ≠ j: a vehicle that is really at landmark i may take it for landmark
//! j. Two matches (i→j), (i′→j′) of different landmarks are joined when the separations d = m_i′ − m_i and
//! e = m_j′ − m_j agree: there is an admissible dive past i and i′ and an admissible history past j and j′ that explains
//! the same detections. Only landmarks within a stated **longest separation** of each other are compared, on both sides.
//!
//! *Tolerance.* As in [`crate::locate::ComposedRun`], the history's values lie within twice composed bounds of the
//! truth's. Let the dive run straight from the sighting of i to that of i′, t its travel, r and r′ the landmarks' positions
//! relative to the vehicle: d = t + r′ − r. The history turns everything by one constant γ (|γ| ≤ 2·bias), and besides:
//!
//! - *Travel.* It moves by κ·Rot(γ + δ)·t, κ in [(1 − s)/(1 + s), (1 + s)/(1 − s)], |δ| ≤ 2ν, plus drift. So it differs
//!   from Rot(γ)·t by at most |t|·√((κ − 1)² + 4κ·sin² ν) + (1 + κ)·c·|t|/v at the largest κ.
//! - *Length of the travel.* Abeam sightings lie square to the track but for beam error, crab angle and noise; so
//!   |t| ≤ |d| + 2R·sin(ε + χ + ν). A forward-looking sonar may see each anywhere in its sector: |t| ≤ |d| + 2R.
//! - *Sighting.* Its relative position is ρ′·Rot(γ + δ) in place of ρ, |δ| ≤ 2ν + 2ε, ρ′ by composed range and altitude:
//!   a difference of at most S = sup √((ρ′ − ρ)² + 4ρρ′·sin²(ν + ε)) over the swath, once for each of the two.
//! - *Boxes.* d and e may each differ from the charted separation by the sum of two half-widths, east and north.
//!
//! Together: e₀ − Rot(γ)·d₀ lies in a box (the four half-widths) grown by a disc (travel and both sightings). γ is known
//! only as an interval: e₀ has to lie within that of an arc. The arc is replaced by its chord and a disc of its height, so
//! the test is closed and errs towards agreement. The two sides are always compared in one order, so that (i→j), (i′→j′)
//! agree exactly when (j→i), (j′→i′) do. A bias too large for one arc is cut into windows of ±5°, searched one by one;
//! the window about 180° finds ground that looks like itself turned by half a turn.
//!
//! *Components.* Agreement of two separations says little; a chain of such agreements may wander anywhere. What the
//! vehicle cannot tell apart has to agree in **every** separation it sees. So the graph is held together by triangles
//! (three matches, all three separations in agreement): triangles that share an edge form a component, and every
//! component has at least three landmarks on each side. This is monotone: shrinking any bound removes edges, so triangles,
//! and never adds a look-alike. Of each component the report gives a largest set found in which *every* two matches agree.
//! A component and its image, seen from the other ground, count once.
//!
//! *Break scale.* The factor to which **all** bounds (boxes included) have to shrink before no triangle of a component is
//! left: the smallest, over its triangles, of the largest scale at which one of the three edges breaks.
//!
//! *What it is not.* A statement about detections that agree. Strays and misses that a budget allows, and an overlap of
//! search areas, are not looked at; a landmark not seen is not used. Chance look-alikes of three landmarks are common in
//! every dense field (for matches in a common window of half-width w: about N·k²·(4λw²)^(k−1) of k landmarks in a random
//! field of density λ), and rank below those of many.
//!
//! *Frame and units.* Working frame, metres, radians.

mod components;
mod constellation;
mod crossing;
mod layout;
mod near;
mod search;
mod tell_tale;
mod tolerance;
mod triangles;

pub use components::Component;
pub use search::{LISTED_DEFAULT, LookAlikeRequest, look_alikes, mark_lines, separation_default_m};
pub use tolerance::AgreementBounds;
pub use triangles::{Match, Triangle};

use std::collections::HashMap;

use crate::map::Landmark;
use near::{Near, SeparationGrid};
use tolerance::Tolerance;
use triangles::Agreement;

/// Fewest landmarks of a look-alike.
pub const LANDMARKS_LEAST: usize = 3;

/// Most agreeing triangles that are kept: about 600 MB. Beyond it the search ends and says so.
pub const TRIANGLES_MAX: usize = 8_000_000;

/// Side of the cells into which separations are sorted, metres.
const CELL_M: f64 = 12.0;

/// The components of the agreement graph, and whether these are all (false beyond [`TRIANGLES_MAX`]).
pub fn components(
    landmarks: &[Landmark],
    bounds: &AgreementBounds,
    separation_max_m: f64,
) -> (Vec<Component>, bool) {
    components_near(&Near::new(landmarks, separation_max_m), bounds, separation_max_m, false)
}

fn components_near(
    near: &Near<'_>,
    bounds: &AgreementBounds,
    separation_max_m: f64,
    only_whole: bool,
) -> (Vec<Component>, bool) {
    let grid = SeparationGrid::new(near, separation_max_m, CELL_M);
    let mut found: Vec<Component> = Vec::new();
    let mut is_complete = true;
    let mut room = TRIANGLES_MAX;
    let mut before = 0..0;
    for window in bounds.windows() {
        let Some(tolerance) = Tolerance::at(bounds, window, 1.0) else { continue };
        let agreement = Agreement::new(near, tolerance, window);
        let (triangles, is_all) = agreement.triangles(&grid, room);
        if only_whole && !is_all {
            return (Vec::new(), false);
        }
        room -= triangles.len();
        is_complete &= is_all;
        let of_window = components::components(&triangles, near.len(), window);
        let from = found.len();
        add_new(&mut found, before, of_window);
        before = from..found.len();
    }
    (found, is_complete)
}

/// Adds the components of a window, without those that lie whole in one of the window before (windows meet at their
/// ends), and takes away those of the window before that lie whole in a new one.
fn add_new(found: &mut Vec<Component>, before: std::ops::Range<usize>, new: Vec<Component>) {
    if before.is_empty() {
        found.extend(new);
        return;
    }
    let mut by_match: HashMap<Match, Vec<usize>> = HashMap::new();
    for number in before {
        for &m in &found[number].matches {
            by_match.entry(m).or_default().push(number);
        }
    }
    let holds = |large: &Component, small: &Component| {
        small.matches.iter().all(|m| large.matches.binary_search(m).is_ok())
    };
    let mut is_replaced = vec![false; found.len()];
    let mut kept = Vec::new();
    for component in new {
        let mut others: Vec<usize> =
            component.matches.iter().filter_map(|m| by_match.get(m)).flatten().copied().collect();
        others.sort_unstable();
        others.dedup();
        if others.iter().any(|&number| holds(&found[number], &component)) {
            continue;
        }
        for number in others {
            is_replaced[number] |= holds(&component, &found[number]);
        }
        kept.push(component);
    }
    let mut number = 0;
    found.retain(|_| {
        number += 1;
        !is_replaced[number - 1]
    });
    found.extend(kept);
}
