use std::io::Write;
use std::path::PathBuf;

use anyhow::{Context, anyhow};
use clap::Args;
use gaussworthy::method::MethodSpec;
use gaussworthy::reference::{SamplerError, Store};
use gaussworthy::report::{CAUTION, ResultsFolder, write_summary};
use gaussworthy::suite::Suite;
use gaussworthy::survey::{Shard, SurveyError, SurveyPlan, SurveySettings, sample_share, summarise, survey};

use super::Failure;
use super::progress::{Progress, heed_interrupts};
use super::stdout::Stdout;

#[derive(Debug, Args)]
pub struct Arguments {
    /// Bundled suites by name, or suite files ending in .toml; the three demonstration suites unless told
    suites: Vec<String>,
    /// Case records (JSON Lines) in place of a suite
    #[arg(long, value_name = "FILE", conflicts_with = "suites")]
    cases: Option<PathBuf>,
    /// Where results folders go
    #[arg(long, value_name = "DIR", default_value = "results")]
    out: PathBuf,
    /// Seed of draws and samples; the suite's, or 1, unless told
    #[arg(long, value_name = "N")]
    seed: Option<u64>,
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
    /// Only sample part K of N of the replicates of every case, up to the cap, into the store; when all parts are there,
    /// a survey with this store and cap takes them from it
    #[arg(long, value_name = "K/N", conflicts_with = "shard")]
    replicates: Option<Shard>,
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

pub fn run(arguments: Arguments) -> Result<(), Failure> {
    let settings = SurveySettings {
        seed: arguments.seed,
        precision: arguments.precision,
        cap: arguments.cap,
        methods: arguments.methods.as_deref().map(methods).transpose()?,
        shard: arguments.shard,
        store: None,
    };
    let plans = suites(&arguments)?
        .into_iter()
        .map(|suite| {
            let plan = SurveyPlan::new(&suite, &settings)
                .map_err(|e| Failure::Input(anyhow!("{}: {e}", blamed(&e, &arguments, &suite))))?;
            Ok((suite, plan))
        })
        .collect::<Result<Vec<_>, Failure>>()?;
    if let Some(share) = arguments.replicates {
        return replicates(&arguments, &plans, share);
    }
    let mut jobs = plans
        .into_iter()
        .map(|(suite, plan)| {
            let folder = ResultsFolder::open(&arguments.out, &suite.name)
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
    let store = store(&arguments)?;
    for (_, plan, _) in &mut jobs {
        plan.store = Some(store.clone());
    }
    make_ready(&arguments)?;

    let mut out = Stdout::new();
    for (suite, plan, folder) in &jobs {
        let asked = plan.shard.map_or(suite.cases.len(), |shard| shard.share(suite.cases.len()));
        let progress = Progress::new(&suite.name, asked);
        let result = survey(suite, plan, !arguments.no_timing, &progress);
        progress.finish();
        folder.write(&result).map_err(Failure::unfinished)?;
        write_summary(&result, &summarise(&result), &mut out)?;
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

/// Who said what cannot be meant: the option, where there is one, else the suite.
fn blamed(error: &SurveyError, arguments: &Arguments, suite: &Suite) -> String {
    match error {
        SurveyError::Precision(_) if arguments.precision.is_some() => "--precision".into(),
        SurveyError::Sampler(SamplerError::CapTooSmall { .. }) if arguments.cap.is_some() => "--cap".into(),
        SurveyError::MethodTwice(_) if arguments.methods.is_some() => "--methods".into(),
        _ => format!("suite `{}`", suite.name),
    }
}

/// Sets the threads and heeds interrupts.
fn make_ready(arguments: &Arguments) -> Result<(), Failure> {
    if let Some(threads) = arguments.threads {
        rayon::ThreadPoolBuilder::new().num_threads(threads.into()).build_global().map_err(Failure::unfinished)?;
    }
    heed_interrupts().map_err(Failure::unfinished)
}

/// Samples a part of the replicates into the store.
fn replicates(arguments: &Arguments, plans: &[(Suite, SurveyPlan)], share: Shard) -> Result<(), Failure> {
    for (_, plan) in plans {
        plan.sampler.check_share(share).context("--replicates").map_err(Failure::Input)?;
    }
    let store = store(arguments)?;
    make_ready(arguments)?;
    let mut out = Stdout::new();
    for (suite, plan) in plans {
        let progress = Progress::new(&suite.name, suite.cases.len());
        let result = sample_share(suite, plan, share, &store, &progress);
        progress.finish();
        let (finished, asked) = (result.finished, result.asked);
        writeln!(out, "{}: part {share} of the replicates is sampled in {finished} of {asked} cases", suite.name)?;
        if finished < asked {
            return Err(Failure::Unfinished(anyhow!(
                "suite `{}`: {finished} of {asked} cases are finished; run again, it goes on where it stopped",
                suite.name
            )));
        }
    }
    Ok(())
}

fn store(arguments: &Arguments) -> Result<Store, Failure> {
    let folder = arguments.store.clone().unwrap_or_else(|| arguments.out.join(".references"));
    let store = Store::open(&folder).context("store of references").map_err(Failure::Input)?;
    Ok(if arguments.fresh { store.fresh() } else { store })
}

fn suites(arguments: &Arguments) -> Result<Vec<Suite>, Failure> {
    if let Some(path) = &arguments.cases {
        return Ok(vec![Suite::from_case_records(path).map_err(Failure::input)?]);
    }
    let names: Vec<String> = if arguments.suites.is_empty() {
        gaussworthy::suite::DEMONSTRATION.iter().map(ToString::to_string).collect()
    } else {
        arguments.suites.clone()
    };
    let suites = names
        .iter()
        .map(|name| Suite::load(name, arguments.seed).map_err(Failure::input))
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
