//! The strips against the R-tree and against looking at every box.

use super::*;
use crate::frame::LocalPoint;
use crate::map::Landmark;

/// Landmarks spread out, in a row, in one heap, with one far away, with wide boxes among narrow ones.
fn maps() -> Vec<Vec<Landmark>> {
    let landmark = |i: u32, east_m: f64, north_m: f64, half_m: f64| Landmark {
        id: i.to_string(),
        position: LocalPoint::new(east_m, north_m),
        half_width_east_m: half_m,
        half_width_north_m: f64::from(i % 3) * 0.5 * half_m,
    };
    let hash = |i: u32, k: u32| f64::from(i.wrapping_mul(k) % 1000);
    vec![
        Vec::new(),
        vec![landmark(0, 5.0, 5.0, 1.0)],
        (0..400).map(|i| landmark(i, hash(i, 7919), hash(i, 104_729), f64::from(i % 5))).collect(),
        (0..300).map(|i| landmark(i, 3.0 * f64::from(i), 50.0, 2.0)).collect(),
        (0..200).map(|i| landmark(i, 500.0, 500.0, f64::from(i % 2) * 30.0)).collect(),
        (0..200)
            .map(|i| {
                let far = if i == 77 { 1e6 } else { 0.0 };
                let half_m = if i == 5 { 200.0 } else { 1.0 };
                landmark(i, hash(i, 7919) + far, hash(i, 104_729) - far, half_m)
            })
            .collect(),
    ]
}

fn query(k: u32) -> Box2 {
    let (east_m, north_m) = (f64::from(k * 37 % 1000), f64::from(k * 91 % 1000));
    let size_m = f64::from(k % 7) * 20.0;
    Box2 {
        east: Interval::new(east_m, east_m + size_m),
        north: Interval::new(north_m, north_m + 0.7 * size_m),
    }
}

#[test]
fn answers_are_those_of_the_tree_in_its_order() {
    for landmarks in maps() {
        let index = LandmarkIndex::new(&landmarks);
        let boxes: Vec<Box2> = landmarks.iter().map(Landmark::bounds).collect();
        let strips = Strips::new(&boxes, &index);
        assert_eq!(strips.len(), landmarks.len());
        let mut places = Vec::new();
        for k in 0..300 {
            strips.meeting(query(k), &mut places);
            let found: Vec<usize> = places.iter().map(|&place| strips.landmark_at(place)).collect();
            assert_eq!(found, index.meeting(query(k)).collect::<Vec<_>>());
        }
    }
}

#[test]
fn a_join_finds_every_pair() {
    for landmarks in maps() {
        let boxes: Vec<Box2> = landmarks.iter().map(Landmark::bounds).collect();
        let strips = Strips::new(&boxes, &LandmarkIndex::new(&landmarks));
        let window = Box2 { east: Interval::new(-12.3, 31.3), north: Interval::new(20.3, 44.3) };
        // No edge of a box plus an end of the window falls on an edge: rounding decides nothing.
        let firsts: Vec<Range<usize>> = (0..strips.count())
            .map(|strip| {
                let Range { start, end } = strips.places(strip);
                start + (end - start) / 5..end
            })
            .collect();
        let mut found = Vec::new();
        strips.join(&firsts, window, |first, place| {
            found.push((first, place));
            true
        });
        let mut scanned = Vec::new();
        for first in firsts.iter().cloned().flatten() {
            let query = strips.box_at(first).minkowski_sum(window);
            let meets = |&place: &usize| !strips.box_at(place).intersection(query).is_empty();
            scanned.extend((0..strips.len()).filter(meets).map(|place| (first, place)));
        }
        found.sort_unstable();
        assert_eq!(found, scanned);
    }
}

#[test]
fn near_pairs_are_all_pairs_that_are_near() {
    for landmarks in maps() {
        let boxes: Vec<Box2> = landmarks.iter().map(Landmark::bounds).collect();
        let strips = Strips::new(&boxes, &LandmarkIndex::new(&landmarks));
        for apart_m in [0.0, 11.3, 24.7, 60.3] {
            // The heap has too many pairs for a list.
            let Some(pairs) = strips.near_pairs(apart_m) else { continue };
            let found: Vec<[usize; 2]> = pairs.map(|[a, b]| [a.min(b), a.max(b)]).collect();
            let unique: std::collections::BTreeSet<[usize; 2]> = found.iter().copied().collect();
            assert_eq!(found.len(), unique.len());
            let reach = Interval::around(0.0, apart_m);
            for a in 0..strips.len() {
                assert!(strips.places(strips.strip_of(a)).contains(&a));
                let query = strips.box_at(a).minkowski_sum(Box2 { east: reach, north: reach });
                strips.for_each_meeting(query, |b| {
                    assert!(a >= b || unique.contains(&[a, b]), "{a} {b}");
                });
            }
        }
    }
    let spread: Vec<Landmark> = maps().swap_remove(3);
    let boxes: Vec<Box2> = spread.iter().map(Landmark::bounds).collect();
    let strips = Strips::new(&boxes, &LandmarkIndex::new(&spread));
    assert!(strips.near_pairs(5.0).is_some() && strips.near_pairs(5000.0).is_none());
}
