use std::fmt;

use crate::method::check_own_label;

/// What an outside implementation is called in tables and files.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Name(String);

/// What is no name.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{0}")]
pub struct NameError(String);

impl Name {
    /// The name.
    ///
    /// # Errors
    /// [`NameError`] if it is that of a built-in method, or would break a table.
    pub fn new(text: &str) -> Result<Self, NameError> {
        check_own_label(text).map_err(|e| NameError(e.message))?;
        Ok(Self(text.into()))
    }

    /// As text.
    pub fn as_str(&self) -> &str {
        &self.0
    }
}

impl fmt::Display for Name {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.0)
    }
}
