//! Sweeps combine as a grid, draws are made anew at every point of it.

use std::sync::Arc;

use super::SuiteError;
use super::draw::{Draw, stream};
use super::node::{Item, Node, Place};
use super::setting::Setting;
use super::sweep::Sweep;

/// The most cases that one suite may hold.
pub(super) const MOST_CASES: u64 = 1_000_000;

/// Keys that make a table a sweep or a draw.
const MARKS: [&str; 6] = ["from", "to", "steps", "scale", "list", "draw"];

/// The sections of a family in which values may vary.
pub(super) type Sections = [Option<Node>; 3];

#[derive(Debug)]
enum Variation {
    Sweep(Sweep),
    Draw(Draw),
}

/// Sections with every sweep and draw taken out and numbered.
#[derive(Debug)]
pub(super) struct Grid {
    sections: Sections,
    variations: Vec<(Place, Variation)>,
    /// Their keys in the family, shared by all its cases.
    keys: Vec<Arc<str>>,
    /// Numbers of the variations in the order in which they were written: the first one runs slowest.
    order: Vec<usize>,
    draws: u64,
}

impl Grid {
    /// Takes the sections apart.
    pub(super) fn new(sections: [Option<&Node>; 3]) -> Result<Self, SuiteError> {
        let mut variations = Vec::new();
        let mut taken = [None, None, None];
        for (to, from) in taken.iter_mut().zip(sections) {
            if let Some(section) = from {
                *to = Some(take_entries(section, &mut variations)?);
            }
        }
        let mut order: Vec<usize> = (0..variations.len()).collect();
        order.sort_by_key(|&i| variations[i].0.offset);
        let keys = variations.iter().map(|(place, _)| own_key(place)).collect();
        Ok(Self { sections: taken, variations, keys, order, draws: 1 })
    }

    /// The grid with `draws` cases (at least 1) drawn at every point.
    pub(super) fn with_draws(self, draws: u64) -> Self {
        Self { draws: draws.max(1), ..self }
    }

    /// Where the first draw stands, if there is one.
    pub(super) fn first_draw(&self) -> Option<&Place> {
        let drawn = self.order.iter().map(|&i| &self.variations[i]);
        drawn.filter(|(_, v)| matches!(v, Variation::Draw(_))).map(|(place, _)| place).next()
    }

    /// How many cases there are: grid points times draws.
    ///
    /// # Errors
    /// More than [`MOST_CASES`]: the count, and the key with the most values, which is `draws` itself if no
    /// sweep is longer.
    pub(super) fn size(&self, draws: &Place) -> Result<u64, SuiteError> {
        let sweeps = || {
            self.variations.iter().filter_map(|(place, v)| match v {
                Variation::Sweep(sweep) => Some((place, sweep.len())),
                Variation::Draw(_) => None,
            })
        };
        let count = sweeps().fold(u128::from(self.draws), |count, (_, len)| count.saturating_mul(len.into()));
        if count <= u128::from(MOST_CASES) {
            return Ok(count as u64);
        }
        let longest = sweeps().max_by_key(|(_, len)| *len).filter(|(_, len)| *len >= self.draws);
        let message =
            |what: String| format!("the grid has {count} cases, {what}; at most {MOST_CASES} are allowed");
        Err(match longest {
            Some((place, len)) => place.error(message(format!("{len} along this key"))),
            None => draws.error(message(format!("{} drawn at every point", self.draws))),
        })
    }

    /// The sections of case `index`, with every value in place.
    pub(super) fn case(&self, index: u64, seed: u64, family: &str) -> Sections {
        let values = self.values(index, seed, family);
        self.sections.each_ref().map(|section| section.as_ref().map(|node| put(node, &values)))
    }

    /// The numbers that make case `index` another than its neighbours, in the order in which they were written.
    pub(super) fn settings(&self, index: u64, seed: u64, family: &str) -> Vec<Setting> {
        let values = self.values(index, seed, family);
        let setting = |&i: &usize| {
            let swept = matches!(self.variations[i].1, Variation::Sweep(_));
            Setting::of(&self.keys[i], values[i].as_ref()?, swept)
        };
        self.order.iter().filter_map(setting).collect()
    }

    fn values(&self, index: u64, seed: u64, family: &str) -> Vec<Option<Node>> {
        let mut point = index / self.draws;
        let mut values: Vec<Option<Node>> = vec![None; self.variations.len()];
        for &i in self.order.iter().rev() {
            if let Variation::Sweep(sweep) = &self.variations[i].1 {
                values[i] = Some(sweep.value(point % sweep.len()));
                point /= sweep.len();
            }
        }
        let mut stream = stream(seed, family, index);
        for &i in &self.order {
            if let Variation::Draw(draw) = &self.variations[i].1 {
                values[i] = Some(draw.value(&mut stream));
            }
        }
        values
    }
}

/// `family[2].prior.range` is the family's own `prior.range`.
fn own_key(place: &Place) -> Arc<str> {
    match place.key.strip_prefix("family[").and_then(|rest| rest.split_once("].")) {
        Some((_, own)) => own.into(),
        None => (&*place.key).into(),
    }
}

fn take(node: &Node, variations: &mut Vec<(Place, Variation)>) -> Result<Node, SuiteError> {
    if MARKS.iter().any(|mark| node.get(mark).is_some()) {
        let variation = match node.get("draw") {
            Some(_) => Variation::Draw(Draw::read(node)?),
            None => Variation::Sweep(Sweep::read(node)?),
        };
        variations.push((node.place.clone(), variation));
        return Ok(Node { place: node.place.clone(), item: Item::Varied(variations.len() - 1) });
    }
    take_entries(node, variations)
}

fn take_entries(node: &Node, variations: &mut Vec<(Place, Variation)>) -> Result<Node, SuiteError> {
    let item = match &node.item {
        Item::List(list) => Item::List(list.iter().map(|e| take(e, variations)).collect::<Result<_, _>>()?),
        Item::Table(entries) => Item::Table(
            entries
                .iter()
                .map(|(name, e)| Ok((name.clone(), take(e, variations)?)))
                .collect::<Result<_, SuiteError>>()?,
        ),
        other => other.clone(),
    };
    Ok(Node { place: node.place.clone(), item })
}

fn put(node: &Node, values: &[Option<Node>]) -> Node {
    let item = match &node.item {
        Item::Varied(i) => match &values[*i] {
            Some(value) => return value.clone(),
            None => node.item.clone(),
        },
        Item::List(list) => Item::List(list.iter().map(|e| put(e, values)).collect()),
        Item::Table(entries) => {
            Item::Table(entries.iter().map(|(name, e)| (name.clone(), put(e, values))).collect())
        }
        other => other.clone(),
    };
    Node { place: node.place.clone(), item }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn numbers(sections: &Sections, paths: &[(usize, &str)]) -> Vec<f64> {
        paths.iter().map(|&(s, path)| sections[s].as_ref().unwrap().at(path).number().unwrap()).collect()
    }

    #[test]
    fn the_first_axis_in_the_file_runs_slowest() {
        let text = "[b]\nx = { list = [1, 2] }\n[a]\nlist_of = [0, { from = 5, to = 7, steps = 3 }]\n";
        let root = Node::parse(text).unwrap();
        let grid = Grid::new([root.get("a"), None, root.get("b")]).unwrap();
        assert_eq!(grid.size(&root.place), Ok(6));
        let walked: Vec<_> =
            (0..6).map(|i| numbers(&grid.case(i, 1, "f"), &[(2, "x"), (0, "list_of[1]")])).collect();
        assert_eq!(walked, [[1.0, 5.0], [1.0, 6.0], [1.0, 7.0], [2.0, 5.0], [2.0, 6.0], [2.0, 7.0]]);
    }

    #[test]
    fn a_draw_belongs_to_its_case() {
        let text = "[a]\nx = { list = [1, 2] }\ny = { draw = \"uniform\", from = 0, to = 1 }\n";
        let root = Node::parse(text).unwrap();
        let few = Grid::new([root.get("a"), None, None]).unwrap().with_draws(3);
        assert_eq!(few.size(&root.place), Ok(6));
        assert_eq!(few.first_draw().unwrap().line, 3);
        let y = |grid: &Grid, index, seed, family| numbers(&grid.case(index, seed, family), &[(0, "y")])[0];
        let longer = Node::parse(&text.replace("[1, 2]", "[1, 2, 9]")).unwrap();
        let longer = Grid::new([longer.get("a"), None, None]).unwrap().with_draws(3);
        for index in 0..6 {
            assert_eq!(y(&few, index, 1, "f"), y(&longer, index, 1, "f"));
            assert_ne!(y(&few, index, 1, "f"), y(&few, index, 2, "f"));
            assert_ne!(y(&few, index, 1, "f"), y(&few, index, 1, "g"));
        }
    }

    #[test]
    fn a_grid_beyond_all_bounds_is_counted_not_made() {
        let axis = "{ from = 0, to = 1, steps = 9000000000000000000 }";
        let root = Node::parse(&format!("[a]\nx = {{ list = [1, 2] }}\ny = [{axis}, {axis}, {axis}]\n")).unwrap();
        let error = Grid::new([root.get("a"), None, None]).unwrap().size(&root.place).unwrap_err();
        assert_eq!(error.line, Some(3));
        assert!(error.message.contains("9000000000000000000 along this key"), "{error}");
    }
}
