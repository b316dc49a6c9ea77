//! What all commands that measure share: their options, and the way from plans to results folders.

use std::io::Write;
use std::path::PathBuf;

use anyhow::{Context, anyhow};
use clap::Args;
use gaussworthy::method::MethodSpec;
use gaussworthy::outside::Outside;
use gaussworthy::reference::Store;
use gaussworthy::report::{CAUTION, ResultsFolder, printable, write_envelopes, write_summary};
use gaussworthy::suite::Suite;
use gaussworthy::survey::{Shard, SurveyPlan, SurveySettings, summarise, survey};

use super::Failure;
use super::progress::{Progress, heed_interrupts};
use super::stdout::Stdout;

/// How suites are measured and where results go.
#[derive(Debug, Args)]
pub struct Measuring {
    /// Where results folders go
    #[arg(long, value_name = "DIR", default_value = "results")]
    out: PathBuf,
    /// Threads; all cores unless told. Results do not depend on it
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    threads: Option<u16>,
    /// Largest standardised standard error of every reference moment, such as 1e-3
    #[arg(long, value_name = "X")]
    precision: Option<f64>,
    /// Most samples a case may take
    #[arg(long, value_name = "N", value_parser = whole)]
    cap: Option<u64>,
    /// Methods, such as taylor-1,gauss-hermite:order=5 (see `catalogue methods`)
    #[arg(long, value_name = "M,...", value_delimiter = ',')]
    methods: Option<Vec<String>>,
    /// Do part K of N of every suite's cases, to be joined by `merge`; parts are not timed
    #[arg(long, value_name = "K/N")]
    shard: Option<Shard>,
    /// Where sampled references are kept and found again; `.references` in the --out folder unless told
    #[arg(long, value_name = "DIR")]
    store: Option<PathBuf>,
    /// Sample everything anew and write over what is stored
    #[arg(long)]
    fresh: bool,
    /// Leave the timing phase out
    #[arg(long)]
    no_timing: bool,
}

impl Measuring {
    /// The plan of every suite.
    pub fn plans(&self, suites: Vec<Suite>, seed: Option<u64>) -> Result<Vec<(Suite, SurveyPlan)>, Failure> {
        let settings = SurveySettings {
            seed,
            precision: self.precision,
            cap: self.cap,
            methods: self.methods.as_deref().map(methods).transpose()?,
            shard: self.shard,
            store: None,
        };
        suites
            .into_iter()
            .map(|suite| {
                let plan = SurveyPlan::new(&suite, &settings)
                    .with_context(|| format!("suite `{}`", suite.name))
                    .map_err(Failure::Input)?;
                Ok((suite, plan))
            })
            .collect()
    }

    /// Sets the threads and heeds interrupts.
    pub fn make_ready(&self) -> Result<(), Failure> {
        if let Some(threads) = self.threads {
            rayon::ThreadPoolBuilder::new()
                .num_threads(threads.into())
                .build_global()
                .map_err(Failure::unfinished)?;
        }
        heed_interrupts().map_err(Failure::unfinished)
    }

    /// The store of references.
    pub fn store(&self) -> Result<Store, Failure> {
        let folder = self.store.clone().unwrap_or_else(|| self.out.join(".references"));
        let store = Store::open(&folder).context("store of references").map_err(Failure::Input)?;
        Ok(if self.fresh { store.fresh() } else { store })
    }

    /// Measures every suite and writes its results folder. `outside` gives the outside implementations that have answered
    /// a suite; all of them have before anything is sampled.
    pub fn measure(
        &self,
        plans: Vec<(Suite, SurveyPlan)>,
        mut outside: impl FnMut(&Suite, &SurveyPlan) -> Result<Vec<Outside>, Failure>,
    ) -> Result<(), Failure> {
        let mut jobs = plans
            .into_iter()
            .map(|(suite, plan)| {
                let folder = ResultsFolder::open(&self.out, &suite.name)
                    .context("results folder")
                    .map_err(Failure::Input)?;
                Ok((suite, plan, folder))
            })
            .collect::<Result<Vec<_>, Failure>>()?;
        let store = self.store()?;
        self.make_ready()?;
        for (suite, plan, _) in &mut jobs {
            plan.store = Some(store.clone());
            for answered in outside(suite, plan)? {
                admit(suite, plan, answered)?;
            }
        }

        let mut out = Stdout::new();
        for (suite, plan, folder) in &jobs {
            let asked = plan.shard.map_or(suite.cases.len(), |shard| shard.share(suite.cases.len()));
            let progress = Progress::new(&suite.name, asked);
            let result = survey(suite, plan, !self.no_timing, &progress);
            progress.finish();
            let conclusions = folder.write(&result).map_err(Failure::unfinished)?;
            write_summary(&result, &summarise(&result), &mut out)?;
            write_envelopes(&conclusions, &mut out)?;
            writeln!(out, "  Written to {}\n", folder.path().display())?;
            if Progress::interrupted() {
                return Err(Failure::Unfinished(anyhow!(
                    "interrupted in suite `{}`: {} of {} cases are finished and written",
                    suite.name,
                    result.cases.len(),
                    asked
                )));
            }
        }
        writeln!(out, "{CAUTION}")?;
        Ok(())
    }
}

/// Takes answers in, and says on standard error which of them cannot be used, and why.
pub fn admit(suite: &Suite, plan: &mut SurveyPlan, outside: Outside) -> Result<(), Failure> {
    for note in outside.notes() {
        let line = printable(&format!("{}: {}: {note}", suite.name, outside.name()));
        // With standard error gone, tables and files still say it.
        let _ = writeln!(std::io::stderr(), "{line}");
    }
    plan.admit(outside).map_err(Failure::input)
}

fn methods(labels: &[String]) -> Result<Vec<MethodSpec>, Failure> {
    labels
        .iter()
        .map(|label| MethodSpec::parse(label).with_context(|| format!("--methods {label}")).map_err(Failure::Input))
        .collect()
}

/// A whole number, also written as 1e6.
fn whole(text: &str) -> Result<u64, String> {
    // Beyond 2^53 a double does not count any more.
    const MOST: f64 = 9_007_199_254_740_992.0;
    match (text.parse::<u64>(), text.parse::<f64>()) {
        (Ok(number), _) => Ok(number),
        (_, Ok(number)) if number.fract() == 0.0 && (0.0..MOST).contains(&number) => Ok(number as u64),
        _ => Err("give a whole number, such as 1000000 or 1e6".into()),
    }
}
