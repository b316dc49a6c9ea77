//! Where each method is trusted over two sweeps: one map a method, all with the same axes.

use plotters::prelude::*;

use super::canvas::{Area, Drawn, FAINT, INK, LETTERS, WARN, YES, letters, mark_at};
use super::{Drawing, Picture};
use crate::guidance::{FamilyMap, Outcome, View};
use crate::publish::axes::{parted, quantity};
use crate::publish::prepared::Prepared;
use crate::trust::Trust;

/// Methods on one picture: more would be too small to read.
const MOST: usize = 8;
const COLUMNS: usize = 4;
const PANEL: (u32, u32) = (330, 300);
const HEAD: u32 = 90;

pub(super) struct TrustMaps<'a> {
    prepared: &'a Prepared<'a>,
    view: View<'a>,
    map: FamilyMap,
    shown: Vec<usize>,
}

/// One picture a family of two sweeps.
pub(super) fn all<'a>(prepared: &'a Prepared<'a>) -> Vec<Picture<'a>> {
    let view = View::own(&prepared.explored);
    let maps = view.maps().into_iter().filter(|map| map.axes.len() == 2);
    maps.enumerate()
        .map(|(k, map)| {
            let shown: Vec<usize> = view.ranking().iter().map(|r| r.entrant).take(MOST).collect();
            let rows = shown.len().div_ceil(COLUMNS) as u32;
            let suite = &prepared.study.provenance.suite.name;
            let axes = [0, 1].map(|k| parted(&prepared.study.headings[map.axes[k]]).0);
            Picture {
                name: format!("{suite}-trust-map-{k}"),
                alt: format!(
                    "Maps of {suite}, family {}: for each of {} methods, trusted or rejected over {} and {}",
                    map.family,
                    shown.len(),
                    axes[0],
                    axes[1]
                ),
                caption: format!(
                    "{suite}, family {}: where each method is trusted (filled), rejected (cross) or cannot be told (?).",
                    map.family
                ),
                size: (PANEL.0 * shown.len().min(COLUMNS) as u32 + 30, PANEL.1 * rows + HEAD),
                drawing: Drawing::TrustMaps(TrustMaps { prepared, view: view.clone(), map, shown }),
            }
        })
        .collect()
}

impl TrustMaps<'_> {
    pub fn draw<DB: DrawingBackend>(&self, area: &Area<DB>) -> Drawn<DB> {
        let study = self.prepared.study;
        let heading = |k: usize| &study.headings[self.map.axes[k]];
        let text = format!("{}: down {}, across {}", self.map.family, parted(heading(0)).0, parted(heading(1)).0);
        area.draw(&Text::new(text, (16, 14), letters(LETTERS + 1)))?;
        // The key.
        let keys = [
            ("trusted", Some(Trust::Trusted)),
            ("rejected", Some(Trust::Rejected)),
            ("cannot be told", Some(Trust::Undecided)),
        ];
        let mut x = 20;
        for (name, outcome) in keys {
            let place = ((x, 52), (x + 26, 76));
            cell(area, place, &[outcome.map_or(Outcome::Skipped, Outcome::Judged)])?;
            area.draw(&Text::new(name, (x + 34, 54), letters(LETTERS - 2)))?;
            x += 70 + 12 * name.len() as i32;
        }
        for (k, &entrant) in self.shown.iter().enumerate() {
            let corner =
                ((k % COLUMNS) as i32 * PANEL.0 as i32 + 10, (k / COLUMNS) as i32 * PANEL.1 as i32 + HEAD as i32);
            self.panel(area, corner, entrant)?;
        }
        Ok(())
    }

    fn panel<DB: DrawingBackend>(&self, area: &Area<DB>, (left, top): (i32, i32), entrant: usize) -> Drawn<DB> {
        let mark = &self.prepared.marks[entrant];
        mark_at(area, mark, (left + 16, top + 14), 1.2)?;
        area.draw(&Text::new(
            self.prepared.study.labels[entrant].clone(),
            (left + 34, top + 3),
            letters(LETTERS - 1),
        ))?;
        let (down, across) = (&self.map.values[0], &self.map.values[1]);
        let heading = |k: usize| &self.prepared.study.headings[self.map.axes[k]];
        let (x0, y0) = (left + 92, top + 34);
        let (width, height) =
            ((PANEL.0 as i32 - 112) / across.len() as i32, (PANEL.1 as i32 - 84) / down.len() as i32);
        // Ticks as far apart as their letters need.
        let (skip_down, skip_across) = ((24 / height.max(1) + 1) as usize, (84 / width.max(1) + 1) as usize);
        for (i, &value) in down.iter().enumerate().filter(|(i, _)| i % skip_down == 0) {
            let y = y0 + i as i32 * height + height / 2 - 9;
            area.draw(&Text::new(quantity(value, heading(0)), (left + 6, y), letters(LETTERS - 4)))?;
        }
        for (j, &value) in across.iter().enumerate().filter(|(j, _)| j % skip_across == 0) {
            let at = (x0 + j as i32 * width, y0 + down.len() as i32 * height + 5);
            area.draw(&Text::new(quantity(value, heading(1)), at, letters(LETTERS - 4)))?;
        }
        for point in &self.map.cells {
            let (x, y) = (x0 + point.place[1] as i32 * width, y0 + point.place[0] as i32 * height);
            let outcomes: Vec<Outcome> = point.cases.iter().map(|&case| self.view.outcome(case, entrant)).collect();
            cell(area, ((x, y), (x + width - 2, y + height - 2)), &outcomes)?;
        }
        Ok(())
    }
}

/// Filled where all are trusted, a cross where all are rejected, a question mark where none is either, else how many are.
fn cell<DB: DrawingBackend>(area: &Area<DB>, place: ((i32, i32), (i32, i32)), outcomes: &[Outcome]) -> Drawn<DB> {
    let ((x0, y0), (x1, y1)) = place;
    let corners = [(x0, y0), (x1, y1)];
    let all = |wanted: Trust| outcomes.iter().all(|&o| o == Outcome::Judged(wanted));
    if all(Trust::Trusted) {
        return area.draw(&Rectangle::new(corners, YES.filled()));
    }
    area.draw(&Rectangle::new(corners, FAINT.stroke_width(1)))?;
    let (x, y) = ((x0 + x1) / 2, (y0 + y1) / 2);
    if all(Trust::Rejected) {
        let r = (x1 - x0).min(y1 - y0) / 4;
        area.draw(&PathElement::new([(x - r, y - r), (x + r, y + r)], WARN.stroke_width(2)))?;
        return area.draw(&PathElement::new([(x - r, y + r), (x + r, y - r)], WARN.stroke_width(2)));
    }
    let trusted = outcomes.iter().filter(|o| o.is_trusted()).count();
    let text = if trusted == 0 { "?".to_string() } else { format!("{trusted}/{}", outcomes.len()) };
    let half = 5 * text.len() as i32;
    let style = letters(LETTERS - 4);
    area.draw(&Text::new(text, (x - half, y - 9), TextStyle { color: INK.to_backend_color(), ..style }))
}
