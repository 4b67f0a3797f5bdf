//! Set operations against outside values: relaxed intersections, and areas of sets in the plane.
//!
//! *Sources* stand beside each check.

use fixability::detect::{Log, LogEvent, ReportedPiece};
use fixability::interval::paving::{Part, Paving, Verdict, pave};
use fixability::interval::{Box2, Interval, IntervalUnion, relaxed_intersection};
use fixability::locate::{Bounds, steps};
use fixability::vehicle::DeadReckoning;
use proptest::prelude::*;

use crate::support::scenes::open_field;

/// The six intervals of the worked example in the article "Relaxed intersection" of an open encyclopedia (read
/// there; the table was recomputed by counting).
const EXAMPLE: [(f64, f64); 6] = [(1.0, 4.0), (2.0, 4.0), (2.0, 7.0), (6.0, 9.0), (3.0, 4.0), (3.0, 7.0)];

#[test]
fn relaxed_intersection_agrees_with_the_published_table() {
    let sets = EXAMPLE.map(|(lo, hi)| Interval::new(lo, hi));
    let published: [&[(f64, f64)]; 6] =
        [&[], &[(3.0, 4.0)], &[(3.0, 4.0)], &[(2.0, 4.0), (6.0, 7.0)], &[(2.0, 7.0)], &[(1.0, 9.0)]];
    for (left_out, parts) in published.into_iter().enumerate() {
        let expected: Vec<Interval> = parts.iter().map(|(lo, hi)| Interval::new(*lo, *hi)).collect();
        assert_eq!(relaxed_intersection(&sets, left_out).parts(), expected, "{left_out} left out");
    }
    assert_eq!(relaxed_intersection(&sets, 6).parts(), [Interval::ENTIRE]);
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 2000, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn relaxed_intersection_agrees_with_counting(
        ends in prop::collection::vec((-9..9i32, 0..7i32), 0..9),
        left_out in 0..10usize,
    ) {
        let sets: Vec<Interval> = ends
            .iter()
            .map(|(lo, length)| Interval::new(f64::from(*lo), f64::from(lo + length)))
            .collect();
        let relaxed = relaxed_intersection(&sets, left_out);
        // Ends are whole numbers, so whole and half numbers meet every piece and every gap.
        for half in -20..40 {
            let x = 0.5 * f64::from(half);
            let held = sets.iter().filter(|set| set.contains(x)).count();
            prop_assert_eq!(relaxed.contains(x), held + left_out >= sets.len(), "{} in {:?}", x, &relaxed);
        }
        let parts = relaxed.parts();
        prop_assert!(parts.windows(2).all(|pair| pair[0].hi() < pair[1].lo()));
        prop_assert_eq!(IntervalUnion::of(parts.iter().rev().copied()), relaxed.clone());
        let wider = relaxed_intersection(&sets, left_out + 1);
        prop_assert_eq!(relaxed.intersection(&wider), relaxed);
    }
}

/// Points whose distance from a centre lies in a band: centre, then nearest and farthest, metres.
type Ring = ([f64; 2], [f64; 2]);

const RINGS: [Ring; 3] =
    [([0.0, 0.0], [95.0, 105.0]), ([120.0, 0.0], [75.0, 85.0]), ([40.0, 150.0], [85.0, 95.0])];

/// Whether a box lies in all rings but at most `left_out`.
fn in_rings(rings: &[Ring], left_out: usize, b: Box2) -> Verdict {
    let (mut certain, mut possible) = (0, 0);
    for ([east, north], [nearest, farthest]) in rings {
        let [x, y] = [b.east - Interval::point(*east), b.north - Interval::point(*north)];
        let distance_squared = x.sqr() + y.sqr();
        let band = Interval::new(nearest * nearest, farthest * farthest);
        certain += usize::from(band.contains_interval(distance_squared));
        possible += usize::from(!band.intersection(distance_squared).is_empty());
    }
    Verdict::at_least(rings.len() - left_out, certain, possible)
}

fn pave_rings(rings: &[Ring], left_out: usize, budget: usize) -> Paving {
    let start = Box2 { east: Interval::new(-120.0, 220.0), north: Interval::new(-130.0, 260.0) };
    pave(start, budget, |b| in_rings(rings, left_out, b))
}

/// Parts that hold part of the set for certain; the others are undecided scraps.
fn certain_parts(paving: &Paving) -> Vec<Part> {
    paving.parts().into_iter().filter(|part| !part.inner.is_empty()).collect()
}

/// Two range rings, [95, 105] m about (0, 0) and [75, 85] m about (120, 0), meet in two mirrored parts. Total area
/// 201.7393234464571 m², x ∈ [67.5, 82.5], |y| ∈ [59.36586, 72.62441]: closed form (circular segments and the radical
/// axis), computed independently.
#[test]
fn two_range_rings_meet_in_two_mirrored_parts_of_known_area() {
    let paving = pave_rings(&RINGS[..2], 0, 60_000);
    let area = paving.area();
    println!("area common to two rings: {area:?}");
    assert!(area.contains(201.739_323_446_457_1), "{area:?}");
    assert!(area.width() < 2.0, "{area:?}");
    assert_eq!(paving.parts().len(), 2);
    let parts = certain_parts(&paving);
    assert_eq!(parts.len(), 2);
    let (east, north) = (Interval::new(67.5, 82.5), Interval::new(59.36586, 72.62441));
    for (part, sides) in parts.iter().zip([-north, north]) {
        assert!(part.area.contains(0.5 * 201.739_323_446_457_1), "{part:?}");
        // The printed digits are rounded: allow half of the last.
        let printed = Interval::new(-5e-6, 5e-6);
        for (outer, inner, exact) in
            [(part.outer.east, part.inner.east, east), (part.outer.north, part.inner.north, sides)]
        {
            assert!((outer + printed).contains_interval(exact), "{outer:?} against {exact:?}");
            assert!((exact + printed).contains_interval(inner), "{inner:?} against {exact:?}");
            assert!(outer.width() < exact.width() + 0.5 && exact.width() < inner.width() + 2.0, "{part:?}");
        }
    }
}

/// A third ring, [85, 95] m about (40, 150), leaves one part of area 92.78071 m² (computed independently).
#[test]
fn a_third_range_ring_leaves_one_part() {
    let paving = pave_rings(&RINGS, 0, 60_000);
    let area = paving.area();
    println!("area common to three rings: {area:?}");
    assert!(area.lo() <= 92.780_715 && 92.780_705 <= area.hi() && area.width() < 1.0, "{area:?}");
    assert_eq!(paving.parts().len(), 1);
    assert_eq!(certain_parts(&paving).len(), 1);
}

/// With one ring of three allowed to be stray, every point of two rings counts, so the area is at least that of the
/// first two, and the set of the two-ring example lies inside.
#[test]
fn a_stray_ring_only_enlarges_the_set() {
    let (strict, relaxed) = (pave_rings(&RINGS, 0, 20_000), pave_rings(&RINGS, 1, 20_000));
    let pair = pave_rings(&RINGS[..2], 0, 20_000);
    assert!(relaxed.area().hi() >= pair.area().lo() && pair.area().hi() >= strict.area().lo());
    for inner in strict.inner.iter().chain(&pair.inner) {
        assert_ne!(in_rings(&RINGS, 1, *inner), Verdict::Outside);
        assert!(relaxed.outside.iter().all(|out| {
            let both = out.intersection(*inner);
            both.is_empty() || both.east.width() * both.north.width() == 0.0
        }));
    }
}

/// Inner, boundary and outside boxes cover the start box and overlap nowhere, at every budget.
#[test]
fn area_is_conserved() {
    let whole = 340.0 * 390.0;
    let mut last = Interval::new(0.0, f64::INFINITY);
    for budget in [0, 1, 7, 100, 3000, 20_000] {
        let paving = pave_rings(&RINGS[..2], 0, budget);
        assert_eq!(paving.tested, budget);
        let sum = paving.inner_area() + paving.boundary_area() + paving.outside_area();
        assert!(sum.contains(whole) && sum.width() < 1e-4, "{sum:?} at {budget}");
        // More work never loosens the answer.
        assert!(last.contains(paving.area().middle()) && paving.area().width() <= last.width());
        last = paving.area();
    }
}

#[test]
fn decided_sets_end_early_and_empty_starts_give_nothing() {
    let start = Box2 { east: Interval::new(0.0, 8.0), north: Interval::new(0.0, 2.0) };
    let half = |b: Box2| {
        if b.east.hi() <= 4.0 {
            Verdict::Inside
        } else if b.east.lo() >= 4.0 {
            Verdict::Outside
        } else {
            Verdict::Unknown
        }
    };
    let paving = pave(start, 1000, half);
    assert_eq!((paving.tested, paving.boundary.len()), (3, 0));
    assert!(paving.area().contains(8.0) && paving.area().width() < 1e-12);
    assert_eq!(pave(Box2::EMPTY, 10, half).tested, 0);
    // A box of two neighbouring numbers cannot be cut; it stays undecided instead of looping.
    let speck = Box2 { east: Interval::new(1.0, 1.0f64.next_up()), north: Interval::point(0.0) };
    let stuck = pave(speck, 100, |_| Verdict::Unknown);
    assert_eq!((stuck.tested, stuck.boundary.len()), (1, 1));
}

/// Data of the bounded-error parameter problem: each value is within 0.5 of
/// 20 exp(−p₁t) − 8 exp(−p₂t). Method: Jaulin and Walter, Automatica 29 (4), 1993; data as given in secondary texts.
///
/// Times in seconds, values in thousandths, so that both are whole numbers over a power of ten.
const MEASURED: [(f64, f64); 10] = [
    (0.75, 7390.0),
    (1.5, 4090.0),
    (2.25, 1740.0),
    (3.0, 97.0),
    (6.0, -2570.0),
    (9.0, -2710.0),
    (13.0, -2070.0),
    (17.0, -1440.0),
    (21.0, -980.0),
    (25.0, -660.0),
];

/// Whether all parameters (p₁, p₂) of a box explain all measured values.
fn explains(b: Box2) -> Verdict {
    let (mut certain, mut possible) = (0, 0);
    let over_thousand = |whole: f64| Interval::point(whole) / Interval::point(1000.0);
    for (t, y) in MEASURED {
        let decay = |p: Interval| (-(p * Interval::point(t))).exp();
        let model = Interval::point(20.0) * decay(b.east) - Interval::point(8.0) * decay(b.north);
        // The exact bounds are no binary numbers: each lies in an enclosure, whose far or near end is taken.
        let (least, most) = (over_thousand(y - 500.0), over_thousand(y + 500.0));
        let (outer, inner) = (least.hull(most), Interval::new(least.hi(), most.lo()));
        certain += usize::from(inner.contains_interval(model));
        possible += usize::from(!outer.intersection(model).is_empty());
    }
    Verdict::at_least(MEASURED.len(), certain, possible)
}

/// The set of parameters has an area between 0.0019487 and 0.0019617 (computed independently).
#[test]
fn the_bounded_error_parameter_problem_has_the_known_area() {
    let whole = Interval::new(0.0, 1.0);
    let paving = pave(Box2 { east: whole, north: whole }, 60_000, explains);
    let area = paving.area();
    println!("area of the feasible parameters: {area:?}, {} boxes", paving.inner.len());
    assert!(area.lo() <= 0.001_961_7 && area.hi() >= 0.001_948_7, "{area:?}");
    assert!(area.width() < 2e-5, "{area:?}");
    let sum = paving.inner_area() + paving.boundary_area() + paving.outside_area();
    assert!(sum.contains(1.0) && sum.width() < 1e-9);
}

/// What dead reckoning may be off after a straight run (arithmetic): 1 degree over 1 km is 17.45 m to either side, 0.1 % of
/// 10 km is 10 m along, 6000 s in an unknown current of 0.1 m/s is 600 m in every direction.
#[test]
fn travel_reaches_as_far_as_dead_reckoning_may_be_off() {
    let reach_of = |length_m: f64, duration_s: f64, dead_reckoning: DeadReckoning| {
        let travel = ReportedPiece { length_m, heading_rad: 0.0, duration_s, is_blind: false };
        let event = LogEvent { along_m: length_m, time_s: duration_s, travel: vec![travel], sighting: None };
        let bounds = Bounds { dead_reckoning, heading_slices: 1, ..open_field(10).bounds };
        // East and north of the reaches: directions 0 and 8.
        let reach = steps(&Log { events: vec![event] }, &bounds)[0].travel[0];
        (reach[0], reach[8])
    };
    let none =
        DeadReckoning { scale_error: 0.0, heading_bias_rad: 0.0, heading_noise_rad: 0.0, drift_mps: 0.0 };
    let holds = |found: f64, exact: f64| found >= exact && found < exact + 1e-4;
    let turned = reach_of(1000.0, 0.0, DeadReckoning { heading_noise_rad: 1f64.to_radians(), ..none });
    assert!(
        holds(turned.0, 1000.0 * 1f64.to_radians().sin()) && (turned.0 - 17.4524).abs() < 2e-4,
        "{turned:?}"
    );
    let scaled = reach_of(10_000.0, 0.0, DeadReckoning { scale_error: 0.001, ..none });
    assert!(holds(scaled.1, 10_010.0), "{scaled:?}");
    let drifted = reach_of(0.0, 6000.0, DeadReckoning { drift_mps: 0.1, ..none });
    assert!(holds(drifted.0, 600.0) && holds(drifted.1, 600.0), "{drifted:?}");
}
