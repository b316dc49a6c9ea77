use serde::{Deserialize, Serialize};

/// The limits that a method must keep to be trusted.
///
/// The defaults are common practice, no source: they are what many teams would let pass, and a suite sets its
/// own.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(default, deny_unknown_fields)]
#[non_exhaustive]
pub struct Limits {
    /// Largest mean error, in reference standard deviations.
    pub mean_error: f64,
    /// Least variance ratio.
    pub variance_ratio_low: f64,
    /// Greatest variance ratio.
    pub variance_ratio_high: f64,
    /// Largest cross-covariance error, in correlation units.
    pub cross_covariance_error: f64,
    /// Least expected NEES ratio.
    pub nees_ratio_low: f64,
    /// Greatest expected NEES ratio.
    pub nees_ratio_high: f64,
    /// Largest excess divergence \[nats\].
    pub excess: f64,
    /// Largest floor \[nats\]; said of the case, not of a method.
    pub floor: f64,
    /// One-sided confidence of every bound, such as 0.999, over all looks at a reference together.
    pub confidence: f64,
}

impl Default for Limits {
    fn default() -> Self {
        Self {
            mean_error: 0.1,
            variance_ratio_low: 0.8,
            variance_ratio_high: 1.25,
            cross_covariance_error: 0.1,
            nees_ratio_low: 0.9,
            nees_ratio_high: 1.1,
            excess: 0.05,
            floor: 0.05,
            confidence: 0.999,
        }
    }
}

impl Limits {
    /// Checks that every limit can be meant.
    ///
    /// # Errors
    /// The key at fault and what would be right.
    pub fn check(&self) -> Result<(), (&'static str, String)> {
        let positive = [
            ("mean_error", self.mean_error),
            ("variance_ratio_low", self.variance_ratio_low),
            ("variance_ratio_high", self.variance_ratio_high),
            ("cross_covariance_error", self.cross_covariance_error),
            ("nees_ratio_low", self.nees_ratio_low),
            ("nees_ratio_high", self.nees_ratio_high),
            ("excess", self.excess),
            ("floor", self.floor),
        ];
        if let Some((key, value)) = positive.into_iter().find(|(_, v)| !(*v > 0.0 && v.is_finite())) {
            return Err((key, format!("is {value}; a limit is a number above 0")));
        }
        for (key, low, upper, high) in [
            ("variance_ratio_low", self.variance_ratio_low, "variance_ratio_high", self.variance_ratio_high),
            ("nees_ratio_low", self.nees_ratio_low, "nees_ratio_high", self.nees_ratio_high),
        ] {
            if low >= high {
                return Err((key, format!("is {low}, not below `{upper}`, which is {high}")));
            }
        }
        if !(self.confidence > 0.5 && self.confidence < 1.0) {
            return Err(("confidence", format!("is {}; give a number above 0.5 and below 1", self.confidence)));
        }
        Ok(())
    }
}
