//! Guidance: what follows from a table of scores, whoever made it and in however many parts: envelopes and choices.

mod choices;
mod conclusions;
mod envelopes;
mod scores;

pub use choices::{Choice, ChoiceMap, Entry, GridCase, work};
pub use conclusions::Conclusions;
pub use envelopes::{Evidence, MethodEnvelopes};
pub use scores::{ScoreRow, Scores, ScoresError};
