//! How a grid distorts true lengths and directions over a site.
//!
//! The vehicle measures true metres and true directions; the map is in grid metres. The difference belongs in the
//! bounds, so it has to be known.
//!
//! *Method.* At a lattice of positions the grid images of two short true displacements, east and north, on the
//! ellipsoid (geodesics after Karney 2013, from the `geo` crate) give the linear part of the map from ground to grid.
//! Its singular values are the smallest and largest scale over all directions, its rotation is the convergence, and
//! the excess of one singular value over the other is the largest error of an angle (zero for a conformal grid).

use geo::{Destination, Geodesic, Point};

use super::{Frame, FrameError, LocalPoint};
use crate::order::{larger, smaller};

/// How the grid distorts true lengths and directions over an area.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GridDistortion {
    /// Smallest ratio of grid distance to true distance on the ellipsoid.
    pub scale_min: f64,
    /// Largest ratio of grid distance to true distance on the ellipsoid.
    pub scale_max: f64,
    /// Smallest grid convergence (true north to grid north, clockwise positive east of the meridian), radians.
    pub convergence_min_rad: f64,
    /// Largest grid convergence, radians.
    pub convergence_max_rad: f64,
    /// Largest error of an angle between a direction and grid north after the convergence is taken off, radians.
    pub shear_max_rad: f64,
}

/// Length of the displacements, metres: short against the radius of the Earth, long against the last digit of a
/// projected coordinate (1e-9 m).
const BASELINE_M: f64 = 100.0;
/// Positions per side of the lattice over the bounding box: corners, edges and inside.
const LATTICE: u32 = 4;

impl Frame {
    /// Distortion over the bounding box of `points`; none for local metres or without points.
    ///
    /// # Errors
    /// When a position of the box lies outside the grid's limits.
    pub fn distortion(&self, points: &[LocalPoint]) -> Result<Option<GridDistortion>, FrameError> {
        if self.is_local() || points.is_empty() {
            return Ok(None);
        }
        let first = points[0];
        let (mut low, mut high) = (first, first);
        for p in points {
            low = LocalPoint::new(smaller(low.east_m, p.east_m), smaller(low.north_m, p.north_m));
            high = LocalPoint::new(larger(high.east_m, p.east_m), larger(high.north_m, p.north_m));
        }
        let mut all = Vec::new();
        for i in 0..=LATTICE {
            for j in 0..=LATTICE {
                let at = |lo: f64, hi: f64, k: u32| lo + (hi - lo) * f64::from(k) / f64::from(LATTICE);
                let p = LocalPoint::new(at(low.east_m, high.east_m, i), at(low.north_m, high.north_m, j));
                all.push(self.distortion_at(p)?);
            }
        }
        Ok(Some(GridDistortion::over(&all)))
    }

    /// Distortion at one position of a grid.
    pub(crate) fn distortion_at(&self, p: LocalPoint) -> Result<GridDistortion, FrameError> {
        let geo = self.to_geo(p)?;
        let origin = Point::new(geo.lon_deg, geo.lat_deg);
        let image = |bearing_deg: f64| -> Result<LocalPoint, FrameError> {
            let q = Geodesic.destination(origin, bearing_deg, 0.5 * BASELINE_M);
            self.to_local(super::GeoPoint { lat_deg: q.y(), lon_deg: q.x() })
        };
        let difference = |to: LocalPoint, from: LocalPoint| {
            ((to.east_m - from.east_m) / BASELINE_M, (to.north_m - from.north_m) / BASELINE_M)
        };
        let east = difference(image(90.0)?, image(270.0)?);
        let north = difference(image(0.0)?, image(180.0)?);
        // A 2 × 2 map splits into a rotation-scaling (sum part) and a reflection-scaling (difference part): their
        // lengths are half the sum and half the difference of the singular values.
        let turn = (0.5 * (east.0 + north.1), 0.5 * (east.1 - north.0));
        let flip = (0.5 * (east.0 - north.1), 0.5 * (east.1 + north.0));
        let (mean, excess) = (libm::hypot(turn.0, turn.1), libm::hypot(flip.0, flip.1));
        // Counter-clockwise turn of the ground on the grid; grid north then lies clockwise of true north.
        let convergence = libm::atan2(turn.1, turn.0);
        Ok(GridDistortion {
            scale_min: mean - excess,
            scale_max: mean + excess,
            convergence_min_rad: convergence,
            convergence_max_rad: convergence,
            shear_max_rad: libm::asin((excess / mean).clamp(0.0, 1.0)),
        })
    }
}

impl GridDistortion {
    /// The extremes of a lattice, widened for what may lie between its points.
    ///
    /// A quantity that varies as a quadratic along an axis, as the scale of a grid does over a site, exceeds its nearest
    /// lattice values by at most f″(h/2)²/2 with h a quarter of the side, and varies by at least f″(side/2)²/2 over the side
    /// when its extreme lies inside: the excess is at most 1/16 of the variation, for two axes 1/8.
    fn over(lattice: &[Self]) -> Self {
        let range = |of: fn(&Self) -> f64| {
            let low = lattice.iter().map(of).fold(f64::INFINITY, smaller);
            let high = lattice.iter().map(of).fold(f64::NEG_INFINITY, larger);
            let slack = 0.125 * (high - low);
            (low - slack, high + slack)
        };
        let convergence = range(|d| d.convergence_min_rad);
        Self {
            scale_min: range(|d| d.scale_min).0,
            scale_max: range(|d| d.scale_max).1,
            convergence_min_rad: convergence.0,
            convergence_max_rad: convergence.1,
            shear_max_rad: range(|d| d.shear_max_rad).1,
        }
    }

    /// Largest deviation of the scale from 1.
    pub fn scale_error(&self) -> f64 {
        larger((self.scale_max - 1.0).abs(), (self.scale_min - 1.0).abs())
    }

    /// Convergence in the middle of its range, radians.
    pub fn convergence_middle_rad(&self) -> f64 {
        0.5 * (self.convergence_min_rad + self.convergence_max_rad)
    }

    /// Half the range of the convergence, radians.
    pub fn convergence_half_range_rad(&self) -> f64 {
        0.5 * (self.convergence_max_rad - self.convergence_min_rad)
    }
}
