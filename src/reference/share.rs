use super::sampler::Sampler;
use super::settings::{SamplerError, SamplerSettings};
use super::state::{ResumeError, SamplerState};
use crate::shard::Shard;
use crate::suite::Case;

/// Samples a share of a case's replicates: what makes one huge case the work of several machines.
///
/// A share has no reference: when all are in a [`Store`](super::Store), the case is found there whole, with the bits that
/// one sampler would have given.
#[derive(Debug)]
pub struct ShareSampler<'a>(Sampler<'a>);

impl<'a> ShareSampler<'a> {
    /// A sampler of the replicates of `case` that `share` holds.
    ///
    /// # Errors
    /// As [`Sampler::new`]; and [`SamplerError::TooManyShares`] if there are more shares than replicates.
    pub fn new(case: &'a Case, settings: SamplerSettings, share: Shard) -> Result<Self, SamplerError> {
        Sampler::of_share(case, settings, share).map(Self)
    }

    /// The same, with the `state` of this share behind it.
    ///
    /// # Errors
    /// As [`Sampler::resume`].
    pub fn resume(
        case: &'a Case,
        settings: SamplerSettings,
        share: Shard,
        state: SamplerState,
    ) -> Result<Self, ResumeError> {
        let mut sampler = Self::new(case, settings, share)?;
        sampler.0.take_up(state)?;
        Ok(sampler)
    }

    /// Doubles the number of points as [`Sampler::deepen`] does.
    pub fn deepen(&mut self) -> bool {
        self.0.deepen()
    }

    /// Everything sampled so far.
    pub fn state(&self) -> SamplerState {
        self.0.state()
    }
}
