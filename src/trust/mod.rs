//! Trust: limits, the verdicts they give on scores, and the envelopes inside which a method is trusted.

mod binomial;
mod envelope;
mod limits;
mod opinion;
mod regime;
mod split;
mod verdict;

pub use binomial::{lower_bound, upper_bound};
pub use envelope::{Claim, Counts, Envelope, Measured, Term, pair_envelope, single_envelope};
pub use limits::Limits;
pub use opinion::{OPINIONS, PROBES, second_opinion};
pub use regime::{RegimeIndex, bend_over_noise, curvature, information};
pub use split::{Part, split};
pub use verdict::{Finding, Judge, Side, Standing, Trust, Verdict};
