use std::collections::HashSet;
use std::fmt::Write as _;
use std::path::Path;

use sha2::{Digest, Sha256};

use super::family::{Family, SECTIONS};
use super::grid::MOST_CASES;
use super::node::{Item, Node};
use super::{Bundled, Case, SuiteError, bundled, name, records, settings, source};
use crate::method::MethodSpec;
use crate::trust::{Claim, Limits};
use crate::wording::{flaw, proposal};

/// Everything at the top of a suite.
const KEYS: [&str; 13] = [
    "title",
    "note",
    "seed",
    "precision",
    "cap",
    "draws",
    "limits",
    "envelope",
    "method",
    "family",
    "sensor",
    "prior",
    "noise",
];

/// A family of questions and how to answer them.
#[derive(Debug, Clone)]
pub struct Suite {
    /// Its name: that of a bundled suite, or of the file without its ending.
    pub name: String,
    /// One line for a heading; the name where the file gives none.
    pub title: String,
    /// What a reader should know, perhaps several lines; may be empty.
    pub note: String,
    /// SHA-256 of the source text, in lower-case hexadecimals.
    pub hash: String,
    /// The seed of its draws: the caller's, else the file's; `None` if neither gives one (1 is taken then).
    pub seed: Option<u64>,
    /// The standardised standard error asked of every moment, above 0.
    pub precision: Option<f64>,
    /// The most samples that a case may take.
    pub cap: Option<u64>,
    /// What a method must keep to be trusted.
    pub limits: Limits,
    /// What envelopes are asked to promise, if it asks for any.
    pub envelope: Option<Claim>,
    /// The methods to measure, if it names any.
    pub methods: Option<Vec<MethodSpec>>,
    /// Its cases, at least one, with different names.
    pub cases: Vec<Case>,
}

impl Suite {
    /// The suites that come with the program.
    pub fn bundled() -> &'static [Bundled] {
        bundled::ALL
    }

    /// The suites of regimes that come with the program: one sensor each, thousands of drawn cases, for envelopes.
    pub fn regimes() -> &'static [Bundled] {
        bundled::REGIMES
    }

    /// Reads a bundled suite by its name, or a file by its path, which ends in `.toml`.
    ///
    /// `seed_override` takes the place of the suite's own seed, which drives its draws.
    ///
    /// # Errors
    /// [`SuiteError`] if there is no such suite or file, the file has more than 8 MiB, or something in it
    /// cannot be meant.
    pub fn load(name_or_path: &str, seed_override: Option<u64>) -> Result<Self, SuiteError> {
        let path = Path::new(name_or_path);
        if path.extension().is_some_and(|ending| ending.eq_ignore_ascii_case("toml")) {
            let text = source::read_text(path)?;
            return Self::from_text(&source::stem(path)?, name_or_path, &text, seed_override);
        }
        let all = || bundled::ALL.iter().chain(bundled::REGIMES);
        if let Some(suite) = all().find(|suite| suite.name == name_or_path) {
            return Self::from_text(suite.name, &format!("{}.toml", suite.name), suite.text, seed_override);
        }
        let names: Vec<_> = bundled::ALL.iter().map(|suite| suite.name).collect();
        let sensors: Vec<_> =
            bundled::REGIMES.iter().filter_map(|suite| suite.name.strip_prefix("regimes-")).collect();
        let near = proposal(name_or_path, all().map(|suite| suite.name));
        let message = format!(
            "there is no bundled suite of this name; {near}give one of {}, a suite of regimes, regimes- and one of {}, or the \
             path of a file that ends in .toml (case records go to --cases)",
            names.join(", "),
            sensors.join(", ")
        );
        Err(SuiteError::of_file(name_or_path, message))
    }

    /// Reads a suite called `name` from TOML; `file` is what messages call it.
    ///
    /// # Errors
    /// [`SuiteError`] with the line and the key at fault.
    pub fn from_text(name: &str, file: &str, text: &str, seed_override: Option<u64>) -> Result<Self, SuiteError> {
        if let Some(flaw) = name::suite_flaw(name) {
            return Err(SuiteError::of_file(file, format!("{flaw}; rename the file")));
        }
        Self::parse(name, text, seed_override).map_err(|e| e.in_file(file))
    }

    fn parse(name: &str, text: &str, seed_override: Option<u64>) -> Result<Self, SuiteError> {
        let root = Node::parse(text)?;
        if root.table(&KEYS)?.is_empty() {
            let message = "is empty; a suite needs [sensor] and [prior], and perhaps [noise] and [[family]]";
            return Err(root.error(message));
        }
        let text_of = |key| root.get(key).map(|node| node.text().map(String::from)).transpose();
        let title = match text_of("title")? {
            Some(title) if title.contains('\n') => {
                return Err(root.at("title").error("has several lines; give one"));
            }
            Some(title) => title,
            None => name.into(),
        };
        let note = text_of("note")?.unwrap_or_default();
        let seed = seed_override.or(settings::whole(&root, "seed", 0)?);
        Ok(Self {
            name: name.into(),
            title,
            note,
            hash: hex(&Sha256::digest(text)),
            seed,
            precision: settings::precision(&root)?,
            cap: settings::whole(&root, "cap", 1)?,
            limits: settings::limits(&root)?,
            envelope: settings::envelope(&root)?,
            methods: settings::methods(&root)?,
            cases: cases(&root, name, seed.unwrap_or(1))?,
        })
    }

    /// The case of this name.
    ///
    /// # Errors
    /// [`SuiteError`] if there is none, with a name that is near.
    pub fn case(&self, id: &str) -> Result<&Case, SuiteError> {
        self.cases.iter().find(|case| case.id() == id).ok_or_else(|| {
            let near = proposal(id, self.cases.iter().map(Case::id));
            SuiteError::of_file(&self.name, format!("has no case `{id}`; {near}`hand-out` lists all"))
        })
    }

    /// A suite of cases that a program has made.
    ///
    /// # Errors
    /// [`SuiteError`] if the name cannot be that of a folder, there is no case, or two have one name.
    pub fn of_cases(name: &str, cases: Vec<Case>) -> Result<Self, SuiteError> {
        let error = |message: String| Err(SuiteError::of_file(name, message));
        if let Some(flaw) = name::suite_flaw(name) {
            return error(flaw);
        }
        if cases.is_empty() {
            return error("has no case".into());
        }
        let mut ids = HashSet::new();
        if let Some(twice) = cases.iter().find(|case| !ids.insert(case.id())) {
            return error(format!("two cases are called `{}`; rename one", twice.id()));
        }
        Ok(Self {
            name: name.into(),
            title: name.into(),
            note: String::new(),
            hash: records::hash_of(&cases),
            seed: None,
            precision: None,
            cap: None,
            limits: Limits::default(),
            envelope: None,
            methods: None,
            cases,
        })
    }

    /// Reads a file of case records (JSON Lines), in place of a suite; it is called as the file is, without
    /// the ending.
    ///
    /// # Errors
    /// [`SuiteError`] with the line and the key at fault: what is no case record, a case name used twice, no
    /// case at all, a line over 8 MiB, more than 1,000,000 cases.
    pub fn from_case_records(path: &Path) -> Result<Self, SuiteError> {
        let name = source::stem(path)?;
        let records = records::read(path)?;
        Ok(Self {
            title: name.clone(),
            name,
            note: String::new(),
            hash: records.hash,
            seed: None,
            precision: None,
            cap: None,
            limits: Limits::default(),
            envelope: None,
            methods: None,
            cases: records.cases,
        })
    }
}

/// The cases of every family; without a family the top level is the single one, called as the suite is.
fn cases(root: &Node, name: &str, seed: u64) -> Result<Vec<Case>, SuiteError> {
    let families = families(root, name)?;
    let mut total = 0;
    for family in &families {
        total += family.size();
        if total > MOST_CASES {
            let message = format!("up to this family there are {total} cases; at most {MOST_CASES} are allowed");
            return Err(family.place().error(message));
        }
    }
    if let Some(draws) = root.get("draws").filter(|_| !families.iter().any(Family::draws)) {
        draws.whole(1)?;
        return Err(draws.error("nothing is drawn in this suite; leave it out, or draw a value"));
    }
    let mut cases = Vec::with_capacity(total as usize);
    for family in families {
        cases.extend(family.cases(seed)?);
    }
    Ok(cases)
}

fn families(root: &Node, name: &str) -> Result<Vec<Family>, SuiteError> {
    let shared = SECTIONS.map(|section| root.get(section));
    let Some(list) = root.get("family") else {
        let family = Family::new(name.into(), root.place.clone(), shared, None, root.get("draws"))?;
        return Ok(vec![family]);
    };
    let Item::List(tables) = &list.item else {
        return Err(list.error("is no list of tables; write [[family]]"));
    };
    if tables.is_empty() {
        return Err(list.error("has no family; write [[family]], or leave it out"));
    }
    let mut names: Vec<(&str, usize)> = Vec::new();
    let mut families = Vec::new();
    for table in tables {
        table.table(&["name", "draws", "sensor", "prior", "noise"])?;
        let name_node = table.need("name", "give each family a name of its own")?;
        let name = name_node.text()?;
        // Room for a dash and the number of a case.
        if let Some(flaw) = flaw(&format!("{name}-000000")) {
            return Err(name_node.error(flaw));
        }
        if let Some((_, line)) = names.iter().find(|(other, _)| *other == name) {
            return Err(name_node.error(format!("the family \"{name}\" stands on line {line} already; rename one")));
        }
        names.push((name, name_node.place.line));
        let own = SECTIONS.map(|section| table.get(section));
        let sections = [0, 1, 2].map(|i| own[i].or(shared[i]));
        families.push(Family::new(
            name.into(),
            table.place.clone(),
            sections,
            table.get("draws"),
            root.get("draws"),
        )?);
    }
    for (section, name) in shared.iter().zip(SECTIONS) {
        if let Some(section) = section.filter(|_| tables.iter().all(|table| table.get(name).is_some())) {
            return Err(section.error("no family uses it, for each has its own; delete it"));
        }
    }
    Ok(families)
}

/// Lower-case hexadecimals.
pub(crate) fn hex(bytes: &[u8]) -> String {
    bytes.iter().fold(String::with_capacity(2 * bytes.len()), |mut text, byte| {
        // Writing to a string cannot fail.
        let _ = write!(text, "{byte:02x}");
        text
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn hashes_are_sha_256_in_lower_case() {
        // The one-block example "abc" of FIPS 180-4 (digest from memory; NIST's example file SHA256.pdf).
        let abc = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
        assert_eq!(hex(&Sha256::digest("abc")), abc);
    }

    #[test]
    fn every_byte_of_the_text_counts() {
        let text = "[sensor]\nkind = \"linear\"\nH = [[1]]\n[prior]\nmean = [0]\nsd = [1]\n";
        let hash = |text: &str| Suite::from_text("x", "x.toml", text, None).unwrap().hash;
        assert_eq!(hash(text), hex(&Sha256::digest(text)));
        assert_ne!(hash(text), hash(&format!("{text}\n")));
    }
}
