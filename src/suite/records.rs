//! Files of case records: JSON Lines, one case a line, read line by line.

use std::collections::HashMap;
use std::io::{BufRead, BufReader, Read};
use std::path::Path;

use sha2::{Digest, Sha256};

use super::definition::hex;
use super::grid::MOST_CASES;
use super::{Case, SuiteError, source, unique};

/// The longest line, in bytes: 8 MiB.
const LONGEST_LINE: u64 = 8 << 20;

/// The cases of a file and the SHA-256 of its bytes.
#[derive(Debug)]
pub(super) struct Records {
    pub cases: Vec<Case>,
    pub hash: String,
}

/// The hash of the file that holds the records of these cases.
pub(super) fn hash_of(cases: &[Case]) -> String {
    let mut hash = Sha256::new();
    for case in cases {
        hash.update(format!("{}\n", case.to_json()));
    }
    hex(&hash.finalize())
}

/// Reads a file of case records.
pub(super) fn read(path: &Path) -> Result<Records, SuiteError> {
    let file = path.display().to_string();
    let mut reader = BufReader::new(source::open(path)?);
    let mut hash = Sha256::new();
    let mut names: HashMap<String, usize> = HashMap::new();
    let mut cases = Vec::new();
    let mut bytes = Vec::new();
    for number in 1.. {
        bytes.clear();
        let at_line = |message: String| SuiteError::at(number, "", message).in_file(&file);
        let mut line = reader.by_ref().take(LONGEST_LINE + 1);
        line.read_until(b'\n', &mut bytes).map_err(|e| source::cannot_read(path, &e))?;
        if bytes.is_empty() {
            break;
        }
        if bytes.len() as u64 > LONGEST_LINE {
            return Err(at_line(format!(
                "the line is longer than {} MiB, the most for a case",
                LONGEST_LINE >> 20
            )));
        }
        hash.update(&bytes);
        if bytes.trim_ascii().is_empty() {
            continue;
        }
        let case = record(&bytes).map_err(|(key, message)| SuiteError::at(number, key, message).in_file(&file))?;
        if let Some(first) = names.insert(case.id().into(), number) {
            let message = format!("the name \"{}\" stands on line {first} already; rename one", case.id());
            return Err(SuiteError::at(number, "case", message).in_file(&file));
        }
        if cases.len() as u64 == MOST_CASES {
            return Err(at_line(format!("more than {MOST_CASES} cases; split the file")));
        }
        cases.push(case);
    }
    if cases.is_empty() {
        let message =
            "holds no case; give one case record a line, as {\"case\":\"k-001\",\"sensor\":{..},\"prior\":{..}}";
        return Err(SuiteError::at(1, "", message).in_file(&file));
    }
    Ok(Records { cases, hash: hex(&hash.finalize()) })
}

fn record(bytes: &[u8]) -> Result<Case, (String, String)> {
    let value = unique::from_line(bytes)?;
    if !value.is_object() {
        return Err((
            String::new(),
            "is no case record; give an object {\"case\":..,\"sensor\":..,\"prior\":..}".into(),
        ));
    }
    Case::from_json(value).map_err(|e| (e.key, e.message))
}
