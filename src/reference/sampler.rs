use nalgebra::DMatrix;
use rayon::prelude::*;

use super::chart::CircularSum;
use super::estimate::{Reference, Soundness, combine, worst_standardised};
use super::foresight::variance_of_squares;
use super::pilot::{BLOCK, FIRST_BLOCKS, Pilot};
use super::replicate::{Ground, Replicate};
use super::stream::Key;
use crate::gaussian::{Gaussian, Marginal, Moments, wrap};
use crate::sensor::Sensor;
use crate::suite::Case;

/// Independent replicates of a reference unless told otherwise.
pub const DEFAULT_REPLICATES: usize = 32;
/// Below this resultant length an angle has no mean direction to centre its chart on. Ours, no source: at 0.1
/// the directions are all but uniform, and where the cut lies decides the moments.
const LEAST_RESULTANT: f64 = 0.1;

/// The least standard deviation of an output as a share of its mean: 1e4 units in the last place of a double.
/// Ours, no source: the rounding of a value, a few units, is then under 1e-3 of what is measured.
const LEAST_SPREAD: f64 = 1e4 * f64::EPSILON;

/// How a reference is to be sampled.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SamplerSettings {
    /// Seed of all random numbers.
    pub seed: u64,
    /// Independent replicates, at least 2.
    pub replicates: usize,
    /// Largest standardised standard error asked for.
    pub precision: f64,
    /// Most samples of h in all replicates together.
    pub cap: u64,
}

impl Default for SamplerSettings {
    /// Seed 1, 32 replicates, precision 1e-3, at most 2^24 samples.
    fn default() -> Self {
        Self { seed: 1, replicates: DEFAULT_REPLICATES, precision: 1e-3, cap: 1 << 24 }
    }
}

impl SamplerSettings {
    /// Checks that there are at least two replicates and that the cap leaves one block for each.
    ///
    /// # Errors
    /// [`SamplerError`] with what would do.
    pub fn check(&self) -> Result<(), SamplerError> {
        if self.replicates < 2 {
            return Err(SamplerError::TooFewReplicates { replicates: self.replicates });
        }
        let least = BLOCK as u64 * self.replicates as u64;
        if self.cap < least {
            return Err(SamplerError::CapTooSmall { cap: self.cap, replicates: self.replicates, least });
        }
        Ok(())
    }

    /// Blocks a replicate after the next doubling of `blocks`; `None` where the cap leaves no room.
    fn blocks_after(&self, blocks: u64) -> Option<u64> {
        let room = self.cap / (BLOCK * self.replicates) as u64;
        let next = if blocks == 0 { FIRST_BLOCKS } else { 2 * blocks }.min(room);
        // A last partial doubling of less than a half again would cost without telling much.
        (next > blocks && 2 * next >= 3 * blocks).then_some(next)
    }

    /// How often a reference can be looked at: once after each doubling that the cap leaves room for.
    pub fn looks(&self) -> usize {
        std::iter::successors(self.blocks_after(0), |&blocks| self.blocks_after(blocks)).count()
    }
}

/// Settings under which nothing can be sampled.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum SamplerError {
    /// Without two replicates there is no standard error.
    #[error("{replicates} replicates are too few: a standard error needs at least 2")]
    TooFewReplicates {
        /// Replicates asked for.
        replicates: usize,
    },
    /// The cap does not leave one block for each replicate.
    #[error("a cap of {cap} samples is too small: {replicates} replicates need at least {least}")]
    CapTooSmall {
        /// Cap asked for.
        cap: u64,
        /// Replicates asked for.
        replicates: usize,
        /// Least cap that would do.
        least: u64,
    },
}

/// Samples the moments of one case, deeper at every call; nothing sampled is thrown away.
///
/// The result depends on the case, the seed and the number of points only: the same bits on any number of
/// threads.
#[derive(Debug)]
pub struct Sampler<'a> {
    ground: Ground<'a>,
    marginal: &'a Marginal,
    prior: &'a Gaussian,
    noise: DMatrix<f64>,
    /// Var(e^2) of every output (p), rare samples included.
    squares: Vec<f64>,
    settings: SamplerSettings,
    replicates: Vec<Replicate>,
    blocks: u64,
}

impl<'a> Sampler<'a> {
    /// A sampler of `case`.
    ///
    /// # Errors
    /// [`SamplerError`] if there are fewer than two replicates or the cap does not leave each 1024 samples.
    pub fn new(case: &'a Case, settings: SamplerSettings) -> Result<Self, SamplerError> {
        let key = Key::new(settings.seed, &case.question());
        Self::of_parts(case.sensor(), case.prior(), case.marginal(), case.noise_or_zero(), key, settings)
    }

    /// A sampler of a sensor of the caller's own; `marginal` is the prior's on the components that the sensor
    /// reads, `noise` is R (p x p), `key` names the question.
    ///
    /// # Errors
    /// As [`Sampler::new`].
    pub fn of_parts(
        sensor: &'a dyn Sensor,
        prior: &'a Gaussian,
        marginal: &'a Marginal,
        noise: DMatrix<f64>,
        key: Key,
        settings: SamplerSettings,
    ) -> Result<Self, SamplerError> {
        settings.check()?;
        let law = marginal.law();
        let root = law.root();
        let ground = Ground {
            key,
            sensor,
            prior: law,
            angular: sensor.outputs().iter().map(|o| o.angular).collect(),
            pilot: Pilot::run(&key, sensor, law, &root),
            root,
        };
        let replicates = (0..settings.replicates as u64).map(|r| Replicate::new(r, &ground)).collect();
        let squares = variance_of_squares(&key, sensor, law.mean(), &ground.root, &ground.angular, &ground.pilot);
        Ok(Self { ground, marginal, prior, noise, squares, settings, replicates, blocks: 0 })
    }

    /// Samples of h so far, all replicates together.
    pub fn points(&self) -> u64 {
        self.replicates.iter().map(Replicate::points).sum()
    }

    /// Doubles the number of points (the first time: takes the first 4096 a replicate), within the cap.
    /// Returns whether there was room for any.
    pub fn deepen(&mut self) -> bool {
        let Some(blocks) = self.settings.blocks_after(self.blocks) else { return false };
        self.blocks = blocks;
        let ground = &self.ground;
        self.replicates.par_iter_mut().for_each(|r| r.deepen(blocks, ground));
        true
    }

    /// Samples until the asked precision or the cap.
    pub fn run(mut self) -> Reference {
        while self.deepen() {
            let reference = self.reference();
            if reference.soundness != Soundness::Wide {
                return reference;
            }
        }
        self.reference()
    }

    /// The moments as far as they are known.
    ///
    /// # Panics
    /// If nothing was sampled yet.
    pub fn reference(&self) -> Reference {
        assert!(self.blocks > 0, "a reference before the first sample");
        let mut replicates: Vec<Moments> =
            self.replicates.iter().map(|r| self.lifted(r.moments(&self.ground, &self.noise))).collect();
        let first = replicates[0].mean.clone();
        for moments in &mut replicates[1..] {
            for (j, &angular) in self.ground.angular.iter().enumerate() {
                if angular {
                    moments.mean[j] = first[j] + wrap(moments.mean[j] - first[j]);
                }
            }
        }
        let (mut moments, standard_error) = combine(&replicates);
        for (j, &angular) in self.ground.angular.iter().enumerate() {
            if angular {
                let turn = wrap(moments.mean[j]) - moments.mean[j];
                moments.mean[j] = wrap(moments.mean[j]);
                for r in &mut replicates {
                    r.mean[j] += turn;
                }
            }
        }
        let worst_error = worst_standardised(&moments, &standard_error, self.prior);
        let foreseen = self.foreseen_error(&moments);
        // Not max(): a NaN must win.
        let worst_error = if foreseen > worst_error { foreseen } else { worst_error };
        let reason = self.refusal(&moments);
        let soundness = match &reason {
            Some(_) => Soundness::Refused,
            None if worst_error <= self.settings.precision => Soundness::Sound,
            None => Soundness::Wide,
        };
        Reference { moments, standard_error, replicates, points: self.points(), worst_error, soundness, reason }
    }

    /// Largest relative standard error of a variance that is foreseen at this number of points.
    fn foreseen_error(&self, moments: &Moments) -> f64 {
        let points = self.points() as f64;
        let error = |(j, square): (usize, &f64)| match *square {
            // Nothing is left to chance, and a constant has no variance to divide by.
            0.0 => 0.0,
            square => (square / points).sqrt() / moments.covariance[(j, j)],
        };
        self.squares.iter().enumerate().map(error).fold(0.0, f64::max)
    }

    fn lifted(&self, moments: Moments) -> Moments {
        let cross_covariance = self.marginal.lift(moments.cross_covariance);
        Moments { cross_covariance, ..moments }
    }

    fn refusal(&self, moments: &Moments) -> Option<String> {
        let outputs = self.ground.sensor.outputs();
        if !moments.is_finite() {
            let which = (0..outputs.len()).find(|&j| !moments.covariance[(j, j)].is_finite()).unwrap_or(0);
            return Some(format!(
                "output `{}` or its square is not a finite number at every sample",
                outputs[which].name
            ));
        }
        for (j, output) in outputs.iter().enumerate() {
            let (sd, size) = (moments.covariance[(j, j)].sqrt(), moments.mean[j].abs());
            if sd > 0.0 && sd < LEAST_SPREAD * size {
                return Some(format!(
                    "output `{}` spreads by {sd:.1e} around {:.1e}: the digits of a number do not show it; measure \
                     it from an origin nearer by",
                    output.name, moments.mean[j]
                ));
            }
        }
        for (j, output) in outputs.iter().enumerate() {
            if let Some(resultant) = self.resultant(j)
                && !(resultant >= LEAST_RESULTANT)
            {
                return Some(format!(
                    "output `{}` has no mean direction: its resultant length is {resultant:.3}, {LEAST_RESULTANT} is \
                     needed",
                    output.name
                ));
            }
        }
        self.replicates
            .iter()
            .any(|r| r.charts().lost)
            .then(|| "the mean direction of an angle moved by more than chance allows".into())
    }

    /// Resultant length of angular output `j` over all replicates together: the least of theirs would depend on
    /// how many samples each has, and refuse at a first look what more samples would answer.
    fn resultant(&self, j: usize) -> Option<f64> {
        let circles = self.replicates.iter().filter_map(|r| r.charts().circle(j));
        circles.reduce(CircularSum::merged).map(|circle| circle.resultant())
    }
}
