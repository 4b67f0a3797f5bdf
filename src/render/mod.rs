//! Charts: a report value in, the bytes of a PNG file out. Nothing here touches a file or decides a result.
//!
//! *Type.* One compiled-in family, three sizes, none under 7 points when the picture is printed on A4 landscape
//! across its full width; a larger or smaller picture scales everything alike.
//!
//! *Layout.* Every text, label and piece of furniture has a rectangle. Fixed furniture stands outside the map's
//! frame; labels inside are tried at candidate places against the rectangles and line corridors already taken, so
//! nothing overlaps and nothing is clipped. [`lines_layout`] and [`trace_layout`] tell where the texts went.

mod area;
mod canvas;
mod classes;
mod colours;
mod furniture;
mod legend;
mod lines;
mod lookalike_panels;
mod lookalikes;
mod nice;
mod pattern;
mod place;
mod ranking;
mod remap;
mod ribbon;
mod scene;
mod sensitivity;
mod suggest;
mod text;
mod trace;

pub use colours::{CLASSES, ramp};
pub use scene::{PlacedText, Rect};

use crate::report::{
    AreaReport, LinesReport, LookAlikesReport, RemapReport, SensitivityReport, SuggestReport, TraceReport,
};

/// Smallest picture on which the furniture leaves room for a map, pixels.
const SMALLEST_PX: (u32, u32) = (800, 560);
/// Most pixels of a picture: A2 landscape at 150 dpi with room to spare. Painting takes 12 bytes of memory for each.
const MOST_PIXELS: u64 = 16_000_000;
/// Longest side over shortest side.
const MOST_ASPECT: f64 = 3.0;

/// Size of a picture.
///
/// *Units.* Pixels. The default is A4 landscape at 150 dots per inch.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct ChartSize {
    /// Width, pixels.
    pub width_px: u32,
    /// Height, pixels.
    pub height_px: u32,
}

impl Default for ChartSize {
    fn default() -> Self {
        Self { width_px: 1754, height_px: 1240 }
    }
}

impl ChartSize {
    /// Checks that a chart of this size can be drawn.
    ///
    /// # Errors
    ///
    /// [`RenderError::Size`] when the picture would be too small, too long for its width, or hold more pixels than
    /// the cap. A size is never changed silently.
    pub fn check(&self) -> Result<(), RenderError> {
        let (width, height) = (self.width_px, self.height_px);
        let pixels = u64::from(width) * u64::from(height);
        let (long, short) = (width.max(height), width.min(height));
        let reason = if width < SMALLEST_PX.0 || height < SMALLEST_PX.1 {
            format!("it must be at least {} × {} pixels to be read", SMALLEST_PX.0, SMALLEST_PX.1)
        } else if pixels > MOST_PIXELS {
            format!("it would have {pixels} pixels, and at most {MOST_PIXELS} are drawn")
        } else if f64::from(long) > f64::from(short) * MOST_ASPECT {
            format!("its long side may be at most {MOST_ASPECT} times its short side")
        } else {
            return Ok(());
        };
        Err(RenderError::Size { width_px: width, height_px: height, reason })
    }
}

/// Why a chart could not be drawn.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum RenderError {
    /// The size asked for cannot be drawn.
    #[error(
        "chart of {width_px} × {height_px} pixels: {reason}; ask for another size (A4 landscape at 150 dpi is 1754 × 1240)"
    )]
    Size {
        /// Width asked for, pixels.
        width_px: u32,
        /// Height asked for, pixels.
        height_px: u32,
        /// What is wrong with it.
        reason: String,
    },
    /// The report holds nothing that has a place on a map.
    #[error("chart: {0}")]
    Nothing(&'static str),
    /// The drawing library failed.
    #[error("chart: drawing failed: {0}")]
    Drawing(String),
    /// The PNG encoder failed.
    #[error("chart: writing the PNG failed: {0}")]
    Encoding(String),
}

/// Draws the candidate lines over the landmarks, each segment coloured by fix distance, with the ranking.
///
/// # Errors
///
/// [`RenderError`] when the size cannot be drawn or no line has a track.
pub fn lines_png(report: &LinesReport, size: &ChartSize) -> Result<Vec<u8>, RenderError> {
    canvas::paint(&lines::scene(report, size)?, size)
}

/// The texts of [`lines_png`] and where they stand.
///
/// # Errors
///
/// As [`lines_png`].
pub fn lines_layout(report: &LinesReport, size: &ChartSize) -> Result<Vec<PlacedText>, RenderError> {
    Ok(lines::scene(report, size)?.texts)
}

/// Which figure of the area map a chart shows.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum AreaChart {
    /// Longest guaranteed fix distance over the headings.
    Worst,
    /// Shortest guaranteed fix distance over the headings, with arrows.
    Best,
    /// Share of the headings with a guaranteed fix within the required distance.
    Share,
}

/// Draws one figure of the area map over the search area.
///
/// # Errors
///
/// [`RenderError`] when the size cannot be drawn or there is no start cell.
pub fn area_png(report: &AreaReport, chart: AreaChart, size: &ChartSize) -> Result<Vec<u8>, RenderError> {
    canvas::paint(&area::scene(report, chart, size)?, size)
}

/// The texts of [`area_png`] and where they stand.
///
/// # Errors
///
/// As [`area_png`].
pub fn area_layout(
    report: &AreaReport,
    chart: AreaChart,
    size: &ChartSize,
) -> Result<Vec<PlacedText>, RenderError> {
    Ok(area::scene(report, chart, size)?.texts)
}

/// Draws the feasible set of one simulated dive at chosen events, one small frame each.
///
/// # Errors
///
/// [`RenderError`] when the size cannot be drawn or there is neither search area nor track.
pub fn trace_png(report: &TraceReport, size: &ChartSize) -> Result<Vec<u8>, RenderError> {
    canvas::paint(&trace::scene(report, size)?, size)
}

/// The texts of [`trace_png`] and where they stand.
///
/// # Errors
///
/// As [`trace_png`].
pub fn trace_layout(report: &TraceReport, size: &ChartSize) -> Result<Vec<PlacedText>, RenderError> {
    Ok(trace::scene(report, size)?.texts)
}

/// Draws the most dangerous look-alikes on the map: both grounds outlined, joined and numbered, with a list beside it.
///
/// # Errors
///
/// [`RenderError`] when the size cannot be drawn or there are neither landmarks nor lines.
pub fn lookalikes_png(report: &LookAlikesReport, size: &ChartSize) -> Result<Vec<u8>, RenderError> {
    canvas::paint(&lookalikes::scene(report, size)?, size)
}

/// The texts of [`lookalikes_png`] and where they stand.
///
/// # Errors
///
/// As [`lookalikes_png`].
pub fn lookalikes_layout(
    report: &LookAlikesReport,
    size: &ChartSize,
) -> Result<Vec<PlacedText>, RenderError> {
    Ok(lookalikes::scene(report, size)?.texts)
}

/// Draws the worst look-alikes one by one, ground 2 laid over ground 1.
///
/// # Errors
///
/// [`RenderError`] when the size cannot be drawn.
pub fn lookalike_panels_png(report: &LookAlikesReport, size: &ChartSize) -> Result<Vec<u8>, RenderError> {
    canvas::paint(&lookalike_panels::scene(report, size)?, size)
}

/// The texts of [`lookalike_panels_png`] and where they stand.
///
/// # Errors
///
/// As [`lookalike_panels_png`].
pub fn lookalike_panels_layout(
    report: &LookAlikesReport,
    size: &ChartSize,
) -> Result<Vec<PlacedText>, RenderError> {
    Ok(lookalike_panels::scene(report, size)?.texts)
}

/// Draws the regions that deserve more mapping, patterned by cause and numbered by gain, with the list of them.
///
/// # Errors
///
/// [`RenderError`] when the size cannot be drawn or the search area has no finite corner.
pub fn remap_png(report: &RemapReport, size: &ChartSize) -> Result<Vec<u8>, RenderError> {
    canvas::paint(&remap::scene(report, size)?, size)
}

/// The texts of [`remap_png`] and where they stand.
///
/// # Errors
///
/// As [`remap_png`].
pub fn remap_layout(report: &RemapReport, size: &ChartSize) -> Result<Vec<PlacedText>, RenderError> {
    Ok(remap::scene(report, size)?.texts)
}

/// Draws the suggested dive points with their scatter discs and first runs, numbered, with the list of them.
///
/// # Errors
///
/// [`RenderError`] when the size cannot be drawn or the search area has no finite corner.
pub fn suggest_png(report: &SuggestReport, size: &ChartSize) -> Result<Vec<u8>, RenderError> {
    canvas::paint(&suggest::scene(report, size)?, size)
}

/// The texts of [`suggest_png`] and where they stand.
///
/// # Errors
///
/// As [`suggest_png`].
pub fn suggest_layout(report: &SuggestReport, size: &ChartSize) -> Result<Vec<PlacedText>, RenderError> {
    Ok(suggest::scene(report, size)?.texts)
}

/// Draws what each improved error bound brings, as bars.
///
/// # Errors
///
/// [`RenderError`] when the size cannot be drawn.
pub fn sensitivity_png(report: &SensitivityReport, size: &ChartSize) -> Result<Vec<u8>, RenderError> {
    canvas::paint(&sensitivity::scene(report, size)?, size)
}

/// The texts of [`sensitivity_png`] and where they stand.
///
/// # Errors
///
/// As [`sensitivity_png`].
pub fn sensitivity_layout(
    report: &SensitivityReport,
    size: &ChartSize,
) -> Result<Vec<PlacedText>, RenderError> {
    Ok(sensitivity::scene(report, size)?.texts)
}
