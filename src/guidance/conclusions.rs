use std::io::Read;

use super::{Choice, ChoiceMap, Entry, Evidence, GridCase, MethodEnvelopes, ScoreRow, Scores, ScoresError};
use crate::method::Evaluations;
use crate::suite::Setting;
use crate::survey::{Indices, OpinionsOf, regime_columns};
use crate::trust::{Claim, RegimeIndex};

/// Everything that follows from the scores of a finished survey.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Conclusions {
    /// One a method, if the suite asks for envelopes.
    pub envelopes: Option<Vec<MethodEnvelopes>>,
    /// The choice at every point of every family of two sweeps.
    pub choices: Vec<Choice>,
}

/// How one entrant did on one case, read from its row.
struct Fared {
    label: String,
    trusted: bool,
    work: Option<u64>,
    opinions: OpinionsOf,
}

impl Fared {
    fn read(row: &ScoreRow<'_>, columns: &[String]) -> Result<Self, ScoresError> {
        let count = |column: &str| Ok::<_, ScoresError>(row.number(column)?.map(|n| n as u64));
        let counts = [count("values")?, count("jacobians")?, count("hessians")?, count("exact_moments")?];
        let work = match (counts, count("inputs")?) {
            ([Some(values), Some(jacobians), Some(hessians), Some(exact_moments)], Some(inputs)) => {
                Some(Evaluations { values, jacobians, hessians, exact_moments }.work(inputs as usize))
            }
            _ => None,
        };
        let mut opinions = OpinionsOf::default();
        for (opinion, column) in opinions.iter_mut().zip(columns) {
            *opinion = row.number(column)?;
        }
        Ok(Self { label: row.text("method")?.into(), trusted: row.text("verdict")? == "trusted", work, opinions })
    }
}

/// The rows of one case.
struct Rows {
    case: String,
    family: String,
    indices: Indices,
    beyond_gaussian: bool,
    swept: Vec<(String, f64)>,
    entrants: Vec<Fared>,
}

impl Rows {
    fn begin(row: &ScoreRow<'_>, columns: &[String], sweeps: &[String]) -> Result<Self, ScoresError> {
        let mut indices = Indices::default();
        for (value, column) in indices.iter_mut().zip(columns) {
            *value = row.number(column)?;
        }
        let mut swept = Vec::new();
        for heading in sweeps {
            if let Some(value) = row.number(heading)? {
                swept.push((heading.clone(), value));
            }
        }
        Ok(Self {
            case: row.text("case")?.into(),
            family: row.text("family")?.into(),
            indices,
            beyond_gaussian: row.text("floor_standing")? == "broken",
            swept,
            entrants: Vec::new(),
        })
    }
}

impl Conclusions {
    /// Reads a table of scores to its end; `claim` is what envelopes are to promise, if any are asked for, and `seed` the
    /// survey's, which says what a case is used for.
    ///
    /// # Errors
    /// [`ScoresError`] if the table cannot be read.
    pub fn of<R: Read>(mut scores: Scores<R>, seed: u64, claim: Option<Claim>) -> Result<Self, ScoresError> {
        // The columns of sweeps and draws are the last ones.
        let columns = regime_columns();
        let (indices, opinions) = columns.split_at(RegimeIndex::ALL.len());
        let own = scores.headings().iter().skip_while(|heading| Some(*heading) != columns.last());
        let sweeps: Vec<String> = own.skip(1).filter(|h| !h.ends_with(Setting::DRAWN)).cloned().collect();
        let (mut evidence, mut map) = (None, ChoiceMap::default());
        let mut here: Option<Rows> = None;
        loop {
            let row = scores.next_row()?;
            let goes_on = match (&row, &here) {
                (Some(row), Some(rows)) => row.text("case")? == rows.case,
                _ => false,
            };
            if !goes_on && let Some(rows) = here.take() {
                take_up(rows, seed, &mut evidence, &mut map);
            }
            let Some(row) = row else { break };
            if here.is_none() {
                here = Some(Rows::begin(&row, indices, &sweeps)?);
            }
            if let Some(rows) = &mut here {
                rows.entrants.push(Fared::read(&row, opinions)?);
            }
        }
        let envelopes = claim.map(|claim| evidence.map_or_else(Vec::new, |e: Evidence| e.envelopes(claim)));
        Ok(Self { envelopes, choices: map.finish() })
    }
}

fn take_up(rows: Rows, seed: u64, evidence: &mut Option<Evidence>, map: &mut ChoiceMap) {
    let labels = || rows.entrants.iter().map(|fared| fared.label.as_str());
    let evidence = evidence.get_or_insert_with(|| Evidence::new(seed, labels()));
    evidence.add(&rows.indices, rows.entrants.iter().map(|fared| (fared.trusted, fared.opinions)));
    if let Ok(axes) = <[(String, f64); 2]>::try_from(rows.swept) {
        let entries = rows.entrants.into_iter();
        let entries = entries.map(|f| Entry { method: f.label, work: f.work, trusted: f.trusted }).collect();
        map.add(GridCase { family: rows.family, axes, beyond_gaussian: rows.beyond_gaussian, entries });
    }
}
