use nalgebra::{DMatrix, DVector};
use rayon::prelude::*;

use super::chart::CircularSum;
use super::estimate::{PointSource, Reference, Soundness, combine, worst_standardised};
use super::foresight::Foresight;
use super::pilot::{Pilot, Question};
use super::replicate::Replicate;
use super::settings::{SamplerError, SamplerSettings};
use super::state::{Look, ResumeError, SamplerState};
use super::stream::Key;
use super::witness::{Testimony, hear};
use crate::gaussian::{Gaussian, Marginal, Moments, wrap};
use crate::net::BLOCK;
use crate::sensor::Sensor;
use crate::shard::Shard;
use crate::suite::Case;

/// Below this resultant length an angle has no mean direction to centre its chart on. Ours, no source: at 0.1
/// the directions are all but uniform, and where the cut lies decides the moments.
const LEAST_RESULTANT: f64 = 0.1;

/// Most probability of the states at which a sensor has no value: beyond it there are no moments to speak of. Ours, no
/// source.
const MAY_BE_UNDEFINED: f64 = 1e-9;

/// The least standard deviation of an output or of a state that is read, as a share of its mean: 1e4 units in the last place of a double.
/// Ours, no source: the rounding of a value, a few units, is then under 1e-3 of what is measured.
const LEAST_SPREAD: f64 = 1e4 * f64::EPSILON;

/// Standard deviations whose fourth power, the size of a squared error of a variance, is a number with all its digits. Ours, no
/// source.
const SPREADS: std::ops::RangeInclusive<f64> = 1e-70..=1e70;

/// Samples the moments of one case, deeper at every call; nothing sampled is thrown away.
///
/// The result depends on the case, the seed and the number of points only: the same bits on any number of
/// threads and with any set of vector instructions.
#[derive(Debug)]
pub struct Sampler<'a> {
    question: Question<'a>,
    pilot: Pilot,
    foresight: Foresight,
    marginal: &'a Marginal,
    prior: &'a Gaussian,
    noise: DMatrix<f64>,
    settings: SamplerSettings,
    replicates: Vec<Replicate>,
    /// How many doublings were taken; the replicates may know more of them, from a state.
    taken: usize,
}

impl<'a> Sampler<'a> {
    /// A sampler of `case`.
    ///
    /// # Errors
    /// [`SamplerError`] if there are fewer than two replicates or the cap does not leave each 256 samples.
    pub fn new(case: &'a Case, settings: SamplerSettings) -> Result<Self, SamplerError> {
        Self::of_share(case, settings, Shard::WHOLE)
    }

    /// As [`Sampler::new`], with the replicates of `share` only: its references are no one's.
    pub(super) fn of_share(case: &'a Case, settings: SamplerSettings, share: Shard) -> Result<Self, SamplerError> {
        settings.check()?;
        settings.check_share(share)?;
        let key = Key::new(settings.seed, &case.question());
        let parts = (case.sensor(), case.prior(), case.marginal());
        Self::assemble(parts, case.noise_or_zero(), key, settings, share)
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
        Self::assemble((sensor, prior, marginal), noise, key, settings, Shard::WHOLE)
    }

    fn assemble(
        (sensor, prior, marginal): (&'a dyn Sensor, &'a Gaussian, &'a Marginal),
        noise: DMatrix<f64>,
        key: Key,
        settings: SamplerSettings,
        share: Shard,
    ) -> Result<Self, SamplerError> {
        settings.check()?;
        let law = marginal.law();
        let question = Question {
            sensor,
            prior: law,
            root: law.root(),
            angular: sensor.outputs().iter().map(|o| o.angular).collect(),
            key,
            level: settings.level,
        };
        let pilot = Pilot::run(&question);
        let foresight = Foresight::look(&question, &pilot);
        let replicates = (0..settings.replicates)
            .filter(|&r| share.holds(r))
            .map(|r| Replicate::new(r as u64, settings.log2(), &question, &pilot))
            .collect();
        Ok(Self { question, pilot, foresight, marginal, prior, noise, settings, replicates, taken: 0 })
    }

    /// A sampler of `case` that has `state` behind it.
    ///
    /// It starts before the first sample, as a new one does, and gives the same bits at every doubling; as far as the
    /// state reaches, doubling costs nothing.
    ///
    /// # Errors
    /// [`ResumeError`] if the settings cannot be meant, or the state is not one of this case under these settings.
    pub fn resume(case: &'a Case, settings: SamplerSettings, state: SamplerState) -> Result<Self, ResumeError> {
        let mut sampler = Self::new(case, settings)?;
        sampler.take_up(state)?;
        Ok(sampler)
    }

    /// Takes up what others found of the same replicates.
    pub(super) fn take_up(&mut self, state: SamplerState) -> Result<(), ResumeError> {
        let controls = self.pilot.controls.basis.len();
        state.check(&self.question, controls, &self.settings, self.replicates.len())?;
        for (replicate, state) in self.replicates.iter_mut().zip(state.replicates) {
            replicate.take_up(state);
        }
        Ok(())
    }

    /// Everything sampled so far, and in the state that this sampler began with.
    pub fn state(&self) -> SamplerState {
        SamplerState { replicates: self.replicates.iter().map(Replicate::state).collect() }
    }

    /// Samples of h so far, all replicates together.
    pub fn points(&self) -> u64 {
        self.blocks() * BLOCK as u64 * self.replicates.len() as u64
    }

    fn blocks(&self) -> u64 {
        self.looks().next().map_or(0, |look| look.blocks)
    }

    /// What each replicate said after the latest doubling.
    fn looks(&self) -> impl Iterator<Item = &Look> {
        self.replicates.iter().filter_map(|r| r.looks()[..self.taken].last())
    }

    /// Doubles the number of points (the first time: takes the first 1024 a replicate), within the cap.
    /// Returns whether there was room for any.
    pub fn deepen(&mut self) -> bool {
        let Some(blocks) = self.settings.blocks_after(self.blocks()) else { return false };
        let (question, pilot, noise) = (&self.question, &self.pilot, &self.noise);
        if self.replicates.iter().any(|r| r.looks().len() == self.taken) {
            self.replicates.par_iter_mut().for_each(|r| r.deepen(blocks, question, pilot, noise));
        }
        self.taken += 1;
        true
    }

    /// Samples until the asked precision or the cap, then hears the witness.
    pub fn run(mut self) -> Reference {
        while self.deepen() {
            let reference = self.reference();
            if reference.soundness != Soundness::Wide {
                return self.witnessed(reference);
            }
        }
        self.witnessed(self.reference())
    }

    /// The reference as it stands after the witness was heard: an independent plain Monte Carlo estimate of 65,536
    /// samples, and the tails of its largest deviations. A refused reference is left as it is.
    pub fn witnessed(&self, reference: Reference) -> Reference {
        if reference.soundness == Soundness::Refused {
            return reference;
        }
        let (mut moments, error) = combine(&self.read_moments());
        // Angular means are taken from the reference, which has unwrapped them.
        moments.mean.copy_from(&reference.moments.mean);
        let error = Moments { mean: reference.standard_error.mean.clone(), ..error };
        let Some(chart) = self.looks().next().map(|look| DVector::from_column_slice(&look.centre)) else {
            return reference;
        };
        let (soundness, reason) = match hear(
            &self.question,
            &self.noise,
            &chart,
            &moments,
            (&error, self.replicates.len()),
            &self.foresight,
        ) {
            Testimony::Agrees => return reference,
            Testimony::Disagrees(reason) => (Soundness::Disputed, reason),
            Testimony::HeavyTail(reason) => (Soundness::HeavyTailed, reason),
            Testimony::NoVariance(reason) => (Soundness::Refused, reason),
        };
        Reference { soundness, reason: Some(reason), ..reference }
    }

    /// The moments as far as they are known.
    ///
    /// # Panics
    /// If nothing was sampled yet.
    pub fn reference(&self) -> Reference {
        assert!(self.taken > 0, "a reference before the first sample");
        let mut replicates: Vec<Moments> = self.read_moments().into_iter().map(|read| self.lifted(read)).collect();
        let (mut moments, standard_error) = combine(&replicates);
        for (j, &angular) in self.question.angular.iter().enumerate() {
            if angular {
                let turn = wrap(moments.mean[j]) - moments.mean[j];
                moments.mean[j] = wrap(moments.mean[j]);
                for r in &mut replicates {
                    r.mean[j] += turn;
                }
            }
        }
        let worst_error = worst_standardised(&moments, &standard_error, self.prior);
        let reason = self.refusal(&moments);
        let soundness = match &reason {
            Some(_) => Soundness::Refused,
            None if worst_error <= self.settings.precision => Soundness::Sound,
            None => Soundness::Wide,
        };
        let nets = self.replicates.iter().all(Replicate::has_net);
        let source = if nets { PointSource::Nets } else { PointSource::Streams };
        let points = self.points();
        Reference { moments, standard_error, replicates, points, source, worst_error, soundness, reason }
    }

    /// The replicates' moments on the read components, their angular means within half a turn of the first's, spread so
    /// that what the outskirts may add is in their standard errors.
    fn read_moments(&self) -> Vec<Moments> {
        let mut replicates: Vec<Moments> = self.looks().map(|look| (&look.moments).into()).collect();
        let Some(first) = replicates.first().map(|r| r.mean.clone()) else { return replicates };
        for moments in &mut replicates[1..] {
            for (j, &angular) in self.question.angular.iter().enumerate() {
                if angular {
                    moments.mean[j] = first[j] + wrap(moments.mean[j] - first[j]);
                }
            }
        }
        self.foresight.outskirts.widen(&mut replicates, self.points() as f64);
        replicates
    }

    fn lifted(&self, moments: Moments) -> Moments {
        let cross_covariance = self.marginal.lift(moments.cross_covariance);
        Moments { cross_covariance, ..moments }
    }

    fn refusal(&self, moments: &Moments) -> Option<String> {
        let outputs = self.question.sensor.outputs();
        if !moments.is_finite() {
            let which = (0..outputs.len()).find(|&j| !moments.covariance[(j, j)].is_finite()).unwrap_or(0);
            return Some(format!(
                "output `{}` or its square is not a finite number at every sample",
                outputs[which].name
            ));
        }
        let undefined = self.foresight.undefined;
        if undefined > MAY_BE_UNDEFINED {
            return Some(format!("the sensor is undefined with probability {undefined:.1e} under this prior"));
        }
        let prior = self.question.prior;
        for (i, &component) in self.question.sensor.reads().iter().enumerate() {
            let sd = prior.covariance()[(i, i)].sqrt();
            if let Some(flaw) = unfit(sd, prior.mean()[i]) {
                return Some(format!("state {component} {flaw}"));
            }
        }
        for (j, output) in outputs.iter().enumerate() {
            let sd = moments.covariance[(j, j)].sqrt();
            if let Some(flaw) = unfit(sd, moments.mean[j]) {
                return Some(format!("output `{}` {flaw}", output.name));
            }
            if output.angular && self.is_without_direction(j) {
                return Some(format!(
                    "output `{}` has no direction at the one state that the prior knows (does it lie on the station?)",
                    output.name
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
        let lost = self.looks().any(|look| look.lost);
        lost.then(|| "the mean direction of an angle moved by more than chance allows".into())
    }

    /// Whether the prior fixes what angular output `j` reads to a point at which it has no slope: the number that stands
    /// there, atan2(0, 0) = 0, is a convention and not a direction.
    fn is_without_direction(&self, j: usize) -> bool {
        let fixed = |m: &Moments| m.covariance[(j, j)] == self.noise[(j, j)];
        if !self.looks().all(|look| fixed(&(&look.moments).into())) {
            return false;
        }
        let (a, p) = (self.question.inputs(), self.question.outputs());
        let (mut value, mut jacobian) = (vec![0.0; p], DMatrix::zeros(p, a));
        self.question.sensor.jacobian(self.question.prior.mean().as_slice(), &mut value, &mut jacobian);
        jacobian.row(j).iter().any(|slope| !slope.is_finite())
    }

    /// Resultant length of angular output `j` over all replicates together: the least of theirs would depend on
    /// how many samples each has, and refuse at a first look what more samples would answer.
    fn resultant(&self, j: usize) -> Option<f64> {
        let circles = self.looks().filter_map(|look| look.circles[j]);
        circles.reduce(CircularSum::merged).map(|circle| circle.resultant())
    }
}

/// What keeps a spread of `sd` around `mean` from being measured, if anything does.
fn unfit(sd: f64, mean: f64) -> Option<String> {
    if sd == 0.0 {
        None
    } else if !SPREADS.contains(&sd) {
        Some(format!(
            "spreads by {sd:.1e}: its fourth power, which a standard error needs, is no number of a computer any more; \
             measure it in another unit"
        ))
    } else if sd < LEAST_SPREAD * mean.abs() {
        Some(format!(
            "spreads by {sd:.1e} around {mean:.1e}: the digits of a number do not show it; measure it from an origin \
             nearer by"
        ))
    } else {
        None
    }
}
