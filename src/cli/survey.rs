use std::io::Write;

use anyhow::{Context, anyhow};
use clap::Args;
use gaussworthy::suite::Suite;
use gaussworthy::survey::{Shard, SurveyPlan, sample_share};

use super::Failure;
use super::measuring::Measuring;
use super::outside::{OutsideCommands, ask};
use super::progress::Progress;
use super::questions::Questions;
use super::stdout::Stdout;

#[derive(Debug, Args)]
#[command(after_help = "Without a suite, the three demonstration suites are measured.")]
pub struct Arguments {
    #[command(flatten)]
    questions: Questions,
    #[command(flatten)]
    measuring: Measuring,
    /// Only sample part K of N of the replicates of every case, up to the cap, into the store; when all parts are there,
    /// a survey with this store and cap takes them from it
    #[arg(long, value_name = "K/N", conflicts_with_all = ["shard", "outside"])]
    replicates: Option<Shard>,
    #[command(flatten)]
    outside: OutsideCommands,
}

pub fn run(arguments: &Arguments) -> Result<(), Failure> {
    let commands = arguments.outside.commands()?;
    let measuring = &arguments.measuring;
    let plans = measuring.plans(arguments.questions.suites()?, arguments.questions.seed)?;
    if let Some(share) = arguments.replicates {
        return replicates(measuring, &plans, share);
    }
    measuring.measure(plans, |suite, plan| ask(&commands, suite, plan))
}

/// Samples a part of the replicates into the store.
fn replicates(measuring: &Measuring, plans: &[(Suite, SurveyPlan)], share: Shard) -> Result<(), Failure> {
    for (_, plan) in plans {
        plan.sampler.check_share(share).context("--replicates").map_err(Failure::Input)?;
    }
    let store = measuring.sampling.store()?;
    measuring.sampling.make_ready()?;
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
