//! `area.tif`: the area map as a GeoTIFF, one band for each figure.
//!
//! *No value.* "No data" (not-a-number) means outside the search area, in every band alike. Inside it, a distance or heading
//! that does not exist because no fix is guaranteed is written as [`NONE_CODE`]: larger than any distance, so that "at most
//! 450 m" is answered rightly cell by cell, and visible on a map, where a gap could be taken for ground that nobody asked
//! about. The last two bands count the headings concerned.

use super::geotiff::{Band, geotiff, pixel_of};
use super::{ExportError, Exporter};
use crate::report::{AREA_STATEMENT, AreaCell, AreaReport};

/// Stands in `area.tif` where no fix is guaranteed. The longest run that can be asked for is a tenth of it.
pub const NONE_CODE: f64 = 1_000_000.0;

/// The bands, named as the columns of `area.csv`.
const BANDS: [Band; 7] = [
    Band { name: "guaranteed_worst_fix_m", unit: "m" },
    Band { name: "guaranteed_best_fix_m", unit: "m" },
    Band { name: "best_heading_deg", unit: "degree" },
    Band { name: "guaranteed_median_fix_m", unit: "m" },
    Band { name: "within_required_share", unit: "" },
    Band { name: "headings_without_fix", unit: "" },
    Band { name: "undecided", unit: "" },
];

/// The figures of a cell in the order of [`BANDS`].
fn figures(report: &AreaReport, cell: &AreaCell) -> [f64; BANDS.len()] {
    let or_none = |value: Option<f64>| value.unwrap_or(NONE_CODE);
    [
        or_none(cell.worst_m),
        or_none(cell.best_m),
        or_none(cell.best_heading.map(|heading| report.headings_deg[heading])),
        or_none(cell.median_m),
        cell.within_required_share,
        f64::from(cell.no_fix.total()),
        f64::from(cell.no_fix.undecided),
    ]
}

/// Writes `area.tif`.
#[derive(Clone, Copy, Debug, Default)]
pub struct AreaTiff;

impl Exporter for AreaTiff {
    type Report = AreaReport;

    fn file_name(&self) -> &'static str {
        "area.tif"
    }

    fn bytes(&self, report: &AreaReport) -> Result<Vec<u8>, ExportError> {
        let grid = &report.grid;
        let mut pixels = vec![f64::NAN; grid.columns * grid.rows * BANDS.len()];
        for cell in &report.cells {
            let at = pixel_of(grid, BANDS.len(), cell.column, cell.row);
            pixels[at..at + BANDS.len()].copy_from_slice(&figures(report, cell));
        }
        let provenance = &report.provenance;
        let inputs: Vec<String> =
            provenance.inputs.iter().map(|input| format!("{} {}", input.name, input.sha256)).collect();
        let items = [
            ("DIVE", provenance.dive.clone()),
            ("CAUTION", provenance.caution.to_owned()),
            ("STATEMENT", AREA_STATEMENT.to_owned()),
            (
                "NO_DATA",
                format!(
                    "not-a-number: outside the search area. {NONE_CODE} in bands 1 to 4: inside it, and no fix is \
                     guaranteed on that heading or share of headings"
                ),
            ),
            ("COORDINATE_SYSTEM", provenance.coordinate_system.clone()),
            ("HEADINGS", report.headings_deg.len().to_string()),
            ("REQUIRED_FIX_M", report.parameters.required_fix_m.to_string()),
            ("LONGEST_RUN_M", report.options.longest_run_m.to_string()),
            ("SEED", provenance.seed.to_string()),
            ("INPUTS_SHA256", inputs.join("; ")),
        ];
        geotiff(self.file_name(), provenance, grid, (&BANDS, &pixels), &items)
    }
}
