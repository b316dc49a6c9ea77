use std::collections::HashMap;
use std::sync::Arc;

use serde_json::Value;

use super::answers::{Flaw, Origin, Outside, Tally};
use super::checked::moments;
use super::lines::{LONGEST, Line};
use super::name::Name;
use crate::gaussian::Moments;
use crate::shard::Shard;
use crate::suite::Suite;
use crate::wording::{printable, proposal};

/// Notes of one kind that are kept; after them only their number is told.
const MOST_NOTES: usize = 20;

/// Answers on their way in, each laid to its case.
#[derive(Debug)]
pub(super) struct Collector<'a> {
    suite: &'a Suite,
    shard: Option<Shard>,
    places: HashMap<&'a str, usize>,
    given: Vec<Option<Given>>,
    answered: usize,
    elsewhere: u64,
    unknown: u64,
    unreadable: u64,
    strays: Vec<String>,
}

#[derive(Debug)]
struct Given {
    line: u64,
    answer: Result<Moments, String>,
}

/// A line as far as it could be read.
enum Record {
    Blank,
    /// Of a case, named.
    Of(String, Result<serde_json::Map<String, Value>, String>),
    /// Of whatever case.
    Stray(String),
}

impl<'a> Collector<'a> {
    /// For the cases of `suite`, or those of a part of it.
    pub fn new(suite: &'a Suite, shard: Option<Shard>) -> Self {
        let places = suite.cases.iter().enumerate().map(|(index, case)| (case.id(), index)).collect();
        let given = suite.cases.iter().map(|_| None).collect();
        Self {
            suite,
            shard,
            places,
            given,
            answered: 0,
            elsewhere: 0,
            unknown: 0,
            unreadable: 0,
            strays: Vec::new(),
        }
    }

    fn asks(&self, index: usize) -> bool {
        self.shard.is_none_or(|shard| shard.holds(index))
    }

    /// How many cases are asked.
    pub fn asked(&self) -> usize {
        let cases = self.suite.cases.len();
        self.shard.map_or(cases, |shard| shard.share(cases))
    }

    /// How many of them are answered, well or not.
    pub fn answered(&self) -> usize {
        self.answered
    }

    /// Lays a line to its case; whether that case had no answer before.
    pub fn take(&mut self, line: &Line) -> bool {
        let (case, record) = match read(line) {
            Record::Blank => return false,
            Record::Of(case, record) => (case, record),
            Record::Stray(why) => {
                self.unreadable += 1;
                self.stray(|_| format!("line {}: {why}", line.number));
                return false;
            }
        };
        let Some(&index) = self.places.get(case.as_str()) else {
            self.unknown += 1;
            self.stray(|suite| {
                let near = proposal(&case, suite.cases.iter().map(|c| c.id()));
                format!(
                    "line {}: there is no case `{case}` in suite `{}`; {near}it is not scored",
                    line.number, suite.name
                )
            });
            return false;
        };
        if !self.asks(index) {
            self.elsewhere += 1;
            return false;
        }
        let number = line.number;
        if let Some(given) = &mut self.given[index] {
            if given.line != 0 {
                let first = given.line;
                *given =
                    Given { line: 0, answer: Err(format!("given twice, on lines {first} and {number}; give one")) };
            }
            return false;
        }
        let answer = record
            .and_then(|record| moments(&self.suite.cases[index], &record))
            .map_err(|why| format!("line {number}: {why}"));
        self.given[index] = Some(Given { line: number, answer });
        self.answered += 1;
        true
    }

    fn stray(&mut self, note: impl FnOnce(&Suite) -> String) {
        if self.strays.len() < MOST_NOTES {
            self.strays.push(printable(&note(self.suite)));
        }
    }

    /// Everything that came, and what was to be said of it; `failure` is how the command failed that gave it.
    pub fn finish(self, name: Name, origin: Origin, failure: Option<String>) -> Outside {
        let mut tally = Tally {
            asked: self.asked(),
            elsewhere: self.elsewhere,
            unknown: self.unknown,
            unreadable: self.unreadable,
            ..Tally::default()
        };
        let why_missing: Option<Arc<str>> = failure.as_deref().map(Arc::from);
        let (mut unusable, mut missing) = (Vec::new(), Vec::new());
        let mut answers = Vec::with_capacity(self.given.len());
        let asked: Vec<bool> = (0..self.given.len()).map(|index| self.asks(index)).collect();
        for ((given, case), asked) in self.given.into_iter().zip(&self.suite.cases).zip(asked) {
            answers.push(asked.then(|| match given {
                Some(Given { answer: Ok(moments), .. }) => {
                    tally.usable += 1;
                    Ok(moments)
                }
                Some(Given { answer: Err(why), .. }) => {
                    tally.unusable += 1;
                    if unusable.len() < MOST_NOTES {
                        unusable.push(printable(&format!("case `{}`: {why}", case.id())));
                    }
                    Err(Flaw::Unusable(printable(&why)))
                }
                None => {
                    tally.missing += 1;
                    if missing.len() < MOST_NOTES {
                        missing.push(case.id());
                    }
                    Err(Flaw::Missing(why_missing.clone()))
                }
            }));
        }
        let more =
            |count: usize, what: &str| (count > MOST_NOTES).then(|| format!("{} more {what}", count - MOST_NOTES));
        let mut notes: Vec<String> = failure.iter().cloned().collect();
        notes.append(&mut unusable);
        notes.extend(more(tally.unusable, "answers cannot be used"));
        if let count @ 1.. = tally.missing {
            let and_more = if count > MOST_NOTES { ", .." } else { "" };
            notes.push(format!("no answer for {count} of {} cases: {}{and_more}", tally.asked, missing.join(", ")));
        }
        notes.extend(self.strays);
        notes.extend(more((tally.unknown + tally.unreadable) as usize, "lines belong to no case"));
        Outside { name, origin, answers: answers.into(), tally, failure, notes }
    }
}

fn read(line: &Line) -> Record {
    if line.bytes.trim_ascii().is_empty() {
        return Record::Blank;
    }
    let broken = |why: String| match case_name(&line.bytes) {
        Some(case) => Record::Of(case, Err(why)),
        None => Record::Stray(why),
    };
    if line.is_cut() {
        return broken(format!("is longer than {} MiB, the most for an answer", LONGEST >> 20));
    }
    match serde_json::from_slice(&line.bytes) {
        Ok(Value::Object(record)) => match record.get("case") {
            Some(Value::String(case)) => Record::Of(case.clone(), Ok(record)),
            Some(_) => Record::Stray("`case` is no text; give the name of a case".into()),
            None => Record::Stray("`case` is missing; an answer names its case".into()),
        },
        Ok(_) => Record::Stray(
            "is no moments record; give {\"case\":..,\"mean\":..,\"covariance\":..,\"cross_covariance\":..}".into(),
        ),
        Err(e) => {
            let (column, text) = (e.column(), e.to_string());
            let what = text.split(" at line ").next().unwrap_or(&text);
            broken(format!("is not JSON: {what} (column {column}); numbers are finite, one record is one line"))
        }
    }
}

/// The name of the case in a record that cannot be read whole: one that is cut short, or holds NaN as many libraries
/// write it.
fn case_name(bytes: &[u8]) -> Option<String> {
    const KEY: &[u8] = b"\"case\"";
    let at = bytes.windows(KEY.len()).position(|window| window == KEY)?;
    let value = bytes[at + KEY.len()..].trim_ascii_start().strip_prefix(b":")?;
    serde_json::Deserializer::from_slice(value).into_iter::<String>().next()?.ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_broken_record_still_names_its_case() {
        for (bytes, name) in [
            (&br#"{"case": "k-1", "mean": [NaN]}"#[..], Some("k-1")),
            (br#"{"mean":[1],"case" : "a \"b\"","cov"#, Some("a \"b\"")),
            (br#"{"case":"k-1"#, None),
            (br#"{"case":7,"mean":[inf]}"#, None),
            (b"case", None),
        ] {
            assert_eq!(case_name(bytes).as_deref(), name, "{}", String::from_utf8_lossy(bytes));
        }
    }
}
