use std::io::Write;
use std::time::Duration;

use anyhow::{Context, anyhow};
use clap::Args;
use gaussworthy::outside::{AskError, OutsideCommand};
use gaussworthy::suite::Suite;
use gaussworthy::survey::{Shard, SurveyPlan, sample_share};

use super::Failure;
use super::measuring::Measuring;
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
    #[arg(long, value_name = "K/N", conflicts_with = "shard")]
    replicates: Option<Shard>,
    /// Score an implementation outside of this program too: a command that reads case records on standard input and
    /// writes moments records on standard output, in any order. Split into words as a shell does; no shell is run
    #[arg(long, value_name = "NAME=COMMAND ARG..", conflicts_with = "replicates")]
    outside: Vec<String>,
    /// Longest time without a new answer from such a command; then it is stopped and counts with the answers it gave
    #[arg(long, value_name = "SECONDS", default_value = "60", value_parser = seconds)]
    outside_timeout: Duration,
}

pub fn run(arguments: &Arguments) -> Result<(), Failure> {
    let commands = commands(arguments)?;
    let measuring = &arguments.measuring;
    let plans = measuring.plans(arguments.questions.suites()?, arguments.questions.seed)?;
    if let Some(share) = arguments.replicates {
        return replicates(measuring, &plans, share);
    }
    measuring.measure(plans, |suite, plan| {
        let progress = Progress::new(&suite.name, 0);
        let answers = commands.iter().map(|command| {
            command.ask(suite, plan.shard, &progress).map_err(|e| match e {
                AskError::Interrupted => {
                    Failure::Unfinished(anyhow!("{}: {e}; nothing was measured", command.name()))
                }
                _ => Failure::Input(anyhow::Error::new(e).context(format!("--outside {}", command.name()))),
            })
        });
        let answers = answers.collect();
        progress.finish();
        answers
    })
}

/// The outside commands, each under a name of its own.
fn commands(arguments: &Arguments) -> Result<Vec<OutsideCommand>, Failure> {
    let mut commands: Vec<OutsideCommand> = Vec::new();
    for text in &arguments.outside {
        let command = OutsideCommand::parse(text, arguments.outside_timeout)
            .with_context(|| format!("--outside {text}"))
            .map_err(Failure::Input)?;
        if commands.iter().any(|other| other.name() == command.name()) {
            return Err(Failure::Input(anyhow!(
                "--outside {text}: the name `{}` is taken; give another",
                command.name()
            )));
        }
        commands.push(command);
    }
    Ok(commands)
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

fn seconds(text: &str) -> Result<Duration, String> {
    let seconds = text.parse().ok().filter(|seconds: &f64| *seconds > 0.0);
    // A year: no one waits longer, and the clock can still count it.
    const MOST: f64 = 3.2e7;
    let seconds = seconds.filter(|seconds| *seconds <= MOST);
    seconds.map(Duration::from_secs_f64).ok_or_else(|| "give a number of seconds above 0, such as 60 or 0.5".into())
}
