//! The chart of `sensitivity`: which error is worth improving first?

use super::colours::{BAR, INK, PALE, SOFT_INK};
use super::furniture::{Sheet, bounds_in_words};
use super::scene::{Rect, Scene};
use super::{ChartSize, RenderError, nice, text};
use crate::interval::{larger, smaller};
use crate::report::{GuaranteedChange, SensitivityReport};

/// Tallest row, pixels of the reference canvas.
const ROW_MOST_PX: f64 = 74.0;
/// Steps of an axis at least.
const STEPS: f64 = 4.0;

/// One row of the figure.
struct Row<'a> {
    rank: String,
    words: &'a str,
    values: String,
    change: &'a GuaranteedChange,
}

/// Lays out the chart.
pub(super) fn scene(report: &SensitivityReport, size: &ChartSize) -> Result<Scene, RenderError> {
    let mut sheet = Sheet::new(size)?;
    let k = sheet.sizes.k;
    let top = sheet.header("Which error is worth improving first?", &subtitle(report));
    let extra = [format!("bounds times {}", nice::short(report.factor, 3))];
    let bottom = sheet.foot(&report.provenance, &report.parameters, &extra);
    let font = sheet.sizes.heading();
    let answer = sentence(&report.verdict.text);
    let lines = text::wrap(&answer, font, sheet.inner.width(), 3);
    let y = sheet.scene.lines((sheet.inner.left, top + 12.0 * k), &lines, font, INK);
    let notes = notes(report);
    let note_font = sheet.sizes.small();
    let notes = text::wrap(&notes, note_font, sheet.inner.width(), 3);
    let notes_top = bottom - 20.0 * k - notes.len() as f64 * note_font.line_px();
    sheet.scene.lines((sheet.inner.left, notes_top), &notes, note_font, SOFT_INK);
    let area = Rect::new(sheet.inner.left, y + 24.0 * k, sheet.inner.right, notes_top - 18.0 * k);
    draw_rows(&mut sheet, area, report);
    Ok(sheet.scene)
}

fn subtitle(report: &SensitivityReport) -> String {
    let lines = match report.lines.len() {
        1 => "one candidate line".to_owned(),
        count => format!("{count} candidate lines"),
    };
    format!(
        "Each error bound times {}, one at a time and all together; guaranteed fixes of {lines}, {} segments, vehicle lost at the \
         start of any of them; {}",
        nice::short(report.factor, 3),
        report.present.segments,
        bounds_in_words(&report.parameters),
    )
}

fn sentence(text: &str) -> String {
    let mut chars = text.chars();
    chars.next().map_or_else(String::new, |first| first.to_uppercase().chain(chars).collect::<String>() + ".")
}

fn notes(report: &SensitivityReport) -> String {
    let mut notes = format!(
        "Now {} of the length of all lines has a guaranteed fix within {} m. Guaranteed figures only, for {} tracks of the descent \
         scatter. Budgets of strays and misses, scatter and detection chance stay as they are.",
        per_cent(report.present.within_required_share),
        nice::short(report.parameters.required_fix_m, 1),
        report.guarantee.offset_tracks,
    );
    if !report.zero.is_empty() {
        let zero: Vec<&str> = report.zero.iter().map(|bound| bound.words).collect();
        notes.push_str(&format!(" Zero already: {}.", zero.join(", ")));
    }
    notes
}

fn per_cent(share: f64) -> String {
    format!("{:.1} %", 100.0 * share)
}

/// One of the two panels of bars.
struct Panel {
    /// Where bars stand, their labels included.
    rect: Rect,
    /// Right edge of a full bar.
    full: f64,
    /// Value of a full bar.
    most: f64,
    step: f64,
    unit: &'static str,
}

impl Panel {
    fn new(rect: Rect, label_room: f64, values: impl Iterator<Item = f64>, unit: &'static str) -> Self {
        let most = values.fold(0.0, larger);
        // Without any gain the axis still has a scale.
        let step = nice::step_up(if most > 0.0 { most / STEPS } else { 1.0 });
        let most = if most > 0.0 { step * libm::ceil(most / step - 1e-9) } else { STEPS * step };
        Self { rect, full: rect.right - label_room, most, step, unit }
    }

    fn x(&self, value: f64) -> f64 {
        self.rect.left + (self.full - self.rect.left) * value / self.most
    }

    /// Grid lines and their values under the panel.
    fn draw_axis(&self, sheet: &mut Sheet, bottom: f64) {
        let (k, font) = (sheet.sizes.k, sheet.sizes.small());
        let width = larger(1.0, k);
        let mut free_from = f64::NEG_INFINITY;
        for value in nice::multiples(self.step, 0.0, self.most * (1.0 + 1e-9)) {
            let x = self.x(value);
            let rect = Rect::new(x - width / 2.0, self.rect.top, x + width / 2.0, bottom);
            sheet.scene.fill(rect, PALE);
            let label = format!("{} {}", nice::written(value, self.step), self.unit);
            let half = text::width(&label, font) / 2.0;
            if x - half >= free_from {
                sheet.scene.text((x - half, bottom + 6.0 * k), &label, font, SOFT_INK);
                free_from = x + half + 10.0 * k;
            }
        }
    }

    fn draw_bar(
        &self,
        sheet: &mut Sheet,
        (top, bottom): (f64, f64),
        value: f64,
        label: &str,
        is_first: bool,
    ) {
        let (k, font) = (sheet.sizes.k, sheet.sizes.body());
        let line = larger(1.0, 1.5 * k);
        let right = self.x(larger(value, 0.0));
        if value > 0.0 {
            let bar = Rect::new(self.rect.left, top, larger(right, self.rect.left + line), bottom);
            // The first place is solid, the others are open: told apart in black and white.
            sheet.scene.fill(bar, if is_first { INK } else { BAR });
            if !is_first && bar.width() > 2.0 * line && bar.height() > 2.0 * line {
                sheet.scene.fill(bar.grown(-line), PALE);
            }
        }
        let base = Rect::new(self.rect.left - line / 2.0, top, self.rect.left + line / 2.0, bottom);
        sheet.scene.fill(base, INK);
        let left = right + 8.0 * k;
        let label = text::fit(label, font, larger(self.rect.right - left, 0.0));
        let middle = (top + bottom) / 2.0 - font.height_px() / 2.0;
        sheet.scene.text((left, middle), &label, font, INK);
    }
}

fn draw_rows(sheet: &mut Sheet, area: Rect, report: &SensitivityReport) {
    let (k, sizes) = (sheet.sizes.k, sheet.sizes);
    let rows: Vec<Row<'_>> = report
        .bounds
        .iter()
        .map(|bound| Row {
            rank: bound.rank.map_or_else(|| "–".to_owned(), |rank| rank.to_string()),
            words: bound.words,
            values: format!(
                "± {} to ± {} {}",
                nice::short(bound.present.stated, 3),
                nice::short(bound.improved.stated, 3),
                bound.unit
            ),
            change: &bound.change,
        })
        .collect();
    let all = Row {
        rank: String::new(),
        words: "all together",
        values: format!("every bound times {}", nice::short(report.factor, 3)),
        change: &report.all_together,
    };
    let names = Rect::new(area.left, area.top, area.left + 330.0 * k, area.bottom);
    let middle = names.right + (area.right - names.right) * 0.53;
    let changes = || report.bounds.iter().map(|b| &b.change).chain([&report.all_together]);
    let heads = [
        format!(
            "Gain in the share of the lines with a guaranteed fix within {} m",
            nice::short(report.parameters.required_fix_m, 1)
        ),
        "How much sooner the fix is guaranteed where there was one: mean (and median)".to_owned(),
    ];
    let heads_height = 2.0 * sizes.body().line_px();
    let bars_top = area.top + heads_height + 10.0 * k;
    let axis_room = sizes.small().line_px() + 10.0 * k;
    let gap = 22.0 * k;
    let pitch =
        smaller((area.bottom - axis_room - bars_top - gap) / (rows.len() + 1) as f64, ROW_MOST_PX * k);
    let bottom = bars_top + pitch * (rows.len() + 1) as f64 + gap;
    let panels = [
        Panel::new(
            Rect::new(names.right, bars_top, middle - 36.0 * k, bottom),
            190.0 * k,
            changes().map(|change| 100.0 * change.share_gained),
            "points",
        ),
        Panel::new(
            Rect::new(middle, bars_top, area.right, bottom),
            190.0 * k,
            changes().filter_map(|change| change.sooner_mean_m),
            "m",
        ),
    ];
    for (panel, head) in panels.iter().zip(heads) {
        let lines = text::wrap(&head, sizes.body(), panel.rect.width(), 2);
        sheet.scene.lines((panel.rect.left, area.top), &lines, sizes.body(), INK);
        panel.draw_axis(sheet, bottom);
    }
    let is_first =
        |rank: usize| report.bounds.get(rank).is_some_and(|b| report.verdict.first.contains(&b.bound));
    for (number, row) in rows.iter().enumerate() {
        draw_row(sheet, &panels, &names, bars_top + number as f64 * pitch, pitch, row, is_first(number));
    }
    let top = bars_top + rows.len() as f64 * pitch + gap;
    let rule = Rect::new(area.left, top - gap / 2.0, area.right, top - gap / 2.0 + larger(1.0, 1.5 * k));
    sheet.scene.fill(rule, SOFT_INK);
    draw_row(sheet, &panels, &names, top, pitch, &all, false);
}

fn draw_row(
    sheet: &mut Sheet,
    panels: &[Panel; 2],
    names: &Rect,
    top: f64,
    pitch: f64,
    row: &Row<'_>,
    is_first: bool,
) {
    let (k, sizes) = (sheet.sizes.k, sheet.sizes);
    let left = names.left + 34.0 * k;
    let room = names.right - left - 16.0 * k;
    let font = if is_first || row.rank.is_empty() { sizes.heading() } else { sizes.body() };
    let small = sizes.small();
    // Two lines where there is room for them, else the name alone.
    let is_roomy = pitch >= font.height_px() + small.height_px() + 2.0 * k;
    let height = if is_roomy { font.height_px() + small.height_px() } else { font.height_px() };
    let text_top = top + (pitch - height) / 2.0;
    if !row.rank.is_empty() {
        let colour = if is_first { INK } else { SOFT_INK };
        sheet.scene.text((names.left, text_top), &row.rank, font, colour);
    }
    sheet.scene.text((left, text_top), &text::fit(row.words, font, room), font, INK);
    if is_roomy {
        let values = text::fit(&row.values, small, room);
        sheet.scene.text((left, text_top + font.height_px()), &values, small, SOFT_INK);
    }
    let inset = larger((pitch - 34.0 * k) / 2.0, 2.0 * k);
    let span = (top + inset, top + pitch - inset);
    let change = row.change;
    let gained = 100.0 * change.share_gained;
    let label = format!("+{gained:.1} to {}", per_cent(change.after.within_required_share));
    panels[0].draw_bar(sheet, span, gained, &label, is_first);
    let label = match (change.sooner_mean_m, change.sooner_median_m) {
        (Some(mean_m), Some(median_m)) => format!("{mean_m:.1} m ({median_m:.1} m)"),
        _ => "nothing to compare".to_owned(),
    };
    panels[1].draw_bar(sheet, span, change.sooner_mean_m.unwrap_or(0.0), &label, is_first);
}
