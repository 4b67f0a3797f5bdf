use proptest::prelude::*;

use super::*;

fn box_of(e0: f64, e1: f64, n0: f64, n1: f64) -> Box2 {
    Box2 { east: Interval::new(e0, e1), north: Interval::new(n0, n1) }
}

#[test]
fn combinations_reproduce_their_direction() {
    for c in COMBINATIONS.iter() {
        let (first, second) = (DIRECTIONS[c.first], DIRECTIONS[c.second]);
        for (axis, component) in DIRECTIONS[c.target].into_iter().enumerate() {
            let sum = c.alpha * Interval::point(first[axis]) + c.gamma * Interval::point(second[axis]);
            assert!(sum.contains(component));
        }
    }
    assert_eq!(COMBINATIONS.len(), 16 * 21);
}

#[test]
fn a_box_keeps_its_area_and_diameter() {
    let cell = Cell::from_box(box_of(100.0, 103.0, -4.0, 0.0));
    assert!((cell.area_m2() - 12.0).abs() < 1e-6);
    assert!(cell.diameter_m() >= 5.0 && cell.diameter_m() < 5.0 + 1e-9);
    assert_eq!(cell.corners().len(), 4);
}

#[test]
fn intersection_of_boxes_is_tight_at_large_coordinates() {
    let a = Cell::from_box(box_of(1e7, 1e7 + 10.0, 1e7, 1e7 + 10.0));
    let b = Cell::from_box(box_of(1e7 + 4.0, 1e7 + 20.0, 1e7 + 7.0, 1e7 + 9.0));
    let both = a.intersection(b.reaches()).expect("they overlap");
    assert!((both.area_m2() - 12.0).abs() < 1e-4, "{}", both.area_m2());
    let apart = Cell::from_box(box_of(1e7 + 10.001, 1e7 + 20.0, 1e7, 1e7 + 9.0));
    assert!(a.intersection(apart.reaches()).is_none());
}

#[test]
fn three_edges_without_a_common_point_are_empty() {
    // Pairwise overlapping sets without a common point: needs a combination of three edges to be seen.
    let triangle_side = |d: usize, h: f64| {
        let mut reach = *Cell::from_box(box_of(-100.0, 100.0, -100.0, 100.0)).reaches();
        reach[d] = h;
        reach
    };
    let whole = Cell::from_box(box_of(-100.0, 100.0, -100.0, 100.0));
    let first = whole.intersection(&triangle_side(2, -1.0)).expect("half-plane");
    let second = first.intersection(&triangle_side(7, -1.0)).expect("wedge");
    assert!(second.intersection(&triangle_side(13, -1.0)).is_none());
}

proptest! {
    #[test]
    fn minkowski_sum_and_intersection_keep_every_point(
        e in -1e6..1e6f64, n in -1e6..1e6f64, w in 0.0..50.0f64, t in 0.0..50.0f64,
        rho in 0.0..100.0f64, rho_width in 0.0..3.0f64, theta in -7.0..7.0f64, half in 0.0..3.0f64,
        u in 0.0..=1.0f64, v in 0.0..=1.0f64, x in 0.0..=1.0f64, y in 0.0..=1.0f64,
    ) {
        let cell = Cell::from_box(box_of(e, e + w, n, n + t));
        let patch = polar_reaches(Interval::new(rho, rho + rho_width), Interval::new(theta - half, theta + half));
        let p = LocalPoint::new((e + u * w).clamp(e, e + w), (n + v * t).clamp(n, n + t));
        let (r, a) = (rho + x * rho_width, theta - half + 2.0 * y * half);
        let moved = LocalPoint::new(p.east_m + r * a.sin(), p.north_m + r * a.cos());
        let sum = cell.minkowski_sum(&patch);
        prop_assert!(sum.contains(moved));
        // Any other cell that holds the moved point must leave it in the intersection.
        let other = Cell::from_box(Box2::around(moved, 1.0 + w, 0.5))
            .minkowski_sum(&polar_reaches(Interval::new(0.0, 2.0), Interval::new(theta, theta + half)));
        prop_assert!(other.contains(moved));
        let both = sum.intersection(other.reaches());
        prop_assert!(both.is_some_and(|c| c.contains(moved)));
        let both = both.expect("checked");
        prop_assert!(sum.contains_cell(&both) && other.contains_cell(&both));
    }

    #[test]
    fn tightened_reaches_are_attained(
        cuts in proptest::collection::vec((0usize..16, -20.0..60.0f64), 1..12),
    ) {
        // After an intersection each reach equals the largest projection of the corners: nothing is left loose.
        let mut reach = *Cell::from_box(box_of(-50.0, 50.0, -50.0, 50.0)).reaches();
        for (d, h) in cuts { reach[d] = smaller(reach[d], h); }
        if let Some(cell) = Cell::tightened(&reach) {
            for (d, h) in DIRECTIONS.iter().zip(cell.reaches()) {
                let most = cell.corners().iter().map(|p| d[0] * p.east_m + d[1] * p.north_m)
                    .fold(f64::NEG_INFINITY, larger);
                prop_assert!((most - h).abs() < 1e-2, "reach {h}, attained {most}");
            }
        }
    }

    #[test]
    fn intersection_is_monotone(
        cuts in proptest::collection::vec((0usize..16, -20.0..60.0f64), 1..8),
        grow in proptest::collection::vec(0.0..5.0f64, 16),
        origin in prop_oneof![Just(0.0), Just(1e7)],
    ) {
        let base = Cell::from_box(box_of(origin - 50.0, origin + 50.0, origin - 50.0, origin + 50.0));
        let mut small = *base.reaches();
        for (d, h) in cuts {
            let [de, dn] = DIRECTIONS[d];
            small[d] = smaller(small[d], h + origin * (de + dn));
        }
        let mut large = small;
        for i in 0..16 { large[i] += grow[i] * f64::from(u8::from(grow[i] > 2.5)); }
        let (a, b) = (Cell::tightened(&small), Cell::tightened(&large));
        if let Some(a) = a {
            prop_assert!(b.is_some_and(|b| b.contains_cell(&a)));
        }
    }
}
