//! A small plot: two axes with round ticks, and lines that can be told apart without colour.

use super::colours::{INK, PALE, Rgb, WHITE};
use super::furniture::Sheet;
use super::nice;
use super::scene::{Px, Rect, Scene};
use super::text::{self, Font};
use crate::order::{larger, smaller};

/// Distance of labels from the plot, pixels of the reference canvas.
const LABEL_PX: f64 = 7.0;
/// How far a label may stick out beside the plot, likewise.
const OVERHANG_PX: f64 = 22.0;

/// How values are spread along an axis.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Spacing {
    /// Equal steps, equal lengths.
    Even,
    /// Equal factors, equal lengths; `least` is positive.
    Logarithmic,
}

/// The values along one side of a plot.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Axis {
    pub(super) least: f64,
    pub(super) most: f64,
    pub(super) spacing: Spacing,
}

impl Axis {
    /// Where a value lies, 0 at the least and 1 at the most; values beyond an end lie on it.
    fn share(&self, value: f64) -> f64 {
        let share = match self.spacing {
            Spacing::Even => (value - self.least) / (self.most - self.least),
            Spacing::Logarithmic => {
                libm::log(larger(value, self.least) / self.least) / libm::log(self.most / self.least)
            }
        };
        share.clamp(0.0, 1.0)
    }

    /// Round values whose labels are at least `apart` (a share of the axis) from each other.
    fn ticks(&self, apart: f64) -> Vec<f64> {
        match self.spacing {
            Spacing::Even => {
                let step = nice::step_up((self.most - self.least) * apart);
                nice::multiples(step, self.least, self.most)
            }
            Spacing::Logarithmic => {
                let decades = (-3..9).map(|n| libm::pow(10.0, f64::from(n)));
                // Decades first; what stands between them is kept where there is room.
                let fine: [&[f64]; 3] = [&[1.0], &[1.0, 3.0], &[1.0, 2.0, 5.0]];
                let of = |digits: &[f64]| -> Vec<f64> {
                    let all = decades.clone().flat_map(|decade| digits.iter().map(move |d| d * decade));
                    all.filter(|&v| v >= self.least && v <= self.most).collect()
                };
                let fits = |values: &Vec<f64>| {
                    values.windows(2).all(|w| self.share(w[1]) - self.share(w[0]) >= apart)
                };
                fine.into_iter().rev().map(of).find(fits).unwrap_or_else(|| of(&[1.0]))
            }
        }
    }

    fn written(&self, value: f64) -> String {
        nice::short(value, 3)
    }
}

/// A rectangle of canvas that shows values against values.
#[derive(Clone, Copy, Debug)]
pub(super) struct Plot {
    pub(super) rect: Rect,
    pub(super) x: Axis,
    pub(super) y: Axis,
}

impl Plot {
    pub(super) fn px(&self, x: f64, y: f64) -> Px {
        (
            self.rect.left + self.x.share(x) * self.rect.width(),
            self.rect.bottom - self.y.share(y) * self.rect.height(),
        )
    }

    fn x_ticks(&self, font: Font) -> Vec<f64> {
        let widest = text::width(&self.x.written(libm::round(self.x.most)), font);
        self.x.ticks(1.6 * widest / self.rect.width())
    }

    fn y_ticks(&self, font: Font) -> Vec<f64> {
        self.y.ticks(1.5 * font.line_px() / self.rect.height())
    }

    /// Width that the labels of the upright axis need left of the plot.
    pub(super) fn gutter(&self, font: Font, k: f64) -> f64 {
        let labels = self.y_ticks(font).into_iter().map(|value| text::width(&self.y.written(value), font));
        labels.fold(0.0, larger) + (LABEL_PX + 4.0) * k
    }

    /// White ground and lines of the grid.
    pub(super) fn draw_ground(&self, sheet: &mut Sheet) {
        let (font, line) = (sheet.sizes.small(), larger(1.0, sheet.sizes.k));
        let Rect { left, top, right, bottom } = self.rect;
        sheet.scene.fill(self.rect, WHITE);
        for value in self.x_ticks(font) {
            let (x, _) = self.px(value, self.y.least);
            sheet.scene.fill(Rect::new(x, top, x + line, bottom), PALE);
        }
        for value in self.y_ticks(font) {
            let (_, y) = self.px(self.x.least, value);
            sheet.scene.fill(Rect::new(left, y, right, y + line), PALE);
        }
    }

    /// The frame and its labels. A label of the upright axis within a line of `spared` is left out: another stands there.
    pub(super) fn draw_edges(&self, sheet: &mut Sheet, spared: Option<f64>) {
        let (font, k) = (sheet.sizes.small(), sheet.sizes.k);
        let line = larger(1.0, 1.5 * k);
        let Rect { left, right, bottom, .. } = self.rect;
        sheet.scene.outline(self.rect.grown(line), line, INK);
        for value in self.x_ticks(font) {
            let (x, _) = self.px(value, self.y.least);
            let label = self.x.written(value);
            let half = text::width(&label, font) / 2.0;
            if x + half <= right + OVERHANG_PX * k {
                sheet.scene.fill(Rect::new(x, bottom, x + line, bottom + 5.0 * k), INK);
                sheet.scene.text((x - half, bottom + LABEL_PX * k), &label, font, INK);
            }
        }
        for value in self.y_ticks(font) {
            let (_, y) = self.px(self.x.least, value);
            if spared.is_some_and(|spared| (spared - y).abs() < font.line_px()) {
                continue;
            }
            sheet.scene.fill(Rect::new(left - 5.0 * k, y, left, y + line), INK);
            self.label_left(sheet, y, &self.y.written(value), INK);
        }
    }

    /// A label left of the plot at height `y`.
    pub(super) fn label_left(&self, sheet: &mut Sheet, y: f64, label: &str, colour: Rgb) {
        let (font, k) = (sheet.sizes.small(), sheet.sizes.k);
        let left = self.rect.left - LABEL_PX * k - text::width(label, font);
        sheet.scene.text((left, y - font.height_px() / 2.0), label, font, colour);
    }
}

/// How a line of a plot is drawn, so that it is known in grey print too.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct LineStyle {
    pub(super) colour: Rgb,
    /// Pixels of the reference canvas.
    pub(super) width: f64,
    /// Drawn and left out, likewise; none for a line drawn through.
    pub(super) dash: Option<(f64, f64)>,
}

impl LineStyle {
    /// Draws a path in this style.
    pub(super) fn draw(&self, scene: &mut Scene, path: &[Px], k: f64) {
        let width = larger(1.0, self.width * k);
        match self.dash {
            None => scene.stroke(path.to_vec(), width, self.colour),
            Some((on, off)) => {
                for dash in dashes(path, on * k, off * k) {
                    scene.stroke(dash, width, self.colour);
                }
            }
        }
    }
}

/// Pieces of a path, `on` pixels drawn and `off` left out, carried on around corners.
fn dashes(path: &[Px], on: f64, off: f64) -> Vec<Vec<Px>> {
    let mut found: Vec<Vec<Px>> = Vec::new();
    let (mut is_on, mut left) = (true, on);
    for pair in path.windows(2) {
        let (from, to) = (pair[0], pair[1]);
        let length = libm::hypot(to.0 - from.0, to.1 - from.1);
        let at = |run: f64| {
            let t = if length > 0.0 { run / length } else { 0.0 };
            (from.0 + (to.0 - from.0) * t, from.1 + (to.1 - from.1) * t)
        };
        let mut run = 0.0;
        while run < length {
            let end = smaller(length, run + left);
            if is_on {
                match found.last_mut().filter(|dash| dash.last() == Some(&at(run))) {
                    Some(dash) => dash.push(at(end)),
                    None => found.push(vec![at(run), at(end)]),
                }
            }
            left -= end - run;
            run = end;
            if left <= 1e-9 {
                is_on = !is_on;
                left = if is_on { on } else { off };
            }
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_apart() {
        let even = Axis { least: 0.0, most: 2334.0, spacing: Spacing::Even };
        assert_eq!(even.ticks(0.2), [0.0, 500.0, 1000.0, 1500.0, 2000.0]);
        let log = Axis { least: 0.8, most: 300.0, spacing: Spacing::Logarithmic };
        assert_eq!(log.ticks(0.3), [1.0, 10.0, 100.0]);
        assert_eq!(log.ticks(0.11), [1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0, 200.0]);
        assert_eq!(log.share(0.0), 0.0, "nothing is below the axis");
    }

    #[test]
    fn dashes_cover_their_share_of_the_path() {
        let path = [(0.0, 0.0), (70.0, 0.0), (70.0, 30.0)];
        let pieces = dashes(&path, 6.0, 4.0);
        let length = |piece: &Vec<Px>| -> f64 {
            piece.windows(2).map(|w| libm::hypot(w[1].0 - w[0].0, w[1].1 - w[0].1)).sum()
        };
        assert_eq!(pieces.len(), 10);
        assert!(pieces.iter().all(|piece| (length(piece) - 6.0).abs() < 1e-9), "{pieces:?}");
    }
}
