//! `scores.csv`, read back.

use std::collections::HashMap;
use std::io::Read;

use csv::{Reader, StringRecord};

/// Why a table of scores cannot be read.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum ScoresError {
    /// It is no CSV, or cannot be read.
    #[error(transparent)]
    Csv(#[from] csv::Error),
    /// A column is not there.
    #[error("has no column `{0}`: it is not of this program, or of another version")]
    Column(String),
    /// A field is not what its column holds.
    #[error("line {line}: `{value}` cannot stand in column `{column}`")]
    Field {
        /// Its line, from 1.
        line: u64,
        /// The column.
        column: String,
        /// What stands there.
        value: String,
    },
}

/// A table of scores, one row a case and entrant, case by case.
#[derive(Debug)]
pub struct Scores<R> {
    reader: Reader<R>,
    columns: HashMap<String, usize>,
    headings: Vec<String>,
}

/// One row.
#[derive(Debug)]
pub struct ScoreRow<'a> {
    record: StringRecord,
    columns: &'a HashMap<String, usize>,
}

impl<R: Read> Scores<R> {
    /// The table that `from` holds.
    ///
    /// # Errors
    /// [`ScoresError`] if its heading cannot be read.
    pub fn new(from: R) -> Result<Self, ScoresError> {
        let mut reader = Reader::from_reader(from);
        let headings: Vec<String> = reader.headers()?.iter().map(String::from).collect();
        let columns = headings.iter().enumerate().map(|(i, heading)| (heading.clone(), i)).collect();
        Ok(Self { reader, columns, headings })
    }

    /// Its columns, in order.
    pub fn headings(&self) -> &[String] {
        &self.headings
    }

    /// The next row; `None` behind the last.
    ///
    /// # Errors
    /// [`ScoresError::Csv`].
    pub fn next_row(&mut self) -> Result<Option<ScoreRow<'_>>, ScoresError> {
        let mut record = StringRecord::new();
        let there = self.reader.read_record(&mut record)?;
        Ok(there.then_some(ScoreRow { record, columns: &self.columns }))
    }
}

impl ScoreRow<'_> {
    /// What stands in a column.
    ///
    /// # Errors
    /// [`ScoresError::Column`].
    pub fn text(&self, column: &str) -> Result<&str, ScoresError> {
        let place = self.columns.get(column).ok_or_else(|| ScoresError::Column(column.into()))?;
        Ok(self.record.get(*place).unwrap_or_default())
    }

    /// The number in a column; `None` where the field is empty.
    ///
    /// # Errors
    /// [`ScoresError`] if there is no such column, or no number in it.
    pub fn number(&self, column: &str) -> Result<Option<f64>, ScoresError> {
        let text = self.text(column)?;
        if text.is_empty() {
            return Ok(None);
        }
        text.parse().map(Some).map_err(|_| self.misplaced(column))
    }

    /// What to say of a field that is not what its column holds.
    pub(super) fn misplaced(&self, column: &str) -> ScoresError {
        ScoresError::Field {
            line: self.record.position().map_or(0, csv::Position::line),
            column: column.into(),
            value: self.text(column).unwrap_or_default().chars().take(60).collect(),
        }
    }
}
