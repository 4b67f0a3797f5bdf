//! Failing cells joined into regions, and the regions as polygons.

use std::collections::BTreeMap;

use geo::{Area, Buffer, Coord, LineString, Polygon, Rect, unary_union};

use crate::frame::LocalPoint;
use crate::report::{AreaGrid, RegionOutline, RemapCause};

/// Cells that belong together.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Group {
    /// Cells by column and row, ascending by row, then column, with the number of each in the list of failing cells.
    pub cells: Vec<(usize, usize)>,
    /// Cause of each cell.
    pub causes: Vec<RemapCause>,
}

/// Joins failing cells (ascending by row, then column) that share an edge and a cause. A group of fewer than `smallest`
/// cells joins the neighbour with which it shares the longest border; what has no neighbour is a speck. Returns the
/// groups and the specks.
pub(super) fn join(
    places: &[(usize, usize)],
    causes: &[RemapCause],
    smallest: usize,
) -> (Vec<Group>, Vec<Group>) {
    let number: BTreeMap<(usize, usize), usize> = places.iter().enumerate().map(|(i, &p)| (p, i)).collect();
    let edges: Vec<(usize, usize)> = places
        .iter()
        .enumerate()
        .flat_map(|(i, &(column, row))| [(column + 1, row), (column, row + 1)].map(|beside| (i, beside)))
        .filter_map(|(i, p)| Some((i, *number.get(&p)?)))
        .collect();
    let mut sets = Sets::new(places.len());
    for &(a, b) in edges.iter().filter(|&&(a, b)| causes[a] == causes[b]) {
        sets.join(a, b);
    }
    while let Some((small, neighbour)) = next_merge(&mut sets, &edges, smallest) {
        sets.join(small, neighbour);
    }
    let mut members: BTreeMap<usize, Vec<usize>> = BTreeMap::new();
    for i in 0..places.len() {
        members.entry(sets.root(i)).or_default().push(i);
    }
    members
        .into_values()
        .map(|cells| Group {
            causes: cells.iter().map(|&i| causes[i]).collect(),
            cells: cells.into_iter().map(|i| places[i]).collect(),
        })
        .partition(|group| group.cells.len() >= smallest)
}

/// The smallest group that is too small and has a neighbour, with the neighbour of the longest common border; ties go
/// to the first cell.
fn next_merge(sets: &mut Sets, edges: &[(usize, usize)], smallest: usize) -> Option<(usize, usize)> {
    let mut borders: BTreeMap<usize, BTreeMap<usize, usize>> = BTreeMap::new();
    for &(a, b) in edges {
        let (a, b) = (sets.root(a), sets.root(b));
        if a != b {
            *borders.entry(a).or_default().entry(b).or_insert(0) += 1;
            *borders.entry(b).or_default().entry(a).or_insert(0) += 1;
        }
    }
    let (small, around) = borders
        .into_iter()
        .filter(|(group, _)| sets.sizes[*group] < smallest)
        .min_by_key(|(group, _)| (sets.sizes[*group], *group))?;
    let (neighbour, _) =
        around.into_iter().max_by_key(|&(other, length)| (length, std::cmp::Reverse(other)))?;
    Some((small, neighbour))
}

/// Disjoint sets; the root of a set is its first member.
struct Sets {
    parents: Vec<usize>,
    sizes: Vec<usize>,
}

impl Sets {
    fn new(count: usize) -> Self {
        Self { parents: (0..count).collect(), sizes: vec![1; count] }
    }

    fn root(&mut self, mut i: usize) -> usize {
        while self.parents[i] != i {
            self.parents[i] = self.parents[self.parents[i]];
            i = self.parents[i];
        }
        i
    }

    fn join(&mut self, a: usize, b: usize) {
        let (a, b) = (self.root(a), self.root(b));
        let (first, second) = (a.min(b), a.max(b));
        if first != second {
            self.parents[second] = first;
            self.sizes[first] += self.sizes[second];
        }
    }
}

/// The union of cell squares that hang together by their edges: one polygon, holes kept. Corners are corners of cells.
pub(super) fn outline(cells: &[(usize, usize)], grid: &AreaGrid) -> RegionOutline {
    let squares: Vec<Polygon> = cells
        .iter()
        .map(|&(column, row)| {
            let low = Coord { x: column as f64, y: row as f64 };
            Rect::new(low, Coord { x: low.x + 1.0, y: low.y + 1.0 }).to_polygon()
        })
        .collect();
    let united = unary_union(&squares);
    // Cells that share edges unite to one polygon; the union works on a raster of its own, so whole numbers are restored.
    let polygon = united
        .0
        .into_iter()
        .max_by(|a, b| a.unsigned_area().total_cmp(&b.unsigned_area()))
        .expect("a region has cells");
    let ring = |line: &LineString, counter_clockwise: bool| {
        let mut corners: Vec<LocalPoint> = line
            .0
            .iter()
            .skip(1)
            .map(|c| {
                LocalPoint::new(
                    grid.west_m + c.x.round() * grid.cell_m,
                    grid.south_m + c.y.round() * grid.cell_m,
                )
            })
            .collect();
        if (signed_area_m2(&corners) > 0.0) != counter_clockwise {
            corners.reverse();
        }
        corners
    };
    RegionOutline {
        outer: ring(polygon.exterior(), true),
        holes: polygon.interiors().iter().map(|hole| ring(hole, false)).collect(),
    }
}

/// Area of a ring, m², positive when it runs counter-clockwise.
fn signed_area_m2(corners: &[LocalPoint]) -> f64 {
    let Some(&origin) = corners.first() else { return 0.0 };
    let relative = |p: LocalPoint| (p.east_m - origin.east_m, p.north_m - origin.north_m);
    let next = corners.iter().skip(1).chain(corners.first());
    corners
        .iter()
        .zip(next)
        .map(|(&a, &b)| {
            let ((ax, ay), (bx, by)) = (relative(a), relative(b));
            0.5 * (ax * by - bx * ay)
        })
        .sum()
}

/// The outline as a polygon of the `geo` crate.
pub(super) fn polygon(outline: &RegionOutline) -> Polygon {
    let ring = |corners: &[LocalPoint]| -> LineString {
        corners.iter().map(|p| Coord { x: p.east_m, y: p.north_m }).collect()
    };
    Polygon::new(ring(&outline.outer), outline.holes.iter().map(|hole| ring(hole)).collect())
}

/// Area of the ground within `reach_m` of the region, the region included, m².
pub(super) fn area_with_margin_m2(outline: &RegionOutline, reach_m: f64) -> f64 {
    if reach_m <= 0.0 {
        return polygon(outline).unsigned_area();
    }
    // Near the origin, so that no digits are lost.
    let origin = outline.outer[0];
    let moved = |corners: &[LocalPoint]| {
        corners
            .iter()
            .map(|p| LocalPoint::new(p.east_m - origin.east_m, p.north_m - origin.north_m))
            .collect::<Vec<_>>()
    };
    let near = RegionOutline {
        outer: moved(&outline.outer),
        holes: outline.holes.iter().map(|hole| moved(hole)).collect(),
    };
    polygon(&near).buffer(reach_m).unsigned_area()
}

/// Centre of the cell that lies deepest inside the region: the one with the most steps to a cell outside; among equal
/// ones the nearest to the mean of the cells.
pub(super) fn label_at(cells: &[(usize, usize)], grid: &AreaGrid) -> LocalPoint {
    let mut depth: BTreeMap<(usize, usize), usize> = cells.iter().map(|&cell| (cell, 0)).collect();
    let mut level: Vec<(usize, usize)> = cells.to_vec();
    let mut step = 0;
    while !level.is_empty() {
        step += 1;
        level.retain(|&(column, row)| {
            let around = [
                (column + 1, row),
                (column.wrapping_sub(1), row),
                (column, row + 1),
                (column, row.wrapping_sub(1)),
            ];
            around.iter().all(|cell| depth.get(cell).is_some_and(|&d| d + 1 >= step))
        });
        for cell in &level {
            depth.insert(*cell, step);
        }
    }
    let count = cells.len() as f64;
    let mean = |of: fn(&(usize, usize)) -> usize| cells.iter().map(|c| of(c) as f64).sum::<f64>() / count;
    let middle = (mean(|c| c.0), mean(|c| c.1));
    let off = |&(column, row): &(usize, usize)| {
        (column as f64 - middle.0).powi(2) + (row as f64 - middle.1).powi(2)
    };
    let best = cells
        .iter()
        .max_by(|a, b| depth[a].cmp(&depth[b]).then(off(b).total_cmp(&off(a))).then(b.cmp(a)))
        .expect("a region has cells");
    grid.centre(best.0, best.1)
}
