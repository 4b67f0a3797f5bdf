//! Colours: ink for what was computed, mid grey for context, one accent for the requirement, one ramp.

use colorous::VIRIDIS;

/// Red, green, blue.
pub(super) type Rgb = (u8, u8, u8);

/// Paper.
pub(super) const WHITE: Rgb = (255, 255, 255);
/// What was computed, and text that must be read.
pub(super) const INK: Rgb = (24, 32, 40);
/// Secondary text.
pub(super) const SOFT_INK: Rgb = (88, 98, 108);
/// Context: landmarks.
pub(super) const GREY: Rgb = (132, 140, 148);
/// Grid lines and the empty part of bars.
pub(super) const PALE: Rgb = (222, 226, 230);
/// Bars of the ranking.
pub(super) const BAR: Rgb = (84, 96, 108);
/// Ground of "undecided".
pub(super) const UNDECIDED_GROUND: Rgb = (190, 195, 200);
/// The requirement.
pub(super) const ACCENT: Rgb = (190, 30, 45);
/// Feasible cells.
pub(super) const FEASIBLE: Rgb = (150, 200, 235);

/// Classes of the ramp.
pub const CLASSES: usize = 5;

/// Where the classes sample the ramp, soonest first: spaced evenly in grey (about 40 steps of 256 apart by ITU-R
/// BT.601), which even steps of the ramp are not. The brightest end is left out so that the first class shows on white.
const SAMPLES: [f64; CLASSES] = [0.96, 0.77, 0.575, 0.24, 0.05];

/// Colours of the classes, soonest (light) to latest (dark): the viridis ramp of the `colorous` crate, sequential in
/// lightness and readable with the common kinds of colour blindness.
pub fn ramp() -> [(u8, u8, u8); CLASSES] {
    SAMPLES.map(|t| VIRIDIS.eval_continuous(t).as_tuple())
}
