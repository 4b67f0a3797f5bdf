//! What the GeoJSON files share (RFC 7946): positions on WGS 84 to 10⁻⁹ degrees (about 0.1 mm), geometry cut at the 180th
//! meridian, rings by the right-hand rule, and members that say where the file comes from.
//!
//! Files of maps in local metres cannot be written: the format holds longitude and latitude only.

use ::geojson::{
    Feature, FeatureCollection, Geometry, GeometryValue, JsonObject, JsonValue, Position, feature,
};

use super::ExportError;
use super::geojson_cut as cut;
use crate::frame::{GeoPoint, LocalPoint};
use crate::report::Provenance;

/// Longest step between two positions of a line or ring, metres. A straight line of the working grid strays from the
/// straight line between longitudes and latitudes by about length² · tan(latitude) / (8 · Earth radius): by 1 cm at 80°.
const STEP_MAX_M: f64 = 300.0;

/// One GeoJSON file in the making.
#[derive(Clone, Copy, Debug)]
pub(super) struct GeoJsonFile<'a> {
    file: &'static str,
    provenance: &'a Provenance,
}

impl<'a> GeoJsonFile<'a> {
    /// The file called `file` of a report.
    pub(super) fn new(file: &'static str, provenance: &'a Provenance) -> Self {
        Self { file, provenance }
    }

    fn failed(&self, reason: impl ToString) -> ExportError {
        ExportError::Format { file: self.file, reason: reason.to_string() }
    }

    fn geo(&self, p: LocalPoint) -> Result<GeoPoint, ExportError> {
        self.provenance.frame.to_geo(p).map_err(|error| self.failed(error))
    }

    fn all(&self, points: &[LocalPoint]) -> Result<Vec<GeoPoint>, ExportError> {
        points.iter().map(|&p| self.geo(p)).collect()
    }

    /// A `Point`.
    pub(super) fn point(&self, p: LocalPoint) -> Result<GeometryValue, ExportError> {
        Ok(GeometryValue::Point { coordinates: cut::position(self.geo(p)?).into() })
    }

    /// A `MultiPoint`.
    pub(super) fn points(&self, points: &[LocalPoint]) -> Result<GeometryValue, ExportError> {
        let coordinates = self.all(points)?.into_iter().map(|p| cut::position(p).into()).collect();
        Ok(GeometryValue::MultiPoint { coordinates })
    }

    /// A `LineString`; a `MultiLineString` where the line crosses the 180th meridian. Positions are added on long legs.
    pub(super) fn line(&self, points: &[LocalPoint]) -> Result<GeometryValue, ExportError> {
        let mut path = Vec::with_capacity(points.len());
        for leg in points.windows(2) {
            stepped(leg[0], leg[1], &mut path);
        }
        path.extend(points.last());
        self.waypoints(&path)
    }

    /// As [`Self::line`] without added positions: for lines that are read again as waypoints, where a position more would
    /// be a turn.
    pub(super) fn waypoints(&self, points: &[LocalPoint]) -> Result<GeometryValue, ExportError> {
        let mut parts: Vec<Vec<Position>> = cut::line(&self.all(points)?).into_iter().map(written).collect();
        Ok(if parts.len() == 1 {
            GeometryValue::LineString { coordinates: parts.remove(0) }
        } else {
            GeometryValue::MultiLineString { coordinates: parts }
        })
    }

    /// A `Polygon`; a `MultiPolygon` where it crosses the 180th meridian. Corners in order, in either sense, the first
    /// not repeated or repeated. Positions are added on long sides.
    pub(super) fn polygon(
        &self,
        outer: &[LocalPoint],
        holes: &[Vec<LocalPoint>],
    ) -> Result<GeometryValue, ExportError> {
        let outer = self.all(&closed_steps(outer))?;
        let holes = holes.iter().map(|hole| self.all(&closed_steps(hole))).collect::<Result<Vec<_>, _>>()?;
        let mut parts: Vec<Vec<Vec<Position>>> = cut::polygon(&outer, &holes)
            .into_iter()
            .map(|rings| rings.into_iter().map(written).collect())
            .collect();
        Ok(if parts.len() == 1 {
            GeometryValue::Polygon { coordinates: parts.remove(0) }
        } else {
            GeometryValue::MultiPolygon { coordinates: parts }
        })
    }

    /// The whole file: features in their order, beside them where they come from and the members `more`.
    pub(super) fn bytes(&self, features: Vec<Feature>, more: JsonObject) -> Result<Vec<u8>, ExportError> {
        let mut members = self.object(self.provenance)?;
        members.insert("positions".into(), "longitude and latitude, degrees, WGS 84".into());
        if let Some(statement) = self.provenance.frame.datum_statement() {
            members.insert("datum".into(), statement.into());
        }
        members.extend(more);
        let collection = FeatureCollection { bbox: None, features, foreign_members: Some(members) };
        let mut bytes = serde_json::to_vec(&collection).map_err(|error| self.failed(error))?;
        bytes.push(b'\n');
        Ok(bytes)
    }

    /// A value as the members of an object.
    pub(super) fn object(&self, value: &impl serde::Serialize) -> Result<JsonObject, ExportError> {
        match serde_json::to_value(value) {
            Ok(JsonValue::Object(members)) => Ok(members),
            Ok(other) => Err(self.failed(format!("{other} is no object"))),
            Err(error) => Err(self.failed(error)),
        }
    }
}

/// A feature with an optional number as its identifier.
pub(super) fn feature(id: Option<usize>, value: GeometryValue, properties: JsonObject) -> Feature {
    Feature {
        geometry: Some(Geometry::new(value)),
        id: id.map(|id| feature::Id::Number(id.into())),
        properties: Some(properties),
        ..Feature::default()
    }
}

fn written(pairs: Vec<cut::Pair>) -> Vec<Position> {
    pairs.into_iter().map(Position::from).collect()
}

/// Adds `a` and the points between it and `b`, both apart by at most [`STEP_MAX_M`], without `b`.
fn stepped(a: LocalPoint, b: LocalPoint, path: &mut Vec<LocalPoint>) {
    let count = (a.distance_m(b) / STEP_MAX_M).ceil().clamp(1.0, 1e6) as usize;
    path.extend((0..count).map(|k| {
        let t = k as f64 / count as f64;
        LocalPoint::new(a.east_m + t * (b.east_m - a.east_m), a.north_m + t * (b.north_m - a.north_m))
    }));
}

/// A ring with long sides divided, each corner once.
fn closed_steps(corners: &[LocalPoint]) -> Vec<LocalPoint> {
    let corners = match corners {
        [first, rest @ .., last] if !rest.is_empty() && first == last => &corners[..corners.len() - 1],
        _ => corners,
    };
    let mut path = Vec::with_capacity(corners.len());
    for (&a, &b) in corners.iter().zip(corners.iter().cycle().skip(1)) {
        stepped(a, b, &mut path);
    }
    path
}
