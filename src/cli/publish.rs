use std::io::Write;
use std::path::PathBuf;

use clap::Args;
use gaussworthy::publish::Publication;
use gaussworthy::report::CAUTION;

use super::Failure;
use super::stdout::Stdout;

#[derive(Debug, Args)]
#[command(after_help = "Example: gaussworthy publish results/harbour-radar results/listening-buoys --to guidance")]
pub struct Arguments {
    /// Results folders that surveys have written, one a suite, in the order in which they are to be shown
    #[arg(required = true, value_name = "RESULTS")]
    results: Vec<PathBuf>,
    /// Where the guidance goes: index.html, guidance.md and pictures/
    #[arg(long, value_name = "DIR")]
    to: PathBuf,
    /// Title of the guidance; made of the suites unless told
    #[arg(long, value_name = "TEXT")]
    title: Option<String>,
    /// Pictures as PNG too, beside SVG
    #[arg(long)]
    png: bool,
}

pub fn run(arguments: &Arguments) -> Result<(), Failure> {
    let failure = |error: gaussworthy::publish::PublishError| {
        if error.is_input() { Failure::input(error) } else { Failure::unfinished(error) }
    };
    let publication = Publication::read(arguments.title.as_deref(), &arguments.results).map_err(failure)?;
    let written = publication.with_png(arguments.png).write(&arguments.to).map_err(failure)?;
    let mut out = Stdout::new();
    for path in written {
        writeln!(out, "{}", path.display())?;
    }
    writeln!(out, "\n{CAUTION}")?;
    Ok(())
}
