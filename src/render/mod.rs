//! Charts: a report value in, the bytes of a PNG file out. Nothing here touches a file or decides a result.
//!
//! *Type.* One compiled-in family, three sizes: 16, 9 and 7.7 points when the picture is printed at its resolution
//! ([`ChartSize::dpi`]), on every paper. A larger paper has more ground and longer lists, not larger type: it is read at
//! the same distance, and whoever wants larger type prints A4 enlarged.
//!
//! *Layout.* Every text, label and piece of furniture has a rectangle. Fixed furniture stands outside the map's
//! frame; labels inside are tried at candidate places against the rectangles and line corridors already taken, so
//! nothing overlaps and nothing is clipped. [`lines_layout`] and [`trace_layout`] tell where the texts went.

mod area;
mod canvas;
mod classes;
mod colours;
mod compass;
mod furniture;
mod graticule;
mod legend;
mod lines;
mod lookalike_panels;
mod lookalikes;
mod nice;
mod pattern;
mod place;
mod plot;
mod profile;
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
/// Most pixels of a picture: A3 at 300 dpi with a little room. Painting takes 12 bytes of memory for each.
const MOST_PIXELS: u64 = 18_000_000;
/// Longest side over shortest side.
const MOST_ASPECT: f64 = 3.0;
/// The resolution at which A4 landscape has the size of the reference canvas, dots per inch.
const REFERENCE_DPI: f64 = 150.0;
/// The canvas all sizes of furniture refer to: A4 landscape at [`REFERENCE_DPI`].
const REFERENCE_PX: (f64, f64) = (1754.0, 1240.0);
/// Whole pixels make a paper up to this much smaller than it is.
const PAPER_SLACK: f64 = 1e-3;

/// A paper of ISO 216, landscape.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, clap::ValueEnum)]
pub enum Paper {
    /// 297 mm by 210 mm.
    #[default]
    A4,
    /// 420 mm by 297 mm.
    A3,
}

impl Paper {
    /// Width and height, millimetres.
    pub fn size_mm(self) -> (f64, f64) {
        match self {
            Self::A4 => (297.0, 210.0),
            Self::A3 => (420.0, 297.0),
        }
    }
}

/// Size of a picture and the resolution at which it is printed.
///
/// *Units.* Pixels. The default is A4 landscape at 150 dots per inch.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct ChartSize {
    /// Width, pixels.
    pub width_px: u32,
    /// Height, pixels.
    pub height_px: u32,
    /// Dots per inch at print size: what makes type so many points high.
    pub dpi: u32,
}

impl Default for ChartSize {
    fn default() -> Self {
        Self::paper(Paper::A4, 150)
    }
}

impl ChartSize {
    /// A whole sheet of `paper` at `dpi` dots per inch.
    pub fn paper(paper: Paper, dpi: u32) -> Self {
        let (width_mm, height_mm) = paper.size_mm();
        let pixels = |mm: f64| libm::round(mm / 25.4 * f64::from(dpi)) as u32;
        Self { width_px: pixels(width_mm), height_px: pixels(height_mm), dpi }
    }

    /// A picture of this many pixels whose furniture scales with it, as if printed so that A4 landscape just fits inside.
    pub fn pixels(width_px: u32, height_px: u32) -> Self {
        let (width, height) = (f64::from(width_px), f64::from(height_px));
        let scale = crate::order::smaller(width / REFERENCE_PX.0, height / REFERENCE_PX.1);
        Self { width_px, height_px, dpi: libm::floor(REFERENCE_DPI * scale) as u32 }
    }

    /// Pixels per pixel of the reference canvas: the scale of type and furniture.
    fn scale(&self) -> f64 {
        f64::from(self.dpi) / REFERENCE_DPI
    }

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
        let least = |reference: f64| reference * self.scale() * (1.0 - PAPER_SLACK);
        let reason = if width < SMALLEST_PX.0 || height < SMALLEST_PX.1 {
            format!("it must be at least {} × {} pixels to be read", SMALLEST_PX.0, SMALLEST_PX.1)
        } else if pixels > MOST_PIXELS {
            format!("it would have {pixels} pixels, and at most {MOST_PIXELS} are drawn")
        } else if f64::from(long) > f64::from(short) * MOST_ASPECT {
            format!("its long side may be at most {MOST_ASPECT} times its short side")
        } else if self.dpi == 0
            || f64::from(width) < least(REFERENCE_PX.0)
            || f64::from(height) < least(REFERENCE_PX.1)
        {
            format!("at {} dpi its type needs at least 297 × 210 mm", self.dpi)
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
        "chart of {width_px} × {height_px} pixels: {reason}; ask for another size (A4 landscape at 150 dpi is 1754 × 1240, A3 at 300 dpi is 4961 × 3508)"
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

/// Draws one panel for each of the first-ranked lines: guaranteed and estimated fix distance against the place on the line
/// where the vehicle is lost, and the number of places against the distance run.
///
/// # Errors
///
/// [`RenderError`] when the size cannot be drawn or no line has a segment.
pub fn profiles_png(report: &LinesReport, size: &ChartSize) -> Result<Vec<u8>, RenderError> {
    canvas::paint(&profile::scene(report, size)?, size)
}

/// The texts of [`profiles_png`] and where they stand.
///
/// # Errors
///
/// As [`profiles_png`].
pub fn profiles_layout(report: &LinesReport, size: &ChartSize) -> Result<Vec<PlacedText>, RenderError> {
    Ok(profile::scene(report, size)?.texts)
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
