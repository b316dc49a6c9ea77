use std::path::PathBuf;

use anyhow::anyhow;
use clap::Args;
use gaussworthy::suite::{DEMONSTRATION, Suite};

use super::Failure;

/// What is asked: suites or case records.
#[derive(Debug, Args)]
pub struct Questions {
    /// Bundled suites by name, or suite files ending in .toml
    suites: Vec<String>,
    /// Case records (JSON Lines) in place of a suite
    #[arg(long, value_name = "FILE", conflicts_with = "suites")]
    cases: Option<PathBuf>,
    /// Seed of draws and samples; the suite's, or 1, unless told
    #[arg(long, value_name = "N")]
    pub seed: Option<u64>,
}

impl Questions {
    /// The suites; the demonstration suites where none is named.
    pub fn suites(&self) -> Result<Vec<Suite>, Failure> {
        if let Some(path) = &self.cases {
            return Ok(vec![Suite::from_case_records(path).map_err(Failure::input)?]);
        }
        let names: Vec<String> = if self.suites.is_empty() {
            DEMONSTRATION.iter().map(ToString::to_string).collect()
        } else {
            self.suites.clone()
        };
        let suites = names
            .iter()
            .map(|name| Suite::load(name, self.seed).map_err(Failure::input))
            .collect::<Result<Vec<_>, _>>()?;
        for (i, suite) in suites.iter().enumerate() {
            if suites[..i].iter().any(|s| s.name == suite.name) {
                return Err(Failure::Input(anyhow!(
                    "two suites are called `{}`: their results would share a folder",
                    suite.name
                )));
            }
        }
        Ok(suites)
    }

    /// The one suite that is named, where cases of several could not be told apart.
    pub fn suite(&self) -> Result<Suite, Failure> {
        if self.cases.is_none() && self.suites.len() != 1 {
            let count = self.suites.len();
            return Err(Failure::Input(anyhow!("{count} suites are named; name one, or give --cases FILE")));
        }
        let mut suites = self.suites()?;
        suites.pop().ok_or_else(|| Failure::Input(anyhow!("name a suite")))
    }
}
