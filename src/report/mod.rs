//! Reports: what surveys found, as files for machines and tables for people. Nothing is computed here.

mod advice;
mod catalogue;
mod choices;
mod envelopes;
mod folder;
mod gate_markdown;
mod gate_table;
mod hand_out;
mod junit;
mod manifest;
mod merge;
mod part;
mod records;
mod scores_csv;
mod table;

pub use crate::wording::printable;
pub use advice::write_advice;
pub(crate) use catalogue::SCORE_LEGEND;
pub use catalogue::{method_page, method_table, score_table, sensor_page, sensor_table};
pub use envelopes::{envelope_sentence, envelope_sentences, write_envelopes};
pub use folder::{FolderError, ResultsFolder};
pub use gate_markdown::write_comparison_page;
pub use gate_table::write_comparison;
pub use hand_out::{hand_out, hand_out_file};
pub use junit::write_junit;
pub use merge::{MergeError, Merged, merge};
pub(crate) use table::evaluations_text;
pub use table::{CAUTION, write_summary};
