//! Trust: limits and verdicts.

mod limits;

pub use limits::Limits;
