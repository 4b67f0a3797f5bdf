//! GeoTIFF files: grids of numbers with their place on the Earth, for GIS programs.
//!
//! *Format.* GeoTIFF 1.1 ([`OGC_GEOTIFF`]) on TIFF 6.0 ([`ADOBE_TIFF`]), 64-bit floats, Deflate, bands pixel by pixel. The
//! value of a pixel belongs to its whole area (`RasterPixelIsArea`); the grid is not turned. Frames with an EPSG code state
//! it; the others state no coordinate system. Names and units of the bands, and the value for "no data", stand in the two
//! tags that GDAL registered and documents for its GeoTIFF driver (42112, 42113).
//!
//! [`OGC_GEOTIFF`]: crate::bibliography::OGC_GEOTIFF
//! [`ADOBE_TIFF`]: crate::bibliography::ADOBE_TIFF

use std::io::Cursor;

use quick_xml::escape::escape;
use tiff::TiffError;
use tiff::encoder::colortype::Gray64Float;
use tiff::encoder::{Compression, DeflateLevel, TiffEncoder};
use tiff::tags::{ExtraSamples, Tag};

use super::ExportError;
use crate::report::{AreaGrid, Provenance};

/// `GTModelTypeGeoKey` (section 7.5.2): 1 is a projected system.
const MODEL_TYPE: [u16; 4] = [1024, 0, 1, 1];
/// `GTRasterTypeGeoKey` (section 7.5.3): 1 is `RasterPixelIsArea`.
const RASTER_TYPE: [u16; 4] = [1025, 0, 1, 1];
/// `ProjectedCRSGeoKey` (section 7.6.3), whose value is an EPSG code.
const PROJECTED_CRS: u16 = 3072;
/// Version of the key directory, and revision 1.1 of the keys (section 7.1.1).
const KEY_DIRECTORY: [u16; 3] = [1, 1, 1];

/// GDAL's tag for metadata as XML.
const GDAL_METADATA: u16 = 42112;

/// Largest size of a strip before compression, bytes.
const STRIP_BYTES: usize = 1 << 18;

/// One band.
pub(super) struct Band {
    /// Name, with the unit at its end as in the tables.
    pub(super) name: &'static str,
    /// Unit; empty for shares and counts.
    pub(super) unit: &'static str,
}

/// Place in the pixels of a file of the first band of a cell of the grid.
pub(super) fn pixel_of(grid: &AreaGrid, bands: usize, column: usize, row: usize) -> usize {
    // The file begins in the north-west.
    ((grid.rows - 1 - row) * grid.columns + column) * bands
}

/// A whole file called `file`: `pixels` holds the values of all bands, pixel by pixel as [`pixel_of`] says, not-a-number
/// where there is no data; `items` are named texts about the file.
pub(super) fn geotiff(
    file: &'static str,
    provenance: &Provenance,
    grid: &AreaGrid,
    (bands, pixels): (&[Band], &[f64]),
    items: &[(&str, String)],
) -> Result<Vec<u8>, ExportError> {
    let failed = |error: TiffError| ExportError::Format { file, reason: error.to_string() };
    let mut bytes = Cursor::new(Vec::new());
    written(&mut bytes, provenance, grid, (bands, pixels), items).map_err(failed)?;
    Ok(bytes.into_inner())
}

fn written(
    bytes: &mut Cursor<Vec<u8>>,
    provenance: &Provenance,
    grid: &AreaGrid,
    (bands, pixels): (&[Band], &[f64]),
    items: &[(&str, String)],
) -> Result<(), TiffError> {
    let encoder = TiffEncoder::new(bytes)?;
    let mut encoder = encoder.with_compression(Compression::Deflate(DeflateLevel::Balanced));
    let mut image =
        encoder.new_image::<Gray64Float>(u32::try_from(grid.columns)?, u32::try_from(grid.rows)?)?;
    image.extra_samples(&vec![ExtraSamples::Unspecified; bands.len().saturating_sub(1)])?;
    let row_bytes = grid.columns * bands.len() * size_of::<f64>();
    image.rows_per_strip(u32::try_from((STRIP_BYTES / row_bytes).clamp(1, grid.rows))?)?;

    let tags = image.encoder();
    tags.write_tag(Tag::ImageDescription, ascii(&description(provenance)).as_str())?;
    tags.write_tag(Tag::Software, format!("fixability {}", provenance.tool_version).as_str())?;
    tags.write_tag(Tag::ModelPixelScaleTag, &[grid.cell_m, grid.cell_m, 0.0][..])?;
    // The upper left corner of the first pixel lies here.
    let north_m = grid.south_m + grid.rows as f64 * grid.cell_m;
    tags.write_tag(Tag::ModelTiepointTag, &[0.0, 0.0, 0.0, grid.west_m, north_m, 0.0][..])?;
    if let Some(code) = provenance.epsg {
        let keys = [MODEL_TYPE, RASTER_TYPE, [PROJECTED_CRS, 0, 1, code]];
        let mut directory = KEY_DIRECTORY.to_vec();
        directory.push(keys.len() as u16);
        directory.extend(keys.concat());
        tags.write_tag(Tag::GeoKeyDirectoryTag, &directory[..])?;
    }
    tags.write_tag(Tag::Unknown(GDAL_METADATA), metadata(bands, items).as_str())?;
    tags.write_tag(Tag::GdalNodata, "nan")?;

    image.write_data(pixels)
}

fn description(provenance: &Provenance) -> String {
    let place = match provenance.epsg {
        Some(_) => provenance.coordinate_system.clone(),
        None => format!("{}, without a coordinate system in this file", provenance.coordinate_system),
    };
    let datum = provenance.frame.datum_statement().map(|text| format!("; {text}")).unwrap_or_default();
    format!("{} Metres in {place}{datum}. Seed {}.", provenance.caution, provenance.seed)
}

/// GDAL's form of metadata: named items, those of a band with its number and role.
fn metadata(bands: &[Band], items: &[(&str, String)]) -> String {
    let mut xml = String::from("<GDALMetadata>\n");
    for (name, text) in items {
        xml.push_str(&format!("  <Item name=\"{}\">{}</Item>\n", xml_ascii(name), xml_ascii(text)));
    }
    for (number, band) in bands.iter().enumerate() {
        for (name, role, text) in
            [("DESCRIPTION", "description", band.name), ("UNITTYPE", "unittype", band.unit)]
        {
            if !text.is_empty() {
                xml.push_str(&format!(
                    "  <Item name=\"{name}\" sample=\"{number}\" role=\"{role}\">{text}</Item>\n"
                ));
            }
        }
    }
    xml.push_str("</GDALMetadata>\n");
    xml
}

/// Text for XML in the seven bits that TIFF allows: other characters as references, those that XML cannot hold replaced.
fn xml_ascii(text: &str) -> String {
    let escaped = escape(text);
    let mut out = String::with_capacity(escaped.len());
    for c in escaped.chars() {
        match c {
            '\n' | '\t' | ' '..='~' => out.push(c),
            '\0'..='\u{1F}' | '\u{FFFE}' | '\u{FFFF}' => out.push_str("&#65533;"),
            _ => out.push_str(&format!("&#{};", u32::from(c))),
        }
    }
    out
}

/// Text in the seven bits that TIFF allows, every other character as a question mark.
fn ascii(text: &str) -> String {
    text.chars().map(|c| if matches!(c, ' '..='~') { c } else { '?' }).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn any_text_fits_into_the_metadata() {
        assert_eq!(xml_ascii("a<b & \"ö\"\u{1}"), "a&lt;b &amp; &quot;&#246;&quot;&#65533;");
        assert_eq!(ascii("Tiefe 3 m, größer"), "Tiefe 3 m, gr??er");
    }
}
