//! The ribbon of a track: cased in ink, filled by class, hatched without a fix, dotted when undecided.
//!
//! The legend draws its swatches with the same functions, so that it shows what the map shows.

use super::classes::Finding;
use super::colours::{INK, Rgb, UNDECIDED_GROUND, WHITE, ramp};
use super::scene::{Px, Scene};

/// Distance between hatch strokes over the ribbon's width.
const HATCH_SPACING: f64 = 0.75;
/// How far a hatch stroke leans along the ribbon, over the ribbon's width.
const HATCH_LEAN: f64 = 0.8;
/// Distance between dots over the ribbon's width.
const DOT_SPACING: f64 = 0.9;

/// Widths of a ribbon, pixels.
#[derive(Clone, Copy, Debug)]
pub(super) struct Ribbon {
    /// Width of the coloured part.
    pub(super) width: f64,
    /// Width of the ink on each side.
    pub(super) casing: f64,
    /// Width of hatch strokes.
    pub(super) hatch: f64,
}

impl Ribbon {
    pub(super) fn half(&self) -> f64 {
        self.width / 2.0 + self.casing
    }

    /// Casing of a whole track, drawn before its segments.
    pub(super) fn case(&self, scene: &mut Scene, points: &[Px]) {
        let mut ends = points.to_vec();
        // The casing closes the ribbon at both ends.
        if let [first, second, ..] = points {
            ends[0] = beyond(*second, *first, self.casing);
        }
        if let [.., second, last] = points {
            ends[points.len() - 1] = beyond(*second, *last, self.casing);
        }
        scene.stroke(ends, self.width + 2.0 * self.casing, INK);
    }

    /// Closes the outer side of the corner between two segments with the colour of the first; drawn between the two,
    /// so that the second covers what lies on its own side.
    pub(super) fn joint(&self, scene: &mut Scene, first: &[Px], second: &[Px], first_finding: Finding) {
        if let ([.., a, b], [c, d, ..]) = (first, second) {
            let (u, v) = ((b.0 - a.0, b.1 - a.1), (d.0 - c.0, d.1 - c.1));
            let (cross, dot) = (u.0 * v.1 - u.1 * v.0, u.0 * v.0 + u.1 * v.1);
            // Under three degrees the strokes meet without a gap.
            if cross.abs() > 0.05 * dot.abs() || dot < 0.0 {
                scene.disc(*b, self.width / 2.0, ground(first_finding));
            }
        }
    }

    /// One segment.
    pub(super) fn segment(&self, scene: &mut Scene, points: &[Px], finding: Finding) {
        scene.stroke(points.to_vec(), self.width, ground(finding));
        match finding {
            Finding::NoFix => self.hatch(scene, points),
            Finding::Undecided => self.dots(scene, points),
            Finding::Class(_) | Finding::NotScored => {}
        }
    }

    fn hatch(&self, scene: &mut Scene, points: &[Px]) {
        let lean = self.width * HATCH_LEAN / 2.0;
        for (point, along) in marks(points, self.width * HATCH_SPACING, lean) {
            let across = (-along.1 * self.width / 2.0, along.0 * self.width / 2.0);
            let from = (point.0 - across.0 - along.0 * lean, point.1 - across.1 - along.1 * lean);
            let to = (point.0 + across.0 + along.0 * lean, point.1 + across.1 + along.1 * lean);
            scene.stroke(vec![from, to], self.hatch, INK);
        }
    }

    fn dots(&self, scene: &mut Scene, points: &[Px]) {
        for (point, _) in marks(points, self.width * DOT_SPACING, self.width * DOT_SPACING / 2.0) {
            scene.disc(point, self.width / 5.0, INK);
        }
    }
}

/// Colour under the marks.
pub(super) fn ground(finding: Finding) -> Rgb {
    match finding {
        Finding::Class(class) => ramp()[class],
        Finding::NoFix | Finding::NotScored => WHITE,
        Finding::Undecided => UNDECIDED_GROUND,
    }
}

/// The point `by` beyond `to` as seen from `from`.
fn beyond(from: Px, to: Px, by: f64) -> Px {
    let length = libm::hypot(to.0 - from.0, to.1 - from.1);
    if length == 0.0 {
        return to;
    }
    (to.0 + (to.0 - from.0) / length * by, to.1 + (to.1 - from.1) / length * by)
}

/// Points at even spacing along a path, `inset` from its ends, with the direction there. A path too short for that
/// gets one mark in its middle, so that its finding still shows.
fn marks(points: &[Px], spacing: f64, inset: f64) -> Vec<(Px, Px)> {
    let total: f64 = points.windows(2).map(|w| libm::hypot(w[1].0 - w[0].0, w[1].1 - w[0].1)).sum();
    let room = total - 2.0 * inset;
    let count = if room > 0.0 { libm::floor(room / spacing) as usize } else { 0 };
    let first = (total - count as f64 * spacing) / 2.0;
    let mut wanted = (0..=count).map(|n| first + n as f64 * spacing).peekable();
    let mut found = Vec::with_capacity(count + 1);
    let mut run = 0.0;
    for pair in points.windows(2) {
        let (dx, dy) = (pair[1].0 - pair[0].0, pair[1].1 - pair[0].1);
        let length = libm::hypot(dx, dy);
        while let Some(at) = wanted.next_if(|&at| length > 0.0 && at <= run + length) {
            let t = (at - run) / length;
            found.push(((pair[0].0 + dx * t, pair[0].1 + dy * t), (dx / length, dy / length)));
        }
        run += length;
    }
    found
}
