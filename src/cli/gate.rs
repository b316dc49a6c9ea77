use std::fs::File;
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};

use anyhow::{Context, anyhow};
use clap::Args;
use gaussworthy::gate::{Baseline, BaselineError, Comparison, Rules, compare};
use gaussworthy::outside::Outside;
use gaussworthy::report::{CAUTION, write_comparison, write_comparison_page, write_junit};
use gaussworthy::suite::Suite;
use gaussworthy::survey::{SurveyPlan, SurveyResult, survey};

use super::Failure;
use super::mark::{answers, called};
use super::measuring::{Sampling, admit};
use super::outside::{OutsideCommands, ask};
use super::progress::Progress;
use super::questions::Questions;
use super::stdout::Stdout;

#[derive(Debug, Args)]
#[command(
    after_help = "Exit codes: 0 nothing worse, 1 a regression, 2 bad input or use, 3 could not finish. Without a suite, the \
                        three demonstration suites are held against their baselines."
)]
pub struct Arguments {
    #[command(flatten)]
    questions: Questions,
    /// Folder of the accepted baselines, one file a suite
    #[arg(long, value_name = "DIR")]
    against: PathBuf,
    /// Show what has changed, then make today's findings the baseline
    #[arg(long)]
    accept: bool,
    /// Largest odds of any false alarm in the run
    #[arg(long, value_name = "P", default_value_t = Rules::default().odds)]
    odds: f64,
    /// Largest change of a method's moments that counts as rounding, in standard deviations
    #[arg(long, value_name = "X", default_value_t = Rules::default().rounding)]
    rounding: f64,
    /// Time the methods too, and fail where one takes more than X times its accepted time, as a ratio to taylor-1
    #[arg(long, value_name = "X", conflicts_with = "no_timing")]
    time_margin: Option<f64>,
    /// Write what was compared as JUnit XML
    #[arg(long, value_name = "FILE")]
    junit: Option<PathBuf>,
    /// Write what has changed as a page of Markdown
    #[arg(long, value_name = "FILE")]
    markdown: Option<PathBuf>,
    /// Hold answers of an outside implementation against the baseline too: moments records (JSON Lines) for one suite; `-` for
    /// standard input
    #[arg(long, value_name = "FILE", requires = "name")]
    answers: Option<PathBuf>,
    /// What the implementation that gave --answers is called
    #[arg(long = "as", value_name = "NAME", requires = "answers")]
    name: Option<String>,
    #[command(flatten)]
    outside: OutsideCommands,
    #[command(flatten)]
    sampling: Sampling,
}

pub fn run(arguments: &Arguments) -> Result<(), Failure> {
    let rules = Rules { odds: arguments.odds, rounding: arguments.rounding, time_margin: arguments.time_margin };
    rules.check().map_err(Failure::input)?;
    let commands = arguments.outside.commands()?;
    let name = arguments.name.as_deref().map(called).transpose()?;
    let suites = match &name {
        Some(_) => vec![arguments.questions.suite()?],
        None => arguments.questions.suites()?,
    };
    // Before an hour of sampling, not after it.
    for file in [&arguments.junit, &arguments.markdown].into_iter().flatten() {
        check_place(file)?;
    }
    let baselines = suites.iter().map(|suite| arguments.baseline(suite)).collect::<Result<Vec<_>, Failure>>()?;
    let mut plans = arguments.sampling.plans(suites, arguments.questions.seed, None)?;
    let store = arguments.sampling.store()?;
    arguments.sampling.make_ready()?;
    for ((suite, plan), baseline) in plans.iter_mut().zip(&baselines) {
        plan.store = Some(store.clone());
        if let Some(baseline) = baseline {
            plan.earlier = baseline.earlier(suite);
        }
        for answered in arguments.answered(name.as_ref(), &commands, suite, plan)? {
            admit(suite, plan, answered)?;
        }
    }
    let surveys =
        plans.iter().map(|(suite, plan)| arguments.measured(suite, plan)).collect::<Result<Vec<_>, Failure>>()?;
    arguments.judge(&baselines, &surveys, &rules)
}

impl Arguments {
    /// The baseline of a suite; none only where one is about to be accepted.
    fn baseline(&self, suite: &Suite) -> Result<Option<Baseline>, Failure> {
        let baseline = match Baseline::read(&self.against, &suite.name) {
            Err(BaselineError::Absent(_)) if self.accept => return Ok(None),
            found => found.map_err(Failure::input)?,
        };
        if self.time_margin.is_some() && baseline.time_ratios.is_empty() && !self.accept {
            let path = Baseline::path(&self.against, &suite.name);
            return Err(Failure::Input(anyhow!(
                "--time-margin: {} holds no times; write them with --accept --time-margin",
                path.display()
            )));
        }
        Ok(Some(baseline))
    }

    fn answered(
        &self,
        name: Option<&gaussworthy::outside::Name>,
        commands: &[gaussworthy::outside::OutsideCommand],
        suite: &Suite,
        plan: &SurveyPlan,
    ) -> Result<Vec<Outside>, Failure> {
        let mut outside = Vec::new();
        if let Some(name) = name {
            outside.push(answers(self.answers.as_deref(), name, suite, plan)?);
        }
        outside.extend(ask(commands, suite, plan)?);
        Ok(outside)
    }

    fn measured<'a>(&self, suite: &'a Suite, plan: &'a SurveyPlan) -> Result<SurveyResult<'a>, Failure> {
        let progress = Progress::new(&suite.name, suite.cases.len());
        let result = survey(suite, plan, self.time_margin.is_some(), &progress);
        progress.finish();
        if !result.is_complete() {
            return Err(Failure::Unfinished(anyhow!(
                "interrupted in suite `{}`: {} of {} cases are finished; nothing was compared or written. Run again, it goes on \
                 from the store",
                suite.name,
                result.cases.len(),
                suite.cases.len()
            )));
        }
        Ok(result)
    }

    fn judge(
        &self,
        baselines: &[Option<Baseline>],
        surveys: &[SurveyResult<'_>],
        rules: &Rules,
    ) -> Result<(), Failure> {
        let found: Vec<Baseline> = surveys.iter().map(Baseline::of).collect();
        let chances = found.iter().map(Baseline::chances).sum();
        let mut out = Stdout::new();
        let mut comparisons: Vec<Comparison> = Vec::new();
        for (baseline, survey) in baselines.iter().zip(surveys) {
            match baseline {
                Some(baseline) => {
                    let comparison = compare(baseline, survey, rules, chances);
                    write_comparison(&comparison, &mut out)?;
                    comparisons.push(comparison);
                }
                None => writeln!(out, "{}: there was no baseline\n", survey.suite.name)?,
            }
        }
        if let Some(path) = &self.junit {
            written(path, |to| write_junit(&comparisons, to))?;
        }
        if let Some(path) = &self.markdown {
            written(path, |to| write_comparison_page(&comparisons, to))?;
        }
        if self.accept {
            for found in &found {
                let path = found.write(&self.against).map_err(Failure::unfinished)?;
                writeln!(out, "Accepted: {}", path.display())?;
            }
        }
        writeln!(out, "{CAUTION}")?;
        let shut: Vec<&str> = comparisons.iter().filter(|c| c.fails()).map(|c| c.suite.as_str()).collect();
        if shut.is_empty() || self.accept {
            return Ok(());
        }
        Err(Failure::Regression(anyhow!(
            "regression in {}; if it is meant, accept it by --accept and have the change of the baseline reviewed",
            shut.join(", ")
        )))
    }
}

/// Whether a file can be written where it shall be.
fn check_place(file: &Path) -> Result<(), Failure> {
    let folder = file.parent().filter(|parent| !parent.as_os_str().is_empty()).unwrap_or(Path::new("."));
    if folder.is_dir() && !file.is_dir() {
        return Ok(());
    }
    Err(Failure::Input(anyhow!("{}: cannot be written: give a file in a folder that is there", file.display())))
}

fn written(path: &Path, fill: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> Result<(), Failure> {
    let attempt = || {
        let mut file = BufWriter::new(File::create(path)?);
        fill(&mut file)?;
        file.flush()
    };
    attempt().with_context(|| format!("{}: cannot be written", path.display())).map_err(Failure::Unfinished)
}
