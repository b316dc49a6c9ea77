use std::io::{self, Write};

use serde::Serialize;

use crate::gaussian::Moments;
use crate::reference::{PointSource, Reference, Soundness};
use crate::suite::rows;
use crate::survey::{Stop, SurveyResult};

/// A moments record with its standard errors. Angles in radians; a value that is not finite becomes null.
#[derive(Serialize)]
struct MomentsRecord<'a> {
    case: &'a str,
    #[serde(flatten)]
    moments: Entries,
    standard_error: Entries,
    points: u64,
    replicates: usize,
    soundness: Soundness,
    stopped: Stop,
    points_of: PointSource,
}

#[derive(Serialize)]
struct Entries {
    mean: Vec<f64>,
    covariance: Vec<Vec<f64>>,
    cross_covariance: Vec<Vec<f64>>,
}

impl From<&Moments> for Entries {
    fn from(m: &Moments) -> Self {
        Self {
            mean: m.mean.iter().copied().collect(),
            covariance: rows(&m.covariance),
            cross_covariance: rows(&m.cross_covariance),
        }
    }
}

/// One case record a line, finished cases only.
pub(super) fn write_cases(survey: &SurveyResult<'_>, to: &mut dyn Write) -> io::Result<()> {
    for result in &survey.cases {
        line(&survey.suite.cases[result.index].to_json(), to)?;
    }
    Ok(())
}

/// One moments record a line.
pub(super) fn write_references(survey: &SurveyResult<'_>, to: &mut dyn Write) -> io::Result<()> {
    for result in &survey.cases {
        let Reference { moments, standard_error, points, soundness, source, .. } = &result.reference;
        let record = MomentsRecord {
            case: survey.suite.cases[result.index].id(),
            moments: moments.into(),
            standard_error: standard_error.into(),
            points: *points,
            replicates: survey.plan.sampler.replicates,
            soundness: *soundness,
            stopped: result.stop,
            points_of: *source,
        };
        line(&record, to)?;
    }
    Ok(())
}

pub(super) fn line(value: &impl Serialize, to: &mut dyn Write) -> io::Result<()> {
    serde_json::to_writer(&mut *to, value)?;
    writeln!(to)
}
