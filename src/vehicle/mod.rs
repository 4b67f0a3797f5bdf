//! The vehicle, its dead reckoning and its sonar, each with its error bounds.
//!
//! *Units.* SI: metres, seconds, radians. Every error figure is a hard bound (plus or minus), not a deviation.

mod range;

pub use range::horizontal_range;

/// How the vehicle moves.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Vehicle {
    /// Speed over ground along the line, metres per second, above 0.
    pub speed_mps: f64,
    /// Radius of a turn at a waypoint, metres, at least 0 (0 turns on the spot).
    pub turn_radius_m: f64,
}

/// Bounds on dead reckoning between two events.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DeadReckoning {
    /// Travelled distance is the reported one times 1 ± this (fraction, below 1).
    pub scale_error: f64,
    /// Heading bias: one unknown constant for the whole dive, ± radians.
    pub heading_bias_rad: f64,
    /// Heading noise, free at every instant, ± radians.
    pub heading_noise_rad: f64,
    /// Speed of an unknown drift (current without bottom lock), metres per second.
    pub drift_mps: f64,
}

/// Which way the sonar looks.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum SonarKind {
    /// Two beams across the track, port and starboard: a landmark is seen when it comes abeam.
    SideLooking {
        /// Half-angle off the vertical that is not seen, radians (the nadir gap). 0 when there is none.
        nadir_gap_rad: f64,
    },
    /// A sector ahead: a landmark is reported when it enters and when it leaves the sector.
    ForwardLooking {
        /// Half the opening of the sector either side of the bow, radians, in (0, π).
        half_sector_rad: f64,
    },
}

/// The sonar and its error bounds.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sonar {
    /// Which way it looks.
    pub kind: SonarKind,
    /// Shortest slant range, metres, at least 0.
    pub range_min_m: f64,
    /// Longest slant range, metres, above `range_min_m` and above the altitude.
    pub range_max_m: f64,
    /// Height above the seabed, metres, at least 0 (0 when ranges are horizontal already).
    pub altitude_m: f64,
    /// Constant part of the slant-range error, ± metres.
    pub range_error_m: f64,
    /// Part of the slant-range error that grows with range, ± fraction of the true range.
    pub range_error_fraction: f64,
    /// Error of the beam direction or of the measured bearing, ± radians.
    pub bearing_error_rad: f64,
    /// Error of the altitude, ± metres.
    pub altitude_error_m: f64,
    /// Chance that a landmark inside the swath is detected, in (0, 1].
    pub detection_chance: f64,
    /// Simulated detections of things that are not on the map, per kilometre of line, at least 0.
    pub strays_per_km: f64,
    /// Whether landmarks are detected while the vehicle turns. Off for most sonars.
    pub detect_in_turns: bool,
}

impl Sonar {
    /// Longest horizontal range at the nominal altitude, metres: √(R² − h²).
    pub fn reach_m(&self) -> f64 {
        libm::sqrt((self.range_max_m.powi(2) - self.altitude_m.powi(2)).clamp(0.0, f64::INFINITY))
    }

    /// Shortest horizontal range at the nominal altitude, metres: where the shortest slant range or the nadir
    /// gap ends, whichever is farther out.
    pub fn nearest_m(&self) -> f64 {
        let by_range =
            libm::sqrt((self.range_min_m.powi(2) - self.altitude_m.powi(2)).clamp(0.0, f64::INFINITY));
        let by_gap = match self.kind {
            SonarKind::SideLooking { nadir_gap_rad } => self.altitude_m * libm::tan(nadir_gap_rad),
            SonarKind::ForwardLooking { .. } => 0.0,
        };
        crate::interval::larger(by_range, by_gap)
    }
}
