use nalgebra::DMatrix;

use super::estimate::jackknife;
use super::evaluate::{Invalid, evaluate, validity};
use super::whitened::{Whitened, WhitenedMethod, definite, definite_within_scale};
use super::{Estimate, Floor, ScoreKind};
use crate::gaussian::{Gaussian, Moments, Support};
use crate::reference::Reference;
use crate::sensor::{Output, chart_deviation};

/// Every score of one method on one case.
#[derive(Debug, Clone, PartialEq)]
pub struct Scores([Option<Estimate>; ScoreKind::COUNT]);

impl Scores {
    /// The score with its standard error; `None` where it is undefined, as it is when the joint of state and
    /// measurement is singular (no noise and a linear sensor).
    pub fn get(&self, kind: ScoreKind) -> Option<Estimate> {
        ScoreKind::ALL.iter().position(|&k| k == kind).and_then(|i| self.0[i])
    }

    /// Scores given one by one, such as those read back from a table.
    pub fn given(score: impl FnMut(ScoreKind) -> Option<Estimate>) -> Self {
        Self(ScoreKind::ALL.map(score))
    }

    /// Made-up scores, for tests of what is made of them.
    #[cfg(test)]
    pub(crate) fn made_up(score: impl Fn(ScoreKind) -> Option<Estimate>) -> Self {
        Self::given(score)
    }
}

/// One estimate of the reference, ready to be compared with.
#[derive(Debug, Clone)]
struct Yardstick {
    moments: Moments,
    whitened: Option<Whitened>,
}

/// Scores methods on one case against its reference: the whitening of the reference and of its leave-one-out
/// estimates is done once and shared by all methods.
#[derive(Debug, Clone)]
pub struct Scorer<'a> {
    outputs: &'a [Output],
    support: Support,
    whole: Yardstick,
    left_out: Vec<Yardstick>,
}

impl<'a> Scorer<'a> {
    /// A scorer for a case with this prior (n), these outputs (p) and this reference.
    pub fn new(prior: &Gaussian, outputs: &'a [Output], reference: &Reference) -> Self {
        let support = Support::of(prior.covariance());
        let yardstick = |moments: Moments| Yardstick { whitened: Whitened::new(&moments, &support), moments };
        let whole = yardstick(reference.moments.clone());
        let left_out = leave_one_out(&reference.replicates).map(yardstick).collect();
        Self { outputs, support, whole, left_out }
    }

    /// Whether the reference covariance is positive definite, without which nothing can be scored.
    pub fn is_defined(&self) -> bool {
        self.whole.whitened.is_some()
    }

    /// Whether the prior has variance in some direction, without which there is nothing to update.
    pub fn has_update(&self) -> bool {
        self.support.rank() > 0
    }

    /// Every score of a method's moments, each with its jackknife standard error over the replicates.
    ///
    /// # Errors
    /// [`Invalid`] when the method's answer is no Gaussian: a result of the method, not a failure of ours.
    pub fn score(&self, method: &Moments) -> Result<Scores, Invalid> {
        if !method.is_finite() {
            return Err(Invalid::NotFinite);
        }
        let Some((whitened, own)) = self.compare(&self.whole, method) else {
            return Ok(Scores([None; ScoreKind::COUNT]));
        };
        validity(&own)?;
        let whole = evaluate(whitened, &own);
        let left_out: Vec<[f64; ScoreKind::COUNT]> = self
            .left_out
            .iter()
            .map(|y| self.compare(y, method).map_or([f64::NAN; ScoreKind::COUNT], |(w, m)| evaluate(w, &m)))
            .collect();
        Ok(Scores(std::array::from_fn(|k| {
            let column: Vec<f64> = left_out.iter().map(|row| row[k]).collect();
            jackknife(whole[k], &column)
        })))
    }

    /// By how much the scores of `method` are above those of `other`, both on this reference, each with the jackknife
    /// standard error of the difference: what the reference leaves to chance shifts both alike and mostly falls out.
    /// `None` where one of the two is no Gaussian.
    pub fn difference(&self, method: &Moments, other: &Moments) -> Option<Scores> {
        let at = |yardstick: &Yardstick, moments: &Moments| -> Option<[f64; ScoreKind::COUNT]> {
            let (whitened, own) = self.compare(yardstick, moments)?;
            validity(&own).ok()?;
            Some(evaluate(whitened, &own))
        };
        let differences = |yardstick: &Yardstick| -> Option<[f64; ScoreKind::COUNT]> {
            let (a, b) = (at(yardstick, method)?, at(yardstick, other)?);
            Some(std::array::from_fn(|k| a[k] - b[k]))
        };
        let whole = differences(&self.whole)?;
        let left_out: Vec<_> = self.left_out.iter().map(differences).collect::<Option<_>>()?;
        Some(Scores(std::array::from_fn(|k| {
            let column: Vec<f64> = left_out.iter().map(|row| row[k]).collect();
            jackknife(whole[k], &column)
        })))
    }

    /// The floor of the case under the noise R (p x p).
    pub fn floor(&self, noise: Option<&DMatrix<f64>>) -> Floor {
        let Some(noise) = noise.filter(|r| definite_within_scale(r).is_some()) else {
            return Floor::Unbounded;
        };
        let left_out: Vec<f64> = self.left_out.iter().map(|y| y.floor(noise).unwrap_or(f64::NAN)).collect();
        let whole = self.whole.floor(noise).unwrap_or(f64::NAN);
        jackknife(whole, &left_out).map_or(Floor::Undefined, Floor::Known)
    }

    fn compare<'y>(&self, yardstick: &'y Yardstick, method: &Moments) -> Option<(&'y Whitened, WhitenedMethod)> {
        let whitened = yardstick.whitened.as_ref()?;
        let shift = chart_deviation(self.outputs, &yardstick.moments.mean, &method.mean);
        Some((whitened, whitened.method(method, &shift, &self.support)))
    }
}

impl Yardstick {
    fn floor(&self, noise: &DMatrix<f64>) -> Option<f64> {
        let whitened = self.whitened.as_ref()?;
        let noise = whitened.both_sides(noise).cholesky()?;
        let residual = definite(&whitened.residual)?;
        Some(0.5 * (residual.ln_determinant() - noise.ln_determinant()))
    }
}

/// The mean of all replicates but one, for each in turn.
fn leave_one_out(replicates: &[Moments]) -> impl Iterator<Item = Moments> {
    let mut total = replicates[0].clone();
    for r in &replicates[1..] {
        total.mean += &r.mean;
        total.covariance += &r.covariance;
        total.cross_covariance += &r.cross_covariance;
    }
    let scale = 1.0 / (replicates.len() as f64 - 1.0);
    replicates.iter().map(move |r| Moments {
        mean: (&total.mean - &r.mean) * scale,
        covariance: (&total.covariance - &r.covariance) * scale,
        cross_covariance: (&total.cross_covariance - &r.cross_covariance) * scale,
    })
}
