//! Black-and-white patterns that fill rectangles of a map. Lines and dots lie on a raster of the whole sheet, so that
//! neighbouring rectangles join without a seam.

use super::colours::{INK, UNDECIDED_GROUND};
use super::scene::{Px, Rect, Scene};
use crate::report::RemapCause;

/// How a surface is filled.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Pattern {
    /// Lines rising to the right.
    Rising,
    /// Lines falling to the right.
    Falling,
    /// Level lines.
    Level,
    /// Upright lines.
    Upright,
    /// Lines rising and falling.
    Crossed,
    /// Dots.
    Dots,
    /// Dots on grey: the mark of "undecided" on every chart.
    DotsOnGrey,
    /// Nothing.
    Open,
}

impl Pattern {
    /// The pattern of a cause.
    pub(super) fn of(cause: RemapCause) -> Self {
        match cause {
            RemapCause::BoxesTooWide => Self::Rising,
            RemapCause::TooFewLandmarks => Self::Level,
            RemapCause::DeadReckoning => Self::Upright,
            RemapCause::Sonar => Self::Dots,
            RemapCause::LookAlikeGround => Self::Crossed,
            RemapCause::SeveralErrors => Self::Falling,
            RemapCause::Undecided => Self::DotsOnGrey,
            RemapCause::DetectionNotCertain => Self::Open,
        }
    }

    /// Fills `rect`; `spacing` and `width` in pixels.
    pub(super) fn fill(self, scene: &mut Scene, rect: Rect, spacing: f64, width: f64) {
        match self {
            Self::Rising => lines(scene, rect, spacing, width, (1.0, -1.0)),
            Self::Falling => lines(scene, rect, spacing, width, (1.0, 1.0)),
            Self::Level => lines(scene, rect, spacing, width, (1.0, 0.0)),
            Self::Upright => lines(scene, rect, spacing, width, (0.0, 1.0)),
            Self::Crossed => {
                lines(scene, rect, spacing, width, (1.0, -1.0));
                lines(scene, rect, spacing, width, (1.0, 1.0));
            }
            Self::Dots => dots(scene, rect, spacing, width),
            Self::DotsOnGrey => {
                scene.fill(rect, UNDECIDED_GROUND);
                dots(scene, rect, spacing, width);
            }
            Self::Open => {}
        }
    }
}

/// Parallel lines in direction `along` (components 0, 1 or −1), `spacing` apart.
fn lines(scene: &mut Scene, rect: Rect, spacing: f64, width: f64, along: Px) {
    let length = libm::hypot(along.0, along.1);
    let (x, y) = (along.0 / length, along.1 / length);
    // Lines are numbered by their distance from the sheet's corner across their direction.
    let across = |p: Px| (p.0 * -y + p.1 * x) / spacing;
    let corners =
        [(rect.left, rect.top), (rect.right, rect.top), (rect.right, rect.bottom), (rect.left, rect.bottom)];
    let numbers = corners.map(across);
    let first = numbers.iter().copied().fold(f64::INFINITY, crate::interval::smaller).ceil() as i64;
    let last = numbers.iter().copied().fold(f64::NEG_INFINITY, crate::interval::larger).floor() as i64;
    let far = rect.left.abs() + rect.top.abs() + rect.right.abs() + rect.bottom.abs();
    for number in first..=last {
        let off = number as f64 * spacing;
        let foot = (-y * off, x * off);
        let ends = ((foot.0 - x * far, foot.1 - y * far), (foot.0 + x * far, foot.1 + y * far));
        if let Some((from, to)) = rect.clip_segment(ends.0, ends.1) {
            scene.stroke(vec![from, to], width, INK);
        }
    }
}

/// Dots on a raster, every other row shifted by half a step.
fn dots(scene: &mut Scene, rect: Rect, spacing: f64, width: f64) {
    let pitch = spacing * 0.8;
    let (first, last) = ((rect.top / pitch).ceil() as i64, (rect.bottom / pitch).floor() as i64);
    for row in first..=last {
        let shift = if row.rem_euclid(2) == 0 { 0.0 } else { 0.5 };
        let from = (rect.left / pitch - shift).ceil() as i64;
        let to = (rect.right / pitch - shift).floor() as i64;
        for column in from..=to {
            let centre = ((column as f64 + shift) * pitch, row as f64 * pitch);
            scene.disc(centre, width * 1.3, INK);
        }
    }
}
