//! The legend: what the colours, the hatch and the marks mean.

use super::classes::{Finding, Quantity, Scale};
use super::colours::{ACCENT, CLASSES, GREY, INK, SOFT_INK};
use super::furniture::Sheet;
use super::nice;
use super::ribbon::Ribbon;
use super::scene::Rect;
use super::text;

/// Draws the legend from `top` down in `column`; returns where it ends.
pub(super) fn draw(
    sheet: &mut Sheet,
    column: Rect,
    top: f64,
    scale: &Scale,
    findings: &[Finding],
    [has_look_alikes, has_regions]: [bool; 2],
) -> f64 {
    let sizes = sheet.sizes;
    let k = sizes.k;
    let (heading, note) = match scale.quantity {
        Quantity::Estimated => (
            "Estimated fix distance, 95th percentile of simulated dives",
            "metres run from a start anywhere in the search area until the position is unambiguous",
        ),
        Quantity::Guaranteed => (
            "Guaranteed fix distance",
            "metres run from a start anywhere in the search area; holds for every error within the bounds",
        ),
    };
    let room = column.width();
    let lines = text::wrap(heading, sizes.heading(), room, 2);
    let mut y = sheet.scene.lines((column.left, top), &lines, sizes.heading(), INK);
    let lines = text::wrap(note, sizes.small(), room, 3);
    y = sheet.scene.lines((column.left, y + 2.0 * k), &lines, sizes.small(), SOFT_INK) + 8.0 * k;

    let pitch = 33.0 * k;
    for class in 0..CLASSES {
        swatch(
            sheet,
            Rect::new(column.left, y, column.right, y + pitch),
            Finding::Class(class),
            &scale.label(class),
        );
        y += pitch;
        if class + 1 == scale.classes_within() {
            y = required_mark(sheet, column, y, scale);
        }
    }
    let mut others = vec![(Finding::NoFix, no_fix_label(scale.quantity))];
    if scale.quantity == Quantity::Estimated {
        others.push((Finding::Undecided, "undecided: cell budget reached"));
    }
    if findings.contains(&Finding::NotScored) {
        others.push((Finding::NotScored, "not scored"));
    }
    for (finding, label) in others {
        swatch(sheet, Rect::new(column.left, y, column.right, y + pitch), finding, label);
        y += pitch;
    }

    let middle = y + pitch / 2.0;
    let side = 5.0 * k;
    sheet.scene.fill(Rect::centred((column.left + swatch_width(k) / 2.0, middle), side, side), GREY);
    let label = text::fit("landmark (its box, where that is larger)", sizes.small(), label_room(column, k));
    let top = middle - sizes.small().height_px() / 2.0;
    sheet.scene.text((label_left(column, k), top), &label, sizes.small(), SOFT_INK);
    y += pitch;
    if has_look_alikes {
        y = mark(sheet, column, y, pitch, "look-alike ground and its number");
    }
    if has_regions {
        y = mark(sheet, column, y, pitch, "remap region (r) and its number");
    }
    y
}

/// The bracket beside marked ground; returns where the row ends.
fn mark(sheet: &mut Sheet, column: Rect, top: f64, pitch: f64, label: &str) -> f64 {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    let middle = top + pitch / 2.0;
    let (left, right) = (column.left + 4.0 * k, column.left + swatch_width(k));
    let points = vec![
        (left, middle - 3.0 * k),
        (left, middle + 1.0 * k),
        (right, middle + 1.0 * k),
        (right, middle - 3.0 * k),
    ];
    sheet.scene.stroke(points, crate::interval::larger(1.0, 1.5 * k), INK);
    let label = text::fit(label, font, label_room(column, k));
    sheet.scene.text((label_left(column, k), middle - font.height_px() / 2.0), &label, font, SOFT_INK);
    top + pitch
}

fn no_fix_label(quantity: Quantity) -> &'static str {
    match quantity {
        Quantity::Estimated => "no fix before line end in over 5 % of dives",
        Quantity::Guaranteed => "no guaranteed fix before the line ends",
    }
}

pub(super) fn swatch_width(k: f64) -> f64 {
    56.0 * k
}

pub(super) fn label_left(column: Rect, k: f64) -> f64 {
    column.left + swatch_width(k) + 12.0 * k
}

pub(super) fn label_room(column: Rect, k: f64) -> f64 {
    column.right - label_left(column, k)
}

/// One row: a piece of ribbon and its label.
pub(super) fn swatch(sheet: &mut Sheet, row: Rect, finding: Finding, label: &str) {
    let sizes = sheet.sizes;
    let k = sizes.k;
    let middle = (row.top + row.bottom) / 2.0;
    let ribbon = Ribbon { width: 20.0 * k, casing: 1.5 * k, hatch: 1.8 * k };
    let points = [(row.left + 2.0 * k, middle), (row.left + swatch_width(k), middle)];
    ribbon.case(&mut sheet.scene, &points);
    ribbon.segment(&mut sheet.scene, &points, finding);
    let font = if matches!(finding, Finding::Class(_)) { sizes.body() } else { sizes.small() };
    let label = text::fit(label, font, label_room(row, k));
    sheet.scene.text((label_left(row, k), middle - font.height_px() / 2.0), &label, font, INK);
}

/// The required distance, in a row of its own between two classes; returns where the row ends.
pub(super) fn required_mark(sheet: &mut Sheet, column: Rect, top: f64, scale: &Scale) -> f64 {
    let (k, font) = (sheet.sizes.k, sheet.sizes.small());
    let bottom = top + font.height_px() + 4.0 * k;
    let middle = (top + bottom) / 2.0;
    let right = column.left + swatch_width(k) + 4.0 * k;
    sheet.scene.fill(Rect::new(column.left - 4.0 * k, middle - 1.5 * k, right, middle + 1.5 * k), ACCENT);
    let label = format!("required fix distance {} m", nice::short(scale.required_m, 2));
    let label = text::fit(&label, font, label_room(column, k));
    sheet.scene.text((label_left(column, k), middle - font.height_px() / 2.0), &label, font, ACCENT);
    bottom
}
