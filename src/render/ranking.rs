//! The ranking of the lines, beside the map.

use super::colours::{BAR, INK, PALE, SOFT_INK};
use super::furniture::Sheet;
use super::nice;
use super::scene::Rect;
use super::text::{self, Font};
use crate::dive::RankBy;
use crate::interval::larger;
use crate::report::{LineReport, LinesReport};

/// Draws the ranking inside `area`, as many lines as fit.
pub(super) fn draw(sheet: &mut Sheet, area: Rect, report: &LinesReport) {
    let sizes = sheet.sizes;
    let k = sizes.k;
    let mut y = sheet.scene.text((area.left, area.top), "Ranking", sizes.heading(), INK).bottom + 2.0 * k;
    let bar = if is_guaranteed(report) {
        "share of the line with a guaranteed fix"
    } else {
        "share of simulated dives with a fix (estimated, all segment starts)"
    };
    let note = format!(
        "bar: {bar} within {} m; {}",
        nice::short(report.parameters.required_fix_m, 2),
        order_in_words(report.rank_by),
    );
    let lines = text::wrap(&note, sizes.small(), area.width(), 3);
    y = sheet.scene.lines((area.left, y), &lines, sizes.small(), SOFT_INK) + 8.0 * k;

    let mut ranked: Vec<&LineReport> = report.lines.iter().collect();
    ranked.sort_by_key(|line| line.rank);
    // Two lines for each, or one when there are many.
    let roomy = sizes.body().line_px() + 38.0 * k;
    let tight = sizes.body().line_px() + 4.0 * k;
    let rows_at = |pitch: f64, bottom: f64| ((bottom - y) / pitch) as usize;
    let is_roomy = ranked.len() <= rows_at(roomy, area.bottom);
    let pitch = if is_roomy { roomy } else { tight };
    let shown = if ranked.len() <= rows_at(pitch, area.bottom) {
        ranked.len()
    } else {
        rows_at(pitch, area.bottom - sizes.small().line_px())
    };
    for line in &ranked[..shown] {
        let at = Rect::new(area.left, y, area.right, y + pitch);
        if is_roomy {
            roomy_row(sheet, at, line);
        } else {
            tight_row(sheet, at, line);
        }
        y += pitch;
    }
    if shown < ranked.len() && y + sizes.small().height_px() <= area.bottom {
        let rest = format!("… and {} more, in lines.csv and lines.json", ranked.len() - shown);
        let rest = text::fit(&rest, sizes.small(), area.width());
        sheet.scene.text((area.left, y), &rest, sizes.small(), SOFT_INK);
    }
}

fn order_in_words(rank_by: RankBy) -> &'static str {
    match rank_by {
        RankBy::Guaranteed => "ordered by guaranteed share",
        RankBy::Share => "ordered by estimated share of dives",
        RankBy::P95 => "ordered by 95th percentile (p95)",
        RankBy::Median => "ordered by median fix distance",
        RankBy::NoFix => "ordered by share of dives without a fix",
    }
}

/// Rank and name; returns the name's rectangle.
fn name(sheet: &mut Sheet, at: Rect, line: &LineReport, font: Font, room: f64) -> Rect {
    let sizes = sheet.sizes;
    let left = at.left + 34.0 * sizes.k;
    sheet.scene.text((at.left, at.top), &line.rank.to_string(), sizes.body(), SOFT_INK);
    let name = text::fit(&text::printable(&line.name), font, room);
    sheet.scene.text((left, at.top), &name, font, INK)
}

/// Name on the first line; bar, share and percentile on the second.
fn roomy_row(sheet: &mut Sheet, at: Rect, line: &LineReport) {
    let (k, font) = (sheet.sizes.k, sheet.sizes.heading());
    let name = name(sheet, at, line, font, at.width() - 34.0 * k);
    let bar = Rect::new(name.left, name.bottom + 6.0 * k, name.left + 150.0 * k, name.bottom + 22.0 * k);
    let right = share(sheet, bar, line);
    let text = beside(line, ["estimated ", "p95 "]);
    percentile(sheet, bar, larger(right + 12.0 * k, bar.right + 72.0 * k), at.right, &text);
}

/// Everything on one line.
fn tight_row(sheet: &mut Sheet, at: Rect, line: &LineReport) {
    let (k, font) = (sheet.sizes.k, sheet.sizes.body());
    let bar_left = at.left + 200.0 * k;
    let name = name(sheet, at, line, font, bar_left - at.left - 42.0 * k);
    let (_, middle) = name.centre();
    let bar = Rect::new(bar_left, middle - 7.0 * k, bar_left + 36.0 * k, middle + 7.0 * k);
    let right = share(sheet, bar, line);
    let text = beside(line, ["est. ", ""]);
    percentile(sheet, bar, larger(right + 8.0 * k, bar.right + 60.0 * k), at.right, &text);
}

/// Whether the ranking shows guaranteed shares.
fn is_guaranteed(report: &LinesReport) -> bool {
    report.lines.iter().any(|line| line.guaranteed.is_some())
}

/// What stands beside the bar: beside a guaranteed share the estimated one, else the 95th percentile.
fn beside(line: &LineReport, prefix: [&str; 2]) -> String {
    let [estimated, p95] = prefix;
    if line.guaranteed.is_some() {
        let share = line.estimated.within_required_share.value.map_or_else(|| "none".to_owned(), per_cent);
        return format!("{estimated}{share}");
    }
    let p95_m =
        line.estimated.p95_m.value.map_or_else(|| "none".to_owned(), |m| format!("{} m", nice::metres(m)));
    format!("{p95}{p95_m}")
}

/// Bar and figure of the share; returns the figure's right edge.
fn share(sheet: &mut Sheet, bar: Rect, line: &LineReport) -> f64 {
    let sizes = sheet.sizes;
    let share = match line.guaranteed {
        Some(guaranteed) => Some(guaranteed.within_required_share),
        None => line.estimated.within_required_share.value,
    };
    sheet.scene.fill(bar, PALE);
    if let Some(share) = share.filter(|&share| share > 0.0) {
        let right = bar.left + bar.width() * share.clamp(0.0, 1.0);
        sheet.scene.fill(Rect::new(bar.left, bar.top, right, bar.bottom), BAR);
    }
    let written = share.map_or_else(|| "no dives".to_owned(), per_cent);
    let top = bar.centre().1 - sizes.body().height_px() / 2.0;
    sheet.scene.text((bar.right + 10.0 * sizes.k, top), &written, sizes.body(), INK).right
}

fn percentile(sheet: &mut Sheet, bar: Rect, left: f64, right: f64, p95: &str) {
    let font = sheet.sizes.small();
    let p95 = text::fit(p95, font, right - left);
    sheet.scene.text((left, bar.centre().1 - font.height_px() / 2.0), &p95, font, SOFT_INK);
}

/// A share in per cent that never rounds to 0 or 100 what is neither.
fn per_cent(share: f64) -> String {
    let percent = share * 100.0;
    if share > 0.0 && percent < 0.5 {
        "<1 %".to_owned()
    } else if share < 1.0 && percent >= 99.5 {
        ">99 %".to_owned()
    } else {
        format!("{percent:.0} %")
    }
}
