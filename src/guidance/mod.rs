//! Guidance: what follows from a table of scores, whoever made it and in however many parts: envelopes and choices;
//! advice for one case; and results read back whole, to be seen by other limits and within a budget.

mod advice;
mod budget;
mod choices;
mod conclusions;
mod envelopes;
mod provenance;
mod scene;
mod scores;
mod study;
mod view;

pub use advice::{Advice, AdviceError, EnvelopeAdvice, IndexValue, MethodAdvice, TermAdvice, advise};
pub use budget::Budget;
pub use choices::{Choice, ChoiceMap, Entry, GridCase};
pub use conclusions::Conclusions;
pub use envelopes::{Evidence, MethodEnvelopes};
pub use provenance::{Build, Finished, MethodCost, OutsideEntry, Provenance, Settings, Spread, SuiteEntry, Times};
pub use scene::{Law, Scene, sharpening};
pub use scores::{ScoreRow, Scores, ScoresError};
pub use study::{Outcome, Study, StudyCase, StudyEntry, StudyError, StudyReference};
pub use view::{Cell, FamilyMap, Ranked, SHARE_CONFIDENCE, View};
