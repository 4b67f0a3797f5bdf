//! A dive with some of its error bounds improved.
//!
//! A bound in force is the stated one and, for some, the part that the grid's distortion adds (`widen.rs`). Better gear
//! or a better survey improves the stated part only, so the stated bounds are kept and widened anew.

use super::Dive;
use super::widen::Grid;
use crate::vehicle::{DeadReckoning, Sonar};

/// An error bound that money can improve. Budgets, descent scatter and detection chance are none.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, serde::Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum ErrorBound {
    /// Half-widths of the landmarks' boxes.
    LandmarkBoxes,
    /// Error of travelled distance.
    DistanceScale,
    /// Constant heading error of a dive.
    HeadingBias,
    /// Changing heading error.
    HeadingNoise,
    /// Speed of an unknown drift.
    Drift,
    /// Constant part of the slant-range error.
    RangeConstant,
    /// Part of the slant-range error that grows with range.
    RangeGrowing,
    /// Error of the beam direction or measured bearing.
    Bearing,
    /// Error of the altitude.
    Altitude,
}

impl ErrorBound {
    /// All of them, in the order of the dive file.
    pub const ALL: [Self; 9] = [
        Self::LandmarkBoxes,
        Self::DistanceScale,
        Self::HeadingBias,
        Self::HeadingNoise,
        Self::Drift,
        Self::RangeConstant,
        Self::RangeGrowing,
        Self::Bearing,
        Self::Altitude,
    ];

    /// In words, for tables and charts.
    pub fn words(self) -> &'static str {
        match self {
            Self::LandmarkBoxes => "landmark boxes",
            Self::DistanceScale => "distance error",
            Self::HeadingBias => "heading bias",
            Self::HeadingNoise => "heading noise",
            Self::Drift => "drift",
            Self::RangeConstant => "range error, constant",
            Self::RangeGrowing => "range error, growing",
            Self::Bearing => "beam direction error",
            Self::Altitude => "altitude error",
        }
    }

    /// The key of the dive file that states it.
    pub fn key(self) -> &'static str {
        match self {
            Self::LandmarkBoxes => "map.uncertainty_m",
            Self::DistanceScale => "dead_reckoning.scale_error_pct",
            Self::HeadingBias => "dead_reckoning.heading_bias_deg",
            Self::HeadingNoise => "dead_reckoning.heading_noise_deg",
            Self::Drift => "dead_reckoning.drift_mps",
            Self::RangeConstant => "sonar.range_error_m",
            Self::RangeGrowing => "sonar.range_error_pct",
            Self::Bearing => "sonar.bearing_error_deg",
            Self::Altitude => "sonar.altitude_error_m",
        }
    }

    /// The unit in which its values are given.
    pub fn unit(self) -> &'static str {
        match self {
            Self::LandmarkBoxes | Self::RangeConstant | Self::Altitude => "m",
            Self::DistanceScale | Self::RangeGrowing => "%",
            Self::HeadingBias | Self::HeadingNoise | Self::Bearing => "degrees",
            Self::Drift => "m/s",
        }
    }

    /// Its value, in its unit; of the landmark boxes the widest half-width.
    fn value_of(self, widest_m: f64, dead_reckoning: &DeadReckoning, sonar: &Sonar) -> f64 {
        match self {
            Self::LandmarkBoxes => widest_m,
            Self::DistanceScale => 100.0 * dead_reckoning.scale_error,
            Self::HeadingBias => dead_reckoning.heading_bias_rad.to_degrees(),
            Self::HeadingNoise => dead_reckoning.heading_noise_rad.to_degrees(),
            Self::Drift => dead_reckoning.drift_mps,
            Self::RangeConstant => sonar.range_error_m,
            Self::RangeGrowing => 100.0 * sonar.range_error_fraction,
            Self::Bearing => sonar.bearing_error_rad.to_degrees(),
            Self::Altitude => sonar.altitude_error_m,
        }
    }
}

/// Bounds as the dive file states them, in true metres.
#[derive(Clone, Copy, Debug)]
pub(super) struct Stated {
    pub grid: Grid,
    pub dead_reckoning: DeadReckoning,
    pub sonar: Sonar,
}

impl Dive {
    /// The value of a bound as stated, in its unit. (Half-widths of landmark boxes are in metres of the grid, which
    /// multiplies them and adds nothing.)
    pub fn stated_value(&self, bound: ErrorBound) -> f64 {
        bound.value_of(self.widest_half_width_m(), &self.stated.dead_reckoning, &self.stated.sonar)
    }

    /// The value of a bound in force, with the grid's part, in its unit.
    pub fn value_in_force(&self, bound: ErrorBound) -> f64 {
        bound.value_of(self.widest_half_width_m(), &self.dead_reckoning, &self.sonar)
    }

    fn widest_half_width_m(&self) -> f64 {
        let half_widths = self.landmarks.iter().flat_map(|l| [l.half_width_east_m, l.half_width_north_m]);
        half_widths.fold(0.0, crate::order::larger)
    }

    /// The dive with each of `bounds` of the dive file multiplied by `factor`, at most 1. The grid's part of a bound stays, and so does the
    /// number of slices of the heading bias.
    ///
    /// *Slices.* With as many slices over a bias of at most half of what it was, each window of the composed run
    /// (`locate/composed.rs`, point 2) lies inside one of the windows of before: the window around mfδ, of half-width fδ,
    /// with δ the width of a slice, lies in the one around jδ, of half-width δ, when |fm − j| ≤ 1 − f, and for f ≤ 1/2
    /// some whole j is near enough. Fewer slices could make a smaller bias look worse.
    #[must_use]
    pub fn improved(&self, bounds: &[ErrorBound], factor: f64) -> Self {
        let mut dive = self.clone();
        let Stated { grid, dead_reckoning, sonar } = &mut dive.stated;
        for bound in bounds {
            match bound {
                ErrorBound::LandmarkBoxes => {
                    for landmark in &mut dive.landmarks {
                        landmark.half_width_east_m *= factor;
                        landmark.half_width_north_m *= factor;
                    }
                }
                ErrorBound::DistanceScale => dead_reckoning.scale_error *= factor,
                ErrorBound::HeadingBias => dead_reckoning.heading_bias_rad *= factor,
                ErrorBound::HeadingNoise => dead_reckoning.heading_noise_rad *= factor,
                ErrorBound::Drift => dead_reckoning.drift_mps *= factor,
                ErrorBound::RangeConstant => sonar.range_error_m *= factor,
                ErrorBound::RangeGrowing => sonar.range_error_fraction *= factor,
                ErrorBound::Bearing => sonar.bearing_error_rad *= factor,
                ErrorBound::Altitude => sonar.altitude_error_m *= factor,
            }
        }
        dive.dead_reckoning = grid.dead_reckoning(*dead_reckoning);
        dive.sonar = grid.sonar(*sonar);
        dive
    }
}
