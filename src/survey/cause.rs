//! Why a method failed: the leading cause in one sentence, from the numbers.

use nalgebra::{Cholesky, DMatrix, DVector};

use crate::gaussian::Moments;
use crate::reference::Reference;
use crate::score::ScoreKind;
use crate::sensor::{Derivatives, Output, chart_deviation};
use crate::suite::Case;
use crate::trust::Finding;

/// An output that carries this share of a direction speaks for it alone.
const ALONE: f64 = 0.9;

/// The leading cause of a broken limit. `None` where the numbers name none beyond the limit itself.
pub(super) fn leading_cause(
    case: &Case,
    reference: &Reference,
    method: &Moments,
    finding: &Finding,
) -> Option<String> {
    let truth = &reference.moments;
    let scene = Scene { case, truth, method, outputs: case.sensor().outputs() };
    let leading = match (finding.score, finding.side) {
        (ScoreKind::MeanError, _) => scene.bias(),
        (ScoreKind::VarianceRatioLow, _) => scene.spread(true),
        (ScoreKind::VarianceRatioHigh, _) => scene.spread(false),
        (ScoreKind::CrossCovarianceError, _) => scene.coupling(),
        // What an update claims is as wrong as what it is made of: the worst of that leads.
        _ => {
            let all = [scene.bias(), scene.spread(true), scene.spread(false), scene.coupling()];
            all.into_iter().flatten().max_by(|a, b| a.0.total_cmp(&b.0))
        }
    };
    leading.map(|(_, sentence)| sentence)
}

/// How far off something is, in standard deviations, natural logarithms or correlations, and the sentence that says so.
type Cause = (f64, String);

struct Scene<'a> {
    case: &'a Case,
    truth: &'a Moments,
    method: &'a Moments,
    outputs: &'a [Output],
}

impl Scene<'_> {
    fn sd(&self, j: usize) -> f64 {
        self.truth.covariance[(j, j)].sqrt()
    }

    /// The output whose mean is furthest off, beside the shift that the second order makes of it.
    fn bias(&self) -> Option<Cause> {
        let off = chart_deviation(self.outputs, &self.method.mean, &self.truth.mean);
        let in_sd = DVector::from_fn(off.len(), |j, _| off[j] / self.sd(j));
        let (j, off) = in_sd.iter().copied().enumerate().max_by(|a, b| a.1.abs().total_cmp(&b.1.abs()))?;
        // Correlated outputs can all be near their means and still together be far from them.
        let deviation = DVector::from_fn(self.outputs.len(), |j, _| in_sd[j] * self.sd(j));
        let solved = Cholesky::new(self.truth.covariance.clone())?.solve(&deviation);
        let together = deviation.dot(&solved).max(0.0).sqrt();
        if off.abs() < 0.5 * together {
            let weights = DVector::from_fn(self.outputs.len(), |j, _| solved[j] * self.sd(j)).normalize();
            return Some((together, format!("its mean of {} is {together:.2} sd off", self.named(&weights))));
        }
        let shift = self.second_order_shift(j) / self.sd(j);
        let name = &self.outputs[j].name;
        let explained = (off + shift).abs() <= 0.5 * off.abs();
        let beside = if explained {
            format!("it leaves out the second-order shift of {shift:+.2} sd")
        } else if shift.is_finite() {
            format!("the second-order shift is {shift:+.2} sd: the bend beyond second order counts")
        } else {
            return Some((off.abs(), format!("its mean of `{name}` is {off:+.2} sd off")));
        };
        Some((off.abs(), format!("its mean of `{name}` is {off:+.2} sd off; {beside}")))
    }

    /// 1/2 tr(H_j P).
    fn second_order_shift(&self, j: usize) -> f64 {
        let law = self.case.marginal().law();
        let mut at = Derivatives::zeros(law.dimension(), self.outputs.len());
        self.case.sensor().hessians(law.mean().as_slice(), &mut at);
        0.5 * (&at.hessians[j] * law.covariance()).trace()
    }

    /// The direction in which the claimed variance is least, or greatest, against the true one; `None` where that is not on
    /// the side asked for.
    fn spread(&self, least: bool) -> Option<Cause> {
        let p = self.outputs.len();
        let factor = Cholesky::new(self.truth.covariance.clone())?;
        let mut half = self.method.covariance.clone();
        factor.l_dirty().solve_lower_triangular_mut(&mut half);
        let mut ratio = half.transpose();
        factor.l_dirty().solve_lower_triangular_mut(&mut ratio);
        if !ratio.iter().all(|v| v.is_finite()) {
            return None;
        }
        let eigen = ((&ratio + ratio.transpose()) * 0.5).symmetric_eigen();
        let k = if least { eigen.eigenvalues.imin() } else { eigen.eigenvalues.imax() };
        let value = eigen.eigenvalues[k];
        if (value < 1.0) != least {
            return None;
        }
        // The combination u' L^-1 y of outputs, each in its own sd.
        let weights = factor.l().transpose().solve_upper_triangular(&eigen.eigenvectors.column(k).into_owned())?;
        let direction = DVector::from_fn(p, |j, _| weights[j] * self.sd(j)).normalize();
        let sentence = format!("its variance of {} is {value:.2} times the true one", self.named(&direction));
        Some((value.max(f64::MIN_POSITIVE).ln().abs(), sentence))
    }

    /// A direction in words.
    fn named(&self, direction: &DVector<f64>) -> String {
        let largest = direction.iamax();
        if direction[largest].abs() >= ALONE {
            return format!("`{}`", self.outputs[largest].name);
        }
        let mut text = String::new();
        for (weight, output) in direction.iter().zip(self.outputs).filter(|(w, _)| w.abs() >= 0.1) {
            let weight = weight * direction[largest].signum();
            let sign = match (text.is_empty(), weight < 0.0) {
                (true, _) => "",
                (false, true) => " - ",
                (false, false) => " + ",
            };
            let size = if text.is_empty() { weight } else { weight.abs() };
            text.push_str(&format!("{sign}{size:.2} `{}`", output.name));
        }
        format!("{text} (each in its sd)")
    }

    /// The state component and output whose coupling is furthest off.
    fn coupling(&self) -> Option<Cause> {
        let sd = |i: usize| self.case.prior().covariance()[(i, i)].sqrt();
        let (n, p) = self.truth.cross_covariance.shape();
        let correlation = |m: &DMatrix<f64>, i: usize, j: usize| m[(i, j)] / (sd(i) * self.sd(j));
        let entries = (0..n).flat_map(|i| (0..p).map(move |j| (i, j)));
        let off = |&(i, j): &(usize, usize)| {
            let off =
                correlation(&self.method.cross_covariance, i, j) - correlation(&self.truth.cross_covariance, i, j);
            if off.is_finite() { off.abs() } else { 0.0 }
        };
        let (i, j) = entries.max_by(|a, b| off(a).total_cmp(&off(b)))?;
        let (claimed, truth) =
            (correlation(&self.method.cross_covariance, i, j), correlation(&self.truth.cross_covariance, i, j));
        let sentence = format!(
            "it couples state {i} and `{}` by {claimed:+.2} where {truth:+.2} is true (in sd of both)",
            self.outputs[j].name
        );
        Some(((claimed - truth).abs(), sentence))
    }
}
