//! Where candidate lines run over regions.

use std::collections::BTreeMap;

use crate::assess::Setup;
use crate::frame::LocalPoint;
use crate::report::{AreaGrid, LineOverRegions, LinesReport, RegionStretch, RemapRegion, RemapReport};
use crate::track::plan::Plan;

/// Finds the region on which a position lies.
#[derive(Clone, Debug)]
pub struct RegionIndex {
    grid: AreaGrid,
    numbers: BTreeMap<(i64, i64), usize>,
}

impl RegionIndex {
    /// Indexes the cells of `regions`.
    pub fn new(grid: AreaGrid, regions: &[RemapRegion]) -> Self {
        let numbers = regions
            .iter()
            .flat_map(|region| {
                region.grid_cells.iter().map(|&(column, row)| ((column as i64, row as i64), region.number))
            })
            .collect();
        Self { grid, numbers }
    }

    /// Number of the region that holds `point`; none outside of all.
    pub fn region_at(&self, point: LocalPoint) -> Option<usize> {
        let column = ((point.east_m - self.grid.west_m) / self.grid.cell_m).floor();
        let row = ((point.north_m - self.grid.south_m) / self.grid.cell_m).floor();
        self.numbers.get(&(column as i64, row as i64)).copied()
    }

    /// The stretches of the path through `points` that lie on regions, with distances counted from its start.
    pub fn stretches(&self, points: &[LocalPoint]) -> Vec<RegionStretch> {
        let mut found: Vec<RegionStretch> = Vec::new();
        let mut along_m = 0.0;
        for pair in points.windows(2) {
            let (from, to) = (pair[0], pair[1]);
            let length_m = from.distance_m(to);
            let at = |t: f64| {
                LocalPoint::new(
                    from.east_m + t * (to.east_m - from.east_m),
                    from.north_m + t * (to.north_m - from.north_m),
                )
            };
            for cut in self.cuts(from, to).windows(2) {
                // Between two grid lines a straight piece lies in one cell: its middle tells which.
                let Some(region) = self.region_at(at(0.5 * (cut[0] + cut[1]))) else { continue };
                let (from_m, to_m) = (along_m + cut[0] * length_m, along_m + cut[1] * length_m);
                match found.last_mut() {
                    Some(last) if last.region == region && (from_m - last.to_m).abs() < 1e-6 => {
                        last.to_m = to_m;
                    }
                    _ => found.push(RegionStretch { region, from_m, to_m }),
                }
            }
            along_m += length_m;
        }
        found
    }

    /// Numbers of the regions that the path through `points` runs over, ascending.
    pub fn regions_under(&self, points: &[LocalPoint]) -> Vec<usize> {
        let mut numbers: Vec<usize> = self.stretches(points).iter().map(|stretch| stretch.region).collect();
        numbers.sort_unstable();
        numbers.dedup();
        numbers
    }

    /// Where a straight piece crosses grid lines, as shares of its length, with 0 and 1, ascending.
    fn cuts(&self, from: LocalPoint, to: LocalPoint) -> Vec<f64> {
        let mut cuts = vec![0.0, 1.0];
        let cell_m = self.grid.cell_m;
        for (start, end) in [
            (from.east_m - self.grid.west_m, to.east_m - self.grid.west_m),
            (from.north_m - self.grid.south_m, to.north_m - self.grid.south_m),
        ] {
            let (low, high) = if start < end { (start, end) } else { (end, start) };
            let (first, last) = ((low / cell_m).ceil() as i64, (high / cell_m).floor() as i64);
            let crossings = (first..=last).map(|k| (k as f64 * cell_m - start) / (end - start));
            cuts.extend(crossings.filter(|t| *t > 0.0 && *t < 1.0));
        }
        cuts.sort_by(f64::total_cmp);
        cuts
    }
}

/// Marks the segments of `lines` with the regions that they run over.
pub fn mark_segments(lines: &mut LinesReport, remap: &RemapReport) {
    let index = RegionIndex::new(remap.grid, &remap.regions);
    for segment in lines.lines.iter_mut().flat_map(|line| &mut line.segments) {
        segment.remap_regions = index.regions_under(&segment.path);
    }
}

/// The candidate lines of the dive over the regions.
pub(super) fn lines(setup: &Setup<'_>, index: &RegionIndex) -> Vec<LineOverRegions> {
    setup
        .dive
        .lines
        .iter()
        .map(|line| {
            let plan = Plan::new(line, setup.dive.vehicle.turn_radius_m);
            let track = plan.path(0.0, plan.length_m);
            let stretches = index.stretches(&track);
            LineOverRegions {
                name: line.name.clone(),
                length_m: plan.length_m,
                over_regions_m: stretches.iter().map(|stretch| stretch.to_m - stretch.from_m).sum(),
                stretches,
                track,
            }
        })
        .collect()
}
