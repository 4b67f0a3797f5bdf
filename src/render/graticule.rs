//! Latitude and longitude along two edges of a map frame: where meridians cross its upper edge and parallels its right
//! edge.
//!
//! *Units.* Angles are whole ten-thousandths of a minute, so that steps and labels are exact; positions along an edge are
//! pixels from its start.
//!
//! *Method.* A grid is not aligned with meridians and parallels, so nothing is interpolated: along the edge the frame's
//! inverse projection gives the angle, and each crossing is found by halving an interval that holds it. Longitudes are
//! followed along the edge without a jump at 180°, which is therefore crossed once.

use super::furniture::MapFrame;
use super::text::{self, Font};
use crate::frame::{GeoPoint, LocalPoint};
use crate::order::{larger, smaller};

/// Units in a degree.
const PER_DEGREE: i64 = 600_000;
/// Units in a minute.
const PER_MINUTE: i64 = 10_000;
/// Steps of the labels: 1, 2, 5 below ten minutes, then divisions of a degree, then degrees.
const STEPS: [i64; 21] = [
    5, 10, 20, 50, 100, 200, 500, 1_000, 2_000, 5_000, 10_000, 20_000, 50_000, 100_000, 150_000, 300_000,
    600_000, 1_200_000, 3_000_000, 6_000_000, 9_000_000,
];
/// Pieces into which an edge is cut before crossings are looked for; in each the angle must not turn back.
const PIECES: usize = 32;
/// Halvings of a piece: a piece of 1000 pixels ends far below a thousandth of a pixel.
const HALVINGS: usize = 40;
/// Room between labels over their width, along the upper edge.
const SPACING: f64 = 1.5;
/// Room between labels over the size of the type, along the right edge.
const ROWS: f64 = 6.0;

/// A meridian or parallel at an edge: where, and what it is called.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Crossing {
    /// Pixels of the canvas: x on the upper edge, y on the right edge.
    pub(super) at: f64,
    /// Such as `55°42.5′N`.
    pub(super) label: String,
}

/// Which angle is read along an edge.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Angle {
    Longitude,
    Latitude,
}

impl Angle {
    fn of(self, p: GeoPoint) -> f64 {
        let degrees = match self {
            Self::Longitude => p.lon_deg,
            Self::Latitude => p.lat_deg,
        };
        degrees * PER_DEGREE as f64
    }

    /// The label of `value`, with the decimals of a minute that `step` needs.
    fn label(self, value: i64, step: i64) -> String {
        let turn = 360 * PER_DEGREE;
        let whole = value.rem_euclid(turn);
        let value = if whole > turn / 2 { whole - turn } else { whole };
        let letter = match (self, value.signum()) {
            // On the equator, the zero meridian and the 180th there is nothing to tell.
            (_, 0) => "",
            (Self::Longitude, _) if value == turn / 2 => "",
            (Self::Longitude, 1) => "E",
            (Self::Longitude, _) => "W",
            (Self::Latitude, 1) => "N",
            (Self::Latitude, _) => "S",
        };
        let (degrees, rest) = (value.abs() / PER_DEGREE, value.abs() % PER_DEGREE);
        let (minutes, fraction) = (rest / PER_MINUTE, rest % PER_MINUTE);
        let decimals = (1..=4).find(|&n| step % 10_i64.pow(4 - n) == 0).unwrap_or(4);
        if step % PER_MINUTE == 0 {
            format!("{degrees}°{minutes:02}′{letter}")
        } else {
            let fraction = format!("{fraction:04}");
            format!("{degrees}°{minutes:02}.{}′{letter}", &fraction[..decimals as usize])
        }
    }
}

/// An edge of a frame, and the angle that is read along it.
struct Edge<'a> {
    frame: &'a MapFrame,
    angle: Angle,
}

impl Edge<'_> {
    fn length(&self) -> f64 {
        match self.angle {
            Angle::Longitude => self.frame.rect.width(),
            Angle::Latitude => self.frame.rect.height(),
        }
    }

    /// The angle `along` pixels from the start of the edge: the left end of the upper edge, the upper end of the right.
    fn value(&self, along: f64) -> Option<f64> {
        let rect = self.frame.rect;
        let px = match self.angle {
            Angle::Longitude => (rect.left + along, rect.top),
            Angle::Latitude => (rect.right, rect.top + along),
        };
        let ground: LocalPoint = self.frame.ground(px);
        let position = self.frame.earth.as_ref()?.to_geo(ground).ok()?;
        Some(self.angle.of(position))
    }

    /// Places along the edge and the angles there, followed from one to the next without a jump.
    fn samples(&self) -> Option<Vec<(f64, f64)>> {
        let mut samples: Vec<(f64, f64)> = Vec::with_capacity(PIECES + 1);
        for piece in 0..=PIECES {
            let along = self.length() * piece as f64 / PIECES as f64;
            let value = self.value(along)?;
            let before = samples.last().map_or(value, |&(_, before)| before);
            samples.push((along, beside(value, before)));
        }
        Some(samples)
    }

    /// The place in the piece from `from` to `to` where the angle is `wanted`.
    fn solve(&self, from: (f64, f64), to: (f64, f64), wanted: f64) -> Option<f64> {
        let (mut low, mut high) = (from.0, to.0);
        let rises = to.1 > from.1;
        for _ in 0..HALVINGS {
            let middle = 0.5 * (low + high);
            let value = beside(self.value(middle)?, from.1);
            if (value < wanted) == rises {
                low = middle;
            } else {
                high = middle;
            }
        }
        Some(0.5 * (low + high))
    }

    /// Every multiple of the smallest step whose labels keep clear of each other.
    fn crossings(&self, font: Font) -> Vec<Crossing> {
        let Some(samples) = self.samples() else { return Vec::new() };
        let start = match self.angle {
            Angle::Longitude => self.frame.rect.left,
            Angle::Latitude => self.frame.rect.top,
        };
        let Some(step) = self.step(&samples, font) else { return Vec::new() };
        let mut found = Vec::new();
        for (index, pair) in samples.windows(2).enumerate() {
            let (from, to) = (pair[0], pair[1]);
            let (least, most) = (smaller(from.1, to.1), larger(from.1, to.1));
            let first = libm::ceil(least / step as f64) as i64;
            let last = libm::floor(most / step as f64) as i64;
            for multiple in first..=last {
                let wanted = (multiple * step) as f64;
                // A crossing where two pieces meet belongs to the first of them.
                if index > 0 && wanted == from.1 {
                    continue;
                }
                if let Some(along) = self.solve(from, to, wanted) {
                    found
                        .push(Crossing { at: start + along, label: self.angle.label(multiple * step, step) });
                }
            }
        }
        found
    }

    fn step(&self, samples: &[(f64, f64)], font: Font) -> Option<i64> {
        let per_px =
            samples.windows(2).map(|w| (w[1].1 - w[0].1).abs() / (w[1].0 - w[0].0)).fold(0.0, larger);
        STEPS.into_iter().find(|&step| {
            let room = match self.angle {
                Angle::Longitude => {
                    let width = |&(_, value): &(f64, f64)| {
                        let multiple = libm::round(value / step as f64) as i64 * step;
                        text::width(&self.angle.label(multiple, step), font)
                    };
                    let ends = [samples.first(), samples.last()];
                    SPACING * ends.into_iter().flatten().map(width).fold(0.0, larger)
                }
                Angle::Latitude => ROWS * font.em_px,
            };
            step as f64 >= per_px * room
        })
    }
}

/// `value`, whole turns added so that it lies beside `reference`.
fn beside(value: f64, reference: f64) -> f64 {
    let turn = (360 * PER_DEGREE) as f64;
    value + turn * libm::round((reference - value) / turn)
}

/// Where meridians cross the upper edge of `frame`; none for local metres.
pub(super) fn meridians(frame: &MapFrame, font: Font) -> Vec<Crossing> {
    Edge { frame, angle: Angle::Longitude }.crossings(font)
}

/// Where parallels cross the right edge of `frame`; none for local metres.
pub(super) fn parallels(frame: &MapFrame, font: Font) -> Vec<Crossing> {
    Edge { frame, angle: Angle::Latitude }.crossings(font)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::frame::Frame;
    use crate::render::furniture::Extent;
    use crate::render::scene::Rect;

    const FONT: Font = Font { em_px: 16.0, bold: false };

    fn frame(epsg: u16, middle: GeoPoint, width_m: f64) -> MapFrame {
        let earth = Frame::from_epsg(epsg).unwrap();
        let p = earth.to_local(middle).unwrap();
        let (half, tall) = (width_m / 2.0, width_m / 3.0);
        let extent = Extent {
            west: p.east_m - half,
            east: p.east_m + half,
            south: p.north_m - tall,
            north: p.north_m + tall,
        };
        MapFrame::showing(extent, Rect::new(100.0, 50.0, 1300.0, 850.0), 0.0).on_earth(&earth)
    }

    /// Degrees of a label, read back.
    fn degrees(label: &str) -> f64 {
        let (degrees, rest) = label.split_once('°').unwrap();
        let (minutes, letter) = rest.split_once('′').unwrap();
        let value = degrees.parse::<f64>().unwrap() + minutes.parse::<f64>().unwrap() / 60.0;
        if letter == "S" || letter == "W" { -value } else { value }
    }

    /// The projection run the other way: the position that the label names, on that meridian or parallel, lies on the
    /// edge where the tick is drawn, to a tenth of a pixel.
    #[test]
    fn ticks_stand_where_the_forward_projection_puts_them() {
        let at = |lat_deg, lon_deg| GeoPoint { lat_deg, lon_deg };
        for (epsg, middle) in [
            (32_631, at(56.2, 3.2)),
            (32_631, at(56.2, 5.9)),
            (32_756, at(-33.9, 151.3)),
            (32_660, at(-0.01, 179.9995)),
            (32_760, at(-17.0, 179.99)),
            (5_041, at(86.0, -130.0)),
        ] {
            for width_m in [40.0, 900.0, 2_500.0, 30_000.0, 90_000.0] {
                let map = frame(epsg, middle, width_m);
                let earth = map.earth.clone().unwrap();
                for (is_top, ticks) in [(true, meridians(&map, FONT)), (false, parallels(&map, FONT))] {
                    assert!(ticks.len() >= 2, "{epsg} {middle:?} {width_m}: {ticks:?}");
                    let edge = |at: f64| if is_top { (at, map.rect.top) } else { (map.rect.right, at) };
                    for tick in &ticks {
                        let found = earth.to_geo(map.ground(edge(tick.at))).unwrap();
                        let named = match is_top {
                            true => GeoPoint { lon_deg: degrees(&tick.label), ..found },
                            false => GeoPoint { lat_deg: degrees(&tick.label), ..found },
                        };
                        let drawn = map.px(earth.to_local(named).unwrap());
                        let off = libm::hypot(drawn.0 - edge(tick.at).0, drawn.1 - edge(tick.at).1);
                        assert!(off < 0.1, "{epsg} {tick:?}: {off} px");
                    }
                    let mut labels: Vec<&str> = ticks.iter().map(|tick| tick.label.as_str()).collect();
                    labels.sort_unstable();
                    labels.dedup();
                    assert_eq!(labels.len(), ticks.len(), "each once");
                }
            }
        }
    }

    #[test]
    fn the_antimeridian_is_named_once_and_letters_change_there() {
        let map = frame(32_660, GeoPoint { lat_deg: -17.0, lon_deg: 180.0 }, 9_000.0);
        let labels: Vec<String> = meridians(&map, FONT).into_iter().map(|tick| tick.label).collect();
        let middle = labels.iter().position(|label| label == "180°00′").expect("180° is a tick");
        assert_eq!(labels.iter().filter(|label| label.starts_with("180")).count(), 1, "{labels:?}");
        assert!(labels[..middle].iter().all(|label| label.starts_with("179°") && label.ends_with('E')));
        assert!(labels[middle + 1..].iter().all(|label| label.starts_with("179°") && label.ends_with('W')));
        assert!(parallels(&map, FONT).iter().all(|tick| tick.label.ends_with('S')));
    }

    #[test]
    fn labels_have_the_decimals_of_their_step() {
        let lat = |value, step| Angle::Latitude.label(value, step);
        assert_eq!(lat(55 * PER_DEGREE + 425_000, 5_000), "55°42.5′N");
        assert_eq!(lat(-(PER_DEGREE + 25_000), 1_000), "1°02.5′S");
        assert_eq!(lat(55 * PER_DEGREE + 5, 5), "55°00.0005′N");
        assert_eq!(lat(0, 20_000), "0°00′");
        assert_eq!(Angle::Longitude.label(-180 * PER_DEGREE - 10_000, 10_000), "179°59′E");
        assert_eq!(Angle::Longitude.label(3 * PER_DEGREE + 1_250, 50), "3°00.125′E");
    }

    #[test]
    fn local_metres_have_no_latitude() {
        let extent = Extent { west: 0.0, south: 0.0, east: 100.0, north: 100.0 };
        let rect = Rect::new(0.0, 0.0, 500.0, 500.0);
        let map = MapFrame::showing(extent, rect, 0.0).on_earth(&Frame::local());
        assert!(meridians(&map, FONT).is_empty() && parallels(&map, FONT).is_empty());
    }
}
