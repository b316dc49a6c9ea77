//! Guidance: what follows from a table of scores, whoever made it and in however many parts: envelopes and choices;
//! and advice for one case.

mod advice;
mod budget;
mod choices;
mod conclusions;
mod envelopes;
mod scores;

pub use advice::{Advice, AdviceError, EnvelopeAdvice, IndexValue, MethodAdvice, TermAdvice, advise};
pub use budget::Budget;
pub use choices::{Choice, ChoiceMap, Entry, GridCase};
pub use conclusions::Conclusions;
pub use envelopes::{Evidence, MethodEnvelopes};
pub use scores::{ScoreRow, Scores, ScoresError};
