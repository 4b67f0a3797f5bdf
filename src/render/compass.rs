//! Grid north, and where true north lies from it.

use super::colours::{INK, SOFT_INK};
use super::furniture::{MapFrame, Sheet};
use super::scene::{Px, Rect};
use super::text;
use crate::frame::LocalPoint;
use crate::order::larger;

/// Width and height of the arrow, pixels of the reference canvas.
const ARROW_PX: (f64, f64) = (18.0, 37.0);
/// Lean of the true-north stroke where the true angle would not show, degrees. The words give the angle.
const LEAST_LEAN_DEG: f64 = 14.0;
/// Convergence that is written as none, degrees.
const NONE_DEG: f64 = 0.005;

/// An arrow to grid north with its right edge at `right`, and left of it where true north lies; returns the left edge
/// of both.
pub(super) fn draw(sheet: &mut Sheet, frame: &MapFrame, (right, top): Px) -> f64 {
    let (font, k) = (sheet.sizes.small(), sheet.sizes.k);
    let convergence_deg = convergence_deg(frame);
    let rect = Rect::new(right - ARROW_PX.0 * k, top + k, right, top + (ARROW_PX.1 + 1.0) * k);
    arrow(sheet, rect);
    let mut left = rect.left;
    if let Some(degrees) = convergence_deg.filter(|degrees| degrees.abs() >= NONE_DEG) {
        left -= true_north(sheet, rect, degrees);
    }
    left -= text::width("N", font) + 4.0 * k;
    sheet.scene.text((left, rect.top), "N", font, INK);
    if let Some(degrees) = convergence_deg {
        let lines = in_words(degrees);
        let width = lines.iter().map(|line| text::width(line, font)).fold(0.0, larger);
        left -= width + 10.0 * k;
        sheet.scene.lines((left, top), &lines, font, SOFT_INK);
    }
    left
}

/// Grid convergence in the middle of the map, degrees: grid north lies so far clockwise of true north.
fn convergence_deg(frame: &MapFrame) -> Option<f64> {
    let middle: LocalPoint = frame.ground(frame.rect.centre());
    let distortion = frame.earth.as_ref()?.distortion(&[middle]).ok()??;
    Some(distortion.convergence_middle_rad().to_degrees())
}

/// Where true north lies from grid north.
fn in_words(convergence_deg: f64) -> Vec<String> {
    let size = convergence_deg.abs();
    if size < NONE_DEG {
        return vec!["true north is".to_owned(), "grid north".to_owned()];
    }
    let side = if convergence_deg > 0.0 { "west" } else { "east" };
    let figure = if size < 0.095 { format!("{size:.2}") } else { format!("{size:.1}") };
    vec![format!("true north {figure}° {side}"), "of grid north".to_owned()]
}

/// An arrow to grid north, its right half filled.
fn arrow(sheet: &mut Sheet, rect: Rect) {
    let (x, _) = rect.centre();
    let notch = (x, rect.bottom - rect.height() * 0.25);
    sheet.scene.polygon(vec![(x, rect.top), (rect.right, rect.bottom), notch], INK);
    let edge = larger(1.0, 1.5 * sheet.sizes.k);
    sheet.scene.stroke(vec![(x, rect.top), (rect.left, rect.bottom), notch], edge, INK);
}

/// A thin stroke to the side where true north lies; returns how far it reaches beyond the arrow's left edge.
fn true_north(sheet: &mut Sheet, rect: Rect, convergence_deg: f64) -> f64 {
    let k = sheet.sizes.k;
    let lean_deg = larger(convergence_deg.abs(), LEAST_LEAN_DEG).copysign(convergence_deg);
    let (x, _) = rect.centre();
    let foot = (x, rect.bottom - rect.height() * 0.25);
    let (sin, cos) = (libm::sin(lean_deg.to_radians()), libm::cos(lean_deg.to_radians()));
    let length = (foot.1 - rect.top) / larger(cos, 0.7);
    let tip = (foot.0 - length * sin, foot.1 - length * cos);
    sheet.scene.stroke(vec![foot, tip], larger(1.0, 1.2 * k), SOFT_INK);
    larger(0.0, rect.left - tip.0)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::frame::{Frame, GeoPoint};
    use crate::render::furniture::Extent;

    /// East of its meridian, north of the equator, a transverse Mercator grid turns clockwise of true north: true north is
    /// west of grid north. On the sphere the convergence is atan(tan Δλ · sin φ); the ellipsoid changes it by less than
    /// 0.01° at this distance (Snyder 1987, *Map projections: a working manual*, eq. 8-5 gives the sphere).
    #[test]
    fn side_and_size_of_true_north() {
        for (epsg, lat_deg, lon_deg) in
            [(32_631, 56.0, 5.0), (32_631, 56.0, 1.0), (32_756, -33.0, 154.5), (32_756, -33.0, 151.0)]
        {
            let earth = Frame::from_epsg(epsg).unwrap();
            let p = earth.to_local(GeoPoint { lat_deg, lon_deg }).unwrap();
            let extent = Extent {
                west: p.east_m - 10.0,
                east: p.east_m + 10.0,
                south: p.north_m - 10.0,
                north: p.north_m + 10.0,
            };
            let map = MapFrame::showing(extent, Rect::new(0.0, 0.0, 300.0, 300.0), 0.0).on_earth(&earth);
            let meridian: f64 = if epsg == 32_631 { 3.0 } else { 153.0 };
            let expected = ((lon_deg - meridian).to_radians().tan() * lat_deg.to_radians().sin()).atan();
            let found = convergence_deg(&map).unwrap();
            assert!((found - expected.to_degrees()).abs() < 0.01, "{found} {}", expected.to_degrees());
        }
        assert_eq!(in_words(0.64), ["true north 0.6° west", "of grid north"]);
        assert_eq!(in_words(-0.04), ["true north 0.04° east", "of grid north"]);
        assert_eq!(in_words(-0.001), ["true north is", "grid north"]);
    }
}
