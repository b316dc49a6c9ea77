use std::fmt;

use crate::wording::printable;

/// What is wrong with a suite or a case-record file, where, and what would be right: one line, and
/// below it perhaps an excerpt of a formula.
///
/// ```text
/// harbour.toml:12: prior.range: "3 deg" is an angle; a length is needed: m, km, cm, mm, nmi
/// ```
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SuiteError {
    /// The file, or the name of the suite where there is none.
    pub file: String,
    /// Line in the file, from 1; `None` for the file as a whole.
    pub line: Option<usize>,
    /// Path of the key at fault, such as `family[1].prior.range`; empty for the line or the file as a whole.
    pub key: String,
    /// What is wrong and what would be right.
    pub message: String,
}

impl SuiteError {
    /// An error that says something of a file as a whole.
    pub(super) fn of_file(file: impl Into<String>, message: impl Into<String>) -> Self {
        Self { file: file.into(), line: None, key: String::new(), message: message.into() }
    }

    /// An error at a line whose file is named later, by [`SuiteError::in_file`].
    pub(super) fn at(line: usize, key: impl Into<String>, message: impl Into<String>) -> Self {
        Self { file: String::new(), line: Some(line), key: key.into(), message: message.into() }
    }

    pub(super) fn in_file(self, file: &str) -> Self {
        Self { file: file.into(), ..self }
    }

    /// Says in which case of a grid the trouble came up.
    pub(super) fn in_case(mut self, id: &str) -> Self {
        self.message.push_str(&format!(" (case {id})"));
        self
    }
}

impl fmt::Display for SuiteError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let mut line = self.file.clone();
        if let Some(number) = self.line {
            line.push_str(&format!(":{number}"));
        }
        for part in [&self.key, &self.message] {
            if !part.is_empty() {
                line.push_str(": ");
                line.push_str(part);
            }
        }
        // Keys and values come from the file and may hold anything.
        f.write_str(&printable(&line))
    }
}

impl std::error::Error for SuiteError {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn it_is_one_line_whatever_the_file_holds() {
        let error = SuiteError::at(3, "prior.a\nb", "is \u{1b}[31mred\u{2028}\n").in_file("x.toml");
        assert_eq!(error.to_string(), "x.toml:3: prior.a\\nb: is \\u{1b}[31mred\\u{2028}\\n");
    }

    #[test]
    fn what_is_not_known_is_left_out() {
        assert_eq!(SuiteError::of_file("x", "is empty").to_string(), "x: is empty");
        assert_eq!(SuiteError::at(1, "", "is empty").in_file("x").to_string(), "x:1: is empty");
    }
}
