//! From the uncertainty a survey quotes to the bound the solver needs.
//!
//! For a circular Gaussian error with standard deviation σ per axis, the chance to lie within the radius r is
//! 1 − exp(−r²/2σ²) (Rayleigh distribution). The box of half-width r holds that circle, so its chance is at least that.

/// What the figures of a file mean.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Declared {
    /// Hard bounds.
    Bound,
    /// One standard deviation per axis, times the factor.
    Sigma {
        /// Bound divided by standard deviation.
        factor: f64,
    },
    /// 95 % radius, times the factor.
    P95 {
        /// Bound divided by 95 % radius.
        factor: f64,
    },
}

impl Declared {
    /// Bound divided by figure.
    pub fn factor(self) -> f64 {
        match self {
            Self::Bound => 1.0,
            Self::Sigma { factor } | Self::P95 { factor } => factor,
        }
    }

    /// Chance that one landmark lies in its box, at least, for a circular Gaussian error; none for hard bounds.
    pub fn chance(self) -> Option<f64> {
        match self {
            Self::Bound => None,
            Self::Sigma { factor } => Some(-libm::expm1(-0.5 * factor * factor)),
            // The 95 % radius is σ√(−2 ln 0.05), so the chance within f of them is 1 − 0.05^(f²).
            Self::P95 { factor } => Some(-libm::expm1(factor * factor * libm::log(0.05))),
        }
    }

    /// In words, with the factor and what it is worth for `landmarks` landmarks together.
    pub fn statement(self, landmarks: usize) -> String {
        let figure = match self {
            Self::Bound => return "uncertainties are hard bounds and used as given (factor 1)".into(),
            Self::Sigma { .. } => "standard deviations per axis",
            Self::P95 { .. } => "95 % radii",
        };
        let chance = self.chance().unwrap_or(1.0);
        let all = libm::pow(chance, landmarks as f64);
        format!(
            "uncertainties are {figure}, multiplied by {} to serve as bounds; for a circular Gaussian error one landmark \
             is then inside its box with probability {} % or more, and all {landmarks} together with {} % or more: what \
             the program calls guaranteed holds when they are",
            self.factor(),
            percent(chance),
            percent(all),
        )
    }
}

/// Per cent with two decimals, rounded down: a probability is not to look better than it is.
fn percent(chance: f64) -> String {
    format!("{:.2}", (chance * 1e4 + 1e-6).floor() / 100.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn default_factors_reach_four_nines() {
        // 4.292 ≥ √(−2 ln 10⁻⁴) = 4.29193…; 1.754 ≥ 4.29193… / √(−2 ln 0.05) = 1.75342… (closed forms).
        for declared in [Declared::Sigma { factor: 4.292 }, Declared::P95 { factor: 1.754 }] {
            let chance = declared.chance().unwrap();
            assert!((0.9999..0.999_901).contains(&chance), "{chance}");
        }
    }

    #[test]
    fn ten_landmarks_at_95_percent_are_all_inside_with_60_percent() {
        // 0.95^10 = 0.5987 (arithmetic).
        let text = Declared::P95 { factor: 1.0 }.statement(10);
        assert!(text.contains("95.00 %") && text.contains("59.87 %"), "{text}");
    }
}
