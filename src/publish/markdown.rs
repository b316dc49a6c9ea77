use askama::Template;

use super::prepared::Prepared;
use super::views::{self, SuiteView};
use crate::report::CAUTION;

/// The guidance as Markdown. Everything foreign goes through [`filters::md`].
#[derive(Template)]
#[template(path = "guidance.md", escape = "none")]
struct Markdown<'a> {
    title: &'a str,
    caution: &'static str,
    suites: Vec<SuiteView<'a>>,
    pictures: Vec<Linked<'a>>,
}

/// A picture beside it.
pub(super) struct Linked<'a> {
    pub alt: &'a str,
    pub caption: &'a str,
    /// Its file, relative to the text.
    pub file: &'a str,
}

pub(super) fn render(
    title: &str,
    prepared: &[Prepared<'_>],
    pictures: Vec<Linked<'_>>,
) -> Result<String, askama::Error> {
    let suites = prepared.iter().map(views::suite).collect();
    Markdown { title, caution: CAUTION, suites, pictures }.render()
}

mod filters {
    use std::fmt::Write;

    use askama::{Result, Values};

    use super::super::words::Rich;
    use super::escaped;

    /// Text that shows as it is: no markup, no HTML, no end of a line or of a cell.
    #[askama::filter_fn]
    pub fn md(text: impl std::fmt::Display, _: &dyn Values) -> Result<String> {
        Ok(escaped(&text.to_string()))
    }

    /// A sentence with its names as code.
    #[askama::filter_fn]
    pub fn rich(text: &Rich, _: &dyn Values) -> Result<String> {
        let mut out = String::new();
        for piece in text.pieces() {
            if piece.code {
                // Nothing is markup between backticks but a pipe in a table, and sentences stand in none.
                let line = piece.text.split_whitespace().collect::<Vec<_>>().join(" ");
                write!(out, "`{line}`")?;
            } else {
                out.push_str(&escaped(piece.text));
            }
        }
        Ok(out)
    }

    /// Without ends of lines.
    #[askama::filter_fn]
    pub fn one_line(text: impl std::fmt::Display, _: &dyn Values) -> Result<String> {
        Ok(text.to_string().split_whitespace().collect::<Vec<_>>().join(" "))
    }
}

/// CommonMark: a backslash before any ASCII punctuation makes it a plain character (CommonMark 0.31.2, sec. 2.4); here before
/// those that could begin something.
fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '\\' | '`' | '*' | '_' | '[' | ']' | '<' | '>' | '|' | '#' | '~' | '&' | '!' | '$' => {
                out.extend(['\\', c])
            }
            c if c.is_control() => out.push(' '),
            c => out.push(c),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::escaped;

    #[test]
    fn what_could_be_markup_is_escaped() {
        assert_eq!(escaped("<b>a|b*\n# [x](y)"), "\\<b\\>a\\|b\\* \\# \\[x\\](y)");
    }
}
