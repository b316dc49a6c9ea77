use std::io::Write;

use clap::{Args, ValueEnum};
use gaussworthy::report::{method_table, score_table, sensor_table};

use super::Failure;
use super::stdout::Stdout;

#[derive(Debug, Args)]
pub struct Arguments {
    /// What to list; everything unless told
    #[arg(value_enum)]
    shelf: Option<Shelf>,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum Shelf {
    Sensors,
    Methods,
    Scores,
}

pub fn run(arguments: &Arguments) -> Result<(), Failure> {
    let mut out = Stdout::new();
    let shelves = [
        (Shelf::Sensors, sensor_table as fn() -> String),
        (Shelf::Methods, method_table),
        (Shelf::Scores, score_table),
    ];
    let mut asked = shelves.into_iter().filter(|(shelf, _)| arguments.shelf.is_none_or(|s| s == *shelf)).peekable();
    while let Some((_, table)) = asked.next() {
        writeln!(out, "{}", table())?;
        if asked.peek().is_some() {
            writeln!(out)?;
        }
    }
    Ok(())
}
