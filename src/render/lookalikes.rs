//! The chart of `lookalikes`: where does the seabed look like itself?

use geo::{ConvexHull, Coord, MultiPoint};

use super::colours::{GREY, INK, SOFT_INK, WHITE};
use super::furniture::{Extent, MapFrame, Sheet, bounds_in_words};
use super::lines::{draw_landmarks, draw_surround, fit_frame};
use super::place::Taken;
use super::scene::{Px, Rect, Scene};
use super::text::{self, Font};
use super::trace::clipped_stroke;
use super::{ChartSize, RenderError, nice};
use crate::frame::LocalPoint;
use crate::interval::larger;
use crate::report::{LookAlike, LookAlikeKind, LookAlikesReport};

/// Most look-alikes that are drawn on the map.
const DRAWN: usize = 9;
/// Least size of landmarks, pixels.
const LANDMARK_PX: f64 = 4.0;
/// Widest identifier of a landmark over the width of its line.
pub(super) const IDENTIFIER_SHARE: f64 = 0.35;
/// How far outlines stay off their landmarks, pixels.
const OUTLINE_PX: f64 = 9.0;

/// Lays out the chart.
pub(super) fn scene(report: &LookAlikesReport, size: &ChartSize) -> Result<Scene, RenderError> {
    let mut sheet = Sheet::new(size)?;
    let k = sheet.sizes.k;
    let tracks = report.lines.iter().flat_map(|line| &line.path);
    let extent = Extent::of(report.landmarks.iter().map(|mark| &mark.position).chain(tracks))
        .ok_or(RenderError::Nothing("there are neither landmarks nor lines with finite coordinates"))?;
    let drawn = first(&report.look_alikes, DRAWN);
    let top = sheet.header("Where does the seabed look like itself?", &subtitle(report));
    let extra = [format!("compared within {} m", nice::metres(report.separation_max_m))];
    let bottom = sheet.foot(&report.provenance, &report.parameters, &extra);
    let column =
        Rect::new(sheet.inner.right - 404.0 * k, top + 34.0 * k, sheet.inner.right, bottom - 16.0 * k);
    let frame = fit_frame(&sheet, &report.provenance, extent, (top, bottom), column.left - 36.0 * k);

    frame.draw_ground(&mut sheet);
    draw_landmarks(&mut sheet.scene, &frame, &report.landmarks, LANDMARK_PX * larger(1.0, k));
    let mut taken = Taken::new(frame.rect.grown(-4.0 * k), 4.0 * k);
    taken.dots = report.landmarks.iter().map(|mark| frame.px(mark.position)).collect();
    for line in &report.lines {
        let path = frame.path(&line.path);
        clipped_stroke(&mut sheet.scene, &frame, &path, larger(1.0, 2.0 * k), SOFT_INK);
        taken.add_corridor(&path);
    }
    // The most dangerous last, so that it lies on top.
    let outlines: Vec<Vec<Vec<Px>>> = drawn.iter().map(|entry| outlines(&frame, report, entry, k)).collect();
    for (entry, outlines) in drawn.iter().zip(&outlines).rev() {
        draw_entry(&mut sheet, &frame, entry, outlines);
    }
    for outline in outlines.iter().flatten() {
        taken.add_corridor(outline);
    }
    draw_line_names(&mut sheet, &frame, report, &mut taken);
    for (entry, outlines) in drawn.iter().zip(&outlines) {
        for outline in outlines {
            draw_number(&mut sheet, &frame, &mut taken, outline, entry.number);
        }
    }
    draw_surround(&mut sheet, &frame, &report.provenance);
    let rest = draw_legend(&mut sheet, column);
    draw_list(&mut sheet, Rect { top: rest + 14.0 * k, ..column }, report, drawn);
    Ok(sheet.scene)
}

fn first(entries: &[LookAlike], count: usize) -> &[LookAlike] {
    if entries.len() > count { &entries[..count] } else { entries }
}

fn subtitle(report: &LookAlikesReport) -> String {
    let count = match report.found {
        1 => "1 look-alike".to_owned(),
        count => format!("{count} look-alikes"),
    };
    let whole = if report.complete { "" } else { " (not all were found)" };
    format!("{count} of three or more landmarks{whole}; {}", bounds_in_words(&report.parameters))
}

/// One outline for a layout, two for a pair.
fn outlines(frame: &MapFrame, report: &LookAlikesReport, entry: &LookAlike, k: f64) -> Vec<Vec<Px>> {
    let groups: Vec<&Vec<usize>> = match entry.kind {
        LookAlikeKind::Pair => vec![&entry.numbers_1, &entry.numbers_2],
        LookAlikeKind::Row | LookAlikeKind::Grid => vec![&entry.numbers_layout],
    };
    groups
        .into_iter()
        .map(|numbers| {
            let points: Vec<LocalPoint> = numbers.iter().map(|&i| report.landmarks[i].position).collect();
            around(&frame.path(&points), OUTLINE_PX * k)
        })
        .collect()
}

/// The convex outline that keeps `margin` pixels off all points: the hull of an octagon about each.
pub(super) fn around(points: &[Px], margin: f64) -> Vec<Px> {
    let corners: Vec<Coord<f64>> = points
        .iter()
        .flat_map(|&(x, y)| {
            (0..8).map(move |turn| {
                let angle = (f64::from(turn) + 0.5) * std::f64::consts::TAU / 8.0;
                Coord { x: x + margin * libm::cos(angle), y: y + margin * libm::sin(angle) }
            })
        })
        .collect();
    MultiPoint::from(corners).convex_hull().exterior().0.iter().map(|c| (c.x, c.y)).collect()
}

/// Centre of an outline.
fn centre(outline: &[Px]) -> Px {
    let count = larger(1.0, outline.len() as f64);
    let (x, y) = outline.iter().fold((0.0, 0.0), |(x, y), p| (x + p.0, y + p.1));
    (x / count, y / count)
}

/// Outline of ground 1 drawn through, of ground 2 dashed, and a dotted line between them; a layout by a heavy outline.
fn draw_entry(sheet: &mut Sheet, frame: &MapFrame, entry: &LookAlike, outlines: &[Vec<Px>]) {
    let k = sheet.sizes.k;
    match outlines {
        [layout] => clipped_stroke(&mut sheet.scene, frame, layout, larger(1.0, 3.0 * k), INK),
        [one, two] => {
            let width = larger(1.0, 1.8 * k);
            clipped_stroke(&mut sheet.scene, frame, one, width, INK);
            for dash in dashes(two, 9.0 * k, 6.0 * k) {
                clipped_stroke(&mut sheet.scene, frame, &dash, width, INK);
            }
            let link = [centre(one), centre(two)];
            let dark = if entry.number <= 3 { INK } else { GREY };
            for dash in dashes(&link, 3.0 * k, 7.0 * k) {
                clipped_stroke(&mut sheet.scene, frame, &dash, larger(1.0, 1.2 * k), dark);
            }
        }
        _ => {}
    }
}

/// Pieces of a path, `on` pixels drawn and `off` left out.
fn dashes(path: &[Px], on: f64, off: f64) -> Vec<[Px; 2]> {
    let mut found = Vec::new();
    for pair in path.windows(2) {
        let ((x, y), (to_x, to_y)) = (pair[0], pair[1]);
        let length = libm::hypot(to_x - x, to_y - y);
        // Whole dashes on each side, so that corners are drawn.
        let count = larger(1.0, libm::round((length + off) / (on + off)));
        let pitch = (length + off) / count;
        for n in 0..count as usize {
            let (from, to) = (n as f64 * pitch, n as f64 * pitch + (pitch - off));
            let at = |run: f64| {
                let t = if length > 0.0 { run / length } else { 0.0 };
                (x + (to_x - x) * t, y + (to_y - y) * t)
            };
            found.push([at(from), at(to)]);
        }
    }
    found
}

/// The number of an entry beside an outline, on white so that it can be read over lines.
fn draw_number(sheet: &mut Sheet, frame: &MapFrame, taken: &mut Taken, outline: &[Px], number: usize) {
    let (k, font) = (sheet.sizes.k, sheet.sizes.heading());
    let Some(&top) = outline.iter().min_by(|a, b| a.1.total_cmp(&b.1)) else { return };
    let label = number.to_string();
    let size = (text::width(&label, font) + 6.0 * k, font.height_px());
    let up = (0.0, -1.0);
    let Some((place, leader)) = taken.label(top, up, 5.0 * k, size) else { return };
    if let Some((from, to)) = leader {
        clipped_stroke(&mut sheet.scene, frame, &[from, to], larger(1.0, k), INK);
        taken.leaders.push((from, to));
    }
    sheet.scene.fill(place, WHITE);
    sheet.scene.text((place.left + 3.0 * k, place.top), &label, font, INK);
    taken.rects.push(place);
}

fn draw_line_names(sheet: &mut Sheet, frame: &MapFrame, report: &LookAlikesReport, taken: &mut Taken) {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    for line in &report.lines {
        let path = frame.path(&line.path);
        let [start, next, ..] = path.as_slice() else { continue };
        let away = (start.0 - next.0, start.1 - next.1);
        let name =
            text::fit(&format!("line {}", text::printable(&line.name)), font, frame.rect.width() * 0.2);
        let size = (text::width(&name, font) + 4.0 * k, font.height_px());
        let Some((place, leader)) = taken.label(*start, away, 5.0 * k, size) else { continue };
        if let Some((from, to)) = leader {
            sheet.scene.stroke(vec![from, to], larger(1.0, k), SOFT_INK);
            taken.leaders.push((from, to));
        }
        sheet.scene.text((place.left + 2.0 * k, place.top), &name, font, SOFT_INK);
        taken.rects.push(place);
    }
}

/// What the outlines mean; returns where it ends.
fn draw_legend(sheet: &mut Sheet, column: Rect) -> f64 {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    let pitch = font.line_px() + 5.0 * k;
    let (swatch, mut y) = (56.0 * k, column.top);
    let names = [
        "row or grid: looks like itself, shifted",
        "ground 1 of a pair",
        "ground 2, which looks like it",
        "the pair they form",
        "candidate line",
        "landmark (its box, where that is larger)",
    ];
    for (index, name) in names.into_iter().enumerate() {
        let middle = y + font.height_px() / 2.0;
        let line = [(column.left, middle), (column.left + swatch, middle)];
        let scene = &mut sheet.scene;
        match index {
            0 => scene.stroke(line.to_vec(), larger(1.0, 3.0 * k), INK),
            1 => scene.stroke(line.to_vec(), larger(1.0, 1.8 * k), INK),
            2 => dashes(&line, 9.0 * k, 6.0 * k)
                .into_iter()
                .for_each(|dash| scene.stroke(dash.to_vec(), larger(1.0, 1.8 * k), INK)),
            3 => dashes(&line, 3.0 * k, 7.0 * k)
                .into_iter()
                .for_each(|dash| scene.stroke(dash.to_vec(), larger(1.0, 1.2 * k), INK)),
            4 => scene.stroke(line.to_vec(), larger(1.0, 2.0 * k), SOFT_INK),
            _ => scene.fill(Rect::centred((column.left + swatch / 2.0, middle), 5.0 * k, 5.0 * k), GREY),
        }
        let left = column.left + swatch + 12.0 * k;
        let name = text::fit(name, font, column.right - left);
        scene.text((left, y), &name, font, INK);
        y += pitch;
    }
    y
}

/// The most dangerous ones in words, as many as fit, and how many there are besides.
fn draw_list(sheet: &mut Sheet, area: Rect, report: &LookAlikesReport, drawn: &[LookAlike]) {
    let (k, sizes) = (sheet.sizes.k, sheet.sizes);
    let heading =
        if drawn.is_empty() { "No look-alikes beyond the fix size" } else { "Most dangerous first" };
    let mut y = sheet.scene.text((area.left, area.top), heading, sizes.heading(), INK).bottom + 2.0 * k;
    let note = match drawn {
        [] => "",
        _ => "by the landmarks that agree, then by the metres of line over the ground",
    };
    for line in text::wrap(note, sizes.small(), area.width(), 2) {
        sheet.scene.text((area.left, y), &line, sizes.small(), SOFT_INK);
        y += sizes.small().line_px();
    }
    y += 6.0 * k;
    let pitch = sizes.body().line_px() + sizes.small().line_px() + 5.0 * k;
    let last = area.bottom - 2.0 * sizes.small().line_px();
    let mut listed = 0;
    for entry in drawn {
        if y + pitch > last {
            break;
        }
        sheet.scene.text((area.left, y), &entry.number.to_string(), sizes.heading(), INK);
        let left = area.left + 30.0 * k;
        let title = text::fit(&title(entry), sizes.body(), area.right - left);
        sheet.scene.text((left, y), &title, sizes.body(), INK);
        let room = area.right - left;
        let details = text::fit(&details(entry, sizes.small(), room), sizes.small(), room);
        sheet.scene.text((left, y + sizes.body().line_px()), &details, sizes.small(), SOFT_INK);
        y += pitch;
        listed += 1;
    }
    let layouts = drawn[..listed].iter().filter(|entry| entry.kind != LookAlikeKind::Pair).count();
    let more = report.found - report.within_fix_size - report.in_layouts - (listed - layouts);
    let rest = match drawn {
        [] => format!("{} no farther apart than the fix size", report.within_fix_size),
        _ => format!(
            "and {more} more pairs; {} shifts of rows and grids; {} no farther apart than the fix size",
            report.in_layouts, report.within_fix_size
        ),
    };
    for line in text::wrap(&rest, sizes.small(), area.width(), 2) {
        sheet.scene.text((area.left, y), &line, sizes.small(), SOFT_INK);
        y += sizes.small().line_px();
    }
}

/// What an entry is.
pub(super) fn title(entry: &LookAlike) -> String {
    match &entry.layout {
        Some(layout) => {
            let periods: Vec<String> = layout.periods.iter().map(|p| nice::metres(p.period_m)).collect();
            format!("{} of {}, every {} m", entry.kind.word(), layout.landmarks, periods.join(" × "))
        }
        None => format!(
            "{} landmarks, {} m apart at {:.0}°",
            entry.landmarks,
            nice::metres(entry.apart_m),
            entry.bearing_deg
        ),
    }
}

/// What else there is to say; a long identifier leaves room for the figures.
fn details(entry: &LookAlike, font: Font, room: f64) -> String {
    let tell = entry.nearest_tell_tale().map_or_else(
        || "nothing tells them apart".to_owned(),
        |tell| {
            let landmark = text::fit(&text::printable(&tell.landmark), font, room * IDENTIFIER_SHARE);
            format!("told by {landmark}, {} m on", nice::metres(tell.from_edge_m))
        },
    );
    let breaks = scale_in_words(entry.break_scale);
    match &entry.layout {
        Some(layout) => {
            format!("{} shifts; {} m of line; {breaks}", layout.shifts, nice::metres(entry.line_m))
        }
        None => format!("{tell}; {breaks}"),
    }
}

/// The break scale in words.
pub(super) fn scale_in_words(scale: f64) -> String {
    if scale < 0.005 { "never separates".to_owned() } else { format!("break scale {scale:.2}") }
}
