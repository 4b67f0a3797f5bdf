//! The stepped dives as plain values: the same for the frames drawn here and for the script.
//!
//! *Units.* Decimetres from the north-west corner of the ground shown, x east and y south, whole numbers: SVG's axes, and
//! no decimals to carry.

use serde::Serialize;

use super::Page;
use super::table::count;
use crate::frame::LocalPoint;
use crate::order::{larger, smaller};
use crate::report::{ChartLandmark, TraceEvent, TraceReport};

/// Most cells drawn over all lines at one event of each; every line gets an equal part ...
const CELLS_AT_ONCE: usize = 2400;
/// ... but no more than this, which is as many as can be told apart ...
const CELLS_MOST: usize = 600;
/// ... and no fewer than this.
const CELLS_LEAST: usize = 100;
/// Most landmarks drawn.
const LANDMARKS_MOST: usize = 20_000;
/// A cell whose extent is below this share of the picture's width is drawn as a mark.
const MARK_SHARE: f64 = 0.01;
/// Width of the close-up in fix sizes.
const CLOSE_UP_FIX_SIZES: f64 = 6.0;

/// The ground shown: all of the search area and of the traced tracks.
#[derive(Clone, Copy, Debug)]
pub(super) struct Ground {
    west_m: f64,
    north_m: f64,
    /// Width, decimetres.
    pub width: i64,
    /// Height, decimetres.
    pub height: i64,
    /// Side of the close-up, decimetres.
    pub close: i64,
}

impl Ground {
    /// None when nothing has a place.
    pub fn of(page: &Page<'_>) -> Option<Self> {
        let mut points =
            page.traces.iter().flat_map(|trace| trace.search_area.iter().chain(&trace.path)).copied();
        let first = points.next()?;
        let (mut low, mut high) = (first, first);
        for point in points {
            low = LocalPoint::new(smaller(low.east_m, point.east_m), smaller(low.north_m, point.north_m));
            high = LocalPoint::new(larger(high.east_m, point.east_m), larger(high.north_m, point.north_m));
        }
        let margin = 0.02 * larger(high.east_m - low.east_m, high.north_m - low.north_m) + 1.0;
        let tenths = |metres: f64| (10.0 * metres).round() as i64;
        Some(Self {
            west_m: low.east_m - margin,
            north_m: high.north_m + margin,
            width: tenths(high.east_m - low.east_m + 2.0 * margin),
            height: tenths(high.north_m - low.north_m + 2.0 * margin),
            close: tenths(CLOSE_UP_FIX_SIZES * page.lines.parameters.fix_size_m),
        })
    }

    pub fn at(&self, point: LocalPoint) -> (i64, i64) {
        let x = (10.0 * (point.east_m - self.west_m)).round() as i64;
        let y = (10.0 * (self.north_m - point.north_m)).round() as i64;
        (x, y)
    }

    /// A line through points.
    pub fn line(&self, points: &[LocalPoint]) -> String {
        let mut path = String::new();
        for (index, &point) in points.iter().enumerate() {
            let (x, y) = self.at(point);
            path.push_str(&format!("{}{x} {y}", if index == 0 { "M" } else { "L" }));
        }
        path
    }

    /// Landmarks' boxes at true size.
    pub fn boxes(&self, landmarks: &[ChartLandmark]) -> String {
        let mut path = String::new();
        for landmark in spaced(landmarks, LANDMARKS_MOST) {
            let (x, y) = self.at(landmark.position);
            let half = |metres: f64| (10.0 * metres).round() as i64;
            let (w, h) = (half(landmark.half_width_east_m), half(landmark.half_width_north_m));
            path.push_str(&format!("M{} {}h{}v{}h{}z", x - w, y - h, 2 * w, 2 * h, -2 * w));
        }
        path
    }
}

/// At most `most` of the items, evenly spaced.
fn spaced<T>(items: &[T], most: usize) -> impl Iterator<Item = &T> {
    let drawn = items.len().min(most);
    (0..drawn).map(move |index| &items[index * items.len() / drawn])
}

/// All that the script needs.
#[derive(Debug, Serialize)]
pub(super) struct Dives {
    /// Width of the picture, decimetres.
    width: i64,
    /// Side of the close-up, decimetres.
    close: i64,
    dives: Vec<Dive>,
}

impl Dives {
    /// The dives, in the order of the page's traces.
    pub fn list(&self) -> &[Dive] {
        &self.dives
    }
}

/// One dive.
#[derive(Debug, Serialize)]
pub(super) struct Dive {
    pub events: Vec<Event>,
}

/// What is shown of one detection.
#[derive(Debug, Serialize)]
pub(super) struct Event {
    /// In words, for the live text.
    pub text: String,
    /// The same, short.
    pub short: String,
    /// Outlines of the cells.
    pub cells: String,
    /// Middles of the cells that are too small to see on the whole ground.
    pub marks: String,
    /// True position.
    pub truth: (i64, i64),
}

/// The dives of a page; none where there is nothing to draw on.
pub(super) fn dives(page: &Page<'_>) -> Dives {
    let ground = Ground::of(page);
    let most = (CELLS_AT_ONCE / page.traces.len().clamp(1, CELLS_AT_ONCE)).clamp(CELLS_LEAST, CELLS_MOST);
    Dives {
        width: ground.map_or(0, |ground| ground.width),
        close: ground.map_or(0, |ground| ground.close),
        dives: page
            .traces
            .iter()
            .map(|trace| Dive {
                events: ground.map_or_else(Vec::new, |ground| {
                    trace.events.iter().map(|event| self::event(&ground, trace, event, most)).collect()
                }),
            })
            .collect(),
    }
}

/// One detection, with at most `most` of its cells.
fn event(ground: &Ground, trace: &TraceReport, event: &TraceEvent, most: usize) -> Event {
    let (mut cells, mut marks) = (String::new(), String::new());
    for corners in spaced(&event.cell_corners, most) {
        cells.push_str(&ground.line(corners));
        cells.push('z');
        if let Some((middle, extent)) = middle(corners)
            && 10.0 * extent < MARK_SHARE * ground.width as f64
        {
            let (x, y) = ground.at(middle);
            marks.push_str(&format!("M{x} {y}h0"));
        }
    }
    let drawn = event.cell_corners.len().min(most);
    let places = match event.spread_m {
        None => "no position is left".to_owned(),
        Some(spread) => format!(
            "{}, spread {spread:.1} m; {}",
            count(event.places, "place", "places"),
            if event.is_fix { "a fix" } else { "no fix" }
        ),
    };
    let of_cells =
        if drawn < event.cells { format!(" {drawn} of {} cells drawn.", event.cells) } else { String::new() };
    Event {
        text: format!(
            "Detection {} of {}, {:.0} m run: {places}.{of_cells}",
            event.number,
            trace.events.len(),
            event.run_m
        ),
        short: format!("detection {}, {:.0} m run, {places}", event.number, event.run_m),
        cells,
        marks,
        truth: ground.at(event.true_position),
    }
}

/// Middle and larger extent of a cell, metres.
fn middle(corners: &[LocalPoint]) -> Option<(LocalPoint, f64)> {
    let first = *corners.first()?;
    let (mut low, mut high) = (first, first);
    for corner in corners {
        low = LocalPoint::new(smaller(low.east_m, corner.east_m), smaller(low.north_m, corner.north_m));
        high = LocalPoint::new(larger(high.east_m, corner.east_m), larger(high.north_m, corner.north_m));
    }
    let middle = LocalPoint::new((low.east_m + high.east_m) / 2.0, (low.north_m + high.north_m) / 2.0);
    Some((middle, larger(high.east_m - low.east_m, high.north_m - low.north_m)))
}

/// JSON that can stand inside a `script` element: no `<` in it, so that no text can end the element or open a comment.
/// A `<` occurs in JSON only inside strings, where the escape means the same.
pub(super) fn script_json(value: &impl Serialize) -> String {
    let json = serde_json::to_string(value).expect("plain values can be put into JSON");
    json.replace('<', "\\u003c")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn json_cannot_end_its_element() {
        let text = "</script><!-- <script>";
        let json = script_json(&text);
        assert!(!json.contains('<'));
        assert_eq!(serde_json::from_str::<String>(&json).unwrap(), text);
    }

    #[test]
    fn spaced_items_are_few_and_begin_with_the_first() {
        let items: Vec<usize> = (0..1000).collect();
        let few: Vec<usize> = spaced(&items, 4).copied().collect();
        assert_eq!(few, [0, 250, 500, 750]);
        assert_eq!(spaced(&items[..3], 4).count(), 3);
        assert_eq!(spaced::<usize>(&[], 4).count(), 0);
    }
}
