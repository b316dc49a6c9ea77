use std::io::{self, Write};

use crate::score::{Estimate, Floor, ScoreKind};
use crate::survey::{Answer, CaseResult, Cost, SurveyResult};

/// One row a case and method, or outside implementation. An empty field is a value that does not exist (undefined, not
/// counted, not timed); every
/// score stands beside its standard error.
pub(super) fn write(survey: &SurveyResult<'_>, to: &mut dyn Write) -> io::Result<()> {
    let mut csv = csv::Writer::from_writer(to);
    csv.write_record(header())?;
    for result in &survey.cases {
        for (m, (entrant, answer)) in survey.plan.entrants().zip(&result.answers).enumerate() {
            csv.write_record(row(survey, result, (m, entrant.label()), answer))?;
        }
    }
    csv.flush()
}

fn header() -> Vec<String> {
    let mut names: Vec<String> =
        ["case", "method", "inputs", "values", "jacobians", "hessians", "verdict", "reason"]
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
            "time_ns",
            "time_ns_lower_quartile",
            "time_ns_upper_quartile",
            "time_ratio",
            "time_ratio_lower_quartile",
            "time_ratio_upper_quartile",
        ]
        .map(String::from),
    );
    names
}

fn row(survey: &SurveyResult<'_>, result: &CaseResult, (m, label): (usize, &str), answer: &Answer) -> Vec<String> {
    let case = &survey.suite.cases[result.index];
    let mut fields = vec![case.id().to_string(), label.to_string(), case.marginal().law().dimension().to_string()];
    match answer {
        Ok(answered) => {
            fields.extend(
                answered
                    .evaluations
                    .map_or_else(Default::default, |e| [e.values, e.jacobians, e.hessians].map(|n| n.to_string())),
            );
            let verdict = &answered.verdict;
            fields.extend([verdict.trust.name().to_string(), verdict.reason.clone()]);
        }
        Err(refusal) => {
            fields.extend(["", "", "", "skipped"].map(String::from));
            fields.push(refusal.to_string());
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
    fields.extend(cost(timed(survey, result.index, m)));
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
