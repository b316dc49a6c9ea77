//! What the page carries for its script: the numbers of `scores.csv` to the bit.

use std::collections::BTreeMap;

use base64::Engine;
use base64::prelude::BASE64_STANDARD;
use serde::Serialize;

use super::prepared::Prepared;
use crate::score::{Estimate, ScoreKind};
use crate::trust::Limits;

/// Scores that have a limit, in the order in which the script reads them.
const LIMITED: [ScoreKind; 6] = [
    ScoreKind::MeanError,
    ScoreKind::VarianceRatioLow,
    ScoreKind::VarianceRatioHigh,
    ScoreKind::CrossCovarianceError,
    ScoreKind::NeesRatio,
    ScoreKind::Excess,
];

#[derive(Serialize)]
struct Data<'a> {
    suites: Vec<SuiteData<'a>>,
}

#[derive(Serialize)]
struct SuiteData<'a> {
    name: &'a str,
    limits: &'a Limits,
    /// One-sided t quantile, shared over the looks.
    quantile: f64,
    methods: Vec<MethodData<'a>>,
    families: Vec<&'a str>,
    cases: CasesData<'a>,
    /// Values, Jacobians, Hessians, exact moments, work.
    costs: Vec<[u64; 5]>,
    rows: RowsData<'a>,
    /// Value and standard error of [`LIMITED`], row by row, little-endian doubles in base 64; NaN where undefined.
    scores: String,
    /// The same of the floor, case by case.
    floors: String,
    maps: Vec<MapData>,
    thinned: Option<String>,
}

#[derive(Serialize)]
struct MethodData<'a> {
    label: &'a str,
    code: &'a str,
    /// Median time as a ratio to first-order Taylor.
    time: Option<f64>,
}

#[derive(Serialize)]
struct CasesData<'a> {
    id: Vec<&'a str>,
    family: Vec<usize>,
    about: Vec<String>,
    soundness: Vec<&'a str>,
    /// Whether no verdict rests on the reference.
    doubt: Vec<bool>,
}

/// One row a case and method.
#[derive(Serialize)]
struct RowsData<'a> {
    /// First letters of the outcomes.
    outcome: String,
    /// 1 where no limit can change it.
    fixed: String,
    /// Place among the costs, -1 where nothing was counted.
    cost: Vec<i64>,
    /// Why, where no limit decided.
    reason: BTreeMap<usize, &'a str>,
}

#[derive(Serialize)]
struct MapData {
    family: String,
    cells: Vec<CellData>,
}

#[derive(Serialize)]
struct CellData {
    about: String,
    cases: Vec<usize>,
}

/// All of it as JSON that can stand inside a script element: no `<` can end that early.
pub(super) fn json(prepared: &[Prepared<'_>]) -> serde_json::Result<String> {
    let data = Data { suites: prepared.iter().map(suite).collect() };
    let text = serde_json::to_string(&data)?;
    // Inside JSON these stand in strings only.
    Ok(text.replace('<', "\\u003c").replace('>', "\\u003e").replace('&', "\\u0026"))
}

fn suite<'a>(prepared: &'a Prepared<'a>) -> SuiteData<'a> {
    let study = &*prepared.explored;
    let families = study.families();
    let family = |name: &str| families.iter().position(|f| *f == name).unwrap_or_default();
    let cases = &study.cases;
    let mut costs: Vec<[u64; 5]> = Vec::new();
    let mut rows =
        RowsData { outcome: String::new(), fixed: String::new(), cost: Vec::new(), reason: BTreeMap::new() };
    let (mut scores, mut floors) = (Vec::new(), Vec::new());
    for case in cases {
        floors.push(case.floor);
        for entry in &case.entries {
            if !entry.by_scores {
                rows.reason.insert(rows.cost.len(), &entry.reason);
            }
            rows.outcome.extend(entry.outcome.name().chars().next());
            rows.fixed.push(if entry.by_scores { '0' } else { '1' });
            let cost = entry.evaluations.zip(entry.work);
            rows.cost.push(cost.map_or(-1, |(e, work)| {
                let cost = [e.values, e.jacobians, e.hessians, e.exact_moments, work];
                let place = costs.iter().position(|c| *c == cost).unwrap_or_else(|| {
                    costs.push(cost);
                    costs.len() - 1
                });
                place as i64
            }));
            scores.extend(LIMITED.map(|kind| entry.scores.get(kind)));
        }
    }
    let about = (0..cases.len()).map(|case| prepared.about_case(case)).collect();
    let maps = prepared.maps().into_iter().map(|map| MapData {
        cells: map
            .cells
            .iter()
            .map(|cell| CellData { about: prepared.about_cell(&map, cell), cases: cell.cases.clone() })
            .collect(),
        family: map.family,
    });
    SuiteData {
        name: &study.provenance.suite.name,
        limits: &study.provenance.settings.limits,
        quantile: study.judge.quantile(),
        methods: study
            .labels
            .iter()
            .zip(&prepared.marks)
            .map(|(label, mark)| MethodData { label, code: &mark.code, time: study.provenance.time_ratio(label) })
            .collect(),
        cases: CasesData {
            id: cases.iter().map(|case| case.id.as_str()).collect(),
            family: cases.iter().map(|case| family(&case.family)).collect(),
            about,
            soundness: cases.iter().map(|case| case.reference.soundness.as_str()).collect(),
            doubt: cases.iter().map(|case| !case.reference.bears_verdicts()).collect(),
        },
        maps: maps.collect(),
        families: families.clone(),
        costs,
        rows,
        scores: doubles(&scores),
        floors: doubles(&floors),
        thinned: prepared.thinned(),
    }
}

fn doubles(estimates: &[Option<Estimate>]) -> String {
    let numbers = estimates.iter().flat_map(|e| e.map_or([f64::NAN; 2], |e| [e.value, e.standard_error]));
    BASE64_STANDARD.encode(numbers.flat_map(f64::to_le_bytes).collect::<Vec<u8>>())
}
