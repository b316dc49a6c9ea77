//! Surveys: every case of a suite sampled, every method and outside implementation scored and judged, cases over threads.

mod case_run;
mod cause;
mod earlier;
mod entrant;
mod kept;
mod regime;
mod run;
mod settings;
mod share;
mod summary;
mod timing;

pub use crate::shard::{Shard, ShardError};
pub use case_run::{Answer, Answered, CaseResult, Stop};
pub use earlier::Earlier;
pub use entrant::Entrant;
pub(crate) use entrant::transformed;
pub use regime::{Indices, OpinionsOf};
pub(crate) use regime::{excess_over, regime_columns};
pub use run::{SurveyResult, Unwatched, Watch, survey};
pub use settings::{SurveyError, SurveyPlan, SurveySettings};
pub use share::{ShareResult, sample_share};
pub use summary::{MethodSummary, Summary, summarise};
pub use timing::{Cost, Quartiles, Timing, time_methods};
