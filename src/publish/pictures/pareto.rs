//! Error against cost: what more work buys.

use plotters::prelude::*;

use super::canvas::{Area, Drawn, FAINT, INK, LETTERS, beside, colour, corners, decades, legend, letters, tick};
use super::{Drawing, Picture};
use crate::guidance::{Spread, View};
use crate::publish::prepared::Prepared;
use crate::score::ScoreKind;

pub(super) struct Pareto<'a> {
    prepared: &'a Prepared<'a>,
    /// Entrant, most work, quartiles of the excess.
    points: Vec<(usize, f64, Spread)>,
    limit: f64,
}

/// An excess below this is nothing: a logarithmic axis needs an end.
const LEAST: f64 = 1e-9;

pub(super) fn of<'a>(prepared: &'a Prepared<'a>) -> Option<Picture<'a>> {
    let study = prepared.study;
    let points: Vec<(usize, f64, Spread)> = View::own(study)
        .ranking()
        .iter()
        .filter_map(|r| {
            let quartiles = study.quartiles(r.entrant, ScoreKind::Excess)?;
            let above = |v: f64| v.max(LEAST);
            let Spread { lower, median, upper } = quartiles;
            Some((
                r.entrant,
                r.work?.1 as f64,
                Spread { lower: above(lower), median: above(median), upper: above(upper) },
            ))
        })
        .collect();
    if points.len() < 2 {
        return None;
    }
    let suite = &study.provenance.suite.name;
    Some(Picture {
        name: format!("{suite}-pareto"),
        alt: format!(
            "Excess of {} methods on {suite} against their work, with quartiles over the cases",
            points.len()
        ),
        caption: format!(
            "{suite}: median excess over the cases, with quartiles, against the work of one transform. The line joins the \
             methods that no other beats in both. Excesses below 1e-9 are drawn there."
        ),
        size: (1000, 560.max(120 + 29 * points.len() as u32)),
        drawing: Drawing::Pareto(Pareto { prepared, points, limit: study.provenance.settings.limits.excess }),
    })
}

impl Pareto<'_> {
    pub fn draw<DB: DrawingBackend>(&self, area: &Area<DB>) -> Drawn<DB> {
        let (plot, side) = area.split_horizontally(690);
        let Some(x) = decades(self.points.iter().map(|p| p.1)) else { return Ok(()) };
        let spread = self.points.iter().flat_map(|(_, _, s)| [s.lower, s.upper]);
        let Some(y) = decades(spread.chain([self.limit])) else { return Ok(()) };
        let mut chart = ChartBuilder::on(&plot)
            .margin(16)
            .x_label_area_size(72)
            .y_label_area_size(106)
            .build_cartesian_2d((x.0..x.1).log_scale(), (y.0..y.1).log_scale())?;
        chart
            .configure_mesh()
            .light_line_style(TRANSPARENT)
            .bold_line_style(FAINT)
            .label_style(letters(LETTERS - 2))
            .axis_desc_style(letters(LETTERS))
            .x_desc("work of one transform [numbers computed]")
            .y_desc("excess, median and quartiles [nats]")
            .x_label_formatter(&tick)
            .y_label_formatter(&|v| format!("{v:.0e}"))
            .draw()?;
        chart.draw_series([PathElement::new([(x.0, self.limit), (x.1, self.limit)], INK.stroke_width(2))])?;
        chart.draw_series([EmptyElement::at((x.0, self.limit)) + beside("limit", (6, -26))])?;
        let mut front: Vec<(f64, f64)> = Vec::new();
        let mut by_work: Vec<_> = self.points.iter().map(|(_, work, s)| (*work, s.median)).collect();
        by_work.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.total_cmp(&b.1)));
        for point in by_work {
            if front.last().is_none_or(|last| point.1 < last.1) {
                front.push(point);
            }
        }
        chart.draw_series([PathElement::new(front, INK.mix(0.6).stroke_width(2))])?;
        for &(entrant, work, s) in &self.points {
            let mark = &self.prepared.marks[entrant];
            let paint = colour(mark.on_paper());
            chart.draw_series([PathElement::new([(work, s.lower), (work, s.upper)], paint.stroke_width(2))])?;
            chart.draw_series([
                EmptyElement::at((work, s.median)) + Polygon::new(corners(mark, 1.3), paint.filled())
            ])?;
        }
        let names = |&(entrant, ..): &(usize, f64, Spread)| {
            (&self.prepared.marks[entrant], self.prepared.study.labels[entrant].clone())
        };
        legend(&side, &self.points.iter().map(names).collect::<Vec<_>>(), 24)
    }
}
