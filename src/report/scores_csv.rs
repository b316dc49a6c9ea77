use std::io::{self, Write};

use crate::score::{Estimate, Floor, ScoreKind};
use crate::suite::Setting;
use crate::survey::{Answer, CaseResult, Cost, SurveyResult, regime_columns};

/// One row a case and method, or outside implementation. An empty field is a value that does not exist (undefined, not
/// counted, not timed); every
/// score stands beside its standard error.
pub(super) fn write(survey: &SurveyResult<'_>, to: &mut dyn Write) -> io::Result<()> {
    let mut csv = csv::Writer::from_writer(to);
    let headings = headings(survey);
    csv.write_record(header(&headings))?;
    for result in &survey.cases {
        for (m, (entrant, answer)) in survey.plan.entrants().zip(&result.answers).enumerate() {
            csv.write_record(row(survey, result, (m, entrant.label()), answer, &headings))?;
        }
    }
    csv.flush()
}

/// What is swept or drawn anywhere in the suite, in the order in which it comes up.
fn headings(survey: &SurveyResult<'_>) -> Vec<String> {
    let mut headings: Vec<String> = Vec::new();
    // Every case of a family has the same.
    let mut family = None;
    for case in &survey.suite.cases {
        if family.replace(case.family()) != Some(case.family()) {
            for heading in case.settings().iter().map(Setting::heading) {
                if !headings.contains(&heading) {
                    headings.push(heading);
                }
            }
        }
    }
    headings
}

fn header(headings: &[String]) -> Vec<String> {
    let mut names: Vec<String> = [
        "case",
        "family",
        "method",
        "inputs",
        "values",
        "jacobians",
        "hessians",
        "exact_moments",
        "verdict",
        "reason",
        "cause",
    ]
    .map(String::from)
    .to_vec();
    for kind in ScoreKind::ALL {
        names.push(kind.id().into());
        names.push(format!("{}_standard_error", kind.id()));
    }
    names.extend(
        [
            "floor",
            "floor_standard_error",
            "floor_standing",
            "time_ns",
            "time_ns_lower_quartile",
            "time_ns_upper_quartile",
            "time_ratio",
            "time_ratio_lower_quartile",
            "time_ratio_upper_quartile",
        ]
        .map(String::from),
    );
    names.extend(regime_columns());
    names.extend_from_slice(headings);
    names
}

fn row(
    survey: &SurveyResult<'_>,
    result: &CaseResult,
    (m, label): (usize, &str),
    answer: &Answer,
    headings: &[String],
) -> Vec<String> {
    let case = &survey.suite.cases[result.index];
    let dimension = case.marginal().law().dimension().to_string();
    let mut fields = vec![case.id().to_string(), case.family().to_string(), label.to_string(), dimension];
    match answer {
        Ok(answered) => {
            fields.extend(answered.evaluations.map_or_else(Default::default, |e| {
                [e.values, e.jacobians, e.hessians, e.exact_moments].map(|n| n.to_string())
            }));
            let verdict = &answered.verdict;
            fields.extend([verdict.trust.name().to_string(), verdict.reason.clone()]);
            fields.push(answered.cause.clone().unwrap_or_default());
        }
        Err(refusal) => {
            fields.extend(["", "", "", "", "skipped"].map(String::from));
            fields.extend([refusal.to_string(), String::new()]);
        }
    }
    let scores = answer.as_ref().ok().and_then(|a| a.scores.as_ref().ok());
    for kind in ScoreKind::ALL {
        fields.extend(pair(scores.and_then(|s| s.get(kind))));
    }
    fields.extend(match &result.floor {
        Floor::Known(estimate) => pair(Some(*estimate)),
        Floor::Unbounded => ["unbounded".into(), String::new()],
        Floor::Undefined => pair(None),
        Floor::NoiseInside => ["not defined for noise inside h".into(), String::new()],
    });
    fields.push(result.floor_standing.name().into());
    fields.extend(cost(timed(survey, result.index, m)));
    let opinions = answer.as_ref().map(|a| a.opinions).unwrap_or_default();
    fields.extend(result.indices.iter().chain(&opinions).map(|value| value.map(number).unwrap_or_default()));
    for heading in headings {
        let setting = case.settings().iter().find(|s| s.heading() == *heading);
        fields.push(setting.map(|s| number(s.value)).unwrap_or_default());
    }
    fields
}

fn pair(estimate: Option<Estimate>) -> [String; 2] {
    estimate.map_or_else(Default::default, |e| [number(e.value), number(e.standard_error)])
}

/// The shortest text that reads back as the same number, with an exponent where it is small or large.
fn number(value: f64) -> String {
    format!("{value:?}")
}

fn timed(survey: &SurveyResult<'_>, case: usize, m: usize) -> Option<Cost> {
    let timing = survey.timing.as_ref()?;
    let place = timing.cases.binary_search_by_key(&case, |(index, _)| *index).ok()?;
    timing.cases[place].1.get(m).copied().flatten()
}

fn cost(cost: Option<Cost>) -> [String; 6] {
    cost.map_or_else(Default::default, |Cost { nanoseconds: t, ratio: r }| {
        [
            format!("{:.1}", t.median),
            format!("{:.1}", t.lower),
            format!("{:.1}", t.upper),
            format!("{:.3}", r.median),
            format!("{:.3}", r.lower),
            format!("{:.3}", r.upper),
        ]
    })
}
