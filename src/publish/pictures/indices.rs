//! Error against a regime index, with the envelope: how well a number computed on board tells where a method can be trusted.

use plotters::prelude::*;

use super::canvas::{Area, Drawn, FAINT, INK, LETTERS, beside, colour, corners, decades, letters, mark_at, tick};
use super::{Drawing, Picture};
use crate::guidance::{Outcome, Study, View};
use crate::publish::prepared::Prepared;
use crate::score::ScoreKind;
use crate::trust::RegimeIndex;

/// Panels, one a method.
const MOST: usize = 4;
const PANEL: (u32, u32) = (640, 420);
/// Cases on one panel.
const CASES: usize = 160;
const LEAST: f64 = 1e-9;

pub(super) struct Indices<'a> {
    prepared: &'a Prepared<'a>,
    panels: Vec<Panel>,
    limit: f64,
}

struct Panel {
    entrant: usize,
    index: String,
    /// Where the envelope ends.
    envelope: Option<f64>,
    /// Index, excess, its margin, whether it is trusted.
    points: Vec<(f64, f64, f64, bool)>,
}

pub(super) fn of<'a>(prepared: &'a Prepared<'a>) -> Option<Picture<'a>> {
    let study = &*prepared.explored;
    let view = View::own(study);
    let panels: Vec<Panel> = chosen(study, &view)
        .into_iter()
        .map(|(entrant, index, envelope)| Panel {
            entrant,
            points: points(study, &view, entrant, &index),
            index,
            envelope,
        })
        .filter(|panel| panel.points.len() > 1)
        .collect();
    if panels.is_empty() {
        return None;
    }
    let suite = &study.provenance.suite.name;
    let rows = panels.len().div_ceil(2) as u32;
    Some(Picture {
        name: format!("{suite}-indices"),
        alt: format!("Excess of {} methods on {suite} against a regime index, with limits", panels.len()),
        caption: format!(
            "{suite}: excess of a case against an index that can be computed on board, with confidence bounds. Filled: trusted; \
             hollow: not. Horizontal: the limit on the excess; vertical: where the envelope ends, if there is one. Excesses below \
             1e-9 are drawn there."
        ),
        size: (PANEL.0 * panels.len().min(2) as u32, PANEL.1 * rows),
        drawing: Drawing::Indices(Indices { prepared, panels, limit: study.provenance.settings.limits.excess }),
    })
}

/// Methods with an envelope by one index, those of least work first: for what is dear nobody needs one. Without envelopes the
/// curvature.
fn chosen(study: &Study, view: &View<'_>) -> Vec<(usize, String, Option<f64>)> {
    let mut ranking = view.ranking();
    ranking.sort_by_key(|r| r.work.map_or(u64::MAX, |(_, most)| most));
    let mut order: Vec<usize> = ranking.iter().map(|r| r.entrant).collect();
    if let Some(envelopes) = &study.envelopes {
        order.retain(|&k| {
            envelopes
                .iter()
                .any(|e| e.method == study.labels[k] && e.index.as_ref().is_some_and(|i| i.terms.len() == 1))
        });
        let with = order.into_iter().filter_map(|k| {
            let envelope = envelopes.iter().find(|e| e.method == study.labels[k])?.index.as_ref()?;
            let term = envelope.terms.first()?;
            Some((k, term.index.clone(), Some(term.limit)))
        });
        return with.take(MOST).collect();
    }
    order.into_iter().take(MOST).map(|k| (k, RegimeIndex::Curvature.name().into(), None)).collect()
}

fn points(study: &Study, view: &View<'_>, entrant: usize, index: &str) -> Vec<(f64, f64, f64, bool)> {
    let step = study.cases.len().div_ceil(CASES).max(1);
    let of_case = |(k, case): (usize, &crate::guidance::StudyCase)| {
        let entry = &case.entries[entrant];
        let excess = entry.scores.get(ScoreKind::Excess)?;
        let value = study.index(k, entrant, index)?;
        let trusted = view.outcome(k, entrant);
        let margin = study.judge.quantile() * excess.standard_error;
        (value > 0.0 && trusted != Outcome::Skipped)
            .then(|| (value, excess.value.max(LEAST), margin, trusted.is_trusted()))
    };
    study.cases.iter().enumerate().step_by(step).filter_map(of_case).collect()
}

impl Indices<'_> {
    pub fn draw<DB: DrawingBackend>(&self, area: &Area<DB>) -> Drawn<DB> {
        let (columns, rows) = (self.panels.len().min(2), self.panels.len().div_ceil(2));
        for (panel, area) in self.panels.iter().zip(area.split_evenly((rows, columns))) {
            self.panel(panel, &area)?;
        }
        Ok(())
    }

    fn panel<DB: DrawingBackend>(&self, panel: &Panel, area: &Area<DB>) -> Drawn<DB> {
        let mark = &self.prepared.marks[panel.entrant];
        let paint = colour(mark.on_paper());
        let Some(x) = decades(panel.points.iter().map(|p| p.0).chain(panel.envelope)) else { return Ok(()) };
        let Some(y) = decades(panel.points.iter().map(|p| p.1).chain([self.limit])) else { return Ok(()) };
        mark_at(area, mark, (116, 18), 1.2)?;
        area.draw(&Text::new(self.prepared.study.labels[panel.entrant].clone(), (134, 8), letters(LETTERS)))?;
        let mut chart = ChartBuilder::on(area)
            .margin(14)
            .margin_top(40)
            .margin_right(40)
            .x_label_area_size(72)
            .y_label_area_size(106)
            .build_cartesian_2d((x.0..x.1).log_scale(), (y.0..y.1).log_scale())?;
        let unit = if panel.index.starts_with("excess")
            || panel.index == "bend over noise"
            || panel.index == "information"
        {
            "nats"
        } else {
            "ratio"
        };
        chart
            .configure_mesh()
            .light_line_style(TRANSPARENT)
            .bold_line_style(FAINT)
            .label_style(letters(LETTERS - 2))
            .axis_desc_style(letters(LETTERS))
            .x_desc(format!("{} [{unit}]", panel.index))
            .y_desc("excess [nats]")
            .x_labels(6)
            .x_label_formatter(&tick)
            .y_label_formatter(&|v| format!("{v:.0e}"))
            .draw()?;
        for &(index, excess, margin, trusted) in &panel.points {
            if margin > 0.05 * excess {
                let ends = [(index, (excess - margin).max(y.0)), (index, (excess + margin).min(y.1))];
                chart.draw_series([PathElement::new(ends, paint.stroke_width(1))])?;
            }
            let outline = corners(mark, 0.75);
            if trusted {
                chart.draw_series([EmptyElement::at((index, excess)) + Polygon::new(outline, paint.filled())])?;
            } else {
                let closed: Vec<(i32, i32)> = outline.iter().chain(outline.first()).copied().collect();
                chart.draw_series([
                    EmptyElement::at((index, excess)) + PathElement::new(closed, paint.stroke_width(1))
                ])?;
            }
        }
        chart.draw_series([PathElement::new([(x.0, self.limit), (x.1, self.limit)], INK.stroke_width(2))])?;
        if let Some(end) = panel.envelope {
            chart.draw_series([PathElement::new([(end, y.0), (end, y.1)], INK.stroke_width(3))])?;
            chart.draw_series([EmptyElement::at((end, y.0)) + beside("envelope ends", (8, -30))])?;
        }
        Ok(())
    }
}
