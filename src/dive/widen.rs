//! The difference between true metres and grid metres, put into the bounds.
//!
//! The vehicle measures true lengths at the depth of the seabed and true directions; the map is in grid metres. With k
//! the ratio of grid length to true length over the site, k in [k₁, k₂]:
//!
//! - Travel: true = reported · (1 ± s), grid = k · true, so grid = reported · (1 ± (s + ε + sε)) with ε = max |k − 1|.
//! - Range: the horizontal part of a slant range shrinks by 1/k, which changes the range by at most ε′ times itself,
//!   ε′ = max |1/k − 1|; so a fraction b becomes b(1 + ε′) + ε′.
//! - Heading: to grid north at the middle of the convergence over the site; half its range joins the heading noise.
//! - Bearing: relative to the bow, so only the error of angles of a grid that is not conformal counts.
//! - Boxes: a half-width of true metres is at most k₂ times as many grid metres.
//!
//! Depth: a length at depth d below the ellipsoid is (R − d)/R of its image on it, R being between the smallest and the
//! largest radius of curvature of the WGS 84 ellipsoid.

use super::site::Site;
use crate::frame::{GridDistortion, LocalPoint};
use crate::interval::{larger, smaller, up};
use crate::problem::{Findings, Problem};
use crate::vehicle::{DeadReckoning, Sonar};

/// Largest deviation of the grid scale from 1 that is put into the bounds; beyond it another grid is the better answer.
const SCALE_LIMIT: f64 = 0.02;
/// Smallest radius of curvature of WGS 84: along the meridian at the equator, a(1 − e²), metres (rounded down).
const RADIUS_MIN_M: f64 = 6_335_439.0;
/// Largest radius of curvature of WGS 84: at the poles, a²/b, metres (rounded up).
const RADIUS_MAX_M: f64 = 6_399_594.0;
/// Error allowed in a measured scale or direction: geodesics and projections agree to 1e-8 m or better over the 100 m on
/// which they are compared (`tests/suite/projection.rs`).
const MEASURED_TO: f64 = 1e-9;

/// Grid against ground over the site; the identity for local metres.
#[derive(Clone, Copy, Debug)]
pub(super) struct Grid {
    distortion: Option<GridDistortion>,
    seabed_depth_m: f64,
    k_min: f64,
    k_max: f64,
    turn_rad: f64,
    shear_rad: f64,
}

impl Grid {
    pub(super) fn over(
        site: &Site,
        search_area: &[LocalPoint],
        seabed_depth_m: f64,
        findings: &mut Findings,
    ) -> Option<Self> {
        let mut points = search_area.to_vec();
        points.extend(&site.landmarks);
        points.extend(site.lines.iter().flat_map(|l| &l.waypoints));
        let distortion = match site.frame.distortion(&points) {
            Ok(d) => d,
            Err(e) => {
                findings.problem(
                    Problem::new("search area", format!("reaches beyond the working frame: {e}"))
                        .advice("use a smaller search area or another working_crs"),
                );
                return None;
            }
        };
        let Some(d) = distortion else {
            return Some(Self {
                distortion,
                seabed_depth_m: 0.0,
                k_min: 1.0,
                k_max: 1.0,
                turn_rad: 0.0,
                shear_rad: 0.0,
            });
        };
        if d.scale_error() > SCALE_LIMIT {
            findings.problem(
                Problem::new(
                    "working frame",
                    format!(
                        "{} stretches lengths by {:.3} to {:.3} over the site",
                        site.frame.name(),
                        d.scale_min,
                        d.scale_max
                    ),
                )
                .accepted(format!("a grid within {} % of true lengths", SCALE_LIMIT * 100.0))
                .advice("name one with working_crs, such as the UTM zone of the site"),
            );
            return None;
        }
        let deep = |radius: f64| radius / (radius - seabed_depth_m);
        Some(Self {
            distortion,
            seabed_depth_m,
            k_min: (d.scale_min - MEASURED_TO) * deep(RADIUS_MAX_M),
            k_max: up((d.scale_max + MEASURED_TO) * up(deep(RADIUS_MIN_M))),
            turn_rad: d.convergence_half_range_rad() + d.shear_max_rad + MEASURED_TO,
            shear_rad: d.shear_max_rad + MEASURED_TO,
        })
    }

    fn travel_epsilon(&self) -> f64 {
        up(larger((self.k_max - 1.0).abs(), (self.k_min - 1.0).abs()))
    }

    fn range_epsilon(&self) -> f64 {
        up(larger((1.0 / self.k_max - 1.0).abs(), (1.0 / self.k_min - 1.0).abs()))
    }

    pub(super) fn dead_reckoning(&self, d: DeadReckoning) -> DeadReckoning {
        if self.distortion.is_none() {
            return d;
        }
        let e = self.travel_epsilon();
        DeadReckoning {
            scale_error: up(up(d.scale_error + e) + up(d.scale_error * e)),
            heading_noise_rad: up(d.heading_noise_rad + self.turn_rad),
            // No drift stays no drift.
            drift_mps: if d.drift_mps > 0.0 { up(d.drift_mps * larger(1.0, self.k_max)) } else { 0.0 },
            ..d
        }
    }

    pub(super) fn sonar(&self, s: Sonar) -> Sonar {
        if self.distortion.is_none() {
            return s;
        }
        let e = self.range_epsilon();
        Sonar {
            range_error_fraction: up(up(s.range_error_fraction * up(1.0 + e)) + e),
            bearing_error_rad: up(s.bearing_error_rad + self.shear_rad),
            ..s
        }
    }

    /// A half-width of true metres in grid metres, never smaller than it was.
    pub(super) fn half_width_m(&self, true_m: f64) -> f64 {
        if self.distortion.is_none() || self.k_max <= 1.0 { true_m } else { up(true_m * self.k_max) }
    }

    pub(super) fn report(&self, findings: &mut Findings) {
        let Some(d) = self.distortion else {
            findings.inform(None, "local metres: bounds are used as given, headings are to local north");
            return;
        };
        let depth = if self.seabed_depth_m > 0.0 {
            format!(" at {} m depth", self.seabed_depth_m)
        } else {
            " at sea level (seabed_depth_m is not given: 0.016 % more for every 1000 m of depth)".into()
        };
        findings.inform(
            None,
            format!(
                "grid lengths are {:.6} to {:.6} times true lengths{depth}; {:.4} % is added to the distance error and \
                 {:.4} % to the range error",
                smaller(self.k_min, self.k_max),
                self.k_max,
                self.travel_epsilon() * 100.0,
                self.range_epsilon() * 100.0,
            ),
        );
        findings.inform(
            None,
            format!(
                "headings are to grid north, which lies {:.3}° {} of true north in the middle of the site; {:.4}° is added \
                 to the heading noise for its change over the site",
                d.convergence_middle_rad().to_degrees().abs(),
                if d.convergence_middle_rad() < 0.0 { "west" } else { "east" },
                self.turn_rad.to_degrees(),
            ),
        );
    }
}
