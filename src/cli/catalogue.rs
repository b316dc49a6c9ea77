use std::io::Write;

use anyhow::anyhow;
use clap::{Args, ValueEnum};
use gaussworthy::report::{method_page, method_table, score_table, sensor_page, sensor_table};

use super::Failure;
use super::stdout::Stdout;

#[derive(Debug, Args)]
pub struct Arguments {
    /// What to list; everything unless told
    #[arg(value_enum)]
    shelf: Option<Shelf>,

    /// One sensor or method, to be shown whole
    name: Option<String>,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum Shelf {
    Sensors,
    Methods,
    Scores,
}

pub fn run(arguments: &Arguments) -> Result<(), Failure> {
    let mut out = Stdout::new();
    if let (Some(shelf), Some(name)) = (arguments.shelf, &arguments.name) {
        let page = page(shelf, name).map_err(|message| Failure::Input(anyhow!(message)))?;
        writeln!(out, "{page}")?;
        return Ok(());
    }
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

fn page(shelf: Shelf, name: &str) -> Result<String, String> {
    match shelf {
        Shelf::Sensors => sensor_page(name),
        Shelf::Methods => method_page(name),
        Shelf::Scores => Err(format!("`catalogue scores` shows every score whole; leave out `{name}`")),
    }
}
