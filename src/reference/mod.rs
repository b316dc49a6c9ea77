//! References: the moments of a case by heavy sampling, each entry with its standard error.
//!
//! Plain Monte Carlo on PCG streams, one stream a block of points, in independent replicates. Additive noise
//! is never sampled: S = Cov\[h(x)\] + R exactly. A pilot's linear fit is subtracted from every sample and its
//! known moments are put back, so that what is left to chance is only what is nonlinear. Nothing here knows a
//! method.

mod chart;
mod estimate;
mod foresight;
mod pilot;
mod replicate;
mod sampler;
mod stream;
mod tally;

pub use estimate::{Reference, Soundness};
pub use sampler::{DEFAULT_REPLICATES, Sampler, SamplerError, SamplerSettings};
pub use stream::Key;
