//! Implementations outside of this program: their answers, from a file or from a command, scored beside the methods.
//!
//! An answer is a moments record, one JSON object a line, in any order:
//!
//! ```json
//! {"case":"k-017","mean":[31.7,0.32],"covariance":[[9.1,0.01],[0.01,0.02]],"cross_covariance":[[8.9,0.02],[2.1,0.07]]}
//! ```
//!
//! `mean` has p numbers, one an output; `covariance` is p x p and includes the noise; `cross_covariance` has n rows, one a
//! component of the state, and p columns. Angles are in radians; a mean beyond (-pi, pi] is wrapped. Other keys are for
//! the writer's own use.
//!
//! What cannot be used is never dropped: the case counts as rejected and its verdict says why, with the line.

mod answers;
mod checked;
mod collector;
mod command;
mod last_words;
mod lines;
mod name;

pub use answers::{Flaw, Origin, Outside, Tally};
pub use command::{AskError, CommandError, OutsideCommand};
pub use name::{Name, NameError};
