//! From slant range to horizontal range.

use crate::interval::{Interval, larger, smaller};

/// Horizontal ranges that a slant range and a height above the seabed allow: { √(s² − h²) : s ∈ S, h ∈ H, s ≥ |h| }.
///
/// *Units.* Metres. *Guarantee.* Rounded outward. Empty exactly when no slant range in S reaches any height in H, so
/// that an empty result is a contradiction in the data and never an effect of rounding.
///
/// *Derivation.* √(s² − h²) grows with s and shrinks as |h| grows. The pairs with s ≥ |h| form a convex set (a cone
/// cut by a box), so the values form one interval. Its upper end belongs to the longest slant range over the least
/// |h|. Its lower end is 0 when some s equals some |h|, otherwise it belongs to the shortest slant range over the
/// greatest |h|. Both ends are computed as √((s − h)(s + h)), which keeps its digits where s and h are nearly equal.
#[must_use]
pub fn horizontal_range(slant_m: Interval, altitude_m: Interval) -> Interval {
    if slant_m.is_empty() || altitude_m.is_empty() {
        return Interval::EMPTY;
    }
    let (one, other) = (altitude_m.lo().abs(), altitude_m.hi().abs());
    let least_altitude_m = if altitude_m.contains(0.0) { 0.0 } else { smaller(one, other) };
    let greatest_altitude_m = larger(one, other);
    if slant_m.hi() < least_altitude_m {
        return Interval::EMPTY;
    }
    let nearest = if slant_m.lo() <= greatest_altitude_m {
        Interval::ZERO
    } else {
        leg_of_right_triangle(slant_m.lo(), greatest_altitude_m)
    };
    nearest.hull(leg_of_right_triangle(slant_m.hi(), least_altitude_m))
}

/// Enclosure of √(s² − h²) for s ≥ h ≥ 0.
fn leg_of_right_triangle(hypotenuse_m: f64, height_m: f64) -> Interval {
    let (s, h) = (Interval::point(hypotenuse_m), Interval::point(height_m));
    ((s - h) * (s + h)).sqrt()
}

#[cfg(test)]
mod tests {
    use super::super::{Sonar, SonarKind};
    use super::*;

    /// Right triangles: two with whole sides, the others rounded to the digits given (arithmetic).
    #[test]
    fn known_triangles() {
        for (slant, altitude, horizontal, digit) in [
            (5.0, 3.0, 4.0, 0.0),
            (13.0, 12.0, 5.0, 0.0),
            (75.0, 15.0, 73.4847, 5e-5),
            (100.0, 10.0, 99.4987, 5e-5),
            (100.0, 20.0, 97.9796, 5e-5),
        ] {
            let found = horizontal_range(Interval::point(slant), Interval::point(altitude));
            assert!(Interval::around(horizontal, digit + 1e-13).contains_interval(found), "{found:?}");
            assert!(digit > 0.0 || found.contains(horizontal), "{found:?}");
            assert_eq!(found, horizontal_range(Interval::point(slant), Interval::point(-altitude)));
        }
    }

    /// s ∈ [98, 102], h ∈ [9.5, 10.5] gives √(98² − 10.5²) … √(102² − 9.5²) (arithmetic, rounded to five places).
    #[test]
    fn a_band_of_ranges_over_a_band_of_heights() {
        let found = horizontal_range(Interval::new(98.0, 102.0), Interval::new(9.5, 10.5));
        assert!((found.lo() - 97.43588).abs() < 5e-6 && (found.hi() - 101.55663).abs() < 5e-6, "{found:?}");
        let below_seabed_too = horizontal_range(Interval::new(98.0, 102.0), Interval::new(-9.5, 10.5));
        assert!(below_seabed_too.contains(102.0) && below_seabed_too.width() > found.width());
    }

    #[test]
    fn only_an_unreachable_height_is_empty() {
        assert_eq!(horizontal_range(Interval::point(7.0), Interval::point(7.0)).lo(), 0.0);
        assert!(horizontal_range(Interval::point(7.0f64.next_down()), Interval::point(7.0)).is_empty());
        assert!(horizontal_range(Interval::EMPTY, Interval::point(1.0)).is_empty());
        assert!(horizontal_range(Interval::point(1.0), Interval::EMPTY).is_empty());
    }

    /// Range 75 m, altitude 15 m, 30° either side of the vertical unseen: reach √(75² − 15²) = 73.485 m, half-gap
    /// 15 tan 30° = 8.660 m, 129 648.88 m² seen per kilometre of line on both sides together (arithmetic).
    #[test]
    fn swath_of_a_side_looking_sonar() {
        let sonar = Sonar {
            kind: SonarKind::SideLooking { nadir_gap_rad: 30f64.to_radians() },
            range_min_m: 0.0,
            range_max_m: 75.0,
            altitude_m: 15.0,
            range_error_m: 0.0,
            range_error_fraction: 0.0,
            bearing_error_rad: 0.0,
            altitude_error_m: 0.0,
            detection_chance: 1.0,
            strays_per_km: 0.0,
            detect_in_turns: false,
        };
        assert!((sonar.reach_m() - 73.485).abs() < 5e-4);
        assert!((sonar.nearest_m() - 8.660).abs() < 5e-4);
        assert!((2.0 * 1000.0 * (sonar.reach_m() - sonar.nearest_m()) - 129_648.88).abs() < 5e-3);
        let reach = horizontal_range(Interval::point(75.0), Interval::point(15.0));
        assert!(reach.contains(sonar.reach_m()));
        // Without a gap, the shortest slant range decides.
        let without_gap =
            Sonar { kind: SonarKind::SideLooking { nadir_gap_rad: 0.0 }, range_min_m: 25.0, ..sonar };
        assert!((without_gap.nearest_m() - 20.0).abs() < 1e-12);
    }
}
