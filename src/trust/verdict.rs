use serde::Serialize;
use statrs::distribution::{ContinuousCDF, StudentsT};

use super::Limits;
use crate::score::{Estimate, Floor, Invalid, ScoreKind, Scores};

/// Whether a method can be trusted on a case.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Trust {
    /// Every limit is kept, with the asked confidence.
    Trusted,
    /// A limit is broken, with the asked confidence, or the answer is no Gaussian.
    Rejected,
    /// The reference cannot tell.
    Undecided,
}

impl Trust {
    /// Its name in files and tables.
    pub fn name(self) -> &'static str {
        match self {
            Self::Trusted => "trusted",
            Self::Rejected => "rejected",
            Self::Undecided => "undecided",
        }
    }
}

/// Where a score stands against a limit.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Standing {
    /// The confidence bound is inside.
    Kept,
    /// The confidence bound is wholly outside.
    Broken,
    /// The bound lies across the limit, or the score is undefined.
    Open,
}

/// Which side of a limit is forbidden.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Side {
    /// Nothing above it.
    AtMost,
    /// Nothing below it.
    AtLeast,
}

/// One limit held against one score.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Finding {
    /// Which score.
    pub score: ScoreKind,
    /// Which side of the limit is forbidden.
    pub side: Side,
    /// The limit.
    pub limit: f64,
    /// The score; `None` where undefined.
    pub estimate: Option<Estimate>,
    /// Where it stands.
    pub standing: Standing,
}

impl Finding {
    /// How far outside the limit the score is, as a factor: above 1 outside, below 1 inside.
    pub fn exceedance(&self) -> f64 {
        let value = self.estimate.map_or(f64::NAN, |e| e.value);
        match self.side {
            Side::AtMost => value / self.limit,
            Side::AtLeast => self.limit / value,
        }
    }

    /// What this limit says of a method that breaks it, such as `update overconfident`.
    pub fn fault(&self) -> &'static str {
        match (self.score, self.side) {
            (ScoreKind::MeanError, _) => "mean biased",
            (ScoreKind::VarianceRatioLow, _) => "variance too small",
            (ScoreKind::VarianceRatioHigh, _) => "variance too large",
            (ScoreKind::CrossCovarianceError, _) => "cross-covariance off",
            (ScoreKind::NeesRatio, Side::AtMost) => "update overconfident",
            (ScoreKind::NeesRatio, Side::AtLeast) => "update too cautious",
            (kind, _) => kind.name(),
        }
    }

    /// One sentence: which limit, which direction, how far.
    pub fn sentence(&self) -> String {
        let (side, crossed) = match self.side {
            Side::AtMost => ("at most", "above"),
            Side::AtLeast => ("at least", "below"),
        };
        let name = self.score.name();
        match self.estimate {
            None => {
                format!("{name} is undefined: the joint of state and measurement is singular to working precision")
            }
            Some(Estimate { value, standard_error }) => {
                let place = match self.standing {
                    Standing::Broken => {
                        format!("{crossed} its limit by a factor of {}", short(self.exceedance(), 2))
                    }
                    Standing::Open => "too near its limit to tell".into(),
                    Standing::Kept => "inside its limit".into(),
                };
                let fault = match self.standing {
                    Standing::Broken => format!("{}: ", self.fault()),
                    Standing::Open | Standing::Kept => String::new(),
                };
                let value = short(value, 4);
                format!("{fault}{name} {value} +- {standard_error:.1e} is {place} ({side} {})", self.limit)
            }
        }
    }
}

/// A number with some decimals, or with an exponent where it is too large for them to be read.
fn short(value: f64, decimals: usize) -> String {
    if value.abs() < 1e6 { format!("{value:.decimals$}") } else { format!("{value:.3e}") }
}

/// What is said of one method on one case, and why.
#[derive(Debug, Clone, PartialEq)]
pub struct Verdict {
    /// The word.
    pub trust: Trust,
    /// What decided it: the limit that is broken by the largest factor (the excess only where nothing else is
    /// broken); for an undecided one the first that is open. `None` for a trusted method or an invalid answer.
    pub finding: Option<Finding>,
    /// The reason in one sentence.
    pub reason: String,
}

/// Judges by limits, with bounds from the t law of the reference's replicates.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Judge {
    limits: Limits,
    /// One-sided t quantile of the confidence.
    quantile: f64,
}

impl Judge {
    /// A judge by `limits` on references of `replicates` replicates (at least 2).
    ///
    /// A bound is value +- t s with t the one-sided quantile of Student's law with `replicates` - 1 degrees of
    /// freedom at the limits' confidence.
    pub fn new(limits: Limits, replicates: usize) -> Self {
        let freedom = (replicates.max(2) - 1) as f64;
        // The law exists for every positive freedom; without it no bound could be trusted.
        let quantile =
            StudentsT::new(0.0, 1.0, freedom).map_or(f64::INFINITY, |law| law.inverse_cdf(limits.confidence));
        Self { limits, quantile }
    }

    /// The limits.
    pub fn limits(&self) -> &Limits {
        &self.limits
    }

    /// The verdict on a method's scores.
    pub fn verdict(&self, scores: &Result<Scores, Invalid>) -> Verdict {
        let scores = match scores {
            Ok(scores) => scores,
            Err(invalid) => {
                return Verdict {
                    trust: Trust::Rejected,
                    finding: None,
                    reason: format!("no Gaussian: {invalid}"),
                };
            }
        };
        let findings = self.findings(scores);
        // The excess sums up everything and names no direction: it leads only where it stands alone.
        let broken = findings.iter().filter(|f| f.standing == Standing::Broken).max_by(|a, b| {
            let rank = |f: &Finding| (f.score != ScoreKind::Excess, f.exceedance());
            let ((a, x), (b, y)) = (rank(a), rank(b));
            a.cmp(&b).then(x.total_cmp(&y))
        });
        let open = || findings.iter().find(|f| f.standing == Standing::Open);
        if let Some(finding) = broken {
            Verdict { trust: Trust::Rejected, finding: Some(*finding), reason: finding.sentence() }
        } else if let Some(finding) = open() {
            Verdict { trust: Trust::Undecided, finding: Some(*finding), reason: finding.sentence() }
        } else {
            Verdict { trust: Trust::Trusted, finding: None, reason: "every limit is kept".into() }
        }
    }

    /// Every limit held against its score.
    pub fn findings(&self, scores: &Scores) -> [Finding; 7] {
        let l = &self.limits;
        [
            (ScoreKind::MeanError, Side::AtMost, l.mean_error),
            (ScoreKind::VarianceRatioLow, Side::AtLeast, l.variance_ratio_low),
            (ScoreKind::VarianceRatioHigh, Side::AtMost, l.variance_ratio_high),
            (ScoreKind::CrossCovarianceError, Side::AtMost, l.cross_covariance_error),
            (ScoreKind::NeesRatio, Side::AtLeast, l.nees_ratio_low),
            (ScoreKind::NeesRatio, Side::AtMost, l.nees_ratio_high),
            (ScoreKind::Excess, Side::AtMost, l.excess),
        ]
        .map(|(score, side, limit)| {
            let estimate = scores.get(score);
            let standing = estimate.map_or(Standing::Open, |e| self.standing(e, side, limit));
            Finding { score, side, limit, estimate, standing }
        })
    }

    /// Whether the floor leaves room for a Gaussian at all: `Broken` means that none should be trusted here.
    pub fn floor(&self, floor: &Floor) -> Standing {
        match floor {
            Floor::Known(estimate) => self.standing(*estimate, Side::AtMost, self.limits.floor),
            // Without noise the true joint is no density and the divergence is infinite whatever the sensor, so
            // it tells nothing of this one.
            Floor::Unbounded | Floor::Undefined => Standing::Open,
        }
    }

    fn standing(&self, e: Estimate, side: Side, limit: f64) -> Standing {
        let margin = self.quantile * e.standard_error;
        let (inside, outside) = match side {
            Side::AtMost => (e.value + margin <= limit, e.value - margin > limit),
            Side::AtLeast => (e.value - margin >= limit, e.value + margin < limit),
        };
        match (inside, outside) {
            (true, _) => Standing::Kept,
            (_, true) => Standing::Broken,
            _ => Standing::Open,
        }
    }
}
