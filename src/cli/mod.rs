//! The commands, one file each. Exit codes are decided here and nowhere else.

mod advise;
mod catalogue;
mod gate;
mod hand_out;
mod mark;
mod measuring;
mod merge;
mod outside;
mod progress;
mod publish;
mod questions;
mod stdout;
mod survey;

use std::process::ExitCode;

use clap::{Parser, Subcommand};

/// Which Gaussian approximation of a nonlinear measurement can be trusted, measured.
#[derive(Debug, Parser)]
#[command(name = "gaussworthy", version, arg_required_else_help = true)]
struct Arguments {
    #[command(subcommand)]
    command: Command,
}

#[derive(Debug, Subcommand)]
enum Command {
    /// Measure suites: sample references, score and judge methods, write the results folder
    Survey(survey::Arguments),
    /// Say which method to take for a case, at what price, and what to do where none can be trusted
    Advise(advise::Arguments),
    /// Write the cases of a suite as case records, for an outside implementation to answer
    HandOut(hand_out::Arguments),
    /// Score the answers of an outside implementation beside the methods, as a survey does
    Mark(mark::Arguments),
    /// Hold what suites measure today against an accepted baseline, as a check in CI
    Gate(gate::Arguments),
    /// Join the parts of a survey that were made with --shard
    Merge(merge::Arguments),
    /// Turn results folders into guidance for people who did not run them: a page, Markdown, pictures
    Publish(publish::Arguments),
    /// List sensors, methods and scores with formulas and sources
    Catalogue(catalogue::Arguments),
}

/// How a command failed.
#[derive(Debug)]
enum Failure {
    /// Bad input or use: nothing was done.
    Input(anyhow::Error),
    /// The gate found a regression.
    Regression(anyhow::Error),
    /// Could not finish: what was done is kept.
    Unfinished(anyhow::Error),
}

impl Failure {
    fn input(error: impl Into<anyhow::Error>) -> Self {
        Self::Input(error.into())
    }

    fn unfinished(error: impl Into<anyhow::Error>) -> Self {
        Self::Unfinished(error.into())
    }
}

/// Writing to standard output; a reader that leaves early is no error, see [`stdout::Stdout`].
impl From<std::io::Error> for Failure {
    fn from(error: std::io::Error) -> Self {
        Self::Unfinished(anyhow::Error::new(error).context("standard output"))
    }
}

/// Runs the command and turns its end into an exit code: 0 done, 1 the gate found a regression, 2 bad input or use, 3 could not finish.
pub fn main() -> ExitCode {
    let done = match Arguments::parse().command {
        Command::Survey(arguments) => survey::run(&arguments),
        Command::Advise(arguments) => advise::run(&arguments),
        Command::HandOut(arguments) => hand_out::run(&arguments),
        Command::Mark(arguments) => mark::run(&arguments),
        Command::Gate(arguments) => gate::run(&arguments),
        Command::Merge(arguments) => merge::run(&arguments),
        Command::Publish(arguments) => publish::run(&arguments),
        Command::Catalogue(arguments) => catalogue::run(&arguments),
    };
    match done {
        Ok(()) => ExitCode::SUCCESS,
        Err(Failure::Regression(error)) => complain(&error, 1),
        Err(Failure::Input(error)) => complain(&error, 2),
        Err(Failure::Unfinished(error)) => complain(&error, 3),
    }
}

fn complain(error: &anyhow::Error, code: u8) -> ExitCode {
    use std::io::Write;
    // What was typed may hold anything.
    let line = gaussworthy::report::printable(&format!("gaussworthy: {error:#}"));
    // With standard error gone there is nobody left to tell.
    let _ = writeln!(std::io::stderr(), "{line}");
    ExitCode::from(code)
}
