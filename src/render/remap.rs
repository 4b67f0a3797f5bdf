//! The chart of `remap`: where should a survey map again, why, and what does it buy?

use super::colours::{GREY, INK, PALE, SOFT_INK, WHITE};
use super::furniture::{Extent, MapFrame, Sheet, bounds_in_words};
use super::lines::{BOX_LEAST_PX, draw_landmarks, draw_surround, fit_frame};
use super::pattern::Pattern;
use super::place::Taken;
use super::scene::{Px, Rect, Scene};
use super::trace::clipped_stroke;
use super::{ChartSize, RenderError, nice, text};
use crate::frame::LocalPoint;
use crate::interval::larger;
use crate::report::{AreaGrid, RemapCause, RemapRegion, RemapReport};

/// Distance of pattern lines and their width, pixels of the reference canvas.
const PATTERN_PX: (f64, f64) = (11.0, 1.1);

/// Lays out the chart.
pub(super) fn scene(report: &RemapReport, size: &ChartSize) -> Result<Scene, RenderError> {
    let mut sheet = Sheet::new(size)?;
    let k = sheet.sizes.k;
    let corners = report.regions.iter().flat_map(|region| &region.outline.outer);
    let tracks = report.lines.iter().flat_map(|line| &line.track);
    let extent = Extent::of(report.search_area.iter().chain(corners).chain(tracks))
        .ok_or(RenderError::Nothing("the search area has no finite coordinates"))?;

    let top = sheet.header("Where should a survey map again before the dive?", &subtitle(report));
    let extra = extra_pieces(report);
    let bottom = sheet.foot(&report.provenance, &report.parameters, &extra);
    let column =
        Rect::new(sheet.inner.right - 404.0 * k, top + 34.0 * k, sheet.inner.right, bottom - 16.0 * k);
    let frame = fit_frame(&sheet, &report.provenance, extent, (top, bottom), column.left - 36.0 * k);

    frame.draw_ground(&mut sheet);
    let mut area = frame.path(&report.search_area);
    area.extend(area.first().copied());
    clipped_stroke(&mut sheet.scene, &frame, &area, larger(1.0, 1.2 * k), GREY);
    for &(column, row) in &report.speck_grid_cells {
        fill_run(&mut sheet.scene, &frame, &report.grid, (column, column + 1, row), PALE);
    }
    for region in &report.regions {
        draw_region(&mut sheet, &frame, &report.grid, region);
    }
    draw_landmarks(&mut sheet.scene, &frame, &report.landmarks, BOX_LEAST_PX * larger(1.0, k));
    for region in &report.regions {
        let rings = [&region.outline.outer].into_iter().chain(&region.outline.holes);
        for ring in rings {
            let mut path = frame.path(ring);
            path.extend(path.first().copied());
            clipped_stroke(&mut sheet.scene, &frame, &path, larger(1.0, 2.2 * k), INK);
        }
    }
    for line in &report.lines {
        let track = frame.path(&line.track);
        clipped_stroke(&mut sheet.scene, &frame, &track, larger(2.0, 4.0 * k), WHITE);
        clipped_stroke(&mut sheet.scene, &frame, &track, larger(1.0, 1.4 * k), INK);
    }
    draw_labels(&mut sheet, &frame, report);
    draw_surround(&mut sheet, &frame, &report.provenance);
    let legend_bottom = legend(&mut sheet, column, report);
    list(&mut sheet, Rect { top: legend_bottom + 18.0 * k, ..column }, report);
    Ok(sheet.scene)
}

fn subtitle(report: &RemapReport) -> String {
    format!(
        "{} of {} start cells of {} m fail: less than {} % of {} headings with a guaranteed fix within {} m; {}",
        report.failing_cells,
        report.cells,
        nice::short(report.options.cell_m, 1),
        nice::short(100.0 * report.options.pass_share, 1),
        report.headings,
        nice::metres(report.parameters.required_fix_m),
        bounds_in_words(&report.parameters),
    )
}

fn extra_pieces(report: &RemapReport) -> Vec<String> {
    let mut pieces =
        vec![format!("re-survey to {} m at best", nice::short(report.options.resurvey_half_width_m, 2))];
    if report.specks > 0 {
        pieces.push(format!("{} specks left out", report.specks));
    }
    if report.undecided {
        pieces.push("some runs undecided".to_owned());
    }
    pieces
}

/// The cells `from` to `to` (not included) of a row.
fn run_rect(frame: &MapFrame, grid: &AreaGrid, (from, to, row): (usize, usize, usize)) -> Option<Rect> {
    let at = |column: usize, row: usize| {
        frame.px(LocalPoint::new(
            grid.west_m + column as f64 * grid.cell_m,
            grid.south_m + row as f64 * grid.cell_m,
        ))
    };
    let ((left, bottom), (right, top)) = (at(from, row), at(to, row + 1));
    Rect::new(left, top, right, bottom).intersection(&frame.rect)
}

fn fill_run(
    scene: &mut Scene,
    frame: &MapFrame,
    grid: &AreaGrid,
    run: (usize, usize, usize),
    fill: super::colours::Rgb,
) {
    if let Some(rect) = run_rect(frame, grid, run) {
        scene.fill(rect, fill);
    }
}

/// The pattern of the region's main cause over its cells, row by row.
fn draw_region(sheet: &mut Sheet, frame: &MapFrame, grid: &AreaGrid, region: &RemapRegion) {
    let k = sheet.sizes.k;
    let (spacing, width) = (PATTERN_PX.0 * k, larger(0.8, PATTERN_PX.1 * k));
    let pattern = Pattern::of(region.cause);
    let mut cells = region.grid_cells.iter().copied().peekable();
    while let Some((from, row)) = cells.next() {
        let mut to = from + 1;
        while cells.next_if_eq(&(to, row)).is_some() {
            to += 1;
        }
        if let Some(rect) = run_rect(frame, grid, (from, to, row)) {
            pattern.fill(&mut sheet.scene, rect, spacing, width);
        }
    }
}

/// Numbers of the regions, with cause and gain where there is room, and names of the lines at their starts.
fn draw_labels(sheet: &mut Sheet, frame: &MapFrame, report: &RemapReport) {
    let (k, font, bold) = (sheet.sizes.k, sheet.sizes.small(), sheet.sizes.heading());
    let mut taken = Taken::new(frame.rect.grown(-4.0 * k), 3.0 * k);
    taken.dots = report.landmarks.iter().map(|mark| frame.px(mark.position)).collect();
    let badges: Vec<Rect> = report
        .regions
        .iter()
        .map(|region| {
            let number = region.number.to_string();
            let side = (text::width(&number, bold) + 10.0 * k, bold.height_px() + 2.0 * k);
            Rect::centred(frame.px(region.label_at), side.0, side.1)
        })
        .collect();
    taken.rects.extend(&badges);
    for (region, badge) in report.regions.iter().zip(&badges) {
        boxed(sheet, *badge, &region.number.to_string(), true);
    }
    for line in &report.lines {
        let track = frame.path(&line.track);
        let Some(&start) = track.first() else { continue };
        let name = text::fit(&text::printable(&line.name), bold, frame.rect.width() * 0.2);
        let size = (text::width(&name, bold) + 8.0 * k, bold.height_px() + 2.0 * k);
        let Some((place, leader)) = taken.label(start, away(&track), 4.0 * k, size) else { continue };
        if let Some((from, to)) = leader {
            sheet.scene.stroke(vec![from, to], larger(1.0, k), SOFT_INK);
            taken.leaders.push((from, to));
        }
        sheet.scene.fill(place, WHITE);
        sheet.scene.text((place.left + 4.0 * k, place.top + k), &name, bold, INK);
        taken.rects.push(place);
    }
    for (region, badge) in report.regions.iter().zip(&badges) {
        let label = label(region);
        let size = (text::width(&label, font) + 8.0 * k, font.height_px() + 2.0 * k);
        let gap = badge.height() / 2.0 + 2.0 * k;
        let Some((place, _)) = taken.label(badge.centre(), (0.0, 1.0), gap, size) else { continue };
        // A label that does not touch its number is tied to it.
        if !badge.grown(6.0 * k).overlaps(&place) {
            let (from, to) = (badge.centre(), place.centre());
            if let (Some((_, from)), Some((to, _))) =
                (badge.clip_segment(from, to), place.clip_segment(from, to))
            {
                sheet.scene.stroke(vec![from, to], larger(2.0, 4.0 * k), WHITE);
                sheet.scene.stroke(vec![from, to], larger(1.0, 1.4 * k), SOFT_INK);
                taken.leaders.push((from, to));
            }
        }
        boxed(sheet, place, &label, false);
        taken.rects.push(place);
    }
}

/// Away from the way a track leaves its start.
fn away(track: &[Px]) -> Px {
    match track {
        [first, second, ..] => (first.0 - second.0, first.1 - second.1),
        _ => (0.0, -1.0),
    }
}

/// Text in a white box; a strong one has an ink edge.
fn boxed(sheet: &mut Sheet, rect: Rect, words: &str, strong: bool) {
    let k = sheet.sizes.k;
    let font = if strong { sheet.sizes.heading() } else { sheet.sizes.small() };
    sheet.scene.fill(rect, WHITE);
    if strong {
        sheet.scene.outline(rect, larger(1.0, 1.5 * k), INK);
    }
    let left = rect.centre().0 - text::width(words, font) / 2.0;
    let top = rect.centre().1 - font.height_px() / 2.0;
    sheet.scene.text((left, top), words, font, INK);
}

fn label(region: &RemapRegion) -> String {
    let cause = match region.cause {
        RemapCause::BoxesTooWide => "boxes",
        RemapCause::TooFewLandmarks => "few landmarks",
        RemapCause::LookAlikeGround => "look-alike",
        other => other.in_words(),
    };
    match &region.resurvey {
        Some(resurvey) if resurvey.gained_km2 > 0.0 => {
            format!("{cause}, +{} km²", nice::short(resurvey.gained_km2, 2))
        }
        Some(_) => format!("{cause}, no gain"),
        None => cause.to_owned(),
    }
}

/// The patterns of the causes on the map; returns where the legend ends.
fn legend(sheet: &mut Sheet, column: Rect, report: &RemapReport) -> f64 {
    let (sizes, k) = (sheet.sizes, sheet.sizes.k);
    let mut y =
        sheet.scene.text((column.left, column.top), "Why the cells fail", sizes.heading(), INK).bottom;
    y += 6.0 * k;
    let pitch = 30.0 * k;
    let present = RemapCause::ALL.into_iter().filter(|&c| report.regions.iter().any(|r| r.cause == c));
    for cause in present {
        let swatch = Rect::new(column.left, y + 3.0 * k, column.left + 56.0 * k, y + pitch - 3.0 * k);
        Pattern::of(cause).fill(&mut sheet.scene, swatch, PATTERN_PX.0 * k, larger(0.8, PATTERN_PX.1 * k));
        sheet.scene.outline(swatch, larger(1.0, 1.5 * k), INK);
        row_text(sheet, column, y + pitch / 2.0, meaning(cause), INK);
        y += pitch;
    }
    if report.specks > 0 {
        let swatch = Rect::new(column.left, y + 3.0 * k, column.left + 56.0 * k, y + pitch - 3.0 * k);
        sheet.scene.fill(swatch, PALE);
        row_text(sheet, column, y + pitch / 2.0, "failing cells too few for a region", SOFT_INK);
        y += pitch;
    }
    let middle = y + pitch / 2.0;
    sheet.scene.fill(Rect::centred((column.left + 28.0 * k, middle), 5.0 * k, 5.0 * k), GREY);
    row_text(sheet, column, middle, "landmark (its box, where that is larger)", SOFT_INK);
    y + pitch
}

fn row_text(sheet: &mut Sheet, column: Rect, middle: f64, words: &str, colour: super::colours::Rgb) {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    let left = column.left + 68.0 * k;
    let words = text::fit(words, font, column.right - left);
    sheet.scene.text((left, middle - font.height_px() / 2.0), &words, font, colour);
}

fn meaning(cause: RemapCause) -> &'static str {
    match cause {
        RemapCause::BoxesTooWide => "boxes too wide: narrower ones do",
        RemapCause::TooFewLandmarks => "too few landmarks",
        RemapCause::DeadReckoning => "dead reckoning too coarse",
        RemapCause::Sonar => "sonar errors too large",
        RemapCause::LookAlikeGround => "look-alike ground",
        RemapCause::SeveralErrors => "several errors together",
        RemapCause::Undecided => "undecided: cell budget reached",
        RemapCause::DetectionNotCertain => "detection not certain, no miss allowed",
    }
}

/// The regions in the order of the ranking, as many as fit.
fn list(sheet: &mut Sheet, area: Rect, report: &RemapReport) {
    let (sizes, k) = (sheet.sizes, sheet.sizes.k);
    let font = sizes.small();
    let mut y =
        sheet.scene.text((area.left, area.top), "Regions, best gain first", sizes.heading(), INK).bottom;
    let note =
        "gain: ground that passes only after the re-survey, for each area surveyed; boxes keep their centres";
    let lines = text::wrap(note, font, area.width(), 3);
    y = sheet.scene.lines((area.left, y + 2.0 * k), &lines, font, SOFT_INK) + 6.0 * k;
    let pitch = sizes.body().height_px() + font.height_px() + 3.0 * k;
    let rows = ((area.bottom - y) / pitch) as usize;
    let shown = if report.regions.len() <= rows { rows } else { rows.saturating_sub(1) };
    for region in report.regions.iter().take(shown) {
        let number = region.number.to_string();
        let left = area.left + 40.0 * k;
        let width = text::width(&number, sizes.heading());
        sheet.scene.text((area.left + 30.0 * k - width, y), &number, sizes.heading(), INK);
        let first = format!("{}, {} km²", region.cause.in_words(), nice::short(region.area_km2, 3));
        let first = text::fit(&first, sizes.body(), area.right - left);
        let below = sheet.scene.text((left, y), &first, sizes.body(), INK).bottom;
        let second = text::fit(&bought(region), font, area.right - left);
        sheet.scene.text((left, below), &second, font, SOFT_INK);
        y += pitch;
    }
    if report.regions.is_empty() {
        sheet.scene.text((area.left, y), "none: every cell passes", sizes.body(), INK);
    } else if report.regions.len() > shown {
        let more = format!("and {} more: see remap.csv", report.regions.len() - shown);
        sheet.scene.text((area.left, y), &text::fit(&more, font, area.width()), font, SOFT_INK);
    }
}

/// What the re-survey of a region buys, in words.
fn bought(region: &RemapRegion) -> String {
    match &region.resurvey {
        Some(resurvey) => {
            let gain = nice::short(resurvey.gained_km2, 2);
            let surveyed = nice::short(region.survey_km2, 2);
            match resurvey.cures {
                true => format!(
                    "{} m cures: +{gain} km² for {surveyed} km²",
                    nice::short(resurvey.half_width_after_m, 2)
                ),
                false => format!("not cured: +{gain} km² for {surveyed} km²"),
            }
        }
        None => "re-survey not computed".to_owned(),
    }
}
