use std::io::{self, Write};

use comfy_table::{CellAlignment, ColumnConstraint, ContentArrangement, Table, presets};

use crate::method::Evaluations;
use crate::outside::Outside;
use crate::survey::{MethodSummary, Summary, SurveyResult};

/// What every published page says.
pub const CAUTION: &str = "\
Results guide a choice, they certify nothing: before an estimator steers, lands, stops or warns
anything, your own verification process, the applicable standards and codes, and licensed or
responsible engineers decide.";

/// Columns that a table may take.
pub(super) const WIDTH: u16 = 100;

/// A table without borders that fits [`WIDTH`] columns; `right` are the columns of numbers.
pub(super) fn plain_table(header: &[&str], right: std::ops::Range<usize>) -> Table {
    let mut table = Table::new();
    table.load_style(presets::NOTHING).set_width(WIDTH).set_content_arrangement(ContentArrangement::Dynamic);
    table.set_header(header.to_vec());
    for (i, column) in table.column_iter_mut().enumerate() {
        column.set_padding((0, 2));
        if right.contains(&i) {
            column.set_cell_alignment(CellAlignment::Right);
        }
    }
    table
}

/// Keeps the words of these columns on one line.
pub(super) fn keep_whole(table: &mut Table, columns: std::ops::Range<usize>) {
    for i in columns {
        if let Some(column) = table.column_mut(i) {
            column.set_constraint(ColumnConstraint::ContentWidth);
        }
    }
}

/// Writes what a survey found, one table a suite.
///
/// # Errors
/// What the writer says.
pub fn write_summary(survey: &SurveyResult<'_>, summary: &Summary, to: &mut dyn Write) -> io::Result<()> {
    let suite = survey.suite;
    writeln!(to, "{}", wrapped(&format!("{} - {}", suite.name, suite.title), 0))?;
    let reached = summary
        .worst_error
        .map_or("none can be believed".into(), |worst| format!("worst standardised standard error {worst:.1e}"));
    let facts = format!(
        "{}{} of {} cases, {:.3e} samples in {:.1} s; {reached} ({:e} asked)",
        survey.plan.shard.map_or(String::new(), |shard| format!("part {shard}: ")),
        summary.cases,
        survey.asked(),
        survey.points() as f64,
        survey.sampling_time.as_secs_f64(),
        survey.plan.sampler.precision,
    );
    writeln!(to, "{}", wrapped(&facts, 0))?;
    let mut table =
        plain_table(&["method", "evals", "time", "trusted", "rejected", "undecided", "what breaks first"], 1..6);
    keep_whole(&mut table, 0..6);
    for method in &summary.methods {
        table.add_row(row(method));
    }
    writeln!(to, "{}", lines(&table))?;
    for note in notes(survey, summary) {
        writeln!(to, "{}", wrapped(&note, 2))?;
    }
    writeln!(to)
}

fn row(m: &MethodSummary) -> Vec<String> {
    let share = |count: usize| match m.served() {
        0 => "-".to_string(),
        served => format!("{:.0} %", 100.0 * count as f64 / served as f64),
    };
    vec![
        m.label.clone(),
        m.evaluations.map_or("-".into(), evaluations_text),
        m.time_ratio.map_or("-".into(), |q| format!("{:.1}", q.median)),
        share(m.trusted),
        share(m.rejected),
        share(m.undecided),
        m.breaks_first.map_or("-".into(), |(fault, count)| {
            format!("{fault} ({:.0} %)", 100.0 * count as f64 / m.rejected as f64)
        }),
    ]
}

/// Evaluations of h, least and most, as a number, with a Jacobian as J, a set of Hessians as H and a set of exact moments as M
/// beside it.
pub(crate) fn evaluations_text((least, most): (Evaluations, Evaluations)) -> String {
    let mut parts = Vec::new();
    if most.values > 0 {
        parts.push(if least.values == most.values {
            most.values.to_string()
        } else {
            format!("{}-{}", least.values, most.values)
        });
    }
    for (count, mark) in [(most.jacobians, "J"), (most.hessians, "H"), (most.exact_moments, "M")] {
        if count > 0 {
            parts.push(format!("{count} {mark}"));
        }
    }
    parts.join(" + ")
}

fn notes(survey: &SurveyResult<'_>, summary: &Summary) -> Vec<String> {
    let mut notes = Vec::new();
    let limits = &survey.plan.limits;
    if summary.beyond_gaussian > 0 {
        notes.push(format!(
            "No Gaussian should be trusted in {} of {} cases: their floor is above {} nats.",
            summary.beyond_gaussian, summary.cases, limits.floor
        ));
    }
    if summary.gaussian > 0 && summary.gaussian < summary.cases {
        let most = summary.methods.iter().max_by_key(|m| m.trusted_where_gaussian);
        let of_them = match (summary.cheapest_where_gaussian(), most) {
            (Some(method), _) => format!("the cheapest method that is trusted in all of them is {}", method.label),
            (None, Some(method)) => format!(
                "no method is trusted in all of them; {} is in {}",
                method.label, method.trusted_where_gaussian
            ),
            (None, None) => "nobody was asked".into(),
        };
        notes
            .push(format!("Where a Gaussian will do, {} of {} cases, {of_them}.", summary.gaussian, summary.cases));
    }
    if summary.floor_open > 0 {
        notes.push(format!(
            "Whether any Gaussian can be trusted cannot be told in {} of {} cases: their floor is too near its limit, \
             undefined for want of noise, or that of a refused reference.",
            summary.floor_open, summary.cases
        ));
    }
    if summary.noise_inside > 0 {
        notes.push(format!(
            "The floor is not defined for noise inside h, as in {} of {} cases: whether any Gaussian can be trusted there \
             is not told.",
            summary.noise_inside, summary.cases
        ));
    }
    if summary.wide > 0 {
        notes.push(format!(
            "{} references fell short of the asked precision at the cap of {} samples; their standard errors say by \
             how much.",
            summary.wide, survey.plan.sampler.cap
        ));
    }
    for (count, what) in [
        (summary.refused, "refused (a moment does not exist or cannot be had by sampling)"),
        (summary.disputed, "disputed by an independent plain estimate"),
        (summary.heavy_tailed, "so heavy-tailed that no standard error can be believed"),
    ] {
        if count > 0 {
            notes.push(format!("{count} references are {what}; no verdict rests on them, scores.csv says why."));
        }
    }
    if summary.noiseless > 0 {
        notes.push(format!(
            "{} of {} cases have no noise: R = 0, and some scores are undefined.",
            summary.noiseless, summary.cases
        ));
    }
    if summary.streamed > 0 {
        notes.push(format!(
            "{} references were sampled by plain streams: their sensors read more components than the nets have \
             dimensions.",
            summary.streamed
        ));
    }
    for method in &summary.methods {
        if let Some(reason) = &method.skip_reason {
            notes.push(format!("{} was skipped in {} cases: {reason}.", method.label, method.skipped));
        }
    }
    notes.extend(survey.plan.outside.iter().flat_map(outside_notes));
    notes
}

/// What an outside implementation left undone; its answers are counted over all cases asked.
fn outside_notes(outside: &Outside) -> Vec<String> {
    let (name, tally) = (outside.name(), outside.tally());
    let mut notes = Vec::new();
    if let Some(failure) = outside.failure() {
        notes.push(format!("{name}: {failure}."));
    }
    if tally.missing + tally.unusable > 0 {
        notes.push(format!(
            "{name} gave no valid answer to {} of {} cases ({} missing, {} invalid); they count as rejected, scores.csv \
             says why.",
            tally.missing + tally.unusable,
            tally.asked,
            tally.missing,
            tally.unusable
        ));
    }
    if tally.unknown + tally.unreadable > 0 {
        notes.push(format!(
            "{name}: {} answers are for cases that are not in this suite, {} lines name no case; none of them is scored.",
            tally.unknown, tally.unreadable
        ));
    }
    notes
}

/// A paragraph that keeps to [`WIDTH`] columns, indented.
pub(super) fn wrapped(text: &str, indent: u16) -> String {
    let mut table = Table::new();
    table.load_style(presets::NOTHING).set_width(WIDTH).set_content_arrangement(ContentArrangement::Dynamic);
    table.add_row([text]);
    if let Some(column) = table.column_mut(0) {
        column.set_padding((indent, 0));
    }
    lines(&table)
}

/// Facts, each behind its label, that keep to [`WIDTH`] columns, indented.
pub(super) fn labelled(facts: &[(&str, String)]) -> String {
    let mut table = Table::new();
    table.load_style(presets::NOTHING).set_width(WIDTH).set_content_arrangement(ContentArrangement::Dynamic);
    for (label, fact) in facts {
        table.add_row([label, fact.as_str()]);
    }
    for column in table.column_iter_mut() {
        column.set_padding((2, 0));
    }
    keep_whole(&mut table, 0..1);
    lines(&table)
}

/// The table without the blanks that end its lines.
pub(super) fn lines(table: &Table) -> String {
    table.trim_fmt()
}
