//! Why a frame could not be made or a position not be converted.

/// Why a frame could not be made or a point not be converted. The text says what to do.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum FrameError {
    /// The code is not in the table.
    #[error("EPSG:{code} is not a known coordinate system")]
    UnknownCode {
        /// EPSG code.
        code: u16,
    },
    /// The text names no coordinate system.
    #[error("\"{text}\" names no coordinate system")]
    NotACode {
        /// The offending text.
        text: String,
    },
    /// A geographic, geocentric or compound system where a plain grid is needed.
    #[error("EPSG:{code} ({name}) is not a projected grid")]
    NotProjected {
        /// EPSG code.
        code: u16,
        /// Name of the system.
        name: String,
    },
    /// A grid in feet or another unit.
    #[error("EPSG:{code} ({name}) does not count in metres; convert the coordinates to a metric grid first")]
    NotMetres {
        /// EPSG code.
        code: u16,
        /// Name of the system.
        name: String,
    },
    /// A grid with west or south axes or another prime meridian.
    #[error(
        "EPSG:{code} ({name}) does not count east and north from Greenwich; convert the coordinates to such a grid first"
    )]
    OddAxes {
        /// EPSG code.
        code: u16,
        /// Name of the system.
        name: String,
    },
    /// Another datum.
    #[error(
        "EPSG:{code} ({name}) is on another datum ({datum}); the shift to WGS 84 depends on the place and is not \
         guessed: transform the coordinates to WGS 84 first, with the parameters that apply at the site"
    )]
    OtherDatum {
        /// EPSG code.
        code: u16,
        /// Name of the system.
        name: String,
        /// Name of the datum.
        datum: String,
    },
    /// No such latitude or longitude.
    #[error(
        "latitude {lat_deg}, longitude {lon_deg} does not exist: latitude is −90 to 90, longitude −180 to 360 degrees"
    )]
    NotOnEarth {
        /// Latitude, degrees.
        lat_deg: f64,
        /// Longitude, degrees.
        lon_deg: f64,
    },
    /// Beyond the ends of UTM.
    #[error(
        "latitude {lat_deg:.4} is outside UTM, which ends at 84° N and 80° S; name a polar grid instead \
         (working_crs = \"EPSG:5041\" in the north, \"EPSG:5042\" in the south)"
    )]
    OutsideUtm {
        /// Latitude, degrees.
        lat_deg: f64,
    },
    /// Too far from the central meridian.
    #[error(
        "the position is {off_deg:.2}° of longitude from the central meridian ({meridian_deg}°) of {name}; the limit \
         is 10°: name the grid that belongs to the site"
    )]
    FarFromMeridian {
        /// Name of the grid.
        name: String,
        /// Distance from the central meridian, degrees of longitude.
        off_deg: f64,
        /// Central meridian, degrees.
        meridian_deg: f64,
    },
    /// A grid value outside the grid.
    #[error("{east_m} m E, {north_m} m N is no position in {name}")]
    OutsideGrid {
        /// Name of the grid.
        name: String,
        /// Easting, metres.
        east_m: f64,
        /// Northing, metres.
        north_m: f64,
    },
    /// The projection failed.
    #[error("{name}: {reason}")]
    Projection {
        /// Name of the grid.
        name: String,
        /// What went wrong.
        reason: String,
    },
    /// Local metres have no latitude and longitude.
    #[error(
        "local metres are not tied to the Earth, so they cannot be turned into or made from other coordinates"
    )]
    LocalHasNoEarth,
}
