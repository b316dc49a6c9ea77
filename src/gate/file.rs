//! A baseline as a file: JSON Lines, one header, then one line a case for its reference and one for every answer, sorted by name. Values read
//! back to the bit; standard errors have three digits.

use std::fs;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};
use serde_json::{Map, Value};

use super::baseline::{Baseline, KeptAnswer, KeptCase, KeptReference, Made};
use crate::gaussian::Moments;
use crate::method::Evaluations;
use crate::reference::Soundness;
use crate::score::{Estimate, ScoreKind};
use crate::suite::rows;
use crate::trust::{Standing, Trust};
use crate::whole_file::WholeFile;
use crate::wording::plain;

/// Number of the format.
const FORMAT: u64 = 1;

/// A baseline cannot be read or written.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum BaselineError {
    /// There is none.
    #[error("{}: there is no baseline yet; write one with --accept", .0.display())]
    Absent(PathBuf),
    /// The system does not let us.
    #[error("{}: {what}", path.display())]
    System {
        /// The file.
        path: PathBuf,
        /// What cannot be done.
        what: &'static str,
        /// What the system says.
        source: io::Error,
    },
    /// It is no baseline.
    #[error("{}:{line}: {message}", path.display())]
    Line {
        /// The file.
        path: PathBuf,
        /// The line, from 1.
        line: usize,
        /// What is wrong, and what would be right.
        message: String,
    },
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Header {
    baseline: u64,
    cases: usize,
    made: Made,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct TimeLine {
    method: String,
    time_ratio: f64,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct ReferenceLine {
    case: String,
    question: String,
    soundness: Soundness,
    floor_standing: String,
    #[serde(skip_serializing_if = "Option::is_none")]
    floor: Option<[f64; 2]>,
    moments: Entries,
    standard_error: Entries,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct AnswerLine {
    case: String,
    method: String,
    #[serde(skip_serializing_if = "Option::is_none")]
    skipped: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    missing: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    verdict: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    invalid: Option<String>,
    /// Values, Jacobians, sets of Hessians, sets of exact moments.
    #[serde(skip_serializing_if = "Option::is_none")]
    evaluations: Option<[u64; 4]>,
    #[serde(skip_serializing_if = "Option::is_none")]
    moments: Option<Entries>,
    /// Score and standard error by name.
    #[serde(skip_serializing_if = "Option::is_none")]
    scores: Option<Map<String, Value>>,
}

/// Moments as JSON; what is not finite is null.
#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Entries {
    mean: Vec<Option<f64>>,
    covariance: Vec<Vec<Option<f64>>>,
    cross_covariance: Vec<Vec<Option<f64>>>,
}

impl Baseline {
    /// Where the baseline of a suite is kept in `folder`.
    pub fn path(folder: &Path, suite: &str) -> PathBuf {
        folder.join(format!("{suite}.jsonl"))
    }

    /// Reads the baseline of a suite from `folder`.
    ///
    /// # Errors
    /// [`BaselineError`] says what is wrong in which line.
    pub fn read(folder: &Path, suite: &str) -> Result<Self, BaselineError> {
        let path = Self::path(folder, suite);
        let text = fs::read_to_string(&path).map_err(|source| match source.kind() {
            io::ErrorKind::NotFound => BaselineError::Absent(path.clone()),
            _ => BaselineError::System { path: path.clone(), what: "cannot be read", source },
        })?;
        Self::parse(&text).map_err(|(line, message)| BaselineError::Line { path, line, message })
    }

    /// Reads a baseline from its text; the error is a line, from 1, and what is wrong there.
    fn parse(text: &str) -> Result<Self, (usize, String)> {
        let mut lines = text.lines().enumerate().map(|(i, line)| (i + 1, line));
        let (_, first) = lines.next().ok_or((1, "is empty; write a baseline with --accept".to_string()))?;
        let header = read_header(first).map_err(|message| (1, message))?;
        let mut found = Self { made: header.made, cases: Default::default(), time_ratios: Default::default() };
        let mut last = 1;
        for (number, line) in lines {
            found.take(line).map_err(|message| (number, message))?;
            last = number;
        }
        if found.cases.len() != header.cases {
            let (there, wanted) = (found.cases.len(), header.cases);
            return Err((last, format!("ends after {there} of {wanted} cases: it has been cut or edited")));
        }
        Ok(found)
    }

    fn take(&mut self, line: &str) -> Result<(), String> {
        let value: Value = serde_json::from_str(line).map_err(|e| format!("is not JSON: {e}"))?;
        match (value.get("case").is_some(), value.get("method").is_some()) {
            (true, false) => {
                let line: ReferenceLine = typed(value)?;
                let case = KeptCase {
                    question: line.question,
                    reference: KeptReference {
                        moments: line.moments.read()?,
                        standard_error: line.standard_error.read()?,
                        soundness: line.soundness,
                        floor: line.floor.map(estimate),
                        floor_standing: named(
                            &line.floor_standing,
                            [Standing::Kept, Standing::Broken, Standing::Open],
                            Standing::name,
                        )?,
                    },
                    answers: Default::default(),
                };
                if self.cases.insert(line.case.clone(), case).is_some() {
                    return Err(format!("case `{}` stands twice", line.case));
                }
            }
            (true, true) => {
                let line: AnswerLine = typed(value)?;
                let (name, label) = (line.case.clone(), line.method.clone());
                let answer = line.read()?;
                let case = self
                    .cases
                    .get_mut(&name)
                    .ok_or_else(|| format!("answers case `{name}`, whose reference must stand before it"))?;
                if let KeptAnswer::Given { moments, .. } = &answer
                    && !same_shape(moments, &case.reference.moments)
                {
                    return Err(format!("the moments have other dimensions than the reference of `{name}`"));
                }
                if case.answers.insert(label.clone(), answer).is_some() {
                    return Err(format!("method `{label}` stands twice in case `{name}`"));
                }
            }
            (false, _) => {
                let line: TimeLine = typed(value)?;
                self.time_ratios.insert(line.method, line.time_ratio);
            }
        }
        Ok(())
    }

    /// Writes it into `folder`, which is made if it is not there; the file appears whole or not at all.
    ///
    /// # Errors
    /// [`BaselineError::System`].
    pub fn write(&self, folder: &Path) -> Result<PathBuf, BaselineError> {
        let path = Self::path(folder, &self.made.suite);
        let attempt = || {
            fs::create_dir_all(folder)?;
            let mut file = WholeFile::create(&path)?;
            self.write_to(&mut file)?;
            file.finish_on_disk()
        };
        attempt().map_err(|source| BaselineError::System {
            path: path.clone(),
            what: "cannot be written",
            source,
        })?;
        Ok(path)
    }

    fn write_to(&self, to: &mut dyn Write) -> io::Result<()> {
        line(&Header { baseline: FORMAT, cases: self.cases.len(), made: self.made.clone() }, to)?;
        for (method, &time_ratio) in &self.time_ratios {
            line(&TimeLine { method: method.clone(), time_ratio }, to)?;
        }
        for (name, case) in &self.cases {
            let reference = &case.reference;
            let written = ReferenceLine {
                case: name.clone(),
                question: case.question.clone(),
                soundness: reference.soundness,
                floor_standing: reference.floor_standing.name().into(),
                floor: reference.floor.map(pair),
                moments: Entries::of(&reference.moments, |v| v),
                standard_error: Entries::of(&reference.standard_error, three_digits),
            };
            line(&written, to)?;
            for (label, answer) in &case.answers {
                line(&AnswerLine::of(name, label, answer), to)?;
            }
        }
        Ok(())
    }
}

fn read_header(text: &str) -> Result<Header, String> {
    let value: Value = serde_json::from_str(text).map_err(|e| format!("is not JSON: {e}"))?;
    match value.get("baseline").map(Value::as_u64) {
        Some(Some(FORMAT)) => typed(value),
        Some(_) => Err(format!(
            "is a baseline of format {}; this version reads {FORMAT}: write it anew with --accept",
            value["baseline"]
        )),
        None => Err("is no baseline: its first line does not begin with {\"baseline\":1".into()),
    }
}

fn typed<T: serde::de::DeserializeOwned>(value: Value) -> Result<T, String> {
    serde_path_to_error::deserialize(value).map_err(|e| {
        let path = e.path().to_string();
        let message = plain(&e.into_inner().to_string());
        if path == "." { message } else { format!("{path}: {message}") }
    })
}

fn named<T: Copy, const N: usize>(text: &str, known: [T; N], name: fn(T) -> &'static str) -> Result<T, String> {
    known.into_iter().find(|&one| name(one) == text).ok_or_else(|| {
        let names: Vec<_> = known.into_iter().map(name).collect();
        format!("`{text}` has no meaning here; known: {}", names.join(", "))
    })
}

impl AnswerLine {
    fn of(case: &str, label: &str, answer: &KeptAnswer) -> Self {
        let nothing = Self {
            case: case.into(),
            method: label.into(),
            skipped: None,
            missing: None,
            verdict: None,
            invalid: None,
            evaluations: None,
            moments: None,
            scores: None,
        };
        match answer {
            KeptAnswer::Skipped(why) => Self { skipped: Some(why.clone()), ..nothing },
            KeptAnswer::Missing(why) => Self { missing: Some(why.clone()), ..nothing },
            KeptAnswer::Given { moments, evaluations, trust, scores } => Self {
                verdict: Some(trust.name().into()),
                invalid: scores.as_ref().err().cloned(),
                evaluations: evaluations.map(|e| [e.values, e.jacobians, e.hessians, e.exact_moments]),
                moments: Some(Entries::of(moments, |v| v)),
                scores: scores.as_ref().ok().map(|scores| {
                    scores
                        .iter()
                        .map(|(kind, score)| (kind.id().to_string(), serde_json::json!(pair(*score))))
                        .collect()
                }),
                ..nothing
            },
        }
    }

    fn read(self) -> Result<KeptAnswer, String> {
        if let Some(why) = self.skipped {
            return Ok(KeptAnswer::Skipped(why));
        }
        if let Some(why) = self.missing {
            return Ok(KeptAnswer::Missing(why));
        }
        let verdict = self.verdict.ok_or("`verdict` is missing")?;
        let scores = match (self.invalid, self.scores) {
            (Some(why), None) => Err(why),
            (None, Some(scores)) => Ok(scores
                .into_iter()
                .map(|(name, pair)| {
                    let kind = named_score(&name)?;
                    let pair: [f64; 2] = typed(pair).map_err(|e| format!("scores.{name}: {e}"))?;
                    Ok((kind, estimate(pair)))
                })
                .collect::<Result<_, String>>()?),
            _ => return Err("give either `scores` or `invalid`".into()),
        };
        Ok(KeptAnswer::Given {
            moments: self.moments.ok_or("`moments` is missing")?.read()?,
            evaluations: self.evaluations.map(|[values, jacobians, hessians, exact_moments]| Evaluations {
                values,
                jacobians,
                hessians,
                exact_moments,
            }),
            trust: named(&verdict, [Trust::Trusted, Trust::Rejected, Trust::Undecided], Trust::name)?,
            scores,
        })
    }
}

fn named_score(name: &str) -> Result<ScoreKind, String> {
    named(name, ScoreKind::ALL, ScoreKind::id)
}

fn pair(e: Estimate) -> [f64; 2] {
    [e.value, three_digits(e.standard_error)]
}

fn estimate([value, standard_error]: [f64; 2]) -> Estimate {
    Estimate { value, standard_error }
}

/// More would change with every seed and tell a reviewer nothing.
fn three_digits(error: f64) -> f64 {
    format!("{error:.2e}").parse().unwrap_or(error)
}

fn same_shape(a: &Moments, b: &Moments) -> bool {
    a.mean.len() == b.mean.len()
        && a.covariance.shape() == b.covariance.shape()
        && a.cross_covariance.shape() == b.cross_covariance.shape()
}

impl Entries {
    fn of(moments: &Moments, digits: fn(f64) -> f64) -> Self {
        let finite = |v: f64| v.is_finite().then(|| digits(v));
        let matrix =
            |m: &DMatrix<f64>| rows(m).into_iter().map(|row| row.into_iter().map(finite).collect()).collect();
        Self {
            mean: moments.mean.iter().map(|&v| finite(v)).collect(),
            covariance: matrix(&moments.covariance),
            cross_covariance: matrix(&moments.cross_covariance),
        }
    }

    fn read(self) -> Result<Moments, String> {
        let p = self.mean.len();
        if self.covariance.len() != p {
            return Err(format!("covariance has {} rows; the mean has {p} entries", self.covariance.len()));
        }
        Ok(Moments {
            mean: DVector::from_iterator(p, self.mean.into_iter().map(number)),
            covariance: matrix(&self.covariance, p, "covariance")?,
            cross_covariance: matrix(&self.cross_covariance, p, "cross_covariance")?,
        })
    }
}

fn matrix(rows: &[Vec<Option<f64>>], columns: usize, key: &str) -> Result<DMatrix<f64>, String> {
    match rows.iter().find(|row| row.len() != columns) {
        Some(row) => Err(format!("{key} has a row of {} numbers; give {columns}", row.len())),
        None => Ok(DMatrix::from_fn(rows.len(), columns, |i, j| number(rows[i][j]))),
    }
}

fn number(entry: Option<f64>) -> f64 {
    entry.unwrap_or(f64::NAN)
}

fn line(value: &impl Serialize, to: &mut dyn Write) -> io::Result<()> {
    serde_json::to_writer(&mut *to, value)?;
    writeln!(to)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::suite::Suite;
    use crate::survey::{SurveyPlan, SurveySettings, Unwatched, survey};

    fn text() -> (Baseline, String) {
        let suite = Suite::load("smoke", None).unwrap();
        let settings = SurveySettings { precision: Some(5e-2), ..Default::default() };
        let plan = SurveyPlan::new(&suite, &settings).unwrap();
        let mut found = Baseline::of(&survey(&suite, &plan, false, &Unwatched));
        found.time_ratios.insert("unscented".into(), 2.5);
        let mut bytes = Vec::new();
        found.write_to(&mut bytes).unwrap();
        (found, String::from_utf8(bytes).unwrap())
    }

    #[test]
    fn what_is_written_reads_back_to_the_bit_and_is_sorted() {
        let (found, text) = text();
        let again = Baseline::parse(&text).unwrap();
        for (name, case) in &found.cases {
            let kept = &again.cases[name];
            assert_eq!(kept.reference.moments, case.reference.moments, "{name}");
            for (label, answer) in &case.answers {
                match (answer, &kept.answers[label]) {
                    (
                        KeptAnswer::Given { moments, evaluations, trust, scores: Ok(scores) },
                        KeptAnswer::Given { moments: m, evaluations: e, trust: t, scores: Ok(s) },
                    ) => {
                        assert_eq!((moments, evaluations, trust), (m, e, t), "{name} {label}");
                        for (kind, score) in scores {
                            assert_eq!(score.value, s[kind].value);
                            let (error, kept) = (score.standard_error, s[kind].standard_error);
                            // Three digits: half a unit in the third of them.
                            assert!((error - kept).abs() <= 5e-3 * error, "{error} {kept}");
                        }
                    }
                    (answer, kept) => assert_eq!(answer, kept),
                }
            }
        }
        assert_eq!((again.made, again.time_ratios), (found.made, found.time_ratios));
        let names: Vec<_> = text.lines().skip(1).filter_map(|l| l.split("\"case\":\"").nth(1)).collect();
        let names: Vec<_> = names.iter().map(|l| l.split('"').next().unwrap()).collect();
        assert!(names.is_sorted());
    }

    #[test]
    fn what_is_wrong_is_said_with_its_line() {
        let (_, text) = text();
        let refusal = |edited: &str| Baseline::parse(edited).unwrap_err();
        assert_eq!(refusal(""), (1, "is empty; write a baseline with --accept".into()));
        assert!(refusal("{}").1.starts_with("is no baseline"));
        assert!(refusal(&text.replacen("\"baseline\":1", "\"baseline\":7", 1)).1.contains("format 7"));
        let lines: Vec<&str> = text.lines().collect();
        let cut = lines[..lines.len() - 20].join("\n");
        assert!(refusal(&cut).1.contains("it has been cut or edited"), "{:?}", refusal(&cut));
        let twice = [lines.as_slice(), &lines[lines.len() - 1..]].concat().join("\n");
        assert_eq!(refusal(&twice).0, lines.len() + 1);
        assert!(refusal(&twice).1.contains("stands twice"));
        let third = |edited: String| {
            let mut lines = lines.clone();
            lines[3] = &edited;
            refusal(&lines.join("\n"))
        };
        for (from, to, said) in [
            ("\"verdict\":\"", "\"verdict\":\"un", "has no meaning here; known: trusted, rejected, undecided"),
            ("\"moments\":", "\"momentum\":", "unknown key `momentum`; did you mean `moments`?"),
            ("\"mean\":[", "\"mean\":[1.0,", "covariance has"),
            ("{", "", "is not JSON"),
        ] {
            let (line, message) = third(lines[3].replacen(from, to, 1));
            assert!(line == 4 && message.contains(said), "{line}: {message}");
        }
    }
}
