use std::borrow::Cow;

use super::axes::{parted, quantity};
use super::marks::Mark;
use crate::guidance::{Cell, FamilyMap, Study, View};

/// Rows of a suite that a page carries, so that it stays small; of a larger suite it has cases evenly spread.
const MOST_ROWS: usize = 4000;

/// A study made ready to be shown.
pub(super) struct Prepared<'a> {
    pub study: &'a Study,
    /// The cases that the page carries: all of them, or evenly spread ones.
    pub explored: Cow<'a, Study>,
    /// One mark an entrant.
    pub marks: Vec<Mark>,
}

impl<'a> Prepared<'a> {
    /// All studies, with marks that are the same in all of them.
    pub fn all(studies: &'a [Study]) -> Vec<Self> {
        let mut labels: Vec<String> = Vec::new();
        for label in studies.iter().flat_map(|study| &study.labels) {
            if !labels.contains(label) {
                labels.push(label.clone());
            }
        }
        let marks = Mark::of(&labels);
        let mark =
            |label: &String| marks.iter().zip(&labels).find(|(_, l)| *l == label).map(|(mark, _)| mark.clone());
        studies
            .iter()
            .map(|study| Self {
                study,
                explored: thinned(study),
                marks: study.labels.iter().filter_map(mark).collect(),
            })
            .collect()
    }

    /// What to say where not every case is carried.
    pub fn thinned(&self) -> Option<String> {
        let (carried, all) = (self.explored.cases.len(), self.study.cases.len());
        (carried < all).then(|| format!("This page carries {carried} of the {all} cases, evenly spread; the answer above rests on all of them."))
    }

    /// Where a cell lies: `prior.range 300 m, prior.across_sd 0.5 deg`.
    pub fn about_cell(&self, map: &FamilyMap, cell: &Cell) -> String {
        let parts = map.axes.iter().zip(&cell.place).enumerate().map(|(k, (&axis, &place))| {
            let heading = &self.study.headings[axis];
            let (name, _) = parted(heading);
            format!("{name} {}", quantity(map.values[k][place], heading))
        });
        parts.collect::<Vec<_>>().join(", ")
    }

    /// What was swept or drawn for a case.
    pub fn about_case(&self, case: usize) -> String {
        let settings = self.explored.cases[case].settings.iter().zip(&self.study.headings);
        let parts = settings.filter_map(|(value, heading)| {
            let (name, _) = parted(heading);
            value.map(|value| format!("{name} {}", quantity(value, heading)))
        });
        parts.collect::<Vec<_>>().join(", ")
    }

    /// The maps of the explored cases.
    pub fn maps(&self) -> Vec<FamilyMap> {
        View::own(&self.explored).maps()
    }

    /// What stands in the corner of a map: what runs down and what runs across.
    pub fn corner(&self, map: &FamilyMap) -> String {
        let of = |k: usize| parted(&self.study.headings[map.axes[k]]).0;
        if map.axes.len() == 2 { format!("{} down, {} across", of(0), of(1)) } else { format!("{} across", of(0)) }
    }
}

fn thinned(study: &Study) -> Cow<'_, Study> {
    let most = (MOST_ROWS / study.labels.len().max(1)).max(1);
    let all = study.cases.len();
    if all <= most {
        return Cow::Borrowed(study);
    }
    let cases = (0..most).map(|k| study.cases[k * all / most].clone()).collect();
    Cow::Owned(Study { cases, ..study.clone() })
}
