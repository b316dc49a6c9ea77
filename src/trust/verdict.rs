use statrs::distribution::{ContinuousCDF, StudentsT};

use super::Limits;
use crate::score::{Estimate, Floor, Invalid, ScoreKind, Scores};

/// Whether a method can be trusted on a case.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
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

impl Standing {
    /// Its name in files.
    pub fn name(self) -> &'static str {
        match self {
            Self::Kept => "kept",
            Self::Broken => "broken",
            Self::Open => "open",
        }
    }
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
    /// One-sided t quantile of the confidence, shared over the looks.
    quantile: f64,
}

impl Judge {
    /// A judge by `limits` on references of `replicates` replicates (at least 2), that are looked at up to `looks`
    /// times (at least 1).
    ///
    /// A bound is value +- t s with t the one-sided quantile of Student's law with `replicates` - 1 degrees of
    /// freedom. A reference is deepened until the verdict is decided, so that each of its looks is a chance to err:
    /// at 0.999 and eight looks, a score that lies on its limit would be judged with odds of 0.7 % on either side,
    /// not 0.1 %. The error that the confidence leaves is shared equally over the looks (Bonferroni), which brings
    /// those odds back to 0.1 % or less.
    ///
    /// Source of the sharing: K. K. G. Lan, D. L. DeMets, "Discrete sequential boundaries for clinical trials",
    /// Biometrika 70 (1983) 659-663 (spending of the error; the equal share is the simplest).
    pub fn new(limits: Limits, replicates: usize, looks: usize) -> Self {
        let freedom = (replicates.max(2) - 1) as f64;
        let error = (1.0 - limits.confidence) / looks.max(1) as f64;
        // The law exists for every positive freedom; without it no bound could be trusted. Its lower tail: 1 - error
        // would round away the digits of a small error.
        let quantile = StudentsT::new(0.0, 1.0, freedom).map_or(f64::INFINITY, |law| -law.inverse_cdf(error));
        Self { limits, quantile }
    }

    /// The one-sided t quantile that its bounds are made with, shared over the looks.
    pub fn quantile(&self) -> f64 {
        self.quantile
    }

    /// The same judge, by other limits.
    #[must_use]
    pub fn with(self, limits: Limits) -> Self {
        Self { limits, ..self }
    }

    /// The verdict on a method's scores.
    pub fn verdict(&self, scores: &Result<Scores, Invalid>) -> Verdict {
        let scores = match scores {
            Ok(scores) => scores,
            Err(invalid) => {
                let reason = match invalid {
                    Invalid::NoAnswer(why) => why.clone(),
                    _ => format!("no Gaussian: {invalid}"),
                };
                return Verdict { trust: Trust::Rejected, finding: None, reason };
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
            // it tells nothing of this one; with noise inside h it is not known.
            Floor::Unbounded | Floor::Undefined | Floor::NoiseInside => Standing::Open,
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

#[cfg(test)]
mod tests {
    use super::*;

    /// One-sided t quantile at 0.999 with 31 degrees of freedom, as printed, to three decimals. Source: NIST/SEMATECH
    /// e-Handbook of Statistical Methods, sec. 1.3.6.7.2, critical values of Student's t distribution (row 31, value
    /// from memory).
    const T_31: f64 = 3.375;
    /// Half a unit of the last printed decimal.
    const PRINTED: f64 = 5e-4;

    fn judge() -> Judge {
        Judge::new(Limits::default(), 32, 1)
    }

    fn estimate(value: f64, standard_error: f64) -> Estimate {
        Estimate { value, standard_error }
    }

    /// The scores of a perfect method, without error, but for those given.
    fn scores(given: &[(ScoreKind, Option<Estimate>)]) -> Scores {
        Scores::made_up(|kind| match given.iter().find(|(k, _)| *k == kind) {
            Some((_, estimate)) => *estimate,
            None => match kind {
                ScoreKind::VarianceRatioLow
                | ScoreKind::VarianceRatioHigh
                | ScoreKind::NeesRatio
                | ScoreKind::WorstNees => Some(estimate(1.0, 0.0)),
                _ => Some(estimate(0.0, 0.0)),
            },
        })
    }

    fn verdict(given: &[(ScoreKind, Option<Estimate>)]) -> Verdict {
        judge().verdict(&Ok(scores(given)))
    }

    fn standing(judge: &Judge, kind: ScoreKind, side: Side, estimate: Estimate) -> Standing {
        let findings = judge.findings(&scores(&[(kind, Some(estimate))]));
        findings.iter().find(|f| f.score == kind && f.side == side).map(|f| f.standing).unwrap()
    }

    /// Holds the bound of `judge` between `t` less and `t` plus [`PRINTED`], on both sides of a limit of each kind.
    fn bound_is(judge: &Judge, t: f64) {
        const ERROR: f64 = 1e-3;
        for (kind, side, limit) in [
            (ScoreKind::MeanError, Side::AtMost, 0.1),
            (ScoreKind::NeesRatio, Side::AtMost, 1.1),
            (ScoreKind::NeesRatio, Side::AtLeast, 0.9),
            (ScoreKind::VarianceRatioLow, Side::AtLeast, 0.8),
        ] {
            let inward = if side == Side::AtMost { -ERROR } else { ERROR };
            let at = |distance: f64| standing(judge, kind, side, estimate(limit + distance * inward, ERROR));
            let what = format!("{kind:?} {side:?}, t = {t}");
            assert_eq!(at(t + PRINTED), Standing::Kept, "{what}");
            assert_eq!(at(t - PRINTED), Standing::Open, "{what}");
            assert_eq!(at(-t + PRINTED), Standing::Open, "{what}");
            assert_eq!(at(-t - PRINTED), Standing::Broken, "{what}");
        }
    }

    #[test]
    fn a_limit_is_kept_or_broken_beyond_the_published_t_quantile() {
        bound_is(&judge(), T_31);
        // Five looks share an error of 0.005.
        bound_is(&Judge::new(Limits { confidence: 0.995, ..Limits::default() }, 32, 5), T_31);
        // The same table: 0.975 with 9 degrees of freedom.
        bound_is(&Judge::new(Limits { confidence: 0.975, ..Limits::default() }, 10, 1), 2.262);
    }

    #[test]
    fn a_score_without_error_is_judged_by_its_value_and_a_limit_itself_is_kept() {
        let at = |value| standing(&judge(), ScoreKind::MeanError, Side::AtMost, estimate(value, 0.0));
        assert_eq!(at(0.1), Standing::Kept);
        assert_eq!(at(0.1_f64.next_up()), Standing::Broken);
        let at = |value| standing(&judge(), ScoreKind::VarianceRatioLow, Side::AtLeast, estimate(value, 0.0));
        assert_eq!(at(0.8), Standing::Kept);
        assert_eq!(at(0.8_f64.next_down()), Standing::Broken);
    }

    #[test]
    fn a_perfect_method_is_trusted() {
        let verdict = verdict(&[]);
        assert_eq!((verdict.trust, verdict.finding), (Trust::Trusted, None));
        assert_eq!(verdict.reason, "every limit is kept");
    }

    #[test]
    fn every_limit_has_its_own_fault() {
        for (kind, value, fault) in [
            (ScoreKind::MeanError, 0.2, "mean biased"),
            (ScoreKind::VarianceRatioLow, 0.5, "variance too small"),
            (ScoreKind::VarianceRatioHigh, 2.0, "variance too large"),
            (ScoreKind::CrossCovarianceError, 0.3, "cross-covariance off"),
            (ScoreKind::NeesRatio, 1.5, "update overconfident"),
            (ScoreKind::NeesRatio, 0.5, "update too cautious"),
            (ScoreKind::Excess, 0.2, "excess"),
        ] {
            let verdict = verdict(&[(kind, Some(estimate(value, 1e-3)))]);
            assert_eq!(verdict.trust, Trust::Rejected, "{kind:?}");
            assert_eq!(verdict.finding.map(|f| (f.score, f.fault())), Some((kind, fault)));
        }
    }

    #[test]
    fn scores_without_a_limit_decide_nothing() {
        let far = Some(estimate(50.0, 1e-3));
        for kind in [ScoreKind::CovarianceError, ScoreKind::WorstNees, ScoreKind::InformationLost] {
            assert_eq!(verdict(&[(kind, far)]).trust, Trust::Trusted, "{kind:?}");
        }
    }

    #[test]
    fn the_largest_factor_leads_whichever_its_side() {
        let mean = |value| (ScoreKind::MeanError, Some(estimate(value, 1e-3)));
        let low = |value| (ScoreKind::VarianceRatioLow, Some(estimate(value, 1e-3)));
        let leads = |given: &[_]| verdict(given).finding.map(|f| (f.score, f.exceedance()));
        assert_eq!(leads(&[mean(0.2), low(0.2)]), Some((ScoreKind::VarianceRatioLow, 0.8 / 0.2)));
        assert_eq!(leads(&[mean(0.5), low(0.2)]), Some((ScoreKind::MeanError, 0.5 / 0.1)));
    }

    #[test]
    fn the_excess_leads_only_where_it_stands_alone() {
        let excess = (ScoreKind::Excess, Some(estimate(5.0, 1e-3)));
        let leads = |given: &[_]| verdict(given).finding.map(|f| f.score);
        assert_eq!(leads(&[excess]), Some(ScoreKind::Excess));
        // A hundred times its limit, against a mean at twice its own.
        assert_eq!(leads(&[excess, (ScoreKind::MeanError, Some(estimate(0.2, 1e-3)))]), Some(ScoreKind::MeanError));
        // One that is only open does not stand beside it.
        assert_eq!(leads(&[excess, (ScoreKind::MeanError, Some(estimate(0.1, 1e-3)))]), Some(ScoreKind::Excess));
    }

    #[test]
    fn what_is_open_or_undefined_is_undecided_until_something_is_broken() {
        let open = (ScoreKind::NeesRatio, Some(estimate(1.1, 1e-3)));
        let undefined = (ScoreKind::Excess, None);
        let found = verdict(&[open, undefined]);
        assert_eq!((found.trust, found.finding.map(|f| f.score)), (Trust::Undecided, Some(ScoreKind::NeesRatio)));
        let found = verdict(&[undefined]);
        assert_eq!(found.trust, Trust::Undecided);
        assert_eq!(found.finding.map(|f| (f.score, f.standing)), Some((ScoreKind::Excess, Standing::Open)));
        let broken = (ScoreKind::MeanError, Some(estimate(0.2, 1e-3)));
        assert_eq!(verdict(&[open, undefined, broken]).trust, Trust::Rejected);
    }

    #[test]
    fn an_answer_that_is_no_gaussian_is_rejected_without_a_finding() {
        let verdict = judge().verdict(&Err(Invalid::Covariance(-0.25)));
        assert_eq!((verdict.trust, verdict.finding), (Trust::Rejected, None));
        assert_eq!(
            verdict.reason,
            "no Gaussian: its covariance has the eigenvalue -2.500e-1 in reference units: not positive definite"
        );
    }

    #[test]
    fn a_floor_is_judged_by_its_own_limit() {
        let error = 1e-3;
        let known = |value| judge().floor(&Floor::Known(estimate(value, error)));
        assert_eq!(known(0.05 - (T_31 + PRINTED) * error), Standing::Kept);
        assert_eq!(known(0.05 - (T_31 - PRINTED) * error), Standing::Open);
        assert_eq!(known(0.05 + (T_31 - PRINTED) * error), Standing::Open);
        assert_eq!(known(0.05 + (T_31 + PRINTED) * error), Standing::Broken);
        assert_eq!(judge().floor(&Floor::Unbounded), Standing::Open);
        assert_eq!(judge().floor(&Floor::Undefined), Standing::Open);
    }

    #[test]
    fn reasons_name_the_limit_the_direction_and_the_distance() {
        for (kind, estimate, reason) in [
            (
                ScoreKind::NeesRatio,
                Some(estimate(1.32, 2e-3)),
                "update overconfident: expected NEES ratio 1.3200 +- 2.0e-3 is above its limit by a factor of 1.20 \
                 (at most 1.1)",
            ),
            (
                ScoreKind::VarianceRatioLow,
                Some(estimate(0.4, 1e-3)),
                "variance too small: least variance ratio 0.4000 +- 1.0e-3 is below its limit by a factor of 2.00 \
                 (at least 0.8)",
            ),
            (
                ScoreKind::MeanError,
                Some(estimate(0.101, 1e-3)),
                "mean error 0.1010 +- 1.0e-3 is too near its limit to tell (at most 0.1)",
            ),
            (
                ScoreKind::Excess,
                None,
                "excess is undefined: the joint of state and measurement is singular to working precision",
            ),
        ] {
            assert_eq!(verdict(&[(kind, estimate)]).reason, reason);
        }
        let kept = judge().findings(&scores(&[]))[0].sentence();
        assert_eq!(kept, "mean error 0.0000 +- 0.0e0 is inside its limit (at most 0.1)");
    }
}
