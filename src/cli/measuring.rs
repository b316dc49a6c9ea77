//! What all commands that measure share: their options, and the way from plans to results folders.

use std::io::Write;
use std::path::PathBuf;

use anyhow::{Context, anyhow};
use clap::Args;
use gaussworthy::method::{MethodSpec, every_kind};
use gaussworthy::outside::Outside;
use gaussworthy::reference::{SamplerError, Store};
use gaussworthy::report::{CAUTION, ResultsFolder, printable, write_envelopes, write_summary};
use gaussworthy::suite::Suite;
use gaussworthy::survey::{Shard, SurveyError, SurveyPlan, SurveySettings, summarise, survey};

use super::Failure;
use super::progress::{Progress, heed_interrupts};
use super::stdout::Stdout;

/// How cases are sampled, and where what is found goes.
#[derive(Debug, Args)]
pub struct Sampling {
    /// Where results folders go
    #[arg(long, value_name = "DIR", default_value = "results")]
    pub out: PathBuf,
    /// Threads; all cores unless told. Results do not depend on it
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    threads: Option<u16>,
    /// Largest standardised standard error of every reference moment, such as 1e-3
    #[arg(long, value_name = "X")]
    precision: Option<f64>,
    /// Most samples a case may take
    #[arg(long, value_name = "N", value_parser = whole)]
    cap: Option<u64>,
    /// Methods, such as taylor-1,gauss-hermite:order=5, or every (see `catalogue methods`)
    #[arg(long, value_name = "M,...", value_delimiter = ',')]
    methods: Option<Vec<String>>,
    /// Where sampled references are kept and found again; `.references` in the --out folder unless told
    #[arg(long, value_name = "DIR")]
    store: Option<PathBuf>,
    /// Sample everything anew and write over what is stored
    #[arg(long)]
    fresh: bool,
    /// Leave the timing phase out
    #[arg(long)]
    pub no_timing: bool,
}

/// How suites are measured.
#[derive(Debug, Args)]
pub struct Measuring {
    #[command(flatten)]
    pub sampling: Sampling,
    /// Do part K of N of every suite's cases, to be joined by `merge`; parts are not timed
    #[arg(long, value_name = "K/N")]
    shard: Option<Shard>,
}

impl Sampling {
    /// What is asked for beyond what a suite says.
    pub fn settings(&self, seed: Option<u64>) -> Result<SurveySettings, Failure> {
        Ok(SurveySettings {
            seed,
            precision: self.precision,
            cap: self.cap,
            methods: self.methods.as_deref().map(methods).transpose()?,
            shard: None,
            store: None,
        })
    }

    /// The plan of every suite, or of a part of it.
    pub fn plans(
        &self,
        suites: Vec<Suite>,
        seed: Option<u64>,
        shard: Option<Shard>,
    ) -> Result<Vec<(Suite, SurveyPlan)>, Failure> {
        let settings = SurveySettings { shard, ..self.settings(seed)? };
        suites
            .into_iter()
            .map(|suite| {
                let plan = SurveyPlan::new(&suite, &settings)
                    .map_err(|e| Failure::Input(anyhow!("{}: {e}", self.blamed(&e, &suite))))?;
                Ok((suite, plan))
            })
            .collect()
    }

    /// Who said what cannot be meant: the option, where there is one, else the suite.
    fn blamed(&self, error: &SurveyError, suite: &Suite) -> String {
        match error {
            SurveyError::Precision(_) if self.precision.is_some() => "--precision".into(),
            SurveyError::Sampler(SamplerError::CapTooSmall { .. }) if self.cap.is_some() => "--cap".into(),
            SurveyError::MethodTwice(_) if self.methods.is_some() => "--methods".into(),
            _ => format!("suite `{}`", suite.name),
        }
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
}

impl Measuring {
    /// The plan of every suite.
    pub fn plans(&self, suites: Vec<Suite>, seed: Option<u64>) -> Result<Vec<(Suite, SurveyPlan)>, Failure> {
        self.sampling.plans(suites, seed, self.shard)
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
                let folder = ResultsFolder::open(&self.sampling.out, &suite.name)
                    .context("results folder")
                    .map_err(Failure::Input)?;
                Ok((suite, plan, folder))
            })
            .collect::<Result<Vec<_>, Failure>>()?;
        for (suite, _, folder) in &jobs {
            if folder.holds_another(suite) {
                // With standard error gone there is nobody left to tell.
                let _ = writeln!(
                    std::io::stderr(),
                    "{}: holds results of another suite of this name, or of this one before it was changed; they are replaced",
                    folder.path().display()
                );
            }
        }
        let store = self.sampling.store()?;
        self.sampling.make_ready()?;
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
            let result = survey(suite, plan, !self.sampling.no_timing, &progress);
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
    if labels == ["every"] {
        return Ok(every_kind());
    }
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
