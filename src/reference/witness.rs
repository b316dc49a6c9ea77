//! The witness: the same moments by another way, so that a fault of the first is seen.

use nalgebra::{DMatrix, DVector};
use rand::RngExt;
use rand_distr::StandardNormal;
use statrs::distribution::{ContinuousCDF, StudentsT};

use super::basis::Basis;
use super::block::Block;
use super::estimate::combine;
use super::foresight::{Foresight, reach_out};
use super::pilot::Question;
use super::tails::fit_pareto;
use crate::gaussian::{Moments, SquareRoot, wrap};
use crate::net::{BLOCK, Net};
use crate::sensor::Output;

/// Batches of the witness: their spread gives its standard errors.
const BATCHES: u64 = 32;
/// Samples of a batch.
const BATCH: usize = 2048;
/// Odds of disputing a true reference, over all its entries together.
const FALSE_DISPUTE: f64 = 1e-6;
/// Share of an entry's natural scale that counts as rounding.
const ROUNDING: f64 = 1e-9;
/// From this shape of the tail on the variance does not exist.
const NO_VARIANCE: f64 = 0.5;
/// From this shape of the tail on the fourth moment does not exist: the standard error of a variance cannot be
/// believed.
const NO_FOURTH_MOMENT: f64 = 0.25;

/// One point of the look ahead that carries this share of a fourth moment dominates it. Ours, no source.
const DOMINANT: f64 = 0.1;

/// What the witness says of a reference.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Testimony {
    /// Nothing against it.
    Agrees,
    /// The two estimates disagree beyond what chance allows.
    Disagrees(String),
    /// A standard error cannot be believed.
    HeavyTail(String),
    /// A variance does not exist.
    NoVariance(String),
}

/// Hears the witness: an independent plain Monte Carlo estimate, with its own streams, the machine's mathematical
/// library, one point at a time, and the noise sampled instead of added.
///
/// `moments` and `error` are the reference's on the read components (C is a x p), from so many replicates, `chart` the
/// centres of its charts.
/// They are disputed when an entry differs by more than Student's t law of the batches allows at odds of 1e-6 over
/// all entries. The witness's standard error is that of its batches or, where that is larger, what the spread of
/// each integrand over a net predicts: rare large samples that no batch happened to draw must not make it look
/// surer than it is.
///
/// Tails: a generalised Pareto law is fitted to the 3 sqrt(N) largest deviations of each output, and again to the
/// largest eighth of these. An angle is bounded and needs no fit.
pub(super) fn hear(
    question: &Question<'_>,
    noise: &DMatrix<f64>,
    chart: &DVector<f64>,
    moments: &Moments,
    (error, replicates): (&Moments, usize),
    foresight: &Foresight,
) -> Testimony {
    let outputs = question.sensor.outputs();
    let sample = Sample::draw(question, noise, chart);
    for (j, output) in outputs.iter().enumerate().filter(|(_, o)| !o.angular) {
        // Where samples that reach further out know the fourth moment, it exists, whatever the fit says: a saturating
        // sensor seen far from its bound has a tail like a lognormal's.
        let known = foresight.dominance(j).is_some_and(|share| share < DOMINANT);
        if !known && let Some(testimony) = tail(output, &sample.deviations[j]) {
            return testimony;
        }
    }
    let spread = Spread::measure(question, noise, chart, moments);
    disagreement(question, &sample, spread.as_ref(), moments, (error, replicates)).unwrap_or(Testimony::Agrees)
}

/// The witness's estimate.
struct Sample {
    moments: Moments,
    error: Moments,
    /// Deviations of each output from its chart's centre, all batches.
    deviations: Vec<Vec<f64>>,
}

impl Sample {
    fn draw(question: &Question<'_>, noise: &DMatrix<f64>, chart: &DVector<f64>) -> Self {
        let (a, p) = (question.inputs(), question.outputs());
        let noise_root = SquareRoot::of(noise).into_factor();
        let mut deviations = vec![Vec::with_capacity(BATCHES as usize * BATCH); p];
        let [mut z, mut dx, mut x] = [(); 3].map(|()| vec![0.0; a * BATCH]);
        let [mut w, mut y] = [(); 2].map(|()| vec![0.0; p * BATCH]);
        let batches: Vec<Moments> = (0..BATCHES)
            .map(|b| {
                let mut rng = question.key.witness(b);
                z.iter_mut().chain(w.iter_mut()).for_each(|v| *v = rng.sample(StandardNormal));
                for i in 0..a {
                    let row = &mut dx[i * BATCH..(i + 1) * BATCH];
                    row.fill(0.0);
                    (0..a).for_each(|k| add_scaled(row, question.root[(i, k)], &z[k * BATCH..(k + 1) * BATCH]));
                    let mean = question.prior.mean()[i];
                    x[i * BATCH..(i + 1) * BATCH].iter_mut().zip(row.iter()).for_each(|(x, d)| *x = mean + d);
                }
                question.sensor.values(BATCH, &x, &mut y);
                for j in 0..p {
                    let row = &mut y[j * BATCH..(j + 1) * BATCH];
                    row.iter_mut().for_each(|v| *v -= chart[j]);
                    if question.angular[j] {
                        row.iter_mut().for_each(|v| *v = wrap(*v));
                    }
                    (0..p).for_each(|k| add_scaled(row, noise_root[(j, k)], &w[k * BATCH..(k + 1) * BATCH]));
                    deviations[j].extend_from_slice(row);
                }
                dx.chunks_exact_mut(BATCH).for_each(|row| {
                    centre(row);
                });
                let mean = DVector::from_iterator(p, y.chunks_exact_mut(BATCH).map(centre));
                let product = |left: &[f64], right: &[f64]| dot(left, right) / (BATCH - 1) as f64;
                Moments {
                    mean: chart + mean,
                    covariance: DMatrix::from_fn(p, p, |j, k| product(column(&y, j), column(&y, k))),
                    cross_covariance: DMatrix::from_fn(a, p, |i, j| product(column(&dx, i), column(&y, j))),
                }
            })
            .collect();
        let (moments, error) = combine(&batches);
        Self { moments, error, deviations }
    }
}

fn column(columns: &[f64], i: usize) -> &[f64] {
    &columns[i * BATCH..(i + 1) * BATCH]
}

/// Takes the mean out of a column and returns it.
fn centre(column: &mut [f64]) -> f64 {
    let mean = in_lanes(column, |k| column[k]) / column.len() as f64;
    column.iter_mut().for_each(|v| *v -= mean);
    mean
}

fn dot(left: &[f64], right: &[f64]) -> f64 {
    in_lanes(left, |k| left[k] * right[k])
}

/// Sum of `term` over the places of `column` in eight fixed lanes: one sum would wait for every addition.
fn in_lanes(column: &[f64], term: impl Fn(usize) -> f64) -> f64 {
    let mut lanes = [0.0; 8];
    for k in 0..column.len() {
        lanes[k % 8] += term(k);
    }
    lanes.iter().sum()
}

fn add_scaled(to: &mut [f64], factor: f64, from: &[f64]) {
    if factor != 0.0 {
        to.iter_mut().zip(from).for_each(|(t, f)| *t += factor * f);
    }
}

/// Standard errors that a sample of the witness's size has, from the variances of its integrands over a net that
/// reaches further out than the prior ([`Foresight`]): rare samples are weighed though none may have been met.
struct Spread(Moments);

impl Spread {
    const LOG2: u32 = 13;

    /// `None` where nets do not reach.
    fn measure(
        question: &Question<'_>,
        noise: &DMatrix<f64>,
        chart: &DVector<f64>,
        moments: &Moments,
    ) -> Option<Self> {
        let (a, p) = (question.inputs(), question.outputs());
        let key = question.key.spread();
        let net = Net::new(&key, 0, a, Self::LOG2).ok()?;
        let noise_root = SquareRoot::of(noise).into_factor();
        let mut block = Block::new(question.level, a, p, &Basis::new(a, 0));
        let (mut first, mut second) = (Moments::zeros(a, p), Moments::zeros(a, p));
        // Deviations are counted from the chart's centre, the reference's mean lies this far from it.
        let offset = DVector::from_fn(p, |j, _| {
            let d = moments.mean[j] - chart[j];
            if question.angular[j] { wrap(d) } else { d }
        });
        let (mut z, mut w) = (DVector::zeros(a), DVector::zeros(p));
        for b in 0..net.blocks() {
            block.take_net(&net, b);
            let weights = reach_out(&mut block.z);
            question.evaluate(&mut block);
            block.subtract(chart, &question.angular, &DMatrix::zeros(p, a));
            let mut rng = key.witness(b);
            for k in 0..BLOCK {
                z.iter_mut().zip(&block.z).for_each(|(to, from)| *to = from[k]);
                w.iter_mut().for_each(|v| *v = rng.sample(StandardNormal));
                let mut d = DVector::from_fn(p, |j, _| block.deviation[j][k]) - &offset;
                d.gemv(1.0, &noise_root, &w, 1.0);
                let dx = &question.root * &z;
                add(&mut first, &d, &dx, |v| weights[k] * v);
                add(&mut second, &d, &dx, |v| weights[k] * v * v);
            }
        }
        let count = (net.blocks() * BLOCK as u64) as f64;
        let samples = (BATCHES * BATCH as u64) as f64;
        let error = |first: f64, second: f64| {
            let mean = first / count;
            ((second / count - mean * mean).max(0.0) / samples).sqrt()
        };
        Some(Self(Moments {
            mean: first.mean.zip_map(&second.mean, error),
            covariance: first.covariance.zip_map(&second.covariance, error),
            cross_covariance: first.cross_covariance.zip_map(&second.cross_covariance, error),
        }))
    }
}

/// Adds f of every integrand at one sample.
fn add(to: &mut Moments, d: &DVector<f64>, dx: &DVector<f64>, f: impl Fn(f64) -> f64) {
    for j in 0..d.len() {
        to.mean[j] += f(d[j]);
        for k in 0..d.len() {
            to.covariance[(j, k)] += f(d[j] * d[k]);
        }
        for i in 0..dx.len() {
            to.cross_covariance[(i, j)] += f(dx[i] * d[j]);
        }
    }
}

fn disagreement(
    question: &Question<'_>,
    sample: &Sample,
    spread: Option<&Spread>,
    moments: &Moments,
    (error, replicates): (&Moments, usize),
) -> Option<Testimony> {
    let (a, p) = (question.inputs(), question.outputs());
    let entries = (p + p * (p + 1) / 2 + a * p) as f64;
    // The fewer of the two sides' replicates decide how far chance goes.
    let freedom = (BATCHES - 1).min(replicates as u64 - 1);
    let law = StudentsT::new(0.0, 1.0, freedom as f64).ok()?;
    let bound = -law.inverse_cdf(FALSE_DISPUTE / (2.0 * entries));
    let outputs = question.sensor.outputs();
    let sd = |j: usize| moments.covariance[(j, j)].max(0.0).sqrt();
    let state_sd = |i: usize| question.prior.covariance()[(i, i)].sqrt();
    let predicted = |pick: &dyn Fn(&Moments) -> f64| spread.map_or(0.0, |s| pick(&s.0));
    let dispute = |what: &dyn Fn() -> String, wrapped: bool, scale: f64, pick: &dyn Fn(&Moments) -> f64| {
        let difference = pick(moments) - pick(&sample.moments);
        let difference = if wrapped { wrap(difference) } else { difference };
        let own = pick(&sample.error).max(predicted(pick));
        let ratio = difference.abs() / own.hypot(pick(error));
        // A NaN on either side disputes too.
        let beyond = difference.abs() > ROUNDING * scale && ratio > bound || difference.is_nan();
        beyond.then(|| {
            Testimony::Disagrees(format!(
                "{} is {:.6e}, an independent plain estimate says {:.6e}: {ratio:.1} standard errors apart, chance \
                 allows {bound:.1}",
                what(),
                pick(moments),
                pick(&sample.moments)
            ))
        })
    };
    for j in 0..p {
        let name = || format!("the mean of `{}`", outputs[j].name);
        if let Some(found) = dispute(&name, question.angular[j], sd(j), &|m| m.mean[j]) {
            return Some(found);
        }
        for k in 0..=j {
            let name = || format!("the covariance of `{}` and `{}`", outputs[j].name, outputs[k].name);
            if let Some(found) = dispute(&name, false, sd(j) * sd(k), &|m| m.covariance[(j, k)]) {
                return Some(found);
            }
        }
        for i in 0..a {
            let component = question.sensor.reads()[i];
            let name = || format!("the covariance of state {component} and `{}`", outputs[j].name);
            if let Some(found) = dispute(&name, false, state_sd(i) * sd(j), &|m| m.cross_covariance[(i, j)]) {
                return Some(found);
            }
        }
    }
    None
}

/// What the largest of an output's deviations say of its tail.
fn tail(output: &Output, deviations: &[f64]) -> Option<Testimony> {
    let mean = deviations.iter().sum::<f64>() / deviations.len() as f64;
    let mut sizes: Vec<f64> = deviations.iter().map(|d| (d - mean).abs()).collect();
    if sizes.iter().any(|v| !v.is_finite()) {
        return Some(Testimony::NoVariance(format!("output `{}` is not finite at every sample", output.name)));
    }
    let largest = (3.0 * (sizes.len() as f64).sqrt()) as usize;
    let cut = sizes.len() - largest - 1;
    let (_, &mut threshold, top) = sizes.select_nth_unstable_by(cut, f64::total_cmp);
    let mut exceedances: Vec<f64> = top.iter().map(|v| v - threshold).filter(|v| *v > 0.0).collect();
    exceedances.sort_by(f64::total_cmp);
    if exceedances.len() < 64 {
        // Nearly all of the largest are equal: there is no tail.
        return None;
    }
    // An output that is bounded but rarely flips (a saturated sensor) has a few large deviations above many small ones,
    // which looks heavy; its very largest then all lie at the bound. A true tail is as heavy there too.
    let largest_few = &exceedances[exceedances.len() - exceedances.len() / 8..];
    let base = exceedances[exceedances.len() - largest_few.len() - 1];
    let few: Vec<f64> = largest_few.iter().map(|v| v - base).filter(|v| *v > 0.0).collect();
    let upper = fit_pareto(&few).map_or(f64::NEG_INFINITY, |fit| {
        // Two standard errors of the estimate, (1 + shape) / sqrt(n) (Zhang & Stephens 2009, from memory).
        fit.shape + 2.0 * (1.0 + fit.shape).max(0.0) / (few.len() as f64).sqrt()
    });
    let shape = fit_pareto(&exceedances)?.shape.min(upper);
    let tell = |moment: &str| {
        format!(
            "the tail of output `{}` has the shape {shape:.2} (generalised Pareto law of its {} largest deviations): \
             {moment}",
            output.name,
            exceedances.len()
        )
    };
    if shape >= NO_VARIANCE {
        Some(Testimony::NoVariance(tell("its variance does not exist")))
    } else if shape >= NO_FOURTH_MOMENT {
        Some(Testimony::HeavyTail(tell("its fourth moment does not exist, so no standard error can be believed")))
    } else {
        None
    }
}
