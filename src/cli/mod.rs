//! The commands, one file each. Exit codes are decided here and nowhere else.

mod catalogue;
mod progress;
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
    /// List sensors, methods and scores with formulas and sources
    Catalogue(catalogue::Arguments),
}

/// How a command failed.
#[derive(Debug)]
enum Failure {
    /// Bad input or use: nothing was done.
    Input(anyhow::Error),
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

/// Writing to the terminal or a pipe.
impl From<std::io::Error> for Failure {
    fn from(error: std::io::Error) -> Self {
        Self::Unfinished(anyhow::Error::new(error).context("standard output"))
    }
}

/// Runs the command and turns its end into an exit code: 0 done, 2 bad input or use, 3 could not finish.
pub fn main() -> ExitCode {
    let done = match Arguments::parse().command {
        Command::Survey(arguments) => survey::run(arguments),
        Command::Catalogue(arguments) => catalogue::run(&arguments),
    };
    match done {
        Ok(()) => ExitCode::SUCCESS,
        Err(Failure::Input(error)) => complain(&error, 2),
        // A reader that has seen enough, such as `head`, closed the pipe.
        Err(Failure::Unfinished(error)) if is_closed_pipe(&error) => ExitCode::SUCCESS,
        Err(Failure::Unfinished(error)) => complain(&error, 3),
    }
}

fn complain(error: &anyhow::Error, code: u8) -> ExitCode {
    use std::io::Write;
    // With standard error gone too there is nobody left to tell.
    let _ = writeln!(std::io::stderr(), "gaussworthy: {error:#}");
    ExitCode::from(code)
}

fn is_closed_pipe(error: &anyhow::Error) -> bool {
    error
        .chain()
        .filter_map(|e| e.downcast_ref::<std::io::Error>())
        .any(|e| e.kind() == std::io::ErrorKind::BrokenPipe)
}
