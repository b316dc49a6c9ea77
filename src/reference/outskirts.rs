use nalgebra::DMatrix;

use super::block::Block;
use super::columns::Column;
use super::control::Residuals;
use super::estimate::combine;
use super::pilot::{Pilot, Question};
use super::sums::Sums;
use crate::gaussian::Moments;
use crate::lanes::{Simd, Task, dispatch};
use crate::net::BLOCK;

/// A region is out of sight while fewer samples than this are expected in it: 97 of 100 references have none there. Ours,
/// chosen by the coverage of 95 % intervals on closed-form cases: 0.1 covers 97 %, 0.05 96.2 %, 0.03 95.7 %, none 94 %.
const UNSEEN: f64 = 0.03;
/// Most products of a control with an integrand that a point costs on average over all blocks of the look ahead.
const MOST_PRODUCTS: usize = 256;
/// Fewest blocks that are looked at.
const FEWEST_BLOCKS: usize = 16;
/// Where the largest |r| lie this many times above what is well seen, there is a gap, and beyond it a rare event: not the
/// end of a tail that a net's layers still reach, but something that happens or not. Ours: at 8 the smooth tails of
/// closed-form cases count too (95 % intervals cover 98 %), at 128 none does, and a bearing's half turn is 1000 and more.
const GAP: f64 = 128.0;
/// A rare event is counted here until so many are expected: with thirty the samples show it themselves. Ours, no source.
const SEEN: f64 = 30.0;
/// What is well seen: so many samples lie above the level that a gap is measured from.
const WELL_SEEN: f64 = 3.0 * SEEN;
/// A spread below this share of the value is the rounding of equal replicates.
const ROUNDING: f64 = 64.0 * f64::EPSILON;
/// Levels of |r| that are told apart, four an octave below the largest.
const LEVELS: usize = 256;
/// Bits below the exponent's last two of the fraction.
const LEVEL_SHIFT: u32 = 50;

/// What samples too rare to have been met add to the variance of each moment's estimate.
///
/// Of N samples, N P fall in a region of probability P; where that is far below one, the replicates agree about a moment
/// to which none of them has seen the region add. Its variance in the estimate,
///
/// > V = E\[r^2; region\] / N
///
/// with r what the control variates leave of the moment's integrand, is computed by importance sampling over the largest
/// |r| with N P = 0.03, and added to the spread of the replicates. Without it one smooth case in 200 had an entry more than
/// five standard errors off, where chance allows one in 4000.
///
/// A rare event, such as a ship behind the buoy that hears it, lies beyond a gap in |r|. It counts whole until N P = 30:
/// with N P = 2 it is missed by one reference in seven, and whoever has missed it agrees with himself perfectly.
///
/// Source: importance sampling with an inflated covariance, A. B. Owen, Monte Carlo theory, methods and examples (2013),
/// ch. 9 (chapter from memory); the region is ours.
#[derive(Debug, Clone, Default)]
pub(super) struct Outskirts {
    /// One a moment: means, covariances packed by rows, cross-covariances output by output.
    tails: Vec<Tail>,
    inputs: usize,
    outputs: usize,
}

/// Sums over the points with |r| above a level, the highest level first.
#[derive(Debug, Clone, Default)]
struct Tail(Vec<Above>);

#[derive(Debug, Clone, Copy)]
struct Above {
    /// |r| at the lower end of the level, to a quarter of an octave.
    level: f64,
    probability: f64,
    /// E\[r^2; above\].
    square: f64,
}

impl Tail {
    /// Of the points' |r| and weights.
    fn of(r: &[f64], weights: &[f64]) -> Self {
        let counts = |r: f64, weight: f64| (weight * r * r).is_finite();
        let largest = r
            .iter()
            .zip(weights)
            .filter(|&(&r, &w)| counts(r, w))
            .fold(0.0_f64, |largest, (r, _)| largest.max(r.abs()));
        let top = largest.to_bits() >> LEVEL_SHIFT;
        let mut levels: [Above; LEVELS] = std::array::from_fn(|below| {
            let level = f64::from_bits(top.saturating_sub(below as u64) << LEVEL_SHIFT);
            Above { level, probability: 0.0, square: 0.0 }
        });
        for (&r, &weight) in r.iter().zip(weights) {
            if counts(r, weight) {
                let below = (top - (r.abs().to_bits() >> LEVEL_SHIFT)) as usize;
                let level = &mut levels[below.min(LEVELS - 1)];
                level.probability += weight;
                level.square += weight * r * r;
            }
        }
        let scale = 1.0 / r.len() as f64;
        let (mut probability, mut square) = (0.0, 0.0);
        let mut tail = Vec::new();
        for level in levels.iter().filter(|level| level.probability > 0.0) {
            probability += level.probability * scale;
            square += level.square * scale;
            tail.push(Above { level: level.level, probability, square });
        }
        Self(tail)
    }

    /// E\[r^2\] over what of the largest |r| `count` samples cannot be relied upon to show.
    fn unseen_square(&self, count: f64) -> f64 {
        let seen =
            self.0.iter().find(|above| above.probability * count > WELL_SEEN).map_or(0.0, |above| above.level);
        let mut last = Above { level: 0.0, probability: 0.0, square: 0.0 };
        for &above in &self.0 {
            let allowed = if above.level > GAP * seen { SEEN } else { UNSEEN } / count;
            if above.probability > allowed {
                let share = ((allowed - last.probability) / (above.probability - last.probability)).max(0.0);
                return last.square + share * (above.square - last.square);
            }
            last = above;
        }
        last.square
    }
}

/// Gathers what the outskirts are made of, block by block.
#[derive(Debug)]
pub(super) struct Gathering<'a> {
    question: &'a Question<'a>,
    slope: &'a DMatrix<f64>,
    residuals: Residuals<'a>,
    weights: Vec<f64>,
    /// One list a moment.
    r: Vec<Vec<f64>>,
    /// Blocks that it still takes.
    room: usize,
}

impl<'a> Gathering<'a> {
    /// Of at most `blocks` blocks; fewer where controls and moments are many.
    pub fn new(question: &'a Question<'a>, pilot: &'a Pilot, blocks: usize) -> Self {
        let (a, p) = (question.inputs(), question.outputs());
        let moments = p + p * (p + 1) / 2 + a * p;
        let products = moments * (pilot.controls.basis.len() + 1);
        let affordable = blocks * MOST_PRODUCTS / products;
        Self {
            question,
            slope: &pilot.slope,
            residuals: pilot.controls.residuals(),
            weights: Vec::new(),
            r: vec![Vec::new(); moments],
            room: affordable.clamp(FEWEST_BLOCKS, blocks),
        }
    }

    /// Adds a block whose z were drawn wider than the prior, with the weights that make up for it.
    pub fn add(&mut self, block: &Block, weights: &Column) {
        if self.room == 0 {
            return;
        }
        self.room -= 1;
        self.weights.extend_from_slice(weights);
        let residuals = self.residuals.of(block, self.question.level);
        let entries = Entries { question: self.question, slope: self.slope, residuals, r: &mut self.r };
        dispatch(self.question.level, entries);
    }

    /// What was gathered.
    pub fn finish(self) -> Outskirts {
        let tails = self.r.iter().map(|r| Tail::of(r, &self.weights)).collect();
        Outskirts { tails, inputs: self.question.inputs(), outputs: self.question.outputs() }
    }
}

impl Outskirts {
    /// Spreads replicates of `count` samples in all, on the read components, so that the outskirts are in their standard
    /// errors: about their mean, which stays. Where nets do not reach nothing is known of the outskirts.
    pub fn widen(&self, replicates: &mut [Moments], count: f64) {
        if self.tails.is_empty() {
            return;
        }
        let (mean, error) = combine(replicates);
        let unseen = self.variance(count);
        // Where all replicates are equal there is nothing to stretch: they are set to either side in turn, by pairs, so that
        // their mean stays.
        let all = replicates.len() as f64;
        let paired = 2 * (replicates.len() / 2);
        let apart = (all * (all - 1.0) / paired as f64).sqrt();
        for (k, replicate) in replicates.iter_mut().enumerate() {
            let side = match k {
                _ if k >= paired => 0.0,
                _ if k % 2 == 0 => apart,
                _ => -apart,
            };
            let widened = |value: f64, mean: f64, error: f64, unseen: f64| {
                let equal = error <= ROUNDING * mean.abs();
                match unseen {
                    0.0 => value,
                    _ if equal => mean + side * unseen.sqrt(),
                    _ => mean + (value - mean) * (1.0 + unseen / (error * error)).sqrt(),
                }
            };
            let each = |values: &mut [f64], mean: &[f64], error: &[f64], unseen: &[f64]| {
                for (i, value) in values.iter_mut().enumerate() {
                    *value = widened(*value, mean[i], error[i], unseen[i]);
                }
            };
            let Moments { mean: m, covariance: s, cross_covariance: c } = replicate;
            each(m.as_mut_slice(), mean.mean.as_slice(), error.mean.as_slice(), unseen.mean.as_slice());
            let [of_mean, of_error, of_unseen] = [&mean, &error, &unseen].map(|m| m.covariance.as_slice());
            each(s.as_mut_slice(), of_mean, of_error, of_unseen);
            let [of_mean, of_error, of_unseen] = [&mean, &error, &unseen].map(|m| m.cross_covariance.as_slice());
            each(c.as_mut_slice(), of_mean, of_error, of_unseen);
        }
    }

    /// The variance that the outskirts add to each moment's estimate from `count` samples; C is of the read components.
    fn variance(&self, count: f64) -> Moments {
        let (a, p) = (self.inputs, self.outputs);
        let mut moments = Moments::zeros(a, p);
        let mut tails = self.tails.iter().map(|tail| tail.unseen_square(count) / count);
        let mut next = || tails.next().unwrap_or(0.0);
        moments.mean.apply(|v| *v = next());
        for j in 0..p {
            for k in 0..=j {
                moments.covariance[(j, k)] = next();
                moments.covariance[(k, j)] = moments.covariance[(j, k)];
            }
        }
        moments.cross_covariance.apply(|v| *v = next());
        moments
    }
}

/// Turns what is left of the integrands e, e e', z e' into what is left of mu, S and C.
struct Entries<'a> {
    question: &'a Question<'a>,
    slope: &'a DMatrix<f64>,
    residuals: &'a [Column],
    r: &'a mut [Vec<f64>],
}

impl Task for Entries<'_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self) {
        let (a, p) = (self.question.inputs(), self.question.outputs());
        let (e, rest) = self.residuals.split_at(p);
        let (ee, ze) = rest.split_at(p * (p + 1) / 2);
        let mut r = self.r.iter_mut();
        let mut put = |column: &Column| {
            if let Some(r) = r.next() {
                r.extend_from_slice(column);
            }
        };
        let add = |sum: &mut Column, factor: f64, column: &Column| {
            if factor != 0.0 {
                sum.iter_mut().zip(column).for_each(|(s, v)| *s += factor * v);
            }
        };
        e.iter().for_each(&mut put);
        for j in 0..p {
            for k in 0..=j {
                let mut sum = ee[Sums::pair(j, k)];
                for i in 0..a {
                    add(&mut sum, self.slope[(j, i)], &ze[k * a + i]);
                    add(&mut sum, self.slope[(k, i)], &ze[j * a + i]);
                }
                put(&sum);
            }
        }
        for ze in ze.chunks_exact(a.max(1)) {
            for i in 0..a {
                let mut sum = [0.0; BLOCK];
                ze.iter().enumerate().for_each(|(l, column)| add(&mut sum, self.question.root[(i, l)], column));
                put(&sum);
            }
        }
    }
}
