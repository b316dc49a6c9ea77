use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use super::chart::{Charts, CircularSum};
use super::net::BLOCK;
use super::pilot::{Pilot, Question};
use super::replicate::Replicate;
use super::settings::{SamplerError, SamplerSettings};
use super::sums::Sums;
use crate::gaussian::Moments;
use crate::suite::rows;

/// What a [`Sampler`](super::Sampler) has found so far: the sums of every replicate, from which it goes on, and what it
/// saw at every doubling, so that a survey that asks for less stops where it would have stopped without.
///
/// In JSON every number comes back to the bit. Pilot and nets are not in it: they follow from the question.
#[derive(Debug, Clone, PartialEq)]
pub struct SamplerState {
    pub(super) looks: Vec<Look>,
    pub(super) places: Vec<Place>,
}

/// Where one replicate stands.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Place {
    pub sums: Sums,
    pub charts: Charts,
}

/// What all replicates say after a doubling.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Look {
    /// Blocks of points a replicate.
    pub blocks: u64,
    /// Whether a chart moved further than was kept ready.
    pub lost: bool,
    /// Resultant length of each output (p); `None` where it is no angle.
    pub resultants: Vec<Option<f64>>,
    /// Moments on the read components, one a replicate.
    pub moments: Vec<Entries>,
}

/// Moments as lists of rows.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Entries {
    mean: Vec<f64>,
    covariance: Vec<Vec<f64>>,
    cross_covariance: Vec<Vec<f64>>,
}

/// Why a sampler cannot go on from a state.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum ResumeError {
    /// Nothing can be sampled under these settings.
    #[error(transparent)]
    Sampler(#[from] SamplerError),
    /// The state is that of another question or of other settings.
    #[error("the state does not fit: {0}")]
    Misfit(&'static str),
}

impl Look {
    pub fn at(
        blocks: u64,
        replicates: &[Replicate],
        question: &Question<'_>,
        pilot: &Pilot,
        noise: &DMatrix<f64>,
    ) -> Self {
        // Over all replicates together: the least of theirs would depend on how many samples each has, and refuse at
        // a first look what more samples would answer.
        let resultant = |j| {
            let circles = replicates.iter().filter_map(|r| r.charts().circle(j));
            circles.reduce(CircularSum::merged).map(|circle| circle.resultant())
        };
        Self {
            blocks,
            lost: replicates.iter().any(|r| r.charts().lost),
            resultants: (0..question.outputs()).map(resultant).collect(),
            moments: replicates.iter().map(|r| Entries::from(&r.moments(question, pilot, noise))).collect(),
        }
    }

    fn fits(&self, a: usize, angular: &[bool]) -> bool {
        self.resultants.iter().map(Option::is_some).eq(angular.iter().copied())
            && self.moments.iter().all(|m| m.fit(a, angular.len()))
    }

    fn is_finite(&self) -> bool {
        self.resultants.iter().flatten().all(|r| r.is_finite()) && self.moments.iter().all(Entries::are_finite)
    }
}

impl Entries {
    fn fit(&self, a: usize, p: usize) -> bool {
        let shaped = |m: &[Vec<f64>], rows: usize| m.len() == rows && m.iter().all(|row| row.len() == p);
        self.mean.len() == p && shaped(&self.covariance, p) && shaped(&self.cross_covariance, a)
    }

    fn are_finite(&self) -> bool {
        let matrices = self.covariance.iter().chain(&self.cross_covariance).flatten();
        self.mean.iter().chain(matrices).all(|v| v.is_finite())
    }
}

impl From<&Moments> for Entries {
    fn from(m: &Moments) -> Self {
        Self {
            mean: m.mean.iter().copied().collect(),
            covariance: rows(&m.covariance),
            cross_covariance: rows(&m.cross_covariance),
        }
    }
}

impl From<&Entries> for Moments {
    fn from(e: &Entries) -> Self {
        let p = e.mean.len();
        let matrix = |m: &[Vec<f64>]| DMatrix::from_row_iterator(m.len(), p, m.iter().flatten().copied());
        Self {
            mean: DVector::from_column_slice(&e.mean),
            covariance: matrix(&e.covariance),
            cross_covariance: matrix(&e.cross_covariance),
        }
    }
}

impl SamplerState {
    /// Samples of h behind it, all replicates together.
    pub fn points(&self) -> u64 {
        self.blocks().saturating_mul(BLOCK as u64).saturating_mul(self.places.len() as u64)
    }

    /// Blocks a replicate.
    pub(super) fn blocks(&self) -> u64 {
        self.looks.last().map_or(0, |look| look.blocks)
    }

    /// Whether every value in it is a number: JSON has no others.
    pub fn is_finite(&self) -> bool {
        let places = self.places.iter().all(|place| place.sums.is_finite() && place.charts.is_finite());
        places && self.looks.iter().all(Look::is_finite)
    }

    /// Checks every shape against the question, and the doublings against the settings.
    pub(super) fn check(
        &self,
        question: &Question<'_>,
        controls: usize,
        settings: &SamplerSettings,
    ) -> Result<(), ResumeError> {
        let (a, p, angular) = (question.inputs(), question.outputs(), &question.angular[..]);
        let fail = |what| Err(ResumeError::Misfit(what));
        if self.places.len() != settings.replicates
            || self.looks.iter().any(|look| look.moments.len() != settings.replicates)
        {
            return fail("another number of replicates");
        }
        let first = settings.blocks_after(0).unwrap_or(0);
        let doublings = std::iter::successors(Some(first), |blocks| blocks.checked_mul(2));
        if !doublings.take(self.looks.len()).eq(self.looks.iter().map(|look| look.blocks)) {
            return fail("points were doubled from another beginning");
        }
        if !self.looks.iter().all(|look| look.fits(a, angular)) {
            return fail("moments of another shape");
        }
        let count = (self.blocks() * BLOCK as u64) as f64;
        for Place { sums, charts } in &self.places {
            if !(sums.fit(a, p, controls) && charts.fit(a, angular)) {
                return fail("sums of another shape");
            }
            if sums.count != count {
                return fail("another number of points in the sums than at the last doubling");
            }
        }
        if self.is_finite() { Ok(()) } else { fail("a value that is no finite number") }
    }
}
