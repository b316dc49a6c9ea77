//! The gate: what a survey finds today against a baseline that was accepted before.
//!
//! A [`Baseline`] holds, of every case, the reference's moments with their standard errors, and of every method its moments, scores, verdict and
//! evaluations. What is compared, and what chance may explain:
//!
//! | what | rule |
//! | --- | --- |
//! | moments of a method | no chance in them: beyond rounding ([`Rules::rounding`]) the method has moved |
//! | scores of a method that has moved | today's and the accepted moments are scored on today's reference; the jackknife error of the difference decides ([`Scorer::difference`](crate::score::Scorer::difference)) |
//! | scores of one that has not | the standard errors of both sides decide, and the bias that norms have (q + root of the number of moments in place of q); on the very same reference, nothing but rounding is allowed |
//! | reference, floor | the standard errors of both sides decide |
//! | verdicts | a worse one counts unless the method stands still and only the reference was sampled anew |
//! | evaluations, validity, what is missing | counted |
//!
//! A method that has moved fails, unless it became better beyond the standard errors of both sides and nowhere worse: a change that no score resolves is
//! still a change that nobody asked for, until it is accepted. Improvements and what is new are listed and never fail.
//!
//! With d a difference and s1, s2 the standard errors of its sides, chance is ruled out where |d| > q sqrt(s1^2 + s2^2), with q the two-sided
//! quantile of Student's law with R - 1 degrees of freedom at odds / m: R replicates, m differences in the run, so that the odds of any false alarm
//! in the whole run are at most `odds`, whatever the dependence between differences.
//!
//! Sources: B. L. Welch, "The generalization of 'Student's' problem when several different population variances are involved", Biometrika 34
//! (1947) 28-35 (his degrees of freedom lie between R - 1 and 2 R - 2; the smaller errs on the side of silence); O. J. Dunn, "Multiple comparisons
//! among means", JASA 56 (1961) 52-64 (Bonferroni's inequality). The step-down of Holm (1979) would list a few more differences once one is found,
//! and find none where this finds none.

mod baseline;
mod change;
mod comparison;
mod file;
mod moments;
mod rules;
mod scores;

pub use baseline::{Baseline, KeptAnswer, KeptCase, KeptReference, Made};
pub use change::{Change, Effect, Subject, Topic};
pub use comparison::{Comparison, compare};
pub use file::BaselineError;
pub use rules::{Rules, RulesError};
