use std::io::{self, Write};

use super::gate_table::{comparison_sentence, leading, subject};
use super::table::CAUTION;
use crate::gate::Comparison;
use crate::wording::printable;

/// Rows of one table: pages of CI jobs are limited to about a mebibyte.
const MOST_ROWS: usize = 500;

/// Writes comparisons as a page of Markdown (CommonMark with tables) for a CI job.
///
/// # Errors
/// What the writer says.
pub fn write_comparison_page(comparisons: &[Comparison], to: &mut dyn Write) -> io::Result<()> {
    let shut = comparisons.iter().any(Comparison::fails);
    writeln!(to, "# Numerical accuracy: {}\n", if shut { "regression" } else { "nothing worse" })?;
    for comparison in comparisons {
        writeln!(to, "## {}\n", escaped(&comparison.suite))?;
        writeln!(to, "{}.\n", escaped(&comparison_sentence(comparison)))?;
        for note in &comparison.notes {
            writeln!(to, "- {}", escaped(note))?;
        }
        if !comparison.notes.is_empty() {
            writeln!(to)?;
        }
        let rows = leading(&comparison.changes);
        if !rows.is_empty() {
            writeln!(to, "| | case | method | what | baseline | now | more |")?;
            writeln!(to, "| --- | --- | --- | --- | --- | --- | ---: |")?;
        }
        for (change, more) in rows.iter().take(MOST_ROWS) {
            let [case, method] = subject(&change.subject).map(|name| escaped(&name));
            let [what, before, now] = [&change.what, &change.before, &change.now].map(|text| escaped(text));
            let more = if *more == 0 { String::new() } else { format!("+{more}") };
            writeln!(to, "| {} | {case} | {method} | {what} | {before} | {now} | {more} |", change.effect.name())?;
        }
        if rows.len() > MOST_ROWS {
            writeln!(to, "\n{} more rows are not shown.", rows.len() - MOST_ROWS)?;
        }
        if !rows.is_empty() {
            writeln!(to)?;
        }
    }
    writeln!(to, "> {}", CAUTION.replace('\n', "\n> "))
}

/// `text` as plain words: CommonMark takes a backslash before any ASCII punctuation (section 2.4), and no line is broken.
fn escaped(text: &str) -> String {
    let mut escaped = String::with_capacity(text.len());
    for c in printable(text).chars() {
        if matches!(c, '\\' | '`' | '*' | '_' | '[' | ']' | '<' | '>' | '|' | '~' | '&' | '#' | '!' | '$') {
            escaped.push('\\');
        }
        // The excerpts of a message are lines of their own, which a table has no room for.
        escaped.push(if c == '\n' { ' ' } else { c });
    }
    escaped
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_a_stranger_wrote_stays_words() {
        assert_eq!(escaped("a|b <img> [x](y) `c` &amp;"), "a\\|b \\<img\\> \\[x\\](y) \\`c\\` \\&amp;");
        assert_eq!(escaped("one\ntwo\n    three"), "one\\\\ntwo     three");
    }
}
