use std::io::Write;
use std::path::PathBuf;

use clap::Args;
use gaussworthy::report::{MergeError, merge};

use super::Failure;
use super::stdout::Stdout;

#[derive(Debug, Args)]
pub struct Arguments {
    /// The --out folders of all parts, in any order
    #[arg(required = true, value_name = "DIR")]
    parts: Vec<PathBuf>,
    /// Where results folders of the whole go; another folder than any part's
    #[arg(long, value_name = "DIR")]
    out: PathBuf,
}

pub fn run(arguments: &Arguments) -> Result<(), Failure> {
    let merged = merge(&arguments.parts, &arguments.out).map_err(|error| match error {
        MergeError::Folder(_) => Failure::unfinished(error),
        _ => Failure::input(error),
    })?;
    let mut out = Stdout::new();
    for whole in merged {
        writeln!(
            out,
            "{}: {} cases of {} parts, written to {}",
            whole.suite,
            whole.cases,
            whole.parts,
            whole.folder.display()
        )?;
    }
    Ok(())
}
