//! Geometry on the Earth as RFC 7946 wants it: longitudes from −180 to 180, lines and polygons cut where they cross the
//! 180th meridian (section 3.1.9), outer rings counter-clockwise and holes clockwise (section 3.1.6).
//!
//! *Method.* Longitudes are first followed continuously along the line or ring, so that a step across the meridian stays
//! a short step. The plane of these longitudes is then cut at 180° plus whole turns, and each part is moved back.

use geo::orient::Direction;
use geo::{BooleanOps, BoundingRect, Coord, LineString, Orient, Polygon, Rect};

use crate::frame::GeoPoint;
use crate::order::{larger, smaller};

/// Longitude and latitude, degrees.
pub(super) type Pair = [f64; 2];

/// Steps per degree of what is written: 10⁻⁹° is about 0.1 mm on the ground.
const DEGREE_STEPS: f64 = 1e9;
/// A corner this close to the cut lies on it, degrees (about 1 mm): the clipping works on a fine grid of its own.
const ON_THE_CUT_DEG: f64 = 1e-8;

/// The pair as it is written.
pub(super) fn rounded(longitude_deg: f64, latitude_deg: f64) -> Pair {
    [longitude_deg, latitude_deg].map(|x| (x * DEGREE_STEPS).round() / DEGREE_STEPS)
}

/// A position with its longitude from −180 to 180.
pub(super) fn position(p: GeoPoint) -> Pair {
    let longitude_deg = if (-180.0..=180.0).contains(&p.lon_deg) {
        p.lon_deg
    } else {
        (p.lon_deg + 180.0).rem_euclid(360.0) - 180.0
    };
    rounded(longitude_deg, p.lat_deg)
}

/// The parts of a line, in its order and direction.
pub(super) fn line(points: &[GeoPoint]) -> Vec<Vec<Pair>> {
    let path = with_crossings(&followed(points));
    let mut parts: Vec<Vec<Pair>> = Vec::new();
    let mut turn_before = None;
    for step in path.windows(2) {
        let middle = 0.5 * (step[0].x + step[1].x);
        // A step along the cut itself stays with the part before it.
        let turn = match turn_before {
            Some(before) if is_on_cut(middle) => before,
            _ => turn_of(middle),
        };
        if turn_before != Some(turn) {
            parts.push(vec![moved_back(step[0], turn)]);
            turn_before = Some(turn);
        }
        if let Some(part) = parts.last_mut() {
            part.push(moved_back(step[1], turn));
        }
    }
    if parts.is_empty() {
        parts.push(points.iter().map(|&p| position(p)).collect());
    }
    parts
}

/// The parts of a polygon, each a list of closed rings with the outer one first. Corners are given once each.
pub(super) fn polygon(outer: &[GeoPoint], holes: &[Vec<GeoPoint>]) -> Vec<Vec<Vec<Pair>>> {
    let outer = around_pole(followed(outer));
    let (west, east) = extent(&outer);
    let middle = 0.5 * (west + east);
    let holes = holes.iter().map(|hole| {
        let hole = followed(hole);
        let (hole_west, hole_east) = extent(&hole);
        // A hole lies inside its ring, so it belongs to the same turn as the ring around it.
        let turns = ((middle - 0.5 * (hole_west + hole_east)) / 360.0).round();
        LineString::new(hole.into_iter().map(|c| Coord { x: c.x + 360.0 * turns, y: c.y }).collect())
    });
    let whole = Polygon::new(LineString::new(outer), holes.collect());
    let (first, last) = (turn_of(west + ON_THE_CUT_DEG), turn_of(east - ON_THE_CUT_DEG));
    if first >= last {
        return vec![rings(&whole, first)];
    }
    let mut parts = Vec::new();
    for turn in first..=last {
        let Some(bounds) = whole.bounding_rect() else { continue };
        // No wider than the polygon: the clipping's own grid is as fine as the extent is small.
        let window = Rect::new(
            Coord { x: larger(bounds.min().x, 360.0 * turn as f64 - 180.0), y: bounds.min().y },
            Coord { x: smaller(bounds.max().x, 360.0 * turn as f64 + 180.0), y: bounds.max().y },
        );
        parts.extend(whole.intersection(&window.to_polygon()).iter().map(|part| rings(part, turn)));
    }
    parts
}

/// Positions with longitudes that never step by more than half a turn.
fn followed(points: &[GeoPoint]) -> Vec<Coord<f64>> {
    let mut path: Vec<Coord<f64>> = Vec::with_capacity(points.len());
    for &point in points {
        let [mut x, y] = [position(point)[0], point.lat_deg];
        // The full value, not the rounded one, when it is already in range.
        if (-180.0..=180.0).contains(&point.lon_deg) {
            x = point.lon_deg;
        }
        if let Some(before) = path.last() {
            x += 360.0 * ((before.x - x) / 360.0).round();
        }
        path.push(Coord { x, y });
    }
    path
}

/// A ring around a pole does not close in the plane of longitudes: it is led to the pole, along it, and back.
fn around_pole(mut ring: Vec<Coord<f64>>) -> Vec<Coord<f64>> {
    let (Some(&first), Some(&last)) = (ring.first(), ring.last()) else { return ring };
    let turns = ((last.x - first.x) / 360.0).round();
    if turns != 0.0 {
        let pole = if first.y >= 0.0 { 90.0 } else { -90.0 };
        let end = first.x + 360.0 * turns;
        ring.extend([Coord { x: end, y: first.y }, Coord { x: end, y: pole }, Coord { x: first.x, y: pole }]);
    }
    ring
}

/// The path with a point wherever a step crosses the cut.
fn with_crossings(path: &[Coord<f64>]) -> Vec<Coord<f64>> {
    let mut cut: Vec<Coord<f64>> = path.first().copied().into_iter().collect();
    for step in path.windows(2) {
        let (a, b) = (step[0], step[1]);
        let (west, east) = (smaller(a.x, b.x), larger(a.x, b.x));
        let meridian = 360.0 * ((west + 180.0) / 360.0).floor() + 180.0;
        if west < meridian && meridian < east {
            let share = (meridian - a.x) / (b.x - a.x);
            cut.push(Coord { x: meridian, y: a.y + share * (b.y - a.y) });
        }
        cut.push(b);
    }
    cut
}

fn extent(ring: &[Coord<f64>]) -> (f64, f64) {
    ring.iter()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(west, east), c| (smaller(west, c.x), larger(east, c.x)))
}

/// Which turn of longitudes a value belongs to: 0 for −180 to 180.
fn turn_of(x: f64) -> i64 {
    ((x + 180.0) / 360.0).floor() as i64
}

fn is_on_cut(x: f64) -> bool {
    (x + 180.0).rem_euclid(360.0) == 0.0
}

fn moved_back(c: Coord<f64>, turn: i64) -> Pair {
    let x = c.x - 360.0 * turn as f64;
    let x = if (x.abs() - 180.0).abs() <= ON_THE_CUT_DEG { 180.0_f64.copysign(x) } else { x };
    rounded(x, c.y)
}

/// Closed rings, outer counter-clockwise, holes clockwise.
fn rings(polygon: &Polygon<f64>, turn: i64) -> Vec<Vec<Pair>> {
    let polygon = polygon.orient(Direction::Default);
    let ring = |ring: &LineString<f64>| ring.0.iter().map(|&c| moved_back(c, turn)).collect();
    std::iter::once(polygon.exterior()).chain(polygon.interiors()).map(ring).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn geo(points: &[(f64, f64)]) -> Vec<GeoPoint> {
        points.iter().map(|&(lon_deg, lat_deg)| GeoPoint { lat_deg, lon_deg }).collect()
    }

    /// Area of a closed ring in square degrees, above 0 when it runs counter-clockwise.
    fn signed(ring: &[Pair]) -> f64 {
        ring.windows(2).map(|s| 0.5 * (s[0][0] * s[1][1] - s[1][0] * s[0][1])).sum()
    }

    fn area(parts: &[Vec<Vec<Pair>>]) -> f64 {
        parts.iter().flatten().map(|ring| signed(ring)).sum()
    }

    /// What must hold of every polygon: closed rings, the right way round, no edge over half a turn, longitudes in range.
    fn check(parts: &[Vec<Vec<Pair>>]) {
        for part in parts {
            for (place, ring) in part.iter().enumerate() {
                assert_eq!(ring.first(), ring.last());
                assert!(ring.len() >= 4);
                assert_eq!(signed(ring) > 0.0, place == 0, "{ring:?}");
                assert!(ring.iter().all(|p| (-180.0..=180.0).contains(&p[0])), "{ring:?}");
                assert!(ring.windows(2).all(|s| (s[1][0] - s[0][0]).abs() < 180.0), "{ring:?}");
            }
        }
    }

    #[test]
    fn a_line_across_the_meridian_has_two_parts() {
        // The example of RFC 7946, section 3.1.9: from 45° N 170° E across the meridian to 45° N 170° W.
        let parts = line(&geo(&[(170.0, 45.0), (-170.0, 45.0)]));
        assert_eq!(parts, [vec![[170.0, 45.0], [180.0, 45.0]], vec![[-180.0, 45.0], [-170.0, 45.0]]]);
    }

    #[test]
    fn a_polygon_across_the_meridian_has_two_parts() {
        // The example of RFC 7946, section 3.1.9.
        let parts = polygon(&geo(&[(170.0, 40.0), (-170.0, 40.0), (-170.0, 50.0), (170.0, 50.0)]), &[]);
        check(&parts);
        assert_eq!(parts.len(), 2);
        let corners = |part: &[Vec<Pair>]| {
            let mut corners = part[0][1..].to_vec();
            corners.sort_by(|a, b| a[0].total_cmp(&b[0]).then(a[1].total_cmp(&b[1])));
            corners
        };
        let expected = |west, east| vec![[west, 40.0], [west, 50.0], [east, 40.0], [east, 50.0]];
        assert_eq!(corners(&parts[0]), expected(170.0, 180.0));
        assert_eq!(corners(&parts[1]), expected(-180.0, -170.0));
    }

    #[test]
    fn a_line_that_touches_the_meridian_stays_whole() {
        for side in [1.0, -1.0] {
            let parts = line(&geo(&[(179.0 * side, 0.0), (180.0 * side, 1.0), (179.0 * side, 2.0)]));
            assert_eq!(parts, [vec![[179.0 * side, 0.0], [180.0 * side, 1.0], [179.0 * side, 2.0]]]);
        }
        // Written with the sign of the other side.
        let parts = line(&geo(&[(179.0, 0.0), (-180.0, 1.0)]));
        assert_eq!(parts, [vec![[179.0, 0.0], [180.0, 1.0]]]);
    }

    #[test]
    fn a_line_that_waits_on_the_meridian_is_cut_once() {
        let parts = line(&geo(&[(179.0, 0.0), (180.0, 0.0), (180.0, 1.0), (-179.0, 1.0)]));
        assert_eq!(
            parts,
            [vec![[179.0, 0.0], [180.0, 0.0], [180.0, 1.0]], vec![[-180.0, 1.0], [-179.0, 1.0]]]
        );
    }

    #[test]
    fn a_notched_polygon_with_a_hole_keeps_its_area() {
        // Two teeth reach over the meridian from the west; one hole lies on it, one beside it.
        let ring = [
            (179.0, 0.0),
            (-178.0, 0.0),
            (-178.0, 2.5),
            (179.5, 2.5),
            (179.5, 3.5),
            (-178.0, 3.5),
            (-178.0, 6.0),
            (179.0, 6.0),
        ];
        let holes = [
            geo(&[(179.8, 1.0), (-179.2, 1.0), (-179.2, 2.0), (179.8, 2.0)]),
            geo(&[(-179.0, 4.0), (-178.5, 4.0), (-178.5, 5.0), (-179.0, 5.0)]),
        ];
        for turned in [false, true] {
            let mut ring = geo(&ring);
            if turned {
                ring.reverse();
            }
            let parts = polygon(&ring, &holes);
            check(&parts);
            // West of the meridian one part, east of it one for each tooth.
            assert_eq!(parts.len(), 3);
            assert!((area(&parts) - (18.0 - 2.5 - 1.0 - 0.5)).abs() < 1e-7, "{}", area(&parts));
        }
    }

    #[test]
    fn a_polygon_around_a_pole_reaches_it() {
        for pole in [90.0, -90.0] {
            let ring: Vec<(f64, f64)> =
                (0..36).map(|k| (f64::from(k) * 10.0 - 180.0, pole * 88.0 / 90.0)).collect();
            let parts = polygon(&geo(&ring), &[]);
            // A strip of 360° by 2°. Its top edge along the pole is one step.
            assert!((area(&parts) - 720.0).abs() < 1e-6, "{}", area(&parts));
            assert!(parts.iter().flatten().flatten().all(|p| (-180.0..=180.0).contains(&p[0])));
        }
    }

    #[test]
    fn away_from_the_meridian_nothing_is_cut() {
        let parts = polygon(&geo(&[(10.0, 0.0), (10.0, 1.0), (11.0, 1.0), (11.0, 0.0)]), &[]);
        check(&parts);
        assert_eq!(parts.len(), 1);
        assert_eq!(parts[0][0].len(), 5);
        // A ring with an edge on the meridian, written with either sign.
        for sign in [1.0, -1.0] {
            let parts =
                polygon(&geo(&[(180.0 * sign, 0.0), (180.0 * sign, 1.0), (179.0, 1.0), (179.0, 0.0)]), &[]);
            check(&parts);
            assert_eq!(parts.len(), 1);
        }
    }
}
