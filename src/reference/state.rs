use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use super::chart::{Charts, CircularSum};
use super::pilot::Question;
use super::settings::{SamplerError, SamplerSettings};
use super::sums::Sums;
use crate::gaussian::Moments;
use crate::net::BLOCK;
use crate::suite::rows;

/// What a [`Sampler`](super::Sampler) has found so far: the sums of every replicate, from which it goes on, and what it
/// saw at every doubling, so that a survey that asks for less stops where it would have stopped without.
///
/// In JSON every number comes back to the bit. Pilot and nets are not in it: they follow from the question.
#[derive(Debug, Clone, PartialEq)]
pub struct SamplerState {
    pub(super) replicates: Vec<ReplicateState>,
}

/// What one replicate has found.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct ReplicateState {
    pub looks: Vec<Look>,
    pub sums: Sums,
    pub charts: Charts,
}

/// What one replicate says after a doubling.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Look {
    /// Blocks of points so far.
    pub blocks: u64,
    /// Whether a chart moved further than was kept ready.
    pub lost: bool,
    /// Circular sums of each output (p), seen from angle zero; `None` where it is no angle.
    pub circles: Vec<Option<CircularSum>>,
    /// Centre of the chart of each output (p).
    pub centre: Vec<f64>,
    /// Moments on the read components.
    pub moments: Entries,
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

impl ReplicateState {
    fn blocks(&self) -> u64 {
        self.looks.last().map_or(0, |look| look.blocks)
    }

    fn is_finite(&self) -> bool {
        let look = |l: &Look| {
            l.moments.are_finite()
                && l.centre.iter().all(|v| v.is_finite())
                && l.circles.iter().flatten().all(CircularSum::is_finite)
        };
        self.sums.is_finite() && self.charts.is_finite() && self.looks.iter().all(look)
    }
}

impl Look {
    fn fits(&self, a: usize, angular: &[bool]) -> bool {
        let p = angular.len();
        self.circles.iter().map(Option::is_some).eq(angular.iter().copied())
            && self.centre.len() == p
            && self.moments.fit(a, p)
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
    /// Samples of h behind it, all its replicates together.
    pub fn points(&self) -> u64 {
        self.blocks().saturating_mul(BLOCK as u64).saturating_mul(self.replicates.len() as u64)
    }

    /// Blocks a replicate.
    fn blocks(&self) -> u64 {
        self.replicates.first().map_or(0, ReplicateState::blocks)
    }

    /// Whether every value in it is a number: JSON has no others.
    pub fn is_finite(&self) -> bool {
        self.replicates.iter().all(ReplicateState::is_finite)
    }

    /// The whole from the shares 1/N, 2/N, .. N/N of the replicates; `None` unless all are equally deep.
    pub(super) fn join(shares: Vec<Self>) -> Option<Self> {
        let depth = shares.first()?.blocks();
        if shares.iter().any(|share| share.blocks() != depth) {
            return None;
        }
        let count = shares.iter().map(|share| share.replicates.len()).sum();
        let mut shares: Vec<_> = shares.into_iter().map(|share| share.replicates.into_iter()).collect();
        let of = shares.len();
        let replicates = (0..count).map(|r: usize| shares[r % of].next()).collect::<Option<_>>()?;
        Some(Self { replicates })
    }

    /// Checks every shape against the question, and the doublings against the settings.
    pub(super) fn check(
        &self,
        question: &Question<'_>,
        controls: usize,
        settings: &SamplerSettings,
        replicates: usize,
    ) -> Result<(), ResumeError> {
        let (a, p, angular) = (question.inputs(), question.outputs(), &question.angular[..]);
        let fail = |what| Err(ResumeError::Misfit(what));
        if self.replicates.len() != replicates {
            return fail("another number of replicates");
        }
        let looks = self.replicates.first().map_or(0, |r| r.looks.len());
        let first = settings.blocks_after(0).unwrap_or(0);
        let doublings = || std::iter::successors(Some(first), |blocks: &u64| blocks.checked_mul(2)).take(looks);
        for ReplicateState { looks, sums, charts } in &self.replicates {
            if !doublings().eq(looks.iter().map(|look| look.blocks)) {
                return fail("points were doubled from another beginning, or not as often in every replicate");
            }
            if !looks.iter().all(|look| look.fits(a, angular)) {
                return fail("moments of another shape");
            }
            if !(sums.fit(a, p, controls) && charts.fit(a, angular)) {
                return fail("sums of another shape");
            }
            if sums.count != self.blocks() as f64 * BLOCK as f64 {
                return fail("another number of points in the sums than at the last doubling");
            }
        }
        if self.is_finite() { Ok(()) } else { fail("a value that is no finite number") }
    }
}
