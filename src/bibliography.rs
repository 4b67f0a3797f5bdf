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
