//! stub
use super::{GeoPoint, LocalPoint};
/// A working frame.
#[derive(Clone, Debug)]
pub struct Frame {}
/// Why a frame could not be made or a point not be converted.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum FrameError {
    /// stub
    #[error("stub")]
    Stub,
}
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
}
impl Frame {
    /// Plain local metres, not tied to the Earth.
    pub fn local() -> Self {
        Self {}
    }
    /// Projected system on the WGS 84 datum (or a datum defined to coincide with it) by EPSG code.
    pub fn from_epsg(_code: u16) -> Result<Self, FrameError> {
        Err(FrameError::Stub)
    }
    /// The UTM zone of a position.
    pub fn utm_for(_p: GeoPoint) -> Result<Self, FrameError> {
        Err(FrameError::Stub)
    }
    /// EPSG code; none for local metres.
    pub fn epsg(&self) -> Option<u16> {
        None
    }
    /// Name in words.
    pub fn name(&self) -> String {
        String::new()
    }
    /// Geographic to working frame.
    pub fn to_local(&self, _p: GeoPoint) -> Result<LocalPoint, FrameError> {
        Err(FrameError::Stub)
    }
    /// Working frame to geographic; an error for local metres.
    pub fn to_geo(&self, _p: LocalPoint) -> Result<GeoPoint, FrameError> {
        Err(FrameError::Stub)
    }
    /// Distortion over the hull of `points`; none for local metres.
    pub fn distortion(&self, _points: &[LocalPoint]) -> Result<Option<GridDistortion>, FrameError> {
        Err(FrameError::Stub)
    }
}
