//! The chart of `suggest`: where should the vehicle dive, and which way should it run first?

use super::classes::Scale;
use super::colours::{CLASSES, GREY, INK, PALE, SOFT_INK, WHITE};
use super::furniture::{Extent, MapFrame, Sheet, bounds_in_words};
use super::legend::{label_left, label_room, required_mark, swatch, swatch_width};
use super::lines::{BOX_LEAST_PX, draw_landmarks, draw_surround, fit_frame};
use super::place::Taken;
use super::ribbon::Ribbon;
use super::scene::{Px, Rect, Scene};
use super::trace::clipped_stroke;
use super::{ChartSize, RenderError, nice, text};
use crate::interval::larger;
use crate::report::{SuggestReport, Suggestion};

/// Corners of a drawn disc.
const DISC_CORNERS: usize = 48;
/// Width of the run, pixels of the reference canvas.
const RUN_PX: f64 = 9.0;

/// Lays out the chart.
pub(super) fn scene(report: &SuggestReport, size: &ChartSize) -> Result<Scene, RenderError> {
    let mut sheet = Sheet::new(size)?;
    let k = sheet.sizes.k;
    let ends = report.suggestions.iter().flat_map(|s| [&s.dive_point, &s.line_end]);
    let extent = Extent::of(report.search_area.iter().chain(ends))
        .ok_or(RenderError::Nothing("the search area has no finite coordinates"))?;

    let top =
        sheet.header("Where should the vehicle dive, and which way should it run first?", &subtitle(report));
    let extra = [format!("search on cells of {} m", nice::short(report.search.cell_m, 2))];
    let bottom = sheet.foot(&report.provenance, &report.parameters, &extra);
    let column =
        Rect::new(sheet.inner.right - 404.0 * k, top + 34.0 * k, sheet.inner.right, bottom - 16.0 * k);
    let frame = fit_frame(&sheet, &report.provenance, extent, (top, bottom), column.left - 36.0 * k);

    let scale = Scale::of_guaranteed(report.parameters.required_fix_m);
    frame.draw_ground(&mut sheet);
    for suggestion in &report.suggestions {
        let disc = frame.rect.clip_polygon(&disc_px(&frame, report, suggestion));
        if disc.len() > 2 {
            sheet.scene.polygon(disc, PALE);
        }
    }
    let mut area = frame.path(&report.search_area);
    area.extend(area.first().copied());
    clipped_stroke(&mut sheet.scene, &frame, &area, larger(1.0, 1.5 * k), INK);
    draw_landmarks(&mut sheet.scene, &frame, &report.landmarks, BOX_LEAST_PX * larger(1.0, k));
    // The best one is drawn last, on top.
    for suggestion in report.suggestions.iter().rev() {
        draw_run(&mut sheet, &frame, report, suggestion, &scale);
    }
    draw_numbers(&mut sheet, &frame, report);
    draw_surround(&mut sheet, &frame, &report.provenance);
    let legend_bottom = legend(&mut sheet, column, report, &scale);
    list(&mut sheet, Rect { top: legend_bottom + 16.0 * k, ..column }, report);
    Ok(sheet.scene)
}

fn subtitle(report: &SuggestReport) -> String {
    format!(
        "{} dive points and {} headings tried, vehicle anywhere within {} m of the dive point and lost in the whole search area; {}",
        report.dive_points,
        report.search.headings,
        nice::short(report.scatter_m, 1),
        bounds_in_words(&report.parameters),
    )
}

fn disc_px(frame: &MapFrame, report: &SuggestReport, suggestion: &Suggestion) -> Vec<Px> {
    let (x, y) = frame.px(suggestion.dive_point);
    let radius = report.scatter_m * frame.px_per_m;
    (0..DISC_CORNERS)
        .map(|corner| {
            let angle = std::f64::consts::TAU * corner as f64 / DISC_CORNERS as f64;
            (x + radius * libm::cos(angle), y + radius * libm::sin(angle))
        })
        .collect()
}

/// The disc's edge, the run up to the fix coloured by class, and the rest of the line with its head.
fn draw_run(
    sheet: &mut Sheet,
    frame: &MapFrame,
    report: &SuggestReport,
    suggestion: &Suggestion,
    scale: &Scale,
) {
    let k = sheet.sizes.k;
    let (start, end) = (frame.px(suggestion.dive_point), frame.px(suggestion.line_end));
    let length = larger(libm::hypot(end.0 - start.0, end.1 - start.1), 1e-9);
    let ahead = ((end.0 - start.0) / length, (end.1 - start.1) / length);
    let run_px = suggestion.fix_m * frame.px_per_m;
    let fix = (start.0 + ahead.0 * run_px, start.1 + ahead.1 * run_px);
    let mut edge = disc_px(frame, report, suggestion);
    edge.extend(edge.first().copied());
    clipped_stroke(&mut sheet.scene, frame, &edge, larger(1.0, 1.5 * k), INK);
    clipped_stroke(&mut sheet.scene, frame, &[fix, end], 4.5 * k, WHITE);
    clipped_stroke(&mut sheet.scene, frame, &[fix, end], 2.0 * k, INK);
    let ribbon = Ribbon { width: RUN_PX * k, casing: 1.5 * k, hatch: 1.8 * k };
    ribbon.case(&mut sheet.scene, &[start, fix]);
    ribbon.segment(&mut sheet.scene, &[start, fix], scale.class_of(suggestion.fix_m));
    head(&mut sheet.scene, end, ahead, k);
    sheet.scene.disc(start, 5.0 * k, INK);
    sheet.scene.disc(start, 2.5 * k, WHITE);
}

/// An arrow head with its tip at `tip`.
fn head(scene: &mut Scene, tip: Px, ahead: Px, k: f64) {
    let at = |back: f64, aside: f64| {
        (tip.0 - (ahead.0 * back + ahead.1 * aside) * k, tip.1 - (ahead.1 * back - ahead.0 * aside) * k)
    };
    scene.polygon(vec![at(-3.0, 0.0), at(17.0, 8.5), at(17.0, -8.5)], WHITE);
    scene.polygon(vec![tip, at(14.0, 6.0), at(14.0, -6.0)], INK);
}

/// The names of the suggestions at their dive points.
fn draw_numbers(sheet: &mut Sheet, frame: &MapFrame, report: &SuggestReport) {
    let (k, font) = (sheet.sizes.k, sheet.sizes.heading());
    let mut taken = Taken::new(frame.rect.grown(-4.0 * k), RUN_PX * k);
    taken.dots = report.landmarks.iter().map(|mark| frame.px(mark.position)).collect();
    for suggestion in &report.suggestions {
        taken.add_corridor(&frame.path(&[suggestion.dive_point, suggestion.line_end]));
    }
    for suggestion in &report.suggestions {
        let (start, end) = (frame.px(suggestion.dive_point), frame.px(suggestion.line_end));
        let size = (text::width(&suggestion.name, font) + 10.0 * k, font.height_px() + 2.0 * k);
        let gap = larger(report.scatter_m * frame.px_per_m, 6.0 * k) + 6.0 * k;
        let away = (start.0 - end.0, start.1 - end.1);
        let Some((place, leader)) = taken.label(start, away, gap, size) else { continue };
        // A name that does not touch its disc is tied to it.
        let tie = leader.or_else(|| {
            let (edge, _) = place.clip_segment(start, place.centre())?;
            Some((start, edge))
        });
        if let Some((from, to)) = tie {
            sheet.scene.stroke(vec![from, to], larger(1.0, 1.2 * k), SOFT_INK);
            taken.leaders.push((from, to));
        }
        sheet.scene.fill(place, WHITE);
        sheet.scene.outline(place, larger(1.0, 1.5 * k), INK);
        sheet.scene.text((place.left + 5.0 * k, place.top + k), &suggestion.name, font, INK);
        taken.rects.push(place);
    }
}

/// What colours and marks mean; returns where the legend ends.
fn legend(sheet: &mut Sheet, column: Rect, report: &SuggestReport, scale: &Scale) -> f64 {
    let (k, sizes) = (sheet.sizes.k, sheet.sizes);
    let lines =
        text::wrap("Guaranteed fix distance, worst start in the disc", sizes.heading(), column.width(), 2);
    let mut y = sheet.scene.lines((column.left, column.top), &lines, sizes.heading(), INK);
    let note = "metres run on the first heading until the position is unambiguous, for every error within the bounds";
    let lines = text::wrap(note, sizes.small(), column.width(), 3);
    y = sheet.scene.lines((column.left, y + 2.0 * k), &lines, sizes.small(), SOFT_INK) + 8.0 * k;
    let pitch = 33.0 * k;
    if !report.suggestions.is_empty() {
        for class in 0..CLASSES {
            let row = Rect::new(column.left, y, column.right, y + pitch);
            let finding = super::classes::Finding::Class(class);
            swatch(sheet, row, finding, &scale.label(class));
            y += pitch;
            if class + 1 == scale.classes_within() {
                y = required_mark(sheet, column, y, scale);
            }
        }
        let middle = y + pitch / 2.0;
        let (left, right) = (column.left + 2.0 * k, column.left + swatch_width(k));
        sheet.scene.stroke(vec![(left, middle), (right, middle)], 2.0 * k, INK);
        head(&mut sheet.scene, (right, middle), (1.0, 0.0), k);
        y = row_text(sheet, column, y, pitch, "after the fix: rest of the exported line");
        let centre = (column.left + swatch_width(k) / 2.0, y + pitch / 2.0);
        sheet.scene.disc(centre, 12.0 * k, INK);
        sheet.scene.disc(centre, 10.5 * k, PALE);
        sheet.scene.disc(centre, 5.0 * k, INK);
        sheet.scene.disc(centre, 2.5 * k, WHITE);
        let disc = format!("dive point and its disc of {} m", nice::short(report.scatter_m, 1));
        y = row_text(sheet, column, y, pitch, &disc);
    }
    let centre = (column.left + swatch_width(k) / 2.0, y + pitch / 2.0);
    sheet.scene.fill(Rect::centred(centre, 5.0 * k, 5.0 * k), GREY);
    row_text(sheet, column, y, pitch, "landmark (its box, where that is larger)")
}

fn row_text(sheet: &mut Sheet, column: Rect, top: f64, pitch: f64, words: &str) -> f64 {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    let words = text::fit(words, font, label_room(column, k));
    let at = (label_left(column, k), top + pitch / 2.0 - font.height_px() / 2.0);
    sheet.scene.text(at, &words, font, SOFT_INK);
    top + pitch
}

/// The suggestions in their order, as many as fit, or why there is none.
fn list(sheet: &mut Sheet, area: Rect, report: &SuggestReport) {
    let (sizes, k) = (sheet.sizes, sheet.sizes.k);
    let font = sizes.small();
    let mut y =
        sheet.scene.text((area.left, area.top), "Suggestions, best first", sizes.heading(), INK).bottom
            + 6.0 * k;
    if report.suggestions.is_empty() {
        let room = larger(area.bottom - y, font.line_px());
        let most = (room / font.line_px()) as usize;
        let lines = text::wrap(&report.verdict, font, area.width(), most.clamp(1, 12));
        sheet.scene.lines((area.left, y), &lines, font, INK);
        return;
    }
    let pitch = sizes.body().height_px() + font.height_px() + 5.0 * k;
    let rows = (larger(area.bottom - y, 0.0) / pitch) as usize;
    let shown = if report.suggestions.len() <= rows { rows } else { rows.saturating_sub(1) };
    for suggestion in report.suggestions.iter().take(shown) {
        let left = area.left + 50.0 * k;
        sheet.scene.text((area.left, y), &suggestion.name, sizes.heading(), INK);
        let first = format!(
            "fix after {} m, heading {}°",
            nice::metres(suggestion.fix_m),
            nice::short(suggestion.heading_deg, 1)
        );
        let first = text::fit(&first, sizes.body(), area.right - left);
        let below = sheet.scene.text((left, y), &first, sizes.body(), INK).bottom;
        let place = format!(
            "{:.0} E, {:.0} N; line {} m",
            suggestion.dive_point.east_m,
            suggestion.dive_point.north_m,
            nice::metres(suggestion.line_m)
        );
        sheet.scene.text((left, below), &text::fit(&place, font, area.right - left), font, SOFT_INK);
        y += pitch;
    }
    if report.suggestions.len() > shown {
        let more = format!("and {} more: see suggest.csv", report.suggestions.len() - shown);
        if y + font.height_px() <= area.bottom {
            sheet.scene.text((area.left, y), &text::fit(&more, font, area.width()), font, SOFT_INK);
        }
    }
}
