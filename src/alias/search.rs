//! From the components to the report: what is dangerous, in which order, and what is said of it.

use rayon::prelude::*;

use super::constellation::{Constellation, break_scale, constellation, middle};
use super::crossing::{Passings, length_m};
use super::layout::{Layout, layouts, may_be_shift};
use super::near::Near;
use super::tell_tale::tell_tale;
use super::tolerance::{AgreementBounds, Tolerance};
use super::triangles::Agreement;
use super::{Component, components_near};
use crate::dive::Dive;
use crate::map::index::LandmarkIndex;
use crate::report::{
    ChartLandmark, ChartLine, LOOK_ALIKE_STATEMENT, LinesReport, LookAlike, LookAlikeKind, LookAlikeStretch,
    LookAlikesReport, Parameters, Provenance, RegularLayout,
};
use crate::track::plan::Plan;

/// Look-alikes listed when nothing else is asked for.
pub const LISTED_DEFAULT: usize = 40;
/// Components that are looked at between two checks whether the list is settled.
const BATCH: usize = 256;

/// What is asked beyond the dive file.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LookAlikeRequest {
    /// Longest separation at which landmarks are compared, metres; none for [`separation_default_m`].
    pub separation_max_m: Option<f64>,
    /// Most entries to list.
    pub listed: usize,
    /// Whether a list of some of the look-alikes only is of no use: then nothing is listed when there are more than can be
    /// held, and no time and memory go into those that can.
    pub only_whole: bool,
}

impl Default for LookAlikeRequest {
    fn default() -> Self {
        Self { separation_max_m: None, listed: LISTED_DEFAULT, only_whole: false }
    }
}

/// The longest separation when none is given: twice the sonar's horizontal reach, the width of the swath.
pub fn separation_default_m(dive: &Dive) -> f64 {
    2.0 * dive.sonar.reach_m()
}

/// A look-alike before it is described.
struct Candidate {
    /// Number of the component.
    component: usize,
    constellation: Constellation,
    stretches: Vec<LookAlikeStretch>,
    line_m: f64,
    layout: Option<Layout>,
}

/// The most dangerous look-alikes of the map.
///
/// *Order.* Landmarks that agree, most first; then metres of the candidate lines over the grounds; then the distance
/// between the grounds. Look-alikes no farther apart than the fix size are counted and not listed.
pub fn look_alikes(
    dive: &Dive,
    request: &LookAlikeRequest,
    (provenance, parameters, landmarks): (Provenance, Parameters, Vec<ChartLandmark>),
) -> LookAlikesReport {
    let separation_max_m = request.separation_max_m.unwrap_or_else(|| separation_default_m(dive));
    let search = Search::new(dive, separation_max_m);
    let (components, complete) =
        components_near(&search.near, &search.bounds, separation_max_m, request.only_whole);
    let (mut candidates, in_layouts) = search.in_layouts(&components);
    let is_in_layout = |number: usize| in_layouts.binary_search(&number).is_ok();
    let is_far: Vec<bool> =
        components.par_iter().map(|component| apart_m(dive, component) > dive.scoring.fix_size_m).collect();
    let within_fix_size = (0..components.len()).filter(|&n| !is_far[n] && !is_in_layout(n)).count();
    let others: Vec<usize> = (0..components.len()).filter(|&n| is_far[n] && !is_in_layout(n)).collect();
    candidates.extend(search.best_of(&components, others, request.listed));
    candidates.sort_by(danger);
    candidates.truncate(request.listed);
    let look_alikes = candidates
        .par_iter()
        .enumerate()
        .map(|(place, candidate)| search.described(place + 1, candidate, &components))
        .collect();
    LookAlikesReport {
        provenance,
        parameters,
        separation_max_m,
        statement: LOOK_ALIKE_STATEMENT,
        found: components.len(),
        within_fix_size,
        in_layouts: in_layouts.len(),
        complete,
        look_alikes,
        landmarks,
        lines: dive
            .lines
            .iter()
            .map(|line| {
                let plan = Plan::new(line, dive.vehicle.turn_radius_m);
                ChartLine { name: line.name.clone(), path: plan.path(0.0, plan.length_m) }
            })
            .collect(),
    }
}

/// Marks the segments of the lines that run over the ground of a listed look-alike.
pub fn mark_lines(report: &mut LinesReport, look_alikes: &LookAlikesReport) {
    for line in &mut report.lines {
        for segment in &mut line.segments {
            let (start_m, end_m) = (segment.start_m, segment.end_m);
            segment.look_alikes = look_alikes
                .look_alikes
                .iter()
                .filter(|entry| {
                    entry.stretches.iter().any(|stretch| {
                        stretch.line == line.name && stretch.from_m < end_m && stretch.to_m >= start_m
                    })
                })
                .map(|entry| entry.number)
                .collect();
        }
    }
}

/// Distance between the mean positions of both sides of a component, metres.
fn apart_m(dive: &Dive, component: &Component) -> f64 {
    let of = |side: fn(&super::Match) -> u32| middle(&dive.landmarks, component.matches.iter().map(side));
    of(|m| m.0).distance_m(of(|m| m.1))
}

/// Most dangerous first; the last key settles ties by the order of the landmarks.
fn danger(a: &Candidate, b: &Candidate) -> std::cmp::Ordering {
    (b.constellation.matches.len().cmp(&a.constellation.matches.len()))
        .then(b.line_m.total_cmp(&a.line_m))
        .then(b.constellation.overlay.apart_m().total_cmp(&a.constellation.overlay.apart_m()))
        .then(a.constellation.matches.cmp(&b.constellation.matches))
}

/// Everything that the search needs at hand.
struct Search<'a> {
    dive: &'a Dive,
    bounds: AgreementBounds,
    near: Near<'a>,
    index: LandmarkIndex,
    passings: Passings,
}

impl<'a> Search<'a> {
    fn new(dive: &'a Dive, separation_max_m: f64) -> Self {
        Self {
            dive,
            bounds: AgreementBounds::of(dive),
            near: Near::new(&dive.landmarks, separation_max_m),
            index: LandmarkIndex::new(&dive.landmarks),
            passings: Passings::new(dive, separation_max_m),
        }
    }

    fn agreement(&self, window: usize) -> Agreement<'_> {
        let tolerance =
            Tolerance::at(&self.bounds, window, 1.0).expect("a component was found in a window in reach");
        Agreement::new(&self.near, tolerance, window)
    }

    fn constellation(&self, component: &Component) -> Constellation {
        constellation(component, &self.dive.landmarks, &self.agreement(component.window))
    }

    /// The regular layouts, each with its most dangerous shift, and the numbers of all components that are such shifts.
    /// Layouts whose shifts are all within the fix size are left to be counted as such.
    fn in_layouts(&self, components: &[Component]) -> (Vec<Candidate>, Vec<usize>) {
        let shifts: Vec<(usize, Constellation)> = components
            .par_iter()
            .enumerate()
            .filter(|(_, component)| may_be_shift(component))
            .map(|(number, component)| (number, self.constellation(component)))
            .collect();
        let mut numbers = Vec::new();
        let mut candidates = Vec::new();
        for layout in layouts(&shifts, components) {
            let stretches = self.passings.over(&layout.landmarks, 1);
            let line_m = length_m(&stretches);
            let worst = layout
                .shifts
                .iter()
                .map(|&number| {
                    let constellation = self.constellation(&components[number]);
                    Candidate {
                        component: number,
                        constellation,
                        stretches: stretches.clone(),
                        line_m,
                        layout: None,
                    }
                })
                .filter(|c| c.constellation.overlay.apart_m() > self.dive.scoring.fix_size_m)
                .min_by(danger);
            if let Some(mut worst) = worst {
                numbers.extend(&layout.shifts);
                worst.layout = Some(layout);
                candidates.push(worst);
            }
        }
        numbers.sort_unstable();
        (candidates, numbers)
    }

    /// Candidates among the components `numbers`, at least the `listed` most dangerous ones.
    fn best_of(&self, components: &[Component], mut numbers: Vec<usize>, listed: usize) -> Vec<Candidate> {
        let most: Vec<usize> = components.par_iter().map(Component::most).collect();
        numbers.sort_by(|a, b| most[*b].cmp(&most[*a]).then(a.cmp(b)));
        let mut found: Vec<Candidate> = Vec::new();
        for batch in numbers.chunks(BATCH) {
            // No constellation is larger than its component allows: the rest cannot enter the list any more.
            if found.len() >= listed && found[listed - 1].constellation.matches.len() > most[batch[0]] {
                break;
            }
            found.par_extend(batch.par_iter().map(|&number| {
                let constellation = self.constellation(&components[number]);
                let mut stretches = Vec::new();
                for (ground, side) in [(1, 0), (2, 1)] {
                    let mut of: Vec<u32> = constellation.matches.iter().map(|m| [m.0, m.1][side]).collect();
                    of.sort_unstable();
                    stretches.extend(self.passings.over(&of, ground));
                }
                let line_m = length_m(&stretches);
                Candidate { component: number, constellation, stretches, line_m, layout: None }
            }));
            found.sort_by(danger);
            found.truncate(listed);
        }
        found
    }

    fn described(&self, number: usize, candidate: &Candidate, components: &[Component]) -> LookAlike {
        let landmarks = &self.dive.landmarks;
        let component = &components[candidate.component];
        let agreement = self.agreement(component.window);
        let constellation = &candidate.constellation;
        let overlay = &constellation.overlay;
        let ids = |side: fn(&super::Match) -> u32| -> Vec<String> {
            constellation.matches.iter().map(|m| landmarks[side(m) as usize].id.clone()).collect()
        };
        let numbers = |side: fn(&super::Match) -> u32| -> Vec<usize> {
            constellation.matches.iter().map(|m| side(m) as usize).collect()
        };
        let tell = |ground| tell_tale(constellation, ground, landmarks, &self.index, &agreement);
        let bearing_deg = overlay.middle_1.bearing_rad(overlay.middle_2).to_degrees();
        LookAlike {
            number,
            kind: candidate.layout.as_ref().map_or(LookAlikeKind::Pair, |layout| layout.kind),
            landmarks: constellation.matches.len(),
            ground_1: ids(|m| m.0),
            ground_2: ids(|m| m.1),
            apart_m: overlay.apart_m(),
            bearing_deg: if bearing_deg < 0.0 { bearing_deg + 360.0 } else { bearing_deg },
            offset_east_m: overlay.middle_2.east_m - overlay.middle_1.east_m,
            offset_north_m: overlay.middle_2.north_m - overlay.middle_1.north_m,
            turn_deg: overlay.turn_rad.to_degrees(),
            disagreement_rms_m: constellation.rms_m,
            disagreement_worst_m: constellation.worst_m,
            break_scale: break_scale(component, &self.near, &self.bounds),
            tell_tale_1: tell(1),
            tell_tale_2: tell(2),
            line_m: candidate.line_m,
            stretches: candidate.stretches.clone(),
            layout: candidate.layout.as_ref().map(|layout| RegularLayout {
                landmarks: layout.landmarks.len(),
                periods: layout.periods.clone(),
                shifts: layout.shifts.len(),
            }),
            numbers_1: numbers(|m| m.0),
            numbers_2: numbers(|m| m.1),
            numbers_layout: candidate
                .layout
                .iter()
                .flat_map(|layout| layout.landmarks.iter().map(|&i| i as usize))
                .collect(),
        }
    }
}
