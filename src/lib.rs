//! Gaussworthy measures how wrong each Gaussian approximation of a nonlinear measurement is, for
//! *your* sensor and *your* operating conditions, and says where it can be trusted.
//!
//! Data flows one way: [`suite`] makes cases; [`reference`](mod@reference) samples their true moments
//! beside the [`method`]s that approximate them, and the answers of implementations [`outside`]; [`score`] compares the two;
//! [`trust`] judges; [`survey`] runs it all in parallel; [`guidance`] draws conclusions; [`gate`] holds it against a
//! baseline; [`report`] writes it down and [`publish`] tells those who did not run it.
//! [`gaussian`] and [`sensor`] are the ground they stand on; [`net`] and [`lanes`] are what sampling is made of.
//!
//! Results guide a choice, they certify nothing: before an estimator steers, lands, stops or warns
//! anything, the reader's own verification process, the applicable standards and codes, and licensed or
//! responsible engineers decide.

pub mod gate;
pub mod gaussian;
pub mod guidance;
pub mod lanes;
pub mod method;
pub mod net;
pub mod outside;
pub mod publish;
pub mod reference;
pub mod report;
pub mod score;
pub mod sensor;
mod shard;
pub mod suite;
pub mod survey;
pub mod trust;
mod whole_file;
mod wording;
