//! The chart of `trace`: where the vehicle could be after chosen detections of one simulated dive.

use super::colours::{FEASIBLE, GREY, INK, SOFT_INK, WHITE};
use super::furniture::{Extent, MapFrame, Sheet, bounds_in_words};
use super::lines::draw_landmarks;
use super::scene::{Px, Rect, Scene};
use super::{ChartSize, RenderError, nice, text};
use crate::dive::ErrorShape;
use crate::interval::{larger, smaller};
use crate::report::{TraceEvent, TraceReport};

/// Most frames that show the whole search area.
const WIDE_FRAMES: usize = 7;
/// A close-up is drawn when the last set is at most this share of the wide frames' ground.
const CLOSE_SHARE: f64 = 0.25;
/// Cells smaller than this are drawn as a mark of [`MARK_PX`], pixels.
const CELL_LEAST_PX: f64 = 5.0;
/// Side of the mark for a cell too small to see, pixels.
const MARK_PX: f64 = 7.0;
/// Gap between frames, northing labels included, at least; pixels.
const NOTE_MARGIN_PX: f64 = 110.0;
/// Least size of landmarks in the small frames, pixels.
const LANDMARK_PX: f64 = 3.0;

/// One small frame: its captions, its ground, and the event it shows.
struct Panel<'a> {
    title: String,
    note: String,
    extent: Extent,
    event: Option<&'a TraceEvent>,
}

/// Lays out the chart.
pub(super) fn scene(report: &TraceReport, size: &ChartSize) -> Result<Scene, RenderError> {
    let mut sheet = Sheet::new(size)?;
    let k = sheet.sizes.k;
    let panels = panels(report)?;
    let header = sheet.header("Where could the vehicle be, detection by detection?", &subtitle(report));
    let top = legend(&mut sheet, header + 10.0 * k);
    let bottom = sheet.foot(&report.provenance, &report.parameters, &[]);

    let font = sheet.sizes.small();
    let scale_row = 56.0 * k;
    let area = Rect::new(sheet.inner.left, top + 14.0 * k, sheet.inner.right, bottom - scale_row);
    let (columns, rows) = raster(panels.len(), area);
    let (pitch_x, pitch_y) = (area.width() / columns as f64, area.height() / rows as f64);
    // Notes are set narrower than any frame, so that the height they need is known before the frames are.
    let notes: Vec<Vec<String>> =
        panels.iter().map(|panel| text::wrap(&panel.note, font, pitch_x - NOTE_MARGIN_PX * k, 2)).collect();
    let note_lines = notes.iter().map(Vec::len).max().unwrap_or(1);
    let captions = sheet.sizes.heading().line_px() + note_lines as f64 * font.line_px() + 6.0 * k;
    let mut wide: Option<MapFrame> = None;
    for (index, (panel, note)) in panels.iter().zip(&notes).enumerate() {
        let (left, top) =
            (area.left + (index % columns) as f64 * pitch_x, area.top + (index / columns) as f64 * pitch_y);
        let cell = Rect::new(left, top, left + pitch_x - 16.0 * k, top + pitch_y - font.line_px() - 22.0 * k);
        let frame = panel_frame(&sheet, panel.extent, Rect { top: cell.top + captions, ..cell })
            .on_earth(&report.provenance.frame);
        let room = frame.rect.width();
        let title = text::fit(&panel.title, sheet.sizes.heading(), room);
        sheet.scene.text((frame.rect.left, cell.top), &title, sheet.sizes.heading(), INK);
        let note_top = cell.top + sheet.sizes.heading().line_px();
        sheet.scene.lines((frame.rect.left, note_top), note, font, INK);
        draw_panel(&mut sheet, &frame, report, panel);
        wide.get_or_insert(frame);
    }
    if let Some(frame) = wide {
        let row = area.bottom + 4.0 * k;
        let left = frame.draw_scale(&mut sheet, area.right, row);
        let name = format!(
            "Eastings and northings in metres  ·  {}, grid north up  ·  scale bar: frames of the whole search area",
            report.provenance.coordinate_system
        );
        let name = text::fit(&name, font, left - sheet.inner.left - 24.0 * k);
        sheet.scene.text((sheet.inner.left, row), &name, font, SOFT_INK);
    }
    Ok(sheet.scene)
}

fn subtitle(report: &TraceReport) -> String {
    let shape = match report.error_shape {
        ErrorShape::Uniform => "errors uniform within their bounds",
        ErrorShape::Corners => "errors at the ends of their bounds",
        ErrorShape::Steady => "errors steady at the ends of their bounds",
    };
    let verdict = match (report.undecided, report.fix_distance_m) {
        (true, _) => "undecided, the solver ran out of its cell budget".to_owned(),
        (false, Some(run)) => format!("fix after {} m", nice::metres(run)),
        (false, None) => "no fix before the line ends".to_owned(),
    };
    format!(
        "One simulated dive on line {} (lost at {} m, draw {}, {shape}): {verdict}; {}",
        text::printable(&report.line),
        nice::metres(report.from_m),
        report.draw,
        bounds_in_words(&report.parameters),
    )
}

/// The frames to draw: chosen events on the same ground, then a close-up of the last set if that shows more.
fn panels(report: &TraceReport) -> Result<Vec<Panel<'_>>, RenderError> {
    let chosen = choose(&report.events);
    let cells = chosen.iter().flat_map(|event| event.cell_corners.iter().flatten());
    let truths = chosen.iter().map(|event| &event.true_position);
    let ground = report.search_area.iter().chain(&report.path).chain(cells).chain(truths);
    let extent = Extent::of(ground).ok_or(RenderError::Nothing(
        "the trace has neither a search area nor a track with finite coordinates",
    ))?;
    let mut panels: Vec<Panel<'_>> = chosen
        .iter()
        .map(|&event| Panel {
            title: format!("Event {}, {} m run", event.number, nice::metres(event.run_m)),
            note: found(event),
            extent,
            event: Some(event),
        })
        .collect();
    if panels.is_empty() {
        let (title, note) = ("No detection".to_owned(), "nothing was seen on this run".to_owned());
        panels.push(Panel { title, note, extent, event: None });
    }
    if let Some(last) = chosen.last() {
        let set = Extent::of(last.cell_corners.iter().flatten().chain([&last.true_position]));
        let close = set.map(|set| set.grown(larger(larger(set.width(), set.height()) * 0.3, 1.0)));
        let widest = larger(extent.width(), extent.height());
        if let Some(close) =
            close.filter(|close| larger(close.width(), close.height()) <= CLOSE_SHARE * widest)
        {
            panels.push(Panel {
                title: format!("Close-up of event {}", last.number),
                note: found(last),
                extent: close,
                event: Some(last),
            });
        }
    }
    Ok(panels)
}

/// What one event left, in words.
fn found(event: &TraceEvent) -> String {
    let places = match event.places {
        1 => "1 place".to_owned(),
        count => format!("{count} places"),
    };
    let words = match event.spread_m {
        Some(spread) => format!("{places}, spread {} m", nice::metres(spread)),
        None => "empty set: bounds violated".to_owned(),
    };
    let mut words = vec![words];
    if event.is_fix {
        words.push("fix".to_owned());
    }
    if !event.truth_inside {
        words.insert(0, "TRUTH OUTSIDE".to_owned());
    }
    let drawn = event.cell_corners.len();
    if drawn < event.cells {
        words.push(format!("{drawn} of {} cells drawn", event.cells));
    }
    words.join("; ")
}

/// First and last event, the fix, and those at which the number of places changes by the largest factor.
fn choose(events: &[TraceEvent]) -> Vec<&TraceEvent> {
    let mut chosen: Vec<usize> = Vec::new();
    let fix = events.iter().position(|event| event.is_fix);
    let mut changes: Vec<usize> = (1..events.len()).collect();
    let change = |index: usize| {
        let logarithm = |event: &TraceEvent| libm::log(event.places as f64 + 1.0);
        (logarithm(&events[index]) - logarithm(&events[index - 1])).abs()
    };
    changes.sort_by(|&a, &b| change(b).total_cmp(&change(a)).then(a.cmp(&b)));
    let ends = (!events.is_empty()).then_some(0).into_iter().chain(events.len().checked_sub(1));
    for index in ends.chain(fix).chain(changes) {
        if chosen.len() < WIDE_FRAMES && !chosen.contains(&index) {
            chosen.push(index);
        }
    }
    chosen.sort_unstable();
    chosen.into_iter().map(|index| &events[index]).collect()
}

/// Columns and rows that give `count` frames the largest squares in `area`.
pub(super) fn raster(count: usize, area: Rect) -> (usize, usize) {
    let side = |columns: usize| {
        let rows = count.div_ceil(columns);
        smaller(area.width() / columns as f64, area.height() / rows as f64)
    };
    let columns = (1..=count).max_by(|&a, &b| side(a).total_cmp(&side(b)).then(b.cmp(&a))).unwrap_or(1);
    (columns, count.div_ceil(columns))
}

/// The map frame of a panel: as wide as its column leaves room for, beside its northing labels.
pub(super) fn panel_frame(sheet: &Sheet, extent: Extent, cell: Rect) -> MapFrame {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    let at = |gutter: f64| {
        let rect = Rect { left: cell.left + gutter, ..cell };
        MapFrame::showing(extent, rect, 12.0 * k)
    };
    at(at(84.0 * k).gutter(font, k))
}

fn draw_panel(sheet: &mut Sheet, frame: &MapFrame, report: &TraceReport, panel: &Panel<'_>) {
    let k = sheet.sizes.k;
    let thin = larger(1.0, 1.2 * k);
    frame.draw_ground(sheet);
    let scene = &mut sheet.scene;
    let mut area = frame.path(&report.search_area);
    area.extend(area.first().copied());
    clipped_stroke(scene, frame, &area, thin, GREY);
    draw_landmarks(scene, frame, &report.landmarks, LANDMARK_PX * larger(1.0, k));
    clipped_stroke(scene, frame, &frame.path(&report.path), thin, INK);
    if let Some(event) = panel.event {
        for cell in &event.cell_corners {
            draw_cell(scene, frame, &frame.path(cell), k);
        }
        let truth = frame.px(event.true_position);
        if frame.rect.holds(truth) {
            cross(scene, truth, k);
        }
    }
    frame.draw_edges(sheet);
}

/// A feasible cell: tint with an ink edge, or a mark where the cell is too small to see.
fn draw_cell(scene: &mut Scene, frame: &MapFrame, corners: &[Px], k: f64) {
    let Some(&first) = corners.first() else { return };
    let bounds = corners.iter().fold(Rect::new(first.0, first.1, first.0, first.1), |b, &(x, y)| {
        Rect::new(smaller(b.left, x), smaller(b.top, y), larger(b.right, x), larger(b.bottom, y))
    });
    if bounds.width() < CELL_LEAST_PX * k && bounds.height() < CELL_LEAST_PX * k {
        mark(scene, frame, bounds.centre(), k);
        return;
    }
    let inside = frame.rect.clip_polygon(corners);
    scene.polygon(inside, FEASIBLE);
    let mut edge = corners.to_vec();
    edge.push(first);
    clipped_stroke(scene, frame, &edge, larger(1.0, 1.4 * k), INK);
}

fn mark(scene: &mut Scene, frame: &MapFrame, centre: Px, k: f64) {
    let side = MARK_PX * k;
    let edge = larger(1.0, 1.4 * k);
    if let Some(seen) = Rect::centred(centre, side, side).intersection(&frame.rect) {
        scene.fill(seen, INK);
    }
    if let Some(seen) = Rect::centred(centre, side - 2.0 * edge, side - 2.0 * edge).intersection(&frame.rect)
    {
        scene.fill(seen, FEASIBLE);
    }
}

/// A cross with an open middle, so that it does not hide what it marks.
fn cross(scene: &mut Scene, (x, y): Px, k: f64) {
    for (width, from, to, colour) in [(5.0, 5.0, 14.0, WHITE), (2.2, 6.0, 13.0, INK)] {
        for (dx, dy) in [(1.0, 0.0), (-1.0, 0.0), (0.0, 1.0), (0.0, -1.0)] {
            let at = |r: f64| (x + dx * r * k, y + dy * r * k);
            scene.stroke(vec![at(from), at(to)], width * k, colour);
        }
    }
}

pub(super) fn clipped_stroke(
    scene: &mut Scene,
    frame: &MapFrame,
    points: &[Px],
    width: f64,
    colour: super::colours::Rgb,
) {
    for pair in points.windows(2) {
        if let Some((from, to)) = frame.rect.clip_segment(pair[0], pair[1]) {
            scene.stroke(vec![from, to], width, colour);
        }
    }
}

/// What the marks mean, in one row; returns where it ends.
fn legend(sheet: &mut Sheet, top: f64) -> f64 {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    let bottom = top + font.height_px();
    let middle = (top + bottom) / 2.0;
    let names = [
        "feasible cells",
        "true position (known to the simulator only)",
        "planned track",
        "landmark",
        "edge of the search area",
    ];
    let (swatch, gap) = (34.0 * k, 30.0 * k);
    let mut left = sheet.inner.left;
    for (index, name) in names.into_iter().enumerate() {
        let centre = (left + swatch / 2.0, middle);
        let line = vec![(left, middle), (left + swatch, middle)];
        let scene = &mut sheet.scene;
        match index {
            0 => {
                let rect = Rect::centred(centre, swatch, 16.0 * k);
                scene.fill(rect, FEASIBLE);
                scene.outline(rect, larger(1.0, 1.4 * k), INK);
            }
            1 => cross(scene, centre, k),
            2 => scene.stroke(line, larger(1.0, 1.2 * k), INK),
            3 => scene.fill(Rect::centred(centre, 5.0 * k, 5.0 * k), GREY),
            _ => scene.stroke(line, larger(1.0, 1.2 * k), GREY),
        }
        let name = text::fit(name, font, larger(0.0, sheet.inner.right - left - swatch - 8.0 * k));
        left = sheet.scene.text((left + swatch + 8.0 * k, top), &name, font, INK).right + gap;
    }
    bottom
}
