//! Which datums may be used, and what is assumed about them.
//!
//! The program shifts no datum. It takes WGS 84, and the regional frames that were defined to coincide with it and
//! have drifted from it by plate motion only, with a statement; every other datum is refused, because the size of the
//! shift (tens to hundreds of metres) depends on the place and on parameters that only the surveyor knows.

use super::FrameError;

/// A datum whose positions are used as they are.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Datum {
    /// WGS 84 itself.
    Wgs84,
    /// A regional frame taken as equal to WGS 84; index into [`COINCIDENT`].
    Coincident(usize),
}

/// Names of datums in the EPSG dataset that are realisations of, or were aligned with, the international terrestrial
/// reference frame, with the name people use.
const COINCIDENT: &[(&str, &str)] = &[
    ("European_Terrestrial_Reference_System_1989", "ETRS89"),
    ("North_American_Datum_1983", "NAD83"),
    ("NAD83_Canadian_Spatial_Reference_System", "NAD83(CSRS)"),
    ("NAD83_High_Accuracy_Reference_Network", "NAD83(HARN)"),
    ("NAD83_National_Spatial_Reference_System_2007", "NAD83(NSRS2007)"),
    ("NAD83_National_Spatial_Reference_System_2011", "NAD83(2011)"),
    ("NAD83_Continuously_Operating_Reference_Station_1996", "NAD83(CORS96)"),
    ("Geocentric_Datum_of_Australia_1994", "GDA94"),
    ("Geocentric_Datum_of_Australia_2020", "GDA2020"),
    ("New_Zealand_Geodetic_Datum_2000", "NZGD2000"),
    ("SWEREF99", "SWEREF99"),
    ("Reseau_Geodesique_Francais_1993", "RGF93"),
    ("Rete_Dinamica_Nazionale_2008", "RDN2008"),
    ("Greenland_1996", "GR96"),
    ("Japanese_Geodetic_Datum_2000", "JGD2000"),
    ("Japanese_Geodetic_Datum_2011", "JGD2011"),
    ("China_2000", "CGCS2000"),
    ("Datum_Geodesi_Nasional_1995", "DGN95"),
    ("Sistema_de_Referencia_Geocentrico_para_las_AmericaS_2000", "SIRGAS 2000"),
    ("Sistema_de_Referencia_Geocentrico_para_America_del_Sur_1995", "SIRGAS 1995"),
];

impl Datum {
    /// The datum named in a coordinate system definition, if it may be used.
    pub(super) fn from_wkt(code: u16, crs_name: &str, wkt: &str) -> Result<Self, FrameError> {
        let found = quoted_after(wkt, "DATUM[").unwrap_or_default();
        if found == "WGS_1984" {
            return Ok(Self::Wgs84);
        }
        COINCIDENT.iter().position(|(name, _)| *name == found).map(Self::Coincident).ok_or_else(|| {
            FrameError::OtherDatum { code, name: crs_name.to_owned(), datum: found.replace('_', " ") }
        })
    }

    pub(super) fn name(self) -> &'static str {
        match self {
            Self::Wgs84 => "WGS 84",
            Self::Coincident(i) => COINCIDENT[i].1,
        }
    }

    pub(super) fn statement(self) -> Option<String> {
        match self {
            Self::Wgs84 => None,
            Self::Coincident(_) => Some(format!(
                "{} is taken as equal to WGS 84, without any shift; the two may differ by a metre or two (plate \
                 motion; common practice)",
                self.name()
            )),
        }
    }
}

/// The first quoted text after `key`.
pub(super) fn quoted_after<'a>(text: &'a str, key: &str) -> Option<&'a str> {
    let rest = &text[text.find(key)? + key.len()..];
    let rest = rest.strip_prefix('"')?;
    rest.find('"').map(|end| &rest[..end])
}
