//! Planned lines.
//!
//! *Frame.* The working frame of [`crate::frame`], metres.

mod csv;
mod geojson;
mod gpx;
mod kml;
pub mod plan;
pub mod read;

use crate::frame::LocalPoint;

/// A candidate line as drawn by the planner: waypoints joined by straight legs.
#[derive(Clone, Debug, PartialEq)]
pub struct Line {
    /// Name from the file, unique among the lines of a dive.
    pub name: String,
    /// At least two, each apart from the one before it.
    pub waypoints: Vec<LocalPoint>,
}
