//! A family of cases: its sections, its grid, its draws.

use std::sync::Arc;

use super::case::{Case, CaseError};
use super::grid::{Grid, Sections};
use super::node::{Node, Place};
use super::prior::Prior;
use super::{SuiteError, noise, sensor};

/// The sections that a family may have, in the order in which [`Sections`] holds them.
pub(super) const SECTIONS: [&str; 3] = ["sensor", "prior", "noise"];

/// A named family whose values may still vary.
#[derive(Debug)]
pub(super) struct Family {
    name: String,
    place: Place,
    grid: Grid,
    size: u64,
}

impl Family {
    /// The family `name` of these sections. `own_draws` is its own `draws`, `shared_draws` the suite's.
    pub(super) fn new(
        name: String,
        place: Place,
        sections: [Option<&Node>; 3],
        own_draws: Option<&Node>,
        shared_draws: Option<&Node>,
    ) -> Result<Self, SuiteError> {
        for (section, right) in [
            (0, "say what measures, as [sensor] with `kind = \"range-bearing\"`"),
            (1, "say what is known before the measurement, as [prior] with `mean` and `sd`"),
        ] {
            if sections[section].is_none() {
                return Err(place.error(format!("[{}] is missing; {right}", SECTIONS[section])));
            }
        }
        let draws = own_draws.or(shared_draws);
        let mut grid = Grid::new(sections)?;
        match (grid.first_draw(), draws) {
            (Some(_), Some(draws)) => grid = grid.with_draws(draws.whole(1)?),
            (Some(drawn), None) => {
                return Err(
                    drawn.error("is drawn, but `draws` is missing; say how many cases each grid point gets")
                );
            }
            (None, _) => {
                if let Some(draws) = own_draws {
                    return Err(draws.error("nothing is drawn in this family; leave it out, or draw a value"));
                }
            }
        }
        let size = grid.size(draws.map_or(&place, |node| &node.place))?;
        Ok(Self { name, place, grid, size })
    }

    /// How many cases it has.
    pub(super) fn size(&self) -> u64 {
        self.size
    }

    /// Where it stands.
    pub(super) fn place(&self) -> &Place {
        &self.place
    }

    /// Whether any of its values is drawn.
    pub(super) fn draws(&self) -> bool {
        self.grid.first_draw().is_some()
    }

    /// Its cases, in grid order.
    pub(super) fn cases(&self, seed: u64) -> Result<Vec<Case>, SuiteError> {
        // Three digits at least, so that a family that grows keeps the names of its cases.
        let width = (self.size - 1).to_string().len().max(3);
        let name: Arc<str> = self.name.as_str().into();
        let case = |index| {
            let id = format!("{}-{index:0width$}", self.name);
            let made = self.case(&id, self.grid.case(index, seed, &self.name));
            let settings = self.grid.settings(index, seed, &self.name);
            let made = made.map(|case| case.in_family(Arc::clone(&name), settings));
            // What is wrong in the first case is hardly the grid's doing.
            if index == 0 { made } else { made.map_err(|e| e.in_case(&id)) }
        };
        (0..self.size).map(case).collect()
    }

    fn case(&self, id: &str, sections: Sections) -> Result<Case, SuiteError> {
        let [Some(sensor_section), Some(prior_section), noise_section] = &sections else {
            return Err(self.place.error("a section is missing"));
        };
        let prior = Prior::read(prior_section)?;
        let sensor = sensor::read(sensor_section, prior.dimension()?)?;
        let gaussian = prior.gaussian(&sensor)?;
        let r = noise_section.as_ref().map(|section| noise::read(section, sensor.sensor())).transpose()?;
        Case::new(id, sensor, gaussian, r.unwrap_or_default()).map_err(|CaseError { key, message }| {
            let section = SECTIONS.iter().position(|name| key.starts_with(name));
            match section.and_then(|i| sections[i].as_ref()) {
                Some(node) => node.error(message),
                None => self.place.error(message),
            }
        })
    }
}
