use serde::Deserialize;

use crate::reference::SamplerSettings;
use crate::trust::{Claim, Judge, Limits};

/// What `manifest.json` says of where results come from.
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct Provenance {
    /// Version of the program.
    pub version: String,
    /// How it was built.
    pub build: Build,
    /// The suite.
    pub suite: SuiteEntry,
    /// Seed of draws and samples.
    pub seed: u64,
    /// What was asked for.
    pub settings: Settings,
    /// How many cases were asked and finished.
    pub cases: Finished,
    /// Samples of all references together.
    pub samples: u64,
    /// Time ratios of methods, where they were timed.
    #[serde(default)]
    pub cost: Vec<MethodCost>,
    /// When.
    pub times: Times,
}

/// How the program was built.
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct Build {
    /// Debug or release.
    pub profile: String,
    /// Architecture and system.
    pub target: String,
}

/// The suite that was measured.
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct SuiteEntry {
    /// Its name.
    pub name: String,
    /// Its title.
    pub title: String,
    /// Its note.
    pub note: String,
    /// SHA-256 of its text.
    pub hash: String,
}

/// What was asked of the survey.
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct Settings {
    /// Standardised standard error asked.
    pub precision: f64,
    /// Most samples a case may take.
    pub cap: u64,
    /// Independent replicates of a reference.
    pub replicates: usize,
    /// Labels of the methods, in the order of rows.
    pub methods: Vec<String>,
    /// Implementations outside of the program.
    #[serde(default)]
    pub outside: Vec<OutsideEntry>,
    /// Limits of trust.
    pub limits: Limits,
    /// What envelopes are asked to promise.
    #[serde(default)]
    pub envelope: Option<Claim>,
}

/// An implementation outside of the program.
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct OutsideEntry {
    /// What it is called.
    pub name: String,
}

/// Cases asked and finished.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
pub struct Finished {
    /// Cases asked.
    pub asked: usize,
    /// Cases finished.
    pub finished: usize,
}

/// The cost of one method.
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct MethodCost {
    /// Its label.
    pub method: String,
    /// Quartiles over the timed cases of the ratio to first-order Taylor.
    pub time_ratio: Option<Spread>,
}

/// Median and quartiles.
#[derive(Debug, Clone, Copy, PartialEq, Deserialize)]
pub struct Spread {
    /// First quartile.
    pub lower: f64,
    /// Median.
    pub median: f64,
    /// Third quartile.
    pub upper: f64,
}

/// When it was measured.
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct Times {
    /// RFC 3339, UTC.
    pub started: String,
}

impl Provenance {
    /// The judge that gave the verdicts: the same limits, replicates and looks.
    pub fn judge(&self) -> Judge {
        let Settings { cap, replicates, precision, .. } = self.settings;
        let sampler = SamplerSettings { cap, replicates, precision, ..SamplerSettings::default() };
        // Looks of what cannot be sampled are none.
        let looks = sampler.check().map_or(1, |()| sampler.looks());
        Judge::new(self.settings.limits, replicates, looks)
    }

    /// Median time of a method as a ratio to first-order Taylor.
    pub fn time_ratio(&self, label: &str) -> Option<f64> {
        self.cost.iter().find(|cost| cost.method == label)?.time_ratio.map(|ratio| ratio.median)
    }
}
