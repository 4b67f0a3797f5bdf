use proptest::prelude::*;

use super::*;

fn box_of(e0: f64, e1: f64, n0: f64, n1: f64) -> Box2 {
    Box2 { east: Interval::new(e0, e1), north: Interval::new(n0, n1) }
}

#[test]
fn directions_are_even_and_opposite_in_pairs() {
    for i in 0..DIRECTION_COUNT {
        let (d, e) = (DIRECTIONS[i], DIRECTIONS[(i + 1) % DIRECTION_COUNT]);
        let gap = (CROSS[i][(i + 1) % DIRECTION_COUNT] / (d[0].hypot(d[1]) * e[0].hypot(e[1]))).asin();
        assert!((10.4..12.0).contains(&gap.to_degrees()), "{i}: {}", gap.to_degrees());
        let opposite = DIRECTIONS[(i + HALF) % DIRECTION_COUNT];
        assert_eq!(opposite.map(|x| -x + 0.0), d.map(|x| x + 0.0));
    }
    assert_eq!((DIRECTIONS[EAST], DIRECTIONS[NORTH]), ([1.0, 0.0], [0.0, 1.0]));
}

/// The least that any pair of reaches implies, tried one by one.
fn least_implied(bound: &Reaches, t: usize) -> f64 {
    let mut least = bound[t];
    for before in 1..HALF {
        for after in 1..HALF - before {
            let (a, b) = ((t + DIRECTION_COUNT - before) % DIRECTION_COUNT, (t + after) % DIRECTION_COUNT);
            least = smaller(least, implied(bound, t, a, b));
        }
    }
    least
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
    let first = whole.intersection(&triangle_side(4, -1.0)).expect("half-plane");
    let second = first.intersection(&triangle_side(14, -1.0)).expect("wedge");
    assert!(second.intersection(&triangle_side(26, -1.0)).is_none());
}

proptest! {
    // Failures become named tests, not files beside the manifest.
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

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
        cuts in proptest::collection::vec((0usize..DIRECTION_COUNT, -20.0..60.0f64), 1..12),
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
    fn tightening_finds_what_trying_all_pairs_finds(
        cuts in proptest::collection::vec((0usize..DIRECTION_COUNT, -60.0..60.0f64), 1..40),
    ) {
        let mut reach = *Cell::from_box(box_of(-50.0, 50.0, -50.0, 50.0)).reaches();
        for (d, h) in cuts { reach[d] = smaller(reach[d], h); }
        let all: Reaches = std::array::from_fn(|t| least_implied(&reach, t));
        match Cell::tightened(&reach) {
            None => prop_assert!((0..HALF).any(|i| all[i] + all[i + HALF] < 1e-9)),
            Some(cell) => {
                prop_assert!((0..HALF).all(|i| all[i] + all[i + HALF] > -1e-9), "emptiness not seen");
                for (t, h) in cell.reaches().iter().enumerate() {
                    prop_assert!((h - all[t]).abs() < 1e-9, "{t}: {h} against {}", all[t]);
                }
            }
        }
    }

    #[test]
    fn intersection_is_monotone(
        cuts in proptest::collection::vec((0usize..DIRECTION_COUNT, -20.0..60.0f64), 1..8),
        grow in proptest::collection::vec(0.0..5.0f64, DIRECTION_COUNT),
        origin in prop_oneof![Just(0.0), Just(1e7)],
    ) {
        let base = Cell::from_box(box_of(origin - 50.0, origin + 50.0, origin - 50.0, origin + 50.0));
        let mut small = *base.reaches();
        for (d, h) in cuts {
            let [de, dn] = DIRECTIONS[d];
            small[d] = smaller(small[d], h + origin * (de + dn));
        }
        let mut large = small;
        for i in 0..DIRECTION_COUNT { large[i] += grow[i] * f64::from(u8::from(grow[i] > 2.5)); }
        let (a, b) = (Cell::tightened(&small), Cell::tightened(&large));
        if let Some(a) = a {
            // Up to the rounding of a tightened reach.
            let grown = b.map(|b| b.minkowski_sum(&disc_reaches(1e-6)));
            prop_assert!(grown.is_some_and(|b| b.contains_cell(&a)));
        }
    }
}
