//! The coordinate system of an input file, and the way from it to the working frame.

use super::datum::{self, Datum};
use super::{Frame, FrameError, GeoPoint, LocalPoint};

/// Coordinate system of an input file.
#[derive(Clone, Debug, PartialEq)]
pub enum Crs {
    /// Plain metres.
    Local,
    /// Latitude and longitude in degrees.
    Geographic {
        /// EPSG code.
        epsg: u16,
        /// Name in words.
        name: String,
        /// Short name of the datum.
        datum: &'static str,
        /// What is assumed about the datum, where it is not WGS 84.
        statement: Option<String>,
    },
    /// A projected grid.
    Grid(Frame),
}

/// A position as a file gives it, before it is brought into the working frame.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Given {
    /// Latitude and longitude.
    Geographic(GeoPoint),
    /// Metres in the file's own grid.
    Metres(LocalPoint),
}

impl Crs {
    /// WGS 84 latitude and longitude, EPSG:4326.
    pub fn wgs84() -> Self {
        Self::Geographic { epsg: 4326, name: "WGS 84 (EPSG:4326)".into(), datum: "WGS 84", statement: None }
    }

    /// Reads `local`, `EPSG:4326` or another `EPSG:` code.
    ///
    /// # Errors
    /// Anything else, and codes that cannot be used, with the reason.
    pub fn parse(text: &str) -> Result<Self, FrameError> {
        let word = text.trim();
        if word.eq_ignore_ascii_case("local") {
            return Ok(Self::Local);
        }
        let not_a_code = || FrameError::NotACode { text: text.to_owned() };
        let digits = word
            .get(..5)
            .filter(|p| p.eq_ignore_ascii_case("EPSG:"))
            .map(|_| word[5..].trim())
            .ok_or_else(not_a_code)?;
        Self::from_epsg(digits.parse().map_err(|_| not_a_code())?)
    }

    fn from_epsg(code: u16) -> Result<Self, FrameError> {
        let def = crs_definitions::from_code(code).ok_or(FrameError::UnknownCode { code })?;
        if !def.wkt.starts_with("GEOGCS[") {
            return Frame::from_epsg(code).map(Self::Grid);
        }
        let name = datum::quoted_after(def.wkt, "GEOGCS[").unwrap_or_default().to_owned();
        if def.proj4.contains("+pm=") {
            return Err(FrameError::OddAxes { code, name });
        }
        let datum = Datum::from_wkt(code, &name, def.wkt)?;
        Ok(Self::Geographic {
            epsg: code,
            name: format!("{name} (EPSG:{code})"),
            datum: datum.name(),
            statement: datum.statement(),
        })
    }

    /// Name in words.
    pub fn name(&self) -> String {
        match self {
            Self::Local => "local metres".into(),
            Self::Geographic { name, .. } => name.clone(),
            Self::Grid(frame) => frame.name(),
        }
    }

    /// Short name of the datum; none for local metres.
    pub fn datum_name(&self) -> Option<&'static str> {
        match self {
            Self::Local => None,
            Self::Geographic { datum, .. } => Some(datum),
            Self::Grid(frame) => frame.datum_name(),
        }
    }

    /// What is assumed about the datum, where it is not WGS 84.
    pub fn datum_statement(&self) -> Option<String> {
        match self {
            Self::Local => None,
            Self::Geographic { statement, .. } => statement.clone(),
            Self::Grid(frame) => frame.datum_statement(),
        }
    }

    /// Whether positions are latitude and longitude.
    pub fn is_geographic(&self) -> bool {
        matches!(self, Self::Geographic { .. })
    }

    /// The geographic position; an error for local metres.
    ///
    /// # Errors
    /// As [`Frame::to_geo`].
    pub fn to_geo(&self, given: Given) -> Result<GeoPoint, FrameError> {
        match (self, given) {
            (_, Given::Geographic(p)) => Ok(p),
            (Self::Grid(frame), Given::Metres(p)) => frame.to_geo(p),
            (_, Given::Metres(_)) => Err(FrameError::LocalHasNoEarth),
        }
    }

    /// The position in the working frame.
    ///
    /// # Errors
    /// When one of the two is local metres and the other is not, or the position is outside the limits of a grid.
    pub fn to_frame(&self, given: Given, frame: &Frame) -> Result<LocalPoint, FrameError> {
        match (self, given) {
            (Self::Local, Given::Metres(p)) if frame.is_local() => Ok(p),
            (Self::Grid(own), Given::Metres(p)) if own == frame => {
                // The value stays as it is, but it must be a position of the grid.
                frame.to_geo(p).map(|_| p)
            }
            _ => frame.to_local(self.to_geo(given)?),
        }
    }
}
