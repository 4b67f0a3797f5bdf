//! Published sources that other pages link to.

/// IEEE Std 1788-2015, *IEEE Standard for Interval Arithmetic*.
pub const IEEE_1788: &str = "IEEE Std 1788-2015, IEEE Standard for Interval Arithmetic";

/// L. Jaulin, M. Kieffer, O. Didrit, E. Walter, *Applied Interval Analysis*, Springer, 2001.
pub const JAULIN_2001: &str = "Jaulin, Kieffer, Didrit, Walter, Applied Interval Analysis, Springer, 2001";

/// L. Jaulin, E. Walter, "Set inversion via interval analysis for nonlinear bounded-error estimation",
/// *Automatica* 29 (4), 1993, 1053–1064.
pub const JAULIN_WALTER_1993: &str = "Jaulin, Walter, Set inversion via interval analysis for nonlinear bounded-error estimation, Automatica 29 (4), 1993";

/// D. P. Bertsekas, I. B. Rhodes, "Recursive state estimation for a set-membership description of uncertainty",
/// *IEEE Transactions on Automatic Control* 16 (2), 1971, 117–128.
pub const BERTSEKAS_RHODES_1971: &str = "Bertsekas, Rhodes, Recursive state estimation for a set-membership description of uncertainty, IEEE TAC 16 (2), 1971";

/// C. J. Clopper, E. S. Pearson, "The use of confidence or fiducial limits illustrated in the case of the binomial",
/// *Biometrika* 26 (4), 1934, 404–413.
pub const CLOPPER_PEARSON_1934: &str = "Clopper, Pearson, The use of confidence or fiducial limits illustrated in the case of the binomial, Biometrika 26 (4), 1934";

/// Open Geospatial Consortium, *OGC GeoTIFF Standard*, version 1.1, OGC 19-008r4, 2019.
pub const OGC_GEOTIFF: &str =
    "Open Geospatial Consortium, OGC GeoTIFF Standard, version 1.1, OGC 19-008r4, 2019";

/// Adobe Developers Association, *TIFF*, revision 6.0, 1992.
pub const ADOBE_TIFF: &str = "Adobe Developers Association, TIFF, Revision 6.0, 1992";

/// H. Butler, M. Daly, A. Doyle, S. Gillies, S. Hagen, T. Schaub, *The GeoJSON Format*, RFC 7946, 2016.
pub const RFC_7946: &str = "Butler, Daly, Doyle, Gillies, Hagen, Schaub, The GeoJSON Format, RFC 7946, 2016";

/// *GPX 1.1 Schema Documentation*, 2004.
pub const GPX_1_1: &str = "GPX 1.1 Schema Documentation, 2004";

/// Open Geospatial Consortium, *OGC KML*, version 2.3, OGC 12-007r2, 2015.
pub const OGC_KML: &str = "Open Geospatial Consortium, OGC KML, version 2.3, OGC 12-007r2, 2015";
