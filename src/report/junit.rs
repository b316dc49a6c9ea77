use std::collections::BTreeMap;
use std::io::{self, Write};

use quick_junit::{NonSuccessKind, Report, TestCase, TestCaseStatus, TestSuite};

use crate::gate::{Change, Comparison, Subject};

/// Writes comparisons as JUnit XML: a suite is a test suite, a case with a method (or with its reference) a test case. A
/// test case fails where something got worse or moved; all its changes stand in the text of the failure, improvements and notes of
/// one that passes in its output.
///
/// # Errors
/// What the writer says.
pub fn write_junit(comparisons: &[Comparison], to: &mut dyn Write) -> io::Result<()> {
    let mut report = Report::new("gaussworthy gate");
    for comparison in comparisons {
        let mut suite = TestSuite::new(comparison.suite.as_str());
        let mut changes: BTreeMap<&Subject, Vec<&Change>> =
            comparison.compared.iter().map(|subject| (subject, Vec::new())).collect();
        for change in &comparison.changes {
            changes.entry(&change.subject).or_default().push(change);
        }
        for (subject, changes) in changes {
            suite.add_test_case(test_case(&comparison.suite, subject, &changes));
        }
        if !comparison.notes.is_empty() {
            suite.set_system_out(comparison.notes.join("\n"));
        }
        report.add_test_suite(suite);
    }
    let text = report.to_string().map_err(io::Error::other)?;
    to.write_all(without_skipped_of_all(&text).as_bytes())
}

/// The schema of JUnit XML knows `skipped` on a test suite, but not on all of them together.
fn without_skipped_of_all(text: &str) -> String {
    let (head, rest) = text.split_once("<testsuites").unwrap_or((text, ""));
    let (tag, body) = rest.split_once('>').unwrap_or((rest, ""));
    let kept: Vec<&str> = tag.split(" skipped=\"0\"").collect();
    format!("{head}<testsuites{}>{body}", kept.concat())
}

fn test_case(suite: &str, subject: &Subject, changes: &[&Change]) -> TestCase {
    let name = subject.case.as_deref().unwrap_or("whole suite");
    let class = subject.method.as_deref().unwrap_or("reference");
    let text = changes.iter().map(|change| change.sentence()).collect::<Vec<_>>().join("\n");
    let failing = changes.iter().find(|change| change.effect.fails());
    let status = failing.map_or_else(TestCaseStatus::success, |change| {
        let mut status = TestCaseStatus::non_success(NonSuccessKind::Failure);
        let kind = format!("{}.{}", change.effect.name(), change.topic.name());
        status.set_message(change.sentence()).set_type(kind).set_description(text.as_str());
        status
    });
    let mut case = TestCase::new(name, status);
    case.set_classname(format!("{suite}.{class}"));
    if failing.is_none() && !text.is_empty() {
        case.set_system_out(text.as_str());
    }
    case
}
