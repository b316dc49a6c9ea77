use std::io::{ErrorKind, Write};
use std::path::PathBuf;

use clap::Args;
use gaussworthy::report::{hand_out, hand_out_file};

use super::Failure;
use super::questions::Questions;
use super::stdout::Stdout;

#[derive(Debug, Args)]
#[command(after_help = "Name one suite, or give --cases.")]
pub struct Arguments {
    #[command(flatten)]
    questions: Questions,
    /// The file to write, whole or not at all; standard output unless told
    #[arg(long, value_name = "FILE")]
    out: Option<PathBuf>,
}

pub fn run(arguments: &Arguments) -> Result<(), Failure> {
    let suite = arguments.questions.suite()?;
    if let Some(path) = &arguments.out {
        return hand_out_file(&suite, path).map_err(|e| {
            // A place that is not there was never one to write to; a disk that fills is no mistake of the user's.
            let mistaken = matches!(
                e.kind(),
                ErrorKind::NotFound
                    | ErrorKind::PermissionDenied
                    | ErrorKind::IsADirectory
                    | ErrorKind::NotADirectory
            );
            let error = anyhow::Error::new(e).context(format!("{}: cannot be written", path.display()));
            if mistaken { Failure::Input(error) } else { Failure::Unfinished(error) }
        });
    }
    let mut out = Stdout::new();
    hand_out(&suite, &mut out)?;
    out.flush()?;
    Ok(())
}
