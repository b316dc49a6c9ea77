//! A suite as the page and the Markdown show it: texts, marks and places, ready for a template.

use super::axes;
use super::marks::Mark;
use super::prepared::Prepared;
use super::words::{self, Rich};
use crate::guidance::View;
use crate::report::envelope_sentences;

pub(super) struct SuiteView<'a> {
    pub name: &'a str,
    pub title: &'a str,
    pub note: &'a str,
    pub answer: Vec<Rich>,
    pub ranking: Vec<RankedView<'a>>,
    pub maps: Vec<MapView<'a>>,
    pub envelopes: Vec<String>,
    pub limits: String,
    pub references: Rich,
    pub command: String,
    pub facts: Vec<(&'static str, String)>,
    /// What to say where ranking and maps are of a part of the cases.
    pub thinned: Option<String>,
}

pub(super) struct RankedView<'a> {
    pub entrant: usize,
    pub mark: &'a Mark,
    pub label: &'a str,
    pub evaluations: String,
    pub time: String,
    pub trusted_percent: String,
    pub undecided_percent: String,
    pub trusted: String,
    pub rejected: String,
    pub undecided: String,
    pub breaks: String,
}

pub(super) struct MapView<'a> {
    pub family: String,
    pub corner: String,
    pub columns: Vec<String>,
    pub rows: Vec<RowView<'a>>,
}

pub(super) struct RowView<'a> {
    pub tick: String,
    pub cells: Vec<Option<CellView<'a>>>,
}

pub(super) struct CellView<'a> {
    pub index: usize,
    pub mark: Option<&'a Mark>,
    pub beyond: bool,
}

pub(super) fn suite<'a>(prepared: &'a Prepared<'a>) -> SuiteView<'a> {
    let study = prepared.study;
    let from = &study.provenance;
    SuiteView {
        name: &from.suite.name,
        title: if from.suite.title.is_empty() { &from.suite.name } else { &from.suite.title },
        note: &from.suite.note,
        answer: words::answer(study, &View::own(study)),
        ranking: ranking(prepared),
        maps: maps(prepared),
        envelopes: study.envelopes.iter().flatten().flat_map(envelope_sentences).collect(),
        limits: words::limits(study),
        references: words::references(study),
        command: words::command(study),
        facts: words::facts(study),
        thinned: prepared.thinned(),
    }
}

fn ranking<'a>(prepared: &'a Prepared<'a>) -> Vec<RankedView<'a>> {
    let study = &*prepared.explored;
    let share = |count: usize, of: usize| if of == 0 { 0.0 } else { 100.0 * count as f64 / of as f64 };
    let ranked = View::own(study).ranking().into_iter().map(|r| {
        let served = r.served();
        let counted = |count: usize| format!("{} ({count})", words::percent(count, served));
        RankedView {
            entrant: r.entrant,
            mark: &prepared.marks[r.entrant],
            label: &study.labels[r.entrant],
            evaluations: words::evaluations(r.evaluations),
            time: r.time.map_or("–".into(), |time| format!("{time:.1}")),
            trusted_percent: format!("{:.2}", share(r.trusted, served)),
            undecided_percent: format!("{:.2}", share(r.undecided, served)),
            trusted: counted(r.trusted),
            rejected: counted(r.rejected),
            undecided: counted(r.undecided),
            breaks: r
                .breaks_first
                .map_or("–".into(), |(fault, count)| format!("{fault} ({})", words::percent(count, r.rejected))),
        }
    });
    ranked.collect()
}

fn maps<'a>(prepared: &'a Prepared<'a>) -> Vec<MapView<'a>> {
    let maps = prepared.maps().into_iter().map(|map| {
        let ticks = |k: usize| -> Vec<String> {
            let heading = &prepared.study.headings[map.axes[k]];
            map.values[k].iter().map(|&value| axes::quantity(value, heading)).collect()
        };
        let across = map.axes.len() - 1;
        let down = if across == 1 { ticks(0) } else { vec![String::new()] };
        let cell = |row: usize, column: usize| {
            let place = if across == 1 { vec![row, column] } else { vec![column] };
            let index = map.cells.iter().position(|cell| cell.place == place)?;
            let cell = &map.cells[index];
            let mark = cell.choice.map(|entrant| &prepared.marks[entrant]);
            Some(CellView { index, mark, beyond: cell.beyond_gaussian > 0 })
        };
        let columns = ticks(across);
        let rows = down.into_iter().enumerate().map(|(row, tick)| RowView {
            tick,
            cells: (0..columns.len()).map(|column| cell(row, column)).collect(),
        });
        MapView { family: map.family.clone(), corner: prepared.corner(&map), rows: rows.collect(), columns }
    });
    maps.collect()
}
