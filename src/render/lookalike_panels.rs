//! The worst look-alikes one by one: ground 2 laid over ground 1.

use super::colours::{BAR, GREY, INK, SOFT_INK, UNDECIDED_GROUND, WHITE};
use super::furniture::{Extent, MapFrame, Sheet, bounds_in_words};
use super::lookalikes::{IDENTIFIER_SHARE, scale_in_words, title};
use super::scene::{Px, Rect, Scene};
use super::text::{self, Font};
use super::trace::{clipped_stroke, panel_frame, raster};
use super::{ChartSize, RenderError, nice};
use crate::frame::LocalPoint;
use crate::interval::{larger, smaller};
use crate::report::{ChartLandmark, LookAlike, LookAlikesReport, TellTale};

/// Most panels.
const PANELS: usize = 6;
/// Least size of a box, pixels.
const BOX_LEAST_PX: f64 = 7.0;
/// Radius of the ring round a tell-tale beyond its box, pixels.
const RING_PX: f64 = 6.0;
/// Pairs closer than this need no line to show that they belong together, pixels.
const JOIN_LEAST_PX: f64 = 4.0;
/// From this turn on ground 2 is turned as well as moved, degrees; smaller ones are within the heading bias.
const TURNED_DEG: f64 = 5.0;

/// Lays out the chart.
pub(super) fn scene(report: &LookAlikesReport, size: &ChartSize) -> Result<Scene, RenderError> {
    let mut sheet = Sheet::new(size)?;
    let k = sheet.sizes.k;
    let count = if report.look_alikes.len() > PANELS { PANELS } else { report.look_alikes.len() };
    let shown = &report.look_alikes[..count];
    let header = sheet.header("Why can the vehicle not tell these grounds apart?", &subtitle(report, count));
    let top = legend(&mut sheet, header + 10.0 * k);
    let bottom = sheet.foot(&report.provenance, &report.parameters, &[]);
    let font = sheet.sizes.small();
    let area = Rect::new(sheet.inner.left, top + 14.0 * k, sheet.inner.right, bottom - 44.0 * k);
    if shown.is_empty() {
        sheet.scene.text(
            (area.left, area.top),
            "No look-alikes beyond the fix size.",
            sheet.sizes.body(),
            INK,
        );
        return Ok(sheet.scene);
    }
    let (columns, rows) = raster(count, area);
    let (pitch_x, pitch_y) = (area.width() / columns as f64, area.height() / rows as f64);
    let captions = sheet.sizes.heading().line_px() + 2.0 * font.line_px() + 6.0 * k;
    for (index, entry) in shown.iter().enumerate() {
        let left = area.left + (index % columns) as f64 * pitch_x;
        let top = area.top + (index / columns) as f64 * pitch_y;
        let cell = Rect::new(left, top, left + pitch_x - 16.0 * k, top + pitch_y - font.line_px() - 22.0 * k);
        let overlaid = Overlaid::new(report, entry);
        let frame = panel_frame(&sheet, overlaid.extent()?, Rect { top: cell.top + captions, ..cell });
        let room = frame.rect.width();
        let caption = text::fit(&format!("{}: {}", entry.number, title(entry)), sheet.sizes.heading(), room);
        sheet.scene.text((frame.rect.left, cell.top), &caption, sheet.sizes.heading(), INK);
        let notes = text::wrap(&note(entry, font, room), font, room, 2);
        sheet.scene.lines((frame.rect.left, cell.top + sheet.sizes.heading().line_px()), &notes, font, INK);
        overlaid.draw(&mut sheet, &frame);
    }
    let name = format!(
        "Eastings and northings of ground 1 in metres  ·  {}, grid north up",
        report.provenance.coordinate_system
    );
    let name = text::fit(&name, font, sheet.inner.width());
    sheet.scene.text((sheet.inner.left, area.bottom + 8.0 * k), &name, font, SOFT_INK);
    Ok(sheet.scene)
}

fn subtitle(report: &LookAlikesReport, shown: usize) -> String {
    format!(
        "Ground 2 laid over ground 1 for the {shown} most dangerous look-alikes; {}",
        bounds_in_words(&report.parameters)
    )
}

/// Offset, agreement and what tells the grounds apart, in words.
fn note(entry: &LookAlike, font: Font, room: f64) -> String {
    let turn = if entry.turn_deg.abs() > TURNED_DEG {
        format!(", turned by {:.0}°", entry.turn_deg)
    } else {
        String::new()
    };
    let tell = entry.nearest_tell_tale().map_or_else(
        || "nothing tells them apart".to_owned(),
        |tell| {
            format!(
                "{} tells, {} m from ground {}",
                text::fit(&text::printable(&tell.landmark), font, room * IDENTIFIER_SHARE),
                nice::metres(tell.from_edge_m),
                tell.ground
            )
        },
    );
    format!(
        "{} agree; offset {} m at {:.0}°{turn}; off by up to {} m; {}; {tell}",
        entry.landmarks,
        nice::metres(entry.apart_m),
        entry.bearing_deg,
        nice::metres(entry.disagreement_worst_m),
        scale_in_words(entry.break_scale),
    )
}

/// A look-alike in the frame of ground 1.
struct Overlaid<'a> {
    report: &'a LookAlikesReport,
    entry: &'a LookAlike,
}

impl<'a> Overlaid<'a> {
    fn new(report: &'a LookAlikesReport, entry: &'a LookAlike) -> Self {
        Self { report, entry }
    }

    fn mark(&self, number: usize) -> &'a ChartLandmark {
        &self.report.landmarks[number]
    }

    /// Where a landmark of ground 2 comes to lie on ground 1.
    fn back(&self, p: LocalPoint) -> LocalPoint {
        let entry = self.entry;
        let moved = LocalPoint::new(p.east_m - entry.offset_east_m, p.north_m - entry.offset_north_m);
        if entry.turn_deg.abs() <= TURNED_DEG {
            return moved;
        }
        let numbers = &entry.numbers_1;
        let count = larger(1.0, numbers.len() as f64);
        let (e, n) = numbers.iter().fold((0.0, 0.0), |(e, n), &i| {
            let q = self.mark(i).position;
            (e + (q.east_m - moved.east_m), n + (q.north_m - moved.north_m))
        });
        let middle = LocalPoint::new(moved.east_m + e / count, moved.north_m + n / count);
        let turn = -entry.turn_deg.to_radians();
        let (x, y) = (moved.east_m - middle.east_m, moved.north_m - middle.north_m);
        let (sin, cos) = (libm::sin(turn), libm::cos(turn));
        LocalPoint::new(middle.east_m + x * cos + y * sin, middle.north_m + y * cos - x * sin)
    }

    fn tell_tales(&self) -> Vec<(&'a TellTale, LocalPoint)> {
        [&self.entry.tell_tale_1, &self.entry.tell_tale_2]
            .into_iter()
            .flatten()
            .map(|tell| {
                let position = self.mark(tell.number).position;
                (tell, if tell.ground == 1 { position } else { self.back(position) })
            })
            .collect()
    }

    fn extent(&self) -> Result<Extent, RenderError> {
        let mut points: Vec<LocalPoint> =
            self.entry.numbers_1.iter().map(|&i| self.mark(i).position).collect();
        points.extend(self.entry.numbers_2.iter().map(|&i| self.back(self.mark(i).position)));
        points.extend(self.tell_tales().into_iter().map(|(_, position)| position));
        let extent = Extent::of(&points)
            .ok_or(RenderError::Nothing("a look-alike has no landmark with finite coordinates"))?;
        Ok(extent.grown(larger(larger(extent.width(), extent.height()) * 0.06, 5.0)))
    }

    fn draw(&self, sheet: &mut Sheet, frame: &MapFrame) {
        let k = sheet.sizes.k;
        let thin = larger(1.0, 1.4 * k);
        frame.draw_ground(sheet);
        let scene = &mut sheet.scene;
        let (one, two) = (&self.entry.numbers_1, &self.entry.numbers_2);
        for number in 0..self.report.landmarks.len() {
            if !one.contains(&number) {
                fill_box(
                    scene,
                    frame,
                    self.boxed(frame, number, self.mark(number).position, k),
                    UNDECIDED_GROUND,
                );
            }
            if !two.contains(&number) {
                outline_box(
                    scene,
                    frame,
                    self.boxed(frame, number, self.back(self.mark(number).position), k),
                    thin,
                    GREY,
                );
            }
        }
        for (&i, &j) in one.iter().zip(two) {
            fill_box(scene, frame, self.boxed(frame, i, self.mark(i).position, k), BAR);
            let there = self.back(self.mark(j).position);
            outline_box(scene, frame, self.boxed(frame, j, there, k), larger(1.0, 2.0 * k), INK);
            let join = [frame.px(self.mark(i).position), frame.px(there)];
            if libm::hypot(join[1].0 - join[0].0, join[1].1 - join[0].1) >= JOIN_LEAST_PX * k {
                clipped_stroke(scene, frame, &join, larger(1.0, 4.4 * k), WHITE);
                clipped_stroke(scene, frame, &join, larger(1.0, 2.4 * k), INK);
            }
        }
        for (tell, position) in self.tell_tales() {
            let rect = self.boxed(frame, tell.number, position, k);
            ring(scene, frame, rect.centre(), larger(rect.width(), rect.height()) / 2.0 + RING_PX * k, k);
        }
        frame.draw_edges(sheet);
    }

    fn boxed(&self, frame: &MapFrame, number: usize, at: LocalPoint, k: f64) -> Rect {
        let mark = self.mark(number);
        let least = BOX_LEAST_PX * larger(1.0, k);
        let side = |half_width_m: f64| larger(least, 2.0 * half_width_m * frame.px_per_m);
        Rect::centred(frame.px(at), side(mark.half_width_east_m), side(mark.half_width_north_m))
    }
}

fn fill_box(scene: &mut Scene, frame: &MapFrame, rect: Rect, colour: super::colours::Rgb) {
    if let Some(seen) = rect.intersection(&frame.rect) {
        scene.fill(seen, colour);
    }
}

fn outline_box(scene: &mut Scene, frame: &MapFrame, rect: Rect, width: f64, colour: super::colours::Rgb) {
    let Rect { left, top, right, bottom } = rect;
    let corners = [(left, top), (right, top), (right, bottom), (left, bottom), (left, top)];
    clipped_stroke(scene, frame, &corners, width, colour);
}

/// A double ring, so that it shows on dark boxes and on paper.
fn ring(scene: &mut Scene, frame: &MapFrame, centre: Px, radius: f64, k: f64) {
    let points: Vec<Px> = (0..=36)
        .map(|turn| {
            let angle = f64::from(turn) * std::f64::consts::TAU / 36.0;
            (centre.0 + radius * libm::cos(angle), centre.1 + radius * libm::sin(angle))
        })
        .collect();
    clipped_stroke(scene, frame, &points, larger(1.0, 2.6 * k), INK);
}

/// What the marks mean, in one row; returns where it ends.
fn legend(sheet: &mut Sheet, top: f64) -> f64 {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    let middle = top + font.height_px() / 2.0;
    let names = [
        "box on ground 1",
        "box on ground 2, moved here",
        "agreeing pair",
        "tell-tale: on one ground only",
        "other landmarks of ground 1",
        "and of ground 2",
    ];
    let (swatch, gap) = (30.0 * k, 24.0 * k);
    let mut left = sheet.inner.left;
    for (index, name) in names.into_iter().enumerate() {
        let centre = (left + swatch / 2.0, middle);
        let square = Rect::centred(centre, 13.0 * k, 13.0 * k);
        let whole = MapFrame::showing(
            Extent { west: 0.0, south: 0.0, east: 1.0, north: 1.0 },
            square.grown(20.0 * k),
            0.0,
        );
        let scene = &mut sheet.scene;
        match index {
            0 => scene.fill(square, BAR),
            1 => outline_box(scene, &whole, square, larger(1.0, 2.0 * k), INK),
            2 => scene.stroke(
                vec![(left + 4.0 * k, middle), (left + swatch - 4.0 * k, middle)],
                larger(1.0, 2.0 * k),
                INK,
            ),
            3 => ring(scene, &whole, centre, 10.0 * k, k),
            4 => scene.fill(square, UNDECIDED_GROUND),
            _ => outline_box(scene, &whole, square, larger(1.0, 1.4 * k), GREY),
        }
        let room = larger(0.0, sheet.inner.right - left - swatch - 8.0 * k);
        let name = text::fit(name, font, room);
        left = scene.text((left + swatch + 8.0 * k, top), &name, font, INK).right + gap;
    }
    smaller(top + font.height_px(), sheet.inner.bottom)
}
