//! The chart of `lines`: which line fixes the vehicle soonest?

use super::classes::{Finding, Scale};
use super::colours::{GREY, INK, SOFT_INK};
use super::furniture::{EDGE_LABEL_PX, Extent, MapFrame, Sheet, bounds_in_words};
use super::place::Taken;
use super::ribbon::Ribbon;
use super::scene::{Px, Rect, Scene};
use super::text::Font;
use super::{ChartSize, RenderError, graticule, legend, ranking, text};
use crate::interval::larger;
use crate::report::{ChartLandmark, LineReport, LinesReport, Provenance, SegmentReport};

/// Least size at which a landmark's box is drawn true to scale, pixels; smaller ones become a square of this size.
pub(super) const BOX_LEAST_PX: f64 = 4.0;
/// Widest label over the width of the frame.
const LABEL_SHARE: f64 = 0.2;

/// Lays out the chart.
pub(super) fn scene(report: &LinesReport, size: &ChartSize) -> Result<Scene, RenderError> {
    let mut sheet = Sheet::new(size)?;
    let k = sheet.sizes.k;
    let tracks = report.lines.iter().flat_map(|line| &line.segments).flat_map(|segment| &segment.path);
    let extent =
        Extent::of(tracks).ok_or(RenderError::Nothing("no line has a track with finite coordinates"))?;
    let extent = extent.grown(report.parameters.farthest_horizontal_m);
    let scale = Scale::of(report);

    let top = sheet.header("Which line fixes the vehicle soonest?", &subtitle(report));
    // How many landmarks the frame leaves out is known only once the frame stands; leave room for the largest number.
    let bottom =
        sheet.foot_top(&report.provenance, &report.parameters, &extra_pieces(report, report.landmarks.len()));
    let column =
        Rect::new(sheet.inner.right - 404.0 * k, top + 34.0 * k, sheet.inner.right, bottom - 16.0 * k);
    let frame = fit_frame(&sheet, &report.provenance, extent, (top, bottom), column.left - 36.0 * k);
    let outside = report.landmarks.iter().filter(|mark| !frame.rect.holds(frame.px(mark.position))).count();
    sheet.foot(&report.provenance, &report.parameters, &extra_pieces(report, outside));

    frame.draw_ground(&mut sheet);
    draw_landmarks(&mut sheet.scene, &frame, &report.landmarks, BOX_LEAST_PX * larger(1.0, k));
    let ribbon = Ribbon { width: 10.0 * k, casing: larger(1.0, 1.5 * k), hatch: larger(1.0, 1.6 * k) };
    let mut findings = Vec::new();
    for line in &report.lines {
        ribbon.case(&mut sheet.scene, &track_px(&frame, line));
        let mut before: Option<(Vec<Px>, Finding)> = None;
        for segment in &line.segments {
            let (path, finding) = (frame.path(&segment.path), scale.finding(segment));
            if let Some((before, its_finding)) = &before {
                ribbon.joint(&mut sheet.scene, before, &path, *its_finding);
            }
            ribbon.segment(&mut sheet.scene, &path, finding);
            findings.push(finding);
            before = Some((path, finding));
        }
    }
    let mut taken = draw_names(&mut sheet, &frame, report, ribbon.half());
    let has_look_alikes =
        draw_marks(&mut sheet, &frame, report, ribbon.half(), &mut taken, Mark::LOOK_ALIKES);
    let has_regions = draw_marks(&mut sheet, &frame, report, ribbon.half(), &mut taken, Mark::REMAP_REGIONS);
    draw_surround(&mut sheet, &frame, &report.provenance);
    let legend_bottom =
        legend::draw(&mut sheet, column, column.top, &scale, &findings, [has_look_alikes, has_regions]);
    let rest = Rect::new(column.left, legend_bottom + 22.0 * k, column.right, column.bottom);
    ranking::draw(&mut sheet, rest, report);
    Ok(sheet.scene)
}

fn subtitle(report: &LinesReport) -> String {
    let parameters = &report.parameters;
    let dives: usize = report.lines.iter().map(|line| line.estimated.dives).sum();
    let lines = match report.lines.len() {
        1 => "One candidate line".to_owned(),
        count => format!("{count} candidate lines"),
    };
    format!(
        "{lines}, vehicle lost at the start of any segment; {}; {dives} simulated dives scored",
        bounds_in_words(parameters),
    )
}

fn extra_pieces(report: &LinesReport, outside: usize) -> Vec<String> {
    let mut pieces = vec![format!("{} draws per line", report.parameters.draws)];
    if outside > 0 {
        pieces.push(format!("{outside} landmarks lie outside the frame"));
    }
    pieces
}

/// The map frame between header and foot, left of `right`, tied to the Earth where the report is.
pub(super) fn fit_frame(
    sheet: &Sheet,
    provenance: &Provenance,
    extent: Extent,
    (top, bottom): (f64, f64),
    right: f64,
) -> MapFrame {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    // Above: the name of the northings and the longitudes. Below: easting labels, then scale bar and north arrow.
    let (above, below) = (12.0 * k + font.line_px() + 8.0 * k, font.line_px() + 66.0 * k);
    let frame_at = |left: f64, right: f64| {
        let rect = Rect::new(left, top + above, right, bottom - below);
        MapFrame::showing(extent, rect, 56.0 * k).on_earth(&provenance.frame)
    };
    let guess = frame_at(sheet.inner.left + 90.0 * k, right);
    // The gutter of the latitudes takes part of the space that callers leave beside the frame.
    let latitudes = graticule::parallels(&guess, font);
    let widest = latitudes.iter().map(|tick| text::width(&tick.label, font)).fold(0.0, larger);
    let right = if latitudes.is_empty() { right } else { right - widest + 5.0 * k };
    frame_at(sheet.inner.left + guess.gutter(font, k), right)
}

/// Axis names, tick labels, latitudes and longitudes, scale bar and north arrow around the frame.
pub(super) fn draw_surround(sheet: &mut Sheet, frame: &MapFrame, provenance: &Provenance) {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    let labels_bottom = frame.draw_edges(sheet);
    let above = frame.rect.top - font.height_px() - EDGE_LABEL_PX * k;
    let name = sheet.scene.text((sheet.inner.left, above), "Northing, m", font, SOFT_INK);
    frame.draw_graticule(sheet, name.right + 10.0 * k);
    let row = labels_bottom + 10.0 * k;
    let scale_left = frame.draw_scale(sheet, frame.rect.right, row);
    let name = format!("Easting, m  ·  {}, grid north up", provenance.coordinate_system);
    let name = text::fit(&name, font, scale_left - frame.rect.left - 24.0 * k);
    sheet.scene.text((frame.rect.left, row), &name, font, SOFT_INK);
}

/// Boxes at true size, or squares of `least` pixels where a box would not show.
pub(super) fn draw_landmarks(scene: &mut Scene, frame: &MapFrame, landmarks: &[ChartLandmark], least: f64) {
    for landmark in landmarks {
        let width = larger(least, 2.0 * landmark.half_width_east_m * frame.px_per_m);
        let height = larger(least, 2.0 * landmark.half_width_north_m * frame.px_per_m);
        let rect = Rect::centred(frame.px(landmark.position), width, height);
        if let Some(seen) = rect.intersection(&frame.rect) {
            scene.fill(seen, GREY);
        }
    }
}

fn track_px(frame: &MapFrame, line: &LineReport) -> Vec<Px> {
    let mut track: Vec<Px> = Vec::new();
    for point in line.segments.iter().flat_map(|segment| frame.path(&segment.path)) {
        // Segments share their end points.
        if track.last() != Some(&point) {
            track.push(point);
        }
    }
    track
}

/// An arrow before the start of each line, and its name at a free place near by.
fn draw_names(sheet: &mut Sheet, frame: &MapFrame, report: &LinesReport, half_width: f64) -> Taken {
    let (k, font) = (sheet.sizes.k, sheet.sizes.heading());
    let mut taken = Taken::new(frame.rect.grown(-4.0 * k), half_width);
    taken.dots = report.landmarks.iter().map(|mark| frame.px(mark.position)).collect();
    let tracks: Vec<Vec<Px>> = report.lines.iter().map(|line| track_px(frame, line)).collect();
    for track in &tracks {
        taken.add_corridor(track);
    }
    let starts: Vec<Option<(Px, Px)>> = tracks
        .iter()
        .map(|track| {
            let (start, ahead) = start_of(track, 12.0 * k)?;
            Some((ahead, draw_arrow(sheet, &mut taken, start, ahead)))
        })
        .collect();
    for (line, start) in report.lines.iter().zip(starts) {
        let Some((ahead, tail)) = start else { continue };
        let name = map_name(line, font, frame.rect.width() * LABEL_SHARE);
        let (width, height) = (text::width(&name, font) + 6.0 * k, font.height_px() + 2.0 * k);
        let away = (-ahead.0, -ahead.1);
        let Some((place, leader)) = taken.label(tail, away, 6.0 * k, (width, height)) else { continue };
        if let Some((from, to)) = leader {
            sheet.scene.stroke(vec![from, to], larger(1.0, k), SOFT_INK);
            taken.leaders.push((from, to));
        }
        sheet.scene.text((place.left + 3.0 * k, place.top + 1.0 * k), &name, font, INK);
        taken.rects.push(place);
    }
    taken
}

/// A kind of ground that is marked beside the lines.
#[derive(Clone, Copy)]
struct Mark {
    numbers: fn(&SegmentReport) -> &[usize],
    /// Before each number.
    prefix: &'static str,
    /// 1 to starboard of the line, −1 to port.
    side: f64,
}

impl Mark {
    const LOOK_ALIKES: Self = Self { numbers: |segment| &segment.look_alikes, prefix: "", side: 1.0 };
    const REMAP_REGIONS: Self = Self { numbers: |segment| &segment.remap_regions, prefix: "r", side: -1.0 };
}

/// A thin bracket beside each stretch over marked ground, with its numbers; returns whether there is any. A number that
/// finds no place is left out: the bracket stays, and the CSV has it.
fn draw_marks(
    sheet: &mut Sheet,
    frame: &MapFrame,
    report: &LinesReport,
    half_width: f64,
    taken: &mut Taken,
    mark: Mark,
) -> bool {
    let mut has_any = false;
    for line in &report.lines {
        for run in line.segments.chunk_by(|a, b| (mark.numbers)(a) == (mark.numbers)(b)) {
            if (mark.numbers)(&run[0]).is_empty() {
                continue;
            }
            has_any = true;
            let mut path: Vec<Px> = Vec::new();
            for point in run.iter().flat_map(|segment| frame.path(&segment.path)) {
                if path.last() != Some(&point) {
                    path.push(point);
                }
            }
            let numbers: Vec<String> =
                (mark.numbers)(&run[0]).iter().map(|number| format!("{}{number}", mark.prefix)).collect();
            bracket(sheet, &path, half_width * mark.side, &numbers.join(", "), taken);
        }
    }
    has_any
}

/// A line beside `path`, on its right for a positive `half_width` of the ribbon and on its left for a negative one, with
/// ends turned towards it, and a label at its middle.
fn bracket(sheet: &mut Sheet, path: &[Px], half_width: f64, label: &str, taken: &mut Taken) {
    let k = sheet.sizes.k;
    let (aside, hook) = (half_width + (5.0 * k).copysign(half_width), half_width + k.copysign(half_width));
    let at = |index: usize, by: f64| {
        let (before, after) = (path[index.saturating_sub(1)], path[smaller_index(index + 1, path.len() - 1)]);
        let (dx, dy) = (after.0 - before.0, after.1 - before.1);
        let length = larger(libm::hypot(dx, dy), 1e-9);
        (path[index].0 - dy / length * by, path[index].1 + dx / length * by)
    };
    if path.len() < 2 {
        return;
    }
    let mut points = vec![at(0, hook)];
    points.extend((0..path.len()).map(|index| at(index, aside)));
    points.push(at(path.len() - 1, hook));
    sheet.scene.stroke(points, larger(1.0, 1.5 * k), INK);
    let font = sheet.sizes.small();
    let middle = at(path.len() / 2, aside);
    let on_line = path[path.len() / 2];
    let away = (middle.0 - on_line.0, middle.1 - on_line.1);
    let room = (text::width(label, font) + 4.0 * k, font.height_px());
    if let Some((place, leader)) = taken.label(middle, away, 4.0 * k, room) {
        if let Some((from, to)) = leader {
            sheet.scene.stroke(vec![from, to], larger(1.0, k), SOFT_INK);
            taken.leaders.push((from, to));
        }
        sheet.scene.text((place.left + 2.0 * k, place.top), label, font, INK);
        taken.rects.push(place);
    }
}

fn smaller_index(a: usize, b: usize) -> usize {
    if a < b { a } else { b }
}

/// Name of a line as the map shows it. A name that must be cut, or that has letters which cannot be drawn, begins with its
/// rank, so that two such names can be told apart in the ranking.
fn map_name(line: &LineReport, font: Font, room: f64) -> String {
    let name = text::printable(&line.name);
    if text::width(&name, font) <= room && text::has_every_letter(&name) {
        name
    } else {
        text::fit(&format!("{}: {name}", line.rank), font, room)
    }
}

/// Start of a track and the direction in which it leaves, taken over at least `reach` pixels.
fn start_of(track: &[Px], reach: f64) -> Option<(Px, Px)> {
    let &start = track.first()?;
    let distance = |p: &Px| libm::hypot(p.0 - start.0, p.1 - start.1);
    let ahead = track.iter().find(|p| distance(p) >= reach).or(track.last())?;
    let length = distance(ahead);
    (length > 0.0).then(|| (start, ((ahead.0 - start.0) / length, (ahead.1 - start.1) / length)))
}

/// Draws an arrow that points the way the line runs: before its start, or beside it when that place is taken. Returns
/// the arrow's tail.
fn draw_arrow(sheet: &mut Sheet, taken: &mut Taken, start: Px, ahead: Px) -> Px {
    let k = sheet.sizes.k;
    let length = 26.0 * k;
    let (gap, aside) = (12.0 * k, 18.0 * k);
    let normal = (-ahead.1, ahead.0);
    let behind = (start.0 - ahead.0 * (gap + length), start.1 - ahead.1 * (gap + length));
    let beside = |side: f64| (start.0 + normal.0 * aside * side, start.1 + normal.1 * aside * side);
    let around = |tail: Px| {
        let tip = (tail.0 + ahead.0 * length, tail.1 + ahead.1 * length);
        let bounds = Rect::new(
            crate::interval::smaller(tail.0, tip.0),
            crate::interval::smaller(tail.1, tip.1),
            larger(tail.0, tip.0),
            larger(tail.1, tip.1),
        );
        (tip, bounds.grown(4.0 * k))
    };
    let tail = [behind, beside(1.0), beside(-1.0)]
        .into_iter()
        .find(|&tail| {
            // The corridor test keeps its distance; the arrow itself may come close to its own line.
            let (_, bounds) = around(tail);
            taken.is_free(&bounds.grown(-4.0 * k))
        })
        .unwrap_or(behind);
    let (tip, bounds) = around(tail);
    let neck = (tip.0 - ahead.0 * 12.0 * k, tip.1 - ahead.1 * 12.0 * k);
    sheet.scene.stroke(vec![tail, neck], 3.0 * k, INK);
    let barb = |side: f64| (neck.0 + normal.0 * 6.0 * k * side, neck.1 + normal.1 * 6.0 * k * side);
    sheet.scene.polygon(vec![tip, barb(1.0), barb(-1.0)], INK);
    taken.rects.push(bounds);
    tail
}
