use statrs::distribution::{ContinuousCDF, StudentsT};

use crate::score::Estimate;

/// When a difference counts.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Rules {
    /// Largest odds of any false alarm in the run.
    pub odds: f64,
    /// Largest change of a moment that counts as rounding, for double precision: in standard deviations (means), variances
    /// (covariances) or correlations (cross-covariances), times 1 + |mean| / sd of the outputs concerned, for a value of
    /// large size has coarser digits. Ten thousand sums of products reach some 1e-12; common practice, no source.
    pub rounding: f64,
    /// Largest factor by which the time of a method, as a ratio to first-order Taylor, may rise; not looked at unless given.
    pub time_margin: Option<f64>,
}

impl Default for Rules {
    fn default() -> Self {
        Self { odds: 1e-4, rounding: REFERENCE_ROUNDING, time_margin: None }
    }
}

/// What rounding may do to a reference: under another seed an exact one is summed in another way.
pub(super) const REFERENCE_ROUNDING: f64 = 1e-10;

/// What no rules can be.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("{0}")]
pub struct RulesError(String);

/// What rounding may do in single precision, to what it may in double: the ratio of their units is 5e8, but a tenth of a standard
/// deviation could not pass for rounding.
const SINGLE: f64 = 1e6;
/// A score may differ by so much for rounding alone, absolutely below 1 and relatively above: it is made of differences of
/// whitened numbers of order one, whose condition a factor of 1e6 allows for. Common practice, no source.
const SCORE_ROUNDING: f64 = 1e-9;

impl Rules {
    /// Whether they can be meant.
    ///
    /// # Errors
    /// [`RulesError`] names the one that cannot, and what would be right.
    pub fn check(&self) -> Result<(), RulesError> {
        let Self { odds, rounding, time_margin } = *self;
        if !(odds > 0.0 && odds < 1.0) {
            return Err(RulesError(format!("odds {odds} are not above 0 and below 1; give such as 1e-4")));
        }
        if !(0.0..1.0).contains(&rounding) {
            return Err(RulesError(format!(
                "rounding {rounding} is not 0 or above and below 1; give such as 1e-10"
            )));
        }
        if let Some(margin) = time_margin.filter(|margin| !(*margin >= 1.0 && margin.is_finite())) {
            return Err(RulesError(format!("time margin {margin} is not 1 or above; give a factor such as 1.5")));
        }
        Ok(())
    }

    /// What rounding may do to the moments of a method under this label.
    pub(super) fn rounding_of(&self, label: &str) -> f64 {
        if label.ends_with(":arithmetic=f32") { (self.rounding * SINGLE).min(1e-3) } else { self.rounding }
    }

    /// The quantile q of `chances` differences in the run between means of `replicates` replicates: two-sided, Student's
    /// law with replicates - 1 degrees of freedom, at odds / chances.
    pub(super) fn quantile(&self, chances: usize, replicates: usize) -> f64 {
        let freedom = (replicates.max(2) - 1) as f64;
        let tail = self.odds / (2.0 * chances.max(1) as f64);
        StudentsT::new(0.0, 1.0, freedom).map_or(f64::INFINITY, |law| -law.inverse_cdf(tail))
    }
}

/// What rounding may do to a score.
pub(super) fn score_rounding(score: f64) -> f64 {
    SCORE_ROUNDING * score.abs().max(1.0)
}

/// The standard error of a difference of independent estimates.
pub(super) fn joint_error(a: Estimate, b: Estimate) -> f64 {
    a.standard_error.hypot(b.standard_error)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quantiles_are_those_of_students_law() {
        // Two-sided 0.001 with 31 degrees of freedom: 3.6335 in printed tables of Student's law (from memory; scipy.stats.t.ppf
        // gives 3.633456).
        let rules = Rules { odds: 1e-3, ..Rules::default() };
        assert!((rules.quantile(1, 32) - 3.633_456).abs() < 1e-5, "{}", rules.quantile(1, 32));
        // scipy.stats.t.isf(1e-4 / (2 * 4000), 31)
        let far = Rules::default().quantile(4000, 32);
        assert!((far - FAR).abs() < 1e-4 * FAR, "{far}");
    }

    /// scipy.stats.t.isf(1e-4 / 8000, 31).
    const FAR: f64 = 7.395_976_459;

    #[test]
    fn what_cannot_be_meant_is_refused() {
        let good = Rules::default();
        assert!(good.check().is_ok() && Rules { rounding: 0.0, time_margin: Some(1.0), ..good }.check().is_ok());
        for bad in [
            Rules { odds: 0.0, ..good },
            Rules { odds: f64::NAN, ..good },
            Rules { odds: 1.0, ..good },
            Rules { rounding: -1e-12, ..good },
            Rules { rounding: f64::NAN, ..good },
            Rules { time_margin: Some(0.9), ..good },
            Rules { time_margin: Some(f64::INFINITY), ..good },
        ] {
            assert!(bad.check().is_err(), "{bad:?}");
        }
    }
}
