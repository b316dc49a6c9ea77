//! Suites: TOML files that describe a sensor and a family of cases, and the case records they become.

mod case;

pub use case::{Case, CaseError};
