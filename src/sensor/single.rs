use std::borrow::Cow;

use super::parameter::checked_component;
use super::{Output, ParameterError};

/// One state component and the one plain output that is read from it: what all sensors of a single component share.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Single {
    pub reads: [usize; 1],
    pub outputs: [Output; 1],
}

impl Single {
    /// Reads `component` of a state of `n`; the output is in `unit`.
    ///
    /// # Errors
    /// [`ParameterError`] if the component is outside the state.
    pub fn new(component: usize, unit: impl Into<Cow<'static, str>>, n: usize) -> Result<Self, ParameterError> {
        checked_component("component", component, n)?;
        Ok(Self { reads: [component], outputs: [Output::plain("reading", unit)] })
    }
}
