//! The working frame: plain local metres, or a projected coordinate system made from its EPSG code.
//!
//! *Frame and units.* Geographic positions are degrees on the datum of the frame; grid positions are metres east and
//! north, whatever axis order the registry lists.
//!
//! *Limits.* A transverse Mercator grid (UTM among them) is used up to 10° from its central meridian and refused
//! beyond; UTM itself stops at 84° N and 80° S. Longitudes 180 and −180 are the same meridian: a site across it works in
//! the zone of its first point. Near the poles a polar stereographic code (EPSG:5041, EPSG:5042) has to be named.
//!
//! *References.* EPSG dataset as packed in the `crs-definitions` crate; formulas of the `proj4rs` crate, checked
//! against published points in `tests/suite/projection.rs`.

use std::fmt;
use std::sync::Arc;

use proj4rs::Proj;

use super::datum::{self, Datum};
use super::{FrameError, GeoPoint, LocalPoint};

/// Farthest a position may lie from the central meridian of a transverse Mercator grid, degrees of longitude.
pub const MERIDIAN_LIMIT_DEG: f64 = 10.0;
/// Distance from the central meridian beyond which a position lies outside its own zone and earns a warning, degrees.
/// A UTM zone reaches 3°; half a degree more covers the overlap that surveys commonly keep (common practice).
pub const MERIDIAN_WARN_DEG: f64 = 3.5;
/// Northern end of UTM, degrees (beyond it the polar stereographic grids take over).
pub const UTM_NORTH_LIMIT_DEG: f64 = 84.0;
/// Southern end of UTM, degrees.
pub const UTM_SOUTH_LIMIT_DEG: f64 = -80.0;

/// A working frame. Cheap to clone.
#[derive(Clone)]
pub struct Frame {
    grid: Option<Arc<Grid>>,
}

/// A projected grid.
struct Grid {
    epsg: Option<u16>,
    name: String,
    datum: Datum,
    proj: Proj,
    /// Longitude and latitude on the same ellipsoid, so that no datum shift is ever applied.
    geographic: Proj,
    /// Central meridian, degrees, for transverse Mercator grids only.
    meridian_deg: Option<f64>,
    is_utm: bool,
}

impl Frame {
    /// Plain local metres, not tied to the Earth.
    pub fn local() -> Self {
        Self { grid: None }
    }

    /// Projected system by EPSG code.
    ///
    /// Accepted are metric grids, axes east and north, on WGS 84 or on a datum that was defined to coincide with it to
    /// within a few metres; [`Frame::datum_statement`] says so for the latter.
    ///
    /// # Errors
    /// An unknown or geographic code, another unit than the metre, or another datum, each with its reason.
    pub fn from_epsg(code: u16) -> Result<Self, FrameError> {
        let def = crs_definitions::from_code(code).ok_or(FrameError::UnknownCode { code })?;
        let name = datum::quoted_after(def.wkt, "PROJCS[").unwrap_or_default().to_owned();
        if !def.wkt.starts_with("PROJCS[") {
            let name = datum::quoted_after(def.wkt, "[").unwrap_or_default().to_owned();
            return Err(FrameError::NotProjected { code, name });
        }
        let datum = Datum::from_wkt(code, &name, def.wkt)?;
        let words: Vec<&str> = def.proj4.split_whitespace().collect();
        let has = |word: &str| words.contains(&word);
        if !has("+units=m") {
            return Err(FrameError::NotMetres { code, name });
        }
        if words.iter().any(|w| w.starts_with("+axis=") && *w != "+axis=enu" || w.starts_with("+pm=")) {
            return Err(FrameError::OddAxes { code, name });
        }
        let is_utm = has("+proj=utm");
        let transverse = is_utm || has("+proj=tmerc") || has("+proj=etmerc");
        let full_name = format!("{name} (EPSG:{code})");
        Self::from_definition(Some(code), full_name, datum, def.proj4, transverse, is_utm)
    }

    /// The UTM zone of a position, with the usual wider zones off south-west Norway and around Svalbard.
    ///
    /// # Errors
    /// A position outside 80° S to 84° N.
    pub fn utm_for(p: GeoPoint) -> Result<Self, FrameError> {
        check_range(p)?;
        if p.lat_deg > UTM_NORTH_LIMIT_DEG || p.lat_deg < UTM_SOUTH_LIMIT_DEG {
            return Err(FrameError::OutsideUtm { lat_deg: p.lat_deg });
        }
        Self::from_epsg(utm_code(p))
    }

    /// A transverse Mercator grid on WGS 84 without false origin: for sites that straddle two zones, and for checks.
    ///
    /// # Errors
    /// A meridian outside ±180° or a scale outside 0.9 to 1.1.
    pub fn transverse_mercator(central_meridian_deg: f64, scale: f64) -> Result<Self, FrameError> {
        if !(-180.0..=180.0).contains(&central_meridian_deg) || !(0.9..=1.1).contains(&scale) {
            return Err(FrameError::Projection {
                name: format!("transverse Mercator about {central_meridian_deg}° with scale {scale}"),
                reason: "the meridian is within ±180° and the scale within 0.9 to 1.1".into(),
            });
        }
        let text = format!(
            "+proj=tmerc +lat_0=0 +lon_0={central_meridian_deg} +k={scale} +x_0=0 +y_0=0 +datum=WGS84 +units=m +no_defs"
        );
        let name = format!("WGS 84 / transverse Mercator about {central_meridian_deg}°, scale {scale}");
        Self::from_definition(None, name, Datum::Wgs84, &text, true, false)
    }

    fn from_definition(
        epsg: Option<u16>,
        name: String,
        datum: Datum,
        definition: &str,
        transverse: bool,
        is_utm: bool,
    ) -> Result<Self, FrameError> {
        let fail =
            |e: proj4rs::errors::Error| FrameError::Projection { name: name.clone(), reason: e.to_string() };
        let proj = Proj::from_proj_string(definition).map_err(fail)?;
        // Same ellipsoid and datum words as the grid: positions stay on the frame's own datum.
        let same = ["+datum=", "+ellps=", "+towgs84=", "+a=", "+b=", "+rf=", "+nadgrids="];
        let ellipsoid = definition
            .split_whitespace()
            .filter(|w| same.iter().any(|s| w.starts_with(s)))
            .collect::<Vec<_>>()
            .join(" ");
        let geographic =
            Proj::from_proj_string(&format!("+proj=longlat {ellipsoid} +no_defs")).map_err(fail)?;
        let meridian_deg = transverse.then(|| (proj.longitude_of_origin().to_degrees() * 1e9).round() / 1e9);
        Ok(Self { grid: Some(Arc::new(Grid { epsg, name, datum, proj, geographic, meridian_deg, is_utm })) })
    }

    /// EPSG code; none for local metres and for grids made without a code.
    pub fn epsg(&self) -> Option<u16> {
        self.grid.as_ref().and_then(|g| g.epsg)
    }

    /// Name in words: `WGS 84 / UTM zone 31N (EPSG:32631)` or `local metres`.
    pub fn name(&self) -> String {
        self.grid.as_ref().map_or_else(|| "local metres".to_owned(), |g| g.name.clone())
    }

    /// Whether the frame is plain local metres.
    pub fn is_local(&self) -> bool {
        self.grid.is_none()
    }

    /// What is assumed about the datum, where it is not WGS 84 itself.
    pub fn datum_statement(&self) -> Option<String> {
        self.grid.as_ref().and_then(|g| g.datum.statement())
    }

    /// Name of the datum; none for local metres.
    pub fn datum_name(&self) -> Option<&'static str> {
        self.grid.as_ref().map(|g| g.datum.name())
    }

    /// Distance from the central meridian, degrees of longitude, for transverse Mercator grids.
    pub fn degrees_from_meridian(&self, p: GeoPoint) -> Option<f64> {
        let meridian = self.grid.as_ref()?.meridian_deg?;
        let difference = (p.lon_deg - meridian).rem_euclid(360.0);
        Some(if difference > 180.0 { 360.0 - difference } else { difference })
    }

    /// Geographic to working frame.
    ///
    /// # Errors
    /// Local metres; a latitude or longitude that does not exist; a position outside the grid's limits.
    pub fn to_local(&self, p: GeoPoint) -> Result<LocalPoint, FrameError> {
        let grid = self.grid.as_ref().ok_or(FrameError::LocalHasNoEarth)?;
        check_range(p)?;
        self.check_limits(p)?;
        let lon_deg = if p.lon_deg > 180.0 { p.lon_deg - 360.0 } else { p.lon_deg };
        let mut xyz = (lon_deg.to_radians(), p.lat_deg.to_radians(), 0.0);
        proj4rs::transform::transform(&grid.geographic, &grid.proj, &mut xyz)
            .map_err(|e| FrameError::Projection { name: grid.name.clone(), reason: e.to_string() })?;
        if !(xyz.0.is_finite() && xyz.1.is_finite()) {
            return Err(FrameError::Projection {
                name: grid.name.clone(),
                reason: "the position has no finite grid value".into(),
            });
        }
        Ok(LocalPoint::new(xyz.0, xyz.1))
    }

    /// Working frame to geographic; an error for local metres.
    ///
    /// # Errors
    /// Local metres; a grid value that belongs to no position or to one outside the grid's limits.
    pub fn to_geo(&self, p: LocalPoint) -> Result<GeoPoint, FrameError> {
        let grid = self.grid.as_ref().ok_or(FrameError::LocalHasNoEarth)?;
        let outside =
            || FrameError::OutsideGrid { name: grid.name.clone(), east_m: p.east_m, north_m: p.north_m };
        let mut xyz = (p.east_m, p.north_m, 0.0);
        proj4rs::transform::transform(&grid.proj, &grid.geographic, &mut xyz).map_err(|_| outside())?;
        let geo = GeoPoint { lat_deg: xyz.1.to_degrees(), lon_deg: xyz.0.to_degrees() };
        if check_range(geo).is_err() {
            return Err(outside());
        }
        self.check_limits(geo)?;
        // Far from a zone the series may return a position that belongs to another grid value: go back and compare.
        let back = self.to_local(geo)?;
        if back.distance_m(p) > ROUND_TRIP_M {
            return Err(outside());
        }
        Ok(geo)
    }

    fn check_limits(&self, p: GeoPoint) -> Result<(), FrameError> {
        let Some(grid) = self.grid.as_ref() else { return Ok(()) };
        if grid.is_utm && (p.lat_deg > UTM_NORTH_LIMIT_DEG || p.lat_deg < UTM_SOUTH_LIMIT_DEG) {
            return Err(FrameError::OutsideUtm { lat_deg: p.lat_deg });
        }
        match self.degrees_from_meridian(p) {
            Some(off_deg) if off_deg > MERIDIAN_LIMIT_DEG => Err(FrameError::FarFromMeridian {
                name: grid.name.clone(),
                off_deg,
                meridian_deg: grid.meridian_deg.unwrap_or_default(),
            }),
            _ => Ok(()),
        }
    }
}

/// Largest difference, metres, between a grid value and itself after going to degrees and back. The formulas agree to
/// far less than 1 mm inside the limits; a larger difference means the value is outside the grid.
const ROUND_TRIP_M: f64 = 1e-3;

fn check_range(p: GeoPoint) -> Result<(), FrameError> {
    if (-90.0..=90.0).contains(&p.lat_deg) && (-180.0..=360.0).contains(&p.lon_deg) {
        Ok(())
    } else {
        Err(FrameError::NotOnEarth { lat_deg: p.lat_deg, lon_deg: p.lon_deg })
    }
}

/// EPSG code of the UTM zone on WGS 84.
fn utm_code(p: GeoPoint) -> u16 {
    let lon = (p.lon_deg + 180.0).rem_euclid(360.0) - 180.0;
    let plain = (((lon + 180.0) / 6.0).floor() as u16).clamp(0, 59) + 1;
    let zone = if (56.0..64.0).contains(&p.lat_deg) && (3.0..12.0).contains(&lon) {
        32
    } else if p.lat_deg >= 72.0 && (0.0..42.0).contains(&lon) {
        match lon {
            l if l < 9.0 => 31,
            l if l < 21.0 => 33,
            l if l < 33.0 => 35,
            _ => 37,
        }
    } else {
        plain
    };
    if p.lat_deg >= 0.0 { 32600 + zone } else { 32700 + zone }
}

impl fmt::Debug for Frame {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_tuple("Frame").field(&self.name()).finish()
    }
}

impl PartialEq for Frame {
    /// Two frames are equal when a grid value means the same position in both.
    fn eq(&self, other: &Self) -> bool {
        self.name() == other.name()
    }
}
