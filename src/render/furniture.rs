//! What every chart has: title, map frame with grid, scale bar, north arrow, foot. Written once.

use super::colours::{INK, PALE, SOFT_INK, WHITE};
use super::graticule::{self, Crossing};
use super::scene::{Px, Rect, Scene};
use super::text::{self, Font};
use super::{ChartSize, RenderError, compass, nice};
use crate::frame::{Frame, LocalPoint};
use crate::interval::{larger, smaller};
use crate::report::{Parameters, Provenance};

/// Distance of the labels on the upper edge from the frame, pixels of the reference canvas.
pub(super) const EDGE_LABEL_PX: f64 = 9.0;
/// How far a label of the lower edge may stick out beside the frame, pixels of the reference canvas.
const OVERHANG_PX: f64 = 34.0;

/// The three sizes of type. At print size they are 16, 9 and 7.7 points.
#[derive(Clone, Copy, Debug)]
pub(super) struct Sizes {
    /// Pixels per pixel of the reference canvas.
    pub(super) k: f64,
}

impl Sizes {
    pub(super) fn title(self) -> Font {
        Font { em_px: 34.0 * self.k, bold: true }
    }

    pub(super) fn heading(self) -> Font {
        Font { em_px: 19.0 * self.k, bold: true }
    }

    pub(super) fn body(self) -> Font {
        Font { em_px: 19.0 * self.k, bold: false }
    }

    pub(super) fn small(self) -> Font {
        Font { em_px: 16.0 * self.k, bold: false }
    }
}

/// A sheet with what has been drawn so far.
pub(super) struct Sheet {
    pub(super) scene: Scene,
    pub(super) sizes: Sizes,
    /// The canvas inside its margins.
    pub(super) inner: Rect,
}

impl Sheet {
    pub(super) fn new(size: &ChartSize) -> Result<Self, RenderError> {
        size.check()?;
        let (width, height) = (f64::from(size.width_px), f64::from(size.height_px));
        let k = size.scale();
        let inner = Rect::new(0.0, 0.0, width, height).grown(-48.0 * k);
        Ok(Self { scene: Scene::default(), sizes: Sizes { k }, inner })
    }

    /// Title and subtitle; returns where they end.
    pub(super) fn header(&mut self, title: &str, subtitle: &str) -> f64 {
        let (left, top, room) = (self.inner.left, self.inner.top, self.inner.width());
        let title = text::fit(title, self.sizes.title(), room);
        let bottom =
            self.scene.text((left, top - 6.0 * self.sizes.k), &title, self.sizes.title(), INK).bottom;
        let lines = text::wrap(subtitle, self.sizes.body(), room, 2);
        self.scene.lines((left, bottom + 4.0 * self.sizes.k), &lines, self.sizes.body(), SOFT_INK)
    }

    /// Caution first, provenance second, at the foot of the sheet; returns where they begin.
    pub(super) fn foot(&mut self, provenance: &Provenance, parameters: &Parameters, extra: &[String]) -> f64 {
        let font = self.sizes.small();
        let (caution, origin, top) = self.foot_lines(provenance, parameters, extra);
        let y = self.scene.lines((self.inner.left, top), &caution, font, INK);
        self.scene.lines((self.inner.left, y + 4.0 * self.sizes.k), &origin, font, SOFT_INK);
        top
    }

    /// Where the foot would begin with these extra pieces, without drawing it.
    pub(super) fn foot_top(&self, provenance: &Provenance, parameters: &Parameters, extra: &[String]) -> f64 {
        self.foot_lines(provenance, parameters, extra).2
    }

    /// Lines of the caution, lines of the provenance, and where the former begin.
    fn foot_lines(
        &self,
        provenance: &Provenance,
        parameters: &Parameters,
        extra: &[String],
    ) -> (Vec<String>, Vec<String>, f64) {
        let (font, room) = (self.sizes.small(), self.inner.width());
        let caution = text::wrap(provenance.caution, font, room, 4);
        let pieces = origin(provenance, parameters, extra);
        let pieces: Vec<String> = pieces.iter().map(|piece| text::fit(piece, font, room / 2.0)).collect();
        let origin = text::wrap_pieces(pieces.iter().map(String::as_str), "  ·  ", font, room, 4);
        let lines = (caution.len() + origin.len()) as f64;
        let top = self.inner.bottom - lines * font.line_px() - 4.0 * self.sizes.k;
        (caution, origin, top)
    }
}

/// Where the picture comes from, piece by piece.
fn origin(provenance: &Provenance, parameters: &Parameters, extra: &[String]) -> Vec<String> {
    let landmarks = match (parameters.half_width_min_m, parameters.half_width_max_m) {
        (Some(least), Some(most)) if least < most => {
            format!(
                "{} landmarks, half-width {}–{} m",
                parameters.landmarks,
                nice::short(least, 2),
                nice::short(most, 2)
            )
        }
        (Some(width), _) => {
            format!("{} landmarks, half-width {} m", parameters.landmarks, nice::short(width, 2))
        }
        _ => format!("{} landmarks", parameters.landmarks),
    };
    let mut pieces = vec![text::printable(&provenance.dive)];
    pieces.extend(provenance.issued.as_ref().map(|date| format!("issued {date}")));
    pieces.extend([
        provenance.coordinate_system.clone(),
        age_in_words(provenance),
        format!("{landmarks} ({})", text::printable(&parameters.landmark_uncertainty)),
        format!("fix size {} m", nice::short(parameters.fix_size_m, 2)),
    ]);
    pieces.extend_from_slice(extra);
    pieces.push(format!("seed {} ({})", provenance.seed, provenance.generator));
    pieces.push(format!("fixability {}", provenance.tool_version));
    let inputs = provenance.inputs.iter().map(|input| {
        let hash: String = input.sha256.chars().take(8).collect();
        format!("{} {hash}", text::printable(&input.name))
    });
    pieces.extend(inputs);
    pieces
}

/// Age of the map.
fn age_in_words(provenance: &Provenance) -> String {
    let days = |count: i64| if count.abs() == 1 { "day" } else { "days" };
    match (&provenance.surveyed, provenance.map_age_days) {
        (None, _) => "age of the map not stated".to_owned(),
        (Some(date), None) => format!("landmarks surveyed {date}"),
        (Some(date), Some(0)) => format!("landmarks surveyed {date} (day of issue)"),
        (Some(date), Some(age)) => {
            let side = if age > 0 { "before" } else { "after" };
            format!("landmarks surveyed {date} ({} {} {side} issue)", age.abs(), days(age))
        }
    }
}

/// Vehicle, sonar and bounds in words, for subtitles.
pub(super) fn bounds_in_words(parameters: &Parameters) -> String {
    let mut reckoning = vec![
        format!("{} % of distance", nice::short(parameters.scale_error_pct, 2)),
        format!("±{}° heading bias", nice::short(parameters.heading_bias_deg, 2)),
        format!("±{}° heading noise", nice::short(parameters.heading_noise_deg, 2)),
    ];
    if parameters.drift_mps > 0.0 {
        reckoning.push(format!("{} m/s drift", nice::short(parameters.drift_mps, 3)));
    }
    let budget = match (parameters.stray_budget, parameters.miss_budget) {
        (0, 0) => "no stray or miss allowed".to_owned(),
        (strays, misses) => format!("{strays} strays and {misses} misses allowed"),
    };
    format!(
        "{} sonar {}–{} m, dead reckoning {}; {budget}",
        parameters.sonar_kind,
        nice::short(parameters.range_min_m, 1),
        nice::short(parameters.range_max_m, 1),
        reckoning.join(", "),
    )
}

/// Bounds of a set of positions, metres.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Extent {
    pub(super) west: f64,
    pub(super) south: f64,
    pub(super) east: f64,
    pub(super) north: f64,
}

impl Extent {
    /// The bounds of `points`; none without points or when one is not finite.
    pub(super) fn of<'a>(points: impl IntoIterator<Item = &'a LocalPoint>) -> Option<Self> {
        let extent = points.into_iter().fold(None, |extent: Option<Self>, point| {
            let (e, n) = (point.east_m, point.north_m);
            Some(extent.map_or(Self { west: e, south: n, east: e, north: n }, |x| Self {
                west: smaller(x.west, e),
                south: smaller(x.south, n),
                east: larger(x.east, e),
                north: larger(x.north, n),
            }))
        })?;
        let finite = [extent.west, extent.south, extent.east, extent.north].iter().all(|x| x.is_finite());
        finite.then_some(extent)
    }

    pub(super) fn grown(self, by: f64) -> Self {
        Self { west: self.west - by, south: self.south - by, east: self.east + by, north: self.north + by }
    }

    pub(super) fn width(self) -> f64 {
        self.east - self.west
    }

    pub(super) fn height(self) -> f64 {
        self.north - self.south
    }
}

/// A grid line: its position on the canvas along one axis, pixels, and its label.
type Tick = (f64, String);

/// A map frame: a rectangle of canvas that shows a rectangle of ground, north up, same scale both ways.
#[derive(Clone, Debug)]
pub(super) struct MapFrame {
    pub(super) rect: Rect,
    pub(super) px_per_m: f64,
    /// What ties the ground to latitude and longitude; none for local metres.
    pub(super) earth: Option<Frame>,
    /// Ground at the upper left corner.
    west: f64,
    north: f64,
}

impl MapFrame {
    /// The frame in `rect` that shows all of `extent` at least `inset` pixels from its edges.
    pub(super) fn showing(extent: Extent, rect: Rect, inset: f64) -> Self {
        let room = rect.grown(-inset);
        // A single point still gets a frame of a metre.
        let px_per_m =
            smaller(room.width() / larger(extent.width(), 1.0), room.height() / larger(extent.height(), 1.0));
        let centre = ((extent.west + extent.east) / 2.0, (extent.south + extent.north) / 2.0);
        Self {
            rect,
            px_per_m,
            earth: None,
            west: centre.0 - rect.width() / 2.0 / px_per_m,
            north: centre.1 + rect.height() / 2.0 / px_per_m,
        }
    }

    /// The same frame, tied to the Earth unless `frame` is plain local metres.
    pub(super) fn on_earth(self, frame: &Frame) -> Self {
        Self { earth: (!frame.is_local()).then(|| frame.clone()), ..self }
    }

    /// The ground at a place of the canvas.
    pub(super) fn ground(&self, (x, y): Px) -> LocalPoint {
        LocalPoint::new(
            self.west + (x - self.rect.left) / self.px_per_m,
            self.north - (y - self.rect.top) / self.px_per_m,
        )
    }

    pub(super) fn px(&self, point: LocalPoint) -> Px {
        (
            self.rect.left + (point.east_m - self.west) * self.px_per_m,
            self.rect.top + (self.north - point.north_m) * self.px_per_m,
        )
    }

    pub(super) fn path(&self, points: &[LocalPoint]) -> Vec<Px> {
        points.iter().map(|&point| self.px(point)).collect()
    }

    /// Metres across the frame.
    pub(super) fn width_m(&self) -> f64 {
        self.rect.width() / self.px_per_m
    }

    /// Step of the grid, so that labels stand at least one and a half labels apart.
    fn step_m(&self, font: Font) -> f64 {
        let last = self.west + self.width_m();
        let mut step = nice::step_up(font.em_px * 4.0 / self.px_per_m);
        // Wider labels ask for a wider step, which can only make them shorter: two rounds settle it.
        for _ in 0..2 {
            let label = larger(
                text::width(&nice::written(last, step), font),
                text::width(&nice::written(self.west, step), font),
            );
            step = nice::step_up(1.5 * label / self.px_per_m);
        }
        step
    }

    /// Grid lines of the eastings (by x) and of the northings (by y).
    fn ticks(&self, font: Font) -> (Vec<Tick>, Vec<Tick>) {
        let step = self.step_m(font);
        let east = nice::multiples(step, self.west, self.west + self.width_m());
        let south = self.north - self.rect.height() / self.px_per_m;
        let north = nice::multiples(step, south, self.north);
        let label = |value: f64| nice::written(value, step);
        (
            east.into_iter().map(|e| (self.px(LocalPoint::new(e, self.north)).0, label(e))).collect(),
            north.into_iter().map(|n| (self.px(LocalPoint::new(self.west, n)).1, label(n))).collect(),
        )
    }

    /// Width the northing labels need left of the frame.
    pub(super) fn gutter(&self, font: Font, k: f64) -> f64 {
        let (_, north) = self.ticks(font);
        let widest = north.iter().map(|(_, label)| text::width(label, font)).fold(0.0, larger);
        widest + 14.0 * k
    }

    /// White ground and grid lines.
    pub(super) fn draw_ground(&self, sheet: &mut Sheet) {
        let font = sheet.sizes.small();
        let line = larger(1.0, sheet.sizes.k);
        let Rect { left, top, right, bottom } = self.rect;
        sheet.scene.fill(self.rect, WHITE);
        let (east, north) = self.ticks(font);
        for (x, _) in east {
            sheet.scene.fill(Rect::new(x, top, x + line, bottom), PALE);
        }
        for (y, _) in north {
            sheet.scene.fill(Rect::new(left, y, right, y + line), PALE);
        }
    }

    /// The frame itself, tick marks and full coordinates along its left and lower edges; returns where the easting
    /// labels end.
    pub(super) fn draw_edges(&self, sheet: &mut Sheet) -> f64 {
        let (font, k) = (sheet.sizes.small(), sheet.sizes.k);
        let Rect { left, top, right, bottom } = self.rect;
        let line = larger(1.0, 1.5 * k);
        sheet.scene.outline(self.rect.grown(line), line, INK);
        let (east, north) = self.ticks(font);
        let labels_top = bottom + 9.0 * k;
        for (x, label) in east {
            let half = text::width(&label, font) / 2.0;
            // A label at a corner may stick out as far as the space beside the frame goes.
            if x - half >= left - OVERHANG_PX * k && x + half <= right + OVERHANG_PX * k {
                sheet.scene.fill(Rect::new(x, bottom, x + line, bottom + 6.0 * k), INK);
                sheet.scene.text((x - half, labels_top), &label, font, INK);
            }
        }
        for (y, label) in north {
            let x = left - 11.0 * k - text::width(&label, font);
            let label_top = y - font.height_px() / 2.0;
            // A label may stick out as far as the name of the axis above and the easting labels below leave room.
            if label_top >= top - EDGE_LABEL_PX * k
                && label_top + font.height_px() <= bottom + EDGE_LABEL_PX * k
            {
                sheet.scene.fill(Rect::new(left - 6.0 * k, y, left, y + line), INK);
                sheet.scene.text((x, label_top), &label, font, INK);
            }
        }
        labels_top + font.height_px()
    }

    /// Ticks of longitude on the upper edge, from `left` on, and of latitude on the right edge; nothing for local metres.
    pub(super) fn draw_graticule(&self, sheet: &mut Sheet, left: f64) {
        let (font, k) = (sheet.sizes.small(), sheet.sizes.k);
        let (rect, line) = (self.rect, larger(1.0, 1.5 * k));
        for Crossing { at: x, label } in graticule::meridians(self, font) {
            // A tick goes with its label: without one it tells nothing.
            let half = text::width(&label, font) / 2.0;
            if x - half >= left && x + half <= rect.right + OVERHANG_PX * k {
                let x_line = x - line / 2.0;
                sheet.scene.fill(Rect::new(x_line, rect.top - 6.0 * k, x_line + line, rect.top), INK);
                let label_top = rect.top - font.height_px() - EDGE_LABEL_PX * k;
                sheet.scene.text((x - half, label_top), &label, font, INK);
            }
        }
        for Crossing { at: y, label } in graticule::parallels(self, font) {
            let label_top = y - font.height_px() / 2.0;
            if label_top >= rect.top - 4.0 * k && label_top + font.height_px() <= rect.bottom + 4.0 * k {
                let y_line = y - line / 2.0;
                sheet.scene.fill(Rect::new(rect.right, y_line, rect.right + 6.0 * k, y_line + line), INK);
                sheet.scene.text((rect.right + 11.0 * k, label_top), &label, font, INK);
            }
        }
    }

    /// Scale bar and north arrow with their right edge at `right` and their upper edge at `top`; returns their left
    /// edge.
    pub(super) fn draw_scale(&self, sheet: &mut Sheet, right: f64, top: f64) -> f64 {
        let (font, k) = (sheet.sizes.small(), sheet.sizes.k);
        let compass_left = compass::draw(sheet, self, (right, top));
        let end_label = |length: f64| format!("{} m", nice::short(length, 3));
        let length_m = nice::step_down(self.width_m() * 0.25);
        let end = end_label(length_m);
        let bar_px = length_m * self.px_per_m;
        let end_half = text::width(&end, font) / 2.0;
        let bar_right = compass_left - 24.0 * k - end_half;
        let bar = Rect::new(bar_right - bar_px, top + 24.0 * k, bar_right, top + 32.0 * k);
        sheet.scene.fill(bar, INK);
        let line = larger(1.0, 1.5 * k);
        for quarter in [1, 3] {
            let x = bar.left + bar.width() * f64::from(quarter) / 4.0;
            let part = Rect::new(x + line, bar.top + line, x + bar.width() / 4.0 - line, bar.bottom - line);
            sheet.scene.fill(part, WHITE);
        }
        let zero_half = text::width("0", font) / 2.0;
        sheet.scene.text((bar.left - zero_half, top), "0", font, INK);
        sheet.scene.text((bar.right - end_half, top), &end, font, INK);
        bar.left - zero_half
    }
}
