//! `landmarks.geojson`: the map as understood. The properties are named as the columns of a landmark file, so that the file
//! can be read again, with `uncertainty = "bound"`.

use ::geojson::{Feature, JsonObject};

use super::geojson::{GeoJsonFile, feature};
use super::{ExportError, Exporter};
use crate::report::{CONTACT_POSITIONS, LandmarksReport, MapLandmark};

/// Writes `landmarks.geojson` (RFC 7946, WGS 84): one point for each landmark with its identifier and half-widths. Only for
/// dives in a projected grid: the format has no local metres.
#[derive(Clone, Copy, Debug, Default)]
pub struct LandmarksGeoJson;

impl Exporter for LandmarksGeoJson {
    type Report = LandmarksReport;

    fn file_name(&self) -> &'static str {
        "landmarks.geojson"
    }

    fn bytes(&self, report: &LandmarksReport) -> Result<Vec<u8>, ExportError> {
        let file = GeoJsonFile::new(self.file_name(), &report.provenance);
        let features = report.landmarks.iter().map(|landmark| point(&file, landmark));
        let features = features.collect::<Result<_, _>>()?;
        let mut members = JsonObject::new();
        members.insert("contact_positions".into(), CONTACT_POSITIONS.into());
        members.insert("landmark_uncertainty".into(), report.landmark_uncertainty.clone().into());
        members.insert(
            "uncertainties".into(),
            "bounds: half-widths of the box of each landmark, metres of the working grid".into(),
        );
        file.bytes(features, members)
    }
}

fn point(file: &GeoJsonFile<'_>, landmark: &MapLandmark) -> Result<Feature, ExportError> {
    let mut properties = JsonObject::new();
    properties.insert("id".into(), landmark.id.clone().into());
    properties.insert("uncertainty_east_m".into(), landmark.half_width_east_m.into());
    properties.insert("uncertainty_north_m".into(), landmark.half_width_north_m.into());
    properties.insert("easting_m".into(), landmark.position.east_m.into());
    properties.insert("northing_m".into(), landmark.position.north_m.into());
    Ok(feature(None, file.point(landmark.position)?, properties))
}
