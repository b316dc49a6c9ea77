//! A results folder, read back whole: every case, and how every entrant fared on it.

use std::fs::File;
use std::io::{BufRead, BufReader, Read};
use std::path::{Path, PathBuf};

use nalgebra::DVector;
use serde::Deserialize;
use serde_json::Value;
use sha2::{Digest, Sha256};

use super::scene::matrix;
use super::{MethodEnvelopes, Provenance, ScoreRow, Scores, ScoresError, Spread};
use crate::gaussian::Moments;
use crate::method::Evaluations;
use crate::score::{self, Estimate, Floor, Invalid, ScoreKind};
use crate::suite::Setting;
use crate::survey::{Indices, OpinionsOf, excess_over, regime_columns};
use crate::trust::{Judge, OPINIONS, RegimeIndex, Standing, Trust, Verdict};

/// The results of one suite.
#[derive(Debug, Clone)]
pub struct Study {
    /// Where they come from.
    pub provenance: Provenance,
    /// Who judged.
    pub judge: Judge,
    /// Every entrant, in the order of rows.
    pub labels: Vec<String>,
    /// Headings of what is swept or drawn, see [`Setting::heading`].
    pub headings: Vec<String>,
    /// Every case.
    pub cases: Vec<StudyCase>,
    /// Envelopes, if the suite asks for them.
    pub envelopes: Option<Vec<MethodEnvelopes>>,
}

/// One case.
#[derive(Debug, Clone)]
pub struct StudyCase {
    /// Its name.
    pub id: String,
    /// Its family.
    pub family: String,
    /// Its case record.
    pub record: Value,
    /// Its reference.
    pub reference: StudyReference,
    /// Floor in nats, where it is known.
    pub floor: Option<Estimate>,
    /// The floor against its limit.
    pub floor_standing: Standing,
    /// Where it lies.
    pub indices: Indices,
    /// What is swept or drawn, in the order of the headings; `None` where it is not of this family.
    pub settings: Vec<Option<f64>>,
    /// How everyone did.
    pub entries: Vec<StudyEntry>,
}

/// What is told of a reference.
#[derive(Debug, Clone, Deserialize)]
pub struct StudyReference {
    case: String,
    /// Samples.
    pub points: u64,
    /// How far it can be believed.
    pub soundness: String,
    mean: Vec<Option<f64>>,
    covariance: Vec<Vec<Option<f64>>>,
    cross_covariance: Vec<Vec<Option<f64>>>,
}

impl StudyReference {
    fn unread() -> Self {
        let (mean, covariance, cross_covariance) = Default::default();
        Self { case: String::new(), points: 0, soundness: String::new(), mean, covariance, cross_covariance }
    }

    /// Its moments, where all of them are finite.
    pub fn moments(&self) -> Option<Moments> {
        let moments = Moments {
            mean: DVector::from_iterator(self.mean.len(), self.mean.iter().map(|m| m.unwrap_or(f64::NAN))),
            covariance: matrix(&self.covariance),
            cross_covariance: matrix(&self.cross_covariance),
        };
        moments.is_finite().then_some(moments)
    }

    /// Whether a verdict can rest on it.
    pub fn bears_verdicts(&self) -> bool {
        matches!(self.soundness.as_str(), "sound" | "wide")
    }
}

/// How one entrant did on one case.
#[derive(Debug, Clone)]
pub struct StudyEntry {
    /// What was written.
    pub outcome: Outcome,
    /// The reason in one sentence.
    pub reason: String,
    /// The leading cause of a rejection; empty where there is none.
    pub cause: String,
    /// What it evaluated, where it was counted.
    pub evaluations: Option<Evaluations>,
    /// Its work, see [`Evaluations::work`].
    pub work: Option<u64>,
    /// Its scores.
    pub scores: score::Scores,
    /// What rests on its scores changes with the limits; what rests on the reference or on the answer itself does not.
    pub by_scores: bool,
    /// What richer rules say of it.
    pub opinions: OpinionsOf,
}

/// A verdict, or that a case was not served.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Outcome {
    /// It was judged.
    Judged(Trust),
    /// The method cannot serve the case.
    Skipped,
}

impl Outcome {
    /// Its name in files.
    pub fn name(self) -> &'static str {
        match self {
            Self::Judged(trust) => trust.name(),
            Self::Skipped => "skipped",
        }
    }

    /// Whether it is trusted.
    pub fn is_trusted(self) -> bool {
        self == Self::Judged(Trust::Trusted)
    }

    fn read(name: &str) -> Option<Self> {
        let judged = [Trust::Trusted, Trust::Rejected, Trust::Undecided].map(Self::Judged);
        judged.into_iter().chain([Self::Skipped]).find(|outcome| outcome.name() == name)
    }
}

impl StudyEntry {
    /// What `judge` says of it, and what decided; the finding is `None` where no score did.
    pub fn judged(&self, judge: &Judge) -> (Outcome, Option<Verdict>) {
        if !self.by_scores {
            return (self.outcome, None);
        }
        let verdict = judge.verdict(&Ok::<_, Invalid>(self.scores.clone()));
        (Outcome::Judged(verdict.trust), Some(verdict))
    }
}

/// Why a results folder cannot be read.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum StudyError {
    /// A file is not there, or cannot be read.
    #[error("{}: cannot be read; name a folder that a survey has written, such as results/harbour-radar", path.display())]
    Unreadable {
        /// The file.
        path: PathBuf,
        /// What the system says.
        source: std::io::Error,
    },
    /// A file is not what a survey writes.
    #[error("{}: {message}", path.display())]
    Content {
        /// The file.
        path: PathBuf,
        /// What is wrong.
        message: String,
    },
    /// The table of scores is not one.
    #[error("{}", path.display())]
    Scores {
        /// The file.
        path: PathBuf,
        /// What is wrong.
        source: ScoresError,
    },
}

impl Study {
    /// Reads the results folder of one suite.
    ///
    /// # Errors
    /// [`StudyError`] with the file at fault.
    pub fn read(folder: &Path) -> Result<Self, StudyError> {
        let path = folder.join("manifest.json");
        let provenance: Provenance = serde_json::from_reader(BufReader::new(open(&path)?))
            .map_err(|e| content(&path, format!("is no manifest of a survey: {e}")))?;
        if provenance.cases.finished < provenance.cases.asked {
            let message = format!(
                "{} of {} cases are finished; run the survey again to its end, it goes on where it stopped",
                provenance.cases.finished, provenance.cases.asked
            );
            return Err(content(&path, message));
        }
        let judge = provenance.judge();
        let records: Vec<Value> = lines(&folder.join("cases.jsonl"))?;
        let references: Vec<StudyReference> = lines(&folder.join("references.jsonl"))?;
        let path = folder.join("scores.csv");
        let table = |source| StudyError::Scores { path: path.clone(), source };
        let scores = Scores::new(BufReader::new(open(&path)?)).map_err(table)?;
        let (headings, labels, mut cases) = read_cases(scores, &judge).map_err(table)?;
        if records.len() != cases.len() || references.len() != cases.len() {
            let message = format!(
                "has {} cases, cases.jsonl {} and references.jsonl {}: they are not of one survey",
                cases.len(),
                records.len(),
                references.len()
            );
            return Err(content(&path, message));
        }
        for ((case, record), reference) in cases.iter_mut().zip(records).zip(references) {
            if record["case"] != case.id.as_str() || reference.case != case.id {
                return Err(content(&path, format!("case `{}` stands elsewhere in the files beside it", case.id)));
            }
            for entry in &mut case.entries {
                entry.by_scores &= reference.bears_verdicts();
            }
            (case.record, case.reference) = (record, reference);
        }
        let path = folder.join("envelopes.json");
        let envelopes = match provenance.settings.envelope {
            Some(_) => Some(
                serde_json::from_reader(BufReader::new(open(&path)?))
                    .map_err(|e| content(&path, format!("is no file of envelopes: {e}")))?,
            ),
            None => None,
        };
        Ok(Self { provenance, judge, labels, headings, cases, envelopes })
    }

    /// Headings of the sweeps of a family, with their columns.
    pub fn sweeps(&self, family: &str) -> Vec<usize> {
        let of_family: Vec<&StudyCase> = self.cases.iter().filter(|case| case.family == family).collect();
        let swept = |k: &usize| {
            !self.headings[*k].ends_with(Setting::DRAWN) && of_family.iter().any(|case| case.settings[*k].is_some())
        };
        (0..self.headings.len()).filter(swept).collect()
    }

    /// The families, in order.
    pub fn families(&self) -> Vec<&str> {
        let mut families: Vec<&str> = Vec::new();
        for case in &self.cases {
            if !families.contains(&case.family.as_str()) {
                families.push(&case.family);
            }
        }
        families
    }
}

fn content(path: &Path, message: String) -> StudyError {
    StudyError::Content { path: path.into(), message }
}

fn open(path: &Path) -> Result<File, StudyError> {
    File::open(path).map_err(|source| StudyError::Unreadable { path: path.into(), source })
}

fn lines<T: for<'de> Deserialize<'de>>(path: &Path) -> Result<Vec<T>, StudyError> {
    let mut found = Vec::new();
    for (k, line) in BufReader::new(open(path)?).lines().enumerate() {
        let line = line.map_err(|source| StudyError::Unreadable { path: path.into(), source })?;
        found.push(serde_json::from_str(&line).map_err(|e| content(path, format!("line {}: {e}", k + 1)))?);
    }
    Ok(found)
}

type Cases = (Vec<String>, Vec<String>, Vec<StudyCase>);

fn read_cases<R: Read>(mut scores: Scores<R>, judge: &Judge) -> Result<Cases, ScoresError> {
    let columns = regime_columns();
    // The columns of sweeps and draws are the last ones.
    let own = scores.headings().iter().skip_while(|heading| Some(*heading) != columns.last());
    let headings: Vec<String> = own.skip(1).cloned().collect();
    let (mut labels, mut cases): (Vec<String>, Vec<StudyCase>) = (Vec::new(), Vec::new());
    while let Some(row) = scores.next_row()? {
        let id = row.text("case")?;
        if cases.last().is_none_or(|case| case.id != id) {
            cases.push(begin(&row, &columns, &headings)?);
        }
        let label = row.text("method")?;
        if !labels.iter().any(|l| l == label) {
            labels.push(label.into());
        }
        if let Some(case) = cases.last_mut() {
            case.entries.push(entry(&row, &columns, judge)?);
        }
    }
    Ok((headings, labels, cases))
}

fn begin(row: &ScoreRow<'_>, columns: &[String], headings: &[String]) -> Result<StudyCase, ScoresError> {
    let mut indices = Indices::default();
    for (value, column) in indices.iter_mut().zip(columns) {
        *value = row.number(column)?;
    }
    let floor_standing = [Standing::Kept, Standing::Broken, Standing::Open];
    let written = row.text("floor_standing")?;
    let floor = match row.text("floor")?.parse() {
        Ok(value) => row.number("floor_standard_error")?.map(|standard_error| Estimate { value, standard_error }),
        Err(_) => None,
    };
    Ok(StudyCase {
        id: row.text("case")?.into(),
        family: row.text("family")?.into(),
        record: Value::Null,
        reference: StudyReference::unread(),
        floor,
        floor_standing: floor_standing.into_iter().find(|s| s.name() == written).unwrap_or(Standing::Open),
        indices,
        settings: headings.iter().map(|heading| row.number(heading)).collect::<Result<_, _>>()?,
        entries: Vec::new(),
    })
}

fn entry(row: &ScoreRow<'_>, columns: &[String], judge: &Judge) -> Result<StudyEntry, ScoresError> {
    let verdict = row.text("verdict")?;
    let outcome = Outcome::read(verdict).ok_or_else(|| row.misplaced("verdict"))?;
    let count = |column: &str| Ok::<_, ScoresError>(row.number(column)?.map(|n| n as u64));
    let counts = [count("values")?, count("jacobians")?, count("hessians")?, count("exact_moments")?];
    let evaluations = match counts {
        [Some(values), Some(jacobians), Some(hessians), Some(exact_moments)] => {
            Some(Evaluations { values, jacobians, hessians, exact_moments })
        }
        _ => None,
    };
    let inputs = row.number("inputs")?.map(|n| n as usize);
    let mut estimates = Vec::new();
    for kind in ScoreKind::ALL {
        let value = row.number(kind.id())?;
        let error = row.number(&format!("{}_standard_error", kind.id()))?;
        estimates.push(value.zip(error).map(|(value, standard_error)| Estimate { value, standard_error }));
    }
    let mut estimates = estimates.into_iter();
    let scores = score::Scores::given(|_| estimates.next().flatten());
    // A verdict that its scores do not give rests on something else: no Gaussian, a reference that cannot be believed.
    let by_scores = outcome == Outcome::Judged(judge.verdict(&Ok(scores.clone())).trust);
    let mut opinions = OpinionsOf::default();
    for (opinion, column) in opinions.iter_mut().zip(&columns[RegimeIndex::ALL.len()..]) {
        *opinion = row.number(column)?;
    }
    Ok(StudyEntry {
        outcome,
        reason: row.text("reason")?.into(),
        cause: row.text("cause")?.into(),
        evaluations,
        work: evaluations.zip(inputs).map(|(evaluations, inputs)| evaluations.work(inputs)),
        scores,
        by_scores,
        opinions,
    })
}

/// The floor of a case against the limits of `judge`.
pub(super) fn floor_of(case: &StudyCase, judge: &Judge) -> Standing {
    match case.floor {
        Some(estimate) if case.reference.bears_verdicts() => judge.floor(&Floor::Known(estimate)),
        _ => Standing::Open,
    }
}

impl Study {
    /// Median and quartiles of a score of one entrant over the cases whose reference bears verdicts; `None` where it has none.
    pub fn quartiles(&self, entrant: usize, kind: ScoreKind) -> Option<Spread> {
        let sound = self.cases.iter().filter(|case| case.reference.bears_verdicts());
        let mut values: Vec<f64> = sound
            .filter_map(|case| case.entries[entrant].scores.get(kind))
            .map(|estimate| estimate.value)
            .collect();
        values.sort_by(f64::total_cmp);
        let at = |share: f64| values.get((share * (values.len() - 1) as f64).round() as usize).copied();
        if values.is_empty() {
            return None;
        }
        Some(Spread { lower: at(0.25)?, median: at(0.5)?, upper: at(0.75)? })
    }

    /// The value of a regime index or second opinion, by its name in envelopes, of an entrant on a case.
    pub fn index(&self, case: usize, entrant: usize, name: &str) -> Option<f64> {
        let case = &self.cases[case];
        if let Some(k) = RegimeIndex::ALL.iter().position(|index| index.name() == name) {
            return case.indices[k];
        }
        let k = OPINIONS.iter().position(|rule| excess_over(rule) == name)?;
        case.entries[entrant].opinions[k]
    }

    /// SHA-256 of every verdict, case by case and entrant by entrant: another one where any of them is another.
    pub fn fingerprint(&self) -> String {
        let mut hash = Sha256::new();
        for case in &self.cases {
            for (label, entry) in self.labels.iter().zip(&case.entries) {
                hash.update(format!("{}\t{label}\t{}\n", case.id, entry.outcome.name()));
            }
        }
        hash.finalize().iter().map(|byte| format!("{byte:02x}")).collect()
    }
}
