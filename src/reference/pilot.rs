use nalgebra::{Cholesky, DMatrix, DVector};
use rand::RngExt;
use rand_distr::StandardNormal;
use rand_pcg::Pcg64Dxsm;

use super::basis::Basis;
use super::block::Block;
use super::chart::CircularSum;
use super::columns::{add_dots_at, add_totals_at};
use super::control::{Controls, Means, Regression};
use super::stream::Key;
use super::sums::Sums;
use crate::gaussian::Gaussian;
use crate::lanes::Level;
use crate::net::{BLOCK, Net};
use crate::sensor::Sensor;

/// Blocks that a replicate starts with.
pub(super) const FIRST_BLOCKS: u64 = 4;
/// Blocks of the linear fit, and again of the regression on control variates.
const FIT_BLOCKS: u64 = 16;
/// Small nets on which the degrees of control variates are tried, and blocks of each.
const TRIALS: u64 = 16;
const TRIAL_BLOCKS: u64 = 2;
/// Most control variates: beyond, least squares on the pilot's 4096 points would be noise.
const MOST_CONTROLS: usize = 300;
/// A deviation beyond this \[rad\] in the pilot makes an angle a far one.
const FAR: f64 = 1.0;

/// What is asked of a case, as its sampler sees it: the sensor on the components that it reads.
#[derive(Debug)]
pub(super) struct Question<'a> {
    pub sensor: &'a dyn Sensor,
    /// Prior of the read components (a).
    pub prior: &'a Gaussian,
    /// Square root of its covariance (a x a).
    pub root: DMatrix<f64>,
    pub angular: Vec<bool>,
    pub key: Key,
    pub level: Level,
}

impl Question<'_> {
    pub fn inputs(&self) -> usize {
        self.prior.dimension()
    }

    pub fn outputs(&self) -> usize {
        self.angular.len()
    }

    /// h of the normals that the block holds.
    pub fn evaluate(&self, block: &mut Block) {
        block.evaluate(self.sensor, self.prior.mean(), &self.root);
    }
}

/// Fills a block with normals from a plain stream.
pub(super) fn take_stream(block: &mut Block, rng: &mut Pcg64Dxsm) {
    for z in block.z.as_flattened_mut() {
        *z = rng.sample(StandardNormal);
    }
}

/// What a first look at a case fixes for all replicates. It has streams of its own: given the pilot, replicates are
/// independent and unbiased.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Pilot {
    /// About where each output lies (p): the mean, the circular mean where angular.
    pub centre: DVector<f64>,
    /// Linear fit of the deviation on z (p x a): it is subtracted from every sample, and its known moments are put
    /// back.
    pub slope: DMatrix<f64>,
    /// Angular outputs whose samples come far from the centre, so that the place of the cut matters.
    pub far: Vec<bool>,
    /// How far each chart may have to move after the first blocks \[rad\]; `None` where an output is plain.
    pub bands: Vec<Option<f64>>,
    /// Control variates that pay.
    pub controls: Controls,
}

impl Pilot {
    pub fn run(question: &Question<'_>) -> Self {
        let mut pilot = Self::fit(question);
        pilot.controls = pilot.choose_controls(question);
        pilot
    }

    /// Centre and linear fit.
    fn fit(question: &Question<'_>) -> Self {
        let (a, p) = (question.inputs(), question.outputs());
        let basis = Basis::new(a, 0);
        let mut block = Block::new(question.level, a, p, &basis);
        let mut centre = first_centre(question, &mut block);
        let nothing = DMatrix::zeros(p, a);
        let mut zz = DMatrix::zeros(a, a);
        let mut zd = DMatrix::zeros(a, p);
        let (mut z_sum, mut d_sum) = (DVector::zeros(a), DVector::zeros(p));
        let mut circles = vec![CircularSum::default(); p];
        let mut far = vec![false; p];
        for b in 0..FIT_BLOCKS {
            take_stream(&mut block, &mut question.key.pilot(b));
            question.evaluate(&mut block);
            block.subtract(&centre, &question.angular, &nothing);
            for (j, d) in block.deviation.iter().enumerate() {
                if question.angular[j] {
                    circles[j].add(d);
                    far[j] |= d.iter().any(|d| d.abs() > FAR);
                }
                add_dots_at(question.level, d, &block.z, &mut zd.as_mut_slice()[j * a..(j + 1) * a]);
            }
            for (i, z) in block.z.iter().enumerate() {
                add_dots_at(question.level, z, &block.z, &mut zz.as_mut_slice()[i * a..(i + 1) * a]);
            }
            add_totals_at(question.level, &block.deviation, d_sum.as_mut_slice());
            add_totals_at(question.level, &block.z, z_sum.as_mut_slice());
        }
        // Least squares, not the covariance with z: on a linear sensor the fit is then exact and nothing is left to
        // chance, however small the noise is beside the spread.
        let count = (FIT_BLOCKS * BLOCK as u64) as f64;
        zz.ger(-1.0 / count, &z_sum, &z_sum, 1.0);
        zd.ger(-1.0 / count, &z_sum, &d_sum, 1.0);
        let slope = Cholesky::new(zz)
            .map(|zz| zz.solve(&zd).transpose())
            .filter(|slope| slope.iter().all(|v| v.is_finite()))
            .unwrap_or(nothing);
        for j in 0..p {
            let step = if question.angular[j] {
                circles[j].direction()
            } else {
                // The mean of the residual, where z has mean zero.
                (d_sum[j] - slope.row(j).transpose().dot(&z_sum)) / count
            };
            if step.is_finite() {
                centre[j] += step;
            }
        }
        let bands = (0..p)
            .map(|j| {
                let first = if far[j] { FIRST_BLOCKS } else { 1 };
                question.angular[j].then(|| circles[j].band((first * BLOCK as u64) as f64))
            })
            .collect();
        Self { centre, slope, far, bands, controls: Controls::none(a, p) }
    }

    /// The degree of control variates that promises the least product of variance and cost, measured on small nets.
    fn choose_controls(&self, question: &Question<'_>) -> Controls {
        let (a, p) = (question.inputs(), question.outputs());
        let degrees: Vec<usize> = [2, 4].into_iter().filter(|&d| Basis::count(a, d) <= MOST_CONTROLS).collect();
        let Some(&highest) = degrees.last() else { return Controls::none(a, p) };
        let mut regression = Regression::new(a, p, highest);
        let mut block = Block::new(question.level, a, p, &Basis::new(a, highest));
        for b in FIT_BLOCKS..2 * FIT_BLOCKS {
            take_stream(&mut block, &mut question.key.pilot(b));
            question.evaluate(&mut block);
            block.subtract(&self.centre, &question.angular, &self.slope);
            regression.add(&block, question.level);
        }
        let candidates: Vec<Controls> = std::iter::once(Controls::none(a, p))
            .chain(degrees.iter().map(|&d| regression.solve(d, a, p)))
            .collect();
        let trials = self.trials(question, highest);
        let price = |controls: &Controls| worst_variance(controls, &trials, self) * cost(controls, a, p);
        let mut best = 0;
        for candidate in 1..candidates.len() {
            // A variance from sixteen trials is known to a third: a dearer degree must win clearly.
            if price(&candidates[candidate]) < 0.7 * price(&candidates[best]) {
                best = candidate;
            }
        }
        candidates.into_iter().nth(best).unwrap_or_else(|| Controls::none(a, p))
    }

    /// Sums over small nets of their own scrambling; empty where nets do not reach.
    fn trials(&self, question: &Question<'_>, degree: usize) -> Vec<Sums> {
        let (a, p) = (question.inputs(), question.outputs());
        let basis = Basis::new(a, degree);
        let mut block = Block::new(question.level, a, p, &basis);
        (0..TRIALS)
            .filter_map(|t| {
                let net = Net::new(&question.key.trial(), t, a, (TRIAL_BLOCKS * BLOCK as u64).ilog2()).ok()?;
                let mut sums = Sums::empty(a, p, basis.len());
                for b in 0..TRIAL_BLOCKS {
                    block.take_net(&net, b);
                    question.evaluate(&mut block);
                    block.subtract(&self.centre, &question.angular, &self.slope);
                    block.add_to(&mut sums, &basis);
                }
                Some(sums)
            })
            .collect()
    }
}

/// Largest variance over the trials of any integrand's mean, in the natural scale of its moment.
fn worst_variance(controls: &Controls, trials: &[Sums], pilot: &Pilot) -> f64 {
    let means: Vec<Means> = trials.iter().map(|sums| controls.means(sums)).collect();
    let Some(first) = means.first() else { return 0.0 };
    let p = first.e.len();
    let variance = |of: &dyn Fn(&Means) -> f64| {
        let count = means.len() as f64;
        let mean = means.iter().map(of).sum::<f64>() / count;
        means.iter().map(|m| (of(m) - mean) * (of(m) - mean)).sum::<f64>() / count
    };
    let spread: Vec<f64> = (0..p)
        .map(|j| {
            let residual = means.iter().map(|m| m.ee[Sums::pair(j, j)]).sum::<f64>() / means.len() as f64;
            pilot.slope.row(j).norm_squared() + residual.max(0.0)
        })
        .collect();
    let a = first.ze.len() / p;
    let mut worst: f64 = 0.0;
    for j in 0..p {
        worst = worst.max(variance(&|m| m.e[j]) / spread[j]);
        for k in 0..=j {
            worst = worst.max(variance(&|m| m.ee[Sums::pair(j, k)]) / (spread[j] * spread[k]));
        }
        for i in 0..a {
            worst = worst.max(variance(&|m| m.ze[j * a + i]) / spread[j]);
        }
    }
    worst
}

/// What a sample costs, in the time of one sum of products: a figure for choosing, fixed so that the choice, and with
/// it every bit of a result, does not depend on the machine. Measured: a normal is about 40 sums, a sensor about 30
/// an output.
fn cost(controls: &Controls, a: usize, p: usize) -> f64 {
    let sums = a + p + p * (p + 1) / 2 + a * p;
    (40 * a + 30 * p + sums + controls.basis.columns() + controls.basis.len()) as f64
}

/// A first centre from the first block: the value of its first point where plain (any value near enough keeps
/// the digits), the circular mean where angular.
fn first_centre(question: &Question<'_>, block: &mut Block) -> DVector<f64> {
    take_stream(block, &mut question.key.pilot(0));
    question.evaluate(block);
    DVector::from_fn(question.outputs(), |j, _| {
        let values = &block.deviation[j];
        let centre = if question.angular[j] {
            let mut circle = CircularSum::default();
            circle.add(values);
            circle.direction()
        } else {
            values[0]
        };
        if centre.is_finite() { centre } else { 0.0 }
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::suite::Suite;
    use rayon::prelude::*;

    /// Over every bundled case the chosen control variates are held against none, on the same 64 nets of 512 points of
    /// their own: the product of variance and cost a sample must not be more than 5 % above, and should mostly be far
    /// below.
    #[test]
    fn control_variates_never_cost_more_than_they_give() {
        let cases: Vec<_> =
            Suite::bundled().iter().flat_map(|b| Suite::load(b.name, None).unwrap().cases).collect();
        let mut ratios: Vec<f64> = cases
            .par_iter()
            .map(|case| {
                let law = case.marginal().law();
                let question = Question {
                    sensor: case.sensor(),
                    prior: law,
                    root: law.root(),
                    angular: case.sensor().outputs().iter().map(|o| o.angular).collect(),
                    key: Key::new(1, &case.question()),
                    level: Level::best(),
                };
                let pilot = Pilot::run(&question);
                let fresh = Question { key: Key::new(2, &case.question()), ..question };
                let (a, p) = (fresh.inputs(), fresh.outputs());
                let trials: Vec<Sums> = (0..4)
                    .flat_map(|k| {
                        let key = Key::new(3 + k, &case.question());
                        pilot.trials(
                            &Question { key, root: fresh.root.clone(), angular: fresh.angular.clone(), ..fresh },
                            4,
                        )
                    })
                    .collect();
                let price = |controls: &Controls| worst_variance(controls, &trials, &pilot) * cost(controls, a, p);
                let (chosen, none) = (price(&pilot.controls), price(&Controls::none(a, p)));
                if none > 0.0 { chosen / none } else { 1.0 }
            })
            .collect();
        ratios.sort_by(f64::total_cmp);
        let (median, worst) = (ratios[ratios.len() / 2], ratios[ratios.len() - 1]);
        println!(
            "variance times cost against none: median {median:.2e}, worst {worst:.3} of {} cases",
            ratios.len()
        );
        assert!(worst <= 1.05, "{worst}");
        assert!(median < 0.1, "{median}");
    }
}
