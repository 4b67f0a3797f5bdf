//! Positions and the frame they live in.
//!
//! *Frame.* All computation happens in one **working frame**: metres east and north, either a projected coordinate
//! system (an EPSG code, usually a UTM zone) or plain local metres. Latitude and longitude exist only at the rim.

mod crs;
mod datum;
mod distortion;
mod error;
mod projection;

pub use crs::{Crs, Given};
pub use distortion::GridDistortion;
pub use error::FrameError;
pub use projection::{
    Frame, MERIDIAN_LIMIT_DEG, MERIDIAN_WARN_DEG, UTM_NORTH_LIMIT_DEG, UTM_SOUTH_LIMIT_DEG,
};

use serde::{Deserialize, Serialize};

/// A position in the working frame.
///
/// *Units.* Metres, east and north (full grid values, such as 512 300 m E, 6 231 450 m N).
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
pub struct LocalPoint {
    /// Metres east.
    pub east_m: f64,
    /// Metres north.
    pub north_m: f64,
}

impl LocalPoint {
    /// The point `east_m` metres east and `north_m` metres north of the frame's origin.
    pub const fn new(east_m: f64, north_m: f64) -> Self {
        Self { east_m, north_m }
    }

    /// Straight distance to `other`, metres (nearest value, not an enclosure).
    pub fn distance_m(self, other: Self) -> f64 {
        libm::hypot(other.east_m - self.east_m, other.north_m - self.north_m)
    }

    /// Bearing to `other`, radians clockwise from grid north, in (−π, π].
    pub fn bearing_rad(self, other: Self) -> f64 {
        libm::atan2(other.east_m - self.east_m, other.north_m - self.north_m)
    }
}

/// A geographic position on WGS 84. Exists only where files are read and written.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
pub struct GeoPoint {
    /// Latitude, degrees north.
    pub lat_deg: f64,
    /// Longitude, degrees east.
    pub lon_deg: f64,
}
