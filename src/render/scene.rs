//! A chart before it is painted: shapes in drawing order, and rectangles that say what is taken.
//!
//! *Frame and units.* Pixels of the finished picture, x to the right, y down, with fractions. The chart modules
//! decide where everything goes; the canvas only paints.

use super::colours::Rgb;
use super::text::{self, Font};
use crate::interval::{larger, smaller};

/// A point on the canvas, pixels.
pub(super) type Px = (f64, f64);

/// A rectangle on the canvas, pixels.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rect {
    /// Left edge.
    pub left: f64,
    /// Upper edge.
    pub top: f64,
    /// Right edge.
    pub right: f64,
    /// Lower edge.
    pub bottom: f64,
}

impl Rect {
    /// The rectangle with these edges.
    pub const fn new(left: f64, top: f64, right: f64, bottom: f64) -> Self {
        Self { left, top, right, bottom }
    }

    pub(super) fn centred(centre: Px, width: f64, height: f64) -> Self {
        let (x, y) = centre;
        Self::new(x - width / 2.0, y - height / 2.0, x + width / 2.0, y + height / 2.0)
    }

    /// Width, pixels.
    pub fn width(&self) -> f64 {
        self.right - self.left
    }

    /// Height, pixels.
    pub fn height(&self) -> f64 {
        self.bottom - self.top
    }

    /// Its centre.
    pub fn centre(&self) -> (f64, f64) {
        ((self.left + self.right) / 2.0, (self.top + self.bottom) / 2.0)
    }

    pub(super) fn grown(&self, by: f64) -> Self {
        Self::new(self.left - by, self.top - by, self.right + by, self.bottom + by)
    }

    /// Whether the two share more than an edge.
    pub fn overlaps(&self, other: &Self) -> bool {
        self.left < other.right
            && other.left < self.right
            && self.top < other.bottom
            && other.top < self.bottom
    }

    /// Whether `other` lies inside, edges included.
    pub fn contains(&self, other: &Self) -> bool {
        self.left <= other.left
            && self.top <= other.top
            && self.right >= other.right
            && self.bottom >= other.bottom
    }

    pub(super) fn holds(&self, (x, y): Px) -> bool {
        x >= self.left && x <= self.right && y >= self.top && y <= self.bottom
    }

    pub(super) fn intersection(&self, other: &Self) -> Option<Self> {
        self.overlaps(other).then(|| {
            Self::new(
                larger(self.left, other.left),
                larger(self.top, other.top),
                smaller(self.right, other.right),
                smaller(self.bottom, other.bottom),
            )
        })
    }

    /// The part of the segment from `p` to `q` inside, by parametric clipping against the four edges.
    pub(super) fn clip_segment(&self, p: Px, q: Px) -> Option<(Px, Px)> {
        let d = (q.0 - p.0, q.1 - p.1);
        let (mut from, mut to) = (0.0, 1.0);
        let edges = [
            (-d.0, p.0 - self.left),
            (d.0, self.right - p.0),
            (-d.1, p.1 - self.top),
            (d.1, self.bottom - p.1),
        ];
        for (slope, room) in edges {
            if slope == 0.0 {
                if room < 0.0 {
                    return None;
                }
            } else if slope < 0.0 {
                from = larger(from, room / slope);
            } else {
                to = smaller(to, room / slope);
            }
        }
        (from <= to).then_some(((p.0 + d.0 * from, p.1 + d.1 * from), (p.0 + d.0 * to, p.1 + d.1 * to)))
    }

    /// The part of a polygon inside, cutting along one edge after the other.
    pub(super) fn clip_polygon(&self, points: &[Px]) -> Vec<Px> {
        /// Signed depth inside one edge of the rectangle; negative outside.
        type Depth<'a> = &'a dyn Fn(Px) -> f64;
        let depths: [Depth<'_>; 4] =
            [&|p| p.0 - self.left, &|p| self.right - p.0, &|p| p.1 - self.top, &|p| self.bottom - p.1];
        let mut kept = points.to_vec();
        for depth in depths {
            let mut next = Vec::with_capacity(kept.len() + 2);
            for (index, &here) in kept.iter().enumerate() {
                let before = kept[(index + kept.len() - 1) % kept.len()];
                let (at_here, at_before) = (depth(here), depth(before));
                if (at_here < 0.0) != (at_before < 0.0) {
                    let t = at_before / (at_before - at_here);
                    next.push((before.0 + (here.0 - before.0) * t, before.1 + (here.1 - before.1) * t));
                }
                if at_here >= 0.0 {
                    next.push(here);
                }
            }
            kept = next;
        }
        kept
    }
}

/// One shape.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Item {
    /// A filled polygon.
    Polygon { points: Vec<Px>, fill: Rgb },
    /// A filled rectangle, snapped to whole pixels so that its edges are sharp.
    Fill { rect: Rect, fill: Rgb },
    /// A stroke with butt ends and round joints.
    Stroke { points: Vec<Px>, width: f64, colour: Rgb },
    /// A filled disc.
    Disc { centre: Px, radius: f64, fill: Rgb },
    /// One line of text from `left` on `baseline`.
    Text { left: f64, baseline: f64, text: String, font: Font, colour: Rgb },
}

/// A piece of text on a chart and the rectangle it fills.
#[derive(Clone, Debug, PartialEq)]
pub struct PlacedText {
    /// What is written.
    pub text: String,
    /// Where: from the highest accent to the lowest descender.
    pub rect: Rect,
    /// Height of the type (the em), pixels.
    pub em_px: f64,
}

/// Shapes in drawing order.
#[derive(Clone, Debug, Default)]
pub(super) struct Scene {
    pub(super) items: Vec<Item>,
    pub(super) texts: Vec<PlacedText>,
}

impl Scene {
    pub(super) fn fill(&mut self, rect: Rect, fill: Rgb) {
        self.items.push(Item::Fill { rect, fill });
    }

    pub(super) fn polygon(&mut self, points: Vec<Px>, fill: Rgb) {
        self.items.push(Item::Polygon { points, fill });
    }

    pub(super) fn stroke(&mut self, points: Vec<Px>, width: f64, colour: Rgb) {
        self.items.push(Item::Stroke { points, width, colour });
    }

    pub(super) fn disc(&mut self, centre: Px, radius: f64, fill: Rgb) {
        self.items.push(Item::Disc { centre, radius, fill });
    }

    /// The outline of a rectangle, drawn inside it.
    pub(super) fn outline(&mut self, rect: Rect, width: f64, colour: Rgb) {
        let Rect { left, top, right, bottom } = rect;
        self.fill(Rect::new(left, top, right, top + width), colour);
        self.fill(Rect::new(left, bottom - width, right, bottom), colour);
        self.fill(Rect::new(left, top, left + width, bottom), colour);
        self.fill(Rect::new(right - width, top, right, bottom), colour);
    }

    /// Writes one line of text whose rectangle has its upper left corner at `(left, top)`; returns the rectangle.
    pub(super) fn text(&mut self, (left, top): Px, text: &str, font: Font, colour: Rgb) -> Rect {
        let rect = text::rect_at((left, top), text, font);
        self.items.push(Item::Text {
            left,
            baseline: top + font.ascent_px(),
            text: text.to_owned(),
            font,
            colour,
        });
        self.texts.push(PlacedText { text: text::without_steering(text), rect, em_px: font.em_px });
        rect
    }

    /// Writes lines of text one under the other; returns where the next line would start.
    pub(super) fn lines(&mut self, (left, top): Px, lines: &[String], font: Font, colour: Rgb) -> f64 {
        lines.iter().fold(top, |y, line| {
            self.text((left, y), line, font, colour);
            y + font.line_px()
        })
    }
}
