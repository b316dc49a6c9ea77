//! What the outside checks share: the check files, seeded random covariances, comparisons.

// Every test binary compiles this module whole and uses a part of it.
#![allow(dead_code)]

pub mod analytic;
pub mod close;
pub mod deviations;
pub mod random;
pub mod records;
pub mod sightings;
pub mod trials;
