//! The charts of `area`: where is it risky to come down, which way to run first, and how many headings pass?

use super::classes::{Finding, Scale};
use super::colours::{CLASSES, INK, SOFT_INK, WHITE};
use super::furniture::{Extent, MapFrame, Sheet, bounds_in_words};
use super::legend::{label_left, label_room, required_mark, swatch, swatch_width};
use super::lines::{draw_surround, fit_frame};
use super::ribbon::ground;
use super::scene::{Rect, Scene};
use super::{AreaChart, ChartSize, RenderError, nice, text};
use crate::frame::LocalPoint;
use crate::interval::{larger, smaller};
use crate::report::{AreaCell, AreaReport};

/// Distance between hatch strokes, pixels of the reference canvas.
const HATCH_PX: f64 = 9.0;
/// Distance between dots, likewise.
const DOTS_PX: f64 = 9.0;
/// Least distance between arrows, likewise.
const ARROWS_PX: f64 = 34.0;
/// Up to this many landmarks each gets a square with an edge; more are dots.
const SQUARES_MAX: usize = 1500;
/// Least shares of headings of the classes, best first; the last holds every share above 0.
const SHARES: [f64; CLASSES] = [1.0, 0.75, 0.5, 0.25, 0.0];

/// Lays out one chart.
pub(super) fn scene(report: &AreaReport, chart: AreaChart, size: &ChartSize) -> Result<Scene, RenderError> {
    let mut sheet = Sheet::new(size)?;
    let k = sheet.sizes.k;
    let half = LocalPoint::new(0.5 * report.grid.cell_m, 0.5 * report.grid.cell_m);
    let centres: Vec<LocalPoint> =
        report.cells.iter().map(|cell| report.grid.centre(cell.column, cell.row)).collect();
    let extent = Extent::of(centres.iter().chain(&report.search_area))
        .filter(|_| !report.cells.is_empty())
        .ok_or(RenderError::Nothing("no start cell lies in the search area"))?
        .grown(half.east_m);

    let (title, what) = words(report, chart);
    let top = sheet.header(title, &format!("{what}; {}", bounds_in_words(&report.parameters)));
    let extra = [format!("cells of {} m", nice::short(report.grid.cell_m, 2))];
    let bottom = sheet.foot_top(&report.provenance, &report.parameters, &extra);
    let column =
        Rect::new(sheet.inner.right - 404.0 * k, top + 34.0 * k, sheet.inner.right, bottom - 16.0 * k);
    let frame = fit_frame(&sheet, &report.provenance, extent, (top, bottom), column.left - 36.0 * k);
    sheet.foot(&report.provenance, &report.parameters, &extra);

    let scale = scale_of(report, chart);
    let findings: Vec<Finding> =
        report.cells.iter().map(|cell| finding(cell, chart, scale.as_ref())).collect();
    frame.draw_ground(&mut sheet);
    draw_cells(&mut sheet, &frame, report, &findings);
    draw_area_edge(&mut sheet, &frame, report);
    draw_marks(&mut sheet, &frame, report);
    if chart == AreaChart::Best {
        draw_arrows(&mut sheet, &frame, report);
    }
    draw_surround(&mut sheet, &frame, &report.provenance);
    draw_legend(&mut sheet, column, report, chart, scale.as_ref());
    Ok(sheet.scene)
}

/// Title, and what the map shows.
fn words(report: &AreaReport, chart: AreaChart) -> (&'static str, String) {
    let headings = report.headings_deg.len();
    let runs = format!(
        "straight runs of up to {} m from the centre of each {} m cell, vehicle lost in the whole search area",
        nice::short(report.options.longest_run_m, 1),
        nice::short(report.grid.cell_m, 2)
    );
    match chart {
        AreaChart::Worst => {
            ("Where is it risky to come down?", format!("Worst of {headings} headings; {runs}"))
        }
        AreaChart::Best => {
            ("Which way should the vehicle run first?", format!("Best of {headings} headings; {runs}"))
        }
        AreaChart::Share => (
            "From where does the heading not matter?",
            format!(
                "Share of {headings} headings with a guaranteed fix within {} m; {runs}",
                nice::short(report.parameters.required_fix_m, 1)
            ),
        ),
    }
}

/// The classes of distance; none for shares.
fn scale_of(report: &AreaReport, chart: AreaChart) -> Option<Scale> {
    (chart != AreaChart::Share).then(|| Scale::of_guaranteed(report.parameters.required_fix_m))
}

/// How a cell is drawn. A cell is undecided only when an undecided heading may change what is drawn.
fn finding(cell: &AreaCell, chart: AreaChart, scale: Option<&Scale>) -> Finding {
    let undecided = cell.no_fix.undecided;
    match (chart, scale) {
        (AreaChart::Worst, Some(scale)) => match cell.worst_m {
            Some(worst_m) => scale.class_of(worst_m),
            None if cell.no_fix.total() == undecided => Finding::Undecided,
            None => Finding::NoFix,
        },
        (AreaChart::Best, Some(scale)) => match cell.best_m {
            Some(best_m) => scale.class_of(best_m),
            None if undecided > 0 => Finding::Undecided,
            None => Finding::NoFix,
        },
        _ if cell.within_required_share > 0.0 => {
            let class = SHARES.iter().position(|&least| cell.within_required_share >= least);
            Finding::Class(class.unwrap_or(CLASSES - 1))
        }
        _ if undecided > 0 => Finding::Undecided,
        _ => Finding::NoFix,
    }
}

/// The cells, joined along each row where neighbours are drawn alike.
fn draw_cells(sheet: &mut Sheet, frame: &MapFrame, report: &AreaReport, findings: &[Finding]) {
    let grid = &report.grid;
    let k = sheet.sizes.k;
    let corner = |column: usize, row: usize| {
        frame.px(LocalPoint::new(
            grid.west_m + column as f64 * grid.cell_m,
            grid.south_m + row as f64 * grid.cell_m,
        ))
    };
    let mut number = 0;
    while number < findings.len() {
        let first = &report.cells[number];
        let mut end = number + 1;
        while end < findings.len()
            && findings[end] == findings[number]
            && report.cells[end].row == first.row
            && report.cells[end].column == report.cells[end - 1].column + 1
        {
            end += 1;
        }
        let (left, bottom) = corner(first.column, first.row);
        let (right, top) = corner(report.cells[end - 1].column + 1, first.row + 1);
        let rect = Rect::new(left, top, right, bottom);
        sheet.scene.fill(rect, ground(findings[number]));
        match findings[number] {
            Finding::NoFix => hatch(&mut sheet.scene, &rect, HATCH_PX * k, larger(1.0, 1.5 * k)),
            Finding::Undecided => dots(&mut sheet.scene, &rect, DOTS_PX * k, 1.7 * k),
            Finding::Class(_) | Finding::NotScored => {}
        }
        number = end;
    }
}

/// Strokes from upper left to lower right, as in the legend, on lines that all rectangles share.
fn hatch(scene: &mut Scene, rect: &Rect, spacing: f64, width: f64) {
    // On a stroke x − y is constant.
    let (first, last) = (rect.left - rect.bottom, rect.right - rect.top);
    for n in (libm::ceil(first / spacing) as i64)..=(libm::floor(last / spacing) as i64) {
        let difference = n as f64 * spacing;
        let (from, to) = ((difference + rect.top, rect.top), (difference + rect.bottom, rect.bottom));
        if let Some((from, to)) = rect.clip_segment(from, to) {
            scene.stroke(vec![from, to], width, INK);
        }
    }
}

/// Dots on a lattice that all rectangles share.
fn dots(scene: &mut Scene, rect: &Rect, spacing: f64, radius: f64) {
    let lines = |from: f64, to: f64| {
        (libm::ceil(from / spacing) as i64..=libm::floor(to / spacing) as i64)
            .map(move |n| n as f64 * spacing)
    };
    for y in lines(rect.top, rect.bottom).filter(|&y| y < rect.bottom) {
        for x in lines(rect.left, rect.right).filter(|&x| x < rect.right) {
            scene.disc((x, y), radius, INK);
        }
    }
}

fn draw_area_edge(sheet: &mut Sheet, frame: &MapFrame, report: &AreaReport) {
    let width = larger(1.0, 1.5 * sheet.sizes.k);
    let mut corners = frame.path(&report.search_area);
    corners.extend(corners.first().copied());
    for pair in corners.windows(2) {
        if let Some((from, to)) = frame.rect.clip_segment(pair[0], pair[1]) {
            sheet.scene.stroke(vec![from, to], width, INK);
        }
    }
}

/// Landmarks as white squares with an edge of ink, so that they show on every class.
fn draw_marks(sheet: &mut Sheet, frame: &MapFrame, report: &AreaReport) {
    let k = larger(1.0, sheet.sizes.k);
    let is_dense = report.landmarks.len() > SQUARES_MAX;
    let least = if is_dense { 2.0 * k } else { 5.0 * k };
    for landmark in &report.landmarks {
        let width = larger(least, 2.0 * landmark.half_width_east_m * frame.px_per_m);
        let height = larger(least, 2.0 * landmark.half_width_north_m * frame.px_per_m);
        let rect = Rect::centred(frame.px(landmark.position), width, height);
        let Some(seen) = rect.intersection(&frame.rect) else { continue };
        sheet.scene.fill(seen, INK);
        if !is_dense && let Some(inner) = rect.grown(-k).intersection(&frame.rect) {
            sheet.scene.fill(inner, WHITE);
        }
    }
}

/// Arrows along the best heading, on as many cells as there is room for; none reaches beyond the cells.
fn draw_arrows(sheet: &mut Sheet, frame: &MapFrame, report: &AreaReport) {
    let (k, grid) = (sheet.sizes.k, &report.grid);
    let every = larger(libm::ceil(ARROWS_PX * k / (grid.cell_m * frame.px_per_m)), 1.0) as usize;
    let Some((columns, rows)) = spans(report) else { return };
    // The lattice stands in the middle of the cells, so that the same is left over on both sides.
    let first = |(first, last): (usize, usize)| first + ((last + 1 - first) % every) / 2 + every / 2;
    let (first_column, first_row) = (first(columns), first(rows));
    let on_lattice = |value: usize, first: usize| value >= first && (value - first).is_multiple_of(every);
    let corner = |column: usize, row: usize| {
        frame.px(LocalPoint::new(
            grid.west_m + column as f64 * grid.cell_m,
            grid.south_m + row as f64 * grid.cell_m,
        ))
    };
    let ((left, bottom), (right, top)) = (corner(columns.0, rows.0), corner(columns.1 + 1, rows.1 + 1));
    let ground = Rect::new(left, top, right, bottom);
    let chosen = report
        .cells
        .iter()
        .filter(|cell| on_lattice(cell.column, first_column) && on_lattice(cell.row, first_row));
    for cell in chosen {
        let Some(heading) = cell.best_heading else { continue };
        let heading_rad = report.headings_deg[heading].to_radians();
        let (dx, dy) = (libm::sin(heading_rad), -libm::cos(heading_rad));
        let (x, y) = frame.px(grid.centre(cell.column, cell.row));
        let at =
            |ahead: f64, aside: f64| (x + (dx * ahead - dy * aside) * k, y + (dy * ahead + dx * aside) * k);
        if ![15.0, -12.5].into_iter().all(|ahead| ground.holds(at(ahead, 0.0))) {
            continue;
        }
        for (grown, colour) in [(1.5, WHITE), (0.0, INK)] {
            let shaft = vec![at(-11.0 - grown, 0.0), at(4.0, 0.0)];
            sheet.scene.stroke(shaft, (2.2 + 2.0 * grown) * k, colour);
            let head = vec![
                at(12.0 + 2.0 * grown, 0.0),
                at(3.0 - grown, 4.8 + 1.4 * grown),
                at(3.0 - grown, -4.8 - 1.4 * grown),
            ];
            sheet.scene.polygon(head, colour);
        }
    }
}

/// First and last column and row that have a cell.
fn spans(report: &AreaReport) -> Option<((usize, usize), (usize, usize))> {
    let of = |value: fn(&AreaCell) -> usize| {
        Some((report.cells.iter().map(value).min()?, report.cells.iter().map(value).max()?))
    };
    Some((of(|cell| cell.column)?, of(|cell| cell.row)?))
}

fn draw_legend(
    sheet: &mut Sheet,
    column: Rect,
    report: &AreaReport,
    chart: AreaChart,
    scale: Option<&Scale>,
) {
    let (k, sizes) = (sheet.sizes.k, sheet.sizes);
    let longest = nice::short(report.options.longest_run_m, 1);
    let required = nice::short(report.parameters.required_fix_m, 1);
    let (heading, note) = match chart {
        AreaChart::Worst => (
            "Guaranteed fix distance, worst heading",
            "metres run until the position is unambiguous, for every error within the bounds, whichever heading is run"
                .to_owned(),
        ),
        AreaChart::Best => (
            "Guaranteed fix distance, best heading",
            "metres run until the position is unambiguous, for every error within the bounds, on the heading of the arrow"
                .to_owned(),
        ),
        AreaChart::Share => (
            "Share of headings that pass",
            format!("headings on which a fix within {required} m is guaranteed, for every error within the bounds"),
        ),
    };
    let lines = text::wrap(heading, sizes.heading(), column.width(), 2);
    let mut y = sheet.scene.lines((column.left, column.top), &lines, sizes.heading(), INK);
    let lines = text::wrap(&note, sizes.small(), column.width(), 3);
    y = sheet.scene.lines((column.left, y + 2.0 * k), &lines, sizes.small(), SOFT_INK) + 8.0 * k;
    let pitch = 33.0 * k;
    let row = |sheet: &mut Sheet, y: &mut f64, finding: Finding, label: &str| {
        let rect = Rect::new(column.left, *y, column.right, *y + pitch);
        swatch(sheet, rect, finding, label);
        *y += pitch;
    };
    for class in 0..CLASSES {
        let label = match scale {
            Some(scale) => scale.label(class),
            None => share_label(class),
        };
        row(sheet, &mut y, Finding::Class(class), &label);
        if let Some(scale) = scale.filter(|scale| class + 1 == scale.classes_within()) {
            y = required_mark(sheet, column, y, scale);
        }
    }
    let (none, undecided) = match chart {
        AreaChart::Worst => {
            (format!("some heading without a fix by {longest} m"), "undecided: cell budget reached")
        }
        AreaChart::Best => {
            (format!("no heading with a fix by {longest} m"), "undecided: cell budget reached")
        }
        AreaChart::Share => ("no heading".to_owned(), "undecided: cell budget reached"),
    };
    row(sheet, &mut y, Finding::NoFix, &none);
    row(sheet, &mut y, Finding::Undecided, undecided);
    let middle = y + pitch / 2.0;
    let centre = (column.left + swatch_width(k) / 2.0, middle);
    let side = if report.landmarks.len() > SQUARES_MAX { 2.0 } else { 5.0 } * larger(1.0, k);
    sheet.scene.fill(Rect::centred(centre, side, side), INK);
    if report.landmarks.len() <= SQUARES_MAX {
        let inner = side - 2.0 * larger(1.0, k);
        sheet.scene.fill(Rect::centred(centre, inner, inner), WHITE);
    }
    let font = sizes.small();
    let label = text::fit("landmark (its box, where that is larger)", font, label_room(column, k));
    sheet.scene.text((label_left(column, k), middle - font.height_px() / 2.0), &label, font, SOFT_INK);
    y += pitch + 14.0 * k;
    draw_summary(sheet, Rect { top: y, ..column }, report);
}

/// Label of a class of shares.
fn share_label(class: usize) -> String {
    let per_cent = |share: f64| nice::short(100.0 * share, 0);
    match class {
        0 => "all headings".to_owned(),
        _ if class + 1 == CLASSES => format!("under {} %", per_cent(SHARES[class - 1])),
        1 => format!("{} % to under all", per_cent(SHARES[1])),
        _ => format!("{} to under {} %", per_cent(SHARES[class]), per_cent(SHARES[class - 1])),
    }
}

/// The answer in figures.
fn draw_summary(sheet: &mut Sheet, area: Rect, report: &AreaReport) {
    let sizes = sheet.sizes;
    let required = nice::short(report.parameters.required_fix_m, 1);
    let count = report.cells.len() as f64;
    let share = |of: &dyn Fn(&AreaCell) -> bool| {
        let share = 100.0 * report.cells.iter().filter(|&cell| of(cell)).count() as f64 / count;
        // A figure that rounds to all or nothing without being so is not shown as that.
        format!("{} %", nice::short(if share < 100.0 { smaller(share, 99.9) } else { share }, 1))
    };
    let rows = [
        (
            share(&|c| c.within_required_share >= 1.0),
            format!("of the cells: every heading fixes within {required} m"),
        ),
        (
            share(&|c| c.within_required_share > 0.0),
            format!("of the cells: some heading fixes within {required} m"),
        ),
        (share(&|c| c.best_m.is_none()), "of the cells: no heading has a guaranteed fix".to_owned()),
    ];
    let k = sizes.k;
    let mut y = sheet.scene.text((area.left, area.top), "In figures", sizes.heading(), INK).bottom + 6.0 * k;
    let indent = 84.0 * k;
    for (figure, what) in rows {
        let lines = text::wrap(&what, sizes.small(), area.width() - indent, 2);
        if y + lines.len() as f64 * sizes.small().line_px() > area.bottom {
            return;
        }
        sheet.scene.text((area.left, y), &figure, sizes.body(), INK);
        y = sheet.scene.lines((area.left + indent, y + 2.0 * k), &lines, sizes.small(), SOFT_INK) + 6.0 * k;
    }
}
