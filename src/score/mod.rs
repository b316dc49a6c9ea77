//! Scores: how far a method's moments are from the reference's, and what that does to the update.
//!
//! All of them follow from moments alone. They are computed in whitened coordinates (output by the reference
//! covariance, state by the prior on its support), where every one is free of units.

mod estimate;
mod evaluate;
mod floor;
mod kinds;
mod scorer;
mod whitened;

pub use estimate::Estimate;
pub use evaluate::Invalid;
pub use floor::Floor;
pub use kinds::ScoreKind;
pub use scorer::{Scorer, Scores};
