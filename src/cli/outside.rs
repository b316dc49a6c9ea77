//! Implementations outside of this program, as commands that answer.

use std::time::Duration;

use anyhow::{Context, anyhow};
use clap::Args;
use gaussworthy::outside::{AskError, Outside, OutsideCommand};
use gaussworthy::suite::Suite;
use gaussworthy::survey::SurveyPlan;

use super::Failure;
use super::progress::Progress;

/// Which commands are asked, and how long they are waited for.
#[derive(Debug, Args)]
pub struct OutsideCommands {
    /// Score an implementation outside of this program too: a command that reads case records on standard input and
    /// writes moments records on standard output, in any order. Split into words as a shell does; no shell is run
    #[arg(long, value_name = "NAME=COMMAND ARG..")]
    outside: Vec<String>,
    /// Longest time without a new answer from such a command; then it is stopped and counts with the answers it gave
    #[arg(long, value_name = "SECONDS", default_value = "60", value_parser = seconds)]
    outside_timeout: Duration,
}

impl OutsideCommands {
    /// The commands, each under a name of its own.
    pub fn commands(&self) -> Result<Vec<OutsideCommand>, Failure> {
        let mut commands: Vec<OutsideCommand> = Vec::new();
        for text in &self.outside {
            let command = OutsideCommand::parse(text, self.outside_timeout)
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
}

/// Asks every command for its answers to a suite.
pub fn ask(commands: &[OutsideCommand], suite: &Suite, plan: &SurveyPlan) -> Result<Vec<Outside>, Failure> {
    let progress = Progress::new(&suite.name, 0);
    let answers = commands.iter().map(|command| {
        command.ask(suite, plan.shard, &progress).map_err(|e| match e {
            AskError::Interrupted => Failure::Unfinished(anyhow!("{}: {e}; nothing was measured", command.name())),
            _ => Failure::Input(anyhow::Error::new(e).context(format!("--outside {}", command.name()))),
        })
    });
    let answers = answers.collect();
    progress.finish();
    answers
}

fn seconds(text: &str) -> Result<Duration, String> {
    let seconds = text.parse().ok().filter(|seconds: &f64| *seconds > 0.0);
    // A year: no one waits longer, and the clock can still count it.
    const MOST: f64 = 3.2e7;
    let seconds = seconds.filter(|seconds| *seconds <= MOST);
    seconds.map(Duration::from_secs_f64).ok_or_else(|| "give a number of seconds above 0, such as 60 or 0.5".into())
}
