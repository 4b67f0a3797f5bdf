//! The chart of profiles, one panel for each line: how far must the vehicle run, depending on where it is lost, and how
//! fast does the number of places fall?
//!
//! Guaranteed figures are drawn through and heavy, estimated ones broken, so that they stay apart in grey print. Where a
//! figure has no value its line is interrupted and its strip above the plot is hatched. All panels have the same scales.
//! A number of places of 0 (no position explains the detections) lies on the lower edge.

use super::classes::{Finding, Scale};
use super::colours::{ACCENT, INK, Rgb, SOFT_INK, WHITE, ramp};
use super::furniture::{Sheet, bounds_in_words};
use super::pattern::Pattern;
use super::plot::{Axis, LineStyle, Plot, Spacing};
use super::scene::{Px, Rect, Scene};
use super::{ChartSize, RenderError, nice, text};
use crate::interval::{larger, smaller};
use crate::report::{Cause, LineReport, LinesReport, SegmentReport};

/// Most panels: more would not be legible on A4.
const PANELS: usize = 6;
/// Share of a panel's width for the fix distance; the rest is for the number of places.
const FIX_SHARE: f64 = 0.64;
/// Height of a strip for missing values, and of the gap between strips, pixels of the reference canvas.
const STRIP_PX: (f64, f64) = (9.0, 3.0);
/// Least number of places on the axis: 1 stands a little above the edge.
const LEAST_PLACES: f64 = 0.8;
/// Distance and width of hatch strokes in the strips, likewise.
const HATCH_PX: (f64, f64) = (7.0, 1.3);

/// Which figure a line of the plot shows.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Figure {
    Guaranteed,
    P95,
    Median,
}

impl Figure {
    fn style(self) -> LineStyle {
        let estimated = ramp()[3];
        match self {
            Self::Guaranteed => LineStyle { colour: INK, width: 3.2, dash: None },
            Self::P95 => LineStyle { colour: estimated, width: 2.2, dash: Some((10.0, 5.0)) },
            Self::Median => LineStyle { colour: estimated, width: 2.2, dash: Some((2.5, 3.5)) },
        }
    }

    fn name(self) -> &'static str {
        match self {
            Self::Guaranteed => "guaranteed",
            Self::P95 => "estimated, 95th percentile",
            Self::Median => "estimated, median",
        }
    }

    fn of(self, segment: &SegmentReport) -> Option<f64> {
        match self {
            Self::Guaranteed => segment.guaranteed.as_ref().and_then(|fix| fix.distance_m),
            Self::P95 => segment.estimated.p95_m.value,
            Self::Median => segment.estimated.median_m.value,
        }
    }

    /// How the strip is filled where the figure is missing; none where it was not computed.
    fn missing(self, segment: &SegmentReport) -> Option<Pattern> {
        match self {
            Self::Guaranteed => match segment.guaranteed.as_ref()?.cause {
                Some(Cause::Undecided) => Some(Pattern::DotsOnGrey),
                _ => Some(Pattern::Falling),
            },
            Self::P95 | Self::Median => match Scale::estimate_missing(segment) {
                Finding::Undecided => Some(Pattern::DotsOnGrey),
                Finding::NotScored => None,
                _ => Some(Pattern::Falling),
            },
        }
    }
}

/// What all panels share.
struct Common {
    figures: Vec<Figure>,
    along: Axis,
    fix: Axis,
    run: Axis,
    places: Axis,
    required_m: f64,
}

/// Lays out the chart.
pub(super) fn scene(report: &LinesReport, size: &ChartSize) -> Result<Scene, RenderError> {
    let mut sheet = Sheet::new(size)?;
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    let mut ranked: Vec<&LineReport> = report.lines.iter().filter(|line| !line.segments.is_empty()).collect();
    ranked.sort_by_key(|line| line.rank);
    if ranked.is_empty() {
        return Err(RenderError::Nothing("no line has a segment"));
    }
    let (shown, rest) = ranked.split_at(if ranked.len() > PANELS { PANELS } else { ranked.len() });
    let common = Common::of(report, shown);
    let title = "How far must the vehicle run, depending on where it is lost?";
    let header = sheet.header(title, &subtitle(report));
    let top = legend(&mut sheet, header + 8.0 * k, &common);
    let bottom = sheet.foot(&report.provenance, &report.parameters, &[draws(report)]);
    let mut area = Rect::new(sheet.inner.left, top + 16.0 * k, sheet.inner.right, bottom - 16.0 * k);
    if let (Some(first), Some(last)) = (rest.first(), rest.last()) {
        let words = match rest.len() {
            1 => format!("1 more line is not drawn (rank {}): see lines.csv", first.rank),
            n => {
                format!("{n} more lines are not drawn (ranks {} to {}): see lines.csv", first.rank, last.rank)
            }
        };
        area.bottom -= font.line_px() + 6.0 * k;
        let words = text::fit(&words, font, area.width());
        sheet.scene.text((area.left, area.bottom + 10.0 * k), &words, font, INK);
    }
    let is_upright = area.height() > area.width();
    let columns = if is_upright || shown.len() <= 3 { 1 } else { 2 };
    let rows = shown.len().div_ceil(columns);
    let (gap_x, gap_y) = (34.0 * k, 14.0 * k);
    let (width, height) = (
        (area.width() - gap_x * (columns - 1) as f64) / columns as f64,
        (area.height() - gap_y * (rows - 1) as f64) / rows as f64,
    );
    for (index, line) in shown.iter().enumerate() {
        let left = area.left + (index % columns) as f64 * (width + gap_x);
        let top = area.top + (index / columns) as f64 * (height + gap_y);
        panel(&mut sheet, Rect::new(left, top, left + width, top + height), line, &common);
    }
    Ok(sheet.scene)
}

fn subtitle(report: &LinesReport) -> String {
    let parameters = &report.parameters;
    let guaranteed = match report.guarantee {
        Some(_) => "Guaranteed: for every error within the bounds. ",
        None => "",
    };
    format!(
        "{guaranteed}Estimated: from simulated dives. Vehicle lost anywhere in the search area; {}",
        bounds_in_words(parameters)
    )
}

fn draws(report: &LinesReport) -> String {
    format!("{} draws per line", report.parameters.draws)
}

impl Common {
    fn of(report: &LinesReport, shown: &[&LineReport]) -> Self {
        let segments = || shown.iter().flat_map(|line| &line.segments);
        let points = || shown.iter().flat_map(|line| &line.profile);
        let mut figures = vec![Figure::P95, Figure::Median];
        if segments().any(|segment| segment.guaranteed.is_some()) {
            figures.insert(0, Figure::Guaranteed);
        }
        let required_m = report.parameters.required_fix_m;
        let values = segments().flat_map(|s| figures.iter().filter_map(|figure| figure.of(s)));
        let most_m = values.fold(1.1 * required_m, larger);
        let longest_m = shown.iter().map(|line| line.length_m).fold(1.0, larger);
        let farthest_m = points().map(|point| point.run_m).fold(1.0, larger);
        let most_places =
            points().flat_map(|point| [point.places_median, point.places_p95]).flatten().fold(10.0, larger);
        let even = |most: f64| Axis { least: 0.0, most, spacing: Spacing::Even };
        Self {
            along: even(longest_m),
            fix: even(nice::round_up(most_m)),
            run: even(farthest_m),
            places: Axis {
                least: LEAST_PLACES,
                most: nice::round_up(most_places),
                spacing: Spacing::Logarithmic,
            },
            required_m,
            figures,
        }
    }
}

/// The panel of one line inside `cell`.
fn panel(sheet: &mut Sheet, cell: Rect, line: &LineReport, common: &Common) {
    let (k, sizes) = (sheet.sizes.k, sheet.sizes);
    let font = sizes.small();
    let rank = sheet.scene.text((cell.left, cell.top), &format!("{}", line.rank), sizes.body(), SOFT_INK);
    let name_left = rank.right + 14.0 * k;
    let name = text::fit(&text::printable(&line.name), sizes.heading(), cell.right - name_left);
    sheet.scene.text((name_left, cell.top), &name, sizes.heading(), INK);
    let mut top = cell.top + sizes.heading().line_px();
    let words = text::fit(&in_words(line, common), font, cell.width());
    sheet.scene.text((cell.left, top), &words, font, SOFT_INK);
    top += font.line_px();
    let strips = common.figures.len() as f64 * (STRIP_PX.0 + STRIP_PX.1) * k + STRIP_PX.1 * k;
    let rect =
        Rect { top: top + font.line_px() + strips, bottom: cell.bottom - font.height_px() - 8.0 * k, ..cell };
    let split = cell.left + cell.width() * FIX_SHARE;
    let mut fix = Plot { rect: Rect { right: split, ..rect }, x: common.along, y: common.fix };
    let label = nice::short(common.required_m, 1);
    fix.rect.left +=
        larger(fix.gutter(font, k), larger(text::width("none", font), text::width(&label, font)) + 11.0 * k);
    let name = text::fit("fix distance, m, by distance along the line, m", font, split - fix.rect.left);
    sheet.scene.text((fix.rect.left, top), &name, font, INK);
    draw_fix(sheet, &fix, line, common, strips);

    let mut places = Plot { rect, x: common.run, y: common.places };
    // The strips of the other plot have no counterpart here.
    places.rect.top -= strips;
    places.rect.left = split + 30.0 * k;
    places.rect.left += places.gutter(font, k);
    places.rect.right -= 18.0 * k;
    let name = text::fit("places left, by metres run", font, cell.right - places.rect.left);
    sheet.scene.text((places.rect.left, top), &name, font, INK);
    draw_places(sheet, &places, line);
}

/// The line's shares in words.
fn in_words(line: &LineReport, common: &Common) -> String {
    let required = nice::short(common.required_m, 1);
    let per_cent = |share: f64| nice::short(100.0 * share, 1);
    let mut pieces: Vec<String> = Vec::new();
    if let Some(guaranteed) = &line.guaranteed {
        let share = per_cent(guaranteed.within_required_share);
        pieces.push(format!("guaranteed on {share} % of the line"));
    }
    if let Some(share) = line.estimated.within_required_share.value {
        pieces.push(format!("estimated in {} % of runs", per_cent(share)));
    }
    format!("fix within {required} m: {}", pieces.join(", "))
}

fn draw_fix(sheet: &mut Sheet, plot: &Plot, line: &LineReport, common: &Common, strips: f64) {
    let k = sheet.sizes.k;
    plot.draw_ground(sheet);
    let Rect { left, top, right, .. } = plot.rect;
    let (_, required) = plot.px(0.0, common.required_m);
    sheet.scene.fill(Rect::new(left, required - k, right, required + larger(1.0, k)), ACCENT);
    // The least certain first, so that the guarantee lies on top.
    for &figure in common.figures.iter().rev() {
        for path in steps(plot, line, figure) {
            figure.style().draw(&mut sheet.scene, &path, k);
        }
    }
    for (index, &figure) in common.figures.iter().enumerate() {
        let strip_top = top - strips + (index as f64 * (STRIP_PX.0 + STRIP_PX.1) + STRIP_PX.1) * k;
        draw_strip(sheet, plot, line, figure, (strip_top, strip_top + STRIP_PX.0 * k));
    }
    plot.draw_edges(sheet, Some(required));
    plot.label_left(sheet, required, &nice::short(common.required_m, 1), ACCENT);
    // Clear of a label at the plot's upper end.
    let beside = larger(strips / 2.0 + 2.0 * k, sheet.sizes.small().line_px());
    plot.label_left(sheet, top - beside, "none", INK);
}

/// The strip in which a figure is hatched where it has no value.
fn draw_strip(sheet: &mut Sheet, plot: &Plot, line: &LineReport, figure: Figure, (top, bottom): (f64, f64)) {
    let k = sheet.sizes.k;
    let same = |a: &SegmentReport, b: &SegmentReport| pattern_of(figure, a) == pattern_of(figure, b);
    for run in line.segments.chunk_by(same) {
        let (Some(first), Some(last)) = (run.first(), run.last()) else { continue };
        let Some(pattern) = pattern_of(figure, first) else { continue };
        let (left, _) = plot.px(first.start_m, 0.0);
        let (right, _) = plot.px(last.end_m, 0.0);
        let rect = Rect::new(left, top, larger(right, left + 2.0 * k), bottom);
        sheet.scene.fill(rect, WHITE);
        pattern.fill(&mut sheet.scene, rect, HATCH_PX.0 * k, larger(1.0, HATCH_PX.1 * k));
        sheet.scene.outline(rect, larger(1.0, k), figure.style().colour);
    }
}

/// What fills the strip of `figure` over a segment; none where the figure has a value.
fn pattern_of(figure: Figure, segment: &SegmentReport) -> Option<Pattern> {
    if figure.of(segment).is_some() { None } else { figure.missing(segment) }
}

/// The stepped lines of a figure, one for each stretch that has values.
fn steps(plot: &Plot, line: &LineReport, figure: Figure) -> Vec<Vec<Px>> {
    let runs = line.segments.chunk_by(|a, b| figure.of(a).is_some() == figure.of(b).is_some());
    runs.filter_map(|run| {
        let path: Vec<Px> = run
            .iter()
            .filter_map(|segment| Some((segment, figure.of(segment)?)))
            .flat_map(|(segment, value)| [plot.px(segment.start_m, value), plot.px(segment.end_m, value)])
            .collect();
        (!path.is_empty()).then_some(path)
    })
    .collect()
}

fn draw_places(sheet: &mut Sheet, plot: &Plot, line: &LineReport) {
    plot.draw_ground(sheet);
    for figure in [Figure::Median, Figure::P95] {
        let of = |index: usize| {
            let point = &line.profile[index];
            let value = if figure == Figure::Median { point.places_median } else { point.places_p95 };
            value.map(|value| plot.px(point.run_m, value))
        };
        let points: Vec<Option<Px>> = (0..line.profile.len()).map(of).collect();
        for run in points.chunk_by(|a, b| a.is_some() == b.is_some()) {
            let path: Vec<Px> = run.iter().flatten().copied().collect();
            if path.len() > 1 {
                figure.style().draw(&mut sheet.scene, &path, sheet.sizes.k);
            }
        }
    }
    plot.draw_edges(sheet, None);
}

/// A sample and what it means.
enum Sample {
    Line(LineStyle),
    Strip(Pattern),
}

/// What the lines and strips mean, in rows; returns where they end.
fn legend(sheet: &mut Sheet, top: f64, common: &Common) -> f64 {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    let mut entries: Vec<(Sample, String, Rgb)> = common
        .figures
        .iter()
        .map(|figure| (Sample::Line(figure.style()), figure.name().to_owned(), INK))
        .collect();
    let required = LineStyle { colour: ACCENT, width: 2.0, dash: None };
    let words = format!("required fix distance {} m", nice::short(common.required_m, 2));
    entries.push((Sample::Line(required), words, ACCENT));
    let order = match common.figures.len() {
        3 => "guaranteed, 95th percentile, median",
        _ => "95th percentile, median",
    };
    let words = format!("none before the line ends (strips from above: {order})");
    entries.push((Sample::Strip(Pattern::Falling), words, INK));
    entries.push((Sample::Strip(Pattern::DotsOnGrey), "undecided: cell budget reached".to_owned(), INK));
    let (swatch, gap) = (46.0 * k, 28.0 * k);
    let (mut left, mut y) = (sheet.inner.left, top);
    for (sample, words, colour) in entries {
        let width = swatch + 8.0 * k + text::width(&words, font);
        if left > sheet.inner.left && left + width > sheet.inner.right {
            (left, y) = (sheet.inner.left, y + font.line_px() + 3.0 * k);
        }
        let middle = y + font.height_px() / 2.0;
        match sample {
            Sample::Line(style) => {
                style.draw(&mut sheet.scene, &[(left, middle), (left + swatch, middle)], k);
            }
            Sample::Strip(pattern) => {
                let rect = Rect::centred((left + swatch / 2.0, middle), swatch, STRIP_PX.0 * k);
                pattern.fill(&mut sheet.scene, rect, HATCH_PX.0 * k, larger(1.0, HATCH_PX.1 * k));
                sheet.scene.outline(rect, larger(1.0, k), INK);
            }
        }
        let room = larger(0.0, sheet.inner.right - left - swatch - 8.0 * k);
        let words = text::fit(&words, font, room);
        left = sheet.scene.text((left + swatch + 8.0 * k, y), &words, font, colour).right + gap;
    }
    smaller(y + font.height_px(), sheet.inner.bottom)
}
