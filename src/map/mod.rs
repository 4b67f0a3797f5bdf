//! The prior map: landmarks that all look alike, each known only within a box.
//!
//! *Frame.* The working frame of [`crate::frame`], metres.

mod csv;
mod geojson;
pub mod index;
mod kml;
pub mod read;
pub mod uncertainty;

use crate::frame::LocalPoint;
use crate::interval::Box2;

/// One mapped object: a point that lies somewhere inside a box, fixed in time.
#[derive(Clone, Debug, PartialEq)]
pub struct Landmark {
    /// Identifier from the file, or the row number where the file has none.
    pub id: String,
    /// The charted position: centre of the box.
    pub position: LocalPoint,
    /// Half the width of the box east and west, metres, at least 0. A bound, not a statistic.
    pub half_width_east_m: f64,
    /// Half the width of the box north and south, metres, at least 0. A bound, not a statistic.
    pub half_width_north_m: f64,
}

impl Landmark {
    /// The box that holds the true point, rounded outward.
    pub fn bounds(&self) -> Box2 {
        Box2::around(self.position, self.half_width_east_m, self.half_width_north_m)
    }
}
