use std::io::{self, Write};

use super::table::{keep_whole, lines, plain_table, wrapped};
use crate::gate::{Change, Comparison, Effect, Subject};
use crate::wording::printable;

/// Rows of one table; the rest is counted.
const MOST_ROWS: usize = 30;

/// Writes what is otherwise than in the baseline: a sentence, then one row a case and method with its weightiest change.
///
/// # Errors
/// What the writer says.
pub fn write_comparison(comparison: &Comparison, to: &mut dyn Write) -> io::Result<()> {
    writeln!(to, "{}", wrapped(&comparison_sentence(comparison), 0))?;
    for note in &comparison.notes {
        writeln!(to, "{}", wrapped(&printable(note), 2))?;
    }
    let rows = leading(&comparison.changes);
    if rows.is_empty() {
        return writeln!(to);
    }
    let mut table = plain_table(&["", "case", "method", "what", "baseline", "now", "more"], 6..7);
    keep_whole(&mut table, 0..1);
    for (change, more) in rows.iter().take(MOST_ROWS) {
        let [case, method] = subject(&change.subject);
        table.add_row([
            change.effect.name().to_string(),
            case,
            method,
            printable(&change.what),
            printable(&change.before),
            printable(&change.now),
            if *more == 0 { String::new() } else { format!("+{more}") },
        ]);
    }
    writeln!(to, "{}", lines(&table))?;
    if rows.len() > MOST_ROWS {
        let left = rows.len() - MOST_ROWS;
        let note = format!("{left} more rows are not shown; --junit and --markdown have them.");
        writeln!(to, "{}", wrapped(&note, 2))?;
    }
    writeln!(to)
}

/// What came of a comparison, in one sentence.
pub(super) fn comparison_sentence(comparison: &Comparison) -> String {
    let counts: Vec<String> = Effect::ALL
        .into_iter()
        .map(|effect| (effect, leading_of(&comparison.changes, effect)))
        .filter(|(_, count)| *count > 0)
        .map(|(effect, count)| format!("{count} {}", effect.name()))
        .collect();
    let found = if counts.is_empty() { "nothing has changed".into() } else { counts.join(", ") };
    let end = if comparison.fails() { "REGRESSION" } else { "nothing worse" };
    format!(
        "{}: {end}; {} answers and references held against the baseline: {found}",
        comparison.suite,
        comparison.compared.len()
    )
}

/// Case and method, a dash for none.
pub(super) fn subject(subject: &Subject) -> [String; 2] {
    [&subject.case, &subject.method].map(|name| name.as_deref().map_or_else(|| "-".into(), printable))
}

/// The weightiest change of every subject, in order, and how many more it has.
pub(super) fn leading(changes: &[Change]) -> Vec<(&Change, usize)> {
    let mut rows: Vec<(&Change, usize)> = Vec::new();
    let mut places = std::collections::HashMap::new();
    for change in changes {
        match places.get(&change.subject) {
            Some(&place) => {
                let (_, more): &mut (&Change, usize) = &mut rows[place];
                *more += 1;
            }
            None => {
                places.insert(&change.subject, rows.len());
                rows.push((change, 0));
            }
        }
    }
    rows
}

fn leading_of(changes: &[Change], effect: Effect) -> usize {
    leading(changes).iter().filter(|(change, _)| change.effect == effect).count()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::gate::Topic;
    use crate::report::table::WIDTH;

    #[test]
    fn one_row_a_subject_and_no_line_too_wide() {
        let change = |case: &str, effect| Change {
            subject: Subject { case: Some(case.into()), method: Some("unscented-scaled:alpha=0.5:beta=2".into()) },
            topic: Topic::Score,
            effect,
            what: "greatest variance ratio".into(),
            before: "1.01050 +- 3e-5".into(),
            now: "1.06190 (+5.1e-2)\u{1b}[2J".into(),
            size: 0.1,
        };
        let changes = [
            vec![change("the-very-long-name-of-a-family-of-cases-000", Effect::Worse); 3],
            (0..40).map(|k| change(&format!("case-{k:03}"), Effect::Better)).collect(),
        ];
        let comparison = Comparison {
            suite: "harbour".into(),
            notes: vec!["The baseline was made with another seed: 1; now 2.".into()],
            changes: changes.concat(),
            compared: Vec::new(),
            quantile: 7.0,
        };
        let mut bytes = Vec::new();
        write_comparison(&comparison, &mut bytes).unwrap();
        let text = String::from_utf8(bytes).unwrap();
        assert!(text.lines().all(|line| line.chars().count() <= usize::from(WIDTH)), "{text}");
        assert!(
            text.contains("REGRESSION") && text.contains("1 worse, 40 better") && text.contains("+2"),
            "{text}"
        );
        assert!(text.contains("11 more rows are not shown") && !text.contains('\u{1b}'), "{text}");
    }
}
