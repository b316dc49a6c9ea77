//! The cheapest trusted method at every point of a grid.

use serde::{Deserialize, Serialize};

/// What a method did on one case of a grid.
#[derive(Debug, Clone, PartialEq)]
pub struct Entry {
    /// Its label.
    pub method: String,
    /// Its work, see [`Evaluations::work`](crate::method::Evaluations::work); `None` where it is not known, as of an outside implementation.
    pub work: Option<u64>,
    /// Whether it is trusted.
    pub trusted: bool,
}

/// One point of a choice map.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Choice {
    /// The family.
    pub family: String,
    /// Heading and value on the slower axis.
    pub first_axis: String,
    /// Its value.
    pub first: f64,
    /// The other axis.
    pub second_axis: String,
    /// Its value.
    pub second: f64,
    /// Cases at this point: more than one where something is drawn.
    pub cases: usize,
    /// Cases in which the floor is above its limit: no Gaussian should be trusted there.
    pub beyond_gaussian: usize,
    /// The method of least work that is trusted in all of them; empty if there is none.
    pub choice: String,
    /// Its work.
    pub work: Option<u64>,
}

/// One case of a grid of two sweeps.
#[derive(Debug, Clone, PartialEq)]
pub struct GridCase {
    /// The family.
    pub family: String,
    /// Headings and values of its two sweeps.
    pub axes: [(String, f64); 2],
    /// Whether the floor is above its limit.
    pub beyond_gaussian: bool,
    /// How everyone did.
    pub entries: Vec<Entry>,
}

/// The map of cases that come grid point by grid point.
#[derive(Debug, Clone, Default)]
pub struct ChoiceMap {
    points: Vec<(Choice, Vec<Entry>)>,
}

impl ChoiceMap {
    /// Takes up the next case; cases at the same point come one after the other.
    pub fn add(&mut self, case: GridCase) {
        let [(first_axis, first), (second_axis, second)] = case.axes;
        let there = |c: &Choice| c.family == case.family && c.first == first && c.second == second;
        match self.points.last_mut() {
            Some((choice, entries)) if there(choice) => {
                choice.cases += 1;
                choice.beyond_gaussian += usize::from(case.beyond_gaussian);
                for (entry, here) in entries.iter_mut().zip(case.entries) {
                    entry.trusted &= here.trusted;
                    entry.work = entry.work.max(here.work);
                }
            }
            _ => {
                let choice = Choice {
                    family: case.family,
                    first_axis,
                    first,
                    second_axis,
                    second,
                    cases: 1,
                    beyond_gaussian: usize::from(case.beyond_gaussian),
                    choice: String::new(),
                    work: None,
                };
                self.points.push((choice, case.entries));
            }
        }
    }

    /// The choice at every point, in the order of the suite.
    pub fn finish(self) -> Vec<Choice> {
        let chosen = |(choice, entries): (Choice, Vec<Entry>)| match cheapest(&entries) {
            Some(entry) => Choice { choice: entry.method.clone(), work: entry.work, ..choice },
            None => choice,
        };
        self.points.into_iter().map(chosen).collect()
    }
}

/// The trusted one of least work; of equals the first.
fn cheapest(entries: &[Entry]) -> Option<&Entry> {
    entries.iter().filter(|entry| entry.trusted && entry.work.is_some()).min_by_key(|entry| entry.work)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn case(first: f64, trusted: [bool; 3]) -> GridCase {
        let entries = ["dear", "cheap", "outside"].into_iter().zip([Some(9), Some(3), None]).zip(trusted);
        let entries = entries.map(|((method, work), trusted)| Entry { method: method.into(), work, trusted });
        GridCase {
            family: "f".into(),
            axes: [("x".into(), first), ("y".into(), 1.0)],
            beyond_gaussian: first > 2.0,
            entries: entries.collect(),
        }
    }

    #[test]
    fn the_choice_is_trusted_in_every_case_of_its_point() {
        let mut map = ChoiceMap::default();
        map.add(case(1.0, [true, true, true]));
        map.add(case(1.0, [true, false, true]));
        map.add(case(2.0, [true, true, true]));
        map.add(case(3.0, [false, false, true]));
        let found = map.finish();
        let choices: Vec<_> = found.iter().map(|c| (c.first, c.cases, c.choice.as_str(), c.work)).collect();
        assert_eq!(choices, [(1.0, 2, "dear", Some(9)), (2.0, 1, "cheap", Some(3)), (3.0, 1, "", None)]);
        assert_eq!(found[2].beyond_gaussian, 1);
    }
}
