//! The landmarks as understood: positions in the working frame, figures turned into bounds.

use super::Provenance;
use crate::frame::LocalPoint;

/// One landmark.
#[derive(Clone, Debug, PartialEq)]
pub struct MapLandmark {
    /// Identifier from the file, or the row or feature number where the file has none.
    pub id: String,
    /// Charted position: centre of its box.
    pub position: LocalPoint,
    /// Half-width of its box east and west, m.
    pub half_width_east_m: f64,
    /// Half-width of its box north and south, m.
    pub half_width_north_m: f64,
}

/// The map that every other report is computed from.
#[derive(Clone, Debug, PartialEq)]
pub struct LandmarksReport {
    /// Where this comes from.
    pub provenance: Provenance,
    /// How the uncertainty was declared and turned into bounds.
    pub landmark_uncertainty: String,
    /// In file order.
    pub landmarks: Vec<MapLandmark>,
}
