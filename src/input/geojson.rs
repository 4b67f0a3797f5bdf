//! GeoJSON (RFC 7946): features one by one, so that a bad one is named and the others are still read.

use ::geojson::{Feature, Geometry, JsonObject, JsonValue, Position};

use super::strict_json::Strict;
use super::{BadRows, InputText};
use crate::frame::Crs;
use crate::problem::{Findings, Problem};

/// One feature with its number in the file, from 1.
#[derive(Debug)]
pub struct NumberedFeature {
    /// Number, from 1.
    pub number: usize,
    /// The feature.
    pub feature: Feature,
}

/// The features of a file and the coordinate system it states, if any.
#[derive(Debug)]
pub struct Features {
    /// Sound features, in file order.
    pub list: Vec<NumberedFeature>,
    /// Those that are not.
    pub faulty: BadRows,
    /// The `crs` member, which RFC 7946 has dropped but GIS programs still write.
    pub crs: Option<Crs>,
}

/// Splits a file into features. None, with findings, when it is no GeoJSON at all.
pub fn read(input: &InputText, findings: &mut Findings) -> Option<Features> {
    let file = input.name.as_path();
    let value = match serde_json::from_str(&input.text) {
        Ok(Strict(value)) => value,
        Err(e) => {
            findings.problem(
                Problem::new(file, format!("is not valid JSON: {e}"))
                    .line(e.line() as u64)
                    .place(format!("character {}", e.column()))
                    .accepted("GeoJSON (RFC 7946)"),
            );
            return None;
        }
    };
    let not_geojson = |what: String| {
        Problem::new(file, what).accepted("a GeoJSON FeatureCollection, Feature or geometry (RFC 7946)")
    };
    let JsonValue::Object(mut object) = value else {
        findings.problem(not_geojson("is JSON but not a GeoJSON object".into()));
        return None;
    };
    let crs = match stated_crs(&object) {
        Ok(crs) => crs,
        Err(why) => {
            findings.problem(Problem::new(file, why).place("member crs").advice(
                "remove the member if the coordinates are WGS 84 longitude and latitude, or state a usable code",
            ));
            return None;
        }
    };
    let kind = object.get("type").and_then(JsonValue::as_str).unwrap_or("").to_owned();
    let mut faulty = BadRows::default();
    let mut list = Vec::new();
    match kind.as_str() {
        "FeatureCollection" => {
            let Some(JsonValue::Array(items)) = object.remove("features") else {
                findings.problem(not_geojson("the FeatureCollection has no list \"features\"".into()));
                return None;
            };
            for (i, item) in items.into_iter().enumerate() {
                match serde_json::from_value::<Feature>(item) {
                    Ok(feature) => list.push(NumberedFeature { number: i + 1, feature }),
                    Err(e) => faulty.add([not_geojson(e.to_string()).place(format!("feature {}", i + 1))]),
                }
            }
        }
        "Feature" => match serde_json::from_value::<Feature>(object.into()) {
            Ok(feature) => list.push(NumberedFeature { number: 1, feature }),
            Err(e) => faulty.add([not_geojson(e.to_string()).place("feature 1")]),
        },
        "" => {
            findings.problem(not_geojson("has no member \"type\"".into()));
            return None;
        }
        _ => match serde_json::from_value::<Geometry>(object.into()) {
            Ok(geometry) => list.push(NumberedFeature { number: 1, feature: Feature::from(geometry) }),
            Err(e) => faulty.add([not_geojson(e.to_string())]),
        },
    }
    Some(Features { list, faulty, crs })
}

/// The coordinate system in which to read the file: what the file states, what the dive file states, or the default.
/// None, with a finding, when the first two differ.
pub fn settle_crs(
    input: &InputText,
    in_file: Option<Crs>,
    declared: Option<&Crs>,
    default: Crs,
    findings: &mut Findings,
) -> Option<Crs> {
    match (in_file, declared) {
        (Some(own), Some(said)) if own != *said && own.name() != said.name() => {
            findings.problem(
                Problem::new(
                    &input.name,
                    format!("the file says {}, the dive file says {}", own.name(), said.name()),
                )
                .place("member crs")
                .advice("make them agree"),
            );
            None
        }
        (own, said) => Some(own.or_else(|| said.cloned()).unwrap_or(default)),
    }
}

fn stated_crs(object: &JsonObject) -> Result<Option<Crs>, String> {
    let Some(member) = object.get("crs").filter(|v| !v.is_null()) else { return Ok(None) };
    let name = member
        .pointer("/properties/name")
        .and_then(JsonValue::as_str)
        .ok_or_else(|| format!("{member} names no coordinate system"))?;
    if name.to_ascii_uppercase().ends_with("CRS84") {
        return Ok(Some(Crs::wgs84()));
    }
    let code = name.rsplit(':').next().unwrap_or("");
    if !name.to_ascii_uppercase().contains("EPSG") {
        return Err(format!("\"{name}\" is no EPSG code"));
    }
    Crs::parse(&format!("EPSG:{code}")).map(Some).map_err(|e| e.to_string())
}

/// Text of a property that may be written as text or as a number.
pub fn text_property(feature: &Feature, names: &[&str]) -> Option<String> {
    names.iter().find_map(|n| match feature.property(n) {
        Some(JsonValue::String(s)) if !s.trim().is_empty() => Some(s.trim().to_owned()),
        Some(JsonValue::Number(x)) => Some(x.to_string()),
        _ => None,
    })
}

/// The identifier of a feature: its `id` member.
pub fn feature_id(feature: &Feature) -> Option<String> {
    feature.id.as_ref().map(|id| match id {
        ::geojson::feature::Id::String(s) => s.clone(),
        ::geojson::feature::Id::Number(n) => n.to_string(),
    })
}

/// First two numbers of a position, if it has them.
pub fn xy(position: &Position) -> Option<(f64, f64)> {
    match position.as_slice() {
        [x, y, ..] => Some((*x, *y)),
        _ => None,
    }
}
