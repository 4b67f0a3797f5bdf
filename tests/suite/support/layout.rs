//! What every chart keeps to: texts on the sheet, none on another.

use fixability::render::{ChartSize, PlacedText, Rect};

/// Fails unless every text lies on the canvas and is clear of all others. `what` names the chart.
#[track_caller]
pub fn assert_clear(texts: &[PlacedText], size: &ChartSize, what: &str) {
    let canvas = Rect::new(0.0, 0.0, f64::from(size.width_px), f64::from(size.height_px));
    for (index, text) in texts.iter().enumerate() {
        assert!(canvas.contains(&text.rect), "{what}: clipped: {text:?}");
        for other in &texts[..index] {
            assert!(!text.rect.overlaps(&other.rect), "{what}: {text:?} lies on {other:?}");
        }
    }
}
