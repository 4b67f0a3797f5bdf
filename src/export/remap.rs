//! `remap.json`, `remap.csv`, `remap.geojson` and the table of the regions.

use geojson::{Feature, JsonObject, JsonValue};

use super::geojson::{self as shared, GeoJsonFile};
use super::json::pretty;
use super::table::{add, none, per_cent, plain, printable, short};
use super::{ExportError, Exporter};
use crate::report::{RemapCause, RemapRegion, RemapReport, Resurvey};

/// Columns of `remap.csv` beside those of the causes.
const COLUMNS: [&str; 11] = [
    "region",
    "cause",
    "label_easting_m",
    "label_northing_m",
    "cells",
    "area_km2",
    "survey_margin_m",
    "survey_km2",
    "landmarks_inside",
    "landmarks_surveyed",
    "verdict",
];

/// Columns of the re-survey.
const RESURVEY_COLUMNS: [&str; 11] = [
    "resurvey_factor",
    "resurvey_floor_m",
    "half_width_before_m",
    "half_width_after_m",
    "cures",
    "region_cells_passing",
    "map_cells_passing_before",
    "map_cells_passing_after",
    "gained_km2",
    "gained_share",
    "gained_per_surveyed",
];

/// Writes `remap.json`.
#[derive(Clone, Copy, Debug, Default)]
pub struct RemapJson;

impl Exporter for RemapJson {
    type Report = RemapReport;

    fn file_name(&self) -> &'static str {
        "remap.json"
    }

    fn bytes(&self, report: &RemapReport) -> Result<Vec<u8>, ExportError> {
        pretty(self.file_name(), report)
    }
}

/// Writes `remap.csv`: one row for each region, in the order of the ranking.
#[derive(Clone, Copy, Debug, Default)]
pub struct RemapCsv;

impl Exporter for RemapCsv {
    type Report = RemapReport;

    fn file_name(&self) -> &'static str {
        "remap.csv"
    }

    fn bytes(&self, report: &RemapReport) -> Result<Vec<u8>, ExportError> {
        let mut writer = csv::Writer::from_writer(Vec::new());
        let format = |error: csv::Error| ExportError::Format { file: "remap.csv", reason: error.to_string() };
        let mut header: Vec<String> = COLUMNS.map(str::to_owned).to_vec();
        header.extend(RemapCause::ALL.map(|cause| format!("cells_{}", cause.word().replace('-', "_"))));
        header.extend(RESURVEY_COLUMNS.map(str::to_owned));
        header.push("seed".to_owned());
        writer.write_record(&header).map_err(format)?;
        for region in &report.regions {
            let mut row = vec![
                region.number.to_string(),
                region.cause.word().to_owned(),
                region.label_at.east_m.to_string(),
                region.label_at.north_m.to_string(),
                region.cells.to_string(),
                region.area_km2.to_string(),
                region.survey_margin_m.to_string(),
                region.survey_km2.to_string(),
                region.landmarks_inside.to_string(),
                region.landmarks_surveyed.to_string(),
                region.verdict.clone(),
            ];
            row.extend(RemapCause::ALL.map(|cause| {
                let share = region.causes.iter().find(|share| share.cause == cause);
                share.map_or(0, |share| share.cells).to_string()
            }));
            row.extend(region.resurvey.as_ref().map_or_else(|| vec![String::new(); 11], resurvey_fields));
            row.push(report.provenance.seed.to_string());
            writer.write_record(&row).map_err(format)?;
        }
        writer
            .into_inner()
            .map_err(|error| ExportError::Format { file: "remap.csv", reason: error.to_string() })
    }
}

/// Fields in the order of [`RESURVEY_COLUMNS`].
fn resurvey_fields(resurvey: &Resurvey) -> Vec<String> {
    vec![
        resurvey.factor.to_string(),
        resurvey.floor_m.to_string(),
        resurvey.half_width_before_m.to_string(),
        resurvey.half_width_after_m.to_string(),
        resurvey.cures.to_string(),
        resurvey.region_cells_passing.to_string(),
        resurvey.map_cells_passing_before.to_string(),
        resurvey.map_cells_passing_after.to_string(),
        resurvey.gained_km2.to_string(),
        resurvey.gained_share.to_string(),
        resurvey.gained_per_surveyed.to_string(),
    ]
}

/// Writes `remap.geojson` (RFC 7946, WGS 84): one polygon for each region. Only for dives in a projected grid: the format
/// has no local metres.
#[derive(Clone, Copy, Debug, Default)]
pub struct RemapGeoJson;

impl Exporter for RemapGeoJson {
    type Report = RemapReport;

    fn file_name(&self) -> &'static str {
        "remap.geojson"
    }

    fn bytes(&self, report: &RemapReport) -> Result<Vec<u8>, ExportError> {
        let file = GeoJsonFile::new(self.file_name(), &report.provenance);
        let features =
            report.regions.iter().map(|region| feature(&file, region)).collect::<Result<_, _>>()?;
        let mut members = JsonObject::new();
        members.insert("statement".into(), report.statement.into());
        file.bytes(features, members)
    }
}

fn feature(file: &GeoJsonFile<'_>, region: &RemapRegion) -> Result<Feature, ExportError> {
    let mut properties = JsonObject::new();
    let mut put = |name: &str, value: JsonValue| {
        properties.insert(name.to_owned(), value);
    };
    put("name", format!("{}: {}", region.number, region.cause.in_words()).into());
    put("region", region.number.into());
    put("cause", region.cause.word().into());
    put("verdict", region.verdict.clone().into());
    put("cells", region.cells.into());
    put("area_km2", region.area_km2.into());
    put("survey_km2", region.survey_km2.into());
    put("survey_margin_m", region.survey_margin_m.into());
    put("landmarks_inside", region.landmarks_inside.into());
    put("landmarks_surveyed", region.landmarks_surveyed.into());
    if let Some(resurvey) = &region.resurvey {
        properties.extend(file.object(resurvey)?);
    }
    let outline = &region.outline;
    Ok(shared::feature(Some(region.number), file.polygon(&outline.outer, &outline.holes)?, properties))
}

/// The regions, best gain first, and which of them the candidate lines run over.
pub fn remap_table(report: &RemapReport) -> String {
    let required = short(report.parameters.required_fix_m);
    let header = [
        "region",
        "main cause",
        "of cells %",
        "area km2",
        "margin m",
        "survey km2",
        "landmarks",
        "half-width now m",
        "re-survey to m",
        "cures",
        "gain km2",
        "gain per km2",
    ];
    let mut table = plain(&header.map(str::to_owned), 1);
    for region in &report.regions {
        let resurvey = region.resurvey.as_ref();
        let figure = |of: fn(&Resurvey) -> f64, digits: usize| {
            resurvey.map_or_else(none, |resurvey| format!("{:.digits$}", of(resurvey)))
        };
        let row = vec![
            region.number.to_string(),
            region.cause.in_words().to_owned(),
            per_cent(region.causes[0].share),
            format!("{:.4}", region.area_km2),
            format!("{:.0}", region.survey_margin_m),
            format!("{:.4}", region.survey_km2),
            region.landmarks_surveyed.to_string(),
            figure(|resurvey| resurvey.half_width_before_m, 2),
            figure(|resurvey| resurvey.half_width_after_m, 2),
            resurvey.map_or_else(none, |resurvey| if resurvey.cures { "yes" } else { "no" }.to_owned()),
            figure(|resurvey| resurvey.gained_km2, 4),
            figure(|resurvey| resurvey.gained_per_surveyed, 3),
        ];
        add(&mut table, row, 1);
    }
    let mut text = if report.regions.is_empty() {
        String::from("No region fails the requirement.\n")
    } else {
        format!("{}\n", table.trim_fmt())
    };
    for region in &report.regions {
        text.push_str(&format!("Region {}: {}.\n", region.number, region.verdict));
    }
    text.push_str(&format!(
        "{} of {} cells of {} m fail ({:.3} km2): fewer than {} of {} headings with a guaranteed fix within {required} m.\n",
        report.failing_cells,
        report.cells,
        short(report.options.cell_m),
        report.failing_km2,
        needed(report),
        report.headings,
    ));
    if report.specks > 0 {
        text.push_str(&format!(
            "{} specks ({} cells) of fewer than {} cells are left out.\n",
            report.specks, report.speck_cells, report.options.smallest_region_cells
        ));
    }
    for line in report.lines.iter().filter(|line| !line.stretches.is_empty()) {
        let mut numbers: Vec<usize> = line.stretches.iter().map(|stretch| stretch.region).collect();
        numbers.sort_unstable();
        numbers.dedup();
        let numbers: Vec<String> = numbers.iter().map(usize::to_string).collect();
        text.push_str(&format!(
            "Line {}: {:.0} of {:.0} m over regions {}.\n",
            printable(&line.name),
            line.over_regions_m,
            line.length_m,
            numbers.join(", ")
        ));
    }
    text
}

/// Headings that must pass.
fn needed(report: &RemapReport) -> usize {
    (0..=report.headings)
        .find(|&headings| headings as f64 >= report.options.pass_share * report.headings as f64)
        .unwrap_or(report.headings)
}
