//! References: the moments of a case by heavy sampling, each entry with its standard error.
//!
//! Points are randomised Sobol' nets in independent replicates, evaluated in lanes. Additive noise is never sampled:
//! S = Cov\[h(x)\] + R exactly. A pilot's linear fit is subtracted from every sample and its known moments are put
//! back, so that what is left to chance is only what is nonlinear; Hermite polynomials of the normals, whose
//! expectations are known, take out more of that where they pay. Nothing here knows a method.

mod basis;
mod block;
mod chart;
mod columns;
mod control;
mod estimate;
mod foresight;
mod outskirts;
mod pilot;
mod replicate;
mod sampler;
mod settings;
mod share;
mod state;
mod store;
mod stream;
mod sums;
mod tails;
mod witness;

pub use estimate::{PointSource, Reference, Soundness};
pub use sampler::Sampler;
pub use settings::{DEFAULT_REPLICATES, SamplerError, SamplerSettings};
pub use share::ShareSampler;
pub use state::{ResumeError, SamplerState};
pub use store::{FORMAT, Loaded, Saved, Store, StoreError};
pub use stream::Key;
pub use tails::{ParetoFit, fit_pareto};
