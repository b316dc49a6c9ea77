use std::fs::File;
use std::io::{self, Read};
use std::path::{Path, PathBuf};

use anyhow::{Context, anyhow};
use clap::Args;
use gaussworthy::outside::{Name, Outside};
use gaussworthy::suite::Suite;
use gaussworthy::survey::SurveyPlan;

use super::Failure;
use super::measuring::{Measuring, admit};
use super::questions::Questions;

#[derive(Debug, Args)]
#[command(
    after_help = "Name one suite, or give --cases. Take the suite and the seed that the cases were handed out with: an answer \
                  says the name of its case and nothing else of it."
)]
pub struct Arguments {
    #[command(flatten)]
    questions: Questions,
    /// Moments records (JSON Lines), one a case of the suite in any order; standard input unless told, or by `-`
    #[arg(long, value_name = "FILE")]
    answers: Option<PathBuf>,
    /// What the implementation is called in tables and files
    #[arg(long = "as", value_name = "NAME")]
    name: String,
    #[command(flatten)]
    measuring: Measuring,
}

pub fn run(arguments: &Arguments) -> Result<(), Failure> {
    let name = called(&arguments.name)?;
    let suite = arguments.questions.suite()?;
    let mut plans = arguments.measuring.plans(vec![suite], arguments.questions.seed)?;
    for (suite, plan) in &mut plans {
        let answers = answers(arguments.answers.as_deref(), &name, suite, plan)?;
        admit(suite, plan, answers)?;
    }
    arguments.measuring.measure(plans, |_, _| Ok(Vec::new()))
}

/// The name that is given with `--as`.
pub fn called(name: &str) -> Result<Name, Failure> {
    Name::new(name).with_context(|| format!("--as {name}")).map_err(Failure::Input)
}

/// The answers that a file, or standard input, holds for a suite.
pub fn answers(path: Option<&Path>, name: &Name, suite: &Suite, plan: &SurveyPlan) -> Result<Outside, Failure> {
    let (file, from) = open(path)?;
    let answers = Outside::read(name.clone(), suite, plan.shard, &file, from)
        .with_context(|| format!("{file}: cannot be read"))
        .map_err(Failure::Input)?;
    check_meant(suite, &answers, &file)?;
    Ok(answers)
}

/// What answers are read from, and what it is called without its folder.
fn open(path: Option<&Path>) -> Result<(String, Box<dyn Read>), Failure> {
    let Some(path) = path.filter(|path| *path != Path::new("-")) else {
        return Ok(("standard input".into(), Box::new(io::stdin().lock())));
    };
    let file = File::open(path).and_then(|file| {
        let is_folder = file.metadata()?.is_dir();
        if is_folder { Err(io::Error::from(io::ErrorKind::IsADirectory)) } else { Ok(file) }
    });
    let file = file.with_context(|| format!("{}: cannot be read", path.display())).map_err(Failure::Input)?;
    let name = path.file_name().unwrap_or(path.as_os_str()).to_string_lossy().into_owned();
    Ok((name, Box::new(file)))
}

/// Where not one answer is for a case of the suite, another suite or file was meant.
fn check_meant(suite: &Suite, answers: &Outside, file: &str) -> Result<(), Failure> {
    let tally = answers.tally();
    if tally.usable + tally.unusable > 0 || tally.elsewhere > 0 {
        return Ok(());
    }
    let first = answers.notes().iter().find(|note| note.starts_with("line "));
    let first = first.map_or_else(
        || "it is empty; give one moments record a line, as {\"case\":..,\"mean\":..,\"covariance\":..,\"cross_covariance\":..}".into(),
        |note| format!("the first: {note}"),
    );
    Err(Failure::Input(anyhow!("{file}: holds no answer to any case of suite `{}`; {first}", suite.name)))
}
