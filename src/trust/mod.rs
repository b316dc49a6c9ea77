//! Trust: limits, and the verdicts they give on scores.

mod limits;
mod verdict;

pub use limits::Limits;
pub use verdict::{Finding, Judge, Side, Standing, Trust, Verdict};
