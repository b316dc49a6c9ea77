use std::io::Write;
use std::path::PathBuf;

use anyhow::{Context, anyhow};
use clap::{Args, ValueEnum};
use gaussworthy::guidance::{Budget, MethodEnvelopes, advise};
use gaussworthy::method::{MethodSpec, every_kind};
use gaussworthy::report::write_advice;
use gaussworthy::suite::{Case, Suite};

use super::Failure;
use super::measuring::Sampling;
use super::questions::Questions;
use super::stdout::Stdout;

#[derive(Debug, Args)]
#[command(
    after_help = "Name a suite, or give --cases or --record. Without --case every case is advised on, one after the other."
)]
pub struct Arguments {
    #[command(flatten)]
    questions: Questions,
    /// The case of the suite, or of the records, to advise on
    #[arg(long = "case", value_name = "ID")]
    case: Option<String>,
    /// One case record, as JSON on the command line, in place of a suite
    #[arg(long, value_name = "JSON", conflicts_with_all = ["suites", "cases"])]
    record: Option<String>,
    /// Most evaluations that a transform may take
    #[arg(long, value_name = "N")]
    most_evaluations: Option<u64>,
    /// Longest time of a transform, as a ratio to first-order Taylor
    #[arg(long, value_name = "X")]
    most_time: Option<f64>,
    /// No method that needs derivatives
    #[arg(long)]
    no_derivatives: bool,
    /// No method with a weight below zero
    #[arg(long)]
    no_negative_weights: bool,
    /// Every method in single precision
    #[arg(long)]
    single_precision: bool,
    /// Results folder of a suite of the same sensor, whose envelopes the case is held against; the suite's own in --out unless told
    #[arg(long, value_name = "DIR")]
    envelopes: Option<PathBuf>,
    /// Text for people, or JSON
    #[arg(long, value_enum, default_value = "text")]
    format: Format,
    #[command(flatten)]
    sampling: Sampling,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum Format {
    Text,
    Json,
}

pub fn run(arguments: &Arguments) -> Result<(), Failure> {
    let suite = arguments.suite()?;
    let chosen: Vec<&Case> = match &arguments.case {
        None => suite.cases.iter().collect(),
        Some(id) => vec![suite.case(id).context("--case").map_err(Failure::Input)?],
    };
    let mut settings = arguments.sampling.settings(arguments.questions.seed)?;
    let methods = settings.methods.take().or_else(|| suite.methods.clone()).unwrap_or_else(every_kind);
    settings.methods = Some(if arguments.single_precision { in_single_precision(&methods)? } else { methods });
    if arguments.most_time.is_some() && arguments.sampling.no_timing {
        return Err(Failure::Input(anyhow!(
            "--most-time: nothing is timed under --no-timing; give one of the two"
        )));
    }
    if arguments.most_time.is_some_and(|most| !(most > 0.0)) {
        return Err(Failure::Input(anyhow!("--most-time: give a ratio above 0")));
    }
    let budget = Budget {
        evaluations: arguments.most_evaluations,
        time: arguments.most_time,
        no_derivatives: arguments.no_derivatives,
        no_negative_weights: arguments.no_negative_weights,
        single_precision: arguments.single_precision,
    };
    let envelopes = arguments.envelopes(&suite)?;
    settings.store = Some(arguments.sampling.store()?);
    arguments.sampling.make_ready()?;
    let mut out = Stdout::new();
    for case in chosen {
        let timed = !arguments.sampling.no_timing;
        let advice = advise(case, &suite, &settings, budget, &envelopes, timed).map_err(Failure::input)?;
        match arguments.format {
            Format::Text => write_advice(&advice, &mut out)?,
            Format::Json => {
                let line = serde_json::to_string(&advice).map_err(Failure::unfinished)?;
                writeln!(out, "{line}")?;
            }
        }
    }
    Ok(())
}

impl Arguments {
    fn suite(&self) -> Result<Suite, Failure> {
        let Some(record) = &self.record else { return self.questions.suite() };
        let value = serde_json::from_str(record).context("--record: is not JSON").map_err(Failure::Input)?;
        let case = Case::from_json(value).context("--record").map_err(Failure::Input)?;
        Suite::of_cases("record", vec![case]).map_err(Failure::input)
    }

    /// The envelopes that were asked for, or those of an earlier survey of the suite, if there are any.
    fn envelopes(&self, suite: &Suite) -> Result<Vec<MethodEnvelopes>, Failure> {
        let own = self.sampling.out.join(&suite.name);
        let folder = self.envelopes.as_ref().unwrap_or(&own);
        let path = folder.join("envelopes.json");
        if self.envelopes.is_none() && !path.exists() {
            return Ok(Vec::new());
        }
        let text = std::fs::read_to_string(&path)
            .with_context(|| format!("{}: cannot be read", path.display()))
            .map_err(Failure::Input)?;
        serde_json::from_str(&text)
            .with_context(|| format!("{}: is no file of envelopes that was written here", path.display()))
            .map_err(Failure::Input)
    }
}

fn in_single_precision(methods: &[MethodSpec]) -> Result<Vec<MethodSpec>, Failure> {
    let mut labels: Vec<String> = Vec::new();
    for method in methods {
        let label = method.label();
        let single =
            if label.ends_with(":arithmetic=f32") { label.into() } else { format!("{label}:arithmetic=f32") };
        if !labels.contains(&single) {
            labels.push(single);
        }
    }
    labels.iter().map(|label| MethodSpec::parse(label).map_err(Failure::input)).collect()
}
