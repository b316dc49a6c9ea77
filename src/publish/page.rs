use askama::Template;

use super::data;
use super::marks::{COLOURS, Mark};
use super::prepared::Prepared;
use super::views::{self, SuiteView};
use super::words::{self, Rich};
use crate::guidance::View;
use crate::method::{self, Degree, MethodSpec};
use crate::report::{CAUTION, SCORE_LEGEND};
use crate::score::ScoreKind;
use crate::sensor;
use crate::trust::RegimeIndex;

/// The whole page. Everything foreign goes through the template's escapes.
#[derive(Template)]
#[template(path = "page.html")]
struct Page<'a> {
    version: &'static str,
    title: &'a str,
    caution: &'static str,
    marks: Vec<Colour>,
    suites: Vec<SuiteView<'a>>,
    indices: Vec<(&'static str, &'static str)>,
    pictures: Vec<Shown<'a>>,
    methods: Vec<MethodView<'a>>,
    sensors: Vec<&'static sensor::Kind>,
    scores: [ScoreKind; ScoreKind::COUNT],
    score_legend: [&'static str; 4],
    data: String,
}

struct Colour {
    light: &'static str,
    dark: &'static str,
}

struct MethodView<'a> {
    mark: &'a Mark,
    label: &'a str,
    kind: Option<&'static method::Kind>,
    exact: Option<String>,
    fared: Vec<FaredView<'a>>,
}

struct FaredView<'a> {
    suite: &'a str,
    text: Rich,
}

/// A picture inside the page.
pub(super) struct Shown<'a> {
    pub alt: &'a str,
    pub caption: &'a str,
    /// As a data URI.
    pub data: String,
    pub width: u32,
    pub height: u32,
}

/// The page of these studies.
///
/// # Errors
/// What the writer of JSON or the template says.
pub(super) fn render(
    title: &str,
    prepared: &[Prepared<'_>],
    pictures: Vec<Shown<'_>>,
) -> Result<String, Box<dyn std::error::Error + Send + Sync>> {
    let page = Page {
        version: env!("CARGO_PKG_VERSION"),
        title,
        caution: CAUTION,
        marks: COLOURS.iter().map(|&(light, dark)| Colour { light, dark }).collect(),
        suites: prepared.iter().map(views::suite).collect(),
        indices: RegimeIndex::ALL.iter().map(|index| (index.name(), index.formula())).collect(),
        pictures,
        methods: methods(prepared),
        sensors: sensors(prepared),
        scores: ScoreKind::ALL,
        score_legend: SCORE_LEGEND,
        data: data::json(prepared)?,
    };
    Ok(page.render()?)
}

fn methods<'a>(prepared: &'a [Prepared<'a>]) -> Vec<MethodView<'a>> {
    let mut views: Vec<MethodView<'a>> = Vec::new();
    for p in prepared {
        let view = View::own(p.study);
        for ranked in view.ranking() {
            let label = p.study.labels[ranked.entrant].as_str();
            let fared =
                FaredView { suite: &p.study.provenance.suite.name, text: words::fared(p.study, &view, &ranked) };
            match views.iter_mut().find(|view| view.label == label) {
                Some(view) => view.fared.push(fared),
                None => {
                    let outside = p.study.provenance.settings.outside.iter().any(|outside| outside.name == label);
                    let spec = if outside { None } else { MethodSpec::parse(label).ok() };
                    views.push(MethodView {
                        mark: &p.marks[ranked.entrant],
                        label,
                        kind: spec.as_ref().and_then(MethodSpec::kind),
                        exact: spec.as_ref().and_then(exact),
                        fared: vec![fared],
                    });
                }
            }
        }
    }
    views
}

fn exact(spec: &MethodSpec) -> Option<String> {
    let exact = spec.method().exactness()?;
    let words = |degree| match degree {
        Degree::UpTo(degree) => format!("up to degree {degree}"),
        Degree::Every => "for every sensor that it serves".into(),
    };
    let [mean, cross, covariance] = [exact.mean, exact.cross_covariance, exact.covariance].map(words);
    Some(format!("on polynomial sensors: mean {mean}, cross-covariance {cross}, covariance {covariance}"))
}

/// The kinds of sensor in these studies.
fn sensors(prepared: &[Prepared<'_>]) -> Vec<&'static sensor::Kind> {
    let mut kinds: Vec<&'static sensor::Kind> = Vec::new();
    for case in prepared.iter().flat_map(|p| &p.study.cases) {
        let name = case.record["sensor"]["kind"].as_str().unwrap_or("formula");
        if let Some(kind) = sensor::KINDS.iter().find(|kind| kind.name == name)
            && !kinds.iter().any(|k| k.name == name)
        {
            kinds.push(kind);
        }
    }
    kinds
}
